package reports

import (
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"drivemend/diagnose/safety"
	"drivemend/measure/quantity"
)

// Discharge prints how the board is made dead. What is done stands at the end, where a terminal stops scrolling, with the
// cautions right above it; the figures, and the limits of every source side by side, come first. Of a plan that must not
// be carried out it prints why, and neither resistor nor times nor steps.
func Discharge(w io.Writer, p *safety.Plan, style Style) error {
	s := newScreen(style)
	s.head("STORED", storedTotal(p))
	s.grid(chargeColumns, chargeRows(p))
	writeTaken(s, p)
	withheld := len(p.Withheld) > 0
	if !withheld {
		writeResistor(s, p)
		writeTimes(s, p)
	}
	writeWanted(s, p.Needs)
	writeLimits(s, p.Limits)
	s.head("CAUTION", "")
	for _, c := range p.Cautions {
		s.hang(caution, " ! ", c.Text+basisOf(c))
	}
	if withheld {
		s.hang(danger, "WITHHELD  ", "the steps of this discharge")
		writeMissing(s, p.Withheld)
	} else {
		writeSteps(s, p)
	}
	return s.write(w)
}

// mostEnergy is what the board can hold with every capacitance at the top of its interval.
func mostEnergy(p *safety.Plan) string {
	return quantity.Format(max(p.WorstEnergyJ, p.TotalEnergyJ), quantity.Joule)
}

func storedTotal(p *safety.Plan) string {
	text := quantity.Format(p.TotalEnergyJ, quantity.Joule) + " in all"
	if p.WorstEnergyJ > p.TotalEnergyJ {
		text += ", " + mostEnergy(p) + " with every capacitance at the top of its interval"
	}
	return text
}

func writeSteps(s *screen, p *safety.Plan) {
	s.head("STEPS", "")
	for i, step := range p.Steps {
		text := step.Text
		if !strings.HasPrefix(text, step.Point) {
			text = step.Point + ": " + text
		}
		s.hang(mandatory, pad(strconv.Itoa(i+1), 3), text)
	}
}

var chargeColumns = []column{{title: "store", width: 11}, {title: "what"}, {title: "up to", width: 7, right: true}, {title: "holds", width: 8, right: true}, {title: "charge", width: 8, right: true}, {title: "energy", width: 8, right: true}, {title: "known", width: 8}}

// chargeRows are the rows of the stores with their charge.
func chargeRows(p *safety.Plan) [][]entry {
	rows := storeRows(p)
	for i, d := range p.Stores {
		charge := ""
		if d.Store.Capacitance.Basis != safety.None {
			charge = quantity.Format(d.Store.ChargeC, quantity.Coulomb)
		}
		rows[i] = slices.Insert(rows[i], 4, entry{Text: charge})
	}
	return rows
}

func storeRows(p *safety.Plan) [][]entry {
	var rows [][]entry
	for _, d := range p.Stores {
		st := d.Store
		holds, energy := "", ""
		if st.Capacitance.Basis != safety.None {
			holds, energy = quantity.Format(st.Capacitance.Value, quantity.Farad), quantity.Format(st.EnergyJ, quantity.Joule)
		}
		rows = append(rows, []entry{{Text: st.Point}, {Text: storeTitle(st)}, {Text: volts(st.Voltage.Value)}, {Text: holds}, {Text: energy}, knownWord(st)})
	}
	return rows
}

func storeTitle(st safety.Store) string {
	if st.PartOf != "" {
		return st.Title + " (part of " + st.PartOf + ")"
	}
	return st.Title
}

func knownWord(st safety.Store) entry {
	switch {
	case st.ToCheck:
		return entry{"to check", caution}
	case st.Known():
		return entry{"stated", neutral}
	}
	return entry{"assumed", caution}
}

// writeTaken says first of all where the plan is made for a worst case.
func writeTaken(s *screen, p *safety.Plan) {
	if len(p.Stores) == 0 {
		return
	}
	bus := p.Stores[0].Store
	for _, f := range []safety.Figure{bus.Voltage, bus.Capacitance} {
		because := f.Because
		if because == "" {
			because = "the worst case of such a board"
		}
		switch f.Basis {
		case safety.Assumed:
			s.item(caution, "assumed", quantity.Format(f.Value, f.Unit)+": "+because)
		case safety.Measured:
			s.item(caution, "read", quantity.Format(f.Value, f.Unit)+": "+because)
		}
	}
}

func writeResistor(s *screen, p *safety.Plan) {
	r := p.Resistor
	text := quantity.Format(r.Ohm, quantity.Ohm)
	if r.Series > 1 {
		text += " as " + strconv.Itoa(r.Series) + " × " + quantity.Format(r.EachOhm, quantity.Ohm) + " in series, each body good for " + volts(r.EachV)
	} else if r.EachV > 0 {
		text += ", its body good for " + volts(r.EachV)
	}
	if r.Given {
		text += " (as given)"
	}
	s.item(strong, "resistor", text+", at least "+quantity.Format(r.RatedW, quantity.Watt))
	text = "first moment " + quantity.Format(r.PeakA, quantity.Ampere) + " and " + quantity.Format(r.PeakW, quantity.Watt)
	if r.AverageW > 0 {
		text += ", on average " + quantity.Format(r.AverageW, quantity.Watt) + " over the first " + quantity.Format(p.TimeConstantS, quantity.Second)
	}
	s.item(strong, "", text+"; takes "+quantity.Format(r.JoulesJ, quantity.Joule)+unevenWords(r))
	for _, n := range r.Notes {
		s.item(caution, "", n)
	}
}

