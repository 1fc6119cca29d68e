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
	for n := range 20000 {
		size := 1 + n%14
		a := make([]float64, size*size)
		for i := range a {
			a[i] = random.NormFloat64()
			switch n % 5 {
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
		if n%5 == 4 { // rows that follow from others, and rates far apart
			for i := size / 2; i < size; i++ {
				for j := range size {
					a[i*size+j] = a[(i-size/2)*size+j] * math.Pow(10, float64(n%7-3))
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
	switch n % 5 {
	case 2:
		return 3e-3 // five- and sixfold ones
	case 4:
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

// The sixteen states of an opening leg with networks: three rows say the same, and two rates are zero. Its small entries come
// down to the rounding of the large ones and no further, which a sweep must not wait for.
func TestEigenvaluesOfADependentCircuit(t *testing.T) {
	const n = 16
	a := make([]float64, n*n)
	for _, e := range []struct {
		i, j int
		v    float64
	}{
		{0, 0, -102682.39316143202}, {0, 1, -30929.85122095889}, {0, 10, 1124129.3961231136}, {0, 12, -1268740.95735203},
		{1, 0, 30929.851220958877}, {1, 10, -338608.7322734285}, {1, 12, 382168.43063972046}, {2, 2, -4048660260.969883},
		{2, 10, 5803377909.819766}, {2, 12, -6549942800.689794}, {3, 0, 1747180.927196939}, {3, 1, 526283.4695461307},
		{3, 2, 9019914640.007025}, {3, 3, -3355660655.558676}, {3, 5, -299546301.71490264}, {3, 6, 256887289.7927661},
		{3, 10, -12949722230.220232}, {3, 11, -151781717.93744826}, {3, 12, 16183590951.704617}, {3, 14, -139966852.50720426},
		{4, 4, -247912922.5895203}, {5, 3, 159579449.20769832}, {6, 3, -513774579.58553207}, {6, 6, -5315653823.422404},
		{6, 9, 8591962494.699898}, {6, 10, 455214363.9299583}, {6, 12, -513774579.58553207}, {9, 6, 8591962494.6999},
		{9, 9, -13887627366.749899}, {10, 0, 1124129.3961231136}, {10, 1, 338608.7322734285}, {10, 2, 5803377909.819763},
		{10, 3, -1008829318.3571577}, {10, 5, -90054127.15820086}, {10, 6, -165280280.62310416}, {10, 10, -8331800790.645116},
		{10, 11, -440270561.97005445}, {10, 12, 8394800680.152168}, {10, 14, 90054127.15820082}, {11, 10, 268963163.7393587},
		{11, 11, -3952919745.701733}, {11, 15, 698514797.7790979}, {12, 0, -1747180.927196939}, {12, 1, -526283.4695461306},
		{12, 2, -9019914640.007023}, {12, 3, 1567975492.7765236}, {12, 5, 139966852.50720426}, {12, 6, 256887289.79276597},
		{12, 10, 12949722230.22023}, {12, 11, -151781717.93744817}, {12, 12, -17971276114.48677}, {12, 14, 299546301.7149025},
		{13, 13, -247912922.5895203}, {14, 12, -159579449.20769832}, {15, 11, -698514797.7790978}, {15, 15, -2686531.0139557067},
	} {
		a[e.i*n+e.j] = e.v
	}
	var e mat.Eigen
	if !e.Factorize(mat.NewDense(n, n, slices.Clone(a)), mat.EigenNone) {
		t.Fatal("no result to compare with")
	}
	got, ok := eigenvaluesOf(a, make([]float64, 2*n), n, nil)
	if !ok {
		t.Fatal("the sweeps do not end")
	}
	if worst := strayed(got, e.Values(nil)); worst > 1e-3 {
		t.Errorf("off by %g 1/s", worst)
	}
}
