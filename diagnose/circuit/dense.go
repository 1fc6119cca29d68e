package circuit

import (
	"errors"
	"math"
)

var errSingular = errors.New("nearly singular equations")

// leastPivot is the smallest pivot, after scaling to a unit diagonal, that still counts as independent.
const leastPivot = 1e-14

// row gives row i of a matrix stored by rows of width w.
func row(m []float64, w, i int) []float64 { return m[i*w : (i+1)*w : (i+1)*w] }

// addTo adds k·src to dst.
func addTo(dst, src []float64, k float64) {
	for i, v := range src {
		dst[i] += float64(k * v)
	}
}

// dot is the inner product over the length of a. Two sums run side by side, which is faster than one.
func dot(a, b []float64) float64 {
	b = b[:len(a)]
	even, odd := 0.0, 0.0
	k := 0
	for ; k+1 < len(a); k += 2 {
		even += float64(a[k] * b[k])
		odd += float64(a[k+1] * b[k+1])
	}
	if k < len(a) {
		even += float64(a[k] * b[k])
	}
	return even + odd
}

// solveSPD solves m·x = rhs in place for a symmetric positive definite n×n matrix and w right-hand sides (rhs is n
// rows of width w). The matrix is scaled to a unit diagonal first, so that values of any size may stand side by side.
func solveSPD(m []float64, n int, rhs []float64, w int) error {
	scale := make([]float64, n)
	for i := range scale {
		d := m[i*n+i]
		if !(d > 0) || math.IsInf(d, 0) {
			return errSingular
		}
		scale[i] = 1 / math.Sqrt(d)
	}
	for i := range n {
		for j := range n {
			m[i*n+j] *= float64(scale[i] * scale[j])
		}
		for j := range w {
			rhs[i*w+j] *= scale[i]
		}
	}
	if err := cholesky(m, n); err != nil {
		return err
	}
	substitute(m, n, rhs, w)
	for i := range n {
		for j := range w {
			rhs[i*w+j] *= scale[i]
		}
	}
	return nil
}

// cholesky puts the lower factor of m into its lower half.
func cholesky(m []float64, n int) error {
	for j := range n {
		for i := j; i < n; i++ {
			s := m[i*n+j]
			for k := range j {
				s -= float64(m[i*n+k] * m[j*n+k])
			}
			if i > j {
				m[i*n+j] = s / m[j*n+j]
				continue
			}
			if !(s > leastPivot) {
				return errSingular
			}
			m[j*n+j] = math.Sqrt(s)
		}
	}
	return nil
}

// substitute solves with the lower factor l of a Cholesky decomposition, forwards then backwards.
func substitute(l []float64, n int, rhs []float64, w int) {
	for i := range n {
		for k := range i {
			addTo(row(rhs, w, i), row(rhs, w, k), -l[i*n+k])
		}
		divide(row(rhs, w, i), l[i*n+i])
	}
	for i := n - 1; i >= 0; i-- {
		for k := i + 1; k < n; k++ {
			addTo(row(rhs, w, i), row(rhs, w, k), -l[k*n+i])
		}
		divide(row(rhs, w, i), l[i*n+i])
	}
}

func divide(v []float64, d float64) {
	for i := range v {
		v[i] /= d
	}
}

// multiply sets dst = a·b for a n×n and b n×w.
func multiply(dst, a, b []float64, n, w int) {
	clear(dst)
	for i := range n {
		for k := range n {
			addTo(row(dst, w, i), row(b, w, k), a[i*n+k])
		}
	}
}
