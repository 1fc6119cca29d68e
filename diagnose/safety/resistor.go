package safety

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// The limits a discharge resistor is chosen by.
const (
	mostPeakAmperes = 2.0   // so that clips do not spark; common practice, 0.1 to 2 A
	mostPeakWatts   = 500.0 // ten times a 50 W part for about a second; judgement, the pulse curve decides
	leastOhms       = 100.0 // ABB PQFM manual, p. 8, read; the unit is cut off in the excerpt, ohm by context
	oneBodyVolts    = 350.0 // a single axial part holds 350 to 500 V; common practice, the lower end
	mostBodyVolts   = 500.0
	// shortAmperes is the peak from which a resistor is no tool but a short with a delay; judgement, five times the
	// current at which clips spark.
	shortAmperes = 10.0
	// bodySeconds is the time constant with which the body of a wire-wound resistor warms up: parts that stand five
	// times their rating for 5 s (from memory) have one of 22 s; judgement, rounded.
	bodySeconds = 22.0
	// mostRatedWatts and mostStackJoules end what a stack of ordinary parts does; judgements, the energy is the limit
	// of the arc-flash class.
	mostRatedWatts  = 200.0
	mostStackJoules = 10e3
)

// Resistor is the discharge resistor and what it must stand.
type Resistor struct {
	Ohm     float64
	Given   bool // by the technician; else chosen
	Series  int  // equal parts in series that share the voltage
	EachOhm float64
	EachV   float64 // voltage over each part's body at the first moment
	JoulesJ float64 // energy it takes from all stores one after the other, at the top of the capacitance's interval
	// UnevenJ is the same with one half of a split bank holding the whole voltage of the bus; 0 without halves.
	UnevenJ float64
	PeakW   float64 // at the highest store
	PeakA   float64
	// AverageW is the mean power over the first time constant RC, (1−e⁻²)/2 of the peak.
	AverageW float64
	RatedW   float64 // advised continuous rating, all parts together, by peak, the larger energy and time constant
	// LoadBank tells that no stack of ordinary resistors does it: a load bank or the maker's discharge tool.
	LoadBank bool
	Notes    []string
	Within   bool // every limit of resistance, current and power kept
}

// chooseResistor takes the given resistor, or the smallest E3 value (two or more of them in series where one body does
// not hold the voltage), at least 100 Ω in all, that keeps peak current and peak power within their limits at the
// highest store, so that one tool serves all of them.
func chooseResistor(in Input) Resistor {
	volt := 0.0
	for _, s := range in.Stores {
		if s.Capacitance.Basis != None {
			volt = math.Max(volt, s.Voltage.Value)
		}
	}
	r := Resistor{Ohm: in.ResistorOhm, Given: in.ResistorOhm > 0, Series: 1, JoulesJ: worstEnergy(in.Stores)}
	if volt > oneBodyVolts {
		r.Series = int(math.Max(2, math.Ceil(volt/mostBodyVolts)))
	}
	n := float64(r.Series)
	if !r.Given {
		r.Ohm = n * smallestWithin(volt, n)
	}
	r.EachOhm, r.EachV = r.Ohm/n, volt/n
	r.PeakA, r.PeakW = volt/r.Ohm, volt*volt/r.Ohm
	r.AverageW = r.PeakW * (1 - math.Exp(-2)) / 2
	r.UnevenJ = unevenEnergy(in)
	most := math.Max(r.JoulesJ, r.UnevenJ)
	r.RatedW = ratedWatts(r.PeakW, most)
	r.LoadBank = r.RatedW > mostRatedWatts || most >= mostStackJoules
	r.Notes = r.faults()
	r.Within = len(r.Notes) == 0
	return r
}

// smallestWithin steps through E3 values for one of n equal parts.
func smallestWithin(volt, n float64) float64 {
	for decade := leastOhms / 100; decade < mostResistor; decade *= 10 {
		for _, digit := range []float64{10, 22, 47} {
			ohm := n * digit * decade
			if ohm >= leastOhms && volt/ohm <= mostPeakAmperes && volt*volt/ohm <= mostPeakWatts {
				return digit * decade
			}
		}
	}
	return mostResistor
}

// ratedWatts is the advised continuous rating in watts, the next usual size: never below a tenth of the peak (judgement),
// and never below what keeps the body at or under its limit while the energy runs in. The power falls as
// P·e^(−2t/RC), the body warms up with the time constant T; its hottest moment needs P·x^(−x/(x−1)) with x = 2T/RC.
// That is E/T for a short discharge, where the energy alone counts, and P for a long one, where the power does.
func ratedWatts(peak, joule float64) float64 {
	need := math.Max(peak/10, peak*hottest(bodySeconds*peak/joule))
	for _, w := range []float64{10, 25, 50, 100, 200} {
		if need <= w {
			return w
		}
	}
	return math.Ceil(need/100) * 100
}

// hottest is the share of the peak power that a body has to stand without end, x^(−x/(x−1)), x its time constant over
// that of the falling power.
func hottest(x float64) float64 {
	switch {
	case math.IsNaN(x), math.IsInf(x, 1):
		return 0
	case x <= 0:
		return 1
	case math.Abs(x-1) < 1e-6:
		return math.Exp(-1)
	}
	return math.Exp(-x * math.Log(x) / (x - 1))
}

