package measure

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
)

// mostBytes bounds a case file: some five thousand readings.
const mostBytes = 1 << 20

// mostSearched bounds the files in which the line of a syntax fault is searched; longer ones take the library's word.
const mostSearched = 128 << 10

// deepest bounds the nesting of a case file; the table itself is seven deep.
const deepest = 40

const byteOrderMark = "\uFEFF"

// foldedMark stands for an unquoted > while the rest of the file is read; it is of the same width.
const foldedMark = '\uE000'

// source is the text of a file with the places of its lines. The node tree's columns count characters after a
// byte order mark.
type source struct {
	raw   []byte
	start int   // length of the byte order mark
	lines []int // offset of the first byte of each line
}

// newSource finds the lines: LF, CRLF and lone CR end one, as in YAML.
func newSource(raw []byte) *source {
	s := &source{raw: raw}
	if bytes.HasPrefix(raw, []byte(byteOrderMark)) {
		s.start = len(byteOrderMark)
	}
	s.lines = []int{s.start}
	for i := s.start; i < len(raw); i++ {
		if raw[i] == '\n' || raw[i] == '\r' && (i+1 == len(raw) || raw[i+1] != '\n') {
			s.lines = append(s.lines, i+1)
		}
	}
	return s
}

// offset gives the byte of a line and column of the node tree, clipped to the text.
func (s *source) offset(line, column int) int {
	if line < 1 {
		return s.start
	}
	if line > len(s.lines) {
		return len(s.raw)
	}
	at := s.lines[line-1]
	for c := 1; c < column && at < len(s.raw); c++ {
		_, n := utf8.DecodeRune(s.raw[at:])
		at += n
	}
	return at
}

// line gives the bytes of a line without its end.
func (s *source) line(n int) []byte {
	if n < 1 || n > len(s.lines) {
		return nil
	}
	end := len(s.raw)
	if n < len(s.lines) {
		end = s.lines[n]
	}
	return bytes.TrimRight(s.raw[s.lines[n-1]:end], "\r\n")
}

// lineOf gives the number of the line that holds a byte.
func (s *source) lineOf(offset int) int {
	low, high := 0, len(s.lines)
	for high-low > 1 {
		if mid := (low + high) / 2; s.lines[mid] <= offset {
			low = mid
		} else {
			high = mid
		}
	}
	return low + 1
}

// ending gives the bytes that end lines in this file: those of its first line, LF when it has none.
func (s *source) ending() string {
	i := bytes.IndexAny(s.raw, "\r\n")
	switch {
	case i < 0 || s.raw[i] == '\n':
		return "\n"
	case i+1 < len(s.raw) && s.raw[i+1] == '\n':
		return "\r\n"
	}
	return "\r"
}

// checkText refuses what cannot be text of a case file: the first bad byte is named with its place.
func checkText(raw []byte) *Problem {
	if len(raw) > mostBytes {
		return &Problem{Line: 1, Column: 1, Message: fmt.Sprintf("the file is longer than %d MB", mostBytes>>20),
			Hint: "a case file holds one board; keep captures in files of their own"}
	}
	if bytes.HasPrefix(raw, []byte{0xFF, 0xFE}) || bytes.HasPrefix(raw, []byte{0xFE, 0xFF}) {
		return &Problem{Line: 1, Column: 1, Message: "the file is UTF-16 text", Hint: "save it as UTF-8"}
	}
	s := newSource(raw)
	for at := s.start; at < len(raw); {
		r, n := utf8.DecodeRune(raw[at:])
		if what := unfit(r, n); what != "" {
			line := s.lineOf(at)
			column := utf8.RuneCount(raw[s.lines[line-1]:at]) + 1
			return &Problem{Line: line, Column: column, Message: what, Hint: "save the file as plain UTF-8 text"}
		}
		at += n
	}
	return nil
}

// unfit names a character that has no place in a case file; "" when it has.
func unfit(r rune, width int) string {
	switch {
	case r == utf8.RuneError && width <= 1:
		return "this byte is not UTF-8 text"
	case r == '\n' || r == '\r' || r == '\t':
		return ""
	case r < 0x20 || r >= 0x7F && r < 0xA0 || r == 0xFFFE || r == 0xFFFF:
		return fmt.Sprintf("the control character U+%04X has no place in a case file", r)
	case r == 0x2028 || r == 0x2029 || r == 0xFEFF:
		return fmt.Sprintf("the invisible character U+%04X has no place here", r)
	}
	return ""
}

