package stress

import (
	"math"

	"drivemend/diagnose/circuit"
)

const (
	recoverySpan = 8.0  // time constants of the recovery's fall that are followed before it ends in a straight line
	leftForward  = 1e-6 // of the load current that the diode may still carry when it is taken as blocking
	rampSpan     = 10.0 // how far the closing channel's ramp goes on, over load and recovery current
	refillSpan   = 5.0  // time constants of a network that empties through its resistor, followed for its heat
)

// closingSlope is the current slope of the bank that closes.
func (s scene) closingSlope() float64 {
	bank := s.in.bank
	if s.leg {
		bank = s.in.farBank
	}
	return s.opposite("switch.turn_on_slope") * float64(max(bank, 1)) * math.Max(s.steep, 1)
}

// turnOn solves the closing edge: the opposite switch takes the load current over on a ramp, the victim's diode
// recovers, and the closing switch's voltage then falls no faster than its gate lets it. The victim's network starts
// empty, that of the closing switch at the bus.
func (s scene) turnOn() (*Edge, error) {
	s, err := s.settled()
	if err != nil {
		return nil, err
	}
	c, r := s.closing(), s.recovery()
	slope := s.closingSlope()
	whole := (s.amps + r.amps) / slope
	drain := c.Node("drain")
	c.Voltage("surge", c.chip, drain, circuit.Constant(0))
	c.Current("channel", drain, 0, circuit.Waveform{{T: 0, V: 0}, {T: rampSpan * whole, V: rampSpan * (s.amps + r.amps)}})
	c.Voltage("floor-level", c.Node("floor"), 0, circuit.Constant(0))
	c.Diode("floor", c.Node("floor"), drain, 0, floorSlope)
	c.Current("recovery", c.far, c.load, circuit.Constant(r.amps))
	run, probe, err := s.start(c)
	if err != nil {
		return nil, err
	}
	surge := run.ProbeCurrent("surge")
	rises := (s.amps + r.amps) / math.Min(slope, s.bus/s.commutation()) // where the loop is slower than the switch
	reached, err := run.To(3*rises+s.afterClosing(r), run.ProbeCurrent("loop"), s.amps*(1-leftForward)+r.amps)
	if err == nil && reached {
		err = c.block(run, probe, r)
	}
	e := Edge{Name: turnOn, Shape: shapeRamp}
	e.Surge, _ = run.Peak(surge)
	return c.read(run, probe, e), err
}

// block is the closing from the moment the diode blocks.
func (c *cell) block(run *circuit.Run, probe int, r recovered) error {
	t, level := run.Time(), run.Voltage(c.chip, 0)
	recovery, decay := r.fall(t)
	run.Retarget("recovery", recovery, decay...)
	if level > 0 {
		falling, curve := c.s.collapse(t, level)
		run.Retarget("floor-level", falling, curve)
	}
	return c.follow(run, probe, t+c.s.afterClosing(r))
}

// collapse is the fall of the closing switch's voltage from a level at time t. At the bus its gate lets it fall at the
// closing slope; the capacitance to the gate grows as the voltage falls, with its root, so that it ends as a parabola.
func (s scene) collapse(t, level float64) (circuit.Waveform, circuit.Curve) {
	whole := 2 * math.Sqrt(level*s.bus) / s.fallSlope()
	w := circuit.Waveform{{T: t, V: level}, {T: t + whole, V: 0}}
	return w, circuit.Parabola(t, t+whole, level, -2*level/whole, 2*level/(whole*whole))
}

// fall is the reverse current of a diode from the moment it blocks: a decay, and its tangent at the end.
func (r recovered) fall(t float64) (circuit.Waveform, []circuit.Curve) {
	if r.amps <= 0 || r.time <= 0 {
		return circuit.Constant(0), nil
	}
	end := t + recoverySpan*r.time
	w := circuit.Waveform{{T: t, V: r.amps}, {T: end, V: r.amps * math.Exp(-recoverySpan)}, {T: end + r.time, V: 0}}
	return w, []circuit.Curve{circuit.Decay(t, end, r.amps, r.time)}
}

// fallSlope is how fast the voltage of the closing switch falls.
func (s scene) fallSlope() float64 { return s.opposite("switch.closing_slope") }

// afterClosing is how long a closing is followed once the diode blocks: recovery, fall and some turns of the slowest
// ring; where the heat is wanted, until the network of the closing switch has emptied.
func (s scene) afterClosing(r recovered) float64 {
	farad := s.ringFarad() + s.freewheelFarad()
	span := recoverySpan*r.time + 2*s.bus/s.fallSlope() + s.turns()*2*math.Pi*math.Sqrt(s.henry()*farad)
	if !s.fast {
		span += refillSpan * s.get("snubber.resistance") * s.networkFarad()
	}
	return span
}
