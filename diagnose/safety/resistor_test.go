package safety

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// Banks from small to far beyond a bench: the rating follows energy and time constant, and what no stack does is said.
// The figures are computed here by following the warming body in small steps, see hottestBody.
func TestRatingFollowsEnergyAndTimeConstant(t *testing.T) {
	for _, row := range []struct {
		volt, farad float64
		loadBank    bool
	}{
		{390, 2200e-6, false},
		{800, 2200e-6, false},
		{800, 20e-3, false}, // 7.7 kJ at +20 %
		{800, 100e-3, true}, // 38 kJ
		{800, 1, true},      // 384 kJ
		{60, 55e-3, false},  // 119 J
		{48, 1, false},      // 1.4 kJ, but 23 W at first
	} {
		p, err := Discharge(Input{BusV: row.volt, CapacitanceF: row.farad})
		if err != nil {
			t.Fatal(err)
		}
		r := p.Resistor
		need := hottestBody(r.PeakW, 2*r.JoulesJ/r.PeakW)
		if r.RatedW < need*0.99 || r.RatedW < r.PeakW/10 {
			t.Errorf("%g V, %g F: rated %g W, its body needs %.3g W, a tenth of its peak is %.3g W", row.volt, row.farad, r.RatedW, need, r.PeakW/10)
		}
		if r.RatedW > 2.5*math.Max(need, r.PeakW/10) && r.RatedW > 10 {
			t.Errorf("%g V, %g F: rated %g W is far more than the %.3g W needed", row.volt, row.farad, r.RatedW, need)
		}
		near(t, "average power", r.AverageW, p.PeakPowerW*(1-math.Exp(-2))/2, 1e-9)
		words := p.Steps[2].Text
		if r.LoadBank != row.loadBank || hasCaution(p, "load-bank") != row.loadBank || strings.Contains(words, "load bank") != row.loadBank {
			t.Errorf("%g V, %g F: load bank %v, %s", row.volt, row.farad, r.LoadBank, words)
		}
		t.Logf("%g V, %g F: %g Ω, %.4g J, peak %.4g W, needs %.4g W, rated %g W, load bank %v", row.volt, row.farad, r.Ohm, r.JoulesJ, r.PeakW, need, r.RatedW, r.LoadBank)
	}
}

// hottestBody follows a body of the package's time constant under P·e^(−2t/RC) in small steps: the continuous rating
// that its hottest moment asks for.
func hottestBody(peak, rc float64) float64 {
	body, top := 0.0, 0.0
	step := math.Min(rc, bodySeconds) / 2000
	for at := 0.0; at < 5*math.Max(rc, bodySeconds); at += step {
		body += step / bodySeconds * (peak*math.Exp(-2*(at+step/2)/rc) - body)
		top = math.Max(top, body)
	}
	return top
}

func TestHottestBodyHasItsLimits(t *testing.T) {
	near(t, "equal time constants", hottest(1), math.Exp(-1), 1e-6)
	near(t, "beside it", hottest(1+1e-4), math.Exp(-1), 1e-3)
	near(t, "short: the energy counts", hottest(1e4)*1e4, 1, 1e-2)
	near(t, "long: the power counts", hottest(1e-6), 1, 1e-4)
	rapid.Check(t, func(t *rapid.T) {
		x := math.Exp(rapid.Float64Range(-20, 20).Draw(t, "log x"))
		if h := hottest(x); !(h > 0 && h <= 1) || hottest(x*1.01) > h*(1+1e-6) {
			t.Fatalf("x %g: %g, then %g", x, h, hottest(x*1.01))
		}
	})
}

// A resistor that its own caution forbids is never ordered on.
func TestAResistorLikeAShortIsWithheld(t *testing.T) {
	for _, row := range []struct {
		volt, ohm float64
		withheld  bool
	}{
		{800, 0.1, true}, {800, 10, true}, {48, 10, true}, {390, 99.9, true},
		{390, 100, false}, // 3.9 A: a caution, no more
		{999, 100, false}, {1100, 100, true}, {800, 2200, false}, {800, 0, false},
	} {
		p, err := Discharge(Input{BusV: row.volt, CapacitanceF: 2200e-6, ResistorOhm: row.ohm})
		if err != nil {
			t.Fatal(err)
		}
		if (len(p.Withheld) > 0) != row.withheld {
			t.Errorf("%g V, %g Ω: withheld %+v", row.volt, row.ohm, p.Withheld)
		}
		connects := false
		for _, s := range p.Steps {
			connects = connects || strings.Contains(s.Text, "across it") || strings.Contains(s.Text, "resistor on") ||
				strings.HasPrefix(s.Text, "Take ") || strings.Contains(s.Text, "Take it off")
		}
		if connects == row.withheld {
			t.Errorf("%g V, %g Ω: a step connects it: %v\n%+v", row.volt, row.ohm, connects, p.Steps)
		}
		if row.withheld {
			m := p.Withheld[0]
			if m.Point != 5 || !strings.Contains(m.Text, "must not be connected") || !strings.Contains(m.Unlock, "take ") || !hasCaution(p, "resistor") {
				t.Errorf("%g V, %g Ω: %+v", row.volt, row.ohm, m)
			}
		}
	}
}

func TestTheChosenResistorIsNeverWithheld(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, err := Discharge(Input{BusV: rapid.Float64Range(1, 2000).Draw(t, "bus"), CapacitanceF: rapid.Float64Range(1e-9, 100).Draw(t, "capacitance")})
		if err != nil || len(p.Withheld) > 0 || math.IsNaN(p.Resistor.RatedW) || p.Resistor.RatedW < 10 || len(p.Steps) < 6 {
			t.Fatalf("%+v, %v", p, err)
		}
	})
}
