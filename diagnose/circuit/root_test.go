package circuit

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The root of a falling function is found to the last digits, within few evaluations, wherever it lies and however bent
// the function is; a threefold root, at which Newton's steps creep, too.
func TestRootOf(t *testing.T) {
	for power, within := range map[float64]struct {
		mean float64
		most int
	}{1: {12, 60}, 3: {90, 170}, 9: {140, 170}} {
		random := rand.New(rand.NewPCG(3, 4))
		most, all := 0, 0
		for n := range 5000 {
			root := math.Pow(random.Float64(), float64(1+n%4))
			bow := 4 * random.Float64()
			count := 0
			got := rootOf(1, func(t float64) (float64, float64) {
				count++
				x := root - t
				return math.Pow(x, power) * (1 + bow*t), bow*math.Pow(x, power) - power*math.Pow(x, power-1)*(1+bow*t)
			})
			if math.Abs(got-root) > 4e-15 {
				t.Fatalf("root %.17g of power %g found at %.17g", root, power, got)
			}
			most, all = max(most, count), all+count
		}
		if mean := float64(all) / 5000; mean > within.mean || most > within.most {
			t.Errorf("power %g: %g evaluations in the mean, %d at most", power, mean, most)
		}
	}
}
