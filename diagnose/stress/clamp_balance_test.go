package stress

import (
	"fmt"
	"math"
	"testing"

	"drivemend/diagnose/circuit"
)

// clampCase is the regression value d7: 200 nH, 50 A, 20 kHz, bus 400 V, clamp 480 V.
func clampCase(to string) HeldClamp {
	return HeldClamp{Bus: 400, Henry: 200e-9, Amps: 50, Hertz: 20e3, Return: to}
}

// cycle is one period of a held clamp in the solver: the loop empties through the diode into the capacitor, which the
// resistor bleeds; it gives the capacitor's voltage at the end and the highest.
func (c HeldClamp) cycle(t *testing.T, farad, ohm, start float64) (end, highest float64) {
	t.Helper()
	x := circuit.New()
	bus, sw, held := x.Node("bus"), x.Node("switch"), x.Node("held")
	x.Voltage("bus", bus, 0, circuit.Constant(c.Bus))
	x.Inductor("loop", bus, sw, c.Henry, c.Amps)
	x.Diode("clamp", sw, held, 0, 0)
	x.Capacitor("C", held, 0, farad, start)
	to := 0
	if c.Return == ClampToBus {
		to = bus
	}
	x.Resistor("R", held, to, ohm)
	run, err := x.Start()
	if err != nil {
		t.Fatal(err)
	}
	probe := run.Probe(held, 0)
	if _, err := run.To(1/c.Hertz, -1, 0); err != nil {
		t.Fatal(err)
	}
	highest, _ = run.Peak(probe)
	return run.Voltage(held, 0), highest
}

// balance finds the voltage to which a cycle comes back, by the secant.
func (c HeldClamp) balance(t *testing.T, farad, ohm, guess float64) (mean float64) {
	t.Helper()
	a, b := guess, guess+0.01
	fa, _ := c.cycle(t, farad, ohm, a)
	fa -= a
	for range 6 {
		fb, highest := c.cycle(t, farad, ohm, b)
		fb -= b
		mean = (b + highest) / 2
		if math.Abs(fb) < 1e-10*guess {
			break
		}
		a, b, fa = b, b-fb*(b-a)/(fb-fa), fb
	}
	return mean
}

// Regression value d7 and the fixed points of the balance, derived from the charge of one event: the level that the solver's clamp
// comes to is that of With. The ripple is 2·10⁻⁴ of clamp less bus, so the mean of one period is the level to 1e-6.
func TestClampLevelAgainstSolver(t *testing.T) {
	for _, to := range []string{ClampToRail, ClampToBus} {
		for _, volts := range []float64{420, 480, 560} {
			c := clampCase(to)
			want, err := c.At(volts)
			if err != nil {
				t.Fatal(err)
			}
			farad := want.Capacitance(2e-4 * (volts - c.Bus))
			within(t, fmt.Sprintf("clamp to the %s", to), c.balance(t, farad, want.Ohm, volts-0.1), volts, 1e-6)
			back, err := c.With(want.Ohm)
			if err != nil {
				t.Fatal(err)
			}
			within(t, "and back", back.Clamp, volts, 1e-12)
			within(t, "watts and back", back.Watts, want.Watts, 1e-9)
		}
	}
}

// One event into a held clamp, in the solver: charge, time and energy.
func TestClampEventAgainstSolver(t *testing.T) {
	for _, volts := range []float64{401, 480, 900} {
		c := clampCase(ClampToRail)
		want, err := c.At(volts)
		if err != nil {
			t.Fatal(err)
		}
		x := circuit.New()
		bus, sw := x.Node("bus"), x.Node("switch")
		x.Voltage("bus", bus, 0, circuit.Constant(c.Bus))
		x.Inductor("loop", bus, sw, c.Henry, c.Amps)
		x.Diode("clamp", sw, 0, volts, 0)
		run, err := x.Start()
		if err != nil {
			t.Fatal(err)
		}
		if _, err := run.To(want.Time*(1-1e-6), -1, 0); err != nil || !run.Conducts("clamp") {
			t.Errorf("%g V: not conducting just before %g s (%v)", volts, want.Time, err)
		}
		if _, err := run.To(want.Time*(1+1e-6), -1, 0); err != nil || run.Conducts("clamp") {
			t.Errorf("%g V: still conducting just after %g s (%v)", volts, want.Time, err)
		}
		within(t, "energy", run.Energy("clamp"), want.Joule, 1e-6)
		within(t, "charge", run.Energy("clamp")/volts, want.Coulomb, 1e-6)
	}
}

