package stress

import (
	"fmt"
	"math"

	"drivemend/diagnose/circuit"
)

// device is one of the two of a commutation cell.
type device struct {
	output  []step  // of the bank; a single step where it is constant
	pack    float64 // H, of the bank
	volt    float64 // V, at the chip in the beginning
	network bool    // the network lies across it
	held    float64 // V, of the network's capacitor in the beginning, unless a clamp or the bus holds it
}

// cell is the commutation cell laid out as a circuit. The lower device opens or closes, the upper one takes the
// current over or gives it back.
type cell struct {
	*circuit.Circuit
	s                                      scene
	rail, local, load, terminal, chip, far int
	plus, minus                            int // of the victim's chip
	victim                                 device
	level                                  int // the step of its output capacitance that comes next
	struck                                 int // probe of the avalanche current; -1 without one
	outside                                int // probe of the terminals; -1 unless they are watched
	worked                                 int // probe of the network's capacitor current; -1 without one
}

// opening is the cell before the victim, its lower device, opens.
func (s scene) opening() *cell {
	lower := device{output: s.steps(), pack: s.ownPackage(), network: s.net != "" && !s.moved, held: s.left()}
	upper := device{volt: s.bus, network: s.net != "" && (s.leg || s.moved), held: s.bus}
	if s.leg {
		upper.output, upper.pack = []step{{s.oppositeFarad(), math.Inf(1)}}, s.oppositePackage()
	} else if farad := s.get("freewheel.capacitance"); farad > 0 {
		upper.output = []step{{farad, math.Inf(1)}}
	}
	c := s.lay(lower, s.amps)
	if s.free {
		c.upper(upper, 0)
		c.conducting("freewheel", c.load, c.far, "freewheel", false)
	}
	c.victim, c.plus, c.minus = lower, c.chip, 0
	if s.stand > 0 {
		c.Diode("avalanche", c.chip, 0, s.stand, channelSlope)
	}
	return c
}

// closing is the cell before the opposite switch, here the lower device, closes and the victim's diode recovers.
func (s scene) closing() *cell {
	drop := s.get("freewheel.forward_voltage") + s.amps*s.diodeSlope("freewheel")
	// The current already rises evenly: what the loop takes of the bus is missing at the chip.
	volt := math.Max(s.bus+drop-s.closingSlope()*s.commutation(), 0)
	lower := device{output: []step{{s.oppositeFarad(), math.Inf(1)}}, pack: s.oppositePackage(), volt: volt,
		network: s.net != "" && !s.moved, held: s.bus}
	upper := device{output: s.steps(), pack: s.ownPackage(), volt: -drop, network: s.net != "" && (s.leg || s.moved)}
	if !s.leg {
		lower.output, lower.pack = []step{{s.meanFarad(), math.Inf(1)}}, s.ownPackage()
		upper.output, upper.pack = []step{{s.freewheelFarad(), math.Inf(1)}}, 0
	}
	c := s.lay(lower, 0)
	c.upper(upper, -s.amps)
	c.Diode("freewheel", c.load, c.far, s.get("freewheel.forward_voltage"), s.diodeSlope("freewheel"))
	c.victim, c.plus, c.minus = upper, c.far, c.load
	if s.stand > 0 {
		c.Diode("avalanche", c.far, c.load, s.stand, channelSlope)
	}
	return c
}

// lay makes the cell without upper device and channel.
func (s scene) lay(lower device, current float64) *cell {
	n := circuit.New()
	c := &cell{Circuit: n, s: s, rail: n.Node("rail"), load: n.Node("load"), chip: n.Node("chip")}
	c.supply(current)
	c.local, c.far, c.terminal = c.rail, c.rail, c.chip
	loop, ohm := s.branch()+s.common()*s.link(), math.Max(s.get("loop.resistance"), leastOhm)
	if s.net == "decoupling" {
		c.decoupling(ohm, current)
		loop, ohm = s.branch(), leastOhm
	}
	c.shared("loop-resistance", c.load, n.Node("loop"), ohm, s.net != "decoupling")
	if lower.network && s.net != "decoupling" || s.outside {
		c.terminal = n.Node("terminal")
		c.Inductor("loop", n.Node("loop"), c.terminal, loop, current)
		c.Inductor("package", c.terminal, c.chip, lower.pack, current)
		if lower.network && s.net != "decoupling" {
			c.network("", c.terminal, 0, c.local, lower.held)
		}
	} else {
		c.Inductor("loop", n.Node("loop"), c.chip, loop+lower.pack, current)
	}
	c.dampLoop(loop)
	if s.free {
		c.Current("load", c.local, c.load, circuit.Constant(s.amps))
	} else {
		c.Inductor("load", c.local, c.load, s.load, s.amps)
	}
	c.output("", c.chip, 0, lower)
	c.Diode("reverse", 0, c.chip, plainDrop, plainSlope)
	return c
}

// dampLoop lays across the loop inductance what damps its ring beyond its resistance: currents at the ring's frequency
// run in the skin of copper and foils, and in whatever they induce. R = √(L/C)/(2ζ), with the output capacitance.
func (c *cell) dampLoop(henry float64) {
	ratio := c.s.get("loop.damping_ratio")
	if ratio < leastDamping || henry <= 0 {
		return
	}
	ohm := math.Sqrt(henry/c.s.meanFarad()) / (2 * ratio)
	c.Resistor("loop-damping", c.Node("loop"), c.terminal, ohm)
}

