package stress

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
)

// sample is one board drawn for the comparison, in SI units. It is written down twice, once as a scene for the
// solver and once as a deck: the two share nothing but these numbers.
type sample struct {
	topology, edge                                 string // chopper, leg, all-off, unclamped; the shape
	kind, net                                      string
	moved, open, back                              bool // network across the freewheel diode; tie broken; clamp's resistor to the bus
	bus, amps, loop, ohm, pack, farad, fall, slope float64
	leg                                            float64 // H, the leg's own share of the loop; 0: all of it is common
	bank, farBank                                  int
	farPack, farFarad                              float64 // one opposite device
	drop, recoveryV, recoveryT, ownOhm, junction   float64 // the freewheel diode
	store, esr, esl, supply                        float64
	lead, resistance, capacitance, onTime          float64
	diodeDrop, diodeV, diodeT, diodeOhm            float64 // the network's diode
	clamp, kneeOhm                                 float64
	reservoir, tieHenry, tieOhm                    float64
	henry                                          float64 // H, load without a freewheel path
	charge, soft, onSlope, closing                 float64 // recovery, and how the switch closes
	at, rated                                      float64 // V, where farad was measured and what the switch stands
}

// recipe is what a drawn board is made of.
type recipe struct {
	topology, edge, net string
	moved, open, back   bool
}

func (r recipe) String() string {
	name := r.topology + " " + r.edge + " " + r.net
	for _, word := range []struct {
		is   bool
		text string
	}{{r.moved, " across the freewheel diode"}, {r.open, ", tie broken"}, {r.net == "clamp" && r.back, " to the bus"}, {r.net == "clamp" && !r.back, " to the rail"}} {
		if word.is {
			name += word.text
		}
	}
	return name
}

// networkKinds are those that other tests draw from.
var networkKinds = []string{"none", "capacitor", "rc", "rcd"}

// placedNetworks are the networks that lie across a device.
var placedNetworks = []recipe{{net: "capacitor"}, {net: "rc"}, {net: "rcd"}, {net: "clamp", back: true}, {net: "clamp"},
	{net: "suppressor"}, {net: "recovery"}, {net: "recovery", open: true}}

// recipes are all that is compared: every network at every place of every topology with every edge. Those that stand
// first are drawn first: each network at each place opens in one of the two shapes and closes, then opens in the other.
func recipes() []recipe {
	var first, second []recipe
	add := func(r recipe, closes bool) {
		shapes := []string{shapeCut, shapeGate}
		n := len(first) + len(r.net)
		r.edge = shapes[n%2]
		first = append(first, r)
		if closes {
			r.edge = shapeRamp
			first = append(first, r)
		}
		r.edge = shapes[(n+1)%2]
		second = append(second, r)
	}
	for _, topology := range []string{"chopper", "leg", "all-off", "unclamped"} {
		closes := topology == "chopper" || topology == "leg"
		add(recipe{topology: topology, net: "none"}, closes)
		if topology != "unclamped" {
			add(recipe{topology: topology, net: "decoupling"}, closes)
		}
		for _, r := range placedNetworks {
			r.topology = topology
			add(r, closes)
			if topology == "chopper" {
				r.moved = true
				add(r, closes)
			}
		}
	}
	return append(first, second...)
}

// drawSample draws parasitics and parts over the ranges that boards from 24 to 800 V have.
func drawSample(n uint64, of recipe) sample {
	r := rand.New(rand.NewPCG(n, 7))
	decade := func(low, high float64) float64 { return low * math.Pow(high/low, r.Float64()) }
	b := sample{topology: of.topology, edge: of.edge, net: of.net, moved: of.moved, open: of.open, back: of.back}
	b.kind, b.bank, b.farBank = []string{"igbt", "mosfet"}[r.IntN(2)], 1+r.IntN(4), 1+r.IntN(4)
	b.bus, b.amps = decade(24, 800), decade(5, 150)
	b.loop, b.ohm, b.pack = decade(10e-9, 200e-9), decade(2e-3, 50e-3), decade(3e-9, 25e-9)
	b.leg = b.loop * (0.2 + 0.6*r.Float64())
	b.farad, b.fall, b.slope = decade(100e-12, 2e-9), decade(20e-9, 300e-9), decade(2e9, 50e9)
	b.farPack, b.farFarad = decade(3e-9, 25e-9), decade(100e-12, 2e-9)
	b.drop, b.recoveryV, b.recoveryT = decade(0.4, 2), decade(1, 40), decade(20e-9, 200e-9)
	b.ownOhm, b.diodeOhm = decade(1e-3, 20e-3), decade(2e-3, 50e-3)
	b.store, b.esr, b.esl, b.supply = decade(50e-6, 5e-3), decade(5e-3, 200e-3), decade(2e-9, 20e-9), decade(1e-6, 30e-6)
	b.lead, b.resistance, b.capacitance = decade(3e-9, 50e-9), decade(2, 60), decade(1e-9, 47e-9)
	b.onTime = decade(1, 10) * b.resistance * b.capacitance
	b.diodeDrop, b.diodeV, b.diodeT = decade(0.5, 2), decade(1, 40), decade(20e-9, 200e-9)
	b.clamp, b.kneeOhm = b.bus*decade(1.1, 1.8), decade(20e-3, 1)
	b.reservoir, b.tieHenry, b.tieOhm = decade(100e-9, 10e-6), decade(100e-9, 10e-6), decade(50e-3, 5)
	b.henry = decade(2e-6, 100e-6)
	b.charge, b.soft, b.onSlope, b.closing = decade(50e-9, 3e-6), decade(0.2, 2), decade(100e6, 3e9), decade(2e9, 30e9)
	b.junction = decade(50e-12, 1e-9)
	switch b.net { // parts of the size that such a network has
	case "clamp":
		b.capacitance, b.resistance = decade(47e-9, 2.2e-6), decade(50, 5e3)
	case "suppressor":
		b.capacitance = decade(50e-12, 5e-9)
	case "recovery":
		b.resistance = 0 // no bleeder
	case "decoupling":
		b.capacitance, b.resistance = decade(47e-9, 2.2e-6), decade(5e-3, 1)
	}
	if b.topology == "chopper" && b.edge != shapeRamp && r.IntN(2) == 0 {
		b.junction = 0
	}
	return b
}

