package stress

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// usualRange is a numeric key that the edge reads, with the range in which boards usually have it (judgement).
type usualRange struct {
	key       string
	low, high float64
}

// usualRanges are all of them; conditions stand after the value they belong to.
var usualRanges = []usualRange{
	{"bus.nominal", 12, 800}, {"bus.highest", 15, 1000}, {"bus.capacitance", 10e-6, 10e-3}, {"bus.esr", 1e-3, 1},
	{"bus.esl", 2e-9, 100e-9}, {"bus.supply_inductance", 100e-9, 1e-3},
	{"load.running_current", 1, 300}, {"load.stall_current", 3, 900}, {"load.inductance", 10e-6, 100e-3},
	{"protection.trip_current", 3, 900}, {"protection.trip_delay", 1e-6, 1e-3}, {"protection.short_circuit_current", 10, 3000},
	{"switch.rated_voltage", 40, 1700}, {"switch.rated_current", 5, 400},
	{"switch.output_capacitance", 30e-12, 3e-9}, {"switch.output_capacitance.voltage", 1, 800},
	{"switch.fall_time", 8e-9, 500e-9}, {"switch.fall_time.gate_resistance", 1, 100},
	{"switch.fall.fraction", 0.3, 1}, {"switch.fall.tail_time", 30e-9, 2e-6},
	{"switch.rise_slope", 0.5e9, 80e9}, {"switch.turn_on_slope", 50e6, 10e9}, {"switch.turn_on_slope.gate_resistance", 1, 100},
	{"switch.closing_slope", 0.5e9, 80e9}, {"switch.avalanche.energy", 1e-3, 2}, {"switch.avalanche.current", 1, 200},
	{"switch.gate_threshold", 1, 6}, {"switch.gate_collector_capacitance", 3e-12, 500e-12},
	{"switch.gate_emitter_capacitance", 200e-12, 30e-9}, {"switch.internal_gate_resistance", 0.3, 10},
	{"switch.package_inductance", 1e-9, 40e-9}, {"switch.spread.delay", 1e-9, 100e-9},
	{"gate.on_voltage", 8, 20}, {"gate.off_voltage", -15, 0}, {"gate.turn_on_resistance", 1, 220}, {"gate.turn_off_resistance", 1, 220},
	{"loop.inductance", 5e-9, 500e-9}, {"loop.link", 3e-9, 300e-9}, {"loop.leg", 3e-9, 200e-9},
	{"loop.resistance", 1e-3, 0.1}, {"loop.damping_ratio", 0.01, 0.3},
	{"freewheel.forward_voltage", 0.3, 3}, {"freewheel.recovery_time", 20e-9, 1e-6}, {"freewheel.recovery_charge", 20e-9, 30e-6},
	{"freewheel.recovery_charge.current", 3, 300}, {"freewheel.recovery_charge.slope", 30e6, 3e9}, {"freewheel.softness", 0.05, 3},
	{"freewheel.forward_recovery.voltage", 1, 60}, {"freewheel.forward_recovery.time", 10e-9, 500e-9}, {"freewheel.capacitance", 10e-12, 3e-9},
	{"snubber.capacitance", 100e-12, 2.2e-6}, {"snubber.resistance", 0.5, 10e3}, {"snubber.clamp_voltage", 20, 1000},
	{"snubber.slope_resistance", 1e-3, 10}, {"snubber.reservoir", 10e-9, 100e-6}, {"snubber.link.inductance", 50e-9, 1e-3},
	{"snubber.link.resistance", 1e-3, 10}, {"snubber.lead_inductance", 2e-9, 200e-9},
	{"snubber.diode.forward_voltage", 0.3, 3}, {"snubber.diode.slope_resistance", 1e-3, 0.3},
	{"snubber.diode.forward_recovery.voltage", 1, 60}, {"snubber.diode.forward_recovery.time", 10e-9, 500e-9},
	{"pwm.frequency", 500, 200e3}, {"pwm.shortest_on_time", 100e-9, 100e-6}, {"cooling.coldest_air", -40, 40},
}

// mostNamed is how many values a refusal names.
const mostNamed = 3

// refusal says where the solver gave up and why, which stated values lie furthest from what boards usually have, and
// what to do about them.
func (p *problem) refusal(err error) string {
	what, _, _ := strings.Cut(err.Error(), "; ") // what follows is advice about circuits, not about boards
	said := strings.Join(append([]string{fmt.Sprintf("position %s, %s", p.position, what)}, p.misfits()...), "; ")
	named := p.oddValues(p.own, "")
	if p.leg() {
		for _, v := range p.oddValues(p.far, "switch.") {
			if v.text = p.opposite + ": " + v.text; !slices.ContainsFunc(named, func(have oddValue) bool { return have.key == v.key }) {
				named = append(named, v)
			}
		}
	}
	slices.SortStableFunc(named, func(a, b oddValue) int { return cmp.Compare(b.away, a.away) })
	if len(named) == 0 {
		return said + "; no stated value alone is unusual, but together they lie too far apart: check the prefixes of loop.inductance, " +
			"switch.fall_time, switch.rise_slope and of the network's parts against each other"
	}
	var texts []string
	for _, v := range named[:min(mostNamed, len(named))] {
		texts = append(texts, v.text)
	}
	return said + "; unusual among what the case states: " + strings.Join(texts, ", ") +
		"; check the prefix and unit, or take the key out so that the typical value stands in"
}

// oddValue is a stated value outside the usual range, and how far, as a logarithm.
type oddValue struct {
	key, text string
	away      float64
}

// oddValues lists the stated values of a board outside their usual range that bear on its edges, of keys that begin with
// a prefix.
func (p *problem) oddValues(b measure.Board, prefix string) []oddValue {
	var out []oddValue
	for _, r := range usualRanges {
		q, ok := b.Quantity(r.key)
		if !ok || !strings.HasPrefix(r.key, prefix) || p.bearsNot(r.key) || r.low <= 0 || q.Value >= r.low && q.Value <= r.high {
			continue
		}
		text := fmt.Sprintf("%s %s (usually %s to %s)", r.key, quantity.Format(q.Value, q.Unit), quantity.Format(r.low, q.Unit), quantity.Format(r.high, q.Unit))
		out = append(out, oddValue{r.key, text, r.away(q.Value)})
	}
	return out
}

// bearsNot tells whether no edge can depend on a key: parts that this network does not have, and ratings.
func (p *problem) bearsNot(key string) bool {
	return strings.HasPrefix(key, "snubber.") && !p.in.has(key) || strings.HasPrefix(key, "switch.avalanche.") ||
		key == "switch.spread.delay" || key == "cooling.coldest_air" || key == "pwm.frequency" && p.base.net != "clamp"
}

// away is how far a value lies outside the range, as a logarithm; nothing at all, where the key table allows it, is no
// slip of a prefix and counts as a factor of ten.
func (r usualRange) away(v float64) float64 {
	switch {
	case v <= 0:
		return math.Log(10)
	case v < r.low:
		return math.Log(r.low / v)
	}
	return math.Log(v / r.high)
}
