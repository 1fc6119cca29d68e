package stress

import (
	"fmt"
	"math"

	"drivemend/diagnose/circuit"
)

const (
	heldRounds = 60   // of the search for the voltage a clamp settles at
	heldWithin = 0.02 // of the current, which moves the voltage over the bus by half of that
)

// settled gives the scene with the voltage that its clamp holds: as stated, or where the charge of every edge at the
// PWM frequency and worst current leaves through the resistor.
func (s scene) settled() (scene, error) {
	if s.net != "clamp" || s.held > 0 {
		return s, nil
	}
	if s.held = s.get("snubber.clamp_voltage"); s.held > 0 {
		return s, nil
	}
	worst := s.quick()
	worst.amps = math.Max(s.amps, s.get("load.stall_current"))
	held, err := worst.fixedPoint()
	s.held = held
	return s, err
}

// fixedPoint is the voltage at which a clamp's resistor carries away as much as the edges bring: f·Q(V) = (V − bus)/R,
// to its own rail V/R. What the edges bring falls as the voltage rises, so that one point lies between; it is found by
// false position (Illinois rule: Dowell and Jarratt 1971, from memory). With the resistor to its own rail the edges may
// bring less than it draws at the bus, which then holds the clamp.
func (s scene) fixedPoint() (float64, error) {
	low, high := s.bus*(1+1e-6), s.bus+s.reach()
	over, err := s.surplus(low)
	if err != nil || over <= 0 {
		return s.bus, err
	}
	under, err := s.surplus(high)
	if err != nil || under >= 0 {
		return high, err
	}
	for range heldRounds {
		held := (low*under - high*over) / (under - over)
		left, err := s.surplus(held)
		switch {
		case err != nil:
			return 0, err
		case math.Abs(left) <= heldWithin*s.drain(held):
			return held, nil
		case left > 0:
			low, over, under = held, left, under/2
		default:
			high, under, over = held, left, over/2
		}
	}
	return (low*under - high*over) / (under - over), nil
}

// surplus is the current that the edges bring to a clamp, less what its resistor carries away.
func (s scene) surplus(held float64) (float64, error) {
	if !(held > 0) || math.IsInf(held, 0) { // nothing held would be looked for again, without end
		return 0, fmt.Errorf("the voltage the clamp settles at comes out as %g V; state snubber.clamp_voltage, or correct bus.nominal, "+
			"snubber.resistance and pwm.frequency", held)
	}
	s.held = held
	e, err := s.gateLimited()
	if err != nil {
		return 0, err
	}
	return s.frequency*e.charge - s.drain(held), nil
}

// drain is the current that the clamp's resistor carries away.
func (s scene) drain(held float64) float64 {
	if s.back {
		return (held - s.bus) / s.get("snubber.resistance")
	}
	return held / s.get("snubber.resistance")
}

// reach is a voltage over the bus that no clamp settles above: that of all the energy of the loop in the resistor,
// twice, and no less than a hundredth of the bus.
func (s scene) reach() float64 {
	watts := s.henry() * s.amps * s.amps * s.frequency
	over := math.Sqrt(s.get("snubber.resistance") * watts)
	return math.Max(2*over+s.frequency*s.amps*s.get("switch.fall_time")*s.get("snubber.resistance"), 0.01*s.bus)
}

// gained is the voltage that the reservoir of a recovery network gained in an edge.
func (c *cell) gained(run *circuit.Run) float64 {
	if c.s.net != "recovery" || !c.victim.network {
		return 0
	}
	return math.Abs(run.BranchVoltage(c.s.capacitorName())) - c.s.bus
}

// taken is the charge that a clamp took up in an edge: what its capacitor gained, and what its resistor carried away.
func (c *cell) taken(run *circuit.Run) float64 {
	s := c.s
	if s.net != "clamp" || !c.victim.network {
		return 0
	}
	name := "snubber"
	if c.plus == c.far {
		name = "far-snubber"
	}
	gained := s.get("snubber.capacitance") * (math.Abs(run.BranchVoltage(name)) - s.held)
	if s.get("snubber.resistance") > 0 {
		gained += s.drain(s.held) * run.Time()
	}
	return gained
}
