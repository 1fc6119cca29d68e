package circuit

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// Charge and squared current of a source-fed half sine, a discharge and a capacitor over whole periods, from closed
// forms.
func TestChargeAndSquare(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Capacitor("C", a, 0, 1e-6, 10)
	c.Resistor("R", a, 0, 50)
	r := begin(t, c)
	to(t, r, 30e-6)
	left := math.Exp(-30e-6 / 50e-6)
	near(t, "charge of R", r.Charge("R"), 10e-6*(1-left), 1e-12)
	near(t, "charge of C", r.Charge("C"), -10e-6*(1-left), 1e-12)
	near(t, "square", r.Square("C"), 0.5*1e-6*100*(1-left*left)/50, 1e-12)

	// the ring of a lossless loop: Î²/2 over each whole turn, no charge in the end
	ring := lc(100, 1e-6, 1e-9, 0, 0)
	r = begin(t, ring)
	turn := 2 * math.Pi * math.Sqrt(1e-6*1e-9)
	to(t, r, 5*turn)
	near(t, "rms current", math.Sqrt(r.Square("C")/(5*turn)), 100/math.Sqrt(1e-6/1e-9)/math.Sqrt2, 1e-9)
	if q := r.Charge("C"); math.Abs(q) > 1e-9*1e-9*100 {
		t.Errorf("%g C left after whole turns", q)
	}

	// a clamp takes over from a capacitor at 100 V: 10 mA for 1 ms is 10 µC, of which 1 µC filled the capacitor
	clamp := New()
	n := clamp.Node("n")
	clamp.Current("I", 0, n, Constant(10e-3))
	clamp.Capacitor("C", n, 0, 10e-9, 0)
	clamp.Diode("clamp", n, 0, 100, 0)
	r = begin(t, clamp)
	to(t, r, 1e-3)
	near(t, "charge of the clamp", r.Charge("clamp"), 9e-6, 1e-9)
	near(t, "square of the clamp", r.Square("clamp"), 0.9e-3*1e-4, 1e-9)
	near(t, "energy of the clamp", r.Energy("clamp"), 9e-6*100, 1e-9)
}

// In random circuits the charge into a capacitor is what its voltage tells, the charges at every node add up to
// nothing, and a resistor's heat is its resistance times its square.
func TestChargeBalance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := randomCircuit(rapidPicker{t})
		r, err := c.Start()
		if err != nil {
			t.Fatal(err)
		}
		if _, err := r.To(1e-6, -1, 0); err != nil {
			t.Fatal(err)
		}
		checkCharges(t, r)
	})
}

func checkCharges(t *rapid.T, r *Run) {
	most, heat := 1e-18, 1e-18
	into := make([]float64, len(r.c.nodes))
	for _, b := range r.c.branches {
		q := r.Charge(b.name)
		most, heat = math.Max(most, math.Abs(q)), math.Max(heat, math.Abs(r.Energy(b.name)))
		into[b.a] -= q
		into[b.b] += q
	}
	for n, q := range into {
		if math.Abs(q) > 1e-9*most {
			t.Fatalf("charges at node %q add up to %g of %g C", r.c.nodes[n], q, most)
		}
	}
	for _, b := range r.c.branches {
		q, e := r.Charge(b.name), r.Energy(b.name)
		switch b.kind {
		case capacitor:
			if took := b.value * (r.BranchVoltage(b.name) - b.start); math.Abs(q-took) > 1e-9*most {
				t.Fatalf("%s: charge %g C, its voltage tells %g C (largest charge %g C)", b.name, q, took, most)
			}
		case resistor:
			if math.Abs(e-b.value*r.Square(b.name)) > 1e-9*heat {
				t.Fatalf("%s: heat %g J, from the square %g J", b.name, e, b.value*r.Square(b.name))
			}
		case diode:
			if want := b.volt*q + b.value*r.Square(b.name); math.Abs(e-want) > 1e-9*heat {
				t.Fatalf("%s: energy %g J, from charge and square %g J", b.name, e, want)
			}
		}
	}
}

// The lowest value and the steepest rates of a ring, from closed forms; Lowest of a voltage is Peak of its mirror image.
func TestLowestAndSlope(t *testing.T) {
	const v, l, cap = 100.0, 1e-6, 1e-9
	w := 1 / math.Sqrt(l*cap)
	c := lc(v, l, cap, 0, 0)
	d := c.Node("d")
	r := begin(t, c)
	up, down, rate, amps := r.Probe(d, 0), r.Probe(0, d), r.ProbeSlope(d, 0), r.ProbeCurrent("L")
	to(t, r, 1.5*math.Pi/w) // the voltage has risen to 2V and come down to V
	pick := func(v, _ float64) float64 { return v }
	when := func(_, t float64) float64 { return t }
	near(t, "top", pick(r.Peak(up)), 2*v, 1e-12)
	near(t, "bottom of the mirror image", pick(r.Lowest(down)), -2*v, 1e-12)
	near(t, "steepest rise", pick(r.Peak(rate)), v*w, 1e-12)
	near(t, "its time", when(r.Peak(rate)), math.Pi/2/w, 1e-6)
	near(t, "steepest fall", pick(r.Lowest(rate)), -v*w, 1e-12)
	if low, at := r.Lowest(up); low != 0 || at != 0 {
		t.Errorf("lowest %g V at %g s, want the start", low, at)
	}
	to(t, r, 2*math.Pi/w)
	near(t, "lowest current", pick(r.Lowest(amps)), -v/math.Sqrt(l/cap), 1e-12)
	near(t, "its time", when(r.Lowest(amps)), 1.5*math.Pi/w, 1e-6)
	for _, k := range []int{-1, 4} {
		if v, at := r.Lowest(k); !math.IsNaN(v) || !math.IsNaN(at) {
			t.Errorf("probe %d has a lowest value %g", k, v)
		}
	}
	if r.ProbeSlope(0, 9) != -1 {
		t.Error("the slope of an unknown node was accepted")
	}
}

// The rate of a ramp is known at once, and a corner counts on both sides, also where a source is given another
// waveform before the first step.
func TestSlopeOfCorners(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Voltage("V", a, 0, Waveform{{0, 0}, {1e-6, 5}, {2e-6, 25}, {3e-6, -5}})
	c.Resistor("R", a, 0, 1)
	r := begin(t, c)
	p := r.ProbeSlope(a, 0)
	to(t, r, 4e-6)
	top, _ := r.Peak(p)
	low, _ := r.Lowest(p)
	near(t, "rise", top, 20e6, 1e-12)
	near(t, "fall", low, -30e6, 1e-12)

	r = begin(t, c)
	p = r.ProbeSlope(a, 0)
	r.Retarget("V", Waveform{{0, 0}, {1e-9, 1}, {1e-9, 0}})
	top, _ = r.Peak(p)
	near(t, "rise after a change at the start", top, 1e9, 1e-12)
}

// What rounding takes below nothing is nothing: its root would be no number.
func TestSquareIsNeverBelowNothing(t *testing.T) {
	r := begin(t, snubbedEdge())
	to(t, r, 1e-9)
	k, _ := r.find("Cs")
	r.totals[k].square = -1e-8
	if got := r.Square("Cs"); got != 0 {
		t.Errorf("%g A²s", got)
	}
}
