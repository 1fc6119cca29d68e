package reports

import (
	"io"
	"strconv"
	"strings"
	"time"

	"drivemend/diagnose/safety"
)

// Withheld prints which hold points withhold an instruction, and what to do about each.
func Withheld(w io.Writer, what string, missing []safety.Missing, at time.Time, style Style) error {
	s := newScreen(style)
	s.hang(danger, "WITHHELD  ", what)
	writeMissing(s, missing)
	s.say(neutral, "At "+moment(at)+". Local codes and licensed practice come first.")
	return s.write(w)
}

// Missing prints what is missing at the hold points, one condition a line with what to do about it.
func Missing(w io.Writer, missing []safety.Missing, style Style) error {
	s := newScreen(style)
	writeMissing(s, missing)
	return s.write(w)
}

func writeMissing(s *screen, missing []safety.Missing) {
	for _, m := range missing {
		writeLack(s, "point "+strconv.Itoa(m.Point), lackOf(m.Text, m.Unlock))
	}
}

// lack is one thing missing: what it is about, its conditions with what to do about each, and what to do in the end.
type lack struct {
	about      string
	conditions []condition
	do         []string
}

// condition is one of several that are missing together; do is empty where only all of them together have something to do.
type condition struct{ what, do string }

// leastConditions is from how many parts on a text is taken as a list of conditions.
const leastConditions = 3

// statement is how a text begins that says what a statement before a step lacks, be it one condition.
const statement = "before "

// lackOf takes a text that puts several conditions in one line apart, with what to do about each where there is one
// thing to do for each; the last thing to do is for all of them.
func lackOf(text, unlock string) lack {
	parts, dos := clauses(text), clauses(unlock)
	if len(parts) < leastConditions && !strings.HasPrefix(text, statement) {
		return lack{about: text, do: dos}
	}
	about, first := splitLead(parts[0])
	parts[0] = first
	out := lack{about: about, do: dos}
	for _, p := range parts {
		out.conditions = append(out.conditions, condition{what: p})
	}
	if len(dos) == len(parts)+1 {
		for i := range parts {
			out.conditions[i].do = dos[i]
		}
		out.do = []string{strings.TrimPrefix(dos[len(parts)], "then ")}
	}
	return out
}

// splitLead takes what a list is about off its first condition: "before the full bus: it takes a guard".
func splitLead(text string) (about, first string) {
	for _, mark := range []string{": it takes ", ": "} {
		if lead, rest, found := strings.Cut(text, mark); found {
			return lead + strings.TrimRight(mark, " "), rest
		}
	}
	return "", text
}

// clauses splits a text at its semicolons, except within brackets; an alternative stays with what it is one to.
func clauses(text string) []string {
	var out []string
	depth, from := 0, 0
	for i := 0; i < len(text); i++ {
		switch {
		case text[i] == '(':
			depth++
		case text[i] == ')' && depth > 0:
			depth--
		case depth == 0 && strings.HasPrefix(text[i:], "; ") && !strings.HasPrefix(text[i:], "; or "):
			out, from = append(out, text[from:i]), i+2
		}
	}
	return append(out, text[from:])
}

// writeLack writes what is missing behind a label, then what to do.
func writeLack(s *screen, label string, l lack) {
	s.item(caution, label, l.about)
	for _, c := range l.conditions {
		if l.about == "" {
			s.item(caution, label, "- "+c.what)
			label = ""
		} else {
			s.hang(caution, strings.Repeat(" ", labelColumns)+"- ", c.what)
		}
		if c.do != "" {
			s.hang(mandatory, strings.Repeat(" ", labelColumns)+"  → ", c.do)
		}
	}
	label = "do this"
	for _, do := range l.do {
		s.item(mandatory, label, do)
		label = ""
	}
}
