package circuit

import (
	"fmt"
	"math"
	"math/cmplx"
)

const (
	pointsPerRing = 40    // steps per period of the fastest ring that is not damped away at once, for a trace
	pointsToFind  = 16    // the same when only energies, peaks and events are wanted
	pointsAtPeak  = 8     // the same when only peaks and events are wanted, with steps that watch what they miss
	ringDamping   = 0.5   // modes damped more than this do not shorten the step; restarts resolve them
	dampingToFind = 0.8   // the same when only peaks and events are wanted, with steps that grow faster
	dieAway       = 14    // time constants until a ring counts for nothing (1e-6 of its size)
	dieAwayEnergy = 23    // the same when energies are kept (1e-10)
	smallNorm     = 0.5   // rate × step below which the Taylor polynomial is used
	degree        = 15    // of that polynomial: 0.5^16/16! is below the last digit
	lastBit       = 1e-17 // of a sum, relative; what is smaller adds nothing
	mostLevels    = 90    // halvings of the step
	restartSteps  = 4     // steps at each length while the step grows after an event, for a trace
	kinkSteps     = 2     // the same after a mere corner of a waveform
	energySteps   = 6     // the same after both when energies are kept
	gaussPoints   = 5     // per step for energies; the error at 16 points a ring is 1e-13
)

// follow gives the steps per period of a ring, and the damping above which it need not be followed.
func (o *options) follow() (points, damping float64) {
	switch {
	case o.trace:
		return pointsPerRing, ringDamping
	case o.energy:
		return pointsToFind, dampingToFind
	}
	return pointsAtPeak, dampingToFind
}

// pace gives the steps at each length while the step grows after an event, or after a mere corner of a waveform.
func (o *options) pace(corner bool) int {
	switch {
	case o.energy: // the quadrature needs them shorter than the search for events
		return energySteps
	case o.trace && !corner:
		return restartSteps
	case o.quick():
		return 1
	}
	return kinkSteps
}

// quick tells that only peaks and events are wanted: the steps need not be even, nor short enough for a quadrature.
func (o *options) quick() bool { return !o.trace && !o.energy }

// gaussNode and gaussWeight are the Gauss-Legendre nodes and weights on [0, 1].
var (
	gaussNode   = [gaussPoints]float64{0.046910077030668004, 0.23076534494715845, 0.5, 0.7692346550528415, 0.953089922969332}
	gaussWeight = [gaussPoints]float64{0.11846344252809454, 0.23931433524968324, 0.28444444444444444, 0.23931433524968324, 0.11846344252809454}
)

// ring is an oscillation that is not damped away at once.
type ring struct {
	step  float64 // that follows it
	fades float64 // its time constant
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
	bends   int                  // for which the levels have room
	stride  int                  // of their rows
	segment int                  // segment for which the collapsed rows hold
	order   int                  // states, and two for every bent source
	dx      []float64            // collapsed rate: order rows of order+2
	forms   []float64            // forms of the watched quantities
	watch   []float64            // the same collapsed: rows of order+2
	poly    []float64            // Taylor coefficients of the states: degree+1 rows of order
	terms   int                  // of them that count
	scalar  [degree + 1]float64
}

// prepare chooses the step for this pattern and fills the levels; fresh if the levels are new. Span is the time to
// be covered.
func (s *system) prepare(span float64, g *segment, o *options) (fresh bool, err error) {
	v, longest, piece := &s.solver, o.longest, g.till-g.from
	if v.ready && v.holds(g) && (span <= 256*v.levels[0].h || v.levels[0].h > longest/4) {
		return false, nil
	}
	if !v.ready {
		rates, err := s.eigenvalues()
		if err != nil {
			return false, err
		}
		v.survey(rates, o)
	}
	ring := coarse(math.Min(v.fastest(), longest))
	if !o.trace && piece < span/4 && !math.IsInf(ring, 1) && len(g.bends) == 0 {
		ring = fitting(ring, piece)
	}
	h := longestStep(span/16, ring, longest)
	if !(h > 0) || math.IsInf(s.norm*h, 0) {
		return false, fmt.Errorf("circuit: no usable time step (%g s at a rate of %g per second)", h, s.norm)
	}
	count, norm := 0, math.Max(s.norm, g.rate)
	for ; h*norm > smallNorm*math.Exp2(float64(count)); count++ {
		if count == mostLevels {
			return false, fmt.Errorf("circuit: time constants from %g s to %g s are too far apart; leave out the fastest", 1/norm, h)
		}
	}
	v.bends = max(v.bends, len(g.bends))
	v.stride = s.nx + 2*v.bends + 2
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

// holds tells whether the levels can take the bent sources of a segment.
func (v *solver) holds(g *segment) bool {
	return len(g.bends) <= v.bends && v.unit()*g.rate <= smallNorm
}

// survey notes the fastest rate and the rings; a decay needs no bound, since the steps grow with the time after each
// event.
func (v *solver) survey(rates []complex128, o *options) {
	points, damping := o.follow()
	for _, l := range rates {
		size := cmplx.Abs(l)
		v.rate = math.Max(v.rate, size)
		if imag(l) > 0 && -real(l) < damping*size {
			v.rings = append(v.rings, ring{step: 2 * math.Pi / imag(l) / points, fades: 1 / math.Max(-real(l), 0)})
		}
	}
}

// fastest gives the step that follows the fastest ring.
func (v *solver) fastest() float64 {
	step := math.Inf(1)
	for _, r := range v.rings {
		step = math.Min(step, r.step)
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
			r.quiet = dieAwayEnergy * r.fades
		} else {
			r.quiet = dieAway * r.fades
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

// step carries x over one level, starting at τ in the segment.
func (s *system) step(dst, x []float64, l *level, tau float64) {
	n, stride := s.solver.order, s.solver.stride
	apply(dst[:n], l.d, stride, x[:n])
	for i, d := range dst[:n] {
		c := l.d[i*stride+n:]
		dst[i] = x[i] + (d + (c[0] + float64(c[1]*tau)))
	}
}

// unit is the finest step.
func (v *solver) unit() float64 { return v.levels[len(v.levels)-1].h }

// expand fills the Taylor polynomial of the states at τ, in units of the finest step.
func (s *system) expand(x []float64, tau float64) {
	n, v := s.solver.order, &s.solver
	copy(v.poly[:n], x)
	unit := v.unit()
	quiet := 0
	for v.terms = 1; v.terms <= degree && quiet < 2; v.terms++ {
		k := v.terms
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
		quiet++
		for i, d := range to {
			if d != 0 && math.Abs(d) > lastBit*math.Abs(x[i]) {
				quiet = 0
				break
			}
		}
	}
}

// along evaluates the expanded polynomial dt after its start.
func (s *system) along(dst []float64, dt float64) {
	n := s.solver.order
	dt /= s.solver.unit()
	last := s.solver.terms - 1
	copy(dst, row(s.solver.poly, n, last))
	for k := last - 1; k >= 0; k-- {
		for i, c := range row(s.solver.poly, n, k) {
			dst[i] = float64(dst[i]*dt) + c
		}
	}
}
