package stress

import (
	"cmp"
	"fmt"
	"math"

	"drivemend/diagnose/circuit"
)

const (
	plainDrop    = 0.9     // V, forward voltage of a diode the case is silent about
	plainSlope   = 5e-3    // Ω, its slope resistance
	channelSlope = 1e-3    // Ω, of the element that holds the chip to a voltage ramp
	floorSlope   = 1e-4    // Ω, of the one that keeps a closing switch from taking what is not there
	mostSteps    = 500_000 // of the solver in one edge: a second or so
	mostVolts    = 1e9     // V, the solver's range is wider still
	leastHenry   = 1e-18   // H; a forward recovery of less is none
	leastAmps    = 0.1     // A, load current below which times and recovery no longer grow
	leastOhm     = 1e-6    // Ω, of a resistor that is stated as nothing
	leastDamping = 1e-4    // ratio of the loop's ring; one of less loses a thousandth in the turns that are followed
	ringsShown   = 3.0     // turns of the slowest ring that are followed
	ringsAtPeak  = 2.0     // the same where only the peak is wanted
)

// scene is one set of numbers to solve an edge for. Everything is seen from one switch, the victim; the other device of
// its commutation cell, which takes the current over, is the opposite switch of the leg or the freewheel diode.
//
//	(bus) rail ──[link]── local ──[opposite device]── load ──[loop]── terminal ──[package]── chip ──[victim]── 0
//
// The link is there only with a decoupling network, which lies from local to 0; else it is part of the loop. The load
// current flows from local to load. A high side is the mirror image, with the same figures.
type scene struct {
	in        *inputs
	x         []float64 // one value for each input
	bus       float64
	amps      float64
	kind      string // of the switch
	net       string // of the network that has all its parts
	moved     bool   // a chopper's network lies across its freewheel diode
	leg       bool   // the opposite device is a switch
	both      bool   // all gates go off at once: two legs swing the common link
	free      bool   // there is a freewheel path
	open      bool   // the tie of a recovery network is broken
	back      bool   // a clamp's resistor leads to the bus
	load      float64
	fall      fallShape
	steep     float64  // of the cut edge over its mean slope, of the closing edge over its slope; 0 counts as 1
	at        float64  // V, where the output capacitance was measured; 0 when it is constant
	rated     float64  // V, up to which the falling output capacitance is averaged
	stand     float64  // V, at which the chip avalanches; 0 when it does not
	held      float64  // V, that a clamp holds
	frequency float64  // Hz, of the PWM; 0 when not stated
	tested    blocking // how the diode was measured to block; its charge and softness are inputs
	outside   bool     // the terminals are watched too
	fast      bool     // only the peak is wanted
	most      int      // steps of the solver; 0 counts as mostSteps
}

// fallShape is a stated IGBT fall: the fraction that falls fast, and the tail's time constant.
type fallShape struct{ fraction, tail float64 }

func (s scene) get(key string) float64 {
	if k, ok := s.in.at[key]; ok {
		return s.x[k]
	}
	return 0
}

// opposite is what an input is of the opposite switch of the leg, where that differs.
func (s scene) opposite(key string) float64 {
	if k, ok := s.in.at[oppositeSwitch+key]; ok {
		return s.x[k]
	}
	return s.get(key)
}

// oppositeSwitch stands before the inputs that differ between the two switches of a leg.
const oppositeSwitch = "opposite "

// common is how often a part that all legs share counts for one of them.
func (s scene) common() float64 {
	if s.both {
		return 2
	}
	return 1
}

// link is the share of the loop that all legs share, and that lies before a decoupling network; where the case does
// not say, all of it.
func (s scene) link() float64 {
	if _, split := s.in.at["loop.link"]; split {
		return s.get("loop.link")
	}
	return s.get("loop.inductance")
}

// branch is the share of the loop that only this leg has.
func (s scene) branch() float64 { return math.Max(s.get("loop.inductance")-s.link(), 0) }

// henry is all the stray inductance of the commutation cell.
func (s scene) henry() float64 {
	l := s.branch() + s.common()*s.link() + s.ownPackage() + s.get("snubber.lead_inductance")
	if s.leg {
		l += s.oppositePackage()
	}
	return l
}

// commutation is the inductance in which the current rises at a closing: without the network's lead, and without the
// link where a decoupling network lies behind it.
func (s scene) commutation() float64 {
	l := s.henry() - s.get("snubber.lead_inductance")
	if s.net == "decoupling" {
		l -= s.common() * s.link()
	}
	return l
}

func (s scene) ownPackage() float64 { return s.get("switch.package_inductance") / float64(s.in.bank) }

func (s scene) oppositePackage() float64 {
	if !s.leg {
		return 0
	}
	return s.opposite("switch.package_inductance") / float64(max(s.in.farBank, 1))
}

// left is what an rc or rcd network still holds when the switch opens: V·exp(−shortest on-time/RC). Other networks
// have followed the switch.
func (s scene) left() float64 {
	if s.net != "rc" && s.net != "rcd" {
		return 0
	}
	rc := s.get("snubber.resistance") * s.get("snubber.capacitance")
	return s.bus * math.Exp(-s.get("pwm.shortest_on_time")/rc)
}

// beyond is a voltage above any that the chip can reach: bus and the load current through the impedance of
// everything inductive, ten times.
func (s scene) beyond() float64 {
	steps := s.steps()
	return math.Min(10*(s.bus+s.amps*math.Sqrt((s.henry()+s.load)/steps[len(steps)-1].farad)), mostVolts)
}

// turns is how many turns of the slowest ring are followed.
func (s scene) turns() float64 {
	if s.fast {
		return ringsAtPeak
	}
	return ringsShown
}

// start begins the transient and watches the victim, and the network's capacitor where more than the peak is wanted.
func (s scene) start(c *cell) (*circuit.Run, int, error) {
	options := []circuit.Option{circuit.WithLimit(cmp.Or(s.most, mostSteps))}
	if s.fast {
		options = append(options, circuit.WithoutEnergy(), circuit.WithoutTrace())
	}
	run, err := c.Start(options...)
	if err != nil {
		return nil, 0, fmt.Errorf("the edge circuit cannot be solved: %w", err)
	}
	victim := run.Probe(c.plus, c.minus)
	c.worked, c.struck, c.outside = -1, -1, -1
	if s.outside {
		c.outside = run.Probe(c.terminal, 0)
	}
	if s.stand > 0 {
		c.struck = run.ProbeCurrent("avalanche")
	}
	if !s.fast && s.net != "" {
		c.worked = run.ProbeCurrent(s.capacitorName())
	}
	return run, victim, nil
}

// capacitorName is the element of the network's capacitor at the device that switches, or at the freewheel diode.
func (s scene) capacitorName() string {
	if s.moved {
		return "far-snubber"
	}
	return "snubber"
}
