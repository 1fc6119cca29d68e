// Package ask puts one question at a time to the person at the bench and brings back what was said. It knows neither
// cases nor rules. Lines asks in plain lines, for a pipe, a screen reader or a plain terminal; Forms asks with menus
// and input fields on a terminal.
package ask

import (
	"errors"
	"fmt"
	"slices"
	"strings"
	"unicode"
)

// ErrEnd tells that there is nobody to answer any more: the input has ended.
var ErrEnd = errors.New("the input ended")

// Kind tells what was said to a question.
type Kind int

// The kinds of answer.
const (
	Given   Kind = iota // Text holds it
	Skipped             // not known, or not wanted
	Later               // not now
	Back                // to the question before
	Quit                // stop here
	Moved               // something else was done meanwhile, from an aside: what comes next is to be chosen anew
)

// Answer is what was said. Text is a choice's word, or the free text as typed; of Moved it is empty.
type Answer struct {
	Kind Kind
	Text string
}

// Choice is one answer that a question offers.
type Choice struct{ Word, Means string }

// Aside is something that can be looked at from a question, which is then asked again.
type Aside struct {
	Word  string        // what is typed for it: how, why
	Means string        // what it shows, for the menu
	Show  func() string // lines as they are to stand on the screen
	// Do does something instead of showing; the question then ends as Moved. Its error ends the session.
	Do func() error
}

// Question is one thing to be answered. Choices or Free, or both, are given.
type Question struct {
	Title string   // a few words
	Place string   // where it is read or which part is meant, "" for none
	Lines []string // what stands under the title
	Ask   string   // the question itself

	Choices []Choice
	Free    string                  // what may be typed instead of a choice, "a reading in Ω"; "" for choices only
	Check   func(text string) error // of a free text; the error says what to type instead

	// Danger marks a question that a safety step rests on: only a word typed in full answers it.
	Danger bool
	// Enter is what Enter alone answers, as if it were typed: a choice, a free text, or a command such as later; "" and
	// every question of danger: nothing.
	Enter string
	// NoBack and NoSkip take those commands off where there is nothing to go back to or to leave open.
	NoBack, NoSkip bool
	Asides         []Aside
}

// Asker puts questions.
type Asker interface {
	// Ask gives the answer to one question. The error is ErrEnd when nobody answers any more, or tells what is wrong
	// with the terminal.
	Ask(q Question) (Answer, error)
}

// command is what can always be typed, as far as the question allows.
type command struct {
	words []string
	kind  Kind
	means string
}

// commands lists what can be typed besides an answer.
func (q Question) commands() []command {
	var out []command
	later := command{[]string{"n", "later"}, Later, "not now"}
	if q.plainYesNo() {
		later.words = []string{"later"}
	}
	if !q.NoSkip {
		out = append(out, command{[]string{"?", "skip"}, Skipped, "don't know"}, later)
	}
	if !q.NoBack {
		out = append(out, command{[]string{"b", "back"}, Back, "back"})
	}
	return append(out, command{[]string{"q", "quit"}, Quit, "quit"})
}

// aside finds something to be looked at by its word, or by its first letter where no choice begins with that.
func (q Question) aside(text string) *Aside {
	if q.exact(text) != "" {
		return nil
	}
	for i := range q.Asides {
		w := q.Asides[i].Word
		if text == w || text == w[:1] && !q.begins(text) {
			return &q.Asides[i]
		}
	}
	return nil
}

// begins tells whether one of the choices begins with a text.
func (q Question) begins(text string) bool {
	return slices.ContainsFunc(q.Choices, func(c Choice) bool { return strings.HasPrefix(strings.ToLower(c.Word), text) })
}

// plainYesNo tells whether y and n mean yes and no here: at a question of yes or no on which no safety step rests.
func (q Question) plainYesNo() bool { return !q.Danger && q.exact("yes") != "" && q.exact("no") != "" }

// answer reads one typed line. A word of the question goes before a command, a command before free text.
func (q Question) answer(text string) (Answer, error) {
	text = strings.TrimSpace(text)
	lower := strings.ToLower(text)
	if strings.IndexFunc(text, unicode.IsControl) >= 0 {
		return Answer{}, errors.New("control characters were typed; nothing was taken, type it again")
	}
	if text == "" {
		return q.enter()
	}
	if w := q.exact(lower); w != "" {
		return Answer{Given, w}, nil
	}
	if q.plainYesNo() && (lower == "y" || lower == "n") {
		return Answer{Given, map[string]string{"y": "yes", "n": "no"}[lower]}, nil
	}
	for _, c := range q.commands() {
		for _, w := range c.words {
			if lower == w {
				return Answer{Kind: c.kind}, nil
			}
		}
	}
	return q.other(text, lower)
}

// enter reads Enter alone.
func (q Question) enter() (Answer, error) {
	switch {
	case q.Danger:
		return Answer{}, errors.New("Enter alone confirms nothing here; type " + q.expected())
	case q.isCommand(q.Enter):
		return q.answer(q.Enter)
	case q.Enter != "":
		return Answer{Given, q.Enter}, nil
	case q.NoSkip:
		return Answer{}, errors.New("Enter alone answers nothing; type " + q.expected())
	}
	return Answer{}, errors.New("Enter alone answers nothing; type " + q.expected() + ", or ? if you don't know")
}

// isCommand tells whether a text is a command here.
func (q Question) isCommand(text string) bool {
	return q.exact(text) == "" && slices.ContainsFunc(q.commands(), func(c command) bool { return slices.Contains(c.words, text) })
}

// exact gives the choice with this word, in capitals or not. Digits never choose: at the next question they may be a
// reading.
func (q Question) exact(lower string) string {
	for _, c := range q.Choices {
		if lower == strings.ToLower(c.Word) {
			return c.Word
		}
	}
	return ""
}

// other reads what is neither a word of the question nor a command: the beginning of a word, or free text.
func (q Question) other(text, lower string) (Answer, error) {
	if !q.Danger {
		var fits []string
		for _, c := range q.Choices {
			if strings.HasPrefix(strings.ToLower(c.Word), lower) {
				fits = append(fits, c.Word)
			}
		}
		switch {
		case len(fits) == 1:
			return Answer{Given, fits[0]}, nil
		case len(fits) > 1:
			return Answer{}, fmt.Errorf("%q fits %s; type more of it", text, strings.Join(fits, " and "))
		}
	}
	if q.Free == "" {
		return Answer{}, fmt.Errorf("%q is no answer here; type %s", text, q.expected())
	}
	if q.Check != nil {
		if err := q.Check(text); err != nil {
			return Answer{}, err
		}
	}
	return Answer{Given, text}, nil
}

// expected says what may be typed.
func (q Question) expected() string {
	var words []string
	for _, c := range q.Choices {
		words = append(words, c.Word)
	}
	all := strings.Join(words, ", ")
	switch {
	case q.Free == "":
		return "one of: " + all
	case all == "":
		return q.Free
	}
	return q.Free + ", or one of: " + all
}

// Clean makes a text harmless on a terminal: control characters become blanks.
func Clean(text string) string {
	return strings.Map(func(r rune) rune {
		if r != '\n' && unicode.IsControl(r) {
			return ' '
		}
		return r
	}, text)
}
