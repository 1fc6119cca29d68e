package circuit

import "math"

// level carries the states over one step length: x becomes x + d·y with y = [states | deviations of the bent sources |
// 1 | τ]. The change d is kept instead of the full matrix since doubling it loses nothing of the slow modes. The columns
// of the states hold for the pattern, the others for a segment. Rows are a stride apart.
type level struct {
	h       float64
	d       []float64
	segment int // whose columns are there
}

// chain gives the levels h, h/2 ... h/2^count, the last by Taylor series; fill makes the others.
func (s *system) chain(h float64, count int) []level {
	list := s.room.levels.take(count + 1)
	for k := range list {
		list[k] = level{h: math.Ldexp(h, -k), segment: -1}
	}
	s.furnish(&list[count])
	s.taylor(&list[count])
	return list
}

// furnish gives a level its space.
func (s *system) furnish(l *level) {
	l.d = s.room.take((s.nx + 2*s.solver.bends) * s.solver.stride)
}

// fill makes the levels down to l by doubling, those that were not needed before, and their columns for a segment.
func (s *system) fill(l int, g *segment) {
	v := &s.solver
	for ; v.filled > l; v.filled-- {
		s.double(&v.levels[v.filled-1], &v.levels[v.filled])
		for g := range v.gauss {
			if chain := v.gauss[g]; chain != nil {
				s.double(&chain[v.filled-1], &chain[v.filled])
			}
		}
	}
	if v.levels[l].segment != g.id {
		s.drive(v.levels, l, g)
		for k := range v.gauss {
			if chain := v.gauss[k]; chain != nil {
				s.drive(chain, l, g)
			}
		}
	}
}

// taylor fills the columns of the states of a level from the series of A·∫exp(A·t)dt over the step, by Horner's rule in
// the fourth power (Paterson and Stockmeyer 1973, from memory).
func (s *system) taylor(l *level) {
	n := s.nx
	var power [5][]float64
	for k := range power {
		power[k] = s.room.take(n * n)
	}
	for i := range n {
		for j, a := range row(s.rate, s.width, i)[:n] {
			power[1][i*n+j] = a * l.h
		}
	}
	for k := 2; k < len(power); k++ {
		multiply(power[k], power[k-1], power[1], n, n)
	}
	sum, next := power[0], s.room.take(n*n)
	addTo(sum, power[4], inverseFactorial[16])
	for k := 12; k >= 0; k -= 4 {
		for j := 1; j < 4; j++ {
			addTo(sum, power[j], inverseFactorial[k+j])
		}
		if k == 0 {
			break
		}
		for i := range n {
			sum[i*n+i] += inverseFactorial[k]
		}
		multiply(next, sum, power[4], n, n)
		sum, next = next, sum
	}
	for i := range n {
		copy(row(l.d, s.solver.stride, i), row(sum, n, i))
	}
}

// inverseFactorial holds 1/k!.
var inverseFactorial = func() (f [17]float64) {
	f[0] = 1
	for k, product := 1, 1.0; k < len(f); k++ {
		product *= float64(k)
		f[k] = 1 / product
	}
	return f
}()

// double fills the columns of the states of a level from the one of half its length: d2 = 2d + d·d.
func (s *system) double(long, short *level) {
	n, stride := s.nx, s.solver.stride
	s.furnish(long)
	for i := range n {
		dst, src := row(long.d, stride, i)[:n], row(short.d, stride, i)[:n]
		for j, v := range src {
			dst[j] = 2 * v
		}
		addRows(dst, src, short.d, stride)
	}
}

// drive makes the columns of a segment on the levels from the last to l, those that are not there.
func (s *system) drive(levels []level, l int, g *segment) {
	last := len(levels) - 1
	if levels[last].segment != g.id {
		s.driveLast(&levels[last], g)
	}
	from := l
	for levels[from].segment != g.id {
		from++
	}
	for ; from > l; from-- {
		s.driveOn(&levels[from-1], &levels[from])
	}
}

// driveLast makes them on the finest level by their Taylor series: every term is the generator times the one before.
func (s *system) driveLast(l *level, g *segment) {
	v := &s.solver
	n, w := v.order, v.order+2
	term := v.poly[:2*n]
	for j := s.nx; j < w; j++ {
		now, next := term[:n], term[n:]
		for i := range n {
			now[i] = v.dx[i*w+j] * l.h
			l.d[i*v.stride+j] = now[i]
		}
		for k, quiet := 2, 0; k <= degree+2 && quiet < 2; k++ {
			apply(next, v.dx, w, now)
			quiet++
			for i := range n {
				if j == n && k == 2 { // the time has moved on
					next[i] += float64(v.dx[i*w+n+1] * l.h)
				}
				next[i] = float64(next[i] * l.h / float64(k))
				sum := &l.d[i*v.stride+j]
				if next[i] != 0 && math.Abs(next[i]) > lastBit*math.Abs(*sum) {
					quiet = 0 // two terms that add nothing, and so do those to come
				}
				*sum += next[i]
			}
			now, next = next, now
		}
	}
	l.segment = g.id
}

// driveOn makes them from the level of half its length, on which the time has moved on too.
func (s *system) driveOn(long, short *level) {
	v := &s.solver
	n, w := v.order, v.order+2
	for i := range n {
		dst, src := row(long.d, v.stride, i), row(short.d, v.stride, i)
		for j := s.nx; j < w; j++ {
			dst[j] = 2 * src[j]
		}
		dst[n] += float64(src[n+1] * short.h)
		addRows(dst[s.nx:w], src[:n], short.d[s.nx:], v.stride)
	}
	long.segment = short.segment
}
