package stress

import (
	"math"
	"testing"

	"drivemend/measure"
)

func problemOf(t *testing.T, b measure.Board) *problem {
	t.Helper()
	p, needs := prepare(b)
	if p == nil {
		t.Fatalf("needs %v", needs)
	}
	return p
}

// selfHeld is a clamp whose resistor and the edges decide what it holds.
func selfHeld(t *testing.T, ret, ohm string) measure.Board {
	return boardOf(t, with(held, [2]string{"snubber.return", ret}, [2]string{"snubber.resistance", ohm}, [2]string{"pwm.frequency", "16 kHz"},
		[2]string{"load.stall_current", "90 A"})...).Without("snubber.clamp_voltage")
}

// A clamp settles where the edges at the PWM frequency and worst current bring what its resistor carries away, to the bus
// (V − bus)/R, to its own rail V/R. The search ends within 2 % of it; its coarser waveforms bring up to 1 % less.
func TestClampSettlesInBalance(t *testing.T) {
	for _, c := range []struct{ ret, ohm string }{{"bus", "2.2 kΩ"}, {"bus", "100 Ω"}, {"rail", "4.7 kΩ"}, {"rail", "10 kΩ"}} {
		p := problemOf(t, selfHeld(t, c.ret, c.ohm))
		got, err := p.clamped()
		if err != nil {
			t.Fatal(err)
		}
		s := p.highest()
		over := got.Volt
		if c.ret == "bus" {
			over -= s.bus
		}
		brought, leaves := 16e3*got.Charge, over/s.get("snubber.resistance")
		t.Logf("to the %s over %s: %.1f V on a bus of %.0f V, brings %.4g A, leaves %.4g A (%+.2f %%)", c.ret, c.ohm, got.Volt, s.bus,
			brought, leaves, 100*(brought/leaves-1))
		if got.Stated || !(got.Volt > 1.001*s.bus) || relative(brought, leaves) > 0.03 {
			t.Errorf("to the %s over %s: %+v brings %g A, %g A leaves", c.ret, c.ohm, *got, brought, leaves)
		}
		if relative(got.Watts, brought*over) > 1e-9 || relative(got.Ripple*470e-9, got.Charge) > 1e-9 {
			t.Errorf("%+v", *got)
		}
	}
}

// A clamp whose resistor to its own rail draws more than the edges bring stands at the bus: 310 V over 100 Ω are 3 A, and
// an edge of 90 A would have to bring 190 µC.
func TestClampDrainedToTheBus(t *testing.T) {
	p := problemOf(t, selfHeld(t, "rail", "100 Ω"))
	s, err := p.highest().settled()
	if err != nil || s.held != s.bus {
		t.Errorf("held at %g V on a bus of %g V, %v", s.held, s.bus, err)
	}
}

// A stated clamp voltage is kept, whatever the resistor would make of it; and what it holds is in the figures.
func TestClampAsStated(t *testing.T) {
	p := problemOf(t, boardOf(t, with(held, [2]string{"snubber.resistance", "22 kΩ"}, [2]string{"pwm.frequency", "16 kHz"})...))
	got, err := p.clamped()
	if err != nil || !got.Stated || got.Volt != 400 {
		t.Errorf("%+v, %v", got, err)
	}
	if got, err := problemOf(t, boardOf(t, winch...)).clamped(); got != nil || err != nil {
		t.Errorf("an rc as a clamp: %+v, %v", got, err)
	}
}

// broken is a recovery network whose tie is open.
var broken = with(recovering, [2]string{"snubber.link.open", "yes"}, [2]string{"pwm.frequency", "10 kHz"}, [2]string{"load.stall_current", "70 A"})

// With its tie open the reservoir climbs to the breakdown, and the verdict is over whatever one edge does; each edge
// brings as much: u² grows by what the first one brought, so that the climb takes ((BV − V)/first)² edges.
func TestPumpUpEndsAtBreakdown(t *testing.T) {
	f := computed(t, boardOf(t, broken...)).AsFound
	u := f.PumpUp
	if u == nil || u.EndsBy != StopBreakdown || u.End != f.Rated || f.Verdict != OverIt {
		t.Fatalf("%+v, %s", u, f.Verdict)
	}
	edges := math.Pow((f.Rated-f.Nominal.Bus)/u.FirstEdge, 2)
	if math.Abs(u.Edges-edges) > 1 || relative(u.Time, u.Edges/10e3) > 0.01 {
		t.Errorf("%+v, by hand %g edges", *u, edges)
	}
	// What the loop holds can at most all go into the reservoir: ½·L·I² = ½·C·u², less what is lost on the way.
	loop := 133e-9 + 15e-9
	if most := 60 * math.Sqrt(loop/2.2e-6); u.FirstEdge > most || u.FirstEdge < 0.3*most {
		t.Errorf("the first edge brings %g V, the loop holds %g V", u.FirstEdge, most)
	}
	t.Logf("%+v", *u)
	if f := computed(t, boardOf(t, recovering...)).AsFound; f.PumpUp != nil {
		t.Errorf("a tie that holds: %+v", f.PumpUp)
	}
}

