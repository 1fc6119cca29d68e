package circuit

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// A run for peaks and events alone takes far fewer steps and must find the same: every peak, every lowest value, the
// end, in circuits whose sources have corners and jumps and are changed on the way.
func TestQuickFindsTheSame(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := randomCircuit(rapidPicker{t})
		state := rapid.Uint64().Draw(t, "changes")
		var seen [2][]float64
		scale := 0.0
		for k, opts := range [][]Option{{WithoutEnergy(), WithoutTrace()}, {WithoutEnergy(), WithStep(1e-9)}} {
			r, err := c.Start(opts...)
			if err != nil {
				t.Fatal(err)
			}
			_, probes := everyNode(r)
			if err := wander(&seeded{state}, r, probes[0], 1e-6); err != nil {
				t.Fatal(err)
			}
			for _, p := range probes {
				top, _ := r.Peak(p)
				low, _ := r.Lowest(p)
				seen[k] = append(seen[k], top, low, r.Voltage(p+1, 0))
				scale = math.Max(scale, math.Max(top, -low))
			}
		}
		for k, v := range seen[0] {
			if math.Abs(v-seen[1][k]) > 1e-5*scale {
				t.Fatalf("value %d: %.10g quickly, %.10g with short steps (of %g V)", k, v, seen[1][k], scale)
			}
		}
	})
}
