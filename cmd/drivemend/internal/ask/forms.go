package ask

import (
	"errors"
	"fmt"
	"io"
	"strings"
	"unicode/utf8"

	"github.com/charmbracelet/huh"

	_ "drivemend/cmd/drivemend/internal/ask/quiet" // before the menus question the terminal
)

// Forms asks with menus and input fields on a terminal. What is asked and what was answered stays on the screen above
// the field, so that a session can be read back.
type Forms struct {
	lines *Lines
	in    io.Reader
	out   io.Writer
}

// NewForms asks on a terminal; in and out must be one. Width is in columns; 80 if it is below 40.
func NewForms(in io.Reader, out io.Writer, width int) *Forms {
	return &Forms{NewLines(strings.NewReader(""), out, width, false), in, out}
}

// asideMark stands before the word of something to be looked at, in the value of a menu entry.
const asideMark = "\x00"

// Ask shows the question and its field until there is an answer.
func (f *Forms) Ask(q Question) (Answer, error) {
	f.lines.head(q)
	for {
		text, err := f.field(q)
		if errors.Is(err, huh.ErrUserAborted) {
			return Answer{Kind: Quit}, nil
		}
		if err != nil {
			return Answer{}, err
		}
		if a := q.chosenAside(text); a != nil {
			if a.Do != nil {
				return Answer{Kind: Moved}, a.Do()
			}
			f.lines.verbatim(a.Show())
			f.lines.head(q)
			continue
		}
		answer, err := q.answer(text)
		if err != nil {
			f.lines.paragraph(err.Error(), "  ")
			continue
		}
		fmt.Fprintln(f.out, "> "+Clean(shown(answer, text)))
		return answer, nil
	}
}

// chosenAside finds the aside that was taken from a menu or typed into a field.
func (q Question) chosenAside(text string) *Aside {
	if word, ok := strings.CutPrefix(text, asideMark); ok {
		for i := range q.Asides {
			if q.Asides[i].Word == word {
				return &q.Asides[i]
			}
		}
	}
	return q.aside(strings.ToLower(strings.TrimSpace(text)))
}

// shown is the line that stays on the screen for an answer.
func shown(a Answer, text string) string {
	switch a.Kind {
	case Skipped:
		return "don't know"
	case Later:
		return "not now"
	case Back:
		return "back"
	case Quit:
		return "quit"
	}
	return text
}

// field runs a menu where there are only choices, and an input field where something is typed: a reading, or the word
// that a safety step rests on.
func (f *Forms) field(q Question) (string, error) {
	text := ""
	var field huh.Field
	if q.Free == "" && !q.Danger {
		field = f.menu(q, &text)
	} else {
		f.lines.choices(q)
		field = f.input(q, &text)
	}
	form := huh.NewForm(huh.NewGroup(field)).WithTheme(huh.ThemeBase()).WithShowHelp(false).
		WithWidth(f.lines.width).WithInput(f.in).WithOutput(f.out)
	err := form.Run()
	if err == nil && form.State != huh.StateCompleted {
		err = huh.ErrUserAborted // ended from outside, by a signal
	}
	return text, err
}

// input is a field to type into. A refused text does not stay in it: the reason stands below an empty field.
func (f *Forms) input(q Question, text *string) huh.Field {
	field := huh.NewInput().Description(strings.Join(packed(q.menu(), f.lines.width-2), "\n")).Prompt("> ").Value(text)
	return field.Validate(func(typed string) error {
		if q.aside(strings.ToLower(strings.TrimSpace(typed))) != nil {
			return nil
		}
		_, err := q.answer(typed)
		if err != nil {
			*text = ""
			field.Value(text)
		}
		return err
	})
}

// menu lists the choices, then what can be done instead of answering.
func (f *Forms) menu(q Question, text *string) huh.Field {
	wide := 0
	for _, c := range q.Choices {
		wide = max(wide, utf8.RuneCountInString(c.Word))
	}
	var options []huh.Option[string]
	var words []pick
	add := func(word, means, value string, typed ...string) {
		options = append(options, huh.NewOption(f.label(word, means, wide), value))
		if value != "" {
			words = append(words, pick{typed, value})
		}
	}
	if q.Enter == "" {
		add("", menuKeys, "") // Enter alone stands on no answer
	}
	for _, c := range q.Choices {
		add(c.Word, c.Means, c.Word, c.Word)
	}
	for _, a := range q.Asides {
		add(a.Word, "("+a.Means+")", asideMark+a.Word, a.Word)
	}
	for _, c := range q.commands() {
		add(c.means, "", c.words[len(c.words)-1], append(c.words, c.means)...)
	}
	*text = q.Enter
	field := huh.NewSelect[string]().Options(options...).Value(text).Validate(func(value string) error {
		if value == "" {
			return errors.New("nothing is chosen yet, and Enter alone answers nothing here; " + menuKeys)
		}
		return nil
	})
	return &picker{Select: field, value: text, words: words}
}

// menuKeys says how a menu is answered.
const menuKeys = "choose with the arrows, or type how a word begins; then Enter"

// label is one entry of a menu. A long meaning goes on below its first line.
func (f *Forms) label(word, means string, wide int) string {
	head := fmt.Sprintf("%-*s  ", wide, Clean(word))
	return strings.Join(Wrapped(Clean(means), head, strings.Repeat(" ", wide+2), f.lines.width-4), "\n")
}
