package stress

import (
	"math"
	"slices"
	"testing"
)

// What the comments of the rules say of the reference, in the middle of its boards: the powers of the gate resistance with
// which fall time and closing slope go in the maker's test, from its resistor to three times that, and how much longer a
// diode's reverse current lasts than the softness of its test says.
func TestModelRules(t *testing.T) {
	if !ngspiceThere(t) {
		return
	}
	found := map[string][]float64{}
	note := func(name string, v float64) {
		if !math.IsNaN(v) && !math.IsInf(v, 0) {
			found[name] = append(found[name], v)
		}
	}
	for n := range uint64(modelCount()) {
		b := drawModel(n)
		f := b.fixture()
		s, err := b.sheet()
		if err != nil {
			t.Logf("board %d: %v", n, err)
			continue
		}
		slow := f
		slow.onOhm, slow.offOhm = 3*f.onOhm, 3*f.offOhm
		opening, err := slow.edge(f.bus, f.amps, true)
		if err != nil {
			t.Logf("board %d: %v", n, err)
			continue
		}
		closing, err := slow.edge(f.bus, f.amps, false)
		if err != nil {
			t.Logf("board %d: %v", n, err)
			continue
		}
		ratio := math.Log((3*f.sheetOhm + b.device.gateOhm) / (f.sheetOhm + b.device.gateOhm))
		kind := "mosfet"
		if b.device.kind == "igbt" {
			kind = "igbt"
		}
		note("fall "+kind, math.Log(opening.FallTime/s.FallTime)/ratio)
		note("closing "+kind, math.Log(s.TurnOnSlope/closing.RiseSlope)/ratio)
		d := b.device.diode
		if !b.leg {
			d = b.diode
		}
		rising := math.Sqrt(2 * s.Charge / (1 + s.Softness) / s.RecoverySlope)
		note("recovery", d.lifetime*d.transit/(d.lifetime+d.transit)/(s.Softness*rising/2))
	}
	for name, said := range map[string]float64{"fall igbt": 0.2, "fall mosfet": 0.4, "closing igbt": 0.5, "closing mosfet": 0.5, "recovery": 1.2} {
		v := found[name]
		if slices.Sort(v); len(v) < 3 {
			t.Errorf("%s: only %d boards", name, len(v))
			continue
		}
		if middle := v[len(v)/2]; math.Abs(middle-said) > 0.5*said && math.Abs(middle-said) > 0.2 {
			t.Errorf("%s: %.2f in the middle, said is %.2f", name, middle, said)
		}
		t.Logf("%-15s %3d boards: %.2f to %.2f, middle %.2f", name, len(v), v[len(v)/10], v[len(v)*9/10], v[len(v)/2])
	}
}
