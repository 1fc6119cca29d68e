package circuit

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// Eigenvalues agree with gonum's on random matrices, those of stiff circuits and of such with equal or zero rates among
// them.
func TestEigenvaluesAgree(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for n := range 2000 {
		size := 1 + n%14
		a := make([]float64, size*size)
		for i := range a {
			a[i] = random.NormFloat64()
			switch n % 4 {
			case 1: // rates far apart
				a[i] *= math.Pow(10, 8*random.Float64())
			case 2: // sparse, with rows of zeros
				a[i] *= float64(random.IntN(3) / 2)
			case 3: // as of a circuit without losses: skew
				if r, c := i/size, i%size; r >= c {
					a[i] = -a[c*size+r]
				}
			}
		}
		var e mat.Eigen
		if !e.Factorize(mat.NewDense(size, size, slices.Clone(a)), mat.EigenNone) {
			t.Fatal("no result to compare with")
		}
		want := e.Values(nil)
		trace := 0.0
		for i := range size {
			trace += a[i*size+i]
		}
		norm := mat.Norm(mat.NewDense(size, size, slices.Clone(a)), 2)
		got, ok := eigenvaluesOf(a, make([]float64, 2*size), size, nil)
		if !ok || len(got) != size {
			t.Fatalf("matrix %d: %v of %d", n, got, size)
		}
		sum := complex(0, 0)
		for _, l := range got {
			sum += l
		}
		if cmplx.Abs(sum-complex(trace, 0)) > 1e-12*norm*float64(size) {
			t.Errorf("matrix %d: sum %v, trace %g", n, sum, trace)
		}
		if worst := strayed(got, want); worst > nearness(n)*norm {
			t.Errorf("matrix %d of %d: off by %g of %g\n%v\n%v", n, size, worst, norm, got, want)
		}
	}
}

// nearness is how close two sets of eigenvalues can be told to be: multiple ones of sparse matrices move with the root of
// the rounding, or more.
func nearness(n int) float64 {
	if n%4 == 2 {
		return 1e-4
	}
	return 1e-10
}

// strayed pairs each value with the nearest one left and gives the greatest distance.
func strayed(a, b []complex128) float64 {
	left, worst := slices.Clone(b), 0.0
	for _, x := range a {
		at := 0
		for k := range left {
			if cmplx.Abs(left[k]-x) < cmplx.Abs(left[at]-x) {
				at = k
			}
		}
		worst = math.Max(worst, cmplx.Abs(left[at]-x))
		left = slices.Delete(left, at, at+1)
	}
	return worst
}

func BenchmarkEigenvalues(b *testing.B) {
	random := rand.New(rand.NewPCG(1, 2))
	const n = 9
	a, work := make([]float64, n*n), make([]float64, n*n)
	for i := range a {
		a[i] = random.NormFloat64()
	}
	b.Run("own", func(b *testing.B) {
		space := make([]float64, 2*n)
		var out []complex128
		for b.Loop() {
			copy(work, a)
			out, _ = eigenvaluesOf(work, space, n, out[:0])
		}
	})
	b.Run("gonum", func(b *testing.B) {
		for b.Loop() {
			var e mat.Eigen
			e.Factorize(mat.NewDense(n, n, a), mat.EigenNone)
			e.Values(nil)
		}
	})
}
