package circuit

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// The usual curves, and one that rings and dies away, agree with their closed forms all along.
func TestCurvesAgreeWithTheirFormulas(t *testing.T) {
	const damping, spring = 2e6, 9e13 // 1/s, 1/s²
	ring := math.Sqrt(spring - damping*damping/4)
	for name, k := range map[string]struct {
		c    Curve
		want func(t float64) float64
	}{
		"parabola": {Parabola(1e-6, 3e-6, 5, 2e6, -8e12), func(t float64) float64 { return 5 + 2e6*t - 4e12*t*t }},
		"cosine":   {Cosine(1e-6, 3e-6, 7, -3), func(t float64) float64 { return 2 + 5*math.Cos(math.Pi*t/2e-6) }},
		"decay":    {Decay(1e-6, 3e-6, 40, 50e-9), func(t float64) float64 { return 40 * math.Exp(-t/50e-9) }},
		"ring": {Curve{From: 1e-6, Till: 3e-6, Bend: 10 * spring, Damping: damping, Spring: spring}, func(t float64) float64 {
			return 10 * (1 - math.Exp(-damping*t/2)*(math.Cos(ring*t)+damping/2/ring*math.Sin(ring*t)))
		}},
	} {
		for n := range 101 {
			at := 1e-6 + 20e-9*float64(n)
			if got, want := k.c.At(at), k.want(at-1e-6); math.Abs(got-want) > 1e-11*50 {
				t.Errorf("%s at %g s: %.15g, want %.15g", name, at, got, want)
			}
			if got, want := k.c.on(2e-6).At(at), k.want(at-1e-6); at >= 2e-6 && math.Abs(got-want) > 1e-11*50 {
				t.Errorf("%s taken up at half time, at %g s: %.15g, want %.15g", name, at, got, want)
			}
		}
	}
}

// A capacitor behind a resistor driven by half a cosine, and one straight across the source, whose current is that of the
// curve's slope.
func TestCurveDrivesACircuit(t *testing.T) {
	for _, options := range [][]Option{nil, {WithoutEnergy(), WithoutTrace()}} {
		c := New()
		a, b := c.Node("a"), c.Node("b")
		c.Voltage("V", a, 0, Waveform{{0, 0}, {2e-6, 100}}, Cosine(0, 2e-6, 0, 100))
		c.Resistor("R", a, b, 1e3)
		c.Capacitor("C", b, 0, 0.7e-9, 0)
		c.Capacitor("across", a, 0, 1e-9, 0)
		r := begin(t, c, options...)
		amps := r.ProbeCurrent("across")
		const w, rc = math.Pi / 2e-6, 0.7e-6
		for n := 1; n <= 10; n++ {
			at := 0.2e-6 * float64(n)
			to(t, r, at)
			gone := math.Exp(-at / rc)
			want := 50 * (1 - gone - (math.Cos(w*at)+w*rc*math.Sin(w*at)-gone)/(1+w*w*rc*rc))
			near(t, "behind the resistor", r.Voltage(b, 0), want, 1e-12)
			near(t, "slope", r.Slope(a, 0)+1e7, 50*w*math.Sin(w*at)+1e7, 1e-12)
		}
		to(t, r, 3e-6)
		near(t, "held", r.Voltage(a, 0), 100, 1e-12)
		top, at := r.Peak(amps)
		near(t, "current across", top, 1e-9*50*w, 1e-12)
		near(t, "its time", at, 1e-6, 1e-6)
		if options == nil {
			near(t, "energy across", r.Energy("across"), 0.5e-9*1e4, 1e-11)
		}
	}
}

// Two curves that overlap, a change in the middle of one, diodes that switch in another: the same as with very many straight
// pieces.
func TestCurvesAgreeWithManyPieces(t *testing.T) {
	const pieces = 20000
	straight := func(w Waveform, curves ...Curve) Waveform {
		var out Waveform
		for n := range pieces + 1 {
			at := 3e-6 * float64(n) / pieces
			v := w.At(at)
			for _, c := range curves {
				if c.From <= at && at <= c.Till {
					v = c.At(at)
				}
			}
			out = append(out, Point{at, v})
		}
		return out
	}
	fall, rise, later := Cosine(0.3e-6, 1.3e-6, 20, 0), Decay(0.9e-6, 2.1e-6, 90, 0.4e-6), Parabola(1e-6, 1.6e-6, 4, 1e6, -2e13)
	dying := Waveform{{0.9e-6, 90}, {2.1e-6, rise.At(2.1e-6)}, {2.4e-6, 0}}
	end := Waveform{{0, 4}, {1.6e-6, later.At(1.6e-6)}, {2e-6, 0}}
	solve := func(bent bool) (r *Run, seen []float64) {
		c, _, chip := leg(0)
		c.Voltage("ramp", c.Node("ramp"), 0, Waveform{{0, 90}})
		c.Diode("hold", chip, c.Node("ramp"), 0, 0.5)
		r = begin(t, c, WithoutEnergy(), WithoutTrace(), WithLimit(40_000_000))
		r.Probe(chip, 0)
		for _, s := range []struct {
			at     float64
			name   string
			wave   Waveform
			curves []Curve
		}{{0, "channel", Waveform{{0.3e-6, 20}, {1.3e-6, 0}}, []Curve{fall}}, {0, "ramp", dying, []Curve{rise}}, {1e-6, "channel", end, []Curve{later}}} {
			to(t, r, s.at)
			seen = append(seen, r.Voltage(chip, 0), r.BranchCurrent("loop"))
			if bent {
				r.Retarget(s.name, s.wave, s.curves...)
			} else {
				r.Retarget(s.name, straight(s.wave, s.curves...))
			}
		}
		for n := range 20 {
			to(t, r, 1e-6+0.1e-6*float64(n+1))
			seen = append(seen, r.Voltage(chip, 0), r.BranchCurrent("loop"), r.BranchCurrent("hold"))
		}
		return r, seen
	}
	a, seen := solve(true)
	b, wanted := solve(false)
	top, _ := a.Peak(0)
	want, _ := b.Peak(0)
	near(t, "peak", top, want, 1e-6)
	for k, v := range seen {
		near(t, fmt.Sprint("figure ", k), v+1e3, wanted[k]+1e3, 1e-6)
	}
	if bent, pieces := a.steps, b.steps; bent > pieces/20 {
		t.Errorf("%d steps with curves, %d with pieces", bent, pieces)
	}
	for _, at := range []float64{0.31e-6, 0.8e-6, 0.99e-6, 1.2e-6, 1.59e-6, 1.9e-6} {
		near(t, "as run", a.Source("channel").At(at), b.Source("channel").At(at), 1e-3)
	}
	deck, err := a.Netlist("curves", 3e-6, 1e-9)
	if err != nil || strings.Count(deck, "PWL(") < 2 {
		t.Errorf("%v\n%s", err, deck)
	}
}

// Curves that cannot be used are told.
func TestFaultyCurves(t *testing.T) {
	good := Parabola(1, 2, 0, 1, 1)
	for want, curves := range map[string][]Curve{
		"has no length":   {Parabola(1, 1, 0, 1, 1)},
		"zero or above":   {{From: 1, Till: 2, Damping: -1}},
		"beyond":          {Parabola(1, 2, 0, 1e13, 0)},
		"begins before":   {good, Parabola(1.5, 3, 0, 1, 1)},
		"the spring -1; ": {{From: 1, Till: 2, Spring: -1}},
	} {
		c := New()
		c.Voltage("V", c.Node("a"), 0, Constant(1), curves...)
		c.Resistor("R", 1, 0, 1)
		if _, err := c.Start(); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
	}
}
