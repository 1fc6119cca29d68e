package safety

import (
	"fmt"
	"strings"

	"drivemend/measure/quantity"
)

// Grade tells how well a limit was read.
type Grade string

// The grades, the best first.
const (
	Read           Grade = "read"            // in the source named
	SecondHand     Grade = "second-hand"     // in a restatement of the source named
	Memory         Grade = "memory"          // remembered, not read again
	CommonPractice Grade = "common practice" // no published source read
)

// Caution is a warning with this board's figures in it.
type Caution struct {
	ID, Text string
	Source   string // where the limit or the fact comes from
	Read     Grade
}

// hazard is what the cautions are chosen by. Energies are taken with the capacitance at the top of its interval.
type hazard struct {
	volt, joule float64 // the highest voltage of any store; all stores together
	in          Input
	plan        *Plan
}

// warning is a row of the table of cautions. One that follows a threshold takes its occasion, its source and its grade
// from there, so that no limit stands in two places.
type warning struct {
	id      string
	follows func(p *Plan) Limit // nil: by when, source and read
	when    func(h hazard) bool
	text    func(h hazard, l Limit) string
	source  string
	read    Grade
}

func hazardOf(in Input, p *Plan) hazard {
	h := hazard{in: in, plan: p, joule: p.WorstEnergyJ}
	for _, s := range in.Stores {
		h.volt = max(h.volt, s.Voltage.Value)
	}
	return h
}

func cautions(in Input, p *Plan) []Caution {
	h := hazardOf(in, p)
	var out []Caution
	for _, w := range warnings {
		if c, applies := w.on(h); applies {
			out = append(out, c)
		}
	}
	return out
}

// on gives the caution of a row for a board, if the row applies to it.
func (w warning) on(h hazard) (Caution, bool) {
	if w.follows == nil {
		return Caution{ID: w.id, Text: w.text(h, Limit{}), Source: w.source, Read: w.read}, w.when(h)
	}
	l := w.follows(h.plan)
	return Caution{ID: w.id, Text: w.text(h, l), Source: l.Source, Read: l.Read}, l.Above
}

// byLine follows one threshold, byLowest the lowest of a hazard.
func byLine(id string) func(*Plan) Limit { return func(p *Plan) Limit { return p.limit(id) } }
func byLowest(hazard string) func(*Plan) Limit {
	return func(p *Plan) Limit { return p.goneBy(hazard) }
}

// worst prints an energy with its basis, for a screen on which the one at the marked value stands as well.
func (h hazard) worst(joule float64) string {
	return format(joule, quantity.Joule) + " " + atTop(h.in.spread())
}

// raised lists the stores that read higher than expected.
func (h hazard) raised() string {
	var notes []string
	for _, s := range h.in.Stores {
		if s.Expected.Basis != None {
			notes = append(notes, s.Point+" "+s.Voltage.Because)
		}
	}
	return strings.Join(notes, "; ")
}

func (h hazard) has(point string) bool {
	for _, s := range h.in.Stores {
		if s.Point == point {
			return true
		}
	}
	return false
}

func (h hazard) battery() bool { return h.in.Supply == "battery" }

func always(hazard) bool { return true }

func fixed(text string) func(hazard, Limit) string {
	return func(hazard, Limit) string { return text }
}

