package reports

import (
	"fmt"
	"math"

	"drivemend/diagnose/safety"
)

// What the first page holds of the readings outside their hold points: so many of them, and of each so much of what
// was missing; a later page lists all.
const (
	outsideFirst   = 4
	outsideReasons = 2
)

func (r Report) outsideShort() section {
	s := section{ID: "outside", Title: "Readings taken outside a hold point"}
	rows, _ := r.outsideRows(outsideReasons)
	if len(rows) == 0 {
		s.say(neutral, "", "None on record.")
		return s
	}
	t := outsideTable(rows[:min(len(rows), outsideFirst)])
	if more := len(rows) - outsideFirst; more > 0 {
		t.Rows = append(t.Rows, cells(fmt.Sprintf("and %d more, listed under: %s", more, outsideAllTitle), "", "", "", ""))
	}
	s.tabulate(t)
	return s
}

const outsideAllTitle = "All readings outside a hold point"

// outsideAll lists every reading with everything that was missing, where the first page does not.
func (r Report) outsideAll() section {
	s := section{ID: "outside-all", Title: outsideAllTitle}
	rows, most := r.outsideRows(math.MaxInt)
	if len(rows) > outsideFirst || most > outsideReasons {
		s.tabulate(outsideTable(rows))
	}
	return s
}

func outsideTable(rows [][]entry) table {
	return table{Caption: "Kept, but not taken as the safety rules ask", Heads: []string{"Test", "Where", "Shown", "When", "What was missing"}, Rows: rows}
}

// outsideRows are the readings outside their hold points, each with so many reasons; a reason that is the same as the
// one before is not repeated. most is the largest number of reasons that one of them has.
func (r Report) outsideRows(reasons int) (rows [][]entry, most int) {
	before := ""
	for _, x := range r.Outside {
		if x.Observation < 0 || x.Observation >= len(r.Case.Observations) {
			continue
		}
		o := r.Case.Observations[x.Observation]
		most = max(most, len(x.Missing))
		why := missingWords(x.Missing, reasons)
		if why == before && why != "" {
			why = "the same"
		} else {
			before = why
		}
		rows = append(rows, cells(r.testTitle(o.Test), place(o.Part, o.Position), r.shown(o), moment(o.At), why))
	}
	return rows, most
}

func missingWords(missing []safety.Missing, most int) string {
	var parts []string
	for _, m := range missing {
		parts = append(parts, fmt.Sprintf("hold point %d: %s", m.Point, m.Text))
	}
	return someOf(parts, most, "; ")
}
