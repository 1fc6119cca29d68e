package reports

import (
	"fmt"
	"slices"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// marginBoard is one board of a margin: as found, or the rebuild.
type marginBoard struct {
	name  string
	f     *stress.Figures // nil when it cannot be worked out
	hertz float64         // of its PWM; 0 when not stated
}

// boardsOf are the boards of a margin, the one as found first; the rebuild stands only where it has figures. The case
// tells the PWM frequency; without one there are no watts.
func boardsOf(c *measure.Case, m *stress.Margin) []marginBoard {
	out := []marginBoard{{"as found", m.AsFound, 0}}
	if c != nil {
		out[0].hertz = hertzOf(c.Board)
	}
	if m.Rebuild == nil {
		return out
	}
	rebuild := marginBoard{"rebuild", m.Rebuild, 0}
	if c != nil && c.Rebuild != nil {
		rebuild.hertz = hertzOf(c.Rebuild.Board)
	}
	return append(out, rebuild)
}

func hertzOf(b measure.Board) float64 {
	q, _ := b.Quantity("pwm.frequency")
	return q.Value
}

// marginRow is one row of the margin: what it is, and how it reads on a board; a cell without text has nothing to say.
type marginRow struct {
	name string
	cell func(b marginBoard) entry
}

func textCell(text func(f *stress.Figures) string) func(marginBoard) entry {
	return func(b marginBoard) entry { return entry{Text: text(b.f)} }
}

// row gives a row its cells, one for each board; none when no board has anything to say.
func (r marginRow) row(boards []marginBoard) []entry {
	out, said := []entry{{Text: r.name}}, false
	for _, b := range boards {
		cell := entry{Text: "not known"}
		if b.f != nil {
			cell = r.cell(b)
			said = said || cell.Text != ""
		}
		if cell.Text == "" {
			cell.Text = "none"
		}
		out = append(out, cell)
	}
	if !said {
		return nil
	}
	return out
}

// rowsOf gives the rows that have something to say.
func rowsOf(rows []marginRow, boards []marginBoard) [][]entry {
	var out [][]entry
	for _, r := range rows {
		if cells := r.row(boards); cells != nil {
			out = append(out, cells)
		}
	}
	return out
}

// The names of the edges, as a case and the JSON have them.
const (
	turnOff   = "turn-off"
	turnOn    = "turn-on"
	allOff    = "all-off"
	cutShape  = "cut"
	gateShape = "gate-limited"
	atDiode   = "freewheel" // the place of a chopper's closing edge
)

// edgeWords names an edge in full.
func edgeWords(name, position string) string {
	switch {
	case name == turnOn && position == atDiode:
		return "turn-on, at the freewheel diode"
	case name == turnOn:
		return "turn-on of the opposite switch"
	case name == allOff:
		return "all gates off at once"
	}
	return name
}

// edgeShort names an edge in a narrow cell.
func edgeShort(name string) string {
	switch name {
	case turnOn:
		return "opposite closes"
	case allOff:
		return "all gates off"
	}
	return name
}

// peakRows stand in the order of what decides: what is there, how it is graded, what its edges do in the worst case
// (highest bus, worst current) and in running (nominal bus, running current).
func peakRows(boards []marginBoard) []marginRow {
	return []marginRow{
		{"network", textCell(func(f *stress.Figures) string { return networkWords(f.Network) })},
		{"position", textCell(positionWords)},
		{"verdict", func(b marginBoard) entry {
			return entry{strings.ToUpper(string(b.f.Verdict)), verdictTone(b.f.Verdict)}
		}},
		{"99.9th percentile / rating", textCell(p999Cell)},
		{"rating, coldest junction", textCell(func(f *stress.Figures) string { return volts(f.Rated) })},
		{"worst edge", textCell(worstEdge)},
		peakRow("worst case", boards, func(f *stress.Figures) *stress.Edge { return f.Highest }),
		peakRow("running", boards, func(f *stress.Figures) *stress.Edge { return f.Nominal }),
		peakRow("cut edge", boards, func(f *stress.Figures) *stress.Edge { return f.Cut }),
		peakRow("short circuit", boards, func(f *stress.Figures) *stress.Edge { return f.ShortCircuit }),
		{"absolute corner", textCell(cornerPeak)},
		{"closing, at freewheel diode", textCell(diodePeak)},
	}
}

// positionWords is the position with those whose figures are the same.
func positionWords(f *stress.Figures) string {
	var alike []string
	for _, p := range f.Alike {
		if p != f.Position {
			alike = append(alike, p)
		}
	}
	if len(alike) == 0 {
		return f.Position
	}
	return f.Position + "; alike: " + strings.Join(alike, ", ")
}

func p999Cell(f *stress.Figures) string {
	if f.P999.Samples == 0 {
		return "not computed"
	}
	if !(f.Rated > 0) {
		return volts(f.P999.Peak)
	}
	return volts(f.P999.Peak) + ", " + shareWords(f.P999.Peak/f.Rated)
}

func worstEdge(f *stress.Figures) string {
	if f.Highest == nil {
		return "not computed"
	}
	return edgeWords(f.Highest.Name, f.Highest.Position)
}

// peakRow is a row of peaks. Bus and current stand in its name where they are the same for all boards, else in the
// cells; the edge stands there unless all of them are openings.
func peakRow(name string, boards []marginBoard, pick func(f *stress.Figures) *stress.Edge) marginRow {
	conditions, named := map[string]bool{}, false
	for _, b := range boards {
		if b.f == nil || pick(b.f) == nil {
			continue
		}
		e := pick(b.f)
		conditions[atEdge(e)] = true
		named = named || e.Name != turnOff
	}
	hoist := len(conditions) == 1
	if hoist {
		for at := range conditions {
			name = strings.TrimSuffix(name+", "+at, ", ")
		}
	}
	return marginRow{name, textCell(func(f *stress.Figures) string {
		e := pick(f)
		switch {
		case e == nil:
			return ""
		case named:
			return strings.TrimSpace(volts(e.Peak) + ", " + edgeShort(e.Name) + elseAt(e, hoist))
		}
		return volts(e.Peak) + elseAt(e, hoist)
	})}
}

func elseAt(e *stress.Edge, hoist bool) string {
	if hoist || atEdge(e) == "" {
		return ""
	}
	return " at " + atEdge(e)
}

// atEdge is the bus and the current of an edge.
func atEdge(e *stress.Edge) string {
	if e.Bus <= 0 {
		return ""
	}
	return volts(e.Bus) + ", " + quantity.Format(e.Current, quantity.Ampere)
}

func cornerPeak(f *stress.Figures) string {
	switch {
	case f.Worst.Peak == 0:
		return "not computed"
	case f.Worst.Shape == cutShape && f.Worst.Edge == turnOff:
		return volts(f.Worst.Peak) + ", cut edge"
	case f.Worst.Shape == cutShape:
		return volts(f.Worst.Peak) + ", cut, " + edgeShort(f.Worst.Edge)
	}
	return strings.TrimSuffix(volts(f.Worst.Peak)+", "+edgeShort(f.Worst.Edge), ", ")
}

// diodePeak is the closing edge of a chopper. Its peak stands at the diode, whose rating a case does not state.
func diodePeak(f *stress.Figures) string {
	for _, e := range f.Edges {
		if e.Name == turnOn && e.Position == atDiode {
			return volts(e.Peak) + " there, not graded"
		}
	}
	return ""
}

// percentileWords says how a percentile further out than the draws reach was come by.
func percentileWords(f *stress.Figures) string {
	if f.P999.Samples == 0 {
		return "percentile not computed"
	}
	return fmt.Sprintf("99.9th percentile, tail fitted to %d draws", f.P999.Samples)
}

// edgeNames are the edges of all boards, in their order.
func edgeNames(boards []marginBoard) []string {
	var out []string
	for _, b := range boards {
		if b.f == nil {
			continue
		}
		for _, e := range b.f.Edges {
			if !slices.Contains(out, e.Name) {
				out = append(out, e.Name)
			}
		}
	}
	return out
}

// edgeOfBoard is an edge of a board at nominal bus and running current; nil without one.
func edgeOfBoard(f *stress.Figures, name string) *stress.Edge {
	if f == nil {
		return nil
	}
	for _, e := range f.Edges {
		if e.Name == name {
			return e
		}
	}
	return nil
}
