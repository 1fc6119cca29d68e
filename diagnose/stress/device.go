package stress

import (
	"math"

	"drivemend/measure/quantity"
)

// device takes the switch. The package inductance counts once for the bank: the parallel parts share the current.
func (g gatherer) device() {
	if !g.stated("switch.rated_voltage") {
		g.in.need("switch.rated_voltage", forMargin, "verdict")
	}
	kind, _ := g.b.Word("switch.kind")
	if kind == "" {
		g.in.need("switch.kind", "typical slope and the shape of the fall (taken as a MOSFET's)")
	}
	fall, rise := typicalEdge(kind, g.value("switch.rated_voltage"))
	g.take("switch.fall_time", quantity.Second, around(fall, 2), "typical of the kind of switch, judgement")
	g.gateScale(kind)
	g.slope(rise)
	g.turnOn(kind, rise)
	g.outputCapacitance()
	g.take("switch.package_inductance", quantity.Henry, around(g.in.class.pack, 2), g.in.class.judged())
}

// gateScale scales the data-sheet fall time to the gate resistor in use, with the resistance inside the part: by the
// power 0.75 for a MOSFET, whose source inductance limits it too, by the root for an IGBT or bipolar, whose stored charge
// does. Judgement: in proportion is the textbook's; the maker's test of the gate-driven reference boards shows less, 0.4 for
// MOSFETs and 0.2 for IGBTs in the middle, widely spread (TestModelRules), their own boards more.
func (g gatherer) gateScale(kind string) {
	reference, fitted := g.value("switch.fall_time.gate_resistance"), g.value("gate.turn_off_resistance")
	if reference <= 0 || fitted <= 0 {
		return
	}
	inside, power := g.value("switch.internal_gate_resistance"), mosfetFall
	if kind == "igbt" || kind == "bipolar" {
		power = igbtFall
	}
	g.scale("switch.fall_time", math.Pow((fitted+inside)/(reference+inside), power))
}

// The powers of the gate resistance with which fall times go.
const (
	mosfetFall = 0.75
	igbtFall   = 0.5
)

// igbtClosing is the power of the gate resistance with which an IGBT's closing slope goes; a MOSFET's goes in proportion.
// Judgement: in the maker's test of the reference boards both go with about the root (TestModelRules).
const igbtClosing = 0.7

// plainThreshold is a gate's threshold where the case gives none (judgement).
const plainThreshold = 4.0 // V

// overThreshold is how far the plateau of the gate lies over its threshold at the rated current: judgement, after what
// transfer curves of such parts show.
func overThreshold(kind string) float64 {
	switch kind {
	case "igbt":
		return 4
	case "sic-mosfet":
		return 5
	}
	return 2.5
}

// slope takes the voltage slope at opening: stated, else from the gate, (plateau − off voltage)/(R·C_gc), else
// typical of the kind. C_gc has to be the one at the bus.
func (g gatherer) slope(typical float64) {
	plateau := g.plateau(1)
	drive := plateau - g.value("gate.off_voltage")
	g.take("switch.rise_slope", quantity.VoltPerSecond, around(typical, 2), "typical of the kind of switch, judgement",
		g.byGate("gate.turn_off_resistance", plateau, drive, "(plateau − off voltage)/(R·C_gc)"))
}

// plateau is the gate voltage at which the switch carries so many times the worst current while its voltage moves: over the
// threshold it goes with the root of the current, as the square law of a saturated channel has it. Without a rated current
// it is that at the rated current.
func (g gatherer) plateau(times float64) float64 {
	threshold, share := g.value("switch.gate_threshold"), 1.0
	if threshold <= 0 {
		threshold = plainThreshold
	}
	if rated := g.value("switch.rated_current") * float64(g.in.bank); rated > 0 {
		share = times * g.in.mid("load.stall_current") / rated
	}
	kind, _ := g.b.Word("switch.kind")
	return threshold + overThreshold(kind)*math.Sqrt(share)
}

// byGate is a voltage slope that the gate circuit makes: what drives it over the resistance times C_gc; nothing when
// the case does not state enough.
func (g gatherer) byGate(resistor string, plateau, drive float64, formula string) known {
	charge := (g.value(resistor) + g.value("switch.internal_gate_resistance")) * g.value("switch.gate_collector_capacitance")
	if !g.stated(resistor) || charge <= 0 || drive <= 0 {
		return known{}
	}
	why := fromGate + formula + ", plateau " + quantity.Format(math.Round(10*plateau)/10, quantity.Volt) + ", judgement"
	return known{around(drive/charge, 1.5), why}
}

// turnOn takes the current slope at closing, stated at its own gate resistance or typical, and the slope at which the
// voltage then falls: by the gate, (on voltage − plateau)/(R·C_gc), or as typical as at opening.
func (g gatherer) turnOn(kind string, rise float64) {
	amps := max(g.value("switch.rated_current"), 1)
	g.take("switch.turn_on_slope", quantity.AmperePerSecond, around(amps/typicalRise(kind), 2.5), "rated current within the typical rise time of the kind, judgement")
	reference, fitted := g.value("switch.turn_on_slope.gate_resistance"), g.value("gate.turn_on_resistance")
	if inside := g.value("switch.internal_gate_resistance"); reference > 0 && fitted > 0 {
		scale := (reference + inside) / (fitted + inside)
		if kind == "igbt" || kind == "bipolar" {
			scale = math.Pow(scale, igbtClosing)
		}
		g.scale("switch.turn_on_slope", scale)
	}
	on := g.value("gate.on_voltage")
	plateau := min(g.plateau(closingShare), (1-leastDrive)*on)
	g.take("switch.closing_slope", quantity.VoltPerSecond, around(rise, 2), "typical of the kind of switch, judgement",
		g.byGate("gate.turn_on_resistance", plateau, on-plateau, "(on voltage − plateau)/(R·C_gc)"))
}

