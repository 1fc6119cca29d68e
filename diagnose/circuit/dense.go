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

// apply sets dst[i] = m[i]·x for rows of m that begin a stride apart. Four rows run side by side; each sums as dot
// does, to the last bit.
func apply(dst, m []float64, stride int, x []float64) {
	i := 0
	for ; i+4 <= len(dst); i += 4 {
		four(dst[i:i+4], m[i*stride:], stride, x)
	}
	if i < len(dst) && i > 0 { // the last four once more, which gives the same
		i = len(dst) - 4
		four(dst[i:], m[i*stride:], stride, x)
		return
	}
	for ; i < len(dst); i++ {
		dst[i] = dot(x, m[i*stride:])
	}
}

func four(dst, m []float64, stride int, x []float64) {
	n := len(x)
	a, b, c, d := m[:n], m[stride:][:n], m[2*stride:][:n], m[3*stride:][:n]
	var a0, a1, b0, b1, c0, c1, d0, d1 float64
	k := 0
	for ; k+1 < n; k += 2 {
		p, q := x[k], x[k+1]
		a0 += float64(p * a[k])
		a1 += float64(q * a[k+1])
		b0 += float64(p * b[k])
		b1 += float64(q * b[k+1])
		c0 += float64(p * c[k])
		c1 += float64(q * c[k+1])
		d0 += float64(p * d[k])
		d1 += float64(q * d[k+1])
	}
	if k < n {
		p := x[k]
		a0 += float64(p * a[k])
		b0 += float64(p * b[k])
		c0 += float64(p * c[k])
		d0 += float64(p * d[k])
	}
	dst[0], dst[1], dst[2], dst[3] = a0+a1, b0+b1, c0+c1, d0+d1
}

// addRows adds k[0]·row 0 + k[1]·row 1 ... of m to dst, one after the other.
func addRows(dst, k, m []float64, stride int) {
	w := len(dst)
	i := 0
	for ; i+4 <= len(k); i += 4 {
		k0, k1, k2, k3 := k[i], k[i+1], k[i+2], k[i+3]
		own := m[i*stride:]
		a, b, c, d := own[:w], own[stride:][:w], own[2*stride:][:w], own[3*stride:][:w]
		for j, v := range dst {
			v += float64(k0 * a[j])
			v += float64(k1 * b[j])
			v += float64(k2 * c[j])
			v += float64(k3 * d[j])
			dst[j] = v
		}
	}
	for ; i < len(k); i++ {
		addTo(dst, m[i*stride:][:w], k[i])
	}
}

// solveSPD solves m·x = rhs in place for a symmetric positive definite n×n matrix and w right-hand sides (rhs is n
// rows of width w). The matrix is scaled to a unit diagonal first, so that values of any size may stand side by side; scale
// is space for n factors.
func solveSPD(m, scale []float64, n int, rhs []float64, w int) error {
	for i := range n {
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
		addRows(row(dst, w, i), row(a, n, i), b, w)
	}
}
