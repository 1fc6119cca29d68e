package reports

import (
	"fmt"
	"io"
	"math"
	"strings"

	"drivemend/diagnose"
	"drivemend/measure"
)

// shared is how far a finding's weight and its weight beside all others may differ before it is marked.
const shared = 3.0

var whyColumns = []column{{title: "finding"}, {title: "shown", width: 16}, {title: "from", width: 9}, {title: "dB", width: 6, right: true}, {title: "alone", width: 6, right: true}}

// Why prints what speaks for and against the line r.About, in decibans that add up from its starting to its present
// odds. Findings taken outside a hold point carry an asterisk.
func Why(w io.Writer, c *measure.Case, r *diagnose.Ranking, style Style, beside ...Beside) error {
	s, known := newScreen(style), besides(beside).of(c)
	s.ends(strong, c.ID, "why: "+aboutTitle(r), answers(c))
	s.grid(whyColumns, whyRows(r.Findings, known))
	s.add(whyColumns, []entry{{Text: "sum"}, {}, {}, {decibans(sumOf(r.Findings)), strong}})
	s.blank()
	s.say(neutral, oddsWords(r))
	s.say(neutral, "10 dB is a factor of ten in the odds. dB: in the order of the table. alone: with every other finding already known; where the two differ by more than 3 dB the finding says much the same as others (shared).")
	writeAssumedFindings(s, r.Findings)
	writeDoubts(s, c, r, known, func(id string) string { return titleOf(r, id) })
	s.say(neutral, beliefShort)
	return s.write(w)
}

func whyRows(findings []diagnose.Finding, known Beside) [][]entry {
	var rows [][]entry
	for _, f := range findings {
		name := known.name(f)
		if f.Seen == "on-arrival" || f.Seen == "by-cure" {
			name += ", " + seen(f.Seen)
		}
		if isShared(f) {
			name += " (shared)"
		}
		rows = append(rows, []entry{{Text: name}, {Text: fit(plain(known.shown(f)), 64)}, {Text: f.Source}, {Text: decibans(f.Decibans)}, {Text: decibans(f.Alone)}})
	}
	if len(rows) == 0 {
		rows = [][]entry{{{Text: "no finding counts yet"}}}
	}
	return rows
}

func isShared(f diagnose.Finding) bool { return math.Abs(f.Decibans-f.Alone) > shared }

func sumOf(findings []diagnose.Finding) float64 {
	sum := 0.0
	for _, f := range findings {
		sum += f.Decibans
	}
	return sum
}

// oddsWords shows that the sum leads from the starting odds to the present ones.
func oddsWords(r *diagnose.Ranking) string {
	before, known := priorOf(r, r.About)
	line, ok := lineOf(r, r.About)
	now := line.Probability
	if r.About == "unlisted" {
		before, now, known, ok = r.UnlistedPrior, r.Unlisted, true, true
	}
	switch {
	case !ok:
		return ""
	case !known:
		return "It stands at " + percent(now) + "."
	}
	return fmt.Sprintf("It started at %s (%s dB) and stands at %s (%s dB): the sum of the findings.",
		percent(before), decibans(oddsOf(before)), percent(now), decibans(oddsOf(now)))
}

func writeAssumedFindings(s *screen, findings []diagnose.Finding) {
	for _, f := range findings {
		if len(f.Assumed) > 0 {
			s.say(caution, findingName(f)+" rests on assumed values: "+strings.Join(f.Assumed, ", ")+".")
		}
	}
}