// The two returns differ by clamp over (clamp − bus), whatever else.
func TestClampReturns(t *testing.T) {
	rail, _ := clampCase(ClampToRail).At(480)
	bus, _ := clampCase(ClampToBus).At(480)
	within(t, "ratio of losses", rail.Watts/bus.Watts, 480.0/80, 1e-12)
	within(t, "ripple", rail.Ripple(0.625e-6), 5, 1e-12)
}

func TestClampRefuses(t *testing.T) {
	good := clampCase(ClampToBus)
	for _, change := range []func(*HeldClamp){
		func(c *HeldClamp) { c.Return = "" }, func(c *HeldClamp) { c.Henry = 0 }, func(c *HeldClamp) { c.Amps = -1 },
		func(c *HeldClamp) { c.Hertz = math.NaN() }, func(c *HeldClamp) { c.Bus = math.Inf(1) }, func(c *HeldClamp) { c.Bus = -1 },
	} {
		c := good
		change(&c)
		if _, err := c.At(480); err == nil {
			t.Errorf("%+v: At accepted", c)
		}
		if _, err := c.With(1e3); err == nil {
			t.Errorf("%+v: With accepted", c)
		}
	}
	for _, volts := range []float64{400, 399, math.NaN(), math.Inf(1)} {
		if _, err := good.At(volts); err == nil {
			t.Errorf("clamp of %g V accepted", volts)
		}
	}
	if _, err := good.With(0); err == nil {
		t.Error("no resistor accepted")
	}
	if _, err := DecouplingFor(1e-9, 1, 0); err == nil {
		t.Error("no rise accepted")
	}
	if _, err := (Decoupled{Bus: 1, Amps: 1, Farad: 1e-9}).Figures(1); err == nil {
		t.Error("nothing upstream accepted")
	}
}

// Volke and Hornkamp, IGBT Modules, 2nd ed., p. 477, eq. 13.9 to 13.11, in the solver: the inductance upstream empties
// into the capacitor while load and freewheel diode go round locally, and rings with it through its own inductance.
func TestDecouplingAgainstSolver(t *testing.T) {
	for _, own := range []float64{0, 15e-9} {
		d := Decoupled{Bus: 600, Amps: 400, Upstream: 50e-9, Own: own, Leg: 20e-9}
		farad, err := DecouplingFor(d.Upstream, d.Amps, 200)
		if err != nil {
			t.Fatal(err)
		}
		d.Farad = farad
		want, err := d.Figures(2e9)
		if err != nil {
			t.Fatal(err)
		}
		c := circuit.New()
		bus, local := c.Node("bus"), c.Node("local")
		c.Voltage("bus", bus, 0, circuit.Constant(d.Bus))
		c.Inductor("upstream", bus, local, d.Upstream, d.Amps)
		c.Inductor("own", local, c.Node("plate"), own, d.Amps)
		c.Capacitor("C", c.Node("plate"), 0, farad, d.Bus)
		run, err := c.Start()
		if err != nil {
			t.Fatal(err)
		}
		probe := run.Probe(local, 0)
		modes, err := run.Modes()
		if err != nil {
			t.Fatal(err)
		}
		within(t, "ring", modes[0].Frequency, want.Ring, 1e-6)
		if _, err := run.To(2e-6, -1, 0); err != nil {
			t.Fatal(err)
		}
		if peak, _ := run.Peak(probe); own == 0 {
			within(t, "peak", peak, want.Peak, 1e-6)
			within(t, "peak allowed", peak, 800, 1e-6)
		}
		within(t, "step that remains", want.Step, 600+(own+20e-9)*2e9, 1e-12)
	}
}
