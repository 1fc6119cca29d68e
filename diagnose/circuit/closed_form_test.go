package circuit

import (
	"fmt"
	"math"
	"testing"
)

// near fails unless got is within tol (relative to want, absolute near zero).
func near(t *testing.T, what string, got, want, tol float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tol*math.Max(math.Abs(want), 1e-30)) {
		t.Errorf("%s = %.10g, want %.10g (off by %.2g, allowed %.2g)", what, got, want, got/want-1, tol)
	}
}

func begin(t testing.TB, c *Circuit, opts ...Option) *Run {
	t.Helper()
	r, err := c.Start(opts...)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func to(t testing.TB, r *Run, end float64) {
	t.Helper()
	if _, err := r.To(end, -1, 0); err != nil {
		t.Fatal(err)
	}
}

// First order: v = V(1-exp(-t/RC)) and i = V/R(1-exp(-tR/L)); circuit laws.
func TestFirstOrder(t *testing.T) {
	c := New()
	a, b, d := c.Node("a"), c.Node("b"), c.Node("d")
	c.Voltage("V", a, 0, Constant(10))
	c.Resistor("R1", a, b, 1000)
	c.Capacitor("C", b, 0, 1e-6, 0)
	c.Resistor("R2", a, d, 5)
	c.Inductor("L", d, 0, 1e-3, 0)
	r := begin(t, c)
	for _, at := range []float64{1e-5, 1e-4, 1e-3, 5e-3} {
		to(t, r, at)
		near(t, "RC", r.Voltage(b, 0), 10*-math.Expm1(-at/1e-3), 1e-12)
		near(t, "RL", r.BranchCurrent("L"), 2*-math.Expm1(-at*5/1e-3), 1e-12)
	}
	v := r.Voltage(b, 0)
	near(t, "energy of C", r.Energy("C"), 0.5e-6*v*v, 1e-11)
	x := 5.0 // time over time constant
	near(t, "energy of R1", r.Energy("R1"), 0.5e-6*100*-math.Expm1(-2*x), 1e-9)
}

// Series RLC from rest: the three textbook cases, the critical one with two equal time constants.
func TestSecondOrder(t *testing.T) {
	const l, cap = 1e-6, 1e-9
	w := 1 / math.Sqrt(l*cap)
	for _, zeta := range []float64{0.01, 0.2, 0.9, 1, 1.5, 20} {
		c := New()
		a, b, d := c.Node("a"), c.Node("b"), c.Node("d")
		c.Voltage("V", a, 0, Constant(1))
		c.Resistor("R", a, b, 2*zeta*math.Sqrt(l/cap))
		c.Inductor("L", b, d, l, 0)
		c.Capacitor("C", d, 0, cap, 0)
		r := begin(t, c)
		for _, x := range []float64{0.1, 1, 2.5, 7} {
			to(t, r, x/w)
			near(t, fmt.Sprintf("zeta %g at %g", zeta, x), r.Voltage(d, 0), stepResponse(zeta, x), 1e-10)
		}
	}
}

func stepResponse(zeta, x float64) float64 {
	switch {
	case zeta < 1:
		b := math.Sqrt(1 - zeta*zeta)
		return 1 - math.Exp(-zeta*x)*(math.Cos(b*x)+zeta/b*math.Sin(b*x))
	case zeta == 1:
		return 1 - math.Exp(-x)*(1+x)
	}
	b := math.Sqrt(zeta*zeta - 1)
	slow, fast := -1/(zeta+b), -(zeta + b)
	return 1 - (fast*math.Exp(slow*x)-slow*math.Exp(fast*x))/(fast-slow)
}

// Notes on stress physics 1.2: both forms of the peak of an inductive turn-off into a capacitance, and 2.1's decoupling
// value (Infineon reference book, eq. 13.9: 50 nH, 400 A, 200 V allowed needs 200 nF).
func TestCutInductiveCurrent(t *testing.T) {
	for _, x := range []float64{0, 0.1, 0.5, 1, 2, 3, 10} {
		const v, l, cap = 300.0, 100e-9, 1e-9
		i := x * v / math.Sqrt(l/cap)
		from0, fromV := lc(v, l, cap, i, 0), lc(v, l, cap, i, v)
		near(t, "from 0 V", peakOf(t, from0, 200e-9), v*(1+math.Sqrt(1+x*x)), 1e-12)
		near(t, "from the bus", peakOf(t, fromV, 200e-9), v+i*math.Sqrt(l/cap), 1e-12)
	}
	near(t, "decoupling", peakOf(t, lc(600, 50e-9, 200e-9, 400, 600), 2e-6), 800, 1e-12)
}

// lc is a source, an inductor carrying a current and a capacitor at the node "d".
func lc(v, l, cap, i, start float64) *Circuit {
	c := New()
	a, d := c.Node("a"), c.Node("d")
	c.Voltage("V", a, 0, Constant(v))
	c.Inductor("L", a, d, l, i)
	c.Capacitor("C", d, 0, cap, start)
	return c
}

func peakOf(t testing.TB, c *Circuit, end float64) float64 {
	t.Helper()
	r := begin(t, c)
	p := r.Probe(c.Node("d"), 0)
	to(t, r, end)
	v, _ := r.Peak(p)
	return v
}

// snubber is L into C_par beside R + C_s, per unit: V = 1, L = 1, C_par = 1.
func snubber(x, ratio, ohm float64) *Circuit {
	c := lc(1, 1, 1, x, 0)
	d, e := c.Node("d"), c.Node("e")
	c.Resistor("R", d, e, ohm)
	c.Capacitor("Cs", e, 0, ratio, 0)
	return c
}

// Notes on stress physics 2.3, computed there by numerical integration: peak over step at the best R (R in units of
// Z0 rounded to two digits there; the optimum is flat, so the peak holds to its last printed digit).
func TestSnubberPeakTable(t *testing.T) {
	ratios := []float64{1, 2, 3, 4, 5, 8, 10}
	rows := []struct {
		x     float64
		peaks []float64
		ohms  []float64
	}{
		{0, []float64{1.676, 1.525, 1.434, 1.372, 1.328, 1.243, 1.209}, []float64{1.60, 1.13, 0.96, 0.87, 0.82, 0.73, 0.70}},
		{0.5, []float64{1.735, 1.563, 1.462, 1.394, 1.345, 1.254, 1.217}, []float64{1.47, 1.05, 0.90, 0.83, 0.78, 0.71, 0.68}},
		{1, []float64{1.900, 1.678, 1.550, 1.465, 1.405, 1.294, 1.250}, []float64{1.23, 0.90, 0.78, 0.72, 0.69, 0.63, 0.61}},
		{2, []float64{2.400, 2.048, 1.848, 1.716, 1.623, 1.452, 1.385}, []float64{0.93, 0.68, 0.60, 0.55, 0.53, 0.48, 0.47}},
		{3, []float64{2.989, 2.499, 2.220, 2.038, 1.907, 1.669, 1.574}, []float64{0.79, 0.58, 0.50, 0.46, 0.44, 0.40, 0.38}},
	}
	for _, row := range rows {
		for k, ratio := range ratios {
			got := peakOf(t, snubber(row.x, ratio, row.ohms[k]), 40)
			if math.Abs(got-row.peaks[k]) > 0.0006 {
				t.Errorf("x %g, C_s/C_par %g, R/Z0 %g: peak %.5f, table %.3f", row.x, ratio, row.ohms[k], got, row.peaks[k])
			}
		}
	}
	for _, u := range []struct{ x, peak float64 }{{0, 2}, {0.5, 2.118}, {1, 2.414}, {2, 3.236}, {3, 4.162}} {
		near(t, "no snubber", peakOf(t, lc(1, 1, 1, u.x, 0), 40), u.peak, 3e-4)
	}
}

// Derived from circuit laws, computed there: smallest damping ratio of the snubbed ring at R = Z0 and at the best R.
func TestSnubberDampingTable(t *testing.T) {
	for _, row := range []struct{ ratio, best, zeta, zetaAtZ0 float64 }{
		{1, 1.68, 0.207, 0.162}, {2, 1.14, 0.366, 0.354}, {3, 0.943, 0.500, 0.493},
		{4, 0.836, 0.618, 0.535}, {5, 0.767, 0.725, 0.539},
	} {
		for _, at := range []struct{ ohm, zeta float64 }{{row.best, row.zeta}, {1, row.zetaAtZ0}} {
			modes, err := begin(t, snubber(0, row.ratio, at.ohm)).Modes()
			if err != nil {
				t.Fatal(err)
			}
			least := 1.0
			for _, m := range modes {
				least = math.Min(least, m.Damping)
			}
			if math.Abs(least-at.zeta) > 0.0025 {
				t.Errorf("C_s/C_par %g, R/Z0 %g: damping %.4f, table %.3f", row.ratio, at.ohm, least, at.zeta)
			}
		}
	}
}

// mcMurray is a source, an inductor with trapped current and an R-C snubber across the open device, per unit.
func mcMurray(zeta, xi float64) *Circuit {
	c := New()
	a, d, e := c.Node("a"), c.Node("d"), c.Node("e")
	c.Voltage("E", a, 0, Constant(1))
	c.Inductor("L", a, d, 1, xi)
	c.Resistor("R", d, e, 2*zeta)
	c.Capacitor("C", e, 0, 1, 0)
	return c
}

// mcMurrayPeak is the normalised peak (circuit after W. McMurray, Optimum Snubbers for Power
// Semiconductors, IEEE Trans. Ind. Appl. IA-8, 1972; the formula is derived, below critical damping).
func mcMurrayPeak(zeta, xi float64) float64 {
	step, slope := 2*zeta*xi, 2*zeta-4*zeta*zeta*xi+xi
	if slope < 0 {
		return step
	}
	b := math.Sqrt(1 - zeta*zeta)
	bt := math.Atan2(-b*slope, 1-2*zeta*zeta-3*zeta*xi+4*zeta*zeta*zeta*xi)
	if bt <= 0 {
		bt += math.Pi
	}
	return math.Max(step, 1+math.Exp(-zeta*bt/b)*math.Sqrt(1-2*zeta*xi+xi*xi))
}

func TestMcMurrayGrid(t *testing.T) {
	worst := 0.0
	for zeta := 0.02; zeta < 0.985; zeta += 0.04 {
		for xi := 0.0; xi <= 5; xi += 0.2 {
			got, want := peakOf(t, mcMurray(zeta, xi), 40), mcMurrayPeak(zeta, xi)
			worst = math.Max(worst, math.Abs(got/want-1))
			near(t, fmt.Sprintf("peak at zeta %.2f, xi %.1f", zeta, xi), got, want, 1e-9)
		}
	}
	t.Logf("largest difference %.2g", worst)
}

// Derived from circuit laws: the table of the damping that minimises the peak (three digits), and regression values d4.
func TestMcMurrayTable(t *testing.T) {
	for _, row := range []struct{ xi, zeta, peak float64 }{
		{0.3, 1.732, 1.075}, {0.4, 1.331, 1.123}, {0.5, 1.096, 1.177}, {0.6, 0.942, 1.237}, {0.7, 0.833, 1.301},
		{0.8, 0.754, 1.367}, {0.9, 0.693, 1.436}, {1, 0.645, 1.506}, {1.2, 0.575, 1.651}, {1.5, 0.506, 1.876},
		{2, 0.441, 2.261}, {3, 0.378, 3.049}, {5, 0.331, 4.651},
		{0, 0.1, 1.744}, {0, 0.2, 1.572}, {0, 0.3, 1.451}, {0, 0.4, 1.364}, {0, 0.5, 1.298}, {0, 0.65, 1.228},
		{0, 0.75, 1.194}, {0, 1, 1.135},
		{0.5, 0.2, 1.6486}, {0.5, 0.5, 1.3497}, {1, 0.3, 1.7166}, {1, 0.645, 1.5062}, {1.5, 0.9, 2.7}, {5, 0.331, 4.6511},
	} {
		got := peakOf(t, mcMurray(row.zeta, row.xi), 60)
		if math.Abs(got-row.peak) > 0.0006 {
			t.Errorf("zeta %g, xi %g: peak %.5f, table %g", row.zeta, row.xi, got, row.peak)
		}
	}
}

// Regression value d21: a 10 V step that rings to 19 V has zeta 0.03352, Q 14.92 (Analog Devices, RC Snubbing for the
// Lab, gives the step and the peak).
func TestRingOfNineteenVolts(t *testing.T) {
	const zeta = 0.03352
	c := New()
	a, b, d := c.Node("a"), c.Node("b"), c.Node("d")
	c.Voltage("V", a, 0, Constant(10))
	c.Resistor("R", a, b, 2*zeta*15.92)
	c.Inductor("L", b, d, 253.3e-9, 0)
	c.Capacitor("C", d, 0, 1e-9, 0)
	if got := peakOf(t, c, 300e-9); math.Abs(got-19) > 0.002 {
		t.Errorf("peak %.4f V, want 19", got)
	}
}

// Rashid, Power Electronics, 3rd ed., ex 2.4 p. 48: 0.1 µF at 220 V into 44 Ω: 5 A, 2.42 mJ, 139.64 V after 2 µs.
func TestRashidExample24(t *testing.T) {
	c := New()
	a := c.Node("a")
	c.Capacitor("C", a, 0, 0.1e-6, 220)
	c.Resistor("R", a, 0, 44)
	r := begin(t, c)
	near(t, "first current", r.BranchCurrent("R"), 5, 1e-12)
	to(t, r, 2e-6)
	near(t, "voltage after 2 µs", r.Voltage(a, 0), 139.642, 5e-6)
	to(t, r, 200e-6)
	near(t, "energy", r.Energy("R"), 2.42e-3, 1e-9)
}

// Derived from circuit laws (after Toshiba's FAQ on avalanche energy; regression value d2): with the supply in circuit the clamp takes
// ½·L·I²·BV/(BV-V), for L·I/(BV-V).
func TestAvalancheEnergy(t *testing.T) {
	const l, i, bv, v = 1e-3, 20.0, 250.0, 60.0
	c := lc(v, l, 1e-12, i, v)
	c.Diode("BV", c.Node("d"), 0, bv, 0)
	c.Resistor("Rd", c.Node("d"), 0, 1e9)
	r := begin(t, c)
	to(t, r, 105.2e-6)
	if !r.Conducts("BV") {
		t.Error("the clamp should still conduct at 105.2 µs")
	}
	to(t, r, 105.4e-6)
	if r.Conducts("BV") {
		t.Error("the clamp should have stopped at 105.26 µs")
	}
	near(t, "avalanche energy", r.Energy("BV"), 0.5*l*i*i*bv/(bv-v), 1e-6)
}

// Derived from circuit laws (result attributed there to W. McMurray 1980): losses of a turn-off snubber with linear current fall,
// ideal diodes. With k = C/C_n: switch 1-4/3·√k+k/2 below 1 and 1/(6k) above, capacitor k/2; total 5/9 at 4/9.
func TestTurnOffSnubberLosses(t *testing.T) {
	const v, i, fall = 400.0, 100.0, 200e-9
	w0, cn := 0.5*v*i*fall, i*fall/(2*v)
	for _, k := range []float64{0.1, 0.2, 0.3, 4.0 / 9, 0.6, 0.8, 1, 1.5, 2, 3} {
		c := New()
		bus, x, s := c.Node("bus"), c.Node("x"), c.Node("s")
		c.Voltage("V", bus, 0, Constant(v))
		c.Current("load", bus, x, Constant(i))
		c.Current("channel", x, 0, Waveform{{0, i}, {fall, 0}})
		c.Diode("free", x, bus, 0, 0)
		c.Diode("Ds", x, s, 0, 0)
		c.Capacitor("C", s, 0, k*cn, 0)
		r := begin(t, c)
		to(t, r, 2e-6)
		loss := 1 / (6 * k)
		if k <= 1 {
			loss = 1 - 4.0/3*math.Sqrt(k) + k/2
		}
		near(t, fmt.Sprintf("switch loss at k %.3g", k), r.Energy("channel")/w0, loss, 2e-6)
		near(t, fmt.Sprintf("capacitor at k %.3g", k), r.Energy("C")/w0, k/2, 2e-6)
	}
}

// Two coupled inductors against the textbook: with the secondary short-circuited by a wire the primary shows
// L·(1-k²), so the ring of a capacitor on it is faster by 1/√(1-k²).
func TestCoupledInductors(t *testing.T) {
	const l, k, cap = 1e-6, 0.8, 1e-9
	c := New()
	a, b := c.Node("a"), c.Node("b")
	c.Capacitor("C", a, 0, cap, 10)
	c.Inductor("L1", a, 0, l, 0)
	c.Inductor("L2", b, 0, 4*l, 0)
	c.Resistor("short", b, 0, 0)
	c.Couple("L1", "L2", k)
	r := begin(t, c)
	w := 1 / math.Sqrt(l*(1-k*k)*cap)
	to(t, r, 1/w)
	near(t, "voltage after one radian", r.Voltage(a, 0), 10*math.Cos(1), 1e-11)
	modes, err := r.Modes()
	if err != nil {
		t.Fatal(err)
	}
	near(t, "ring", modes[0].Frequency, w/(2*math.Pi), 1e-12)
}
