package circuit

import (
	"math"
	"strings"
	"testing"
)

// Circuits that could keep a solver busy for ever: each must end, in what physics says or in an error that names the
// element.
func TestNothingHangs(t *testing.T) {
	for _, k := range []struct {
		name  string
		build func(c *Circuit, a, b int)
		want  func(t *testing.T, r *Run, a, b int)
		fault string
	}{
		{name: "tightly coupled inductors with a diode on each side", build: func(c *Circuit, a, b int) {
			c.Current("I", 0, a, Waveform{{0, 2}, {1e-8, 0}})
			c.Inductor("Lp", a, 0, 10e-6, 2)
			c.Inductor("Ls", b, 0, 10e-6, 0)
			c.Couple("Lp", "Ls", 0.999999)
			c.Diode("Dp", 0, a, 30, 0)
			c.Diode("Ds", 0, b, 20, 1e-3)
			c.Capacitor("Cp", a, 0, 100e-12, 0)
			c.Resistor("Rs", b, 0, 1e5)
		}, want: func(t *testing.T, r *Run, a, b int) {
			// 2 A less 20 V/10 µH for 1 µs is about none; with the mutual energy, what the inductors lost is heat
			if amps := r.BranchCurrent("Ls"); amps > 0.05 || amps < -2.001 {
				t.Errorf("secondary carries %g A", amps)
			}
			heat := r.Energy("Dp") + r.Energy("Ds") + r.Energy("Rs") + r.Energy("I")
			gone := 0.5*10e-6*4 - r.Stored("Lp") - r.Stored("Ls") - 0.999999*10e-6*r.BranchCurrent("Lp")*r.BranchCurrent("Ls") - r.Stored("Cp")
			near(t, "energy", heat, gone, 1e-6)
		}},
		{name: "a loop of diodes without resistance", build: func(c *Circuit, a, b int) {
			e := c.Node("e")
			c.Diode("D1", a, b, 0, 0)
			c.Diode("D2", b, e, 0, 0)
			c.Diode("D3", e, a, 0, 0)
			c.Current("I", 0, a, Waveform{{0, 1}, {5e-7, -1}, {1e-6, 1}})
			c.Resistor("R", b, 0, 10)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "v", r.Voltage(b, 0), 10, 1e-6)
			near(t, "v across the loop", 1+r.Voltage(a, b), 1, 1e-5)
		}},
		{name: "diodes back to back without resistance", build: func(c *Circuit, a, b int) {
			c.Diode("D1", a, 0, 0, 0)
			c.Diode("D2", 0, a, 0, 0)
			c.Voltage("V", b, 0, Waveform{{0, 5}, {5e-7, -5}, {1e-6, 5}})
			c.Resistor("R", b, a, 5)
		}, want: func(t *testing.T, r *Run, a, b int) { near(t, "i", r.BranchCurrent("R"), 1, 1e-6) }},
		{name: "capacitors between two sources that ramp", build: func(c *Circuit, a, b int) {
			c.Voltage("V1", a, 0, Waveform{{0, 0}, {1e-6, 10}})
			c.Voltage("V2", b, 0, Waveform{{0, 0}, {5e-7, 10}, {1e-6, 0}})
			c.Capacitor("C", a, b, 1e-9, 0)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "charge", r.Charge("C"), 10e-9, 1e-12)
			near(t, "square", r.Square("C"), 0.5e-6*(0.01*0.01+0.03*0.03), 1e-12)
		}},
		{name: "capacitors between two sources that jump", build: func(c *Circuit, a, b int) {
			c.Voltage("V1", a, 0, Waveform{{0, 0}, {5e-7, 0}, {5e-7, 7}})
			c.Voltage("V2", b, 0, Constant(0))
			c.Capacitor("C", a, b, 1e-9, 0)
		}, fault: `capacitor "C" (0 V) contradicts its loop`},
		{name: "a jump that a resistor takes up", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Waveform{{0, 0}, {5e-7, 0}, {5e-7, 7}})
			c.Resistor("R", a, b, 1e-3)
			c.Capacitor("C", b, 0, 1e-9, 0)
		}, want: func(t *testing.T, r *Run, a, b int) {
			near(t, "v", r.Voltage(b, 0), 7, 1e-12)
			near(t, "heat of R", r.Energy("R"), 0.5e-9*49, 1e-8) // what is left of V²·t/R, which is 10⁷ times as much
		}},
		{name: "a diode that a ring touches again and again", build: func(c *Circuit, a, b int) {
			c.Voltage("V", a, 0, Constant(5))
			c.Inductor("L", a, b, 1e-9, 0)
			c.Capacitor("C", b, 0, 1e-12, 0)
			c.Diode("D", b, 0, 10-1e-9, 0)
		}, want: func(t *testing.T, r *Run, a, b int) {
			if top := math.Max(r.Voltage(b, 0), 0); top > 10+1e-6 {
				t.Errorf("%g V across the clamp", top)
			}
		}},
	} {
		t.Run(k.name, func(t *testing.T) {
			c := New()
			a, b := c.Node("a"), c.Node("b")
			k.build(c, a, b)
			r, err := c.Start(WithLimit(200_000))
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

// A diode that switches on a waveform known in closed form is found to a millionth of the step (in fact to rounding).
func TestEventsAreLocated(t *testing.T) {
	const l, v = 1e-6, 100.0
	for _, cap := range []float64{1e-9, 1.1e-9, 1.3e-9, 1.7e-9} {
		w := 1 / math.Sqrt(l*cap)
		for _, level := range []float64{1, 30, 120, 199, 199.999} { // the last one is passed for a moment between two steps
			for _, opts := range [][]Option{nil, {WithoutEnergy(), WithoutTrace()}} {
				c := lc(v, l, cap, 0, 0)
				d := c.Node("d")
				c.Diode("D", d, 0, level, 1e6) // so much resistance that it draws next to nothing
				r := begin(t, c, opts...)
				p := r.ProbeCurrent("D")
				if stop, err := r.To(1e-6, p, 1e-15); err != nil || !stop {
					t.Errorf("%g F, level %g V: found %v, error %v", cap, level, stop, err)
					continue
				}
				step := 2 * math.Pi / w / pointsPerRing
				allowed := 1e-6*step + 3e-9*level/(v*w*math.Sin(math.Acos(1-level/v))) // and the diode's own tolerance
				if off := math.Abs(r.Time() - math.Acos(1-level/v)/w); off > allowed {
					t.Errorf("%g F, level %g V: the diode is found %g s beside its time, the step is %g s", cap, level, off, step)
				}
			}
		}
	}
}
