package diagnose

import (
	"fmt"
	"math"

	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

const (
	strayShare      = 0.02 // of every reading distribution, spread evenly over the unit's range; judgement
	meterAccuracy   = 0.02 // relative, where the instrument's is not stated; judgement
	exactly         = 1e-9 // accuracy of a computed figure
	instrumentError = 0.02 // a meter, scope or camera answer is wrong; judgement
	eyeError        = 0.05 // an answer by eye or memory at the bench; judgement
	hearsayError    = 0.10 // told by others on arrival; judgement
)

// span is the range over which a stray reading of a unit may fall, and the top of a usual instrument's range,
// above which it shows OL (0: this unit has no such reading). Judgement.
type span struct{ low, high, top float64 }

var spans = map[quantity.Unit]span{
	quantity.Ohm:             {1e-3, 1e9, 20e6},
	quantity.Volt:            {1e-3, 1e4, 2}, // OL in volts is the diode range
	quantity.Ampere:          {1e-6, 1e4, 0},
	quantity.Farad:           {1e-12, 1, 0},
	quantity.Henry:           {1e-9, 100, 0},
	quantity.Second:          {1e-9, 1e8, 0},
	quantity.Hertz:           {1e-2, 1e9, 0},
	quantity.Watt:            {1e-3, 1e5, 0},
	quantity.Kelvin:          {1e-2, 500, 0},
	quantity.Celsius:         {1, 500, 0},
	quantity.KelvinPerWatt:   {1e-3, 100, 0},
	quantity.Ratio:           {1e-3, 1e3, 0},
	quantity.VoltPerSecond:   {1e3, 1e12, 0},
	quantity.AmperePerSecond: {1e3, 1e12, 0},
}

// LowerBound tells whether a reading says no more than that the true value lies above it. A camera sees bare metal, and
// perhaps a surface that nobody named, far colder than it is: at an emissivity of 0.15 (bare metal, read in the guides
// of two camera makers) set to 0.95, 80 °C shows as 36 °C.
func LowerBound(t *knowledge.Test, o measure.Observation) bool {
	return t != nil && t.Instrument == "camera" && o.Reading != nil && o.Reading.Kind != quantity.Word &&
		(o.Surface == "" || o.Surface == "bare-metal")
}

// effective is what the reading of an observation says, whoever asks: as entered, or the bound that is left of it. How
// cold something looked at most says nothing about how warm it is at least.
func effective(t *knowledge.Test, ob measure.Observation) quantity.Reading {
	r := *ob.Reading
	if !LowerBound(t, ob) || r.Kind == quantity.Above || r.Kind == quantity.Over {
		return r
	}
	bound := quantity.Reading{Kind: quantity.Above, Value: r.Low, Low: r.Low, High: r.Low, Unit: r.Unit, Text: "> " + r.Text}
	switch r.Kind {
	case quantity.Between:
		bound.Text = "> " + quantity.Format(r.Low, r.Unit)
	case quantity.Below:
		bound.Value, bound.Low, bound.High, bound.Text = 0, 0, 0, r.Text+" as it looked, no bound"
	}
	return bound
}

// readAgainst gives f(reading | result) for the reading of an observation, and the part of it that stands for a slip.
func readAgainst(t *knowledge.Test, ob measure.Observation, expected func(string) (float64, bool)) (likely []float64, stray float64, err error) {
	r := effective(t, ob)
	likely, err = readingLikelihoods(t, r, ob.Accuracy, ob.Range, expected)
	return likely, strayLikelihood(t, r, ob.Range), err
}

// readingLikelihoods gives f(reading | result) for the results of a test, in their order: a density per ln of the
// reading for a point, a probability for an interval, an over-range or a word.
func readingLikelihoods(t *knowledge.Test, r quantity.Reading, accuracy, top float64, expected func(string) (float64, bool)) ([]float64, error) {
	if r.Kind == quantity.Word {
		return wordLikelihoods(t, r.Word)
	}
	limits, ok := spans[t.Unit]
	if t.Unit == "" || !ok {
		return nil, fmt.Errorf("test %s has named results only: %s", t.ID, resultList(t))
	}
	if r.Unit != quantity.Any && r.Unit != t.Unit {
		return nil, fmt.Errorf("test %s reads in %s, not in %s", t.ID, t.Unit, r.Unit)
	}
	low, high, err := interval(r, limits, top)
	if err != nil {
		return nil, fmt.Errorf("test %s: %w", t.ID, err)
	}
	out := make([]float64, len(t.Results))
	for k, res := range t.Results {
		if res.Times == 0 {
			continue // a result of words only: no number says it
		}
		median := res.Median
		if res.Expected != "" {
			if median, ok = expected(res.Expected); !ok || !(median > 0) {
				return nil, fmt.Errorf("test %s compares with %s, which this board does not state: give the result by name (%s) or state the key", t.ID, res.Expected, resultList(t))
			}
		}
		out[k] = logNormal(median, res.Times, accuracy, low, high, limits)
	}
	return out, nil
}

func wordLikelihoods(t *knowledge.Test, word string) ([]float64, error) {
	out := make([]float64, len(t.Results))
	for k, r := range t.Results {
		if r.ID == word {
			out[k] = 1
			return out, nil
		}
	}
	return nil, fmt.Errorf("test %s has no result %q; it has %s", t.ID, word, resultList(t))
}

// interval is where the true reading lies; a point has equal ends. A bound, and OL, reach to infinity.
func interval(r quantity.Reading, s span, top float64) (low, high float64, err error) {
	if top == 0 {
		top = s.top
	}
	switch r.Kind {
	case quantity.Above:
		low, high = r.Low, math.Inf(1)
	case quantity.Below:
		low, high = 0, r.High
	case quantity.Between:
		low, high = r.Low, r.High
	case quantity.Over:
		if top == 0 {
			return 0, 0, fmt.Errorf("over range says nothing without the instrument's top range: write it as a bound, such as > 2 A")
		}
		low, high = top, math.Inf(1)
	default:
		low, high = r.Value, r.Value
	}
	if high <= s.low { // too small to tell from nothing
		low, high = 0, s.low
	}
	return math.Max(low, 0), high, nil
}

// leastStray is the stray share of an interval beyond the unit's range: no reading makes every result impossible.
const leastStray = 1e-15

// logNormal is the density at a point, or the mass of an interval, of a log-normal with a stray share.
func logNormal(median, times, accuracy, low, high float64, s span) float64 {
	if accuracy == 0 {
		accuracy = meterAccuracy
	}
	sigma := math.Hypot(math.Log(times), math.Log(1+accuracy))
	a := math.Log(low/median) / sigma
	if low == high {
		return float64((1-strayShare)*math.Exp(-a*a/2)/(sigma*math.Sqrt(2*math.Pi))) + s.stray(low, high)
	}
	b := math.Log(high/median) / sigma
	return float64((1-strayShare)*normalMass(a, b)) + s.stray(low, high)
}

// stray is the likelihood of a slip: even over the logarithm of the unit's range.
func (s span) stray(low, high float64) float64 {
	width := math.Log(s.high / s.low)
	if low == high {
		return strayShare / width
	}
	inside := math.Log(math.Min(high, s.high)/math.Max(low, s.low)) / width
	return strayShare * math.Max(inside, leastStray)
}

// strayLikelihood is the part of a reading's likelihood, the same under every result, that stands for a slip.
func strayLikelihood(t *knowledge.Test, r quantity.Reading, top float64) float64 {
	limits, ok := spans[t.Unit]
	low, high, err := interval(r, limits, top)
	if !ok || err != nil || r.Kind == quantity.Word {
		return 0
	}
	return limits.stray(low, high)
}

// normalMass is the standard normal probability between a and b, accurate in both tails.
func normalMass(a, b float64) float64 {
	if a > 0 {
		a, b = -b, -a
	}
	return (math.Erfc(-b/math.Sqrt2) - math.Erfc(-a/math.Sqrt2)) / 2
}

func resultList(t *knowledge.Test) string {
	s := ""
	for i, r := range t.Results {
		if i > 0 {
			s += ", "
		}
		s += r.ID
	}
	return s
}

// answerError is the chance that an answer is not what it says, by who gave it.
func answerError(t *knowledge.Test, seen string) float64 {
	switch {
	case seen == "on-arrival":
		return hearsayError
	case atTerminals(t) || t.Instrument == "scope" || t.Instrument == "double-pulse" || t.Instrument == "camera":
		return instrumentError
	}
	return eyeError
}

// blur makes a row fallible: (1−ε)·row + ε·base.
func blur(row, base []float64, e float64) []float64 {
	out := make([]float64, len(row))
	for k := range row {
		out[k] = float64((1-e)*row[k]) + float64(e*base[k])
	}
	return out
}

func dot(a, b []float64) float64 {
	s := 0.0
	for k := range a {
		s += float64(a[k] * b[k])
	}
	return s
}
