package stress

import (
	"math"
	"slices"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// mosfetBridge is a battery bridge with everything stated that its edges take.
func mosfetBridge(t testing.TB) measure.Board {
	return boardOf(t, [2]string{"bus.nominal", "48 V"}, [2]string{"bus.highest", "56 V"}, [2]string{"bus.capacitance", "1000 µF"},
		[2]string{"switch.kind", "mosfet"}, [2]string{"switch.rated_voltage", "100 V"}, [2]string{"switch.rated_current", "80 A"},
		[2]string{"switch.output_capacitance", "600 pF"}, [2]string{"switch.fall_time", "40 ns"}, [2]string{"switch.rise_slope", "5 V/ns"},
		[2]string{"switch.turn_on_slope", "1 A/ns"}, [2]string{"switch.closing_slope", "5 V/ns"}, [2]string{"switch.avalanche.energy", "200 mJ"},
		[2]string{"freewheel.recovery_charge", "100 nC"}, [2]string{"loop.inductance", "30 nH"}, [2]string{"snubber.kind", "none"},
		[2]string{"load.running_current", "20 A"}, [2]string{"load.stall_current", "60 A"}).
		WithWord("topology", "h-bridge").WithWord("supply", "battery")
}

func spansOf(t testing.TB, b measure.Board) map[string]Span {
	t.Helper()
	spans, needs, err := Spans(b)
	if err != nil || len(spans) == 0 {
		t.Fatalf("no figures: %v, needs %v", err, needs)
	}
	return spans
}

func henry(v float64) quantity.Quantity { return quantity.Of(v, quantity.Henry) }

func BenchmarkSpansOf(b *testing.B) {
	chopper := boardOf(b, clamped...).WithParts("low", "Q1", "Q2", "Q3").Without("loop.inductance").Without("switch.rise_slope")
	for _, c := range []struct {
		name  string
		board measure.Board
	}{
		{"chopper", chopper},
		{"half-bridge", chopper.WithWord("topology", "half-bridge")},
		{"h-bridge", mosfetBridge(b)},
		{"h-bridge-avalanche", mosfetBridge(b).With("loop.inductance", henry(300e-9))},
		{"three-phase-bare", boardOf(b, [2]string{"bus.nominal", "560 V"}, [2]string{"switch.rated_voltage", "1200 V"}, [2]string{"switch.rated_current", "30 A"}).WithWord("topology", "three-phase")},
	} {
		b.Run(c.name, func(b *testing.B) {
			for b.Loop() {
				spansOf(b, c.board)
			}
		})
	}
}

// Which board has which figures.
func TestFiguresOfBoards(t *testing.T) {
	bridge := mosfetBridge(t)
	held := boardOf(t, pump...).WithWord("snubber.kind", "clamp").With("snubber.capacitance", quantity.Of(1e-6, quantity.Farad)).
		With("snubber.clamp_voltage", quantity.Of(450, quantity.Volt)).With("snubber.resistance", quantity.Of(1000, quantity.Ohm))
	for _, c := range []struct {
		name  string
		board measure.Board
		want  []string
	}{
		{"chopper", boardOf(t, pump...), []string{edgeSlope, peakOverRated}},
		{"chopper with a clamp", held, []string{clampOverRated, edgeSlope, peakOverRated}},
		{"bridge of rated energy", bridge, []string{edgeSlope, energyOverRated, peakOverRated, closingOverRated}},
		{"no energy stated", bridge.Without("switch.avalanche.energy"), []string{edgeSlope, peakOverRated, closingOverRated}},
		{"an IGBT is not credited", bridge.WithWord("switch.kind", "igbt"), []string{edgeSlope, peakOverRated, closingOverRated}},
		{"bus over the rating", bridge.With("switch.rated_voltage", quantity.Of(40, quantity.Volt)), []string{edgeSlope, peakOverRated, closingOverRated}},
	} {
		var got []string
		for name := range spansOf(t, c.board) {
			got = append(got, name)
		}
		slices.Sort(got)
		if !slices.Equal(got, c.want) {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
}

// Each figure moves as the board does: more loop, a faster gate, more recovery charge, less rated energy, a higher clamp.
func TestFiguresFollowTheBoard(t *testing.T) {
	bridge := mosfetBridge(t)
	slow := boardOf(t, pump...).With("switch.rise_slope", quantity.Of(2e9, quantity.VoltPerSecond))
	wild := bridge.With("loop.inductance", henry(300e-9))
	held := boardOf(t, pump...).WithWord("snubber.kind", "clamp").With("snubber.capacitance", quantity.Of(1e-6, quantity.Farad)).
		With("snubber.clamp_voltage", quantity.Of(400, quantity.Volt)).With("snubber.resistance", quantity.Of(1000, quantity.Ohm))
	for _, c := range []struct {
		figure     string
		less, more measure.Board
		by         float64 // the high end of more over that of less, at least
	}{
		{peakOverRated, bridge, wild, 1.1},
		{closingOverRated, bridge, bridge.With("loop.inductance", henry(100e-9)).With("freewheel.recovery_charge", quantity.Of(1e-6, quantity.Coulomb)), 1.1},
		{energyOverRated, wild, wild.With("switch.avalanche.energy", quantity.Of(1e-3, quantity.Joule)), 100},
		{edgeSlope, slow, slow.With("switch.rise_slope", quantity.Of(5e9, quantity.VoltPerSecond)), 1.5},
		{edgeSlope, bridge.With("freewheel.recovery_charge", quantity.Of(10e-9, quantity.Coulomb)), bridge, 1.2},
		{clampOverRated, held, held.With("snubber.clamp_voltage", quantity.Of(600, quantity.Volt)), 1.4},
	} {
		less, more := spansOf(t, c.less)[c.figure], spansOf(t, c.more)[c.figure]
		if !(less.High > 0 && more.High > c.by*less.High) || less.Low > less.High || more.Low > more.High {
			t.Errorf("%s: %+v, then %+v", c.figure, less, more)
		}
	}
}

// No avalanche while the peak stays under the rating; over it, no more than the closed form, and without a freewheel
// path that itself: ½·L·I²·BV/(BV−V) (see PulseOf).
func TestEnergyOfAvalanche(t *testing.T) {
	tame := mosfetBridge(t).With("loop.inductance", henry(5e-9)).With("switch.rated_voltage", quantity.Of(600, quantity.Volt))
	if s := spansOf(t, tame); s[peakOverRated].High >= 1 || s[energyOverRated].Low != 0 || s[energyOverRated].High != 0 {
		t.Errorf("under the rating: %+v", s)
	}
	p, _ := prepare(mosfetBridge(t).With("loop.inductance", henry(300e-9)))
	s := p.highest()
	whole := s
	whole.both = true
	pulse, err := PulseOf(whole.henry(), s.amps, p.rated, s.bus)
	if err != nil {
		t.Fatal(err)
	}
	joule, err := p.joule(s, 1e-9)
	if err != nil || !(joule > pulse.Joule/3 && joule < 1.3*pulse.Joule) {
		t.Errorf("solved %g J of %g J, %v", joule, pulse.Joule, err)
	}
	open := boardOf(t, battery...).WithWord("freewheel.fitted", "no").With("load.inductance", henry(1e-3)).With("switch.avalanche.energy", quantity.Of(0.1, quantity.Joule))
	p, _ = prepare(open)
	s = p.highest()
	if pulse, err = PulseOf(s.load+s.henry(), s.amps, p.rated, s.bus); err != nil {
		t.Fatal(err)
	}
	if have := spansOf(t, open)[energyOverRated].High; have < pulse.Joule/0.1*(1-1e-9) {
		t.Errorf("without freewheel path %g, at least %g", have, pulse.Joule/0.1)
	}
}

// What the sweep leaves out does not matter: every unknown at both ends at both buses gives the same interval.
func TestSweepMissesNothing(t *testing.T) {
	for _, b := range []measure.Board{
		boardOf(t, clamped...).Without("loop.inductance").Without("switch.rise_slope"), boardOf(t, battery...), mosfetBridge(t).Without("loop.inductance"),
	} {
		p, _ := prepare(b)
		w, err := p.sweep(turnOff, p.openingFigures)
		if err != nil {
			t.Fatal(err)
		}
		got := w.span(0)
		low, high := got.Low, got.High
		for _, in := range p.unknowns(turnOff) {
			for _, s := range []scene{p.nominal().quick(), p.highest().quick()} {
				for _, v := range []float64{in.low, in.high} {
					x, err := p.openingFigures(s.with(in.key, v))
					if err != nil {
						t.Fatal(err)
					}
					low, high = math.Min(low, x[0]), math.Max(high, x[0])
				}
			}
		}
		if near := 0.002; low < got.Low-near || high > got.High+near {
			t.Errorf("%g to %g, all ends %g to %g", got.Low, got.High, low, high)
		}
	}
}

// A figure is guessed when assumed values move it and nothing stated of the edge does; a bus over the rating needs no edge.
func TestGuessed(t *testing.T) {
	bare := boardOf(t, [2]string{"bus.nominal", "310 V"}, [2]string{"bus.highest", "390 V"}, [2]string{"switch.kind", "igbt"},
		[2]string{"switch.rated_voltage", "600 V"}, [2]string{"load.running_current", "20 A"}, [2]string{"load.stall_current", "60 A"})
	loop := bare.With("loop.inductance", henry(150e-9))
	for _, c := range []struct {
		name    string
		board   measure.Board
		figure  string
		guessed bool
	}{
		{"bus and currents alone", bare, peakOverRated, true},
		{"loop stated", loop, peakOverRated, false},
		{"part rated below the bus", bare.With("switch.rated_voltage", quantity.Of(250, quantity.Volt)), peakOverRated, false},
		{"everything stated", mosfetBridge(t), peakOverRated, false},
		{"gate not stated", bare, edgeSlope, true},
		{"slope stated", bare.With("switch.rise_slope", quantity.Of(5e9, quantity.VoltPerSecond)), edgeSlope, false},
		{"recovery, all typical", bare.WithWord("topology", "half-bridge"), closingOverRated, true},
		{"recovery stated", mosfetBridge(t), closingOverRated, false},
	} {
		span := spansOf(t, c.board)[c.figure]
		if span.Guessed != c.guessed || c.guessed && len(span.Assumed) == 0 {
			t.Errorf("%s: %s is %+v", c.name, c.figure, span)
		}
	}
}

// A slope spans what the same board gives with the values that make it stated at either end of their intervals: the
// gate's slope, and the capacitance where a small running current cannot follow the gate.
func TestSlopeSpansItsUnknowns(t *testing.T) {
	small := boardOf(t, pump...).With("load.running_current", quantity.Of(0.2, quantity.Ampere)).With("load.stall_current", quantity.Of(40, quantity.Ampere))
	for _, c := range []struct {
		board measure.Board
		key   string
	}{{boardOf(t, pump...).Without("switch.rise_slope"), "switch.rise_slope"}, {small.Without("switch.output_capacitance"), "switch.output_capacitance"}} {
		p, _ := prepare(c.board)
		in := p.in.values[p.in.at[c.key]]
		a, b := spansOf(t, c.board.With(c.key, quantity.Of(in.low, in.unit)))[edgeSlope], spansOf(t, c.board.With(c.key, quantity.Of(in.high, in.unit)))[edgeSlope]
		got := spansOf(t, c.board)[edgeSlope]
		if got.Low > min(a.Low, b.Low)*1.001 || got.High < max(a.High, b.High)*0.999 || !slices.Contains(got.Assumed, c.key) {
			t.Errorf("%s not stated: %+v; at its ends %+v and %+v", c.key, got, a, b)
		}
	}
}