// document reads the one YAML document of a file. What YAML itself refuses comes back as problems; whole is false
// when only the lines above the first of them could be read, and the node is nil when nothing could.
func document(raw []byte) (node *yaml.Node, whole bool, problems Problems) {
	if p := checkText(raw); p != nil {
		return nil, false, Problems{*p}
	}
	node, err := decode(raw)
	if err == nil {
		return node, true, directives(raw)
	}
	// An unquoted > in front of a reading is the fault met most; the file is read on as if it were quoted.
	if marked := markFolded(raw); !bytes.Equal(marked, raw) {
		if node, err := decode(marked); err == nil {
			return node, true, directives(raw)
		}
	}
	p := syntaxProblem(raw, err)
	if above, err := decode(raw[:newSource(raw).lines[p.Line-1]]); err == nil && len(above.Content) > 0 {
		node = above
	}
	return node, false, Problems{p}
}

// errSecond is a second document after the first.
var errSecond = errors.New("a second document begins here")

// decode reads exactly one document. A panic of the library counts as unreadable text.
func decode(raw []byte) (node *yaml.Node, err error) {
	defer func() {
		if r := recover(); r != nil {
			node, err = nil, fmt.Errorf("yaml: the text cannot be read")
		}
	}()
	d := yaml.NewDecoder(bytes.NewReader(raw))
	node = &yaml.Node{}
	if err := d.Decode(node); err != nil {
		if errors.Is(err, io.EOF) {
			return &yaml.Node{}, nil
		}
		return nil, err
	}
	if err := d.Decode(&yaml.Node{}); !errors.Is(err, io.EOF) {
		if err == nil {
			err = errSecond
		}
		return nil, err
	}
	return node, nil
}

// directives refuses %YAML and %TAG lines, which the library reads silently.
func directives(raw []byte) Problems {
	s := newSource(raw)
	for n := 1; n <= len(s.lines); n++ {
		text := bytes.TrimSpace(s.line(n))
		if len(s.line(n)) > 0 && s.line(n)[0] == '%' {
			return Problems{{Line: n, Column: 1, Message: "YAML directives have no place in a case file",
				Hint: "take the line out"}}
		}
		if len(text) > 0 && text[0] != '#' {
			break
		}
	}
	return nil
}

// unquotedOver finds a > that begins an unquoted value.
var unquotedOver = regexp.MustCompile(`(:[ \t]+)>([ \t]*=?[ \t]*[0-9.])`)

// markFolded puts the stand-in mark for every > that begins an unquoted value outside quotes and comments.
func markFolded(raw []byte) []byte {
	out := make([]byte, 0, len(raw)+16)
	for _, line := range bytes.SplitAfter(raw, []byte("\n")) {
		last := 0
		for _, m := range unquotedOver.FindAllSubmatchIndex(line, -1) {
			if quotedAt(line, m[3]) {
				continue
			}
			out = append(out, line[last:m[3]]...)
			out = utf8.AppendRune(out, foldedMark)
			last = m[3] + 1
		}
		out = append(out, line[last:]...)
	}
	return out
}

// quotedAt tells whether a byte of a line stands inside quotes or a comment, as far as one line shows.
func quotedAt(line []byte, at int) bool {
	quote := byte(0)
	for i, c := range line[:at] {
		switch {
		case quote != 0:
			if c == quote {
				quote = 0
			}
		case c == '#' && (i == 0 || line[i-1] == ' ' || line[i-1] == '\t'):
			return true
		case (c == '"' || c == '\'') && i > 0 && bytes.IndexByte([]byte(" \t,[{"), line[i-1]) >= 0:
			quote = c
		}
	}
	return quote != 0
}

// libraryLine is how the YAML library names a line in its messages.
var libraryLine = regexp.MustCompile(`^yaml: (?:line (\d+): )?(.*)$`)

