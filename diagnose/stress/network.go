package stress

import "math"

// kneeAmps is the current at which a suppressor's clamp voltage is stated.
const kneeAmps = 1e-3 // A

// network lays the network across a device, from its moving terminal to its rail end; over is the other rail. On the
// upper device the rail end is the positive one, and everything in the network is turned round.
func (c *cell) network(prefix string, moving, still, over int, held float64) {
	n := net{cell: c, prefix: prefix, up: still != 0}
	at := c.lead(prefix, moving)
	s := c.s
	farad, ohm := s.get("snubber.capacitance"), s.get("snubber.resistance")
	inner := at
	if s.net != "capacitor" && s.net != "suppressor" {
		inner = c.Node(prefix + "snubber")
	}
	switch s.net {
	case "capacitor":
		n.capacitor("snubber", at, still, farad, held)
	case "rc":
		c.Resistor(prefix+"snubber-resistor", at, inner, ohm)
		n.capacitor("snubber", inner, still, farad, held)
	case "rcd":
		n.diode("snubber-diode", at, inner)
		c.Resistor(prefix+"snubber-resistor", at, inner, ohm)
		n.capacitor("snubber", inner, still, farad, held)
	case "clamp":
		n.diode("snubber-diode", at, inner)
		n.capacitor("snubber", inner, still, farad, s.held)
		if ohm > 0 {
			c.Resistor(prefix+"snubber-resistor", inner, n.bleeds(still, over), ohm)
		}
	case "suppressor":
		slope := s.get("snubber.slope_resistance")
		n.knee("suppressor", at, still, s.get("snubber.clamp_voltage")-kneeAmps*slope, slope)
		n.capacitor("snubber", at, still, farad, held)
	case "recovery":
		n.diode("snubber-diode", at, inner)
		n.capacitor("snubber", inner, still, s.get("snubber.reservoir"), s.bus)
		n.tie(inner, over)
		if ohm > 0 {
			c.Resistor(prefix+"snubber-resistor", inner, n.bleeds(still, over), ohm)
		}
	}
}

// net lays the parts of one network the right way round.
type net struct {
	*cell
	prefix string
	up     bool
}

func (n net) capacitor(name string, moving, still int, farad, volt float64) {
	if n.up {
		moving, still = still, moving
	}
	n.Capacitor(n.prefix+name, moving, still, farad, volt)
}

func (n net) diode(name string, moving, inner int) {
	n.conducting(n.prefix+name, moving, inner, "snubber.diode", n.up)
}

func (n net) knee(name string, moving, still int, volt, ohm float64) {
	if n.up {
		moving, still = still, moving
	}
	n.Diode(n.prefix+name, moving, still, volt, ohm)
}

// bleeds is where a resistor leads that empties the network's capacitor.
func (n net) bleeds(still, over int) int {
	if n.s.back {
		return over
	}
	return still
}

// tie is the way from the reservoir of a recovery network back to the bus.
func (n net) tie(reservoir, over int) {
	if n.s.open {
		return
	}
	at := n.Node(n.prefix + "tie")
	n.Resistor(n.prefix+"tie-resistance", reservoir, at, math.Max(n.s.get("snubber.link.resistance"), leastOhm))
	n.Inductor(n.prefix+"tie", at, over, n.s.get("snubber.link.inductance"), 0)
}