// A bleeder ends the climb where it takes away what the edges bring: to the bus u²/R = ½·L·I²·f, which is ½·C·u₁²·f with
// what the first edge brought; to its rail (u + V)·u/R.
func TestPumpUpEndsAtBleeder(t *testing.T) {
	for _, ret := range []string{"bus", "rail"} {
		ohm := map[string]string{"bus": "4.7 kΩ", "rail": "33 kΩ"}[ret]
		p := problemOf(t, boardOf(t, with(broken, [2]string{"snubber.resistance", ohm}, [2]string{"snubber.return", ret})...))
		u, err := p.pumpedUp()
		if err != nil || u == nil {
			t.Fatal(u, err)
		}
		over := u.End - 310
		power := 0.5 * 2.2e-6 * u.FirstEdge * u.FirstEdge * 10e3
		volts := over
		if ret == "rail" {
			volts = u.End
		}
		drains := over * volts / p.nominal().get("snubber.resistance")
		t.Logf("to the %s: %+v", ret, *u)
		if u.EndsBy != StopBleeder || relative(drains, power) > 1e-6 || u.End >= p.rated {
			t.Errorf("to the %s: %+v, drains %g W of %g W", ret, *u, drains, power)
		}
	}
}

// unclamped is a switch on a stiff supply whose load has nowhere to go: a small solenoid's worth of leakage.
var unclamped = [][2]string{{"bus.nominal", "24 V"}, {"bus.highest", "28 V"}, {"load.running_current", "1 A"}, {"load.stall_current", "1 A"},
	{"load.inductance", "20 µH"}, {"freewheel.fitted", "no"}, {"switch.kind", "mosfet"}, {"switch.rated_voltage", "60 V"},
	{"switch.output_capacitance", "400 pF"}, {"switch.fall_time", "5 ns"}, {"switch.package_inductance", "8 nH"}, {"loop.inductance", "25 nH"},
	{"loop.resistance", "1 mΩ"}, {"snubber.kind", "none"}, {"cooling.coldest_air", "25 °C"}, {"switch.avalanche.energy", "1 µJ"},
	{"switch.avalanche.current", "0.5 A"}}

// The load of a switch without a freewheel path empties into its avalanche: ½·L·I²·BV/(BV − V) within 2 %, with the current
// that there is when the output capacitance stands at the breakdown; and it does so each cycle.
func TestAvalancheOfUnclampedLoad(t *testing.T) {
	p := problemOf(t, boardOf(t, unclamped...))
	a, err := p.avalanche()
	if err != nil || a == nil {
		t.Fatal(a, err)
	}
	want, err := PulseOf(20e-6+33e-9, a.Current, 60, 28)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%+v, closed form %+v", *a, want)
	if relative(a.Energy, want.Joule) > 0.02 || relative(a.Time, want.Time) > 0.02 || !(a.Current > 0.9 && a.Current <= 1.05) || a.Volt != 60 {
		t.Errorf("%+v, closed form %+v", *a, want)
	}
	if !a.EveryCycle || !a.Rated || !a.OverEnergy || !a.OverCurrent || !(a.Prospective > 150) {
		t.Errorf("%+v", *a)
	}
	igbt := problemOf(t, boardOf(t, unclamped...).WithWord("switch.kind", "igbt"))
	if a, err := igbt.avalanche(); a != nil || err != nil {
		t.Errorf("an IGBT avalanches: %+v, %v", a, err)
	}
}

// Above its rating at the worst current only, it does not avalanche each cycle; below it, not at all.
func TestAvalancheOfTrips(t *testing.T) {
	list := with(battery, [2]string{"snubber.kind", "none"}, [2]string{"load.running_current", "5 A"}, [2]string{"load.stall_current", "150 A"},
		[2]string{"loop.inductance", "60 nH"}, [2]string{"cooling.coldest_air", "25 °C"}, [2]string{"switch.avalanche.energy", "1 J"},
		[2]string{"switch.avalanche.current", "300 A"})
	a, err := problemOf(t, boardOf(t, list...)).avalanche()
	if err != nil || a == nil || a.EveryCycle || a.OverEnergy || a.OverCurrent || !a.Rated {
		t.Fatalf("%+v, %v", a, err)
	}
	// The loop alone avalanches, with what the bus adds on the way.
	if most, err := PulseOf(73e-9, 150, 100, 57.6); err != nil || !(a.Energy > 0 && a.Energy < most.Joule) || !(a.Current <= 150) {
		t.Errorf("%+v, at most %+v, %v", *a, most, err)
	}
	calm := boardOf(t, with(list, [2]string{"load.stall_current", "5 A"})...)
	if a, err := problemOf(t, calm).avalanche(); a != nil || err != nil {
		t.Errorf("below its rating: %+v, %v", a, err)
	}
}