// syntaxProblem says where YAML cannot be read on, in words a technician knows.
func syntaxProblem(raw []byte, err error) Problem {
	s := newSource(raw)
	line, what := 0, err.Error()
	if m := libraryLine.FindStringSubmatch(what); m != nil {
		line, _ = strconv.Atoi(m[1])
		what = m[2]
	}
	// The library's own line can be off; the shortest beginning of the file with the same fault ends in the right one.
	if n := faultyLine(s, what, err); n > 0 {
		line = n
	}
	line = min(max(line, 1), len(s.lines))
	text := s.line(line)
	p := Problem{Line: line, Column: 1 + utf8.RuneCount(text) - utf8.RuneCount(bytes.TrimLeft(text, " \t"))}
	p.Message, p.Hint = plainSyntax(what, string(text))
	return p
}

// faultyLine finds the line at which reading first fails in the same way, 0 when that cannot be told.
func faultyLine(s *source, what string, fault error) int {
	if fault == errSecond {
		return secondLine(s)
	}
	fails := func(n int) bool {
		end := len(s.raw)
		if n < len(s.lines) {
			end = s.lines[n]
		}
		_, err := decode(s.raw[:end])
		return err != nil && strings.HasSuffix(err.Error(), what)
	}
	low, high := 0, len(s.lines)
	if len(s.raw) > mostSearched || !fails(high) {
		return 0
	}
	for high-low > 1 {
		if mid := (low + high) / 2; fails(mid) {
			high = mid
		} else {
			low = mid
		}
	}
	return high
}

// secondLine finds the mark that begins the second document.
func secondLine(s *source) int {
	content := false
	for n := 1; n <= len(s.lines); n++ {
		text := bytes.TrimSpace(s.line(n))
		mark := bytes.HasPrefix(s.line(n), []byte("---"))
		if mark && content {
			return n
		}
		content = content || mark || len(text) > 0 && text[0] != '#'
	}
	return 0
}

// plainSyntax puts a message of the YAML library into words, with what to do.
func plainSyntax(what, line string) (message, hint string) {
	has := func(parts ...string) bool {
		for _, p := range parts {
			if strings.Contains(what, p) {
				return true
			}
		}
		return false
	}
	switch {
	case what == errSecond.Error():
		return "a second document begins here; a case file holds one board", "take the line --- out, or keep a file for each case"
	case unquotedOver.MatchString(line):
		return overMessage, overHint
	case has("unknown anchor", "anchor"):
		return "an alias or anchor stands here; a case file has none", "write the value out"
	case has("undefined tag handle", "tag"):
		return "a YAML tag stands here; a case file has none", "take the word with ! out, or put the value in quotes"
	case has("directive"):
		return "a line or value begins with %, which YAML keeps for itself", "put the value in quotes"
	case has("exceeded"):
		return "the file is nested too deep", "a case file is seven deep at most"
	case has("node content"):
		return "a value is missing between commas or brackets", "take one comma out"
	case has("tab character"), has("cannot start any token") && strings.Contains(line, "\t"):
		return "a tab stands in front of the text", "indent with blanks"
	case has("cannot start any token"):
		return "a value begins with a character YAML keeps for itself (% @ ` > |)", "put the value in quotes"
	case has("mapping values are not allowed"):
		return "a colon stands inside a value, or the line is indented too far", "put a value with a colon in quotes"
	case has("',' or '}'"):
		return "the { } of this line is not closed, or a comma is missing", "check the braces and commas"
	case has("',' or ']'"):
		return "the [ ] of this line is not closed, or a comma is missing", "check the brackets and commas"
	case has("unexpected end of stream", "quoted scalar"):
		return "a quote is opened and not closed", "close it with the same quote"
	case has("did not find expected key", "<document start>", "could not find expected ':'", "block mapping", "expected '-' indicator"):
		return "the line does not fit the lines around it: wrong indentation, or a colon is missing", "line it up with its neighbours"
	}
	return "the text is not YAML here: " + what, "compare the line with the example"
}

const (
	overMessage = "a value that begins with > is not a reading in YAML"
	overHint    = "quote it, '> 20 MΩ', or write above 20 MΩ"
)
