package safety

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// The resistors of the worked example of A2.3, 2200 µF at 800 V: which of them keep to 2 A and 500 W.
func TestResistorsOfPublishedExample(t *testing.T) {
	for ohm, within := range map[float64]bool{100: false, 470: false, 1000: false, 2200: true, 10e3: true} {
		p, err := Discharge(Input{BusV: 800, CapacitanceF: 2200e-6, ResistorOhm: ohm})
		if err != nil {
			t.Fatal(err)
		}
		if p.Resistor.Within != within || (len(p.Resistor.Notes) == 0) != within {
			t.Errorf("%g Ω: within its limits %v, want %v: %v", ohm, p.Resistor.Within, within, p.Resistor.Notes)
		}
		if p.Resistor.Series != 2 || p.Resistor.EachV != 400 || p.Resistor.EachOhm != ohm/2 {
			t.Errorf("800 V needs two bodies of 400 V each: %+v", p.Resistor)
		}
	}
}

func TestBleederForRefusesWhatHasNoAnswer(t *testing.T) {
	for _, bad := range [][4]float64{{0, 565, 60, 5}, {1e-3, 60, 60, 5}, {1e-3, 565, 0, 5}, {1e-3, 565, 60, 0}, {math.NaN(), 565, 60, 5}, {1e-3, math.Inf(1), 60, 5}} {
		if _, _, err := BleederFor(bad[0], bad[1], bad[2], bad[3]); err == nil {
			t.Errorf("%v: no error", bad)
		}
	}
}

// Example 32 of the stress notes: one drive is labelled 760 s from 825 V to 50 V (read in its maker's answer); used
// backwards that is RC = 271.1 s, and 710.6 s to 60 V.
func TestLabelOfPublishedDrive(t *testing.T) {
	rc := 760 / math.Log(825.0/50)
	near(t, "RC", rc, 271.1, 1e-4)
	p, err := Discharge(Input{BusV: 825, CapacitanceF: 1e-3, BleederOhm: rc / 1e-3, HighestF: 1e-3 * (1 + 1e-12)})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "to 50 V", p.Bleeder.Nominal.To50V, 760, 1e-9)
	near(t, "to 60 V", p.Bleeder.Nominal.To60V, 710.6, 1e-4)
	if p.Bleeder.LabelTimeS != 720 || p.Bleeder.WithinFiveS {
		t.Errorf("label time %g s, want 720 s (710.6 s rounded up to minutes)", p.Bleeder.LabelTimeS)
	}
}

// A label leads to 60 V in whole minutes with the capacitance at its top, and none is needed below 5 s.
func TestLabelTimes(t *testing.T) {
	for _, row := range []struct {
		volt, farad, ohm, label float64
		within                  bool
	}{
		{800, 2000e-6, 100e3, 660, false}, // 1.2 · 518 s
		{565, 2200e-6, 1.0e3, 60, false},  // 5.9 s at +20 %, 4.9 s as marked
		{565, 2200e-6, 840, 60, true},     // 4.97 s
		{60, 2200e-6, 100e3, 0, true},     // nothing to fall to
		{60.1, 1, 1e6, 2040, false},       // 1.2 Ms · ln(60.1/60) = 1998 s
	} {
		p, err := Discharge(Input{BusV: row.volt, CapacitanceF: row.farad, BleederOhm: row.ohm})
		if err != nil {
			t.Fatal(err)
		}
		if b := p.Bleeder; b.LabelTimeS != row.label || b.WithinFiveS != row.within || b.Wait.To60V < b.Nominal.To60V {
			t.Errorf("%g V, %g F, %g Ω: label %g s, within 5 s %v: %+v", row.volt, row.farad, row.ohm, b.LabelTimeS, b.WithinFiveS, b)
		}
	}
}

