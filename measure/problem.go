package measure

import (
	"fmt"
	"sort"
	"strings"
)

// mostProblems is how many faults of one file are listed; a longer list is not read at the bench.
const mostProblems = 20

// Problem is one fault of a file.
type Problem struct {
	File         string
	Line, Column int    // 1-based, column in characters; 0 when the fault has no place in a file
	Key          string // dotted path, "" when none
	Message      string // what is wrong and what was expected
	Hint         string // what to do, nearest valid key; may be ""
}

// String gives the fault in one line: file:line:column: key: message; hint.
func (p Problem) String() string {
	var b strings.Builder
	if p.File != "" {
		b.WriteString(p.File)
		if p.Line > 0 {
			fmt.Fprintf(&b, ":%d:%d", p.Line, p.Column)
		}
		b.WriteString(": ")
	}
	if p.Key != "" {
		b.WriteString(p.Key + ": ")
	}
	b.WriteString(p.Message)
	if p.Hint != "" {
		b.WriteString("; " + p.Hint)
	}
	return b.String()
}

// Problems is an error listing faults in file order, at most twenty; a last entry without a line tells how many
// more there are.
type Problems []Problem

// Error gives one fault a line.
func (ps Problems) Error() string {
	lines := make([]string, len(ps))
	for i, p := range ps {
		lines[i] = p.String()
	}
	return strings.Join(lines, "\n")
}

// sorted gives the faults in file order, cut to the twenty that are listed; nil when there is none.
func (ps Problems) sorted(file string) Problems {
	if len(ps) == 0 {
		return nil
	}
	out := append(Problems(nil), ps...)
	sort.SliceStable(out, func(i, j int) bool {
		if out[i].Line != out[j].Line {
			return out[i].Line < out[j].Line
		}
		return out[i].Column < out[j].Column
	})
	for i := range out {
		out[i].File = file
	}
	if more := len(out) - mostProblems; more > 0 {
		out = append(out[:mostProblems], Problem{File: file,
			Message: fmt.Sprintf("%s more; mend these first", countOf(more, "problem"))})
	}
	return out
}

// placeless gives the faults without file and place, for a change that was refused before it reached a file.
func (ps Problems) placeless() Problems {
	out := append(Problems(nil), ps...)
	for i := range out {
		out[i].File, out[i].Line, out[i].Column = "", 0, 0
	}
	return out
}

// countOf gives "1 problem", "3 problems".
func countOf(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}
