package safety

import (
	"fmt"

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

// warning is a row of the table of cautions.
type warning struct {
	id     string
	when   func(h hazard) bool
	text   func(h hazard) string
	source string
	read   Grade
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
		if w.when(h) {
			out = append(out, Caution{ID: w.id, Text: w.text(h), Source: w.source, Read: w.read})
		}
	}
	return out
}

// class is one class of stored energy: it holds for a single store, voltage and energy together.
type energyClass func(volt, joule float64) bool

func arcFlash(v, e float64) bool { return v >= 100 && e >= 10e3 }
func shock(v, e float64) bool    { return v >= 100 && e >= 10 }
func burn(v, e float64) bool     { return v < 100 && e > 100 }

// shockByMemory is the remembered limit of NFPA 70E article 360, lower than the one that was read.
func shockByMemory(v, e float64) bool {
	return (v >= 100 && v <= 400 && e >= 1) || (v > 400 && e >= 0.25)
}

// in gives whether any store falls in a class.
func in(c energyClass) func(hazard) bool {
	return func(h hazard) bool { return h.stores(c) != "" }
}

// stores lists the stores of a class with their figures: "bus 390 V, 200.8 J".
func (h hazard) stores(c energyClass) string {
	text := ""
	for _, s := range h.in.Stores {
		e := s.WorstJ
		if s.Capacitance.Basis == None || !c(s.Voltage.Value, e) {
			continue
		}
		if text != "" {
			text += "; "
		}
		text += fmt.Sprintf("%s %s, %s", s.Point, format(s.Voltage.Value, quantity.Volt), h.worst(e))
	}
	return text
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
	return joined(notes)
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

// labManual is the manual whose tables were read.
const labManual = "Lawrence Berkeley National Laboratory, Electrical Safety Manual, "

func always(hazard) bool { return true }

func fixed(text string) func(hazard) string { return func(hazard) string { return text } }

// warnings stand in the order in which they are shown. Where sources set different limits for the same hazard each
// stands by itself, so that the lowest one is seen.
var warnings = []warning{
	{"above-highest", func(h hazard) bool { return len(alarmsOf(h.in.Stores)) > 0 },
		func(h hazard) string {
			return "ALARM: " + joined(alarmsOf(h.in.Stores)) + ". To do: " + alarmUnlock + "."
		}, "reading against the case", CommonPractice},
	{"read-higher", func(h hazard) bool { return h.raised() != "" },
		func(h hazard) string {
			return "Read higher than expected: " + h.raised() + ". The plan is made for what was read."
		}, "reading against the case", CommonPractice},
	{"arc-flash", in(arcFlash),
		func(h hazard) string {
			return "Stop. Arc-flash class, 100 V and 10 kJ (" + h.stores(arcFlash) + "): this is work for a qualified person with the equipment for it."
		}, labManual + "table 2.3.3", Read},
	{"arc-flash-source", func(h hazard) bool { return h.volt >= 100 && h.battery() },
		func(h hazard) string {
			return "A battery of 100 V or more that can give 500 A (most can) is in the arc-flash class. Open its service disconnect first; if it cannot be opened, this is work for a qualified person."
		}, labManual + "table 2.3.3", Read},
	{"live", func(h hazard) bool { return h.volt >= LiveVolts },
		func(h hazard) string {
			return fmt.Sprintf("Treat the board as live until every store reads below %s: it can hold up to %s, %s in all.", format(LiveVolts, quantity.Volt), format(h.volt, quantity.Volt), h.worst(h.joule))
		}, "29 CFR 1910.333(a)(1), 50 V to ground, in a training summary", SecondHand},
	{"touch-limit", func(h hazard) bool { return h.volt > TouchVolts },
		fixed("Machines are built to fall to 60 V within 5 s of switching off, or to carry a label with the waiting time. The label leads to 60 V, not to zero, and only while the bleeders are whole."),
		"IEC 60204-1 6.2.4, in a clause-by-clause commentary", SecondHand},
	{"drive-limit", func(h hazard) bool { return h.volt > TouchVolts },
		fixed("Drives are built to the same 60 V, or to 50 µC, within 5 s, else to a label. Of the two charges named (60 µC for machines) the lower one counts here."),
		"IEC 61800-5-1 and EN 50178", Memory},
	{"stored-energy", in(shock),
		func(h hazard) string {
			return "Shock hazard, 100 V and 10 J (" + h.stores(shock) + "): one hand, insulated probes, glasses, not alone."
		}, labManual + "table 2.2.13", Read},
	{"stored-energy-low-limit", in(shockByMemory),
		func(h hazard) string {
			return "Hazardous by the lower limit, 1 J from 100 to 400 V and 0.25 J above (" + h.stores(shockByMemory) + ")."
		}, "NFPA 70E article 360", Memory},
	{"burn", in(burn),
		func(h hazard) string {
			return "Burn hazard below 100 V, more than 100 J (" + h.stores(burn) + "): no rings or watch, insulated tools, glasses, also below 50 V."
		}, labManual + "table 2.3.5", Read},
	{"battery", hazard.battery,
		fixed("The battery cannot be switched off: its cells stay live behind the contactor and weld a tool at any voltage. Disconnect it at both poles, cover them; no rings or watch, insulated tools."),
		"limit of 1000 W below 100 V: " + labManual + "table 2.3.5; the rest common practice", CommonPractice},
	{"shared-bus", func(h hazard) bool { return h.in.Supply == "shared-bus" },
		fixed("Other drives on the same bus keep it charged: this board is isolated only when it is taken off the bus or all of them are off and locked."),
		"back-feed is to be looked for: 29 CFR 1910.333(b)(2)(iv), in a training note", SecondHand},
	{"no-short", always,
		func(h hazard) string {
			return "Never discharge with a short: " + h.worst(h.joule) + " would go into a spark and metal spray. Through a resistor of at least 100 Ω."
		}, "ABB PQFM manual, p. 8; the unit of its 100 is cut off in the excerpt, ohm by context", Read},
	{"noise", func(h hazard) bool { return h.joule >= 100 },
		fixed("From about 100 J a dead short of the bank also needs hearing protection."), "NFPA 70E annex R", Memory},
	{"resistor", func(h hazard) bool { return !h.plan.Resistor.Within },
		func(h hazard) string { return "This resistor: " + joined(h.plan.Resistor.Notes) + "." }, "limits of 0.1 to 2 A and of the resistor's pulse curve", CommonPractice},
	{"load-bank", func(h hazard) bool { return h.plan.Resistor.LoadBank },
		func(h hazard) string {
			r := h.plan.Resistor
			return fmt.Sprintf("No stack of ordinary resistors takes this: %s %s, %s at first and %s on average over the first %s. Use a load bank or the maker's discharge tool, and stay with it.",
				format(r.JoulesJ, quantity.Joule), atTop(h.in.spread()), format(r.PeakW, quantity.Watt), format(r.AverageW, quantity.Watt), seconds(h.plan.TimeConstantS))
		}, "a wire-wound body that stands five times its rating for 5 s (from memory); ends of 200 W and 10 kJ are judgements", Memory},
	{"resistor-body", func(h hazard) bool {
		return h.plan.Resistor.Series > 1 && !h.plan.Resistor.LoadBank && len(h.plan.Withheld) == 0
	},
		func(h hazard) string {
			r := h.plan.Resistor
			return fmt.Sprintf("A single axial resistor holds about 350 V over its body: use %d equal parts of %s in series, each good for at least %s.", r.Series, format(r.EachOhm, quantity.Ohm), format(r.EachV, quantity.Volt))
		}, "350 to 500 V for a single axial part", CommonPractice},
	{"bleeder", always,
		fixed("On a blown board bleeders and balancing resistors are often open, and a blown fuse or a burnt track can cut part of the bank off: the charge then stays for hours. A waiting time is a lower bound, never a proof."),
		"verify by measurement: ABB PQFM manual, p. 8; the rest common practice", CommonPractice},
	{"halves", func(h hazard) bool { return h.has(PointUpperHalf) },
		fixed("The rails can read zero while the halves of the bank are charged against each other: discharge and check each half."), "bench practice", CommonPractice},
	{"fused-bank", func(h hazard) bool { return h.has(PointFused) },
		fixed("Behind a blown fuse the bank keeps its charge while the rails read zero: discharge and check behind the fuse."), "bench practice", CommonPractice},
	{"pumped", func(h hazard) bool { return h.has(PointReservoir) || h.has(PointClamp) },
		fixed("The clamp or reservoir capacitor stands above the bus; with its resistor or link open it keeps that charge. Discharge it at its own terminals."), "bench practice", CommonPractice},
	{"motor", func(h hazard) bool { return h.in.MotorCanTurn },
		fixed("A motor that turns, by hand or by wind or load, charges the bus through the freewheel diodes: unplug it or lock its shaft before anything else."), "bench practice", CommonPractice},
	{"meter", func(h hazard) bool { return h.volt > DeadVolts },
		func(h hazard) string {
			text := "Prove the meter on a known DC source of 50 V or more, same range and leads, before and after: a neon, an AC tester or a self-ranging meter can show nothing on a DC bus."
			if h.volt > 1000 {
				return text + " Above 1000 V no hand-held multimeter: a rated divider probe."
			}
			if !h.battery() {
				text += fmt.Sprintf(" Meter and leads CAT III for at least %s, tips with 4 mm of bare metal or less.", format(h.volt, quantity.Volt))
			}
			return text
		}, "live-dead-live: NFPA 70E-2018 120.5, in a trade journal; bare tip: IEC 61010-031, in a meter maker's answer; DC source and category common practice", CommonPractice},
	{"ohms", always,
		fixed("No ohms, diode, capacitance or injection range meets a store above 5 V: the reading lies and the meter or the part burns."), "bench practice", CommonPractice},
	{"recovery", func(h hazard) bool { return h.plan.Recovery.HighV > DeadVolts },
		func(h hazard) string {
			return "Voltage comes back: " + h.plan.Recovery.Text + ". A dead check lives 10 minutes; a link or the resistor left on keeps the bank down; store loose capacitors with a wire across."
		}, "10 to 20 days: Nippon Chemi-Con FAQ on recovery voltage, read; 10 to 15 %: Cornell Dubilier application guide, p. 11, from memory", Memory},
	{"local-rules", always,
		fixed("Local codes, the maker's manual and licensed practice come before anything said here."), "", CommonPractice},
}

func joined(notes []string) string {
	text := ""
	for i, n := range notes {
		if i > 0 {
			text += "; "
		}
		text += n
	}
	return text
}
