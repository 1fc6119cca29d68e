package circuit

import "math"

// sweepsEach is how many sweeps an eigenvalue may take.
const sweepsEach = 60

// spectrum finds the eigenvalues of a real matrix: balancing, reduction to Hessenberg form by reflections, then sweeps with
// two shifts at once (Martin, Peters and Wilkinson, Numer. Math. 14, 1970). It works in place.
type spectrum struct {
	a     []float64 // n×n by rows
	work  []float64
	n     int
	last  int     // of the rows that are left
	moved float64 // by shifts out of turn
	norm  float64
	out   []complex128
}

// eigenvaluesOf appends the n eigenvalues of a to out, conjugate pairs side by side; false if a sweep does not come to an
// end. It leaves its own in a, and needs 2n numbers to work with.
func eigenvaluesOf(a, work []float64, n int, out []complex128) ([]complex128, bool) {
	clear(work)
	s := spectrum{a: a, work: work, n: n, last: n - 1, out: out}
	s.balance()
	s.reflect()
	for i := range n {
		for j := max(i-1, 0); j < n; j++ {
			s.norm += math.Abs(s.row(i)[j])
		}
	}
	for s.last >= 0 {
		if !s.next() {
			return s.out, false
		}
	}
	return s.out, true
}

func (s *spectrum) row(i int) []float64 { return row(s.a, s.n, i) }

// balance scales rows and columns by powers of two until they are of like size.
func (s *spectrum) balance() {
	for again := true; again; {
		again = false
		for i := range s.n {
			across, down := 0.0, 0.0
			for j := range s.n {
				if j != i {
					across += math.Abs(s.a[i*s.n+j])
					down += math.Abs(s.a[j*s.n+i])
				}
			}
			if across == 0 || down == 0 {
				continue
			}
			_, e := math.Frexp(math.Sqrt(across / down))
			f := math.Ldexp(1, e-1)
			if float64(down*f)+across/f >= 0.95*(down+across) {
				continue
			}
			again = true
			for j := range s.n {
				s.a[i*s.n+j] /= f
			}
			for j := range s.n {
				s.a[j*s.n+i] *= f
			}
		}
	}
}

// reflect brings the matrix to Hessenberg form.
func (s *spectrum) reflect() {
	n := s.n
	v, sums := s.work[:n], s.work[n:2*n]
	for k := range n - 2 {
		size, most := 0.0, 0.0
		for i := k + 2; i < n; i++ {
			most = math.Max(most, math.Abs(s.a[i*n+k]))
		}
		if most == 0 {
			continue
		}
		most = math.Max(most, math.Abs(s.a[(k+1)*n+k]))
		for i := k + 1; i < n; i++ {
			v[i] = s.a[i*n+k] / most
			size += float64(v[i] * v[i])
		}
		alpha := -math.Copysign(math.Sqrt(size), v[k+1])
		scale := size - float64(alpha*v[k+1]) // half of v·v
		v[k+1] -= alpha
		s.fromLeft(v, sums, k, scale)
		s.fromRight(v, k, scale)
		for i := k + 2; i < n; i++ {
			s.a[i*n+k] = 0
		}
	}
}

// fromLeft applies a reflection to the columns from k on.
func (s *spectrum) fromLeft(v, sums []float64, k int, scale float64) {
	clear(sums)
	for i := k + 1; i < s.n; i++ {
		addTo(sums[k:], s.row(i)[k:], v[i])
	}
	for i := k + 1; i < s.n; i++ {
		addTo(s.row(i)[k:], sums[k:], -v[i]/scale)
	}
}

// fromRight applies it to all rows.
func (s *spectrum) fromRight(v []float64, k int, scale float64) {
	for i := range s.n {
		r := s.row(i)[k+1:]
		addTo(r, v[k+1:], -dot(r, v[k+1:])/scale)
	}
}

// next sweeps until one or two eigenvalues have come off the end.
func (s *spectrum) next() bool {
	for turn := 1; turn <= sweepsEach; turn++ {
		switch first := s.split(); s.last - first {
		case 0:
			s.out = append(s.out, complex(s.a[s.last*s.n+s.last]+s.moved, 0))
			s.last--
			return true
		case 1:
			s.pair()
			return true
		default:
			s.sweep(first, turn)
		}
	}
	return false
}

// split gives where the last block begins that hangs together.
func (s *spectrum) split() int {
	l := s.last
	for ; l > 0; l-- {
		size := math.Abs(s.a[(l-1)*s.n+l-1]) + math.Abs(s.a[l*s.n+l])
		if size == 0 {
			size = s.norm
		}
		if off := math.Abs(s.a[l*s.n+l-1]); off+size == size || off <= lastBit*s.norm {
			s.a[l*s.n+l-1] = 0
			break
		}
	}
	return l
}

