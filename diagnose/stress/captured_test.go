package stress

import (
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// probed is what a probe on the terminals of a problem's switch shows of its opening at a bus and a current.
func probed(t *testing.T, p *problem, bus, amps float64) map[string]quantity.Quantity {
	t.Helper()
	s := p.base
	s.bus, s.amps = bus, amps
	e, err := watchingTerminals(s).gateLimited()
	if err != nil {
		t.Fatal(err)
	}
	return map[string]quantity.Quantity{"bus": quantity.Of(bus, quantity.Volt), "current": quantity.Of(amps, quantity.Ampere),
		"peak": quantity.Of(e.terminals, quantity.Volt)}
}

func opening(name string, figures map[string]quantity.Quantity) measure.Capture {
	return measure.Capture{Name: name, Edge: "opening", Figures: figures}
}

// capturedBoards are boards with each network that a measured edge is carried over for.
var capturedBoards = map[string][][2]string{"none": with(pump, [2]string{"snubber.kind", "none"}), "capacitor": battery, "rc": winch, "rcd": clamped,
	"rcd of a line": line}

// An opening taken at half or a quarter of the bus and current bounds the one at the highest bus and worst current, which
// is solved: below the high figure, above the low one.
func TestCaptureBoundsTheFullEdge(t *testing.T) {
	for name, keys := range capturedBoards {
		p := problemOf(t, boardOf(t, with(keys, [2]string{"load.stall_current", "70 A"})...))
		full, err := p.highest().gateLimited()
		if err != nil {
			t.Fatal(err)
		}
		for _, share := range []float64{0.5, 0.25} {
			bus, amps := share*p.highest().bus, share*70
			f, err := p.fromCapture([]seen{{name: "scope", measured: measuredOf(probed(t, p, bus, amps))}})
			if err != nil || f == nil {
				t.Fatalf("%s: %+v, %v", name, f, err)
			}
			t.Logf("%s from %.0f V, %.1f A: %.0f, %.0f, %.0f V, solved %.0f V", name, bus, amps, f.Low, f.Mid, f.High, full.Peak)
			if !(f.Low <= f.Mid && f.Mid <= f.High) || f.Name != "scope" || f.Why == "" {
				t.Errorf("%s: %+v", name, *f)
			}
			if full.Peak > f.High || full.Peak < f.Low {
				t.Errorf("%s from %g V, %g A: %g to %g V, solved %g V", name, bus, amps, f.Low, f.High, full.Peak)
			}
		}
	}
}

// A probe on the terminals misses what the package adds: carried to the same bus and current the middle is the solved peak
// at the chip, not the one at the terminals.
func TestCaptureCountsThePackage(t *testing.T) {
	p := problemOf(t, boardOf(t, with(capturedBoards["none"], [2]string{"switch.package_inductance", "40 nH"})...))
	s := p.highest()
	figures := probed(t, p, s.bus, s.amps)
	full, err := s.gateLimited()
	if err != nil {
		t.Fatal(err)
	}
	f, err := p.fromCapture([]seen{{name: "scope", measured: measuredOf(figures)}})
	if err != nil {
		t.Fatal(err)
	}
	outside := figures["peak"].Value
	t.Logf("terminals %.1f V, carried %.1f V, chip %.1f V", outside, f.Mid, full.Peak)
	if relative(f.Mid, full.Peak) > 0.01 || f.Mid < outside+50 { // the share of the package comes of coarser waveforms
		t.Errorf("terminals %g V, carried %g V, chip %g V", outside, f.Mid, full.Peak)
	}
}

// without gives figures less one of them.
func without(figures map[string]quantity.Quantity, key string) map[string]quantity.Quantity {
	out := map[string]quantity.Quantity{}
	for k, q := range figures {
		if k != key {
			out[k] = q
		}
	}
	return out
}

// A capture that lacks bus, current or peak, that shows no overshoot, a closing, or another position, counts for nothing;
// of those that count, the one with the most bus times current does.
func TestCaptureThatCounts(t *testing.T) {
	p := problemOf(t, boardOf(t, capturedBoards["none"]...))
	whole := probed(t, p, 150, 30)
	flat := without(whole, "peak")
	flat["peak"] = quantity.Of(150, quantity.Volt)
	closing, elsewhere, here := opening("closing", whole), opening("elsewhere", whole), opening("here", whole)
	closing.Edge, elsewhere.Position, here.Position = "closing", "high", "low"
	for _, c := range []struct {
		captures []measure.Capture
		want     string
	}{
		{nil, ""}, {[]measure.Capture{opening("no bus", without(whole, "bus"))}, ""},
		{[]measure.Capture{opening("no current", without(whole, "current"))}, ""},
		{[]measure.Capture{opening("no peak", without(whole, "peak"))}, ""}, {[]measure.Capture{opening("flat", flat)}, ""},
		{[]measure.Capture{closing, elsewhere}, ""}, {[]measure.Capture{closing, here}, "here"},
		{[]measure.Capture{opening("whole", whole), opening("no peak", without(whole, "peak"))}, "whole"},
		{[]measure.Capture{opening("low", probed(t, p, 100, 10)), opening("more", whole), opening("lower", probed(t, p, 150, 10))}, "more"},
	} {
		found, rebuilt := openingsOf(&measure.Case{Captures: c.captures})
		f, err := p.fromCapture(found)
		got := ""
		if f != nil {
			got = f.Name
		}
		if err != nil || got != c.want || len(rebuilt) != 0 {
			t.Errorf("%d captures: %q, want %q (%v)", len(c.captures), got, c.want, err)
		}
	}
}

// A capture belongs to the board that stood there when it was taken: until the rebuild is done to the board as found, from
// then on to the rebuild, as every stage of the bring-up does.
func TestCapturesAndTheRebuild(t *testing.T) {
	done := time.Date(2026, 12, 1, 15, 0, 0, 0, time.UTC)
	board := boardOf(t, capturedBoards["none"]...)
	p := problemOf(t, board)
	at := func(name string, when time.Time, amps float64) measure.Capture {
		c := opening(name, probed(t, p, 150, amps))
		c.At = when
		return c
	}
	c := &measure.Case{Board: board, Captures: []measure.Capture{at("before", done.Add(-time.Hour), 20), at("after", done.Add(time.Hour), 30)},
		Rebuild: &measure.Rebuild{Board: board.WithWord("supply", "battery"), Keys: []string{"supply"}, Done: done}}
	names := func() (found, rebuilt string) {
		m, err := Compute(c, 1)
		if err != nil || m.AsFound == nil || m.Rebuild == nil {
			t.Fatalf("%+v, %v", m, err)
		}
		if f := m.AsFound.Measured; f != nil {
			found = f.Name
		}
		if f := m.Rebuild.Measured; f != nil {
			rebuilt = f.Name
		}
		return found, rebuilt
	}
	if found, rebuilt := names(); found != "before" || rebuilt != "after" {
		t.Errorf("as found %q, rebuild %q", found, rebuilt)
	}
	c.BringUp = []measure.Stage{{Stage: "full load", Figures: probed(t, p, 300, 40)}}
	if found, rebuilt := names(); found != "before" || rebuilt != "stage full load" {
		t.Errorf("with a stage: as found %q, rebuild %q", found, rebuilt)
	}
	c.BringUp, c.Rebuild.Done = nil, time.Time{} // not done: all that was captured is the board as found
	if found, rebuilt := names(); found != "after" || rebuilt != "" {
		t.Errorf("not done: as found %q, rebuild %q", found, rebuilt)
	}
}

// What a capture of twice the peak foretells lies twice as far over the bus; more current, higher.
func TestCaptureFollowsWhatWasMeasured(t *testing.T) {
	p := problemOf(t, boardOf(t, capturedBoards["none"]...))
	figures := probed(t, p, 150, 30)
	over := figures["peak"].Value - 150
	carry := func(over float64) *FromCapture {
		figures["peak"] = quantity.Of(150+over, quantity.Volt)
		f, err := p.fromCapture([]seen{{name: "scope", measured: measuredOf(figures)}})
		if err != nil {
			t.Fatal(err)
		}
		return f
	}
	bus := p.highest().bus
	one, two := carry(over), carry(2*over)
	if math.Abs((two.Mid-bus)-2*(one.Mid-bus)) > 1e-9*two.Mid || !(two.High > one.High) || !(two.Low > one.Low) {
		t.Errorf("%+v, of twice the overshoot %+v", *one, *two)
	}
}

// A board that is within by its stated values is not when a measured opening foretells more: within, by one that lies far
// below; thin, naming it, where only its upper end passes 80 % of the rating; over, where it foretells a peak above the rating.
func TestMeasuredOpeningOverrulesTheDraws(t *testing.T) {
	for _, c := range []struct {
		peak string // at the highest bus and worst current, so that nothing is carried
		want Verdict
	}{{"345 V", Within}, {"445 V", Thin}, {"620 V", OverIt}} {
		peak, err := quantity.Parse(c.peak, quantity.Volt)
		if err != nil {
			t.Fatal(err)
		}
		if c.want == Thin { // a reading whose upper end alone passes the bound
			peak.Low, peak.High = 0.9*peak.Value, 1.2*peak.Value
		}
		m, err := Compute(&measure.Case{ID: "bench", Board: soundBoard(t), Captures: []measure.Capture{opening("scope.csv", map[string]quantity.Quantity{
			"bus": quantity.Of(340, quantity.Volt), "current": quantity.Of(20, quantity.Ampere), "peak": peak})}}, 1)
		if err != nil {
			t.Fatal(err)
		}
		f := m.AsFound
		if f.Verdict != c.want {
			t.Errorf("%s: %s, want %s; foretold %.0f, %.0f, %.0f V, allowed %.0f V, rests on %v", c.peak, f.Verdict, c.want, f.Measured.Low, f.Measured.Mid, f.Measured.High, m.Allowed, f.Rests)
		}
		if c.want == Thin && (len(f.Rests) == 0 || !strings.Contains(f.Rests[len(f.Rests)-1], "scope.csv")) {
			t.Errorf("thin, and the capture is not named: %v", f.Rests)
		}
	}
}

// An opening measured at half of bus and current is carried too far for its upper end to take a verdict away.
func TestUpperEndOfAFarOpening(t *testing.T) {
	for _, c := range []struct {
		bus, amps, peak float64
		want            Verdict
	}{{340, 20, 430, Within}, {170, 10, 216, Within}, {300, 17, 397, Thin}} {
		at := func(v float64, u quantity.Unit) quantity.Quantity { return quantity.Of(v, u) }
		m, err := Compute(&measure.Case{ID: "bench", Board: soundBoard(t), Captures: []measure.Capture{opening("scope.csv", map[string]quantity.Quantity{
			"bus": at(c.bus, quantity.Volt), "current": at(c.amps, quantity.Ampere), "peak": at(c.peak, quantity.Volt)})}}, 1)
		if err != nil {
			t.Fatal(err)
		}
		f := m.AsFound
		t.Logf("%g V, %g A: %s, foretold %.0f, %.0f, %.0f V, allowed %.0f V", c.bus, c.amps, f.Verdict, f.Measured.Low, f.Measured.Mid, f.Measured.High, m.Allowed)
		if f.Verdict != c.want {
			t.Errorf("%g V, %g A: %s, want %s", c.bus, c.amps, f.Verdict, c.want)
		}
		if said := strings.Contains(f.Measured.Why, "is a bound"); said == f.Measured.Near || f.Measured.Near != (c.bus > 200) {
			t.Errorf("%g V, %g A: near %v, %q", c.bus, c.amps, f.Measured.Near, f.Measured.Why)
		}
	}
}

// An opening measured near the highest bus and worst current stands in for the gate and the fall time's reference; it lifts
// nothing else.
func TestMeasuredOpeningLiftsTheGate(t *testing.T) {
	for _, key := range []string{"gate.turn_off_resistance", "switch.fall_time.gate_resistance", "snubber.kind"} {
		c := &measure.Case{ID: "bench", Board: soundBoard(t).Without(key)}
		for _, want := range []bool{true, key == "snubber.kind"} {
			m, err := Compute(c, 1)
			if err != nil {
				t.Fatal(err)
			}
			if got := slices.Contains(m.AsFound.LiftedBy, key); got != want {
				t.Errorf("without %s, %d openings measured: lifted by %v", key, len(c.Captures), m.AsFound.LiftedBy)
			}
			c.Captures = []measure.Capture{opening("scope.csv", map[string]quantity.Quantity{"bus": quantity.Of(340, quantity.Volt),
				"current": quantity.Of(20, quantity.Ampere), "peak": quantity.Of(345, quantity.Volt)})}
		}
	}
}
