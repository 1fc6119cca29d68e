package reports

import (
	"fmt"
	"slices"
	"time"

	"drivemend/diagnose/safety"
)

// What the first page holds of the readings and steps outside their hold points: so many of either, and of each so much
// of what was missing; a later page lists all.
const (
	outsideFirst   = 4
	outsideReasons = 2
)

func (r Report) outsideShort() section {
	s := section{ID: "outside", Title: "Readings and steps outside a hold point"}
	readings, steps := r.outsideReadings(), r.outsideSteps()
	if len(readings)+len(steps) == 0 {
		s.say(neutral, "", "None on record.")
		return s
	}
	shown := slices.Concat(readings[:min(len(readings), outsideFirst)], steps[:min(len(steps), outsideFirst)])
	t := outsideTable(shown, shortMissing)
	if more := len(readings) + len(steps) - len(shown); more > 0 {
		t.Rows = append(t.Rows, cells(fmt.Sprintf("and %d more, listed under: %s", more, outsideAllTitle), "", "", "", ""))
	}
	s.tabulate(t)
	return s
}

const outsideAllTitle = "All readings and steps outside a hold point"

// outsideAll lists every one with everything that was missing, where the first page does not.
func (r Report) outsideAll() section {
	s := section{ID: "outside-all", Title: outsideAllTitle}
	readings, steps := r.outsideReadings(), r.outsideSteps()
	all := slices.Concat(readings, steps)
	cut := slices.ContainsFunc(all, func(x outsideEntry) bool { return shortMissing(x.missing) != allMissing(x.missing) })
	if max(len(readings), len(steps)) > outsideFirst || cut {
		s.tabulate(outsideTable(all, allMissing))
	}
	return s
}

// outsideEntry is a reading or a step of the record outside its hold point.
type outsideEntry struct {
	what, where, shown string
	at                 time.Time
	missing            []safety.Missing
}

// outsideTable sets them out, each with its reasons in words; a reason that is the same as the one before is not repeated.
func outsideTable(entries []outsideEntry, words func([]safety.Missing) string) table {
	t := table{Caption: "Kept, but not taken or done as the safety rules ask", Heads: []string{"Test or step", "Where", "Shown", "When", "What was missing"}}
	before := ""
	for _, x := range entries {
		why := words(x.missing)
		if why == before && why != "" {
			why = "the same"
		} else {
			before = why
		}
		t.Rows = append(t.Rows, cells(x.what, x.where, x.shown, moment(x.at), why))
	}
	return t
}

func (r Report) outsideReadings() []outsideEntry {
	var out []outsideEntry
	for _, x := range r.Outside {
		if x.Observation < 0 || x.Observation >= len(r.Case.Observations) {
			continue
		}
		o := r.Case.Observations[x.Observation]
		out = append(out, outsideEntry{r.testTitle(o.Test), place(o.Part, o.Position), r.shown(o), o.At, x.Missing})
	}
	return out
}

func (r Report) outsideSteps() []outsideEntry {
	var out []outsideEntry
	for _, x := range r.OutsideSteps {
		if x.Entry < 0 || x.Entry >= len(r.Case.Steps) {
			continue
		}
		e := r.Case.Steps[x.Entry]
		out = append(out, outsideEntry{"Step: " + r.stepTitle(e.Step), "record", r.resultWords(x.Entry), e.At, x.Missing})
	}
	return out
}

// allMissing puts everything that was missing in words.
func allMissing(missing []safety.Missing) string { return missingWords(missing, len(missing)) }

// longReason is how many columns a reason takes on the first page before its details are left to a later one.
const longReason = 80

// shortMissing names the first things that were missing, long ones without their details.
func shortMissing(missing []safety.Missing) string {
	short := slices.Clone(missing)
	for i := range short {
		if columns(short[i].Text) > longReason {
			short[i].Text = clause(short[i].Text)
		}
	}
	return missingWords(short, outsideReasons)
}

func missingWords(missing []safety.Missing, most int) string {
	var parts []string
	for _, m := range missing {
		parts = append(parts, fmt.Sprintf("hold point %d: %s", m.Point, m.Text))
	}
	return someOf(parts, most, "; ")
}
