package reports

import (
	"fmt"
	"math"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure/quantity"
)

// followRows are what follows from the edges beyond the peak: what decides about a rebuild as much as the peak does.
var followRows = []marginRow{
	{"avalanche, how often", avalancheOften},
	{"avalanche, against rating", avalancheRated},
	{"avalanche, on one device", avalancheWords},
	{"avalanche, peak without it", textCell(func(f *stress.Figures) string {
		if f.Avalanche == nil {
			return ""
		}
		return volts(f.Avalanche.Prospective)
	})},
	{"reservoir with its tie open", pumpWords},
	{"reservoir, each edge", textCell(pumpEdge)},
	{"clamp held at", textCell(clampHeld)},
	{"clamp, into its resistor", textCell(clampHeat)},
	{"clamp, taken up each edge", textCell(clampEdge)},
	{"last part to open", textCell(lastWords)},
	{"measured edge, carried over", textCell(measuredWords)},
	{"loop found from it", textCell(measuredLoop)},
	{"carried over by", textCell(func(f *stress.Figures) string {
		if f.Measured == nil {
			return ""
		}
		return f.Measured.Why
	})},
}

func avalancheOften(b marginBoard) entry {
	switch a := b.f.Avalanche; {
	case a == nil:
		return entry{}
	case a.EveryCycle:
		return entry{"EVERY CYCLE", danger}
	}
	return entry{"at worst current only", caution}
}

func avalancheRated(b marginBoard) entry {
	switch a := b.f.Avalanche; {
	case a == nil:
		return entry{}
	case !a.Rated:
		return entry{"not stated for it", caution}
	case a.OverEnergy && a.OverCurrent:
		return entry{"OVER energy and current", danger}
	case a.OverEnergy:
		return entry{"OVER its energy", danger}
	case a.OverCurrent:
		return entry{"OVER its current", danger}
	}
	return entry{"under, for one pulse", normal}
}

func avalancheWords(b marginBoard) entry {
	a := b.f.Avalanche
	if a == nil {
		return entry{}
	}
	text := quantity.Format(a.Energy, quantity.Joule) + ", " + quantity.Format(a.Current, quantity.Ampere) + ", " + quantity.Format(a.Time, quantity.Second) + " at " + volts(a.Volt)
	if a.Rise > 0 {
		text += ", junction +" + quantity.Format(a.Rise, quantity.Kelvin)
	}
	return entry{Text: text}
}

func clampHeld(f *stress.Figures) string {
	switch c := f.Clamp; {
	case c == nil:
		return ""
	case c.Stated:
		return volts(c.Volt) + ", as stated"
	default:
		return volts(c.Volt) + ", its balance"
	}
}

func clampHeat(f *stress.Figures) string {
	switch c := f.Clamp; {
	case c == nil:
		return ""
	case c.Watts > 0:
		return quantity.Format(c.Watts, quantity.Watt)
	case c.Watts < 0:
		return "fed by the bus: held under it"
	}
	return noHertz
}

// noHertz stands where a loss waits for the PWM frequency.
const noHertz = "needs pwm.frequency"

func clampEdge(f *stress.Figures) string {
	if f.Clamp == nil {
		return ""
	}
	return quantity.Format(f.Clamp.Charge, quantity.Coulomb) + ", rises " + volts(f.Clamp.Ripple)
}

func pumpWords(b marginBoard) entry {
	p := b.f.PumpUp
	if p == nil {
		return entry{}
	}
	text := "ends at " + volts(p.End)
	if p.EndsBy != "" {
		text += " by " + strings.ReplaceAll(p.EndsBy, "-", " ")
	}
	if p.EndsBy == stress.StopBreakdown {
		return entry{text, danger}
	}
	return entry{text, caution}
}

func pumpEdge(f *stress.Figures) string {
	p := f.PumpUp
	if p == nil {
		return ""
	}
	text := "the first +" + volts(p.FirstEdge) + "; " + quantity.Format(math.Ceil(p.Edges), quantity.Count) + " edges"
	if p.Time > 0 {
		text += ", " + quantity.Format(p.Time, quantity.Second)
	}
	return text
}

func lastWords(f *stress.Figures) string {
	l := f.LastPart
	if l == nil {
		return ""
	}
	return quantity.Format(l.Current, quantity.Ampere) + ", " + shareWords(l.Share) + " of the bank; " + quantity.Format(l.Energy, quantity.Joule) + " each opening"
}

// shareWords is a share in per cent.
func shareWords(x float64) string { return quantity.Format(100*x, quantity.Ratio) + " %" }

func measuredWords(f *stress.Figures) string {
	x := f.Measured
	if x == nil {
		return ""
	}
	text := volts(x.Mid) + " (" + volts(x.Low) + " to " + volts(x.High) + ")"
	if x.Name != "" {
		text += ", from " + x.Name
	}
	return text
}

func measuredLoop(f *stress.Figures) string {
	x := f.Measured
	if x == nil || x.Loop <= 0 {
		return ""
	}
	return between(quantity.Quantity{Value: x.Loop, Low: x.LoopLow, High: x.LoopHigh, Unit: quantity.Henry})
}

