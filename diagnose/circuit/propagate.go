package circuit

import (
	"fmt"
	"math"
	"math/cmplx"
)

const (
	pointsPerRing = 40  // steps per period of the fastest ring that is not damped away at once, for a trace
	pointsToFind  = 16  // the same when only peaks and events are wanted
	ringDamping   = 0.5 // modes damped more than this do not shorten the step; restarts resolve them
	dampingToFind = 0.8 // the same when only peaks and events are wanted, with steps that grow faster
	dieAway       = 14  // time constants until a ring counts for nothing (1e-6 of its size)
	dieAwayEnergy = 23  // the same when energies are kept (1e-10)
	smallNorm     = 0.5 // rate × step below which the Taylor polynomial is used
	degree        = 15  // of that polynomial: 0.5^16/16! is below the last digit
	mostLevels    = 90  // halvings of the step
	restartSteps  = 4   // steps at each length while the step grows after an event, for a trace
	kinkSteps     = 2   // the same after a mere corner of a waveform
	energySteps   = 6   // the same after both when energies are kept
	gaussPoints   = 5   // per step for energies; the error at 16 points a ring is 1e-13
)

// follow gives the steps per period of a ring, and the damping above which it need not be followed.
func (o *options) follow() (points, damping float64) {
	if o.trace {
		return pointsPerRing, ringDamping
	}
	return pointsToFind, dampingToFind
}

// pace gives the steps at each length while the step grows after an event, or after a mere corner of a waveform.
func (o *options) pace(corner bool) int {
	switch {
	case o.energy: // the quadrature needs them shorter than the search for events
		return energySteps
	case o.trace && !corner:
		return restartSteps
	}
	return kinkSteps
}

// gaussNode and gaussWeight are the Gauss-Legendre nodes and weights on [0, 1].
var (
	gaussNode   = [gaussPoints]float64{0.046910077030668004, 0.23076534494715845, 0.5, 0.7692346550528415, 0.953089922969332}
	gaussWeight = [gaussPoints]float64{0.11846344252809454, 0.23931433524968324, 0.28444444444444444, 0.23931433524968324, 0.11846344252809454}
)

// level carries the states over one step length: x becomes x + d·y. The change d is kept instead of the full
// matrix since doubling it loses nothing of the slow modes.
type level struct {
	h       float64
	d       []float64 // nx rows of the full width
	c0, c1  []float64 // d applied to the sources of the present segment: c0 + c1·τ
	segment int
}

// ring is an oscillation that is not damped away at once.
type ring struct {
	step  float64 // that follows it
	level int     // with such a step
	quiet float64 // time after an event until it has died away
}

// solver is the part of a system that time stepping needs; it is made on the first step.
type solver struct {
	ready   bool
	rate    float64 // of the fastest mode
	rings   []ring
	levels  []level              // steps h, h/2, h/4 ...
	filled  int                  // levels from here on are made
	gauss   [gaussPoints][]level // the same steps ended at the Gauss nodes
	grade   int                  // level at which a restart begins
	segment int                  // segment for which the collapsed rows hold
	dx      []float64            // collapsed rate: nx rows of nx+2
	forms   []float64            // forms of the watched quantities
	watch   []float64            // the same collapsed: rows of nx+2
	work    []float64
	poly    []float64 // Taylor coefficients of the states: degree+1 rows of nx
	scalar  [degree + 1]float64
}

// prepare chooses the step for this pattern and fills the levels; fresh if the levels are new. Span is the time to
// be covered, piece the length of the present straight piece of the waveforms.
func (s *system) prepare(span, piece float64, o *options) (fresh bool, err error) {
	v, longest := &s.solver, o.longest
	if v.ready && (span <= 256*v.levels[0].h || v.levels[0].h > longest/4) {
		return false, nil
	}
	rates, err := s.eigenvalues()
	if err != nil {
		return false, err
	}
	ring := coarse(math.Min(v.survey(rates, o), longest))
	if !o.trace && piece < span/4 && !math.IsInf(ring, 1) {
		ring = fitting(ring, piece)
	}
	h := longestStep(span/16, ring, longest)
	if !(h > 0) || math.IsInf(s.norm*h, 0) {
		return false, fmt.Errorf("circuit: no usable time step (%g s at a rate of %g per second)", h, s.norm)
	}
	count := 0
	for ; h*s.norm > smallNorm*math.Exp2(float64(count)); count++ {
		if count == mostLevels {
			return false, fmt.Errorf("circuit: time constants from %g s to %g s are too far apart; leave out the fastest", 1/s.norm, h)
		}
	}
	v.levels, v.filled = s.chain(h, count), count
	if o.energy {
		for g, c := range gaussNode {
			v.gauss[g] = s.chain(c*h, count)
		}
	}
	v.holdBack(o.energy)
	for v.grade < count && v.levels[v.grade].h*v.rate > smallNorm/2 {
		v.grade++
	}
	v.ready = true
	return true, nil
}

