package circuit

import (
	"math"
	"math/rand/v2"
	"testing"
)

// The root of a falling function is found to the last digits, within few evaluations, wherever it lies and however bent
// the function is.
func TestRootOf(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	most, all := 0, 0
	for n := range 5000 {
		root := math.Pow(random.Float64(), float64(1+n%4))
		bow := 4 * random.Float64()
		count := 0
		got := rootOf(1, func(t float64) (float64, float64) {
			count++
			x := root - t
			return x * (1 + bow*t), bow*x - (1 + bow*t)
		})
		if math.Abs(got-root) > 4e-15 {
			t.Fatalf("root %.17g found at %.17g", root, got)
		}
		most, all = max(most, count), all+count
	}
	if mean := float64(all) / 5000; mean > 12 || most > 100 {
		t.Errorf("%g evaluations in the mean, %d at most", mean, most)
	}
}
