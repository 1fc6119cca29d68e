package stress

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// Pulse is one avalanche of one device: its voltage stays at the breakdown while the current falls in a straight line
// to nothing. In a bank the device of the lowest breakdown takes all of it: the others do not conduct before it has
// let go, so nothing here is divided by the number of parallel parts. (A breakdown that rises with current and heat
// hands a little to the neighbours; that is not credited.)
type Pulse struct {
	Breakdown float64 // V, held all the time
	Amps      float64 // A, when the breakdown begins
	Time      float64 // s, until the current is gone
	Joule     float64 // J, turned into heat in the junction
}

// PulseOf gives the avalanche of an inductance (H) that carries a current (A) when the device reaches its breakdown
// (V), with the supply (V) in series that goes on feeding, or 0 where the supply is cut off:
// t = L·I/(BV−V), E = ½·L·I²·BV/(BV−V). Every value above zero, the supply from zero and below the breakdown.
// The breakdown of a hot MOSFET is some 1.2 to 1.3 times its rated voltage (from memory: application notes on
// avalanche ratings): 1.3 for the energy, 1.0 to ask whether it avalanches at all.
// Source: Toshiba, FAQ "how to calculate avalanche energy"; Renesas data sheet 2SK3069, rev. 11.00, p. 5.
func PulseOf(henry, amps, breakdown, supply float64) (Pulse, error) {
	const where = "avalanche"
	err := positive(where, argument{"inductance", henry, quantity.Henry}, argument{"current", amps, quantity.Ampere},
		argument{"breakdown voltage", breakdown, quantity.Volt})
	if err != nil {
		return Pulse{}, err
	}
	if !(supply >= 0 && supply < breakdown) {
		return Pulse{}, fmt.Errorf("%s: the supply is %s, the breakdown %s; the current only falls while the supply lies "+
			"from 0 V to below the breakdown; state the breakdown of the hot device", where,
			quantity.Format(supply, quantity.Volt), quantity.Format(breakdown, quantity.Volt))
	}
	time := henry * amps / (breakdown - supply)
	p := Pulse{Breakdown: breakdown, Amps: amps, Time: time, Joule: breakdown * amps * time / 2}
	return p, computable(where, p.Time, p.Joule)
}

// Watts is the power at the start of the pulse, its highest: BV·I, in W.
func (p Pulse) Watts() float64 { return p.Breakdown * p.Amps }

// LadderStep is one step of a thermal ladder in Foster's form: Zth(t) is the sum of R·(1−exp(−t/τ)).
type LadderStep struct {
	Resistance float64 // K/W, above zero
	Time       float64 // s, its time constant, above zero
}

// Rise is the highest junction temperature over that before the pulse, in K, and when it is reached, in s from the
// start of the pulse: the exact superposition on the ladder. A step answers the falling power P0·(1−t/T) with
// R·P0·((1−exp(−t/τ)) − (t/τ − (1−exp(−t/τ)))·τ/T) and alone is hottest at τ·ln(1+T/τ). The sum bends downwards all
// the way, so its one summit lies between the earliest and the latest of those moments, before the end of the pulse.
// Derived from the equation of one step (Infineon, Transient Thermal Measurements and Thermal Equivalent Circuit
// Models, for the ladder). Valid as far as the ladder is: most data sheets end at some 10 µs.
func (p Pulse) Rise(ladder []LadderStep) (kelvin, at float64, err error) {
	if len(ladder) == 0 {
		return 0, 0, fmt.Errorf("junction rise: the thermal ladder is empty; state at least one step with resistance and time")
	}
	err = positive("junction rise", argument{"length of the pulse", p.Time, quantity.Second},
		argument{"power", p.Watts(), quantity.Watt})
	if err != nil {
		return 0, 0, err
	}
	low, high := math.Inf(1), 0.0
	for k, s := range ladder {
		err := positive(fmt.Sprintf("junction rise, step %d of the ladder", k+1),
			argument{"resistance", s.Resistance, quantity.KelvinPerWatt}, argument{"time constant", s.Time, quantity.Second})
		if err != nil {
			return 0, 0, err
		}
		summit := s.Time * math.Log1p(p.Time/s.Time)
		low, high = min(low, summit), max(high, summit)
	}
	at = p.summit(ladder, low, min(high, p.Time))
	kelvin = p.riseAt(ladder, at)
	return kelvin, at, computable("junction rise", kelvin, at)
}

// summit halves the bracket until it is as narrow as the numbers allow; the slope only falls.
func (p Pulse) summit(ladder []LadderStep, low, high float64) float64 {
	for range 200 {
		mid := low + (high-low)/2
		if mid <= low || mid >= high {
			break
		}
		slope := 0.0
		for _, s := range ladder { // R/τ·exp(−t/τ) − R/T·(1−exp(−t/τ)), without the power
			slope += s.Resistance * (math.Exp(-mid/s.Time)/s.Time + math.Expm1(-mid/s.Time)/p.Time)
		}
		if slope > 0 {
			low = mid
		} else {
			high = mid
		}
	}
	return low
}