// dutyRows are what the network goes through in each PWM cycle.
var dutyRows = []marginRow{
	{"capacitor, rms current", dutyCell(func(d *stress.Duty) string {
		if d.CapacitorRMS <= 0 {
			return noHertz
		}
		return quantity.Format(d.CapacitorRMS, quantity.Ampere)
	})},
	{"capacitor, highest current", dutyCell(func(d *stress.Duty) string { return quantity.Format(d.CapacitorPeak, quantity.Ampere) })},
	{"capacitor, steepest slope", dutyCell(func(d *stress.Duty) string { return orNothing(d.Slope, quantity.VoltPerSecond) })},
	{"its resistor", resistorHeat},
	{"into the closing switch", dutyCell(func(d *stress.Duty) string { return orNothing(d.Discharge, quantity.Ampere) })},
	{"emptied, shortest on-time", dutyCell(func(d *stress.Duty) string {
		if d.Emptied <= 0 {
			return ""
		}
		return shareWords(d.Emptied)
	})},
}

func dutyCell(text func(d *stress.Duty) string) func(marginBoard) entry {
	return func(b marginBoard) entry {
		if b.f.Duty == nil {
			return entry{}
		}
		return entry{Text: text(b.f.Duty)}
	}
}

// resistorHeat is what the network's resistor turns into heat; without one it says nothing.
func resistorHeat(b marginBoard) entry {
	if b.f.Duty == nil {
		return entry{}
	}
	if b.f.Duty.ResistorWatts > 0 || b.hertz > 0 {
		return entry{Text: orNothing(b.f.Duty.ResistorWatts, quantity.Watt)}
	}
	for _, e := range b.f.Edges {
		for _, x := range e.Energies {
			if x.Element == "snubber-resistor" {
				return entry{Text: noHertz}
			}
		}
	}
	return entry{}
}

// orNothing is a figure, or no text where it is nothing.
func orNothing(x float64, u quantity.Unit) string {
	if x == 0 {
		return ""
	}
	return quantity.Format(x, u)
}

// edgeRows are one edge in numbers, at nominal bus and running current, with the losses indented below it.
func edgeRows(name string, boards []marginBoard) []marginRow {
	pick := func(text func(e *stress.Edge) string) func(marginBoard) entry {
		return func(b marginBoard) entry {
			if e := edgeOfBoard(b.f, name); e != nil {
				return entry{Text: text(e)}
			}
			return entry{}
		}
	}
	rows := []marginRow{
		{edgeWords(name, placeOfEdge(name, boards)), pick(func(e *stress.Edge) string {
			return volts(e.Peak) + " after " + quantity.Format(e.PeakTime, quantity.Second)
		})},
		{"- slope, 10 to 90 % of bus", pick(func(e *stress.Edge) string { return orNothing(e.Slope, quantity.VoltPerSecond) })},
		{"- ring, damping ratio", pick(ringWords)},
		{"- surge of closing switch", pick(func(e *stress.Edge) string { return orNothing(e.Surge, quantity.Ampere) })},
	}
	return append(rows, lossRows("- ", name, boards)...)
}

// lossRows are what the elements take up in one edge, each named with a word in front.
func lossRows(front, name string, boards []marginBoard) []marginRow {
	var rows []marginRow
	for _, element := range elementsOf(name, boards) {
		rows = append(rows, marginRow{front + elementName(element), func(b marginBoard) entry {
			return entry{Text: lossWords(edgeOfBoard(b.f, name), element, b.hertz)}
		}})
	}
	return rows
}

// placeOfEdge is where the voltage of an edge stands.
func placeOfEdge(name string, boards []marginBoard) string {
	for _, b := range boards {
		if e := edgeOfBoard(b.f, name); e != nil {
			return e.Position
		}
	}
	return ""
}

func ringWords(e *stress.Edge) string {
	if e.Ring <= 0 {
		return ""
	}
	return quantity.Format(e.Ring, quantity.Hertz) + ", " + dampingWords(e.Damping)
}

// dampingWords is a damping ratio in the two digits that it is good for.
func dampingWords(x float64) string {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return quantity.Format(x, quantity.Ratio)
	}
	return fmt.Sprintf("%.2g", x)
}

// keeps tells whether an element gives back what it takes up: that is stored, not lost.
func keeps(element string) bool {
	return strings.HasSuffix(element, "capacitance") || strings.HasSuffix(element, "capacitor")
}

func elementName(element string) string {
	verb := "lost, "
	if keeps(element) {
		verb = "kept, "
	}
	return verb + strings.ReplaceAll(element, "-", " ")
}

// worthLosing is the share of the largest energy of an edge below which an element is left off the screens; the JSON
// holds them all.
const worthLosing = 1e-3

// elementsOf are the elements that take energy up in an edge, on any board: first what is lost, then what is kept.
func elementsOf(name string, boards []marginBoard) []string {
	var lost, kept []string
	seen := map[string]bool{}
	for _, b := range boards {
		e := edgeOfBoard(b.f, name)
		if e == nil {
			continue
		}
		least := 0.0
		for _, x := range e.Energies {
			least = math.Max(least, worthLosing*math.Abs(x.Joule))
		}
		for _, x := range e.Energies {
			switch {
			case seen[x.Element] || math.Abs(x.Joule) < least:
				continue
			case keeps(x.Element):
				kept = append(kept, x.Element)
			default:
				lost = append(lost, x.Element)
			}
			seen[x.Element] = true
		}
	}
	return append(lost, kept...)
}

// lossWords is what an element takes up in one edge, with the watts at the PWM frequency of what is lost.
func lossWords(e *stress.Edge, element string, hertz float64) string {
	if e == nil {
		return ""
	}
	for _, x := range e.Energies {
		if x.Element != element {
			continue
		}
		text := quantity.Format(x.Joule, quantity.Joule)
		if hertz > 0 && !keeps(element) {
			text += ", " + quantity.Format(x.Joule*hertz, quantity.Watt)
		}
		return text
	}
	return ""
}