// A2.4: 10 to 15 % come back, and it is said whether that climbs back over 50 and over 60 V.
func TestVoltageComesBack(t *testing.T) {
	for _, row := range []struct {
		volt             float64
		above50, above60 bool
		says, doesNotSay string
		cautioned        bool
	}{
		{30, false, false, "3 V to 4.5 V", "above", false},
		{320, false, false, "not above 50 V", "back above", true},
		{334, true, false, "back above 50 V", "60 V", true},       // 50.1 V
		{400, true, false, "back above 50 V", "above 60 V", true}, // just 60 V
		{401, true, true, "back above 50 V and above 60 V", "not above", true},
		{800, true, true, "80 V to 120 V", "not above", true},
	} {
		p, err := Discharge(Input{BusV: row.volt, CapacitanceF: 1e-3})
		if err != nil {
			t.Fatal(err)
		}
		r := p.Recovery
		if r.BackAbove50V != row.above50 || r.BackAbove60V != row.above60 || hasCaution(p, "recovery") != row.cautioned {
			t.Errorf("%g V: %+v, cautioned %v", row.volt, r, hasCaution(p, "recovery"))
		}
		if !strings.Contains(r.Text, row.says) || strings.Contains(r.Text, row.doesNotSay) || !strings.Contains(r.Text, "10 to 20 days") {
			t.Errorf("%g V: %s", row.volt, r.Text)
		}
	}
}

// Where neither the bus nor its capacitance is known the worst of a mains board stands in, and both are asked for.
func TestNothingKnownIsTheWorstCase(t *testing.T) {
	p, err := Discharge(Input{BusUnknown: true})
	if err != nil {
		t.Fatal(err)
	}
	if p.BusV != 825 || p.CapacitanceF != 4700e-6 || p.BusBasis != Assumed || p.CapacitanceBasis != Assumed {
		t.Errorf("%g V %s, %g F %s", p.BusV, p.BusBasis, p.CapacitanceF, p.CapacitanceBasis)
	}
	if len(p.Needs) != 2 || p.Needs[0].Key != "bus.highest" || p.Needs[1].Key != "bus.capacitance" || !strings.Contains(p.Needs[0].Why, "supply not stated") {
		t.Errorf("needs %+v", p.Needs)
	}
	if p, err = Discharge(Input{BusUnknown: true, CapacitanceF: 1e-3}); err != nil || p.CapacitanceBasis != Stated || p.BusBasis != Assumed || len(p.Needs) != 1 {
		t.Errorf("capacitance alone: %+v, %v", p, err)
	}
	stated := splitStores(300, 1e-3)
	if p, err = Discharge(Input{BusUnknown: true, Stores: stated}); err != nil || p.BusV != 300 || len(p.Needs) != 0 {
		t.Errorf("stores that are known stay: %+v, %v", p, err)
	}
}

func TestDischargeRefusesWhatIsOutOfRange(t *testing.T) {
	for name, in := range map[string]Input{
		"bus voltage":         {BusV: 0, CapacitanceF: 1e-3},
		"bus voltage ":        {BusV: -310, CapacitanceF: 1e-3},
		"bus voltage  ":       {BusV: 310e3, CapacitanceF: 1e-3},
		"bus voltage   ":      {BusV: math.NaN(), CapacitanceF: 1e-3},
		"bus voltage    ":     {BusV: math.Inf(1), CapacitanceF: 1e-3},
		"bus capacitance":     {BusV: 310, CapacitanceF: 2200},
		"bus capacitance ":    {BusV: 310, CapacitanceF: -1e-3},
		"bus capacitance  ":   {BusV: 310, CapacitanceF: math.NaN()},
		"discharge resistor":  {BusV: 310, CapacitanceF: 1e-3, ResistorOhm: 1e-3},
		"discharge resistor ": {BusV: 310, CapacitanceF: 1e-3, ResistorOhm: -1},
		"bleeder":             {BusV: 310, CapacitanceF: 1e-3, BleederOhm: math.NaN()},
	} {
		p, err := Discharge(in)
		if err == nil || p != nil {
			t.Errorf("%s: no error for %+v", name, in)
			continue
		}
		if !strings.HasPrefix(err.Error(), strings.TrimSpace(name)+": ") || !strings.Contains(err.Error(), "is allowed") {
			t.Errorf("%s: %v", name, err)
		}
	}
}

