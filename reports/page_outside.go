package reports

import (
	"fmt"
	"strings"
)

// outsideFirst is how many readings outside their hold points the first page holds; a later page lists all of more.
const outsideFirst = 4

func (r Report) outsideShort() section {
	s := section{ID: "outside", Title: "Readings taken outside a hold point"}
	rows := r.outsideRows()
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

func (r Report) outsideAll() section {
	s := section{ID: "outside-all", Title: outsideAllTitle}
	if rows := r.outsideRows(); len(rows) > outsideFirst {
		s.tabulate(outsideTable(rows))
	}
	return s
}

func outsideTable(rows [][]entry) table {
	return table{Caption: "Kept, but not taken as the safety rules ask", Heads: []string{"Test", "Where", "Shown", "When", "What was missing"}, Rows: rows}
}

// outsideRows are the readings outside their hold points; a reason that is the same as the one before is not repeated.
func (r Report) outsideRows() [][]entry {
	var rows [][]entry
	before := ""
	for _, x := range r.Outside {
		if x.Observation < 0 || x.Observation >= len(r.Case.Observations) {
			continue
		}
		o := r.Case.Observations[x.Observation]
		var parts []string
		for _, m := range x.Missing {
			parts = append(parts, fmt.Sprintf("hold point %d: %s", m.Point, m.Text))
		}
		why := strings.Join(parts, "; ")
		if why == before && why != "" {
			why = "the same"
		} else {
			before = why
		}
		rows = append(rows, cells(r.testTitle(o.Test), place(o.Part, o.Position), shown(o), moment(o.At), why))
	}
	return rows
}
