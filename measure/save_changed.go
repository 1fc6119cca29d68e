package measure

import (
	"fmt"
	"strings"
)

// ChangedError tells that a case file is not what it was when it was read: another program or an editor wrote to it.
type ChangedError struct {
	Path  string
	What  []string // what changed, one thing an entry
	Gone  bool     // the file was taken away
	There bool     // a file stands where a new case was to be written
}

// Error says what changed and what to do.
func (e *ChangedError) Error() string {
	switch {
	case e.There:
		return e.Path + ": something of this name is there already; nothing was written, choose another name"
	case e.Gone:
		return e.Path + ": the file was moved or removed since it was read; nothing was written, put it back in its place and try again"
	}
	return e.Path + ": the file was changed since it was read: " + strings.Join(e.What, "; ") +
		"; nothing was written, read it again and repeat the entry"
}

// whatChanged names the lines that differ and the observations that came or went.
func whatChanged(before, after []byte) []string {
	x, y := splitLines(before), splitLines(after)
	head := 0
	for head < len(x) && head < len(y) && x[head] == y[head] {
		head++
	}
	tail := 0
	for tail < len(x)-head && tail < len(y)-head && x[len(x)-1-tail] == y[len(y)-1-tail] {
		tail++
	}
	out := []string{changedLines(head, len(x)-head-tail, len(y)-head-tail)}
	old, errOld := Parse("", before)
	now, errNow := Parse("", after)
	if errNow != nil {
		return append(out, "as it stands now it does not load")
	}
	if errOld != nil {
		return out
	}
	if n := len(now.Case.Observations) - len(old.Case.Observations); n > 0 {
		var tests []string
		for _, o := range now.Case.Observations[len(old.Case.Observations):] {
			tests = append(tests, o.Test)
		}
		out = append(out, countOf(n, "observation")+" added: "+strings.Join(tests, ", "))
	} else if n < 0 {
		out = append(out, countOf(-n, "observation")+" taken out")
	}
	return out
}

// changedLines names a run of lines after the first head ones.
func changedLines(head, before, after int) string {
	lines := func(n int) string {
		if n == 1 {
			return fmt.Sprintf("line %d", head+1)
		}
		return fmt.Sprintf("lines %d to %d", head+1, head+n)
	}
	switch {
	case before == 0:
		return lines(after) + " added"
	case after == 0:
		return lines(before) + " taken out"
	}
	return lines(max(before, after)) + " changed"
}

// splitLines cuts a text into lines with their ends.
func splitLines(raw []byte) []string { return strings.SplitAfter(string(raw), "\n") }
