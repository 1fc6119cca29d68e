package ask

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"regexp"
	"strings"
	"unicode/utf8"
)

// longestLine bounds one typed line in bytes.
const longestLine = 64 << 10

// Lines asks in plain lines. One reader is shared by all its questions, so that nothing piped in is lost between them.
type Lines struct {
	in    *bufio.Reader
	out   io.Writer
	width int
	echo  bool
}

// NewLines asks on out and reads answers from in, a line each. Echo repeats what was read, for a pipe, whose reader
// would otherwise not see the answers. Width is in columns; 80 if it is below 40.
func NewLines(in io.Reader, out io.Writer, width int, echo bool) *Lines {
	if width < 40 {
		width = 80
	}
	return &Lines{bufio.NewReaderSize(in, longestLine), out, width, echo}
}

// Ask prints the question and reads lines until one of them is an answer.
func (l *Lines) Ask(q Question) (Answer, error) {
	l.put(q)
	for {
		fmt.Fprint(l.out, "> ")
		text, err := l.line()
		if errors.Is(err, errLong) {
			l.paragraph("the line is too long; nothing was taken, type it again", "  ")
			continue
		}
		if err != nil {
			fmt.Fprintln(l.out)
			return Answer{}, err
		}
		if l.echo {
			fmt.Fprintln(l.out, Clean(text))
		}
		if a := q.aside(strings.ToLower(strings.TrimSpace(text))); a != nil {
			if a.Do != nil {
				return Answer{Kind: Moved}, a.Do()
			}
			l.verbatim(a.Show())
			l.put(q)
			continue
		}
		answer, err := q.answer(text)
		if err == nil {
			return answer, nil
		}
		l.paragraph(err.Error(), "  ")
	}
}

// put prints the whole question.
func (l *Lines) put(q Question) {
	l.head(q)
	l.choices(q)
	for _, line := range packed(q.menu(), l.width) {
		fmt.Fprintln(l.out, Clean(line))
	}
}

var errLong = errors.New("the line is too long")

// line reads one line without its end. The last line of a pipe may lack one.
func (l *Lines) line() (string, error) {
	raw, err := l.in.ReadSlice('\n')
	text := strings.TrimRight(string(raw), "\r\n")
	switch {
	case errors.Is(err, bufio.ErrBufferFull):
		for errors.Is(err, bufio.ErrBufferFull) {
			_, err = l.in.ReadSlice('\n')
		}
		return "", errLong
	case err == nil, text != "":
		return strings.ToValidUTF8(text, "?"), nil
	case errors.Is(err, io.EOF):
		return "", ErrEnd
	}
	return "", err
}

// head prints what is asked.
func (l *Lines) head(q Question) {
	head := q.Title
	if q.Place != "" {
		head += ": " + q.Place
	}
	fmt.Fprintf(l.out, "\n%s\n", Clean(head))
	for _, line := range q.Lines {
		l.paragraph(line, "  ")
	}
	l.paragraph(q.Ask, "")
}

// choices prints what the question offers.
func (l *Lines) choices(q Question) {
	wide := 0
	for _, c := range q.Choices {
		wide = max(wide, utf8.RuneCountInString(c.Word))
	}
	for _, c := range q.Choices {
		l.hang(fmt.Sprintf("   %-*s  ", wide, c.Word), c.Means)
	}
}

// menu lists what may be typed, a few words each.
func (q Question) menu() []string {
	var parts []string
	switch {
	case q.Free != "" && len(q.Choices) > 0:
		parts = append(parts, q.Free+", or a word above or its beginning")
	case q.Free != "":
		parts = append(parts, q.Free)
	case q.Danger:
		parts = append(parts, "a whole word above")
	default:
		parts = append(parts, "a word above or its beginning")
	}
	if q.Danger && q.Free != "" && len(q.Choices) > 0 {
		parts[0] = q.Free + ", or a whole word above"
	}
	if q.Enter != "" && !q.Danger {
		parts = append(parts, "Enter: "+q.Enter)
	}
	for _, a := range q.Asides {
		parts = append(parts, a.Word)
	}
	for _, c := range q.commands() {
		parts = append(parts, c.words[0]+" "+c.means)
	}
	return parts
}

// packed puts parts into lines of at most width columns, a part never broken.
func packed(parts []string, width int) []string {
	var out []string
	line := ""
	for _, p := range parts {
		switch {
		case line == "":
			line = " " + p
		case utf8.RuneCountInString(line)+3+utf8.RuneCountInString(p) > width:
			out, line = append(out, line), " "+p
		default:
			line += " · " + p
		}
	}
	return append(out, line)
}

// verbatim prints lines as they are.
func (l *Lines) verbatim(text string) { fmt.Fprintln(l.out, strings.TrimRight(Clean(text), "\n")) }

// paragraph prints a text broken at blanks to the width, every line indented.
func (l *Lines) paragraph(text, indent string) {
	for _, line := range strings.Split(Clean(text), "\n") {
		l.wrap(line, indent, indent)
	}
}

// hang prints a text behind a head, its further lines under its first.
func (l *Lines) hang(head, text string) {
	l.wrap(Clean(text), Clean(head), strings.Repeat(" ", utf8.RuneCountInString(head)))
}

func (l *Lines) wrap(text, first, rest string) {
	for _, line := range Wrapped(text, first, rest, l.width) {
		fmt.Fprintln(l.out, line)
	}
}

// Wrapped breaks a text at blanks into lines of at most width columns; first stands before the first line, rest before
// the others. A word that is too long stands alone; a number and its unit stay together.
func Wrapped(text, first, rest string, width int) []string {
	var out []string
	line, empty := first, true
	for _, word := range together(strings.Fields(text)) {
		if !empty && utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > width {
			out = append(out, strings.TrimRight(line, " "))
			line, empty = rest, true
		}
		if !empty {
			line += " "
		}
		line, empty = line+word, false
	}
	return append(out, strings.TrimRight(line, " "))
}

// measured is a number, and unit what may stand behind one.
var (
	measured = regexp.MustCompile(`^[(<>]?[-+]?[\d.]+$`)
	unit     = regexp.MustCompile(`^(%|dB|min|[pnµmkMG]?(V|A|J|W|F|H|s|Hz|C|Ω)(/ns|/s)?)[,.;:)]*$`)
)

// together joins numbers with their units.
func together(words []string) []string {
	var out []string
	for _, w := range words {
		if n := len(out); n > 0 && unit.MatchString(w) && measured.MatchString(out[n-1]) {
			out[n-1] += " " + w
			continue
		}
		out = append(out, w)
	}
	return out
}