// warnings stand in the order in which they are shown. Where sources set different limits for the same hazard each
// stands by itself, so that the lowest one is seen.
var warnings = []warning{
	{"above-highest", nil, func(h hazard) bool { return len(alarmsOf(h.in.Stores)) > 0 },
		func(h hazard, _ Limit) string {
			return "ALARM: " + strings.Join(alarmsOf(h.in.Stores), "; ") + ". To do: " + alarmUnlock + "."
		}, "reading against the case", CommonPractice},
	{"read-higher", nil, func(h hazard) bool { return h.raised() != "" },
		func(h hazard, _ Limit) string {
			return "Read higher than expected: " + h.raised() + ". The plan is made for what was read."
		}, "reading against the case", CommonPractice},
	{"arc-flash", byLine("lab-arc"), nil,
		func(_ hazard, l Limit) string {
			return "Stop. Arc-flash class, " + l.Threshold + " (" + l.Board + "): this is work for a qualified person with the equipment for it."
		}, "", ""},
	{"arc-flash-source", byLine("lab-arc-source"), nil,
		fixed("A battery or a shared bus of 100 V or more that can give 500 A (most can) is in the arc-flash class. Open its service disconnect first; if it cannot be opened, this is work for a qualified person."), "", ""},
	{"live", byLowest(HazardTouch), nil,
		func(h hazard, _ Limit) string {
			return fmt.Sprintf("Treat the board as live until every store reads below %s: it can hold up to %s, %s in all.", inVolts(LiveVolts), format(h.volt, quantity.Volt), h.worst(h.joule))
		}, "", ""},
	{"touch-limit", byLine("machine-voltage"), nil,
		func(hazard, Limit) string {
			return "Machines are built to fall to " + inVolts(TouchVolts) + " within " + seconds(residualSeconds) + " of switching off, or to carry a label with the waiting time. The label leads to " + inVolts(TouchVolts) + ", not to zero, and only while the bleeders are whole."
		}, "", ""},
	{"drive-limit", byLine("drive-voltage"), nil,
		func(hazard, Limit) string {
			return fmt.Sprintf("Drives are built to fall to %s, or to %s, within %s, else to carry a label. Of the two charges named (%s for machines) the lower one counts here.",
				inVolts(TouchVolts), inMicro(smallCoulombs), seconds(residualSeconds), inMicro(exemptMachine))
		}, "", ""},
	{"stored-energy", byLine("lab-shock"), nil,
		func(_ hazard, l Limit) string {
			return "Shock hazard, " + l.Threshold + " (" + l.Board + "): one hand, insulated probes, glasses, not alone."
		}, "", ""},
	{"stored-energy-low-limit", byLowest(HazardEnergy), nil,
		func(_ hazard, l Limit) string {
			return "Hazardous by the lowest limit named, " + l.Threshold + " (" + l.Board + "): " + l.Answers + "."
		}, "", ""},
	{"burn", byLowest(HazardBurn), nil,
		func(_ hazard, l Limit) string {
			return "Burn hazard, " + l.Threshold + " (" + l.Board + "): no rings or watch, insulated tools, glasses, also below 50 V."
		}, "", ""},
	{"battery", nil, hazard.battery,
		fixed("The battery cannot be switched off: its cells stay live behind the contactor and weld a tool at any voltage. Disconnect it at both poles, cover them; no rings or watch, insulated tools."),
		"limit of 1000 W below 100 V: " + citeLabBurn.long + "; the rest common practice", CommonPractice},
	{"shared-bus", nil, func(h hazard) bool { return h.in.Supply == "shared-bus" },
		fixed("Other drives on the same bus keep it charged: this board is isolated only when it is taken off the bus or all of them are off and locked."),
		"back-feed is to be looked for: 29 CFR 1910.333(b)(2)(iv), in a training note", SecondHand},
	{"no-short", nil, always,
		func(h hazard, _ Limit) string {
			return "Never discharge with a short: " + h.worst(h.joule) + " would go into a spark and metal spray. Through a resistor of at least 100 Ω."
		}, "ABB PQFM manual, p. 8; the unit of its 100 is cut off in the excerpt, ohm by context", Read},
	{"noise", byLowest(HazardNoise), nil,
		func(_ hazard, l Limit) string {
			return "From about " + l.Threshold + " a dead short of the bank also needs hearing protection."
		}, "", ""},
	{"resistor", nil, func(h hazard) bool { return !h.plan.Resistor.Within },
		func(h hazard, _ Limit) string {
			return "This resistor: " + strings.Join(h.plan.Resistor.Notes, "; ") + "."
		}, "limits of 0.1 to 2 A and of the resistor's pulse curve", CommonPractice},
	{"load-bank", nil, func(h hazard) bool { return h.plan.Resistor.LoadBank },
		func(h hazard, _ Limit) string {
			r := h.plan.Resistor
			return fmt.Sprintf("No stack of ordinary resistors takes this: %s %s, %s at first and %s on average over the first %s. Use a load bank or the maker's discharge tool, and stay with it.",
				format(r.JoulesJ, quantity.Joule), atTop(h.in.spread()), format(r.PeakW, quantity.Watt), format(r.AverageW, quantity.Watt), seconds(h.plan.TimeConstantS))
		}, "a wire-wound body that stands five times its rating for 5 s (from memory); ends of 200 W and 10 kJ are judgements", Memory},
	{"resistor-body", nil, func(h hazard) bool {
		return h.plan.Resistor.Series > 1 && !h.plan.Resistor.LoadBank && len(h.plan.Withheld) == 0
	},
		func(h hazard, _ Limit) string {
			r := h.plan.Resistor
			return fmt.Sprintf("A single axial resistor holds about 350 V over its body: use %d equal parts of %s in series, each good for at least %s.", r.Series, format(r.EachOhm, quantity.Ohm), format(r.EachV, quantity.Volt))
		}, "350 to 500 V for a single axial part", CommonPractice},
	{"bleeder", nil, always,
		fixed("On a blown board bleeders and balancing resistors are often open, and a blown fuse or a burnt track can cut part of the bank off: the charge then stays for hours. A waiting time is a lower bound, never a proof."),
		"verify by measurement: ABB PQFM manual, p. 8; the rest common practice", CommonPractice},
	{"halves", nil, func(h hazard) bool { return h.has(PointUpperHalf) },
		func(h hazard, _ Limit) string {
			text := "The rails can read zero while the halves of the bank are charged against each other: discharge and check each half."
			if u := h.plan.uneven(); u != nil {
				text += fmt.Sprintf(" Out of balance (a can shorted, a balancing resistor open) one half can hold the whole %s: %s.", inVolts(u.Volt), h.worst(u.EnergyJ))
			}
			return text
		}, "bench practice", CommonPractice},
	{"fused-bank", nil, func(h hazard) bool { return h.has(PointFused) },
		fixed("Behind a blown fuse the bank keeps its charge while the rails read zero: discharge and check behind the fuse."), "bench practice", CommonPractice},
	{"pumped", nil, func(h hazard) bool { return h.has(PointReservoir) || h.has(PointClamp) },
		fixed("The clamp or reservoir capacitor stands above the bus; with its resistor or link open it keeps that charge. Discharge it at its own terminals."), "bench practice", CommonPractice},
	{"motor", nil, func(h hazard) bool { return h.in.MotorCanTurn },
		fixed("A motor that turns, by hand or by wind or load, charges the bus through the freewheel diodes: unplug it or lock its shaft before anything else."), "bench practice", CommonPractice},
	{"meter", nil, func(h hazard) bool { return h.volt > DeadVolts },
		func(h hazard, _ Limit) string {
			text := "Prove the meter on a known DC source of 50 V or more, same range and leads, before and after: a neon, an AC tester or a self-ranging meter can show nothing on a DC bus."
			if h.volt > 1000 {
				return text + " Above 1000 V no hand-held multimeter: a rated divider probe."
			}
			if !h.battery() {
				text += fmt.Sprintf(" Meter and leads CAT III for at least %s, tips with 4 mm of bare metal or less.", format(h.volt, quantity.Volt))
			}
			return text
		}, "live-dead-live: NFPA 70E-2018 120.5, in a trade journal; bare tip: IEC 61010-031, in a meter maker's answer; DC source and category common practice", CommonPractice},
	{"ohms", nil, always,
		fixed("No ohms, diode, capacitance or injection range meets a store above 5 V: the reading lies and the meter or the part burns."), "bench practice", CommonPractice},
	{"recovery", nil, func(h hazard) bool { return h.plan.Recovery.HighV > DeadVolts },
		func(h hazard, _ Limit) string {
			return "Voltage comes back: " + h.plan.Recovery.Text + ". A dead check lives 10 minutes; a link or the resistor left on keeps the bank down; store loose capacitors with a wire across."
		}, "10 to 20 days: Nippon Chemi-Con FAQ on recovery voltage, read; 10 to 15 %: Cornell Dubilier application guide, p. 11, from memory", Memory},
	{"local-rules", nil, always,
		fixed("Local codes, the maker's manual and licensed practice come before anything said here."), "", CommonPractice},
}
