package circuit

import (
	"math"
	"strings"
	"testing"
)

// Topologies that a textbook leaves out. Each must end in the right result or in an error that names the element.
func TestAwkwardTopologies(t *testing.T) {
	for _, k := range []struct {
		name  string
		build func(c *Circuit, a, b int)
		want  func(t *testing.T, r *Run, a, b int)
		fault string // expected in the message of Start or To
	}{
		{name: "capacitor loop with equal voltages adds up", build: func(c *Circuit, a, b int) {
			c.Capacitor("C1", a, 0, 1e-9, 10)
			c.Capacitor("C2", a, 0, 3e-9, 10)
			c.Resistor("R", a, 0, 1000)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "v", r.Voltage(a, 0), 10*math.Exp(-1e-6/4e-6), 1e-12)
			near(t, "share of C2", r.BranchCurrent("C2")/r.BranchCurrent("C1"), 3, 1e-12)
		}},
		{name: "capacitor loop with different voltages", build: func(c *Circuit, a, b int) {
			c.Capacitor("C1", a, 0, 1e-9, 10)
			c.Capacitor("C2", a, 0, 3e-9, 5)
		}, fault: `capacitor "C2" (5 V) contradicts its loop C1 (10 V)`},
		{name: "capacitor across a ramping source", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Waveform{{0, 0}, {1e-6, 100}})
			c.Capacitor("C", a, 0, 1e-9, 0)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "energy of C", r.Energy("C"), 0.5e-9*1e4, 1e-12)
			near(t, "energy of V", r.Energy("V"), -0.5e-9*1e4, 1e-12)
		}},
		{name: "source jumps across a capacitor", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Waveform{{0, 0}, {5e-7, 0}, {5e-7, 100}})
			c.Capacitor("C", a, 0, 1e-9, 0)
		}, fault: `capacitor "C" (0 V) contradicts its loop V (100 V)`},
		{name: "inductors in series add up", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(6))
			c.Inductor("L1", a, b, 1e-6, 2)
			c.Inductor("L2", b, 0, 2e-6, 2)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "i", r.BranchCurrent("L1"), 2+6/3e-6*1e-6, 1e-12)
			near(t, "v between", r.Voltage(b, 0), 4, 1e-12)
		}},
		{name: "inductors in series with different currents", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(6))
			c.Inductor("L1", a, b, 1e-6, 2)
			c.Inductor("L2", b, 0, 2e-6, 1)
		}, fault: `contradicts the currents that meet it`},
		{name: "inductor fed by a ramping current source", build: func(c *Circuit, a, b int) {
			c.Current("I", 0, a, Waveform{{0, 1}, {2e-6, 3}})
			c.Inductor("L", a, 0, 1e-6, 1)
		}, want: func(t *testing.T, r *Run, a, b int) { near(t, "v", r.Voltage(a, 0), 1, 1e-12) }},
		{name: "inductor current with no path", build: func(c *Circuit, a, b int) {
			c.Inductor("L", a, 0, 1e-6, 1)
			c.Diode("D", a, 0, 0.7, 0.01)
		}, fault: `the current of inductor "L" has no path`},
		{name: "inductor current finds the diode", build: func(c *Circuit, a, b int) {
			c.Inductor("L", a, 0, 1e-6, -1)
			c.Diode("D", a, 0, 0.5, 0)
		}, want: func(t *testing.T, r *Run, a, b int) { near(t, "i", r.BranchCurrent("D"), 1-0.5, 1e-12) }},
		{name: "node between two blocking diodes", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(-10))
			c.Diode("D1", a, b, 0.7, 0.01)
			c.Diode("D2", b, 0, 0.7, 0.01)
		}, want: func(t *testing.T, r *Run, a, b int) { near(t, "v between", r.Voltage(b, 0), -5, 1e-9) }},
		{name: "two conducting diodes without resistance side by side", build: func(c *Circuit, a, b int) {
			c.Current("I", 0, a, Constant(4))
			c.Diode("D1", a, 0, 0.7, 0)
			c.Diode("D2", a, 0, 0.7, 0)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "sum", r.BranchCurrent("D1")+r.BranchCurrent("D2"), 4, 1e-12)
			near(t, "v", r.Voltage(a, 0), 0.7, 1e-5)
		}},
		{name: "diode without resistance across a capacitor", build: func(c *Circuit, a, b int) {
			c.Current("I", 0, a, Waveform{{0, 1}, {4e-7, 1}, {6e-7, -1}})
			c.Capacitor("C", a, 0, 10e-9, 0)
			c.Diode("D", a, 0, 20, 0)
		}, want: func(t *testing.T, r *Run, a, b int) {
			// 20 V after 200 ns, held until the current turns at 500 ns, then 0.05 and 0.4 µC out of 10 nF
			near(t, "v", r.Voltage(a, 0), 20-0.05*100-0.4*100, 1e-9)
			near(t, "energy of D", r.Energy("D"), 20*(0.2e-6+0.05e-6), 1e-8)
		}},
		{name: "zero ohm, zero henry, zero farad", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(5))
			c.Resistor("R0", a, b, 0)
			e := c.Node("e")
			c.Inductor("L0", b, e, 0, 7)
			c.Resistor("R", e, 0, 10)
			c.Capacitor("C0", e, 0, 0, 3)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "i", r.BranchCurrent("R0"), 0.5, 1e-12)
			near(t, "energy", r.Energy("R"), 2.5e-6, 1e-12)
		}},
		{name: "loop of sources", build: func(c *Circuit, a, b int) {
			c.Voltage("V1", a, 0, Constant(5))
			c.Voltage("V2", a, 0, Constant(5))
		}, fault: `voltage source "V2" closes a loop`},
		{name: "current source without a way back", build: func(c *Circuit, a, b int) {
			c.Current("I", 0, a, Constant(5))
		}, fault: `current source "I" drives node "a"`},
		{name: "node tied to nothing", build: func(c *Circuit, a, b int) {
			c.Resistor("R", a, b, 5)
		}, fault: `no connection to the reference node`},
		{name: "time constants over eighteen decades", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(5))
			c.Resistor("R", a, b, 1e-6)
			c.Capacitor("C", b, 0, 1e-12, 0)
			c.Inductor("L", b, 0, 1, 0)
		}, want: func(t *testing.T, r *Run, a, b int) { near(t, "i", r.BranchCurrent("L"), 5e-6, 1e-9) }},
		{name: "equal time constants in two coupled stages", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(1))
			e := c.Node("e")
			c.Resistor("R1", a, b, 1000)
			c.Capacitor("C1", b, 0, 1e-9, 0)
			c.Resistor("R2", a, e, 1000)
			c.Capacitor("C2", e, 0, 1e-9, 0)
		}, want: func(t *testing.T, r *Run, a, b int) { near(t, "v", r.Voltage(b, 0), -math.Expm1(-1), 1e-12) }},
	} {
		t.Run(k.name, func(t *testing.T) {
			c := New()
			a := c.Node("a")
			b := 0
			if strings.Contains(k.name, "between") || strings.Contains(k.name, "series") || strings.Contains(k.name, "zero ohm") ||
				strings.Contains(k.name, "time constants") || strings.Contains(k.name, "nothing") {
				b = c.Node("b")
			}
			k.build(c, a, b)
			r, err := c.Start()
			if err == nil {
				_, err = r.To(1e-6, -1, 0)
			}
			if k.fault != "" {
				if err == nil || !strings.Contains(err.Error(), k.fault) {
					t.Fatalf("error %v, want one with %q", err, k.fault)
				}
				return
			}
			if err != nil {
				t.Fatal(err)
			}
			k.want(t, r, a, b)
		})
	}
}

