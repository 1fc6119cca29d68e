package stress

import (
	"math"
	"slices"
	"strings"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// bridgeOf is a board as another topology, one part at each position.
func bridgeOf(t testing.TB, topology string, keys [][2]string) measure.Board {
	b := boardOf(t, keys...).WithWord("topology", topology)
	for _, p := range b.Positions() {
		b = b.WithParts(p.Name, "Q-"+p.Name)
	}
	return b
}

func placeNames(problems []*problem) string {
	var out []string
	for _, p := range problems {
		out = append(out, strings.Join(p.alike, " "))
	}
	return strings.Join(out, "; ")
}

// Positions with the same figures are solved once and all named; a switch of its own makes a place of its own, and of the
// opposite one too, whose leg it stands in. The brake's edges are not worked out.
func TestBridgePlaces(t *testing.T) {
	farads := func(b measure.Board, position string) measure.Board {
		return b.With("positions."+position+".output_capacitance", quantity.Of(1e-9, quantity.Farad))
	}
	half, full, three := bridgeOf(t, "half-bridge", pump), bridgeOf(t, "h-bridge", pump), bridgeOf(t, "three-phase", pump)
	for _, c := range []struct {
		b    measure.Board
		want string
	}{
		{half, "high low"}, {full, "a-high a-low b-high b-low"}, {three, "u-high u-low v-high v-low w-high w-low"},
		{three.WithWord("stages.brake.fitted", "yes"), "u-high u-low v-high v-low w-high w-low"},
		{farads(half, "low"), "high; low"}, {farads(full, "a-low"), "a-high; a-low; b-high b-low"},
		{farads(farads(full, "a-low"), "b-low"), "a-high b-high; a-low b-low"},
		{farads(three, "w-high"), "u-high u-low v-high v-low; w-high; w-low"},
	} {
		problems, needs := prepareAll(c.b)
		if got := placeNames(problems); got != c.want {
			t.Errorf("places %q, want %q (needs %v)", got, c.want, needs)
		}
	}
}

// An override is seen from both sides: by its own position as the victim's, by the opposite one as the opposite switch's.
func TestOverrideIsSeenFromBothSides(t *testing.T) {
	b := bridgeOf(t, "half-bridge", pump).With("positions.low.output_capacitance", quantity.Of(1e-9, quantity.Farad))
	problems, _ := prepareAll(b)
	for _, p := range problems {
		own, far := 250e-12, 1e-9
		if p.position == "low" {
			own, far = far, own
		}
		if s := p.nominal(); s.meanFarad() != own || s.oppositeFarad() != far {
			t.Errorf("%s: own %g F, opposite %g F", p.position, s.meanFarad(), s.oppositeFarad())
		}
	}
}

// Of positions that differ the one nearest to its rating is reported, with that rating.
func TestWorstPositionIsReported(t *testing.T) {
	b := bridgeOf(t, "half-bridge", with(sound, [2]string{"snubber.kind", "none"}))
	for _, weak := range []string{"low", "high"} {
		m := computed(t, b.With("positions."+weak+".rated_voltage", quantity.Of(500, quantity.Volt)))
		if f := m.AsFound; f.Position != weak || m.Stated != 500 || f.Rated != 487.5 || !slices.Equal(f.Alike, []string{weak}) {
			t.Errorf("%s is weak, reported %s of %v, stated %g V, rated %g V", weak, f.Position, f.Alike, m.Stated, f.Rated)
		}
	}
}

// doubled is a single leg on a bus of its own with twice what all legs share.
func (s scene) doubled() scene {
	whole := s.branch() + 2*s.link()
	s = s.put("loop.inductance", whole).put("loop.link", whole).scaledBy(2, "bus.esr", "bus.esl", "bus.supply_inductance", "loop.resistance")
	return s.put("bus.capacitance", s.get("bus.capacitance")/2)
}

// tripping are drawn bridges without a network, their resistance taken away, with what lies common in the loop.
func tripping(n uint64) scene {
	b := drawSample(11000+n, recipe{topology: "leg", net: "none"})
	return b.scene().put("loop.resistance", 0)
}

// All gates off are two legs that move together, which counts twice whatever they share: the same as one leg with twice the
// link and twice the impedance of the bus. And it goes higher than the opening of one leg, the more of the loop is common
// the more.
func TestAllGatesOffDoublesTheLink(t *testing.T) {
	shapes := map[string]edgeShape{shapeCut: scene.cut, shapeGate: scene.gateLimited}
	least := math.Inf(1)
	for n := range uint64(40) {
		s := tripping(n)
		for name, shape := range shapes {
			alone, together, doubled := s, s, s.doubled()
			together.both = true
			one, two, like := peakOf(t, alone, shape), peakOf(t, together, shape), peakOf(t, doubled, shape)
			if relative(two, like) > 1e-6 { // a resistance of a µΩ stands in for none
				t.Errorf("board %d, %s: all off %.6f V, with twice the link %.6f V", n, name, two, like)
			}
			least = math.Min(least, two/one)
			if name == shapeCut && two < one*(1-1e-6) {
				t.Errorf("board %d, %s: all off %g V, one leg %g V", n, name, two, one)
			}
		}
	}
	t.Logf("all off over one leg: at least %.4f", least)
}

func peakOf(t *testing.T, s scene, shape edgeShape) float64 {
	t.Helper()
	e, err := shape(s)
	if err != nil {
		t.Fatal(err)
	}
	return e.Peak
}

// What of the loop is common does not matter to one leg, and raises the peak of all of them together.
func TestLinkAndLeg(t *testing.T) {
	last := 0.0
	for _, share := range []string{"0.1 nH", "40 nH", "80 nH", "119.9 nH"} {
		p := problemOf(t, bridgeOf(t, "h-bridge", with(pump, [2]string{"loop.link", share})))
		s := p.nominal()
		one, together := peakOf(t, s, scene.cut), s
		together.both = true
		all := peakOf(t, together, scene.cut)
		silent := peakOf(t, problemOf(t, bridgeOf(t, "h-bridge", pump)).nominal(), scene.cut)
		t.Logf("link of %s: one leg %.2f V, all %.2f V", share, one, all)
		if relative(one, silent) > 1e-6 {
			t.Errorf("link of %s: one leg %g V, without a word of the link %g V", share, one, silent)
		}
		if all <= last || all < one*(1-1e-3) {
			t.Errorf("link of %s: all off %g V, one leg %g V, with less in common %g V", share, all, one, last)
		}
		last = all
	}
	// Only the shares are stated, or one of them and the whole: the rest follows.
	for _, keys := range [][][2]string{{{"loop.link", "70 nH"}, {"loop.leg", "50 nH"}}, {{"loop.leg", "50 nH"}, {"loop.inductance", "120 nH"}},
		{{"loop.link", "70 nH"}, {"loop.inductance", "120 nH"}}} {
		b := bridgeOf(t, "h-bridge", pump).Without("loop.inductance")
		for _, k := range keys {
			q, err := quantity.Parse(k[1], quantity.Henry)
			if err != nil {
				t.Fatal(err)
			}
			b = b.With(k[0], q)
		}
		if s := problemOf(t, b).nominal(); relative(s.link(), 70e-9) > 1e-9 || relative(s.branch(), 50e-9) > 1e-9 {
			t.Errorf("%v: link %g H, leg %g H", keys, s.link(), s.branch())
		}
	}
}

// The verdict of a leg counts its closing, so that it is never better than thin while the recovery charge or the closing
// slope is not stated; the answers that would lift it are named.
func TestLegNeverBetterThanThin(t *testing.T) {
	list := with(sound, [2]string{"switch.rated_voltage", "1200 V"})
	f := computed(t, bridgeOf(t, "half-bridge", list)).AsFound
	if f.Verdict != Within || len(f.LiftedBy) != 0 || !slices.Equal(f.Alike, []string{"high", "low"}) {
		t.Fatalf("everything stated: %s, lifted by %v, rests on %v, %g V at %v", f.Verdict, f.LiftedBy, f.Rests, f.P999.Peak, f.Alike)
	}
	for _, key := range []string{"freewheel.recovery_charge", "switch.turn_on_slope"} {
		f := computed(t, bridgeOf(t, "half-bridge", list).Without(key)).AsFound
		if f.Verdict != Thin || !slices.Equal(f.LiftedBy, []string{key}) {
			t.Errorf("without %s: %s, lifted by %v", key, f.Verdict, f.LiftedBy)
		}
		if slices.Contains(problemOf(t, soundBoard(t).Without(key)).lifts(false), key) {
			t.Errorf("a chopper is held down by %s", key)
		}
	}
	schottky := bridgeOf(t, "half-bridge", with(list, [2]string{"freewheel.forward_voltage", "0.4 V"})).Without("freewheel.recovery_charge")
	if lifts := problemOf(t, schottky).lifts(false); slices.Contains(lifts, "freewheel.recovery_charge") {
		t.Errorf("a Schottky diode has no charge to state: lifted by %v", lifts)
	}
}

// A bridge is graded on all gates off, a half-bridge has no other leg, a chopper no closing, and a leg only on a closing
// whose recovery charge and slope are stated.
func TestEdgesThatCount(t *testing.T) {
	closing := with(pump, [2]string{"freewheel.recovery_charge", "200 nC"}, [2]string{"switch.turn_on_slope", "300 A/µs"})
	for topology, want := range map[string][2]string{
		"low-side-chopper": {"turn-off", "turn-off"},
		"half-bridge":      {"turn-off", "turn-off turn-on"},
		"h-bridge":         {"turn-off all-off", "turn-off turn-on all-off"},
		"three-phase":      {"turn-off all-off", "turn-off turn-on all-off"},
	} {
		for i, list := range [][][2]string{pump, closing} {
			var got []string
			for _, g := range problemOf(t, bridgeOf(t, topology, list)).edges {
				got = append(got, g.name)
			}
			if strings.Join(got, " ") != want[i] {
				t.Errorf("%s, closing stated %v: %v, want %s", topology, i == 1, got, want[i])
			}
		}
	}
}
