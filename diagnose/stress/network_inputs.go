package stress

import (
	"drivemend/measure/quantity"
)

// networkParts are the parts without which a network cannot be worked out.
var networkParts = map[string][]string{
	"capacitor":  {"snubber.capacitance"},
	"rc":         {"snubber.resistance", "snubber.capacitance"},
	"rcd":        {"snubber.resistance", "snubber.capacitance"},
	"clamp":      {"snubber.capacitance"},
	"suppressor": {"snubber.clamp_voltage"},
	"decoupling": {"snubber.capacitance"},
	"recovery":   {"snubber.reservoir"},
}

// shownParts are the parts of any network in the order they are shown.
var shownParts = []string{"snubber.resistance", "snubber.capacitance", "snubber.clamp_voltage", "snubber.slope_resistance",
	"snubber.reservoir", "snubber.link.inductance", "snubber.link.resistance"}

// partUnit are the units of all parts a network may have.
var partUnit = map[string]quantity.Unit{
	"snubber.capacitance": quantity.Farad, "snubber.resistance": quantity.Ohm, "snubber.clamp_voltage": quantity.Volt,
	"snubber.reservoir": quantity.Farad, "snubber.slope_resistance": quantity.Ohm,
	"snubber.link.inductance": quantity.Henry, "snubber.link.resistance": quantity.Ohm,
}

// network takes the parts of the snubber. One whose parts are not stated leaves the margin open: taking it as absent
// would be a guess.
func (g gatherer) network() {
	kind, ok := g.b.Word("snubber.kind")
	switch {
	case !ok:
		g.in.need("snubber.kind", "edges (taken as none)")
		return
	case networkParts[kind] == nil:
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
	g.furtherParts(kind)
}

// furtherParts takes what a network may state beyond its least.
func (g gatherer) furtherParts(kind string) {
	switch kind {
	case "rc":
		g.onTime()
	case "rcd":
		g.networkDiode()
		g.onTime()
	case "clamp":
		g.networkDiode()
		g.clamp()
	case "suppressor":
		g.suppressor()
	case "decoupling":
		g.take("snubber.resistance", quantity.Ohm, interval{5e-3, 10e-3, 30e-3}, "series resistance of a film capacitor, judgement")
	case "recovery":
		g.networkDiode()
		if g.stated("snubber.resistance") {
			g.take("snubber.resistance", quantity.Ohm, around(1, 1.2), "")
		}
		if tied, _ := g.b.Word("snubber.link.open"); tied != "yes" {
			g.take("snubber.link.inductance", quantity.Henry, interval{0.1e-6, 1e-6, 100e-6}, "a short tie or a small choke, judgement")
			g.take("snubber.link.resistance", quantity.Ohm, interval{0.01, 0.1, 1}, "a short tie, judgement")
		}
	}
}

func (g gatherer) networkDiode() {
	g.diode("snubber.diode")
	if g.stated("snubber.diode.slope_resistance") {
		g.take("snubber.diode.slope_resistance", quantity.Ohm, around(1, 2), "")
	}
}

// clamp takes the voltage a clamp holds, or its resistor, from which the voltage is worked out.
func (g gatherer) clamp() {
	if g.stated("snubber.resistance") {
		g.take("snubber.resistance", quantity.Ohm, around(1, 1.2), "")
	}
	if g.stated("snubber.clamp_voltage") {
		g.take("snubber.clamp_voltage", quantity.Volt, around(1, 1.1), "")
		return
	}
	if !g.stated("snubber.resistance") {
		g.in.need("snubber.clamp_voltage", "network clamp: the voltage it holds, or its resistor and the PWM frequency", forMargin)
	}
	if !g.stated("pwm.frequency") {
		g.in.need("pwm.frequency", "network clamp: the voltage its resistor leaves it at", forMargin)
	}
}

// suppressor takes how a suppressor's voltage rises with its current: silent, by a third at the worst current, as
// surge suppressors and varistors do (judgement); and its own capacitance.
func (g gatherer) suppressor() {
	ohm := 0.33 * g.value("snubber.clamp_voltage") / max(g.in.mid("load.stall_current"), leastAmps)
	g.take("snubber.slope_resistance", quantity.Ohm, around(ohm, 2), "a third more voltage at the worst current, judgement")
	g.take("snubber.capacitance", quantity.Farad, around(1*nano, 5), "1 nF, judgement")
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
