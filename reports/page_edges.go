package reports

import (
	"fmt"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure/quantity"
)

// edges are the predicted edges before and after, as figures and in numbers, with what follows from them.
func (r Report) edges() section {
	s := section{ID: "edges", Title: "What the switch saw, and what the rebuild will see"}
	m := r.Margin
	if m == nil || m.AsFound == nil && m.Rebuild == nil {
		return s
	}
	for _, g := range drawnFigures(m) {
		if svg, err := g.svg(m); err == nil {
			s.Blocks = append(s.Blocks, block{Figure: &picture{svg, g.words(m)}})
		}
	}
	boards := boardsOf(r.Case, m)
	s.tabulate(sideBySide("Peaks at the chip, gate-limited edges unless it says cut. Worst case: highest bus and worst current; running: nominal bus and running current", "Figure", boards, rowsOf(peakRows(boards), boards)))
	for _, b := range boards {
		s.verdictOf(m, b)
	}
	s.follows(boards)
	s.tabulate(keyPoints(m))
	s.losses(boards)
	if rows := rowsOf(dutyRows, boards); len(rows) > 0 {
		s.tabulate(sideBySide("What the network goes through in each PWM cycle, at nominal bus and running current", "Figure", boards, rows))
	}
	return s
}

// sideBySide is a table with a column for each board.
func sideBySide(caption, head string, boards []marginBoard, rows [][]entry) table {
	t := table{Caption: caption, Heads: []string{head}, Rows: rows}
	for _, b := range boards {
		t.Heads = append(t.Heads, capital(b.name))
	}
	return t
}

// verdictOf says how a board is graded, on what that rests, and what its absolute corner would need.
func (s *section) verdictOf(m *stress.Margin, b marginBoard) {
	if b.f == nil {
		return
	}
	s.say(verdictTone(b.f.Verdict), capital(b.name)+". "+verdictWords(b.f.Verdict)+".", strings.Join(b.f.Rests, "; ")+restWords(m, b.f))
	if b.f.Worst.Peak > 0 {
		s.say(neutral, capital(b.name)+", absolute corner.", volts(b.f.Worst.Peak)+" would need: "+cornerWords(b.f.Worst.Corner)+".")
	}
}

// follows are avalanche, clamp, reservoir, last part and measured edge, with a word on what they mean.
func (s *section) follows(boards []marginBoard) {
	rows := rowsOf(followRows, boards)
	if len(rows) == 0 {
		return
	}
	s.tabulate(sideBySide("What follows from the peaks", "Figure", boards, rows))
	for _, b := range boards {
		if b.f == nil {
			continue
		}
		if a := b.f.Avalanche; a != nil {
			s.say(avalancheTone(a), capital(b.name)+", avalanche.", avalancheSentence(a))
		}
		if b.f.PumpUp != nil {
			s.say(danger, capital(b.name)+", reservoir.", "The tie that should empty the reservoir into the bus is open: every edge adds charge to it, and what comes after the first edge is higher than the peaks above.")
		}
	}
}

func avalancheTone(a *stress.Avalanched) tone {
	if a.EveryCycle || a.OverEnergy || a.OverCurrent {
		return danger
	}
	return caution
}

// avalancheSentence says in plain words what avalanche means for the switch.
func avalancheSentence(a *stress.Avalanched) string {
	text := fmt.Sprintf("The voltage would rise to %s, but the switch breaks down at %s and turns the rest into heat in itself: %s in each edge, all of it in the one device that breaks down first.",
		volts(a.Prospective), volts(a.Volt), quantity.Format(a.Energy, quantity.Joule))
	if a.EveryCycle {
		text += " It does so in every PWM cycle, which no rating allows."
	}
	return text
}

// keyPoints are the drawn edges in numbers.
func keyPoints(m *stress.Margin) table {
	t := table{Caption: "Key points of the drawn edges", Heads: []string{"Board and edge", "Bus, current", "Peak", "At", "Mean slope 10 to 90 %", "Ring", "Damping", "Surge"},
		Numeric: []bool{false, false, true, true, true, true, true, true}}
	for _, g := range drawnFigures(m) {
		for _, x := range g.edges {
			e := x.edge
			ring, damping := "none", "none"
			if e.Ring > 0 {
				ring, damping = quantity.Format(e.Ring, quantity.Hertz), dampingWords(e.Damping)
			}
			t.Rows = append(t.Rows, cells(x.name+", "+edgeAndShape(e), atEdge(e), volts(e.Peak), quantity.Format(e.PeakTime, quantity.Second),
				quantity.Format(e.Slope, quantity.VoltPerSecond), ring, damping, orNothing(e.Surge, quantity.Ampere)))
		}
	}
	return t.withoutEmptyColumns()
}

// losses are what the elements take up in each edge.
func (s *section) losses(boards []marginBoard) {
	var rows [][]entry
	for _, name := range edgeNames(boards) {
		rows = append(rows, rowsOf(lossRows(edgeShort(name)+": ", name, boards), boards)...)
	}
	if len(rows) > 0 {
		s.tabulate(sideBySide("Energy that each part takes up in an edge, at nominal bus and running current"+wattWords(boards), "Edge and part", boards, rows))
	}
}