// An rc whose capacitor settles at every edge, with edges much shorter than its time constant and a loop too small to matter,
// takes C·V²·f in its resistor: half at the opening, half at the closing. And as all its current goes through the resistor,
// that heat is R times the square of the current, over the period.
func TestDutyOfAnRC(t *testing.T) {
	const farad, ohm, hertz = 1e-9, 68.0, 20e3
	p := problemOf(t, boardOf(t, with(winch, [2]string{"snubber.capacitance", "1 nF"}, [2]string{"snubber.resistance", "68 Ω"},
		[2]string{"pwm.shortest_on_time", "2 µs"}, [2]string{"pwm.frequency", "20 kHz"}, [2]string{"loop.inductance", "5 nH"},
		[2]string{"switch.package_inductance", "2 nH"}, [2]string{"snubber.lead_inductance", "2 nH"}, [2]string{"switch.rise_slope", "100 V/ns"},
		[2]string{"switch.closing_slope", "100 V/ns"}, [2]string{"switch.turn_on_slope", "1000 A/µs"})...))
	edges, err := p.cycle()
	if err != nil {
		t.Fatal(err)
	}
	d := p.duty(edges)
	want := farad * 400 * 400 * hertz
	t.Logf("%+v, C·V²·f %.4g W", *d, want)
	if relative(d.ResistorWatts, want) > 0.03 {
		t.Errorf("%g W, C·V²·f is %g W", d.ResistorWatts, want)
	}
	if squared(d.CapacitorRMS)*ohm/d.ResistorWatts < 1-1e-6 || squared(d.CapacitorRMS)*ohm/d.ResistorWatts > 1+1e-6 {
		t.Errorf("%g A through %g Ω are not %g W", d.CapacitorRMS, ohm, d.ResistorWatts)
	}
	if relative(d.Slope, d.CapacitorPeak/farad) > 1e-9 || relative(d.Discharge, 400/ohm) > 1e-9 {
		t.Errorf("%+v", *d)
	}
	if left := math.Exp(-2e-6 / (ohm * farad)); relative(d.Emptied, 1-left) > 1e-9 {
		t.Errorf("emptied %g, 1 − exp(−t/RC) is %g", d.Emptied, 1-left)
	}
}

// Without a frequency there is no heat and no effective current, but the currents of each edge: the square of an rcd's
// capacitor current, times the time of the edge, is no less than the square of its charge.
func TestDutyWithoutFrequency(t *testing.T) {
	p := problemOf(t, boardOf(t, clamped...))
	edges, err := p.cycle()
	if err != nil {
		t.Fatal(err)
	}
	d := p.duty(edges)
	if d.CapacitorRMS != 0 || d.ResistorWatts != 0 || !(d.CapacitorPeak > 0) || !(d.Slope > 0) {
		t.Errorf("no frequency is stated: %+v", *d)
	}
	for _, e := range edges {
		if charge := e.run.Charge("snubber"); charge*charge > e.Network.Square*e.run.Time() { // Cauchy and Schwarz
			t.Errorf("%s: %g C within %g s and %g A²s", e.Name, charge, e.run.Time(), e.Network.Square)
		}
	}
	if d := problemOf(t, boardOf(t, pump...)).duty(edges); d != nil {
		t.Errorf("no network: %+v", *d)
	}
}

// Three parts of which the last opens half the fall later, 60 of 96 ns/0.8: it takes over half of what the two others
// carried, 1/3 + 2/3·1/2 of the bank's current; as late as the fall, all of it.
func TestLastPart(t *testing.T) {
	for _, c := range []struct {
		delay string
		parts int
		share float64
	}{{"60 ns", 3, 2.0 / 3}, {"120 ns", 3, 1}, {"500 ns", 2, 1}, {"12 ns", 2, 0.55}, {"60 ns", 1, 0}, {"0 ns", 3, 0}} {
		b := boardOf(t, with(pump, [2]string{"switch.spread.delay", c.delay}, [2]string{"load.stall_current", "90 A"})...)
		p := problemOf(t, b.WithParts("low", []string{"Q1", "Q2", "Q3"}[:c.parts]...))
		e, err := p.placed(opens, p.highest())
		if err != nil {
			t.Fatal(err)
		}
		got := p.lastPart(e)
		switch {
		case c.share == 0 && got == nil:
		case c.share == 0 || got == nil || relative(got.Share, c.share) > 1e-9:
			t.Errorf("%s of %d: %+v, want a share of %g", c.delay, c.parts, got, c.share)
		case relative(got.Current, 90*c.share) > 1e-9 || relative(got.Energy, c.share*e.energy("switch")) > 1e-9 || got.Energy <= 0:
			t.Errorf("%s of %d: %+v of %g J", c.delay, c.parts, got, e.energy("switch"))
		}
	}
}
