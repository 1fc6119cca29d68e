package circuit

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// The waveform as it was run: corners before a change, the change as a jump or as a mere corner, of several changes at
// one moment the last, corners after it.
func TestSourceAsRun(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Voltage("V", a, 0, Waveform{{0, 0}, {1, 10}, {1.5, 10}, {1.5, 99}})
	c.Current("I", 0, a, Constant(3))
	c.Resistor("R", a, 0, 1)
	r := begin(t, c)
	to(t, r, 0.5)
	r.Retarget("V", Waveform{{0.5, 5}, {1.5, 7}})
	to(t, r, 1)
	r.Retarget("V", Constant(-4))
	r.Retarget("V", Waveform{{0, 4}, {3, 1}, {4, 2}})
	if want := (Waveform{{0, 0}, {0.5, 5}, {1, 6}, {1, 3}, {3, 1}, {4, 2}}); !slices.Equal(r.Source("V"), want) {
		t.Errorf("V: %v, want %v", r.Source("V"), want)
	}
	to(t, r, 6)
	r.Retarget("V", Constant(1e3))
	for _, k := range []struct{ t, v float64 }{{0.25, 2.5}, {1, 3}, {3, 1}, {5, 2}, {5.99, 2}, {6, 1e3}} {
		if got := r.Source("V").At(k.t); math.Abs(got-k.v) > 1e-12 {
			t.Errorf("V at %g: %g, want %g", k.t, got, k.v)
		}
	}
	if !slices.Equal(r.Source("I"), Constant(3)) || r.Source("R") != nil || r.Source("X") != nil {
		t.Error("a source that nobody touched has changed, or an element that is none has a waveform")
	}
	if err := r.Source("V").Check(); err != nil {
		t.Error(err)
	}
}

// A change that falls on a jump of the old waveform comes in its place.
func TestRetargetOnAJump(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Voltage("V", a, 0, Waveform{{0, 2}, {1, 3}, {1, 50}})
	c.Resistor("R", a, 0, 1)
	r := begin(t, c)
	p := r.Probe(a, 0)
	to(t, r, 1)
	r.Retarget("V", Waveform{{0, 7}, {1, 7}, {1, 4}})
	to(t, r, 2)
	if want := (Waveform{{0, 2}, {1, 3}, {1, 4}}); !slices.Equal(r.Source("V"), want) {
		t.Errorf("%v, want %v", r.Source("V"), want)
	}
	if top, _ := r.Peak(p); top != 4 {
		t.Errorf("peak %g V: the old jump was run", top)
	}
}

// wander runs a circuit with two changes of its sources on the way, the first at a time, the second where a probe
// rises through a level, if it does; the second source jumps.
func wander(p picker, r *Run, probe int, end float64) error {
	for k, name := range []string{"V", "I"} {
		level := math.Inf(1)
		if k == 1 {
			level = p.linear(5, 200)
		}
		if _, err := r.To(r.Time()+end*p.linear(0.05, 0.4), probe, level); err != nil {
			return err
		}
		next := randomWave(p, 100)
		for i := range next {
			next[i].T += r.Time() * p.linear(0.9, 1.1)
		}
		slices.SortFunc(next, func(a, b Point) int { return int(math.Copysign(1, a.T-b.T)) })
		if k == 0 { // on from where it stands
			next = append(Waveform{{r.Time(), r.Source(name).At(r.Time())}}, slices.DeleteFunc(next, func(q Point) bool { return q.T <= r.Time() })...)
		}
		r.Retarget(name, next)
	}
	_, err := r.To(end, -1, 0)
	return err
}

// A circuit started with the waveforms as they were run does the same without a change.
func TestSourceRunsTheSame(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := rapidPicker{t}
		c := randomCircuit(p)
		first, err := c.Start()
		if err != nil {
			t.Fatal(err)
		}
		if err := wander(p, first, first.Probe(1, 0), 1e-6); err != nil {
			t.Fatal(err)
		}
		again := first.c.snapshot()
		for k := range again.branches {
			if b := &again.branches[k]; b.kind == voltageSource || b.kind == currentSource {
				b.wave = first.Source(b.name)
			}
		}
		second, err := again.Start()
		if err != nil {
			t.Fatal(err)
		}
		q := second.Probe(1, 0)
		if _, err := second.To(1e-6, -1, 0); err != nil {
			t.Fatal(err)
		}
		a, _ := first.Peak(0)
		b, _ := second.Peak(q)
		if math.Abs(a-b) > 1e-7*first.volts || math.Abs(first.Voltage(1, 0)-second.Voltage(1, 0)) > 1e-7*first.volts {
			t.Fatalf("peak %.10g V and %.10g V, end %.10g V and %.10g V", a, b, first.Voltage(1, 0), second.Voltage(1, 0))
		}
	})
}