// Faults of the elements are told all at once, each with its name.
func TestFaultyElements(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Resistor("R", a, 0, -1)
	c.Resistor("R", a, 0, 1)
	c.Capacitor("C", a, 7, 1e-9, 0)
	c.Inductor("L", a, a, 1e-9, 0)
	c.Voltage("V", a, 0, Waveform{{1, 0}, {0, 0}})
	c.Current("I", a, 0, nil)
	c.Diode("D", a, 0, math.NaN(), 0)
	c.Couple("L", "R", 0.5)
	_, err := c.Start()
	if err == nil {
		t.Fatal("no error")
	}
	for _, part := range []string{
		`resistor "R": value -1`, `resistor "R": the name is empty or already taken`, `capacitor "C": node 1 or 7`,
		`inductor "L": both ends are on node "a"`, `voltage source "V": point 2`, `current source "I": the waveform has no points`,
		`diode "D": initial value or threshold`, `coupling of "L" and "R"`,
	} {
		if !strings.Contains(err.Error(), part) {
			t.Errorf("the error does not tell %q:\n%v", part, err)
		}
	}
	if _, err := New().Start(); err == nil {
		t.Error("an empty circuit should not start")
	}
}

// A crossing is located far better than a step: a cosine crosses a level at a time known in closed form.
func TestStopsAtLevel(t *testing.T) {
	const l, cap, v = 100e-9, 1e-9, 100.0
	w := 1 / math.Sqrt(l*cap)
	c := lc(v, l, cap, 0, 0)
	r := begin(t, c)
	p := r.Probe(c.Node("d"), 0)
	for _, level := range []float64{10, 90, 150, 199.99, 199.999999} {
		stop, err := r.To(1e-6, p, level)
		if err != nil || !stop {
			t.Fatalf("level %g: stop %v, error %v", level, stop, err)
		}
		near(t, "crossing time", r.Time(), math.Acos(1-level/v)/w, 1e-9)
	}
	if stop, err := r.To(10e-8, p, 200.001); stop || err != nil {
		t.Errorf("a level above the peak: stop %v, error %v", stop, err)
	}
	// already above the level: it must fall below first, so the next crossing is two rings after the first
	stop, err := r.To(1e-6, p, 50)
	if err != nil || !stop {
		t.Fatal(stop, err)
	}
	near(t, "crossing two rings later", r.Time(), (math.Acos(0.5)+4*math.Pi)/w, 1e-9)
	if math.Abs(r.Slope(c.Node("d"), 0)/(v*w*math.Sin(math.Acos(0.5)))-1) > 1e-9 {
		t.Errorf("slope at the crossing %g V/s", r.Slope(c.Node("d"), 0))
	}
}

