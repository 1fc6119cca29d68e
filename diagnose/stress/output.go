package stress

import (
	"math"

	"drivemend/diagnose/circuit"
)

// junctionStep is the voltage beside which the depletion capacitance is at half its zero-bias slope: C goes with
// 1/√(v + 0.8 V).
const junctionStep = 0.8

// step is one stage of a capacitance that falls with the voltage: its constant up to a level.
type step struct{ farad, until float64 }

// depletion is an output capacitance that falls with the voltage, C(v) = C_ref·√((v_ref+0.8)/(v+0.8)), in
// steps: to a quarter of the bus, to the bus, half way to top, and on to 1.3·top and beyond. Each takes the same charge
// as the curve between its ends. A single constant over all would be twice what a ring above the bus sees, and put the
// peak of a cut edge 17 % too low. Against ngspice with the curve itself, twenty edges differ by less than 1.5 % where
// the peak stays near top; by up to 6 % where a cut edge goes to three times the bus, and by 8 % where a ring swings
// far below the bus and up again (a part that came back on the way down is not charged a second time).
func depletion(farad, at, bus, top float64) []step {
	levels, from, out := []float64{bus / 4, bus, (bus + top) / 2}, 0.0, []step(nil)
	for _, to := range levels {
		out = append(out, step{meanCapacitance(farad, at, from, to), to})
		from = to
	}
	return append(out, step{meanCapacitance(farad, at, from, 1.3*top), math.Inf(1)})
}

// meanCapacitance takes the same charge as the falling one between two voltages:
// ∫C dv/(to−from) = 2·C_ref·√(v_ref+0.8)·(√(to+0.8) − √(from+0.8))/(to−from).
func meanCapacitance(farad, at, from, to float64) float64 {
	root := func(v float64) float64 { return math.Sqrt(v + junctionStep) }
	return 2 * farad * root(at) * (root(to) - root(from)) / (to - from)
}

// steps are those of the victim's output capacitance; a single one when it is constant.
func (s scene) steps() []step {
	c := s.get("switch.output_capacitance") * float64(s.in.bank)
	if s.at == 0 {
		return []step{{c, math.Inf(1)}}
	}
	return depletion(c, s.at, s.bus, math.Max(s.rated, 1.25*s.bus))
}

// meanFarad is the victim's output capacitance as a constant up to the bus.
func (s scene) meanFarad() float64 { return s.upToBus(s.get("switch.output_capacitance"), s.in.bank) }

// oppositeFarad is the same of the opposite switch.
func (s scene) oppositeFarad() float64 {
	return s.upToBus(s.opposite("switch.output_capacitance"), s.in.farBank)
}

func (s scene) upToBus(farad float64, bank int) float64 {
	if s.at > 0 {
		farad = meanCapacitance(farad, s.at, 0, s.bus)
	}
	return farad * float64(max(bank, 1))
}

// freewheelFarad is that of a chopper's freewheel diode; silent, half of the switch's (judgement).
func (s scene) freewheelFarad() float64 {
	if farad := s.get("freewheel.capacitance"); farad > 0 {
		return farad
	}
	return s.meanFarad() / 2
}

// deplete takes away what the output capacitance loses at a step, and gives the current that part drew.
func (c *cell) deplete(run *circuit.Run, k int) (amps float64) {
	amps = run.BranchCurrent(depletionName(k))
	run.Retarget(depletionName(k)+"-end", circuit.Constant(c.s.beyond()))
	return amps
}

// climbTo runs until the chip is at a level, past the steps of the output capacitance on the way; false when the chip
// is not there by the end.
func (c *cell) climbTo(run *circuit.Run, probe int, level, end float64) (reached bool, err error) {
	for ; c.level < len(c.victim.output)-1 && c.victim.output[c.level].until < level; c.level++ {
		if reached, err = run.To(end, probe, c.victim.output[c.level].until); err != nil || !reached {
			return false, err
		}
		c.deplete(run, c.level)
	}
	return run.To(end, probe, level)
}

// follow runs on to a time, past the steps of the output capacitance that come.
func (c *cell) follow(run *circuit.Run, probe int, end float64) error {
	for ; c.level < len(c.victim.output)-1; c.level++ {
		reached, err := run.To(end, probe, c.victim.output[c.level].until)
		if err != nil || !reached {
			return err
		}
		c.deplete(run, c.level)
	}
	_, err := run.To(end, -1, 0)
	return err
}
