package stress

import (
	"fmt"
	"math"
	"testing"

	"drivemend/diagnose/circuit"
	"drivemend/measure/quantity"
)

// What this file leaves to circuit/closed_form_test.go, which solves it already: McMurray's normalised peak over zeta 0.02 to
// 0.98 and xi 0 to 5 (to 1e-9), his table, and table 2.3 at its printed resistors.

// closedChecks are what a row of edge-closed.csv can ask; every one works a closed form of this package out.
var closedChecks = map[string]func(*testing.T, values) float64{
	"avalanche_energy": func(t *testing.T, v values) float64 { return mustPulse(t, v["L"], v["I"], v["BV"], v["V"]).Joule },
	"avalanche_time":   func(t *testing.T, v values) float64 { return mustPulse(t, v["L"], v["I"], v["BV"], v["V"]).Time },
	"avalanche_watts":  func(t *testing.T, v values) float64 { return mustPulse(t, v["L"], v["I"], v["BV"], v["V"]).Watts() },
	"root_rise": func(t *testing.T, v values) float64 {
		kelvin, _, err := mustPulse(t, v["L"], v["I"], v["BV"], v["V"]).RootRise(v["zth"], v["at"])
		return asked(t, kelvin, err)
	},
	"rail_clamp_watts": func(t *testing.T, v values) float64 { return v.clamp(t, ClampToRail).Watts },
	"rail_clamp_ohm":   func(t *testing.T, v values) float64 { return v.clamp(t, ClampToRail).Ohm },
	"bus_clamp_watts":  func(t *testing.T, v values) float64 { return v.clamp(t, ClampToBus).Watts },
	"bus_clamp_ohm":    func(t *testing.T, v values) float64 { return v.clamp(t, ClampToBus).Ohm },
	"clamp_charge":     func(t *testing.T, v values) float64 { return v.clamp(t, ClampToBus).Coulomb },
	"clamp_time":       func(t *testing.T, v values) float64 { return v.clamp(t, ClampToBus).Time },
	"clamp_farad":      func(t *testing.T, v values) float64 { return v.clamp(t, ClampToBus).Capacitance(v["ripple"]) },
	"decoupling": func(t *testing.T, v values) float64 {
		farad, err := DecouplingFor(v["L"], v["I"], v["dV"])
		return asked(t, farad, err)
	},
	"pump_above": func(t *testing.T, v values) float64 {
		volts, err := v.reservoir("").After(v["n"])
		return asked(t, volts-v["V"], err)
	},
	"pump_rail": func(t *testing.T, v values) float64 { return v.pumpEnd(t, ClampToRail) },
	"pump_bus":  func(t *testing.T, v values) float64 { return v.pumpEnd(t, ClampToBus) },
	"loop_from_slope": func(t *testing.T, v values) float64 {
		return loopBy(t, LoopFromSlope, Measured{Bus: of(v["V"], "V"), Peak: of(v["peak"], "V"), Slope: of(v["slope"], "A/s")})
	},
	"loop_from_ring": func(t *testing.T, v values) float64 { return loopBy(t, LoopFromAdded, v.rings()) },
	"ring_farad": func(t *testing.T, v values) float64 {
		r, err := v.rings().RingOf()
		return asked(t, r.Farad, err)
	},
	"ring_ohm": func(t *testing.T, v values) float64 {
		r, err := v.rings().RingOf()
		return asked(t, r.Ohm, err)
	},
	"ring_farad_error": func(t *testing.T, v values) float64 {
		m := v.rings()
		m.Ring, m.RingAdded = uncertain(m.Ring, v["u"]), uncertain(m.RingAdded, v["u"])
		r, err := m.RingOf()
		return asked(t, r.FaradSigma/r.Farad, err)
	},
}

func asked(t *testing.T, x float64, err error) float64 {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
	return x
}

func of(value float64, unit quantity.Unit) quantity.Quantity { return quantity.Of(value, unit) }

// uncertain gives a quantity a relative uncertainty.
func uncertain(q quantity.Quantity, share float64) quantity.Quantity {
	q.Low, q.High = q.Value*(1-share), q.Value*(1+share)
	return q
}

