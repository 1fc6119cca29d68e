package safety

import (
	"slices"
	"strings"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// clause is one condition of a statement before a step: a row of the table below.
type clause struct {
	steps []string
	asked func(s scene) bool                   // whether this board asks for it; nil: always
	holds func(s scene, b measure.Before) bool // whether the statement gives it
	needs func(s scene) string                 // what it takes, in plain words
	fault func(s scene, b measure.Before) string
	do    func(s scene, b measure.Before) string // what to do about it
	flag  func(s scene, b measure.Before) string // how it is entered; what was stated well stays as it was stated
}

// fault is what one statement lacks, and what to do about it.
type fault struct{ text, do string }

var (
	poweredSteps    = []string{measure.BeforeControlPower, measure.BeforeLowBus, measure.BeforeFull}
	controlSteps    = []string{measure.BeforeControlPower}
	pulseSteps      = []string{measure.BeforeDoublePulse}
	insulationSteps = []string{measure.BeforeInsulation}
	injectionSteps  = []string{measure.BeforeInjection}
	scopeSteps      = []string{measure.BeforeScope}
)

// clauses is the table of everything that can be asked before a step, in the order in which it is shown.
var clauses = []clause{
	{steps: poweredSteps, holds: motorHarmless, needs: plainly("the motor unplugged, uncoupled or its wheels up"), fault: motorText,
		do: saying("unplug the motor, uncouple it or lift the wheels (--motor unplugged, uncoupled or wheels-up)"),
		flag: func(s scene, b measure.Before) string {
			return "--motor " + kept(motorHarmless(s, b), b.Motor, motorUnplugged)
		}},
	{steps: poweredSteps, asked: hasBrake, holds: func(_ scene, b measure.Before) bool { return b.BrakeResistor != "" },
		needs: plainly("the brake resistor connected or disconnected"), fault: saying("it is not stated whether the brake resistor is connected"),
		do: saying("look at the brake terminals (--brake-resistor disconnected or connected)"),
		flag: func(_ scene, b measure.Before) string {
			return "--brake-resistor " + kept(b.BrakeResistor != "", b.BrakeResistor, "disconnected")
		}},
	yes(poweredSteps, func(b measure.Before) bool { return b.Guard }, "a guard between the board and people", "fit the guard", "--guard"),
	{steps: poweredSteps, holds: fuseHolds, needs: func(s scene) string { return "a fuse of at most " + s.fuse() }, fault: fuseText,
		do: func(s scene, _ measure.Before) string { return "fit a fuse of at most " + s.fuseValue() },
		flag: func(s scene, b measure.Before) string {
			return "--fuse '" + kept(fuseHolds(s, b), quantity.Format(b.Fuse.Value, quantity.Ampere), s.fuseValue()) + "'"
		}},
	yes(poweredSteps, func(b measure.Before) bool { return b.RemoteOff }, "a switch for the supply within reach of where one stands",
		"place a switch that takes the supply off, away from the board", "--remote-off"),
	yes(poweredSteps, func(b measure.Before) bool { return b.Glasses }, "safety glasses on everybody near", "put them on", "--glasses"),
	yes(poweredSteps, func(b measure.Before) bool { return b.SecondPerson }, "a second person who knows how to switch off",
		"ask somebody to stand by, and show the switch", "--second-person"),
	{steps: poweredSteps, asked: hasBank, holds: bankHolds,
		needs: plainly("bus capacitors that were at voltage within a year, or re-formed since"), fault: bankText, do: reform,
		flag: func(_ scene, b measure.Before) string {
			return "--bank " + kept(b.Bank == "stored" || b.Bank == "re-formed", "re-formed", "in-use")
		}},
	yes(controlSteps, func(b measure.Before) bool { return b.BusDisconnected }, "the bus disconnected from its source",
		"disconnect the bus from its source", "--bus-disconnected"),
	yes(pulseSteps, func(b measure.Before) bool { return b.Shield }, "a shield over the board", "put a shield over the board", "--shield"),
	yes(insulationSteps, func(b measure.Before) bool { return b.ElectronicsDisconnected }, "the electronics disconnected from what is tested: the tester's voltage kills them",
		"disconnect the electronics from what is tested", "--electronics-disconnected"),
	yes(injectionSteps, func(b measure.Before) bool { return b.SourcesOff }, "every other source off", "switch every other source off", "--sources-off"),
	yes(injectionSteps, func(b measure.Before) bool { return b.GatesHeld }, "every gate that is not under test held to its emitter or source", "bridge every gate that is not under test to its emitter or source", "--gates-held"),
	yes(injectionSteps, func(b measure.Before) bool { return b.LimitSet }, "the limit of current and voltage set before connecting",
		"set the limit on the open output, before connecting", "--limit-set"),
	yes(injectionSteps, func(b measure.Before) bool { return b.Attended }, "somebody who stays with it and stops at 40 K rise", "stay with it, and stop at 40 K rise", "--attended"),
	{steps: scopeSteps, holds: probeHolds, needs: plainly("a probe whose reference may lie where it is put: differential or isolated; or an earth clip on an earthed node"),
		fault: probeText, do: saying("use a differential probe or an isolated input (--probe differential or isolated-input); or put the earth clip on an earthed node " +
			"(--probe earth-clip --clip-on earthed-node); or feed the board from an isolated supply, with this one earth clip on it and no other " +
			"(--probe earth-clip --clip-on live-node --supply isolated --earth-clips 1)"), flag: saying("--probe differential")},
}

// yes is a clause that one yes gives.
func yes(steps []string, given func(b measure.Before) bool, needs, do, flag string) clause {
	return clause{steps: steps, holds: func(_ scene, b measure.Before) bool { return given(b) }, needs: plainly(needs),
		fault: saying("not stated: " + needs), do: saying(do), flag: saying(flag)}
}

func plainly(text string) func(scene) string { return func(scene) string { return text } }

func saying(text string) func(scene, measure.Before) string {
	return func(scene, measure.Before) string { return text }
}

// asks lists the clauses of a step on this board.
func (s scene) asks(step string) []clause {
	var out []clause
	for _, c := range clauses {
		if slices.Contains(c.steps, step) && (c.asked == nil || c.asked(s)) {
			out = append(out, c)
		}
	}
	return out
}

// faults lists what a statement lacks.
func (s scene) faults(b measure.Before) []fault {
	var out []fault
	for _, c := range s.asks(b.Step) {
		if !c.holds(s, b) {
			out = append(out, fault{c.fault(s, b), c.do(s, b)})
		}
	}
	return out
}

// needed puts everything that a step asks for in one line.
func (s scene) needed(step string) string {
	var words []string
	for _, c := range s.asks(step) {
		words = append(words, c.needs(s))
	}
	return strings.Join(words, "; ")
}

// command gives the command that states everything a step asks for on this board, after a statement that may have given
// some of it.
func (s scene) command(step string, after measure.Before) string {
	text := "drivemend safe before CASE " + step
	for _, c := range s.asks(step) {
		text += " " + c.flag(s, after)
	}
	return text
}

// kept gives what was stated where it is well, else what is asked for.
func kept(well bool, stated, asked string) string {
	if well {
		return stated
	}
	return asked
}

// hasBrake is false only where no board of the case is in doubt about it: the brake's terminals are a store.
func hasBrake(s scene) bool {
	return slices.ContainsFunc(s.status.Points, func(p PointStatus) bool { return p.Store.Point == PointBrake })
}

// hasBank is false only where the board as it stands is said to have no bus capacitors.
func hasBank(s scene) bool { return present(s.board(), "bus.capacitance") != absent }

func motorHarmless(_ scene, b measure.Before) bool {
	return b.Motor == motorUnplugged || b.Motor == motorUncoupled || b.Motor == motorWheelsUp
}

func motorText(_ scene, b measure.Before) string {
	if b.Motor == motorConnected {
		return "the motor is connected to its load: a switch that is still shorted runs it at full speed"
	}
	return "it is not stated how the motor is kept from doing harm"
}

func (s scene) limit() Figure { return FuseFor(s.board(), s.work.Need) }

func (s scene) fuseValue() string { return quantity.Format(s.limit().Value, quantity.Ampere) }

func (s scene) fuse() string { return s.fuseValue() + " (" + s.limit().Because + ")" }

func fuseHolds(s scene, b measure.Before) bool {
	q := b.Fuse
	return q.Unit == quantity.Ampere && q.Value > 0 && !above(max(q.Value, q.High), s.limit().Value)
}

func fuseText(s scene, b measure.Before) string {
	if b.Fuse.Unit != quantity.Ampere || !(b.Fuse.Value > 0) {
		return "no fuse is stated: it takes one of at most " + s.fuse()
	}
	return "the fuse of " + quantity.Format(max(b.Fuse.Value, b.Fuse.High), quantity.Ampere) + " is too large: at most " + s.fuse()
}

func bankHolds(_ scene, b measure.Before) bool { return b.Bank == "in-use" || b.Bank == "re-formed" }

func bankText(_ scene, b measure.Before) string {
	if b.Bank == "stored" {
		return "the bus capacitors have stood without voltage for more than a year: at full voltage at once they can burst"
	}
	return "it is not stated whether the bus capacitors were at voltage within a year"
}

// reform says how a bank that was stored is brought back. Rated voltage through about 100 Ω up to 100 V, 1 kΩ above, for
// 1 h, then 12 to 48 h of rest: EPCOS, text on aluminium electrolytics, in a mirror. Four steps of 25 %, 120 min each,
// after three years: PowerFlex 70 reforming, industrialmonitordirect.com. The year itself: MHI/ECMA white paper on
// capacitor storage, shelf life from the last power-up. All second-hand; the drive maker's own instruction goes before
// them. It puts power on, so that it is told only when nothing else is missing.
func reform(s scene, b measure.Before) string {
	how := s.reformHow() + " (--bank re-formed)"
	if b.Bank == "stored" {
		return how
	}
	return "ask when the board last ran: within a year, state --bank in-use; longer ago, or not known, " + how
}

func (s scene) reformHow() string {
	if !s.reform {
		return "the bank is re-formed first, under conditions of its own: they are told when nothing else is missing"
	}
	ohm := "100 Ω"
	if s.highestBus() > 100 {
		ohm = "1 kΩ"
	}
	return "re-form the bus capacitors first: rated voltage through about " + ohm + " (100 Ω for capacitors of up to 100 V, 1 kΩ above) for 1 h, then let them rest 12 to 48 h; " +
		"after more than three years in steps of 25 % of the rated voltage, 120 min each; never by a bare mains connection, capacitors have burst that way (a capacitor maker's and a drive guide's figures, both second hand; the maker's own instruction comes first)"
}

// highestBus is the highest voltage of the bus in volts, on whichever board it is higher.
func (s scene) highestBus() float64 {
	highest := 0.0
	for _, b := range s.boards {
		highest = max(highest, busVoltage(b).Value)
	}
	return highest
}

func probeHolds(_ scene, b measure.Before) bool {
	switch {
	case b.Probe == "differential", b.Probe == "isolated-input":
		return true
	case b.Probe != "earth-clip":
		return false
	case b.ClipOn == "earthed-node":
		return true
	}
	return b.ClipOn == "live-node" && b.Supply == "isolated" && b.EarthClips == 1
}

func probeText(_ scene, b measure.Before) string {
	switch {
	case b.Probe == "":
		return "it is not stated what the probe's reference is"
	case b.Probe != "earth-clip":
		return "a probe with the reference \"" + b.Probe + "\" is not known"
	case b.ClipOn == "":
		return "it is not stated what the earth clip is on"
	case b.Supply != "isolated":
		return "an earth clip on a live node of a board whose supply is not stated as isolated is a short to earth through the scope"
	case b.EarthClips > 1:
		return "with more than one earth clip on the board the clips short it between themselves, isolated supply or not"
	}
	return "it is not stated that this earth clip is the only one on the board"
}
