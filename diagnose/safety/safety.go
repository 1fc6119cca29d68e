// Package safety says what energy stands on a board, how to take it off, and which instructions may be given at
// this moment. It reads the case record only; the time is an argument, and nothing is kept between calls.
//
// Hold points (numbers as they are shown to the technician):
//
//	0  isolation: locked, motor unplugged or its shaft locked, other sources none or named and off
//	1  every store of energy has a fresh dead check
//	2  a dead check ages, a shorting link blocks, power ends everything
//	3  conditions of a powered step, of the insulation tester and of a double pulse
//	4  conditions of scope and injection steps; a camera reading on bare metal is a lower bound
//	5  cautions stand where the hazard is
//	6  a reading taken outside its hold point is kept and marked
//
// Check keeps points 0 to 4 before an instruction is given, OutsideHoldPoint judges a reading by them afterwards. What
// each kind of work asks for is one table of conditions (conditions.go), and what a statement before a step has to say
// is one table of clauses (clauses.go). The lower bound of point 4 belongs to whoever reads the camera.
//
// Everything here gives way to local codes and licensed practice.
package safety

import (
	"math"
	"time"

	"drivemend/measure/quantity"
)

// Need is the state of the board that a step requires, in the words of a case file and a rule base.
type Need string

// The needs. NeedQuestion, NeedDead, NeedControlPower, NeedLowBus and NeedFull are the values of a test's needs;
// NeedDeadCheck and NeedDischarge are the two steps that lead to a dead board.
const (
	NeedQuestion     Need = "question"      // asking and looking up: nothing is touched
	NeedDeadCheck    Need = "dead-check"    // measuring the voltage at a store of energy
	NeedDischarge    Need = "discharge"     // putting a resistor across a store
	NeedDead         Need = "dead"          // ohms, diode, capacitance, ESR, injection
	NeedControlPower Need = "control-power" // control supply on, bus disconnected
	NeedLowBus       Need = "low-bus"       // current-limited bus
	NeedFull         Need = "full"          // full bus
)

// Needs lists every need in the order in which a job meets them.
func Needs() []Need {
	return []Need{NeedQuestion, NeedDeadCheck, NeedDischarge, NeedDead, NeedControlPower, NeedLowBus, NeedFull}
}

// Powered tells whether a step of this need puts energy into the board. A need that is not known counts as powered.
func (n Need) Powered() bool {
	switch n {
	case NeedQuestion, NeedDeadCheck, NeedDischarge, NeedDead:
		return false
	}
	return true
}

// The limits the package works with.
const (
	// DeadVolts is the highest reading, DC and AC, at which an ohmmeter may be connected. It protects the meter and the
	// part. Common practice.
	DeadVolts = 5.0
	// LiveVolts is the voltage from which a part is treated as live. 29 CFR 1910.333(a)(1), 50 V to ground, read in a
	// restatement; the same figure for AC in NFPA 70E, restated by a laboratory.
	LiveVolts = 50.0
	// TouchVolts is the residual voltage that machines and drives are built to fall to after switching off. IEC 60204-1
	// 6.2.4, read in a clause-by-clause commentary.
	TouchVolts = 60.0
	// CheckLife is how long a dead check speaks for a bank that stands open: voltage comes back by itself. Common
	// practice.
	CheckLife = 10 * time.Minute
	// IsolationLife is how long a statement of isolation speaks, and never past its day: a lock is looked at again
	// whenever work is taken up again. The rule is common practice, the hours are a judgement.
	IsolationLife = 8 * time.Hour
)

// Basis tells where a figure comes from.
type Basis string

// The bases of a figure.
const (
	None     Basis = ""         // the store has no such figure of its own
	Stated   Basis = "stated"   // in the case, or given on the command line
	Computed Basis = "computed" // from stated figures alone
	Assumed  Basis = "assumed"  // not stated: the worst case of this class of board
	Measured Basis = "measured" // read at a dead check, above what was stated or assumed
)

// Figure is a number in an SI unit with its basis; Because says why a value that is not stated was taken.
type Figure struct {
	Value   float64
	Unit    quantity.Unit
	Basis   Basis
	Because string
}

// Known tells whether the figure rests on stated or measured values alone.
func (f Figure) Known() bool { return f.Basis == Stated || f.Basis == Computed || f.Basis == Measured }

// String gives the figure with its unit, and says so where it is assumed.
func (f Figure) String() string {
	if f.Basis == None {
		return "none of its own"
	}
	text := quantity.Format(f.Value, f.Unit)
	if f.Basis == Assumed {
		text += " (assumed)"
	}
	return text
}

// Energy gives the energy of a capacitor, E = ½CV², in joules.
func Energy(farad, volt float64) float64 { return 0.5 * farad * volt * volt }

// Charge gives the charge of a capacitor, Q = CV, in coulombs.
func Charge(farad, volt float64) float64 { return farad * volt }

// TimeTo gives the seconds a capacitor needs through a resistor from one voltage down to another, t = RC·ln(V0/V);
// 0 where it stands no higher to begin with. Both voltages must be above zero.
func TimeTo(ohm, farad, from, to float64) float64 {
	if from <= to {
		return 0
	}
	return ohm * farad * math.Log(from/to)
}

// format prints one value with its unit.
func format(value float64, unit quantity.Unit) string { return quantity.Format(value, unit) }