// survey notes the fastest rate and the rings, and gives the step that follows the fastest ring; a decay needs no
// bound, since the steps grow with the time after each event.
func (v *solver) survey(rates []complex128, o *options) (step float64) {
	points, damping := o.follow()
	step, v.rate, v.rings = math.Inf(1), 0, v.rings[:0]
	for _, l := range rates {
		size := cmplx.Abs(l)
		v.rate = math.Max(v.rate, size)
		if imag(l) > 0 && -real(l) < damping*size {
			r := ring{step: 2 * math.Pi / imag(l) / points, quiet: 1 / math.Max(-real(l), 0)}
			v.rings = append(v.rings, r)
			step = math.Min(step, r.step)
		}
	}
	return step
}

// holdBack gives every ring the level that follows it, and the time until it has died away.
func (v *solver) holdBack(energy bool) {
	v.grade = 0
	for k := range v.rings {
		r := &v.rings[k]
		r.level = 0
		for r.level < len(v.levels)-1 && v.levels[r.level].h > r.step*(1+1e-9) {
			r.level++
		}
		if energy {
			r.quiet *= dieAwayEnergy
		} else {
			r.quiet *= dieAway
		}
		v.grade = max(v.grade, r.level)
	}
}

// longestStep gives a step near the one wanted: the ring's step doubled as often as fits, so that halving leads to it.
func longestStep(want, ring, longest float64) float64 {
	if math.IsInf(ring, 1) {
		return coarse(want)
	}
	for ring < want && ring < longest/2 {
		ring *= 2
	}
	return ring
}

// fitting gives the longest step up to the one wanted that halvings of the piece lead to: waveforms tend to have many
// pieces of one length, and such steps end where they end.
func fitting(want, piece float64) float64 {
	for piece > want {
		piece /= 2
	}
	if piece < want/2 {
		return want
	}
	return piece
}

// coarse rounds a step down to six binary digits, so that the last digit of an eigenvalue cannot move it.
func coarse(h float64) float64 {
	if math.IsInf(h, 0) {
		return h
	}
	f, e := math.Frexp(h)
	return math.Ldexp(math.Floor(f*64)/64, e)
}

// balancedNorm is the larger of the row and column sums of the scaled state matrix: no mode is faster.
func (s *system) balancedNorm() float64 {
	a := s.scaled()
	best := 0.0
	for i := range s.nx {
		across, down := 0.0, 0.0
		for j := range s.nx {
			across += math.Abs(a[i*s.nx+j])
			down += math.Abs(a[j*s.nx+i])
		}
		best = math.Max(best, math.Max(across, down))
	}
	return best
}

// chain gives the levels h, h/2 ... h/2^count, the last by Taylor series; fill makes the others.
func (s *system) chain(h float64, count int) []level {
	list := make([]level, count+1)
	for k := range list {
		list[k] = level{h: math.Ldexp(h, -k), segment: -1}
	}
	s.furnish(&list[count])
	s.taylor(&list[count])
	return list
}

// furnish gives a level its space.
func (s *system) furnish(l *level) {
	l.d, l.c0, l.c1 = s.room.take(s.nx*s.width), s.room.take(s.nx), s.room.take(s.nx)
}

// fill makes the levels down to l by doubling, those that were not needed before.
func (s *system) fill(l int) {
	v := &s.solver
	for ; v.filled > l; v.filled-- {
		s.double(&v.levels[v.filled-1], &v.levels[v.filled])
		for g := range v.gauss {
			if chain := v.gauss[g]; chain != nil {
				s.double(&chain[v.filled-1], &chain[v.filled])
			}
		}
	}
}

