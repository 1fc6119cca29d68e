package stress

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"drivemend/diagnose/circuit"
)

// within fails unless got is want within a relative tolerance.
func within(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s: %.10g, want %.10g (off by %.2g, allowed %g)", what, got, want, got/want-1, tolerance)
	}
}

func mustPulse(t *testing.T, henry, amps, breakdown, supply float64) Pulse {
	t.Helper()
	p, err := PulseOf(henry, amps, breakdown, supply)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// Derived from circuit laws (Toshiba, FAQ on avalanche energy; Renesas 2SK3069 p. 5): energy, time and power in the solver, with
// the supply in series and cut off; and of a bank the lowest device alone, however little lower it lies.
func TestAvalancheAgainstSolver(t *testing.T) {
	for _, v := range []struct{ henry, amps, breakdown, supply float64 }{
		{1e-3, 20, 250, 60}, {1e-3, 20, 250, 0}, {120e-9, 60, 700, 390}, {80e-6, 3, 130, 48}, {2e-6, 200, 1500, 1490},
	} {
		p := mustPulse(t, v.henry, v.amps, v.breakdown, v.supply)
		c := circuit.New()
		supply, drain := c.Node("supply"), c.Node("drain")
		c.Voltage("supply", supply, 0, circuit.Constant(v.supply))
		c.Inductor("L", supply, drain, v.henry, v.amps)
		c.Diode("lowest", drain, 0, v.breakdown, 0)
		c.Diode("next", drain, 0, v.breakdown*1.001, 0)
		run, err := c.Start()
		if err != nil {
			t.Fatal(err)
		}
		within(t, "power at the start", run.BranchCurrent("lowest")*run.BranchVoltage("lowest"), p.Watts(), 1e-6)
		if _, err := run.To(p.Time*(1-1e-6), -1, 0); err != nil || !run.Conducts("lowest") {
			t.Errorf("%+v: over before %g s (%v)", v, p.Time, err)
		}
		if _, err := run.To(p.Time*(1+1e-6), -1, 0); err != nil || run.Conducts("lowest") {
			t.Errorf("%+v: not over after %g s (%v)", v, p.Time, err)
		}
		within(t, fmt.Sprintf("%+v: energy", v), run.Energy("lowest"), p.Joule, 1e-6)
		if x := run.Energy("next"); x != 0 {
			t.Errorf("%+v: the next device took %g J", v, x)
		}
	}
}

// ladders of thermal steps: a package, a single step, and steps that lie far from the pulse on both sides.
var ladders = [][]LadderStep{
	{{0.02, 2e-3}, {0.06, 30e-3}, {0.04, 0.2}},
	{{0.5, 50e-6}},
	{{0.01, 1e-9}, {0.3, 100e-6}, {2, 1e3}},
}

// A Foster ladder is a chain of resistors with capacitors beside them, and the heat a current through it: the solver's
// highest voltage along the chain is the rise. Regression value d2 (½·L·I²·BV/(BV−V), derived) gives the pulse.
func TestRiseAgainstSolver(t *testing.T) {
	p := mustPulse(t, 1e-3, 20, 250, 60)
	for n, ladder := range ladders {
		c := circuit.New()
		c.Current("heat", 0, c.Node("junction"), circuit.Waveform{{T: 0, V: p.Watts()}, {T: p.Time, V: 0}})
		at := c.Node("junction")
		for k, s := range ladder {
			next := 0
			if k < len(ladder)-1 {
				next = c.Node(strings.Repeat("i", k+1))
			}
			c.Resistor("R"+strings.Repeat("i", k), at, next, s.Resistance)
			c.Capacitor("C"+strings.Repeat("i", k), at, next, s.Time/s.Resistance, 0)
			at = next
		}
		run, err := c.Start(circuit.WithoutEnergy(), circuit.WithStep(p.Time/200))
		if err != nil {
			t.Fatal(err)
		}
		probe := run.Probe(c.Node("junction"), 0)
		if _, err := run.To(1.5*p.Time, -1, 0); err != nil {
			t.Fatal(err)
		}
		want, when := run.Peak(probe)
		kelvin, summit, err := p.Rise(ladder)
		if err != nil {
			t.Fatal(err)
		}
		within(t, "rise", kelvin, want, 1e-6)
		if math.Abs(summit-when) > 1e-3*p.Time {
			t.Errorf("ladder %d: summit at %g s, in the solver at %g s", n, summit, when)
		}
	}
}

// One step alone is hottest at τ·ln(1+T/τ) (its slope set to nothing).
func TestRiseOfOneStep(t *testing.T) {
	p := Pulse{Breakdown: 100, Amps: 10, Time: 1e-4}
	for _, tau := range []float64{1e-9, 1e-5, 1e-4, 1e-2, 1e4} {
		kelvin, at, err := p.Rise([]LadderStep{{Resistance: 0.3, Time: tau}})
		if err != nil {
			t.Fatal(err)
		}
		within(t, "summit", at, tau*math.Log1p(p.Time/tau), 1e-9)
		if tau == 1e4 { // nothing flows off: energy over heat capacity
			within(t, "adiabatic", kelvin, 0.3/tau*p.Watts()*p.Time/2, 1e-6)
		}
		if tau == 1e-9 { // follows at once
			within(t, "steady", kelvin, 0.3*p.Watts(), 2e-4)
		}
	}
}

// A step of 10⁵ s under a pulse of 1 ns, the ends of the key table: energy over heat capacity, with no digits lost.
func TestRiseOfFarApartTimes(t *testing.T) {
	p := Pulse{Breakdown: 100, Amps: 10, Time: 1e-9}
	kelvin, _, err := p.Rise([]LadderStep{{Resistance: 0.3, Time: 1e5}})
	if err != nil {
		t.Fatal(err)
	}
	within(t, "adiabatic", kelvin, 0.3/1e5*p.Watts()*p.Time/2, 1e-9)
}

// A ladder of many steps, R = √τ·Δlnτ/(2√π), is the root law Zth = √t (∫(1−exp(−st))·s^(−3/2) ds = 2√(πt)): Rise on it
// and RootRise have to agree.
func TestRootRiseIsALimitOfRise(t *testing.T) {
	const step = 0.05
	var ladder []LadderStep
	for ln := math.Log(1e-15); ln < math.Log(1e6); ln += step {
		tau := math.Exp(ln)
		ladder = append(ladder, LadderStep{Resistance: math.Sqrt(tau) * step / (2 * math.Sqrt(math.Pi)), Time: tau})
	}
	p := mustPulse(t, 1e-3, 20, 250, 60)
	kelvin, at, err := p.Rise(ladder)
	if err != nil {
		t.Fatal(err)
	}
	want, when, err := p.RootRise(1, 1) // √(1 s) = 1 K/W
	if err != nil {
		t.Fatal(err)
	}
	within(t, "rise", kelvin, want, 1e-4)
	within(t, "moment", at, when, 1e-3)
}

func TestAvalancheRuling(t *testing.T) {
	p := Pulse{Breakdown: 600, Amps: 10, Time: 1e-5, Joule: 0.03}
	for _, c := range []struct {
		name  string
		rated AvalancheRating
		hertz float64
		want  AvalancheRuling
	}{
		{"nothing rated", AvalancheRating{}, 0, AvalancheRuling{Uncredited: true}},
		{"energy alone is not enough", AvalancheRating{Joule: 0.06}, 0, AvalancheRuling{Uncredited: true, EnergyShare: 0.5}},
		{"inside", AvalancheRating{Joule: 0.06, Amps: 20}, 0, AvalancheRuling{EnergyShare: 0.5, AmpsShare: 0.5, RiseShare: 0.5}},
		{"at the rating", AvalancheRating{Joule: 0.03, Amps: 10}, 0, AvalancheRuling{EnergyShare: 1, AmpsShare: 1, RiseShare: 1}},
		{"over energy, slower", AvalancheRating{Joule: 0.02, Amps: 40}, 0,
			AvalancheRuling{OverEnergy: true, EnergyShare: 1.5, AmpsShare: 0.25, RiseShare: math.Sqrt(0.375)}},
		{"over current", AvalancheRating{Joule: 0.3, Amps: 5}, 0,
			AvalancheRuling{OverCurrent: true, EnergyShare: 0.1, AmpsShare: 2, RiseShare: math.Sqrt(0.2)}},
		{"every cycle", AvalancheRating{Joule: 0.3, Amps: 50}, 100,
			AvalancheRuling{Repetitive: true, EnergyShare: 0.1, AmpsShare: 0.2, RiseShare: math.Sqrt(0.02), Watts: 3}},
	} {
		got := p.Against(c.rated, c.hertz)
		for _, pair := range [][2]*float64{{&got.EnergyShare, &c.want.EnergyShare}, {&got.AmpsShare, &c.want.AmpsShare},
			{&got.RiseShare, &c.want.RiseShare}, {&got.Watts, &c.want.Watts}} {
			within(t, c.name, *pair[0], *pair[1], 1e-12)
			*pair[0] = *pair[1]
		}
		if got != c.want {
			t.Errorf("%s: %+v, want %+v", c.name, got, c.want)
		}
		if holds := c.name == "inside" || c.name == "at the rating"; got.Holds() != holds {
			t.Errorf("%s: holds %v", c.name, got.Holds())
		}
	}
}

// The ruling by rise is that of RootRise: equal shares for two pulses of one breakdown on one die.
func TestRiseShareIsTheRootLaw(t *testing.T) {
	a, b := mustPulse(t, 1e-3, 10, 600, 300), mustPulse(t, 3e-5, 25, 600, 50)
	ka, _, _ := a.RootRise(0.1, 1e-5)
	kb, _, _ := b.RootRise(0.1, 1e-5)
	within(t, "share", a.Against(AvalancheRating{b.Joule, b.Amps}, 0).RiseShare, ka/kb, 1e-12)
}

func TestAvalancheRefuses(t *testing.T) {
	for _, x := range [][4]float64{{0, 1, 600, 0}, {-1e-3, 1, 600, 0}, {1e-3, 0, 600, 0}, {1e-3, 1, 300, 300}, {1e-3, 1, 300, 400},
		{1e-3, 1, 300, -1}, {math.NaN(), 1, 300, 0}, {1e-3, math.Inf(1), 300, 0}, {1e-3, 1, 300, math.NaN()}, {1e200, 1e200, 300, 0}} {
		if p, err := PulseOf(x[0], x[1], x[2], x[3]); err == nil || !strings.HasPrefix(err.Error(), "avalanche: ") {
			t.Errorf("%v: %+v, %v", x, p, err)
		}
	}
	p := Pulse{Breakdown: 100, Amps: 1, Time: 1e-5}
	for _, ladder := range [][]LadderStep{nil, {{0, 1}}, {{1, -1}}, {{1, 1}, {math.NaN(), 1}}} {
		if _, _, err := p.Rise(ladder); err == nil {
			t.Errorf("%v accepted", ladder)
		}
	}
	if _, _, err := (Pulse{}).Rise(ladders[0]); err == nil {
		t.Error("an empty pulse accepted")
	}
	if _, _, err := p.RootRise(0, 1e-5); err == nil {
		t.Error("no impedance accepted")
	}
}