// A diode stops the ring of a capacitor at its top: twice the driving voltage less twice the threshold.
func TestResonantCharge(t *testing.T) {
	const l, cap = 1e-6, 1e-9
	c := New()
	a, b, d := c.Node("a"), c.Node("b"), c.Node("d")
	c.Voltage("V", a, 0, Constant(100))
	c.Diode("D", a, b, 0.7, 0)
	c.Inductor("L", b, d, l, 0)
	c.Capacitor("C", d, 0, cap, 0)
	r := begin(t, c)
	i := r.ProbeCurrent("L")
	to(t, r, 1e-6)
	near(t, "voltage held", r.Voltage(d, 0), 2*99.3, 1e-12)
	peak, at := r.Peak(i)
	near(t, "peak current", peak, 99.3/math.Sqrt(l/cap), 1e-10)
	near(t, "its time", at, math.Pi/2*math.Sqrt(l*cap), 1e-6)
	if r.Conducts("D") {
		t.Error("the diode should block")
	}
	trace := r.Trace(i)
	for k, p := range trace {
		if p.V < -1e-6 || (k > 0 && p.T < trace[k-1].T) {
			t.Fatalf("sample %d: %g A at %g s", k, p.V, p.T)
		}
	}
}

// A source can be given another future; what lies before stays.
func TestRetarget(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Current("I", 0, a, Constant(1))
	c.Capacitor("C", a, 0, 1e-6, 0)
	r := begin(t, c)
	to(t, r, 1e-6)
	r.Retarget("I", Waveform{{1e-6, 1}, {2e-6, -1}})
	to(t, r, 2e-6)
	near(t, "after the ramp", r.Voltage(a, 0), 1, 1e-12)
	r.Retarget("I", Constant(0))
	to(t, r, 3e-6)
	near(t, "held", r.Voltage(a, 0), 1, 1e-12)
	near(t, "energy", r.Energy("C"), 0.5e-6, 1e-12)
	r.Retarget("C", Constant(0))
	if _, err := r.To(4e-6, -1, 0); err == nil || !strings.Contains(err.Error(), `"C" is not a source`) {
		t.Errorf("error %v", err)
	}
}