// withheld says why a given resistor must not be connected, and which one would do; nil when it may.
func (r Resistor) withheld(in Input) []Missing {
	var why string
	switch {
	case r.Ohm < leastOhms:
		why = format(r.Ohm, quantity.Ohm) + " is below " + format(leastOhms, quantity.Ohm) + ": close to a short, it sparks and sprays metal"
	case r.PeakA > shortAmperes:
		why = fmt.Sprintf("%s would take %s at first, more than %s: it sparks like a short", format(r.Ohm, quantity.Ohm), format(r.PeakA, quantity.Ampere), format(shortAmperes, quantity.Ampere))
	default:
		return nil
	}
	in.ResistorOhm = 0
	return []Missing{{5, "this resistor must not be connected: " + why, "take " + chooseResistor(in).inWords(in.spread()) + "; leave --resistor out to have it planned"}}
}

func (r Resistor) faults() []string {
	var notes []string
	if r.Ohm < leastOhms {
		notes = append(notes, "below "+format(leastOhms, quantity.Ohm)+" it is close to a short: it sparks and sprays metal")
	}
	if r.PeakA > mostPeakAmperes {
		notes = append(notes, fmt.Sprintf("peak current %s is above the %s at which clips begin to spark", format(r.PeakA, quantity.Ampere), format(mostPeakAmperes, quantity.Ampere)))
	}
	if r.PeakW > mostPeakWatts {
		notes = append(notes, fmt.Sprintf("peak power %s: only a part whose pulse curve allows it", format(r.PeakW, quantity.Watt)))
	}
	return notes
}

// Bleeder is what the board's own resistor across the bus does, as long as it is intact.
type Bleeder struct {
	Ohm, PowerW float64 // PowerW at the highest bus, V²/R
	Nominal     Times
	Wait        Times   // with the capacitance at the top of its interval
	LabelTimeS  float64 // what a label would name: down to 60 V, in whole minutes; a lower bound, while the bleeder is whole
	WithinFiveS bool    // down to 60 V within 5 s, so no waiting time need be named
	// NoLabelOhm would bring the bus to 60 V within 5 s, NoLabelW is what it would burn all the time; 0 where the bus
	// stands no higher, or the bleeder does it.
	NoLabelOhm, NoLabelW float64
}

func bleederOf(in Input) *Bleeder {
	b := &Bleeder{Ohm: in.BleederOhm, PowerW: in.BusV * in.BusV / in.BleederOhm,
		Nominal: timesFrom(in.BleederOhm, in.CapacitanceF, in.BusV), Wait: timesFrom(in.BleederOhm, in.HighestF, in.BusV)}
	b.WithinFiveS = b.Wait.To60V <= residualSeconds
	b.LabelTimeS = 60 * math.Ceil(b.Wait.To60V/60)
	if !b.WithinFiveS {
		b.NoLabelOhm, b.NoLabelW, _ = BleederFor(in.HighestF, in.BusV, TouchVolts, residualSeconds)
	}
	return b
}

// BleederFor gives the resistor that brings a capacitance from one voltage to another in a given time,
// R = t/(C·ln(V0/V)), and its power V0²/R. Errors name the value at fault.
func BleederFor(farad, from, to, seconds float64) (ohm, watt float64, err error) {
	if !(farad > 0 && to > 0 && from > to && seconds > 0) || math.IsInf(from, 0) || math.IsInf(farad, 0) || math.IsInf(seconds, 0) {
		return 0, 0, fmt.Errorf("bleeder: capacitance %g F, %g V to %g V in %g s: all must be above zero, and the first voltage above the second", farad, from, to, seconds)
	}
	ohm = seconds / (farad * math.Log(from/to))
	return ohm, from * from / ohm, nil
}

// The share of its voltage that comes back to a bank left open is from memory of makers' guides; the days are read in two
// makers' texts.
const (
	recoveryLow, recoveryHigh         = 0.10, 0.15
	recoveryDaysLow, recoveryDaysHigh = 10, 20
)

// Recovery is the voltage that an electrolytic bank left open makes by itself after it was discharged.
type Recovery struct {
	LowV, HighV       float64 // 10 and 15 % of the voltage it stood at
	DaysLow, DaysHigh float64 // how long it keeps rising
	BackAbove50V      bool    // the high figure reaches 50 V
	BackAbove60V      bool    // the high figure passes 60 V
	Text              string
}

func recoveryOf(volt float64) Recovery {
	r := Recovery{LowV: recoveryLow * volt, HighV: recoveryHigh * volt, DaysLow: recoveryDaysLow, DaysHigh: recoveryDaysHigh}
	r.BackAbove50V, r.BackAbove60V = r.HighV >= LiveVolts, r.HighV > TouchVolts
	r.Text = fmt.Sprintf("left open, the bank can come back to %s to %s by itself, the first part within minutes, rising for %d to %d days",
		format(r.LowV, quantity.Volt), format(r.HighV, quantity.Volt), recoveryDaysLow, recoveryDaysHigh)
	switch {
	case r.BackAbove60V:
		r.Text += ": back above " + format(LiveVolts, quantity.Volt) + " and above " + format(TouchVolts, quantity.Volt)
	case r.BackAbove50V:
		r.Text += ": back above " + format(LiveVolts, quantity.Volt)
	case r.HighV > DeadVolts:
		r.Text += ": not above " + format(LiveVolts, quantity.Volt) + ", but too much for an ohmmeter"
	}
	return r
}