func TestChosenResistorStaysWithinItsLimits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		in := Input{BusV: rapid.Float64Range(1, 2000).Draw(t, "bus"), CapacitanceF: rapid.Float64Range(1e-9, 1).Draw(t, "capacitance")}
		p, err := Discharge(in)
		if err != nil {
			t.Fatal(err)
		}
		r := p.Resistor
		if !r.Within || p.PeakCurrentA > 2 || p.PeakPowerW > 500 || r.Ohm < 100 {
			t.Fatalf("%+v", r)
		}
		if r.EachV > 500 || (r.Series == 1 && r.EachV > 350) || math.Abs(r.EachOhm*float64(r.Series)-r.Ohm) > 1e-9*r.Ohm {
			t.Fatalf("body voltage: %+v", r)
		}
		if smaller := r.Ohm / 2.21; smaller >= 100 && in.BusV/smaller <= 2 && in.BusV*in.BusV/smaller <= 500 {
			t.Fatalf("%g ohm is larger than need be at %g V", r.Ohm, in.BusV)
		}
		left := in.BusV * math.Exp(-p.Nominal.To5V/(r.Ohm*in.CapacitanceF))
		if in.BusV > 5 && math.Abs(left-5) > 1e-6 {
			t.Fatalf("%g V left after the time to 5 V", left)
		}
		if p.Wait.To60V < p.Nominal.To60V || p.Nominal.To60V > p.Nominal.To50V || p.Nominal.To50V > p.Nominal.To5V {
			t.Fatalf("order of times: %+v %+v", p.Nominal, p.Wait)
		}
	})
}

func TestCautionsFollowTheHazard(t *testing.T) {
	for _, row := range []struct {
		name    string
		in      Input
		with    string
		without string
	}{
		{"48 V battery, 20 mF: 23 J", Input{BusV: 48, CapacitanceF: 20e-3, Supply: "battery"}, "battery no-short ohms recovery local-rules", "live burn stored-energy arc-flash touch-limit"},
		{"48 V, 100 mF: 115 J", Input{BusV: 48, CapacitanceF: 100e-3}, "burn noise", "live stored-energy"},
		{"325 V, 2 µF: 0.13 J", Input{BusV: 325, CapacitanceF: 2e-6}, "live touch-limit", "stored-energy stored-energy-low-limit"},
		{"325 V, 10 µF: 0.6 J", Input{BusV: 325, CapacitanceF: 10e-6}, "stored-energy-low-limit", "stored-energy"},
		{"325 V, 47 µF: 2.5 J", Input{BusV: 325, CapacitanceF: 47e-6}, "live stored-energy-low-limit", "stored-energy"},
		{"565 V, 2.2 µF: 0.35 J", Input{BusV: 565, CapacitanceF: 2.2e-6}, "stored-energy-low-limit resistor-body", "stored-energy"},
		{"800 V, 32 mF: 10.2 kJ", Input{BusV: 800, CapacitanceF: 32e-3}, "arc-flash stored-energy", "arc-flash-source"},
		{"144 V battery", Input{BusV: 144, CapacitanceF: 1e-3, Supply: "battery"}, "arc-flash-source battery", "arc-flash"},
		{"shared bus", Input{BusV: 565, CapacitanceF: 1e-3, Supply: "shared-bus"}, "shared-bus arc-flash-source", "battery"},
		{"mains", Input{BusV: 565, CapacitanceF: 1e-3, Supply: "rectified-mains"}, "live", "shared-bus arc-flash-source battery"},
		{"50 V, 100 J at the top", Input{BusV: 50, CapacitanceF: 0.04, HighestF: 0.08}, "burn noise live", "stored-energy"},
		{"short-like resistor", Input{BusV: 565, CapacitanceF: 1e-3, ResistorOhm: 47}, "resistor", ""},
		{"free motor", Input{BusV: 565, CapacitanceF: 1e-3, MotorCanTurn: true}, "motor", "resistor"},
	} {
		p, err := Discharge(row.in)
		if err != nil {
			t.Fatal(err)
		}
		for _, id := range strings.Fields(row.with) {
			if !hasCaution(p, id) {
				t.Errorf("%s: no %s", row.name, id)
			}
		}
		for _, id := range strings.Fields(row.without) {
			if hasCaution(p, id) {
				t.Errorf("%s: has %s", row.name, id)
			}
		}
	}
}

func TestCautionsCarryTheBoardsFiguresAndTheirSource(t *testing.T) {
	p, err := Discharge(Input{BusV: 390, CapacitanceF: 2200e-6})
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range p.Cautions {
		if c.ID == "" || c.Text == "" || c.Read == "" || (c.Source == "" && c.ID != "local-rules") {
			t.Errorf("incomplete: %+v", c)
		}
		// ½ · 2640 µF · 390² = 200.8 J, the capacitance 20 % high
		if c.ID == "stored-energy" && !(strings.Contains(c.Text, "390 V") && strings.Contains(c.Text, "200.8 J")) {
			t.Errorf("without this board's figures: %s", c.Text)
		}
	}
}

func hasCaution(p *Plan, id string) bool {
	for _, c := range p.Cautions {
		if c.ID == id {
			return true
		}
	}
	return false
}
