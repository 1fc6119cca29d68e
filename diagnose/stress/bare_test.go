package stress

import (
	"drivemend/measure"

	"math"
	"slices"
	"testing"
)

// ideal is an edge reduced to what a closed form knows: diodes without drop, nothing stray. Values are laid over it.
func ideal(volts, amps float64, values map[string]float64) scene {
	s := scene{in: &inputs{at: map[string]int{}, bank: 1}, bus: volts, amps: amps, free: true}
	s = s.put("switch.rise_slope", 1e10).put("switch.fall_time", 1e-12).put("freewheel.forward_voltage", 0).put("freewheel.slope_resistance", 0)
	for _, key := range sortedKeys(values) {
		s = s.put(key, values[key])
	}
	return s
}

func sortedKeys(m map[string]float64) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// put gives the scene one more value.
func (s scene) put(key string, v float64) scene {
	in := *s.in
	in.at = map[string]int{}
	for k, n := range s.in.at {
		in.at[k] = n
	}
	in.values, s.x = slices.Clone(s.in.values), slices.Clone(s.x)
	if k, ok := in.at[key]; ok {
		s.x[k] = v
	} else {
		in.add(input{key: key, low: v, mid: v, high: v})
		s.x = append(s.x, v)
	}
	s.in = &in
	return s
}

// withNetwork lays an empty network at the terminals, without leads.
func (s scene) withNetwork(kind string, ohm, farad float64) scene {
	s.net = kind
	s = s.put("snubber.capacitance", farad).put("snubber.diode.forward_voltage", 0).put("snubber.diode.slope_resistance", 0)
	if ohm > 0 {
		s = s.put("snubber.resistance", ohm).put("pwm.shortest_on_time", 1000*ohm*farad)
	}
	return s
}

// winding takes the freewheel path away; the load is an inductance.
func (s scene) winding(henry float64) scene {
	s.free, s.load = false, henry
	return s
}

// straight is the fall time, 90 to 10 %, of a straight fall that takes this long in all.
func straight(fall float64) float64 { return straightRule * fall }

func solveCut(t *testing.T, s scene) *Edge {
	t.Helper()
	e, err := s.cut()
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// volts at a time, in a straight line between samples.
func (e *Edge) volts(at float64) float64 {
	for k := 1; k < len(e.Waveform); k++ {
		if a, b := e.Waveform[k-1], e.Waveform[k]; b.T >= at && b.T > a.T {
			return a.V + (b.V-a.V)*(at-a.T)/(b.T-a.T)
		}
	}
	return math.NaN()
}

func relative(got, want float64) float64 { return math.Abs(got/want - 1) }

// The cut edge without a network, with a ring shorter than the fall: V + a + √(a² + 2aV), a = L·I·0.8/fall_time
// ; the capacitance drops out.
func TestCutEdgeClosedForm(t *testing.T) {
	worst := 0.0
	for _, c := range []struct{ volts, amps, henry, fall, farad float64 }{
		{310, 60, 120e-9, 96e-9, 100e-12}, {310, 60, 120e-9, 96e-9, 250e-12},
		{390, 120, 120e-9, 96e-9, 750e-12}, {24, 20, 20e-9, 30e-9, 200e-12},
		{48, 100, 30e-9, 60e-9, 500e-12}, {600, 300, 60e-9, 150e-9, 400e-12},
		{800, 50, 200e-9, 200e-9, 100e-12}, {12, 5, 15e-9, 25e-9, 50e-12},
		{310, 10, 60e-9, 400e-9, 50e-12}, {560, 25, 120e-9, 80e-9, 20e-12},
	} {
		a := c.henry * c.amps * 0.8 / c.fall
		want := c.volts + a + math.Sqrt(a*a+2*a*c.volts)
		got := solveCut(t, ideal(c.volts, c.amps, map[string]float64{
			"loop.inductance": c.henry, "switch.fall_time": c.fall, "switch.output_capacitance": c.farad})).Peak
		if d := relative(got, want); d > 1e-4 {
			t.Errorf("%+v: peak %.4f V, closed form %.4f V", c, got, want)
		} else {
			worst = math.Max(worst, d)
		}
	}
	t.Logf("largest difference %.2g of the peak", worst)
}

// prepare gathers the first position of a board.
func prepare(b measure.Board) (*problem, []Need) {
	all, needs := prepareAll(b)
	if len(all) == 0 {
		return nil, needs
	}
	return all[0], needs
}