// Questions that have no answer get NaN, -1 or an error, never a panic.
func TestUnknownNames(t *testing.T) {
	c := lc(1, 1, 1, 0, 0)
	r := begin(t, c, WithoutEnergy(), WithoutTrace())
	for _, v := range []float64{r.Energy("C"), r.BranchCurrent("X"), r.BranchVoltage("X"), r.Voltage(0, 99), r.Slope(-1, 0), r.Stored("V")} {
		if !math.IsNaN(v) {
			t.Errorf("%g, want NaN", v)
		}
	}
	if r.Probe(0, 99) != -1 || r.ProbeCurrent("X") != -1 || r.Trace(3) != nil || r.Conducts("L") {
		t.Error("an unknown node or element was accepted")
	}
	if _, err := r.To(1, 5, 0); err == nil {
		t.Error("an unknown probe was accepted")
	}
	to(t, r, 1)
	if _, err := r.To(0.5, -1, 0); err == nil {
		t.Error("a run went back in time")
	}
	for _, o := range []Option{WithStep(0), WithStep(math.NaN())} {
		if _, err := c.Start(o); err == nil {
			t.Error("a useless step was accepted")
		}
	}
	r = begin(t, c, WithLimit(10))
	if _, err := r.To(100, -1, 0); err == nil || !strings.Contains(err.Error(), "10 steps taken") {
		t.Errorf("error %v", err)
	}
}

// Stepping allocates nothing: more time must not cost more allocations. The runtime's own allocations can fall into a
// count, so the least of several counts.
func TestNoAllocationPerStep(t *testing.T) {
	c := lc(1, 1, 1, 0, 0)
	c.Diode("D", c.Node("d"), 0, 100, 1)
	count := func(end float64) float64 {
		least := math.Inf(1)
		for range 5 {
			least = math.Min(least, testing.AllocsPerRun(5, func() {
				r := begin(t, c, WithoutTrace())
				r.Probe(c.Node("d"), 0)
				to(t, r, 0.01) // the same tables for both
				to(t, r, end)
			}))
		}
		return least
	}
	if short, long := count(30), count(40); long > short {
		t.Errorf("%g allocations to 30 s, %g to 40 s", short, long)
	}
}

// Two runs of one circuit agree to the last bit.
func TestSameBits(t *testing.T) {
	c := snubbedEdge()
	var peaks [2]float64
	for k := range peaks {
		r := begin(t, c)
		p := r.Probe(c.Node("chip"), 0)
		to(t, r, 2e-6)
		peaks[k], _ = r.Peak(p)
		peaks[k] += r.Energy("Rs")
	}
	if peaks[0] != peaks[1] {
		t.Errorf("%v", peaks)
	}
}

func TestWaveform(t *testing.T) {
	w := Waveform{{1, 2}, {2, 4}, {2, 10}, {3, 0}}
	for _, k := range []struct{ t, v float64 }{{-5, 2}, {1, 2}, {1.5, 3}, {2, 10}, {2.5, 5}, {3, 0}, {9, 0}} {
		if got := w.At(k.t); got != k.v {
			t.Errorf("at %g: %g, want %g", k.t, got, k.v)
		}
	}
}

