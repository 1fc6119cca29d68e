package stress

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// limits says what a board states that these edges cannot follow to the end, one sentence each. The figures stand, but a
// verdict of within would claim too much.
func (p *problem) limits(f *Figures) []string {
	out := p.misfits()
	on, ok := p.own.Quantity("pwm.shortest_on_time")
	if turn := p.turn(f); ok && on.Value < turn {
		out = append(out, fmt.Sprintf("every edge is taken to begin after the ring of the one before, but pwm.shortest_on_time %s is shorter than "+
			"one turn of it, %s: the peaks of two edges may add up; correct the on-time, or damp the ring", quantity.Format(on.Value, quantity.Second),
			quantity.Format(turn, quantity.Second)))
	}
	return out
}

// misfits says which parts of the network do not go with the bus.
func (p *problem) misfits() []string {
	var out []string
	if key, farad := p.networkStore(); farad > 0 {
		if bank, ok := p.own.Quantity("bus.capacitance"); ok && farad > bank.Value {
			out = append(out, fmt.Sprintf("the network's %s %s is larger than the bus bank (bus.capacitance %s): charging it takes the bus down, "+
				"which is followed for the one edge only; check the prefix of both", key, quantity.Format(farad, quantity.Farad),
				quantity.Format(bank.Value, quantity.Farad)))
		}
	}
	volt, ok := p.own.Quantity("snubber.clamp_voltage")
	if highest := p.in.mid("bus.highest"); ok && p.in.has("snubber.clamp_voltage") && volt.Value < highest {
		out = append(out, fmt.Sprintf("the network begins to conduct at %s (snubber.clamp_voltage), under the highest bus of %s: it conducts "+
			"as long as the switch is open, and burns, which these edges do not show; it has to begin above the bus",
			quantity.Format(volt.Value, quantity.Volt), quantity.Format(highest, quantity.Volt)))
	}
	return out
}

// networkStore is the largest capacitor of the network that was worked out, with its key.
func (p *problem) networkStore() (key string, farad float64) {
	for _, k := range []string{"snubber.capacitance", "snubber.reservoir"} {
		if p.base.net != "" && p.in.mid(k) > farad {
			key, farad = k, p.in.mid(k)
		}
	}
	return key, farad
}

// turn is the longest turn of the rings of the edges shown; where none rings, that of the loop with the devices alone.
func (p *problem) turn(f *Figures) float64 {
	longest := 0.0
	for _, e := range f.Edges {
		if e.Ring > 0 {
			longest = max(longest, 1/e.Ring)
		}
	}
	if longest > 0 {
		return longest
	}
	s := p.nominal()
	other := s.freewheelFarad()
	if s.leg {
		other = s.oppositeFarad()
	}
	return 2 * math.Pi * math.Sqrt(s.henry()*(s.meanFarad()+other))
}