// Live: random circuits whose sources are changed twice on the way, once with a jump, through Run.Netlist; the highest
// voltage of every node within 0.2 % of the largest of them. The deck that knows nothing of the changes must be off,
// or the check would show nothing.
func TestChangedRunsAgainstNgspice(t *testing.T) {
	count, plain := 8, 3
	if testing.Short() {
		count = plain
	}
	const end = 2e-6
	worst := 0.0
	for n := range count {
		p := &seeded{uint64(n) + 101}
		c := ladder(p)
		r := begin(t, c)
		measures, probes := everyNode(r)
		if err := wander(p, r, probes[len(probes)-1], end); err != nil {
			t.Fatal(err)
		}
		changed, err := r.Netlist(fmt.Sprint("changed circuit ", n), end, end/30000, measures...)
		if err != nil {
			t.Fatal(err)
		}
		off := farthest(t, r, probes, measures, runDeck(t, changed))
		worst = math.Max(worst, off)
		if off > 0.002 {
			t.Errorf("circuit %d: peaks differ by %.3f %% of the largest", n, 100*off)
		}
		if n >= plain {
			continue
		}
		unchanged, err := c.Netlist(fmt.Sprint("unchanged circuit ", n), end, end/30000, measures...)
		if err != nil {
			t.Fatal(err)
		}
		if farthest(t, r, probes, measures, runDeck(t, unchanged)) < 0.01 {
			t.Errorf("circuit %d: the changes do not matter", n)
		}
	}
	t.Logf("%d circuits, largest difference %.4f %%", count, 100*worst)
}

// everyNode puts a probe on every node and names a measure for it.
func everyNode(r *Run) (measures []Measure, probes []int) {
	for node := 1; node < len(r.c.nodes); node++ {
		measures = append(measures, Measure{fmt.Sprint("peak", node), node, 0})
		probes = append(probes, r.Probe(node, 0))
	}
	return measures, probes
}

// runDeck runs a deck and gives its measures.
func runDeck(t *testing.T, deck string) map[string]float64 {
	t.Helper()
	file := filepath.Join(t.TempDir(), "deck.cir")
	if err := os.WriteFile(file, []byte(deck), 0o600); err != nil {
		t.Fatal(err)
	}
	return ngspice(t, file)
}

// farthest gives the largest difference of a peak, over the largest peak.
func farthest(t *testing.T, r *Run, probes []int, measures []Measure, want map[string]float64) float64 {
	off, scale := 0.0, 0.0
	for k, m := range measures {
		v, _ := r.Peak(probes[k])
		w, ok := want[m.Name]
		if !ok {
			t.Errorf("ngspice gave no %s", m.Name)
			continue
		}
		off, scale = math.Max(off, math.Abs(v-w)), math.Max(scale, math.Abs(w))
	}
	return off / scale
}

// A gate-limited edge as a whole: the chip is held to a ramp until it reaches the bus, there the ramp jumps away and
// the channel's current, which jumps to what the ramp held, falls. The deck of the run reproduces its peak.
func TestChangedEdgeAgainstNgspice(t *testing.T) {
	c, _, chip := leg(0)
	ramp := c.Node("ramp")
	c.Voltage("ramp", ramp, 0, Waveform{{0, 0}, {1e-6, 12e3}})
	c.Diode("hold", chip, ramp, 0, 10e-3)
	r := begin(t, c)
	p := r.Probe(chip, 0)
	stop, err := r.To(1e-6, p, 310)
	if err != nil || !stop {
		t.Fatal(stop, err)
	}
	at, amps := r.Time(), r.BranchCurrent("hold")
	r.Retarget("ramp", Constant(5000))
	r.Retarget("channel", Waveform{{at, amps}, {at + 60e-9, 0}})
	to(t, r, 1e-6)
	deck, err := r.Netlist("gate-limited edge", 1e-6, 5e-11, Measure{"peak", chip, 0})
	if err != nil {
		t.Fatal(err)
	}
	if amps < 5 {
		t.Fatalf("the ramp holds %g A only", amps)
	}
	v, _ := r.Peak(p)
	want := runDeck(t, deck)["peak"]
	t.Logf("peak %.3f V, ngspice %.3f V", v, want)
	near(t, "peak", v, want, 0.002)
}