// On a whole edge with every kind of element, charge and energy balance to a billionth.
func TestEdgeBalance(t *testing.T) {
	r := begin(t, snubbedEdge())
	to(t, r, 3e-6)
	sum, moved := 0.0, 0.0
	for _, b := range r.c.branches {
		e := r.Energy(b.name)
		sum += e
		if b.name != "V" && b.name != "Cbus" && b.name != "I" {
			moved += math.Abs(e)
		}
		if b.kind == capacitor || b.kind == inductor {
			if stored := r.Stored(b.name) - 0.5*b.value*b.start*b.start; math.Abs(e-stored) > 1e-9*1e-3 {
				t.Errorf("%s took %g J, holds %g J more", b.name, e, stored)
			}
		}
	}
	if math.Abs(sum) > 1e-9*moved {
		t.Errorf("energies add up to %g J of %g J", sum, moved)
	}
}

// Names that a deck cannot hold, or holds only once, get labels of their own; faults come back as errors.
func TestNetlistNames(t *testing.T) {
	c := New()
	a, b := c.Node("snubber node"), c.Node("snubber-node")
	gnd := c.Node("gnd")
	c.Voltage("Bus µ", a, 0, Waveform{{-1, 5}, {1e-6, 5}, {1e-6, 7}})
	c.Resistor("R", a, b, 0)
	c.Resistor("r", b, gnd, 47)
	c.Capacitor("C", gnd, 0, 1e-9, 0)
	deck, err := c.Netlist("two\nlines", 1e-5, 1e-8, Measure{"top", b, 0})
	if err != nil {
		t.Fatal(err)
	}
	for _, line := range []string{
		"* two lines\n", "Vbus__ snubber_node 0 PWL(0 5 1e-06 5 1.00000001e-06 7)\n", "Rr snubber_node snubber_node_2 0.0001\n",
		"Rr_2 snubber_node_2 gnd_3 47\n", ".meas tran top MAX par('v(snubber_node_2)-v(0)')\n",
	} {
		if !strings.Contains(deck, line) {
			t.Errorf("the deck lacks %q:\n%s", line, deck)
		}
	}
	for _, end := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := c.Netlist("", end, 1e-9); err == nil {
			t.Errorf("a deck to %g s was written", end)
		}
	}
	if _, err := c.Netlist("", 1, 1e-3, Measure{"x", 99, 0}); err == nil {
		t.Error("an unknown node was measured")
	}
}

// A run that was released answers with NaN and errors, and the next one in its space knows nothing of it.
func TestRelease(t *testing.T) {
	solve := func(c *Circuit) (peak float64, r *Run) {
		r = begin(t, c, WithoutEnergy(), WithoutTrace())
		p := r.Probe(1, 0)
		to(t, r, 2e-6)
		peak, _ = r.Peak(p)
		return peak, r
	}
	want, _ := solve(snubbedEdge())
	other, _, _ := leg(50e-9)
	for range 3 {
		for _, c := range []*Circuit{other, snubbedEdge()} {
			got, r := solve(c)
			if c != other && got != want {
				t.Errorf("peak %v in used space, %v in new", got, want)
			}
			r.Release()
			r.Release()
			if _, err := r.To(1, -1, 0); err == nil {
				t.Error("a released run runs on")
			}
			if _, err := r.Netlist("x", 1, 0.1); err == nil {
				t.Error("a released run has a netlist")
			}
			if _, err := r.Modes(); err == nil {
				t.Error("a released run has modes")
			}
			r.Retarget("channel", Constant(1))
			top, _ := r.Peak(0)
			for k, v := range []float64{top, r.Voltage(1, 0), r.Slope(1, 0), r.BranchCurrent("channel"), r.Energy("channel"), r.Stored("Cs"), float64(r.Probe(1, 0)), float64(r.ProbeCurrent("channel"))} {
				if !math.IsNaN(v) && v != -1 {
					t.Errorf("question %d is answered by %g", k, v)
				}
			}
			if r.Source("channel") != nil || r.Conducts("D") || r.Trace(0) != nil {
				t.Error("a released run knows its sources")
			}
		}
	}
}
