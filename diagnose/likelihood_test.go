package diagnose

import (
	"math"
	"testing"

	"drivemend/knowledge"
	"drivemend/measure/quantity"
)

var ohmTest = &knowledge.Test{ID: "power-terminals-resistance", Unit: quantity.Ohm, Results: []knowledge.Result{
	{ID: "shorted", Median: 0.5, Times: 3}, {ID: "leaky", Median: 5e3, Times: 6}, {ID: "blocking", Median: 20e6, Times: 5},
}}

func likelihoods(t *testing.T, r quantity.Reading) []float64 {
	t.Helper()
	out, err := readingLikelihoods(ohmTest, r, 0, 0, func(string) (float64, bool) { return 0, false })
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func ohms(kind quantity.ReadingKind, low, high float64) quantity.Reading {
	return quantity.Reading{Kind: kind, Value: low, Low: low, High: high, Unit: quantity.Ohm}
}

// TestDensityHasUnitMass integrates the density over ln(reading) by Simpson's rule.
func TestDensityHasUnitMass(t *testing.T) {
	const n = 20000
	s := spans[quantity.Ohm]
	width := math.Log(s.high / s.low)
	for k := range ohmTest.Results {
		sum := 0.0
		for i := 0; i <= n; i++ {
			w := 2.0 + 2*float64(i%2)
			if i == 0 || i == n {
				w = 1
			}
			x := s.low * math.Exp(width*float64(i)/n)
			sum += w * likelihoods(t, ohms(quantity.Point, math.Max(x, s.low*1.0001), 0))[k]
		}
		if mass := sum * width / n / 3; math.Abs(mass-1) > 0.02 {
			t.Errorf("%s: mass %.4f", ohmTest.Results[k].ID, mass)
		}
	}
}

// TestIntervalsAddUp: the mass of a range is the sum of its parts, and a bound is the range up to the unit's end.
func TestIntervalsAddUp(t *testing.T) {
	whole, left, right := likelihoods(t, ohms(quantity.Between, 1, 1e6)), likelihoods(t, ohms(quantity.Between, 1, 300)), likelihoods(t, ohms(quantity.Between, 300, 1e6))
	above, over := likelihoods(t, ohms(quantity.Above, 20e6, 0)), likelihoods(t, quantity.Reading{Kind: quantity.Over, Unit: quantity.Any})
	for k := range whole {
		if math.Abs(whole[k]-left[k]-right[k]) > 1e-12 {
			t.Errorf("%s: %g is not %g + %g", ohmTest.Results[k].ID, whole[k], left[k], right[k])
		}
		if above[k] != over[k] {
			t.Errorf("%s: OL %g, > 20 MΩ %g", ohmTest.Results[k].ID, over[k], above[k])
		}
	}
}

func TestReadingsFavourTheirResult(t *testing.T) {
	for _, c := range []struct {
		reading quantity.Reading
		best    int
	}{
		{ohms(quantity.Point, 0.4, 0), 0}, {ohms(quantity.Point, 0, 0), 0}, {ohms(quantity.Below, 0, 0.2), 0},
		{ohms(quantity.Point, 4e3, 0), 1}, {ohms(quantity.Point, 12e6, 0), 2}, {quantity.Reading{Kind: quantity.Over}, 2},
		{quantity.Reading{Kind: quantity.Word, Word: "leaky"}, 1},
	} {
		c.reading.Unit = quantity.Ohm
		got := likelihoods(t, c.reading)
		for k := range got {
			if k != c.best && got[k] >= got[c.best] {
				t.Errorf("%+v: %s is at least as likely as %s", c.reading, ohmTest.Results[k].ID, ohmTest.Results[c.best].ID)
			}
			if k != c.best && c.reading.Kind != quantity.Word && got[k] <= 0 {
				t.Errorf("%+v: %s is ruled out by a reading", c.reading, ohmTest.Results[k].ID)
			}
		}
	}
}

func TestReadingErrorsNameTheFix(t *testing.T) {
	none := func(string) (float64, bool) { return 0, false }
	for _, c := range []struct {
		test    *knowledge.Test
		reading quantity.Reading
		want    string
	}{
		{ohmTest, quantity.Reading{Kind: quantity.Point, Value: 3, Unit: quantity.Volt}, "test power-terminals-resistance reads in Ω, not in V"},
		{ohmTest, quantity.Reading{Kind: quantity.Word, Word: "hot"}, `test power-terminals-resistance has no result "hot"; it has shorted, leaky, blocking`},
		{&knowledge.Test{ID: "x", Unit: quantity.Ampere}, quantity.Reading{Kind: quantity.Over, Unit: quantity.Any}, "test x: over range says nothing without the instrument's top range: write it as a bound, such as > 2 A"},
	} {
		if _, err := readingLikelihoods(c.test, c.reading, 0, 0, none); err == nil || err.Error() != c.want {
			t.Errorf("got %v, want %s", err, c.want)
		}
	}
}