// pair takes off the eigenvalues of the last block of two.
func (s *spectrum) pair() {
	k := s.last
	x, w := s.a[k*s.n+k], float64(s.a[k*s.n+k-1]*s.a[(k-1)*s.n+k])
	p := float64(0.5 * (s.a[(k-1)*s.n+k-1] - x))
	q := float64(p*p) + w
	z := math.Sqrt(math.Abs(q))
	x += s.moved
	s.last -= 2
	if q < 0 {
		s.out = append(s.out, complex(x+p, z), complex(x+p, -z))
		return
	}
	z = p + math.Copysign(z, p)
	other := x + z
	if z != 0 {
		other = x - w/z
	}
	s.out = append(s.out, complex(x+z, 0), complex(other, 0))
}

// shifts gives sum parts and product of the two shifts; every tenth sweep they are out of turn.
func (s *spectrum) shifts(turn int) (x, y, w float64) {
	k, n := s.last, s.n
	x, y = s.a[k*n+k], s.a[(k-1)*n+k-1]
	w = float64(s.a[k*n+k-1] * s.a[(k-1)*n+k])
	if turn%10 != 0 {
		return x, y, w
	}
	s.moved += x
	for i := range k + 1 {
		s.a[i*n+i] -= x
	}
	size := math.Abs(s.a[k*n+k-1]) + math.Abs(s.a[(k-1)*n+k-2])
	return float64(0.75 * size), float64(0.75 * size), float64(-0.4375 * size * size)
}

// sweep chases the bulge of a double shift from its start down to the last row.
func (s *spectrum) sweep(first, turn int) {
	x, y, w := s.shifts(turn)
	n := s.n
	m, p, q, r := s.start(first, x, y, w)
	for i := m + 2; i <= s.last; i++ {
		s.a[i*n+i-2] = 0
		if i > m+2 {
			s.a[i*n+i-3] = 0
		}
	}
	for k := m; k < s.last; k++ {
		size := 1.0
		if k > m {
			p, q, r = s.a[k*n+k-1], s.a[(k+1)*n+k-1], 0
			if k < s.last-1 {
				r = s.a[(k+2)*n+k-1]
			}
			if size = math.Abs(p) + math.Abs(q) + math.Abs(r); size == 0 {
				continue
			}
			p, q, r = p/size, q/size, r/size
		}
		along := math.Copysign(math.Sqrt(float64(p*p)+float64(q*q)+float64(r*r)), p)
		if along == 0 {
			continue
		}
		if k > m {
			s.a[k*n+k-1] = -along * size
		} else if first != m {
			s.a[k*n+k-1] = -s.a[k*n+k-1]
		}
		s.chase(first, k, p, q, r, along)
	}
}

// start gives where a sweep may begin, two small entries in a row, and the first column of the double shift there.
func (s *spectrum) start(first int, x, y, w float64) (m int, p, q, r float64) {
	n := s.n
	for m = s.last - 2; ; m-- {
		z := s.a[m*n+m]
		a, b := x-z, y-z
		p = (float64(a*b)-w)/s.a[(m+1)*n+m] + s.a[m*n+m+1]
		q = s.a[(m+1)*n+m+1] - z - a - b
		r = s.a[(m+2)*n+m+1]
		size := math.Abs(p) + math.Abs(q) + math.Abs(r)
		p, q, r = p/size, q/size, r/size
		if m == first {
			return m, p, q, r
		}
		small := float64(math.Abs(s.a[m*n+m-1]) * (math.Abs(q) + math.Abs(r)))
		large := float64(math.Abs(p) * (math.Abs(s.a[(m-1)*n+m-1]) + math.Abs(z) + math.Abs(s.a[(m+1)*n+m+1])))
		if small+large == large {
			return m, p, q, r
		}
	}
}

// chase applies one reflection of a sweep to rows and columns from k to k+2.
func (s *spectrum) chase(first, k int, p, q, r, along float64) {
	n, three := s.n, k < s.last-1
	p += along
	x, y, z := p/along, q/along, r/along
	q, r = q/p, r/p
	one, two := s.row(k)[k:s.last+1], s.row(k + 1)[k:s.last+1]
	last := s.work[:len(one)] // nothing, for the last reflection of a sweep
	if three {
		last = s.row(k + 2)[k : s.last+1]
	} else {
		r, z = 0, 0
	}
	two, last = two[:len(one)], last[:len(one)]
	for j := range one {
		sum := one[j] + float64(q*two[j]) + float64(r*last[j])
		last[j] -= float64(sum * z)
		two[j] -= float64(sum * y)
		one[j] -= float64(sum * x)
	}
	for i := first; i <= min(s.last, k+3); i++ {
		e := s.a[i*n+k:]
		sum := float64(x*e[0]) + float64(y*e[1])
		if three {
			sum += float64(z * e[2])
			e[2] -= float64(sum * r)
		}
		e[1] -= float64(sum * q)
		e[0] -= sum
	}
}
