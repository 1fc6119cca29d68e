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
	g.outputCapacitance()
	g.take("switch.package_inductance", quantity.Henry, around(g.in.class.pack, 2), g.in.class.judged())
}

// gateScale scales the data-sheet fall time to the gate resistor in use: in proportion for a MOSFET, by the square
// root for an IGBT or bipolar (rule drawn from simulated gate-driven boards).
func (g gatherer) gateScale(kind string) {
	reference, fitted := g.value("switch.fall_time.gate_resistance"), g.value("gate.turn_off_resistance")
	if reference <= 0 || fitted <= 0 {
		return
	}
	scale := fitted / reference
	if kind == "igbt" || kind == "bipolar" {
		scale = math.Sqrt(scale)
	}
	in := &g.in.values[g.in.at["switch.fall_time"]]
	in.low, in.mid, in.high = in.low*scale, in.mid*scale, in.high*scale
}

// The plateau of the gate where the case gives no transfer curve (judgement).
const (
	plainThreshold = 4.0 // V
	overThreshold  = 2.5 // V, plateau less threshold
)

// slope takes the voltage slope at opening: stated, else from the gate, (plateau − off voltage)/(R·C_gc), else
// typical of the kind. C_gc has to be the one at the bus.
func (g gatherer) slope(typical float64) {
	taken, why := around(typical, 2), "typical of the kind of switch, judgement"
	threshold, off := plainThreshold, g.value("gate.off_voltage")
	if g.stated("switch.gate_threshold") {
		threshold = g.value("switch.gate_threshold")
	}
	ohm := g.value("gate.turn_off_resistance") + g.value("switch.internal_gate_resistance")
	charge := ohm * g.value("switch.gate_collector_capacitance")
	if drive := threshold + overThreshold - off; g.stated("gate.turn_off_resistance") && charge > 0 && drive > 0 {
		taken = around(drive/charge, 1.5)
		plateau := quantity.Format(threshold+overThreshold, quantity.Volt)
		why = "from the gate: (plateau − off voltage)/(R·C_gc), plateau " + plateau + ", judgement"
	}
	g.take("switch.rise_slope", quantity.VoltPerSecond, taken, why)
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

// junctionStep is the voltage beside which the depletion capacitance is at half its zero-bias slope: C goes with
// 1/√(v + 0.8 V).
const junctionStep = 0.8

// step is one stage of a capacitance that falls with the voltage: its constant up to a level.
type step struct{ farad, until float64 }

// depletion is an output capacitance that falls with the voltage, C(v) = C_ref·√((v_ref+0.8)/(v+0.8)), in
// steps: to a quarter of the bus, to the bus, half way to top, and on to 1.3·top and beyond. Each takes the same charge as the curve between its ends, ∫C dv/(to−from) = 2·C_ref·√(v_ref+0.8)·(√(to+0.8) − √(from+0.8))/(to−from).
// A single constant over all would be twice what a ring above the bus sees, and put the peak of a cut edge 17 % too
// low. Against ngspice with the curve itself, twenty edges differ by less than 1.5 % where the peak stays near top;
// by up to 6 % where a cut edge goes to three times the bus, and by 8 % where a ring swings far below the bus and up
// again (a part that came back on the way down is not charged a second time).
func depletion(farad, at, bus, top float64) []step {
	root := func(v float64) float64 { return math.Sqrt(v + junctionStep) }
	between := func(from, to float64) float64 { return 2 * farad * root(at) * (root(to) - root(from)) / (to - from) }
	levels, from, out := []float64{bus / 4, bus, (bus + top) / 2}, 0.0, []step(nil)
	for _, to := range levels {
		out = append(out, step{between(from, to), to})
		from = to
	}
	return append(out, step{between(from, 1.3*top), math.Inf(1)})
}

// loop takes the loop from the bus capacitor to the terminals; its two shares, if only they are stated, add up.
func (g gatherer) loop() {
	typical := g.in.class.loop
	if !g.stated("loop.inductance") && g.stated("loop.leg") && g.stated("loop.link") {
		l := g.value("loop.leg") + g.value("loop.link")
		assumed := g.b.Assumed("loop.leg") || g.b.Assumed("loop.link")
		g.in.add(input{key: "loop.inductance", unit: quantity.Henry, low: l, mid: l, high: l, assumed: assumed, why: "link and leg together"})
	} else {
		g.take("loop.inductance", quantity.Henry, typical, g.in.class.judged())
	}
	g.take("loop.resistance", quantity.Ohm, interval{5e-3, 20e-3, 40e-3}, g.in.class.judged())
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

// network takes the parts of the snubber. One whose parts are not stated, or that is not worked out, leaves the
// margin open: taking it as absent would be a guess.
func (g gatherer) network() {
	kind, ok := g.b.Word("snubber.kind")
	switch _, known := networkParts[kind]; {
	case !ok:
		g.in.need("snubber.kind", "opening edge (taken as none)")
		return
	case kind == "none":
		return
	case !known:
		g.in.need("snubber.kind", "the edge with a "+kind+" network is not worked out yet: none, capacitor, rc and rcd are", forMargin)
		return
	}
	if across, _ := g.b.Word("snubber.across"); across == "freewheel" {
		g.in.need("snubber.across", "the edge with a network across the freewheel diode is not worked out yet: across the switch is", forMargin)
		return
	}
	for _, key := range networkParts[kind] {
		if !g.stated(key) {
			g.in.need(key, "network "+kind, forMargin)
		}
	}
	for _, key := range networkParts[kind] {
		g.take(key, partUnit[key], around(1, 1.2), "")
	}
	g.take("snubber.lead_inductance", quantity.Henry, g.in.class.lead, g.in.class.judged())
	if kind == "rcd" {
		g.diode("snubber.diode")
		if g.stated("snubber.diode.slope_resistance") {
			g.take("snubber.diode.slope_resistance", quantity.Ohm, around(1, 2), "")
		}
	}
	if kind != "capacitor" {
		g.onTime()
	}
}

// onTime takes the shortest time the switch is closed, in which the network empties. Silent: a tenth of the period,
// 2 to 50 % of it; without a frequency five time constants of the network, one to ten (judgement).
func (g gatherer) onTime() {
	rc := g.in.mid("snubber.resistance") * g.in.mid("snubber.capacitance")
	taken, why := interval{rc, 5 * rc, 10 * rc}, "taken as five time constants of the network, judgement: state it"
	if f := g.value("pwm.frequency"); f > 0 {
		taken, why = interval{0.02 / f, 0.1 / f, 0.5 / f}, "taken as a tenth of the period, judgement: state it"
	}
	g.take("pwm.shortest_on_time", quantity.Second, taken, why)
}