// shared lays the resistance of the loop. Where two legs swing it at once it carries, for each, twice the current less
// the load's, since one of them lets go what the other takes: 2·R and a source of R·I.
func (c *cell) shared(name string, from, to int, ohm float64, inLink bool) {
	if !c.s.both || !inLink {
		c.Resistor(name, from, to, ohm)
		return
	}
	middle := c.Node(name)
	c.Resistor(name, from, middle, 2*ohm)
	c.Voltage(name+"-offset", to, middle, circuit.Constant(c.s.amps*ohm))
}

// supply is a stiff source, or the bus capacitor fed through the supply inductance, which carries the load current; drawn
// is what the leg draws in the beginning.
func (c *cell) supply(drawn float64) {
	s, twice := c.s, c.s.common()
	farad := s.get("bus.capacitance") / twice
	if farad == 0 {
		c.Voltage("bus", c.rail, 0, circuit.Constant(s.bus))
		return
	}
	c.Voltage("supply", c.Node("supply"), 0, circuit.Constant(s.bus))
	c.Inductor("supply-inductance", c.Node("supply"), c.rail, twice*s.get("bus.supply_inductance"), s.amps)
	at := c.rail
	if esl := s.get("bus.esl"); esl > 0 {
		at = c.Node("bank")
		c.Inductor("bus-esl", c.rail, at, twice*esl, s.amps-drawn)
	}
	c.Resistor("bus-esr", at, c.Node("bus"), math.Max(twice*s.get("bus.esr"), leastOhm))
	c.Capacitor("bus", c.Node("bus"), 0, farad, s.bus)
}

// decoupling lays the link before the leg, and the network across the leg.
func (c *cell) decoupling(ohm, current float64) {
	s := c.s
	c.local = c.Node("local")
	c.far = c.local
	c.shared("link-resistance", c.rail, c.Node("link"), ohm, true)
	c.Inductor("link", c.Node("link"), c.local, s.common()*s.link(), current)
	at := c.lead("", c.local)
	c.Resistor("snubber-resistor", at, c.Node("snubber"), math.Max(s.get("snubber.resistance"), leastOhm))
	c.Capacitor("snubber", c.Node("snubber"), 0, s.get("snubber.capacitance"), s.bus)
}

// upper lays the upper device without its diode; current is what its package carries from the rail in the beginning.
func (c *cell) upper(d device, current float64) {
	if d.pack > 0 {
		c.far = c.Node("far")
		c.Inductor("far-package", c.local, c.far, d.pack, current)
	}
	c.output("far-", c.far, c.load, d)
	if d.network && c.s.net != "decoupling" {
		c.network("far-", c.load, c.local, 0, d.held)
	}
}

// output adds a bank's output capacitance. One that falls with the voltage is a constant and, for every step, a
// part that is only there below its level: that part lies in series with two diodes, of which one carries the charge
// of the first rise and is blocked by its source when the level is reached; the other one brings the part back when
// the chip falls below the level again.
func (c *cell) output(prefix string, plus, minus int, d device) {
	last := len(d.output) - 1
	if last < 0 {
		return
	}
	c.Capacitor(prefix+"output", plus, minus, d.output[last].farad, d.volt)
	for k := range last {
		name := depletionName(k)
		foot, block := c.Node(name), c.Node(name+"-end")
		c.Capacitor(name, plus, foot, d.output[k].farad-d.output[k+1].farad, d.volt)
		c.Voltage(name+"-end", block, minus, circuit.Constant(0))
		c.Diode(name+"-charge", foot, block, 0, 0.5)
		c.Diode(name+"-return", minus, foot, 0, 0.5)
	}
}

func depletionName(k int) string { return fmt.Sprintf("depletion-%d", k) }

// conducting adds a diode that begins to conduct, with its forward recovery, a resistor beside an inductor: R = V/I,
// L = R·t/3. Turned tells that it points from its second node to its first.
func (c *cell) conducting(name string, from, to int, key string, turned bool) {
	s := c.s
	volts, time := s.get(key+".forward_recovery.voltage"), s.get(key+".forward_recovery.time")
	end := to
	if ohm := volts / math.Max(s.amps, leastAmps); ohm*time/3 > leastHenry {
		end = c.Node(name + "-recovery")
		c.Resistor(name+"-recovery", end, to, ohm)
		c.Inductor(name+"-recovery-time", end, to, ohm*time/3, 0)
	}
	if turned {
		c.Diode(name, end, from, s.get(key+".forward_voltage"), s.diodeSlope(key))
		return
	}
	c.Diode(name, from, end, s.get(key+".forward_voltage"), s.diodeSlope(key))
}

func (s scene) diodeSlope(key string) float64 {
	if k, ok := s.in.at[key+".slope_resistance"]; ok {
		return s.x[k]
	}
	return plainSlope
}

// lead goes from a terminal over the network's lead inductance.
func (c *cell) lead(prefix string, from int) int {
	henry := c.s.get("snubber.lead_inductance")
	if henry <= 0 {
		return from
	}
	at := c.Node(prefix + "lead")
	c.Inductor(prefix+"lead", from, at, henry, 0)
	return at
}