// riseAt is the temperature rise at a time within the pulse, in K.
func (p Pulse) riseAt(ladder []LadderStep, t float64) (kelvin float64) {
	for _, s := range ladder {
		u := t / s.Time
		kelvin += s.Resistance * p.Watts() * (-math.Expm1(-u) - lagging(u)*s.Time/p.Time)
	}
	return kelvin
}

// lagging is u − (1−exp(−u)), without losing digits where u is small.
func lagging(u float64) float64 {
	if u > 0.1 {
		return u + math.Expm1(-u)
	}
	sum, term := 0.0, u
	for k := 2.0; k < 14; k++ {
		term *= -u / k
		sum -= term
	}
	return sum
}

// RootRise is the highest junction rise in K on a die in the region where its thermal impedance grows with the root of
// time, from one point of the single-pulse curve: zth (K/W) at a pulse length (s). It is ⅔·P0·Zth(T/2), reached at half
// the pulse. Valid for pulses of about 1 µs to 1 ms. Derived (exact for the root law); NXP AN10273 has the same form
// (from memory).
func (p Pulse) RootRise(zth, length float64) (kelvin, at float64, err error) {
	err = positive("junction rise", argument{"thermal impedance", zth, quantity.KelvinPerWatt},
		argument{"its pulse length", length, quantity.Second}, argument{"length of the pulse", p.Time, quantity.Second},
		argument{"power", p.Watts(), quantity.Watt})
	if err != nil {
		return 0, 0, err
	}
	kelvin = 2.0 / 3 * p.Watts() * zth * math.Sqrt(p.Time/2/length)
	return kelvin, p.Time / 2, computable("junction rise", kelvin)
}

// AvalancheRating is what the data sheet of one device allows in a single pulse; 0 where it says nothing.
type AvalancheRating struct {
	Joule float64 // J, the case's switch.avalanche.energy
	Amps  float64 // A, the case's switch.avalanche.current
}

// AvalancheRuling holds a pulse against the rating of the one device that takes it.
type AvalancheRuling struct {
	Uncredited  bool    // no energy or no current is rated: nothing may be credited (an IGBT as a rule, from memory)
	OverEnergy  bool    // more energy than rated
	OverCurrent bool    // more current than rated
	Repetitive  bool    // it happens at every opening: a clamp is missing, whatever the rating says
	EnergyShare float64 // of the rating; 0 where none is stated
	AmpsShare   float64 // of the rating; 0 where none is stated
	// RiseShare is the junction rise over that of the rated pulse, √(E·I/(E_rated·I_rated)); 0 where either is missing.
	// Below one with OverEnergy it says that the same die got no hotter than in its test, because the pulse was slower.
	RiseShare float64
	Watts     float64 // W, mean heat of a repetitive avalanche, E·f
}

// Holds tells whether a single pulse stays within both ratings. A repetitive one never does.
func (r AvalancheRuling) Holds() bool {
	return !r.Uncredited && !r.OverEnergy && !r.OverCurrent && !r.Repetitive
}

// Against holds the pulse against a rating; hertz is how often it comes, 0 for a single event (a trip).
// An energy is only comparable at the same current and starting temperature, since a device dies of its peak
// temperature (D. L. Blackburn, Power MOSFET Failure Revisited, IEEE PESC 1988); RiseShare carries the rated pulse to
// the current at hand: on a die in the root-of-time region the rise goes with √(E·I·BV), and BV is taken as equal
// (derived).
func (p Pulse) Against(rated AvalancheRating, hertz float64) AvalancheRuling {
	r := AvalancheRuling{Uncredited: !(rated.Joule > 0 && rated.Amps > 0), Repetitive: hertz > 0}
	r.Watts = p.Joule * max(hertz, 0)
	if rated.Joule > 0 {
		r.EnergyShare = p.Joule / rated.Joule
	}
	if rated.Amps > 0 {
		r.AmpsShare = p.Amps / rated.Amps
	}
	r.OverEnergy, r.OverCurrent = r.EnergyShare > 1, r.AmpsShare > 1
	r.RiseShare = math.Sqrt(r.EnergyShare * r.AmpsShare)
	return r
}

// argument is one value of a closed form, with its name for the message.
type argument struct {
	name  string
	value float64
	unit  quantity.Unit
}

// positive refuses arguments that are not finite and above zero.
func positive(where string, list ...argument) error {
	return refuse(where, "above zero", math.SmallestNonzeroFloat64, list)
}

// notNegative refuses arguments that are not finite or below zero.
func notNegative(where string, list ...argument) error {
	return refuse(where, "zero or above", 0, list)
}

func refuse(where, allowed string, least float64, list []argument) error {
	for _, a := range list {
		if !(a.value >= least) || math.IsInf(a.value, 0) {
			return fmt.Errorf("%s: the %s is %s; it has to be %s and finite; correct it or leave the figure out",
				where, a.name, quantity.Format(a.value, a.unit), allowed)
		}
	}
	return nil
}

// computable refuses results that left the range of the numbers.
func computable(where string, results ...float64) error {
	for _, x := range results {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return fmt.Errorf("%s: the values lie so far apart that the result is no number; check their units", where)
		}
	}
	return nil
}
