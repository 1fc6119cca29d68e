package safety

import (
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// A reading given with its doubt counts at the unkind end.
func TestAReadingCountsAtTheUnkindEndOfItsInterval(t *testing.T) {
	for text, dead := range map[string]bool{"4 V": true, "4 V ±20 %": true, "4 V ±50 %": false, "-4 V": true, "-6 V": false, "5 V": true} {
		c, e := ready(t)
		q, err := quantity.Parse(text, quantity.Volt)
		if err != nil {
			t.Fatal(err)
		}
		c.Safety.DeadChecks[0].DC = q
		if got := Check(c, Work{Need: NeedDead}, at(t, "10:12"), e).Allowed; got != dead {
			t.Errorf("%s at the bus: ohms allowed %v, want %v", text, got, dead)
		}
	}
}

// A bank above the voltage of one can is taken as split where nothing is said of it.
func TestHalvesAreAskedForAboveOneCan(t *testing.T) {
	for bus, want := range map[string]bool{"449 V": false, "450 V": false, "451 V": true, "550 V": true, "610 V": true} {
		stores := Stores(boardOf(t, "topology: half-bridge\nsupply: battery\nbus: {nominal: 48 V, highest: "+bus+"}\nload: {kind: resistive}"))
		got := false
		for _, s := range stores {
			got = got || s.Point == PointUpperHalf
		}
		if got != want {
			t.Errorf("%s: halves asked for %v, want %v", bus, got, want)
		}
	}
}

// What was proved later does not speak for a reading under power that was taken before it.
func TestALaterStaticDoesNotSpeakForAnEarlierReading(t *testing.T) {
	for clock, outside := range map[string]bool{"09:00": false, "10:13": true} {
		c, e := ready(t)
		for k := range e.Statics {
			e.Statics[k].At = at(t, clock)
		}
		o := measure.Observation{Test: "peak", Result: "low", At: at(t, "10:12")}
		e.Powered = append(e.Powered, o.At)
		if got, missing := OutsideHoldPoint(c, o, Work{Need: NeedLowBus}, e); got != outside {
			t.Errorf("statics of %s, reading of 10:12: outside %v, want %v: %+v", clock, got, outside, missing)
		}
	}
}

// A brake stands on the board when any of its keys is stated.
func TestAnyKeyOfTheBrakeMakesItAStore(t *testing.T) {
	for brake, want := range map[string]bool{"fitted: yes": true, "fitted: no": false, "fitted: unknown": true, "resistor: 47 Ω": true, "on_voltage: 380 V": true} {
		got := false
		for _, s := range Stores(boardOf(t, "topology: half-bridge\nsupply: battery\nbus: {nominal: 48 V}\nload: {kind: resistive}\nstages: {brake: {"+brake+"}}")) {
			got = got || s.Point == PointBrake
		}
		if got != want {
			t.Errorf("%s: a store %v, want %v", brake, got, want)
		}
	}
}

// A network whose kind nobody can tell may be a clamp, which stands above the bus.
func TestANetworkOfUnknownKindMayBeAClamp(t *testing.T) {
	for kind, want := range map[string]string{"unknown": "bus clamp?", "none": "bus", "clamp": "bus clamp"} {
		got := points(Stores(boardOf(t, "topology: half-bridge\nsupply: battery\nbus: {nominal: 48 V}\nload: {kind: resistive}\nsnubber: {kind: "+kind+"}")))
		if got != want {
			t.Errorf("%s: %s, want %s", kind, got, want)
		}
	}
}

// Halves out of balance can hold more than the bank; the total counts the larger one.
func TestTheTotalCountsHalvesOutOfBalance(t *testing.T) {
	stores := []Store{{Point: PointBus, EnergyJ: 10}, {Point: PointUpperHalf, PartOf: PointBus, EnergyJ: 9}, {Point: PointLowerHalf, PartOf: PointBus, EnergyJ: 4}, {Point: PointClamp, EnergyJ: 1}}
	near(t, "total", TotalEnergy(stores), 14, 1e-12)
}

// A label is a number with its unit, or one or two letters and a number; a word with a figure behind it is none.
func TestLabels(t *testing.T) {
	for text, sound := range map[string]bool{"K3 off": true, "PS12 off": true, "24 V off": true, "230vac off": true, "Q12 removed": true,
		"not12 off": false, "live1 isolated": false, "none1 off": false, "no1 off": false, "on2 off": false, "is1 off": false} {
		if fault := sourcesFault(text); (fault == "") != sound {
			t.Errorf("%q: %q", text, fault)
		}
	}
}

// After a step under power that failed, what was proved and stated before it counts no more.
func TestAFailedStepUnderPowerEndsStaticsAndStatements(t *testing.T) {
	for result, want := range map[string]bool{"done": true, "failed": false, "not-possible": true} {
		c, e := ready(t)
		c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepLoadTested, Result: result, At: at(t, "10:09")})
		if got := Check(c, Work{Need: NeedLowBus}, at(t, "10:12"), e).Allowed; got != want {
			t.Errorf("%s: a current-limited bus allowed %v, want %v", result, got, want)
		}
	}
	c, e := ready(t)
	c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepProtectionsProved, Result: "failed", At: at(t, "10:09")})
	for k := range e.Statics {
		e.Statics[k].At = at(t, "10:10")
	}
	c.Safety.Before = append(c.Safety.Before, fullStatement(measure.BeforeLowBus, at(t, "10:11")))
	if d := Check(c, Work{Need: NeedLowBus}, at(t, "10:12"), e); !d.Allowed {
		t.Errorf("read and stated anew: %+v", d.Missing)
	}
}