// scene gives the board to the solver.
func (b sample) scene() scene {
	in := &inputs{at: map[string]int{}, bank: b.bank, farBank: b.farBank}
	s := scene{in: in, bus: b.bus, amps: b.amps, kind: b.kind, fast: true, at: b.at, rated: b.rated}
	s.moved, s.open, s.back, s.held = b.moved, b.open, b.back, b.clamp
	s.leg, s.both = b.topology == "leg" || b.topology == "all-off", b.topology == "all-off"
	if s.free = b.topology != "unclamped"; !s.free {
		s.load = b.henry
	}
	if b.net != "none" {
		s.net = b.net
	}
	for _, v := range b.values() {
		if b.net != "none" || !strings.HasPrefix(v.key, "snubber.") {
			s = s.put(v.key, v.value)
		}
	}
	return s
}

type keyed struct {
	key   string
	value float64
}

// values are the board's numbers by the solver's names.
func (b sample) values() []keyed {
	list := []keyed{
		{"loop.inductance", b.loop}, {"loop.resistance", b.ohm}, {"switch.package_inductance", b.pack},
		{"switch.output_capacitance", b.farad}, {"switch.fall_time", b.fall}, {"switch.rise_slope", b.slope},
		{"freewheel.forward_voltage", b.drop}, {"freewheel.forward_recovery.voltage", b.recoveryV},
		{"freewheel.forward_recovery.time", b.recoveryT}, {"bus.capacitance", b.store}, {"bus.esr", b.esr},
		{"bus.esl", b.esl}, {"bus.supply_inductance", b.supply}, {"snubber.lead_inductance", b.lead},
		{"snubber.resistance", b.resistance}, {"snubber.capacitance", b.capacitance}, {"pwm.shortest_on_time", b.onTime},
		{"snubber.diode.forward_voltage", b.diodeDrop}, {"snubber.diode.forward_recovery.voltage", b.diodeV},
		{"snubber.diode.forward_recovery.time", b.diodeT}, {"snubber.clamp_voltage", b.clamp},
		{"snubber.slope_resistance", b.kneeOhm}, {"snubber.reservoir", b.reservoir},
		{"snubber.link.inductance", b.tieHenry}, {"snubber.link.resistance", b.tieOhm},
		{"freewheel.recovery_charge", b.charge}, {"freewheel.softness", b.soft},
		{"switch.turn_on_slope", b.onSlope}, {"switch.closing_slope", b.closing},
		{"opposite switch.package_inductance", b.farPack}, {"opposite switch.output_capacitance", b.farFarad},
	}
	if b.leg > 0 {
		list = append(list, keyed{"loop.link", b.loop - b.leg})
	}
	if b.junction > 0 {
		list = append(list, keyed{"freewheel.capacitance", b.junction})
	}
	if b.ownOhm > 0 {
		list = append(list, keyed{"freewheel.slope_resistance", b.ownOhm}, keyed{"snubber.diode.slope_resistance", b.diodeOhm})
	}
	return list
}

// solve is the board's edge by the solver, with waveform and energies if wanted.
func (b sample) solve(fast bool) (*Edge, error) {
	s := b.scene()
	s.fast = fast
	switch b.edge {
	case shapeCut:
		return s.cut()
	case shapeGate:
		return s.gateLimited()
	case shapeRamp:
		return s.turnOn()
	}
	return nil, fmt.Errorf("%q is no edge", b.edge)
}
