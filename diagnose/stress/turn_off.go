package stress

import (
	"math"

	"drivemend/diagnose/circuit"
)

const (
	igbtSteeper  = 1.6  // an IGBT without a stated fall shape is this much steeper than its mean
	straightRule = 0.8  // fall time 90 to 10 % over a straight fall (0.8·t(0–100))
	cosineRule   = 0.59 // the same for a raised cosine: (arccos(−0.8) − arccos(0.8))/π
	leastShare   = 1e-6 // of the load current; a channel that carries less at the bus has opened already
	tailSpan     = 4.0  // time constants of a tail that are followed
	tailEnd      = 0.25 // the last of them, in which it ends in a straight line
)

// span is how long an opening is followed.
func (s scene) span() float64 { return s.rise() + s.after() }

// rise is how long the chip may take to the bus.
func (s scene) rise() float64 {
	farad := s.ringFarad()
	rise := math.Max(s.bus/s.get("switch.rise_slope"), 1.5*farad*s.bus/math.Max(s.amps, leastAmps))
	if !s.free {
		rise += 2 * math.Pi * math.Sqrt(s.load*farad)
	}
	return rise
}

// after is how long it is followed from there: the fall, its tail and some turns of the slowest ring.
func (s scene) after() float64 {
	turns := s.turns() * 2 * math.Pi * math.Sqrt(s.henry()*s.ringFarad())
	if !s.free { // the load itself goes on driving the chip up
		turns += 2 * math.Pi * math.Sqrt(s.load*s.ringFarad())
	}
	if s.stand > s.bus { // until the avalanche has taken the current
		turns += (s.load + s.henry()) * s.amps / (s.stand - s.bus)
	}
	if !s.fast && s.net == "rc" { // until its heat is there
		turns += refillSpan * s.get("snubber.resistance") * s.get("snubber.capacitance")
	}
	return 3*s.get("switch.fall_time") + tailSpan*s.fall.tail + turns
}

// ringFarad is all the capacitance that the loop can ring with.
func (s scene) ringFarad() float64 {
	farad := s.steps()[0].farad + s.networkFarad() + s.get("freewheel.capacitance")
	if s.leg {
		farad += s.oppositeFarad()
	}
	return farad
}

// networkFarad is the network's capacitor where it swings with the edge; one that is held swings little.
func (s scene) networkFarad() float64 {
	switch s.net {
	case "capacitor", "rc", "rcd", "suppressor", "decoupling":
		return s.get("snubber.capacitance")
	}
	return 0
}

// cut solves the absolute edge: the channel current falls in a straight line from the load current to nothing
// within fall_time/0.8, while the voltage rises.
func (s scene) cut() (*Edge, error) {
	s, err := s.settled()
	if err != nil {
		return nil, err
	}
	c := s.opening()
	fall := s.get("switch.fall_time") / straightRule / math.Max(s.steep, 1)
	c.Current("channel", c.chip, 0, circuit.Waveform{{T: 0, V: s.amps}, {T: fall, V: 0}})
	run, probe, err := s.start(c)
	if err != nil {
		return nil, err
	}
	err = c.follow(run, probe, s.span())
	return c.read(run, probe, s.opened(shapeCut)), err
}

// gateLimited solves the edge a gate driver makes: the channel holds the chip to a ramp of rise_slope as long as it
// has current left to do so; from the moment the chip reaches the bus, what the channel then carries falls on a
// raised cosine whose steepness is that of the whole current falling in fall_time/0.59. What takes the current over at
// once cannot take it faster than the channel lets go (see lettingGo).
func (s scene) gateLimited() (*Edge, error) {
	s, err := s.settled()
	if err != nil {
		return nil, err
	}
	c := s.opening()
	slope, end := s.get("switch.rise_slope"), s.span()
	c.Voltage("ramp", c.Node("ramp"), 0, circuit.Waveform{{T: 0, V: 0}, {T: 2 * s.bus / slope, V: 2 * s.bus}})
	c.Diode("hold", c.chip, c.Node("ramp"), 0, channelSlope)
	held, curves := s.lettingGo(slope)
	c.Current("channel", c.chip, 0, held, curves...)
	run, probe, err := s.start(c)
	if err != nil {
		return nil, err
	}
	reached, err := c.climbTo(run, probe, s.bus, end)
	if err == nil && reached {
		err = c.letGo(run, probe, s.after())
	}
	return c.read(run, probe, s.opened(shapeGate)), err
}

// letGo is the fall of the channel from the moment the chip is at the bus.
func (c *cell) letGo(run *circuit.Run, probe int, after float64) error {
	s := c.s
	t, amps := run.Time(), math.Max(run.BranchCurrent("hold"), 0)+run.BranchCurrent("channel")
	if c.level < len(c.victim.output)-1 { // from here on the channel carries what the part now gone drew
		if drew := c.deplete(run, c.level); amps > 0 {
			amps += drew
		}
		c.level++
	}
	run.Retarget("ramp", circuit.Waveform{{T: t, V: s.beyond()}})
	if amps > leastShare*s.amps {
		fall, curves := s.cosine(t, amps)
		run.Retarget("channel", fall, curves...)
	} else {
		run.Retarget("channel", circuit.Constant(0))
	}
	return c.follow(run, probe, t+after)
}

// opened names the edge of an opening.
func (s scene) opened(shape string) Edge {
	e := Edge{Name: turnOff, Shape: shape}
	if s.both {
		e.Name = allOff
	}
	return e
}

// lettingGo is the least the channel carries on the way up to the bus, since its current cannot fall faster than the gate
// lets it: without a network across the switch what the output capacitance takes on the gate's ramp, with one what it
// leaves.
func (s scene) lettingGo(slope float64) (circuit.Waveform, []circuit.Curve) {
	amps := math.Min(s.amps, s.steps()[0].farad*slope)
	if s.across() {
		amps = s.amps - amps
	}
	if amps <= leastShare*s.amps {
		return circuit.Constant(0), nil
	}
	return s.cosine(0, amps)
}

// across tells whether a network lies across the victim.
func (s scene) across() bool { return s.net != "" && s.net != "decoupling" && !s.moved }

// cosine is the channel's fall from amps at time t, with a stated tail laid on if there is one: corners, and the curves
// between them.
func (s scene) cosine(t, amps float64) (circuit.Waveform, []circuit.Curve) {
	whole := s.get("switch.fall_time") / cosineRule
	fast := s.fall.fraction
	if fast == 0 {
		fast = 1
		if s.kind == "igbt" {
			whole /= igbtSteeper
		}
	}
	end, left := t+whole*amps/s.amps, amps*(1-fast)
	w, curves := circuit.Waveform{{T: t, V: amps}, {T: end, V: left}}, []circuit.Curve{circuit.Cosine(t, end, amps, left)}
	if left <= 0 {
		return w, curves
	}
	straight := end + (tailSpan-tailEnd)*s.fall.tail
	w = append(w, circuit.Point{T: straight, V: left * math.Exp(tailEnd-tailSpan)}, circuit.Point{T: end + tailSpan*s.fall.tail, V: 0})
	return w, append(curves, circuit.Decay(end, straight, left, s.fall.tail))
}