// A dated capture of a scope says that power was on.
func TestAScopeCaptureSaysThatPowerWasOn(t *testing.T) {
	for kind, dead := range map[string]bool{"thermal": true, "scope": false} {
		c, e := ready(t)
		c.Captures = []measure.Capture{{Name: "edge.csv", Kind: kind, At: at(t, "10:09")}}
		if got := Check(c, Work{Need: NeedDead}, at(t, "10:12"), e).Allowed; got != dead {
			t.Errorf("a %s capture: ohms allowed %v, want %v", kind, got, dead)
		}
	}
}

// A capture that was taken later says nothing of a reading before it.
func TestALaterCaptureDoesNotSpeakAgainstAReading(t *testing.T) {
	for clock, outside := range map[string]bool{"10:08": true, "10:30": false} {
		c, e := ready(t)
		c.Captures = []measure.Capture{{Name: "edge.csv", Kind: "scope", At: at(t, clock)}}
		o := measure.Observation{Test: "ohms", Result: "open", At: at(t, "10:12")}
		if got, missing := OutsideHoldPoint(c, o, Work{Need: NeedDead}, e); got != outside {
			t.Errorf("a capture of %s, a reading of 10:12: outside %v, want %v: %+v", clock, got, outside, missing)
		}
	}
}

// The resistor that would do without a label brings the bank, at the top of its interval, to 60 V in just 5 s (closed
// form).
func TestTheBleederWithoutALabel(t *testing.T) {
	in := Input{BusV: 565, CapacitanceF: 2000e-6, HighestF: 2200e-6, BleederOhm: 100e3, Supply: "rectified-mains"}
	p, err := Discharge(in)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "time to 60 V", TimeTo(p.Bleeder.NoLabelOhm, 2200e-6, 565, TouchVolts), 5, 1e-12)
	near(t, "power", p.Bleeder.NoLabelW*p.Bleeder.NoLabelOhm, 565*565, 1e-12)
	in.BleederOhm = 900
	if p, err = Discharge(in); err != nil || p.Bleeder.NoLabelOhm != 0 {
		t.Errorf("a bleeder that does it: %+v, %v", p.Bleeder, err)
	}
}

// A work stands on the newest full statement that has come to be, of one moment on the later in the file; one that lacks
// something counts against it whatever its time.
func TestAWorkStandsOnTheStatementThatCounts(t *testing.T) {
	c, _ := ready(t)
	noted := func(clock, note string) measure.Before {
		b := fullStatement(measure.BeforeFull, at(t, clock))
		b.Note = note
		return b
	}
	c.Safety.Before = []measure.Before{noted("10:05", "first"), noted("10:01", "older"), noted("10:05", "second"), noted("10:30", "to come"), fullStatement(measure.BeforeScope, at(t, "10:02"))}
	full := Work{Need: NeedFull, Tool: ToolScope}
	got := StandsOn(c, full, at(t, "10:12"))
	if len(got) != 2 || got[0].Note != "second" || got[1].Step != measure.BeforeScope {
		t.Errorf("stands on %+v", got)
	}
	c.Safety.Before = append(c.Safety.Before, measure.Before{Step: measure.BeforeFull, At: at(t, "10:40"), Note: "lacking"})
	if got = StandsOn(c, full, at(t, "10:12")); got[0].Note != "lacking" {
		t.Errorf("a lacking statement to come: stands on %+v", got)
	}
	if got = StandsOn(nil, full, at(t, "10:12")); got != nil {
		t.Errorf("no case states %+v", got)
	}
}