// What a closing switch has while its voltage falls (judgement).
const (
	closingShare = 1.5     // its current over the load's: it carries the recovery too
	leastDrive   = 1.0 / 6 // of the on voltage, what is left over the plateau at the least
)

// fromGate begins the reason of a slope that the gate circuit makes.
const fromGate = "from the gate: "

// scale multiplies an input and its interval.
func (g gatherer) scale(key string, by float64) {
	in := &g.in.values[g.in.at[key]]
	in.low, in.mid, in.high = in.low*by, in.mid*by, in.high*by
}

// outputCapacitance takes one device's output capacitance. Given at a voltage it falls with the voltage; the circuit
// has constant capacitors only and takes it in steps (see depletion), which is said among the assumptions.
func (g gatherer) outputCapacitance() {
	c := 20e-12 * max(1, g.value("switch.rated_current"))
	in := g.take("switch.output_capacitance", quantity.Farad, around(c, 3), "20 pF for each rated ampere, judgement")
	if at, ok := g.b.Quantity("switch.output_capacitance.voltage"); ok && !in.assumed {
		g.in.values[g.in.at[in.key]].why = "given at " + quantity.Format(at.Value, quantity.Volt) + ": falls with the root of the voltage, taken in steps of equal charge"
	}
}

// loop takes the loop from the bus capacitor to the terminals; its two shares, if only they are stated, add up.
func (g gatherer) loop() {
	leg, link := g.value("loop.leg"), g.value("loop.link")
	split := g.stated("loop.leg") && g.stated("loop.link")
	if !g.stated("loop.inductance") && split {
		l := leg + link
		assumed := g.b.Assumed("loop.leg") || g.b.Assumed("loop.link")
		g.in.add(input{key: "loop.inductance", unit: quantity.Henry, low: l, mid: l, high: l, assumed: assumed, why: "link and leg together"})
	} else {
		g.take("loop.inductance", quantity.Henry, g.in.class.loop, g.in.class.judged())
	}
	if share := g.in.mid("loop.inductance"); g.stated("loop.leg") && !g.stated("loop.link") {
		link = max(share-leg, 0)
	}
	if g.stated("loop.leg") || g.stated("loop.link") {
		g.in.add(input{key: "loop.link", unit: quantity.Henry, low: link, mid: link, high: link})
	}
	g.take("loop.resistance", quantity.Ohm, interval{5e-3, 20e-3, 40e-3}, g.in.class.judged())
	g.take("loop.damping_ratio", quantity.Ratio, interval{0.02, 0.05, 0.1}, "rings of such loops as scopes show them, judgement")
}

// freewheel takes the diode that carries the load when the switch is open.
func (g gatherer) freewheel() {
	if fitted, _ := g.b.Word("freewheel.fitted"); fitted == "" || fitted == "unknown" {
		g.in.need("freewheel.fitted", "opening edge (taken as fitted)")
	}
	g.diode("freewheel")
	if g.stated("freewheel.capacitance") {
		g.take("freewheel.capacitance", quantity.Farad, around(1, 2), "")
	}
}

func (g gatherer) diode(key string) {
	g.take(key+".forward_voltage", quantity.Volt, interval{0.7, plainDrop, 1.5}, "0.9 V where the case is silent")
	volts, time := g.in.class.recovery(g.value("switch.rated_voltage"), g.in.mid(key+".forward_voltage"))
	g.take(key+".forward_recovery.voltage", quantity.Volt, around(volts, 2), g.in.class.judged())
	g.take(key+".forward_recovery.time", quantity.Second, around(time, 2), g.in.class.judged())
}

// softness takes how the reverse current of the diode ends. A stated one is read off a test whose own loop may make the
// diode look harder than it is: it lies between what is stated and three times that (judgement; on the reference boards the
// current lasts 0.3 to 2.5 times as long as the test says, 1.2 times in the middle: TestModelRules).
func (g gatherer) softness() {
	in := g.take("freewheel.softness", quantity.Ratio, interval{0.1, 0.3, 1}, "0.3 where the case is silent")
	if in.assumed || in.open() {
		return
	}
	k := g.in.at[in.key]
	g.in.values[k].low, g.in.values[k].mid, g.in.values[k].high = in.mid, 1.5*in.mid, 3*in.mid
	g.in.values[k].why = "stated as its test has it, whose loop may make the diode look harder: up to three times that, judgement"
}

// recovery takes how the diode blocks: its charge as stated, else from the time it takes; a Schottky diode has none.
func (g gatherer) recovery() {
	if g.in.mid("freewheel.forward_voltage") < schottkyDrop && !g.stated("freewheel.recovery_charge") {
		return
	}
	g.softness()
	if g.stated("freewheel.recovery_charge") {
		in := g.take("freewheel.recovery_charge", quantity.Coulomb, around(1, 1.5), "")
		if !in.open() {
			k := g.in.at[in.key]
			g.in.values[k].low, g.in.values[k].high = in.low/recoveryDoubt, in.high*recoveryDoubt
			g.in.values[k].why = "stated at another current, slope or temperature: carried over by the life of the charge, within 1.5 times, judgement"
		}
		return
	}
	kind, _ := g.b.Word("switch.kind")
	g.take("freewheel.recovery_time", quantity.Second, around(typicalRecovery(kind, g.value("switch.rated_voltage")), 2),
		"typical of the kind of diode, judgement")
}
