package reports

import (
	"io"
	"strings"
)

// tone is what a word means on a terminal or a page, after IEC 60073. The word itself always says the same.
type tone string

const (
	neutral   tone = ""
	danger    tone = "danger"
	caution   tone = "caution"
	normal    tone = "normal"
	mandatory tone = "mandatory"
	strong    tone = "strong" // a heading; no meaning of its own
)

var escapes = map[tone]string{danger: "1;31", caution: "33", normal: "32", mandatory: "1;34", strong: "1"}

const (
	usualWidth               = 80
	leastWidth, largestWidth = 40, 200
)

// screen collects the lines of one terminal output.
type screen struct {
	strings.Builder
	width int
	color bool
}

func newScreen(s Style) *screen {
	if s.Width < leastWidth || s.Width > largestWidth {
		s.Width = usualWidth
	}
	return &screen{width: s.Width, color: s.Color}
}

// write hands the lines over in one piece.
func (s *screen) write(w io.Writer) error {
	_, err := io.WriteString(w, s.String())
	return err
}

func (s *screen) paint(t tone, text string) string {
	if code := escapes[t]; s.color && code != "" && strings.TrimSpace(text) != "" {
		return "\x1b[" + code + "m" + text + "\x1b[0m"
	}
	return text
}

// line writes one line, cut to the width.
func (s *screen) line(t tone, text string) {
	s.WriteString(s.paint(t, strings.TrimRight(fit(plainKeep(text), s.width), " ")) + "\n")
}

func (s *screen) blank() { s.WriteByte('\n') }

// ends writes one line with a word, a text after it and another flush right; a text too long for it goes on below,
// under its own beginning.
func (s *screen) ends(t tone, word, text, right string) {
	right = fit(plain(right), s.width/2)
	room := s.width - columns(right) - 2
	mark := fit(plain(word), room/2) + "  "
	under := room - columns(mark)
	lines := fold(plain(text), under)
	if len(lines) == 0 {
		lines = []string{""}
	}
	for i, l := range capped(lines, under) {
		if i > 0 {
			s.WriteString(strings.Repeat(" ", columns(mark)) + s.paint(t, l) + "\n")
			continue
		}
		s.WriteString(s.paint(t, mark+l) + strings.Repeat(" ", under-columns(l)+2) + right + "\n")
	}
}

// head writes a heading: a word in capitals, then what it stands for.
func (s *screen) head(word, rest string) {
	if plain(rest) == "" {
		s.line(strong, word)
		return
	}
	s.hang(strong, word+"  ", rest)
}

const labelColumns = 10

// item writes a label and a text folded beside it.
func (s *screen) item(t tone, label, text string) {
	s.hang(t, " "+pad(label, labelColumns-2)+" ", text)
}

// hang writes a text folded behind a mark, further lines indented to the same column.
func (s *screen) hang(t tone, mark, text string) {
	indent := columns(mark)
	for i, l := range fold(plain(text), s.width-indent) {
		lead := strings.Repeat(" ", indent)
		if i == 0 {
			lead = s.paint(t, mark)
		}
		s.WriteString(lead + l + "\n")
	}
}

// say writes a text folded over the whole width.
func (s *screen) say(t tone, text string) {
	for _, l := range fold(plain(text), s.width) {
		s.WriteString(s.paint(t, l) + "\n")
	}
}

// column is one column of a terminal table. Width 0 takes what the others leave; Right sets numbers flush right.
type column struct {
	title string
	width int
	right bool
}

// entry is one cell.
type entry struct {
	Text string
	Tone tone
}

// grid writes rows in columns with one blank between; text too long for its column folds into further lines.
func (s *screen) grid(columns []column, rows [][]entry) {
	head := make([]entry, len(columns))
	titled := false
	for i, c := range columns {
		head[i] = entry{c.title, strong}
		titled = titled || c.title != ""
	}
	if titled && !s.narrow(columns) {
		s.row(s.widths(columns), head)
	}
	s.add(columns, rows...)
}

// add writes further rows of a grid.
func (s *screen) add(columns []column, rows ...[]entry) {
	for _, r := range rows {
		if s.narrow(columns) {
			s.stack(columns, r)
		} else {
			s.row(s.widths(columns), r)
		}
	}
}

// least is the fewest columns an open column is of use with.
const least = 14

// narrow tells whether a terminal is too narrow for a grid.
func (s *screen) narrow(cols []column) bool {
	used := len(cols) - 1
	for _, c := range cols {
		used += max(c.width, map[bool]int{true: least}[c.width == 0])
	}
	return used > s.width
}

// stack writes a row of a grid that does not fit as lines, each with the title of its column.
func (s *screen) stack(cols []column, cells []entry) {
	lead := ""
	for i, c := range cells {
		text := fit(plain(c.Text), mostLines*s.width)
		if text == "" {
			continue
		}
		if i < len(cols) && cols[i].title != "" && lead != "" {
			text = cols[i].title + ": " + text
		}
		s.hang(c.Tone, lead, text)
		lead = "   "
	}
}

// mostLines is how many lines of a grid one cell may fill; the pages for print hold the rest.
const mostLines = 6

// widths gives the one open column what is left of the line.
func (s *screen) widths(cols []column) []column {
	out := append([]column(nil), cols...)
	left, open := s.width-(len(cols)-1), -1
	for i, c := range cols {
		left -= c.width
		if c.width == 0 {
			open = i
		}
	}
	if open >= 0 {
		out[open].width = max(left, least)
	}
	return out
}

func (s *screen) row(cols []column, cells []entry) {
	folded := make([][]string, len(cols))
	height := 1
	for i := range cols {
		if i < len(cells) {
			folded[i] = capped(fold(plain(cells[i].Text), cols[i].width), cols[i].width)
			height = max(height, len(folded[i]))
		}
	}
	for k := range height {
		line, used := "", 0
		for i, c := range cols {
			if k >= len(folded[i]) || folded[i][k] == "" {
				used += c.width + 1
				continue
			}
			text := folded[i][k]
			gap := used - columns(stripped(line))
			if c.right {
				gap += c.width - columns(text)
			}
			line += strings.Repeat(" ", max(gap, 0)) + s.paint(cells[i].Tone, text)
			used += c.width + 1
		}
		s.WriteString(line + "\n")
	}
}

// capped cuts a cell that fills too many lines.
func capped(lines []string, width int) []string {
	if len(lines) <= mostLines {
		return lines
	}
	last := lines[mostLines-1]
	return append(lines[:mostLines-1:mostLines-1], fit(last+" "+lines[mostLines], width))
}

// stripped takes our own colour codes out, for measuring.
func stripped(line string) string {
	for {
		from := strings.Index(line, "\x1b[")
		if from < 0 {
			return line
		}
		to := strings.IndexByte(line[from:], 'm')
		line = line[:from] + line[from+to+1:]
	}
}

func pad(text string, n int) string {
	return text + strings.Repeat(" ", max(n-columns(text), 0))
}

// plainKeep makes a line of our own making harmless without touching the blanks in front and between columns.
func plainKeep(text string) string {
	body := strings.TrimLeft(text, " ")
	return text[:len(text)-len(body)] + plain(body)
}