// taylor fills a level from the series of the two integrals of the matrix exponential:
// φ1 = ∫exp(A·t)dt and φ2 = ∫φ1 dt over the step, d = [A·φ1 | φ1·B | φ1·S + φ2·B | φ1·b].
func (s *system) taylor(l *level) {
	n := s.nx
	a, p, q := s.room.take(n*n), s.room.take(n*n), s.room.take(n*n)
	phi1, phi2 := s.room.take(n*n), s.room.take(n*n)
	for i := range n {
		copy(row(a, n, i), row(s.rate, s.width, i)[:n])
		p[i*n+i] = l.h
	}
	for k := 1; k <= degree+1; k++ { // p = A^(k-1)·h^k/k!
		addTo(phi1, p, 1)
		addTo(phi2, p, l.h/float64(k+1))
		multiply(q, a, p, n, n)
		for i := range q {
			q[i] *= l.h / float64(k+1)
		}
		p, q = q, p
	}
	multiply(l.d, phi1, s.rate, n, s.width)
	for i := range n {
		for k := range n {
			addTo(row(l.d, s.width, i)[n+s.nu:n+2*s.nu], row(s.rate, s.width, k)[n:n+s.nu], phi2[i*n+k])
		}
	}
}

// double fills a level from the one of half its length: d2 = 2d + d·d, where the sources have moved on by slope·h.
func (s *system) double(long, short *level) {
	n := s.nx
	s.furnish(long)
	for i := range n {
		dst, src := row(long.d, s.width, i), row(short.d, s.width, i)
		for j, v := range src {
			dst[j] = 2 * v
		}
		addRows(dst, src[:n], short.d, s.width)
		addTo(dst[n+s.nu:n+2*s.nu], src[n:n+s.nu], short.h)
	}
}

// segment is a stretch of time over which every source is a straight line.
type segment struct {
	id         int
	from, till float64
	value      []float64 // at from
	slope      []float64
}

// collapse gives a form over [states | 1 | τ] for a segment; dst has nx+2 places.
func (s *system) collapse(dst, form []float64, g *segment) {
	n := s.nx
	copy(dst, form[:n])
	u := form[n : n+s.nu]
	dst[n] = dot(u, g.value) + dot(form[n+s.nu:n+2*s.nu], g.slope) + form[s.width-1]
	dst[n+1] = dot(u, g.slope)
}

// collapseLevel applies the sources of a segment to a level.
func (s *system) collapseLevel(l *level, g *segment) {
	for i := range s.nx {
		s.collapse(s.solver.work, row(l.d, s.width, i), g)
		l.c0[i], l.c1[i] = s.solver.work[s.nx], s.solver.work[s.nx+1]
	}
	l.segment = g.id
}

// step carries x over one level, starting at τ in the segment.
func (s *system) step(dst, x []float64, l *level, g *segment, tau float64) {
	if l.segment != g.id {
		s.collapseLevel(l, g)
	}
	apply(dst[:s.nx], l.d, s.width, x)
	for i, d := range dst[:s.nx] {
		dst[i] = x[i] + (d + (l.c0[i] + float64(l.c1[i]*tau)))
	}
}

// unit is the finest step.
func (v *solver) unit() float64 { return v.levels[len(v.levels)-1].h }

// expand fills the Taylor polynomial of the states at τ, in units of the finest step.
func (s *system) expand(x []float64, tau float64) {
	n, v := s.nx, &s.solver
	copy(v.poly[:n], x)
	unit := v.unit()
	for k := 1; k <= degree; k++ {
		to := row(v.poly, n, k)
		apply(to, v.dx, n+2, row(v.poly, n, k-1))
		for i, d := range to {
			f := row(v.dx, n+2, i)
			if k == 1 {
				d += f[n] + float64(f[n+1]*tau)
			} else if k == 2 {
				d += float64(f[n+1] * unit)
			}
			to[i] = d * unit / float64(k)
		}
	}
}

// along evaluates the expanded polynomial dt after its start.
func (s *system) along(dst []float64, dt float64) {
	n := s.nx
	dt /= s.solver.unit()
	copy(dst, row(s.solver.poly, n, degree))
	for k := degree - 1; k >= 0; k-- {
		for i, c := range row(s.solver.poly, n, k) {
			dst[i] = float64(dst[i]*dt) + c
		}
	}
}