func unevenWords(r safety.Resistor) string {
	if r.UnevenJ <= r.JoulesJ {
		return ""
	}
	return ", " + quantity.Format(r.UnevenJ, quantity.Joule) + " if one half of the bank holds the whole voltage"
}

var timeColumns = []column{{title: "store"}, {title: "to 60 V", width: 10, right: true}, {title: "to 50 V", width: 10, right: true}, {title: "to 5 V", width: 10, right: true}, {title: "leave on", width: 10, right: true}}

func writeTimes(s *screen, p *safety.Plan) {
	s.head("TIMES", "through "+quantity.Format(p.Resistor.Ohm, quantity.Ohm)+", highest capacitance; lower bounds, never a proof")
	s.grid(timeColumns, timeRows(p))
	if b := p.Bleeder; b != nil {
		s.item(strong, "label", labelWords(b))
	}
	if p.Recovery.HighV > safety.DeadVolts {
		s.item(strong, "recovery", p.Recovery.Text)
	}
}

// timeRows gives every store with a capacitor of its own, the halves of a split bank also out of balance, and what the
// board's own bleeder would do.
func timeRows(p *safety.Plan) [][]entry {
	var rows [][]entry
	add := func(what string, t safety.Times, on float64) {
		rows = append(rows, cells(what, waitOr(t.To60V), waitOr(t.To50V), waitOr(t.To5V), waitOr(on)))
	}
	for _, d := range p.Stores {
		if d.Store.Capacitance.Basis == safety.None {
			continue
		}
		add(d.Store.Point, d.Wait, d.FiveRC)
		if d.Uneven != nil {
			add(d.Store.Point+", all "+volts(d.Uneven.Volt)+" on it", d.Uneven.Wait, d.FiveRC)
		}
	}
	if b := p.Bleeder; b != nil {
		add("bus by its bleeder, if whole", b.Wait, 0)
	}
	return rows
}

func labelWords(b *safety.Bleeder) string {
	text := "bleeder " + quantity.Format(b.Ohm, quantity.Ohm) + ", " + quantity.Format(b.PowerW, quantity.Watt)
	switch {
	case b.LabelTimeS == 0:
		return text
	case b.WithinFiveS:
		return text + ": down to " + volts(safety.TouchVolts) + " within 5 s, so a board with it needs no label; a blown one is measured all the same"
	}
	text += ": a label would name " + waitFor(b.LabelTimeS) + ", which leads to " + volts(safety.TouchVolts) + " and only while the bleeder is whole: a lower bound"
	if b.NoLabelOhm > 0 {
		text += "; without a label it would have to be " + quantity.Format(b.NoLabelOhm, quantity.Ohm) + " and burn " + quantity.Format(b.NoLabelW, quantity.Watt) + " all the time"
	}
	return text
}

// waitOr leaves a level that lies above the start empty.
func waitOr(x float64) string {
	if x <= 0 {
		return "-"
	}
	return waitFor(x)
}

// waitFor prints a waiting time, always rounded up: seconds to two minutes, minutes to two hours, then hours.
func waitFor(x float64) string {
	switch {
	case x <= 120:
		return seconds(x)
	case x <= 7200:
		return strconv.FormatFloat(math.Ceil(x/60), 'f', -1, 64) + " min"
	}
	return strconv.FormatFloat(math.Ceil(x/360)/10, 'f', -1, 64) + " h"
}

// timesWords names the levels that the store stands above to begin with; one it never reached has no time.
func timesWords(t safety.Times) string {
	var out []string
	for _, x := range []struct{ level, after float64 }{{safety.TouchVolts, t.To60V}, {safety.LiveVolts, t.To50V}, {safety.DeadVolts, t.To5V}} {
		if x.after > 0 {
			out = append(out, volts(x.level)+" after "+waitFor(x.after))
		}
	}
	if len(out) == 0 {
		return "it stands at " + volts(safety.DeadVolts) + " or less to begin with"
	}
	return strings.Join(out, ", ")
}

func basisOf(c safety.Caution) string {
	switch {
	case c.Read == safety.CommonPractice && c.ID == "local-rules":
		return ""
	case c.Read == safety.CommonPractice && c.Source != "" && strings.Contains(c.Source, "common practice"):
		return " [" + c.Source + "]"
	case c.Read == safety.CommonPractice:
		return " [common practice]"
	case c.Read == safety.Memory && strings.Contains(c.Source, "memory"):
		return " [" + c.Source + "]"
	case c.Read == safety.Memory:
		return " [" + c.Source + ", from memory]"
	case c.Read == safety.SecondHand:
		return " [" + c.Source + ", second hand]"
	case c.Source != "":
		return " [" + c.Source + "]"
	}
	return ""
}

func writeWanted(s *screen, wanted []safety.Wanted) {
	if len(wanted) == 0 {
		return
	}
	s.head("MISSING", "what would settle more")
	for _, n := range wanted {
		s.hang(neutral, "   ", n.Key+": "+n.Why)
	}
}
