package stress

import (
	"testing"

	"drivemend/measure"
)

// A load that takes long to empty is followed to the end of its avalanche: ½·L·I²·BV/(BV − V).
func TestAvalancheOfALongLoad(t *testing.T) {
	p := problemOf(t, boardOf(t, with(unclamped, [2]string{"load.inductance", "1 mH"}, [2]string{"load.stall_current", "12 A"})...))
	a, err := p.avalanche()
	if err != nil || a == nil {
		t.Fatal(a, err)
	}
	if want, err := PulseOf(1e-3+33e-9, 12, 60, 28); err != nil || relative(a.Energy, want.Joule) > 0.02 || relative(a.Time, want.Time) > 0.02 {
		t.Errorf("%+v, closed form %+v (%v)", *a, want, err)
	}
}

// A clamp with a large resistor settles in balance too.
func TestClampSettlesHigh(t *testing.T) {
	for _, ret := range []string{"bus", "rail"} {
		for _, ohm := range []string{"30 kΩ", "47 kΩ", "100 kΩ", "220 kΩ"} {
			p := problemOf(t, selfHeld(t, ret, ohm))
			c, err := p.clamped()
			if err != nil {
				t.Fatal(err)
			}
			s, _ := p.highest().settled()
			if got, want := 16e3*c.Charge, s.drain(s.held); relative(got, want) > 0.05 {
				t.Errorf("to the %s over %s: %.1f V, brings %.3g A, %.3g A leaves", ret, ohm, c.Volt, got, want)
			}
		}
	}
}

// An rc is followed at the opening until it has settled, so that its heat is C·V²·f less what its edges spare.
func TestHeatOfASlowRC(t *testing.T) {
	p := problemOf(t, boardOf(t, with(winch, [2]string{"snubber.capacitance", "10 nF"}, [2]string{"snubber.resistance", "100 Ω"},
		[2]string{"pwm.shortest_on_time", "20 µs"}, [2]string{"pwm.frequency", "20 kHz"})...))
	edges, err := p.cycle()
	if err != nil {
		t.Fatal(err)
	}
	if w, want := p.duty(edges).ResistorWatts, 10e-9*400*400*20e3; relative(w, want) > 0.06 {
		t.Errorf("%g W, C·V²·f is %g W", w, want)
	}
}

// A capture never takes the margin away, whatever the network.
func TestCaptureOfAnyNetwork(t *testing.T) {
	for name, keys := range map[string][][2]string{"clamp": held, "suppressor": suppressed, "decoupling": local, "recovery": recovering} {
		b := boardOf(t, keys...)
		c := &measure.Case{Board: b, Captures: []measure.Capture{opening("scope", probed(t, problemOf(t, b), 200, 30))}}
		if m, err := Compute(c, 1); err != nil || m.AsFound == nil {
			t.Errorf("%s: no figures, needs %v, %v", name, m.Needs, err)
		}
	}
}

// A closing whose current the bus limits, not the gate, is followed until the diode blocks.
func TestClosingLimitedByTheBus(t *testing.T) {
	b := drawSample(24911, recipe{topology: "leg", edge: shapeRamp, net: "clamp"})
	fast, err := b.solve(true)
	if err != nil {
		t.Fatal(err)
	}
	full, err := b.solve(false)
	if err != nil {
		t.Fatal(err)
	}
	if relative(fast.Peak, full.Peak) > 0.05 {
		t.Errorf("peak %g V at %g s, followed further %g V at %g s", fast.Peak, fast.PeakTime, full.Peak, full.PeakTime)
	}
}

// A bank counts its own parts.
func TestBankOfAPosition(t *testing.T) {
	for _, p := range func() []*problem {
		all, _ := prepareAll(bridgeOf(t, "half-bridge", pump).WithParts("high", "Q1", "Q2", "Q3"))
		return all
	}() {
		if own, far := p.in.bank, p.in.farBank; own == far {
			t.Errorf("%v: %d own, %d opposite, of 3 and 1", p.alike, own, far)
		}
	}
}