func (v values) clamp(t *testing.T, to string) ClampFigures {
	t.Helper()
	f, err := HeldClamp{Bus: v["V"], Henry: v["L"], Amps: v["I"], Hertz: v["f"], Return: to}.At(v["clamp"])
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func (v values) reservoir(to string) Reservoir {
	return Reservoir{Bus: v["V"], Farad: v["C"], Henry: v["L"], Amps: v["I"], Hertz: v["f"], Bleeder: v["R"], Return: to}
}

func (v values) pumpEnd(t *testing.T, to string) float64 {
	t.Helper()
	end, err := v.reservoir(to).End(1e5)
	if err != nil || end.By != StopBleeder {
		t.Fatal(end, err)
	}
	return end.Volts
}

func (v values) rings() Measured {
	return Measured{Ring: of(v["f0"], "Hz"), RingAdded: of(v["f1"], "Hz"), Added: of(v["Cadd"], "F")}
}

func loopBy(t *testing.T, method string, m Measured) float64 {
	t.Helper()
	all, err := m.Loops()
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range all {
		if e.Method == method {
			return e.Henry
		}
	}
	t.Fatalf("no figure by %q among %+v", method, all)
	return 0
}

// Published, remembered and derived check values of the closed forms; the table says which is which.
func TestClosedForms(t *testing.T) {
	asks := map[string]bool{}
	for _, r := range table(t, "edge-closed.csv") {
		t.Run(r["id"], func(t *testing.T) {
			check, ok := closedChecks[r["check"]]
			if !ok || r["source"] == "" {
				t.Fatalf("no check named %q, or no source", r["check"])
			}
			if kind := r["kind"]; kind != "published" && kind != "from memory" && kind != "derived" {
				t.Errorf("kind %q", kind)
			}
			asks[r["check"]] = true
			within(t, r["check"]+" ("+r["source"]+")", check(t, r.inputs(t)), r.number(t, "value"), r.number(t, "tolerance"))
		})
	}
	for name := range closedChecks {
		if !asks[name] {
			t.Errorf("no row asks for %s", name)
		}
	}
}

// least finds the lowest value of a function with one valley, by golden sections.
func least(f func(float64) float64, low, high float64) (x, value float64) {
	const gold = 0.6180339887498949
	a, b := high-gold*(high-low), low+gold*(high-low)
	fa, fb := f(a), f(b)
	for range 28 {
		if fa < fb {
			high, b, fb = b, a, fa
			a = high - gold*(high-low)
			fa = f(a)
		} else {
			low, a, fa = a, b, fb
			b = low + gold*(high-low)
			fb = f(b)
		}
	}
	return (low + high) / 2, min(fa, fb)
}

// stepPeak is L, carrying x, into C beside R and n·C, all in units of V, L, C.
func stepPeak(t *testing.T, x, n, ohm float64) float64 {
	t.Helper()
	c := circuit.New()
	d := c.Node("d")
	c.Voltage("V", c.Node("a"), 0, circuit.Constant(1))
	c.Inductor("L", c.Node("a"), d, 1, x)
	c.Capacitor("C", d, 0, 1, 0)
	c.Resistor("R", d, c.Node("e"), ohm)
	c.Capacitor("Cs", c.Node("e"), 0, n, 0)
	run, err := c.Start(circuit.WithoutEnergy(), circuit.WithoutTrace())
	if err != nil {
		t.Fatal(err)
	}
	probe := run.Probe(d, 0)
	if _, err := run.To(40, -1, 0); err != nil {
		t.Fatal(err)
	}
	peak, _ := run.Peak(probe)
	return peak
}

// misrounded are the entries of that table that are one too high in the last digit, with what is right.
var misrounded = map[string]float64{"x=2 n=3 r=0.60": 1.847, "x=2 n=5 r=0.53": 1.622, "x=3 n=4 r=0.46": 2.037}

// The table of the best resistor (edge-tables.csv, damped_step; derived): the best one found again here in the solver has the
// printed peak and resistor, in their last digits, but for three peaks.
func TestBestResistorTable(t *testing.T) {
	rows, worstPeak, worstOhm := 0, 0.0, 0.0
	for _, r := range table(t, "edge-tables.csv") {
		v := r.inputs(t)
		if r["table"] != "damped_step" || v["n"] == 0 {
			continue
		}
		rows++
		ohm, peak := least(func(ohm float64) float64 { return stepPeak(t, v["x"], v["n"], ohm) }, v["r"]/1.6, v["r"]*1.6)
		want := r.number(t, "value")
		if right, ok := misrounded[r["inputs"]]; ok {
			want = right
		}
		offPeak, offOhm := math.Abs(peak-want), math.Abs(ohm-v["r"])
		worstPeak, worstOhm = math.Max(worstPeak, offPeak), math.Max(worstOhm, offOhm)
		if offPeak > 0.0005 || offOhm > 0.0061 {
			t.Errorf("%s: best R/Z0 %.4f with peak %.5f, want %g and %g", r["inputs"], ohm, peak, v["r"], want)
		}
	}
	t.Logf("%d rows, largest differences: peak %.5f, R/Z0 %.4f", rows, worstPeak, worstOhm)
	if rows != 35 {
		t.Errorf("%d rows, want 35", rows)
	}
}

// snubberLoss is the loss of a turn-off snubber over ½·V·I·t_f in the solver: linear fall, ideal diodes, k = C/C_n with
// C_n = I·t_f/(2V).
func snubberLoss(t *testing.T, k float64) (channel, capacitor float64) {
	t.Helper()
	const volts, amps, fall = 400.0, 100.0, 200e-9
	c := circuit.New()
	bus, sw, held := c.Node("bus"), c.Node("switch"), c.Node("held")
	c.Voltage("bus", bus, 0, circuit.Constant(volts))
	c.Current("load", bus, sw, circuit.Constant(amps))
	c.Current("channel", sw, 0, circuit.Waveform{{T: 0, V: amps}, {T: fall, V: 0}})
	c.Diode("freewheel", sw, bus, 0, 0)
	c.Diode("snubber-diode", sw, held, 0, 0)
	c.Capacitor("snubber", held, 0, k*amps*fall/(2*volts), 0)
	run, err := c.Start()
	if err != nil {
		t.Fatal(err)
	}
	if _, err := run.To(2e-6, -1, 0); err != nil {
		t.Fatal(err)
	}
	whole := volts * amps * fall / 2
	return run.Energy("channel") / whole, run.Energy("snubber") / whole
}

// Derived from circuit laws (result attributed to W. McMurray, IEEE Trans. Ind. Appl. IA-16, 1980, from memory): switch
// 1 − 4/3·√k + k/2 up to k = 1 and 1/(6k) above, resistor k/2, to 1e-6; and the least total, found by search in the solver,
// is 5/9 at k = 4/9.
func TestTurnOffSnubberOptimum(t *testing.T) {
	for _, k := range []float64{0.05, 0.1, 0.2, 0.3, 4.0 / 9, 0.6, 0.8, 1, 1.5, 2, 3} {
		want := 1 / (6 * k)
		if k <= 1 {
			want = 1 - 4.0/3*math.Sqrt(k) + k/2
		}
		channel, capacitor := snubberLoss(t, k)
		within(t, fmt.Sprintf("switch at k %.3g", k), channel, want, 1e-6)
		within(t, fmt.Sprintf("resistor at k %.3g", k), capacitor, k/2, 1e-6)
	}
	k, total := least(func(k float64) float64 {
		channel, capacitor := snubberLoss(t, k)
		return channel + capacitor
	}, 0.2, 0.9)
	within(t, "least total", total, 5.0/9, 1e-6)
	within(t, "its k", k, 4.0/9, 2e-3)
}

// edgeOf is a loop and package, an ideal freewheel diode and an output capacitance, cut in a straight line, in the solver.
func edgeOf(t *testing.T, volts, amps, henry, pack, farad, fall float64) (terminal, chip float64) {
	t.Helper()
	c := circuit.New()
	bus, load, term, die := c.Node("bus"), c.Node("load"), c.Node("terminal"), c.Node("chip")
	c.Voltage("bus", bus, 0, circuit.Constant(volts))
	c.Current("load", bus, load, circuit.Constant(amps))
	c.Diode("freewheel", load, bus, 0, 0)
	c.Inductor("loop", load, term, henry, amps)
	c.Inductor("package", term, die, pack, amps)
	c.Capacitor("output", die, 0, farad, 0)
	c.Current("channel", die, 0, circuit.Waveform{{T: 0, V: amps}, {T: fall / 0.8, V: 0}})
	run, err := c.Start(circuit.WithoutEnergy())
	if err != nil {
		t.Fatal(err)
	}
	outer, inner := run.Probe(term, 0), run.Probe(die, 0)
	if _, err := run.To(2*fall, -1, 0); err != nil {
		t.Fatal(err)
	}
	terminal, _ = run.Peak(outer)
	chip, _ = run.Peak(inner)
	return terminal, chip
}

// The loop out of the peak of a hard cut in the solver, exactly; read on the terminals the package is missing.
func TestLoopFromCutAgainstSolver(t *testing.T) {
	for _, v := range []struct{ volts, amps, henry, pack, farad, fall float64 }{
		{310, 60, 120e-9, 13e-9, 100e-12, 96e-9}, {48, 100, 30e-9, 3e-9, 500e-12, 60e-9}, {600, 300, 60e-9, 25e-9, 400e-12, 150e-9},
	} {
		terminal, chip := edgeOf(t, v.volts, v.amps, v.henry, v.pack, v.farad, v.fall)
		m := Measured{AtChip: true, Bus: of(v.volts, "V"), Current: of(v.amps, "A"), FallTime: of(v.fall, "s"), Peak: of(chip, "V")}
		within(t, fmt.Sprintf("%+v at the chip", v), loopBy(t, LoopFromCut, m), v.henry+v.pack, 1e-6)
		m.AtChip, m.Peak = false, of(terminal, "V")
		if got := loopBy(t, LoopFromCut, m); got > 0.99*(v.henry+v.pack) || got < 0.7*v.henry {
			t.Errorf("%+v at the terminals: %g H", v, got)
		}
		all, err := m.Loops()
		if err != nil || len(all) != 2 || !all[0].WithRecovery || !all[1].WithRecovery || all[0].WithPackage || all[1].WithPackage {
			t.Errorf("%+v, %v: from a peak on the terminals, forward recovery included and package left out", all, err)
		}
		if cut, fall := loopBy(t, LoopFromCut, m), loopBy(t, LoopFromFall, m); cut >= fall {
			t.Errorf("%+v: cut %g H, slope %g H", v, cut, fall)
		}
	}
}

// Overshoot over current slope and notch over current slope, in the solver: a current that is forced through loop and package,
// without a capacitance, falls and then rises in straight lines. On the terminals the loop, at the chip both.
func TestLoopFromSlopesAgainstSolver(t *testing.T) {
	const volts, henry, pack, falling, rising = 300.0, 90e-9, 15e-9, 8e8, 3e8
	c := circuit.New()
	bus, term, die := c.Node("bus"), c.Node("terminal"), c.Node("chip")
	c.Voltage("bus", bus, 0, circuit.Constant(volts))
	c.Inductor("loop", bus, term, henry, 80)
	c.Inductor("package", term, die, pack, 80)
	c.Current("channel", die, 0, circuit.Waveform{{T: 0, V: 80}, {T: 80 / falling, V: 0}, {T: 1e-6, V: 0}, {T: 1e-6 + 80/rising, V: 80}})
	run, err := c.Start()
	if err != nil {
		t.Fatal(err)
	}
	for _, at := range []struct {
		chip bool
		node int
		want float64
	}{{false, term, henry}, {true, die, henry + pack}} {
		if at.chip {
			if run, err = c.Start(); err != nil {
				t.Fatal(err)
			}
		}
		if _, err := run.To(40e-9, -1, 0); err != nil {
			t.Fatal(err)
		}
		peak := run.Voltage(at.node, 0)
		if _, err := run.To(1.1e-6, -1, 0); err != nil {
			t.Fatal(err)
		}
		m := Measured{AtChip: at.chip, Bus: of(volts, "V"), Peak: of(peak, "V"), Slope: of(falling, "A/s"),
			Notch: of(volts-run.Voltage(at.node, 0), "V"), NotchSlope: of(rising, "A/s")}
		all, err := m.Loops()
		if err != nil || len(all) != 2 {
			t.Fatal(all, err)
		}
		for _, e := range all {
			within(t, e.Method, e.Henry, at.want, 1e-6)
			if e.WithPackage != at.chip || e.WithRecovery != (e.Method == LoopFromSlope) {
				t.Errorf("%+v at the chip: %v", e, at.chip)
			}
		}
	}
}

// Loop, capacitance and impedance out of the damped ring of the solver, without and with an added capacitor.
func TestLoopFromRingAgainstSolver(t *testing.T) {
	const henry, farad, added = 80e-9, 700e-12, 1.5e-9
	for _, ohm := range []float64{1e-3, 2, 12} {
		ringOf := func(farad float64) circuit.Mode {
			c := circuit.New()
			c.Voltage("bus", c.Node("bus"), 0, circuit.Constant(100))
			c.Inductor("loop", c.Node("bus"), c.Node("far"), henry, 0)
			c.Resistor("R", c.Node("far"), c.Node("chip"), ohm)
			c.Capacitor("output", c.Node("chip"), 0, farad, 0)
			run, err := c.Start()
			if err != nil {
				t.Fatal(err)
			}
			modes, err := run.Modes()
			if err != nil {
				t.Fatal(err)
			}
			return modes[0]
		}
		alone, both := ringOf(farad), ringOf(farad+added)
		m := Measured{Ring: of(alone.Frequency, "Hz"), Damping: alone.Damping, Capacitance: of(farad, "F")}
		within(t, "known capacitance", loopBy(t, LoopFromRing, m), henry, 1e-6)
		m.RingAdded, m.Added = of(both.Frequency, "Hz"), of(added, "F")
		within(t, "added capacitance", loopBy(t, LoopFromAdded, m), henry, 1e-6)
		r, err := m.RingOf()
		if err != nil {
			t.Fatal(err)
		}
		within(t, "capacitance", r.Farad, farad, 1e-6)
		within(t, "impedance", r.Ohm, math.Sqrt(henry/farad), 1e-6)
	}
}
