package stress

import (
	"math"
	"slices"
	"strings"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// sound is a board with nothing left open, well within its rating.
var sound = [][2]string{{"bus.nominal", "310 V"}, {"bus.highest", "340 V"}, {"bus.capacitance", "2200 µF"}, {"bus.esr", "40 mΩ"},
	{"bus.supply_inductance", "10 µH"}, {"load.running_current", "10 A"}, {"load.stall_current", "20 A"}, {"switch.kind", "igbt"},
	{"switch.rated_voltage", "600 V"}, {"switch.rated_current", "40 A"}, {"switch.output_capacitance", "250 pF"}, {"switch.fall_time", "96 ns"},
	{"switch.fall_time.gate_resistance", "10 Ω"}, {"gate.turn_off_resistance", "10 Ω"}, {"switch.rise_slope", "8 V/ns"},
	{"switch.package_inductance", "13 nH"}, {"loop.inductance", "80 nH"}, {"loop.resistance", "20 mΩ"}, {"freewheel.forward_voltage", "1.2 V"},
	{"freewheel.forward_recovery.voltage", "10 V"}, {"freewheel.forward_recovery.time", "100 ns"}, {"snubber.kind", "rcd"},
	{"snubber.capacitance", "10 nF"}, {"snubber.resistance", "47 Ω"}, {"snubber.lead_inductance", "10 nH"},
	{"snubber.diode.forward_voltage", "0.9 V"}, {"snubber.diode.forward_recovery.voltage", "8 V"},
	{"snubber.diode.forward_recovery.time", "60 ns"}, {"pwm.shortest_on_time", "5 µs"}, {"cooling.coldest_air", "0 °C"},
	{"switch.turn_on_slope", "500 A/µs"}, {"switch.closing_slope", "8 V/ns"}, {"freewheel.softness", "0.8"}, {"freewheel.recovery_charge", "0.4 µC"},
	{"loop.damping_ratio", "0.05"}}

func computed(t *testing.T, b measure.Board) *Margin {
	t.Helper()
	m, err := Compute(&measure.Case{ID: "bench", Board: b}, 1)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func soundBoard(t *testing.T, more ...[2]string) measure.Board {
	return boardOf(t, with(sound, more...)...).WithParts("low", "Q1")
}

func TestGrade(t *testing.T) {
	for _, c := range []struct {
		share float64
		want  Verdict
	}{{0, Within}, {0.8, Within}, {0.8001, Thin}, {0.91, Thin}, {0.911, Bare}, {1, Bare}, {1.001, OverIt}, {math.Inf(1), OverIt}, {math.NaN(), Unknown}} {
		if got := Grade(c.share); got != c.want {
			t.Errorf("%g: %s, want %s", c.share, got, c.want)
		}
	}
}

// 0.1 %/K below 25 °C at the coldest junction.
func TestColdRating(t *testing.T) {
	for _, c := range []struct{ coldest, want float64 }{{25, 600}, {40, 600}, {0, 585}, {-40, 561}} {
		if got := coldRating(600, c.coldest); math.Abs(got-c.want) > 1e-9 {
			t.Errorf("%g °C: %g V, want %g V", c.coldest, got, c.want)
		}
	}
}

func TestSoundBoardIsWithin(t *testing.T) {
	m := computed(t, soundBoard(t))
	f := m.AsFound
	if f.Verdict != Within || len(f.LiftedBy) > 0 || len(f.Rests) > 0 {
		t.Fatalf("%s, lifted by %v, rests on %v, 99.9 %% %g V", f.Verdict, f.LiftedBy, f.Rests, f.P999.Peak)
	}
	for _, a := range m.Assumed { // a diode's recovery is carried over from its test
		if a.Key != "freewheel.recovery_charge" && a.Key != "freewheel.softness" {
			t.Errorf("everything is stated, yet assumed: %v", a)
		}
	}
	if m.Rated != 585 || m.Stated != 600 || m.Allowed != 468 {
		t.Errorf("rated %g V, stated %g V, allowed %g V", m.Rated, m.Stated, m.Allowed)
	}
	if !(f.Worst.Peak >= f.P999.Peak) || f.P999.Samples != 400 {
		t.Errorf("corner %g V, percentile %g V of %d", f.Worst.Peak, f.P999.Peak, f.P999.Samples)
	}
}

// Without the gate, or with a gate that is only assumed, a verdict is never better than thin, and says what lifts it.
func TestNeverBetterThanThin(t *testing.T) {
	for _, key := range []string{"gate.turn_off_resistance", "switch.fall_time.gate_resistance", "switch.fall_time", "snubber.kind"} {
		b := soundBoard(t).Without(key)
		if key == "switch.fall_time" { // the keys below it go with it
			b = soundBoard(t, [2]string{"load.stall_current", "10 A"}).Without(key).With("gate.turn_off_resistance", quantity.Of(10, quantity.Ohm))
		}
		f := computed(t, b).AsFound
		if f.Verdict == Within || !slices.Contains(f.LiftedBy, key) {
			t.Errorf("without %s: %s, lifted by %v", key, f.Verdict, f.LiftedBy)
		}
	}
}

// No within while an assumed value could flip it; the interval named is safe, and just outside it is not.
func TestRestsOnAssumed(t *testing.T) {
	b := soundBoard(t, [2]string{"load.stall_current", "40 A"}, [2]string{"switch.rated_voltage", "640 V"}).Without("snubber.lead_inductance")
	p, _ := prepare(b)
	scan, err := p.scan()
	if err != nil {
		t.Fatal(err)
	}
	lead := scan[0]
	for _, s := range scan {
		if s.input.key == "snubber.lead_inductance" {
			lead = s
		}
	}
	middle, err := p.peakWith("snubber.lead_inductance", lead.input.mid)
	if err != nil {
		t.Fatal(err)
	}
	limit := (middle + lead.highest()) / 2 // somewhere the lead decides
	words, err := p.rests(scan, limit)
	if err != nil {
		t.Fatal(err)
	}
	if len(words) != 1 || !strings.Contains(words[0], "snubber.lead_inductance") {
		t.Fatalf("rests on %v", words)
	}
	t.Log(words[0])
	low, high, err := p.safe(lead, limit)
	if err != nil {
		t.Fatal(err)
	}
	beyond := high * 1.02
	if low > lead.input.low {
		beyond = low * 0.98
	}
	for _, c := range []struct {
		value float64
		safe  bool
	}{{low, true}, {high, true}, {(low + high) / 2, true}, {beyond, false}} {
		peak, err := p.peakWith("snubber.lead_inductance", c.value)
		if err != nil {
			t.Fatal(err)
		}
		if (peak <= limit) != c.safe {
			t.Errorf("lead %g H: peak %g V, limit %g V", c.value, peak, limit)
		}
	}
	f := &Figures{P999: Percentile{Peak: limit}}
	p.rated = limit / withinShare * (1 + 1e-9)
	if err := p.verdict(f, scan); err != nil || f.Verdict != Thin || len(f.Rests) == 0 {
		t.Errorf("%s, rests on %v, %v", f.Verdict, f.Rests, err)
	}
}

// What cannot be worked out has no figures, and the need says which and why.
func TestNeeds(t *testing.T) {
	for _, c := range []struct{ key, word, need, says string }{
		{"topology", "", "board.topology", "80 %"},
		{"topology", "other", "board.topology", "chopper"},
		{"snubber.kind", "clamp", "pwm.frequency", "clamp"},
		{"snubber.kind", "recovery", "snubber.reservoir", "recovery"},
		{"snubber.kind", "suppressor", "snubber.clamp_voltage", "suppressor"},
		{"freewheel.fitted", "no", "load.inductance", "freewheel"},
		{"snubber.capacitance", "", "snubber.capacitance", "rcd"},
		{"switch.rated_voltage", "", "switch.rated_voltage", "verdict"},
		{"bus.nominal", "", "", ""},
	} {
		b := soundBoard(t)
		if c.word == "" {
			b = b.Without(c.key)
		} else {
			b = b.WithWord(c.key, c.word)
		}
		problems, needs := prepareAll(b)
		if c.need == "" {
			if len(problems) == 0 { // the highest voltage serves
				t.Errorf("without %s: no figures, needs %v", c.key, needs)
			}
			continue
		}
		k := slices.IndexFunc(needs, func(n Need) bool { return n.Key == c.need })
		if len(problems) > 0 || k < 0 || !strings.Contains(strings.Join(needs[k].For, "; "), c.says) {
			t.Errorf("%s %s: %d places, needs %v", c.key, c.word, len(problems), needs)
		}
	}
}

// Worst current: the highest of stall, and trip plus V·delay/L; never below the running current.
func TestWorstCurrent(t *testing.T) {
	for _, c := range []struct {
		keys    [][2]string
		without []string
		want    float64
		assumed bool
	}{
		{nil, nil, 20, false},
		{[][2]string{{"protection.trip_current", "30 A"}, {"protection.trip_delay", "10 µs"}, {"load.inductance", "340 µH"}}, nil, 40, false},
		{[][2]string{{"protection.trip_current", "15 A"}}, nil, 20, false},
		{[][2]string{{"protection.trip_current", "15 A"}}, []string{"load.stall_current"}, 15, false},
		{[][2]string{{"load.running_current", "25 A"}}, nil, 25, false},
		{nil, []string{"load.stall_current"}, 40, true},
		{nil, []string{"load.stall_current", "switch.rated_current"}, 20, true},
	} {
		b := soundBoard(t, c.keys...)
		for _, key := range c.without {
			b = b.Without(key)
		}
		in := gather(placesOf(b)[0])
		got := in.values[in.at["load.stall_current"]]
		if math.Abs(got.mid-c.want) > 1e-9 || got.assumed != c.assumed {
			t.Errorf("%v without %v: %g A (assumed %v), want %g A", c.keys, c.without, got.mid, got.assumed, c.want)
		}
	}
}

// The gate resistor scales the fall time, by the power 0.75 for a MOSFET, by the root for an IGBT; it gives the slope
// where none is stated: at half of the IGBT's rated current (4 V + 4 V·√0.5 + 5 V)/((10 + 2) Ω · 100 pF) = 9.86 V/ns.
func TestGateScaling(t *testing.T) {
	for _, c := range []struct {
		kind string
		want float64
	}{{"igbt", 192e-9}, {"mosfet", 96e-9 * math.Pow(4, 0.75)}} {
		in := gather(placesOf(soundBoard(t, [2]string{"gate.turn_off_resistance", "40 Ω"}).WithWord("switch.kind", c.kind))[0])
		if got := in.mid("switch.fall_time"); relative(got, c.want) > 1e-9 {
			t.Errorf("%s: %g s, want %g s", c.kind, got, c.want)
		}
	}
	in := gather(placesOf(soundBoard(t, [2]string{"gate.off_voltage", "-5 V"}, [2]string{"switch.internal_gate_resistance", "2 Ω"},
		[2]string{"switch.gate_collector_capacitance", "100 pF"}).Without("switch.rise_slope"))[0])
	if got := in.mid("switch.rise_slope"); relative(got, (9+4*math.Sqrt(0.5))/12/100e-12) > 1e-9 {
		t.Errorf("slope %g V/s", got)
	}
}

// At closing a sixth of the on voltage is left over the plateau at the least, and the reason gives the plateau that the slope
// follows from: (8 V − 6.7 V)/(10 Ω · 100 pF).
func TestClosingPlateau(t *testing.T) {
	in := gather(placesOf(soundBoard(t, [2]string{"gate.on_voltage", "8 V"}, [2]string{"gate.turn_on_resistance", "10 Ω"},
		[2]string{"switch.gate_collector_capacitance", "100 pF"}).Without("switch.closing_slope"))[0])
	got := in.values[in.at["switch.closing_slope"]]
	if relative(got.mid, 8.0/6/10/100e-12) > 1e-9 || !strings.Contains(got.why, "plateau 6.7 V, judgement") {
		t.Errorf("%g V/s, %s", got.mid, got.why)
	}
}

// A high-side chopper is the mirror image of a low-side one.
func TestHighSideIsTheMirror(t *testing.T) {
	low := computed(t, soundBoard(t)).AsFound
	high := computed(t, boardOf(t, sound...).WithWord("topology", "high-side-chopper").WithParts("high", "Q1")).AsFound
	if low.P999 != high.P999 || low.Nominal.Peak != high.Nominal.Peak || high.Position != "high" {
		t.Errorf("low %g V, high %g V at %s", low.P999.Peak, high.P999.Peak, high.Position)
	}
}

// A short circuit is worked out only from a stated current.
func TestShortCircuit(t *testing.T) {
	if f := computed(t, soundBoard(t)).AsFound; f.ShortCircuit != nil {
		t.Error("a short circuit without a current")
	}
	stated := [2]string{"protection.short_circuit_current", "120 A"}
	f := computed(t, soundBoard(t, stated)).AsFound
	if f.ShortCircuit == nil || f.ShortCircuit.Current != 120 || !(f.ShortCircuit.Peak > f.Highest.Peak) {
		t.Errorf("%+v", f.ShortCircuit)
	}
	if f := computed(t, soundBoard(t, stated).WithWord("protection.soft_turn_off", "yes")).AsFound; f.ShortCircuit != nil {
		t.Error("a soft turn-off taken as a hard one")
	}
}

// Every value that the case does not state is listed, those without an interval too.
func TestAssumedIsComplete(t *testing.T) {
	m := computed(t, boardOf(t, [2]string{"bus.nominal", "48 V"}, [2]string{"switch.kind", "mosfet"}, [2]string{"switch.rated_voltage", "100 V"},
		[2]string{"switch.rated_current", "30 A"}, [2]string{"snubber.kind", "none"}))
	for _, key := range []string{"positions.parallel", "bus.highest", "load.running_current", "load.stall_current", "switch.fall_time",
		"switch.rise_slope", "switch.output_capacitance", "switch.package_inductance", "loop.inductance", "cooling.coldest_air"} {
		if !slices.ContainsFunc(m.Assumed, func(a Assumed) bool { return a.Key == key && a.Why != "" }) {
			t.Errorf("%s is not listed", key)
		}
	}
	if f := m.AsFound; f.Verdict == Within {
		t.Errorf("within on assumptions: %v", f.LiftedBy)
	}
}

// Both ends of the fall: an IGBT's stated fraction and tail are followed to nothing.
func TestTailEndsAtNothing(t *testing.T) {
	b := soundBoard(t, [2]string{"switch.fall.fraction", "0.8"}, [2]string{"switch.fall.tail_time", "200 ns"})
	p, _ := prepare(b)
	w, _ := p.nominal().cosine(0, 10)
	if last := w[len(w)-1]; last.V != 0 {
		t.Errorf("the tail ends at %g A", last.V)
	}
	p, needs := prepare(soundBoard(t, [2]string{"switch.fall.fraction", "0.8"}))
	if p.base.fall != (fallShape{}) || !slices.ContainsFunc(needs, func(n Need) bool { return n.Key == "switch.fall.tail_time" }) {
		t.Errorf("a fraction without a tail: %+v, needs %v", p.base.fall, needs)
	}
}
