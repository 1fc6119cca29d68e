package circuit

import (
	"fmt"
	"math"
)

// dipGuard is what is added to the depth of a dip that the rates at both ends of a step tell.
const dipGuard = 0.05

// roughBy is how far, relative to the scale of the circuit, a watched quantity may end from where the mean of its rates at
// both ends of a step would take it; at 8 points a ring that is 4 % of the ring. A cubic through both ends is then close.
const roughBy = 0.04

// rateRounding is what rounding leaves of a rate, relative to the fastest rate of the circuit.
const rateRounding = 1e-14

// sightShare is the share of a step up to which the estimate of a crossing inside it is trusted.
const sightShare = 512

// stop is the level at which To ends early.
type stop struct {
	watch      int // -1: none
	level      float64
	armed, hit bool
}

// heights are what of a watch must stay above least: its height and the rate of that at both ends of the step tried.
type heights struct{ a, da, b, db, least float64 }

// ends gives the heights of a watch; false if nobody asks for it.
func (r *Run) ends(k int) (h heights, asked bool) {
	w := &r.watch[k]
	if w.isDiode {
		return heights{w.now, w.rate, w.then, w.rateThen, -w.tol}, true
	}
	if k != r.stop.watch || !r.stop.armed {
		return h, false
	}
	return heights{r.stop.level - w.now, -w.rate, r.stop.level - w.then, -w.rateThen, 0}, true
}

// crosses tells whether the height falls to the least, or dips and comes back, which is seen from the rates.
func (h *heights) crosses(dt float64) bool {
	return h.b <= h.least || h.da < 0 && h.db > 0 && dip(h.a, h.da, h.b, h.db, dt) < h.least
}

// rough tells whether a step is too long for what it passes over, and notes how rough it is.
func (r *Run) rough(dt float64) bool {
	r.defect = 0
	for k := range r.watch {
		w := &r.watch[k]
		miss := math.Abs(w.then - w.now - float64(0.5*dt*(w.rate+w.rateThen)))
		if size := r.scale(w); miss > r.defect*size {
			r.defect = miss / size
		}
	}
	r.defect -= float64(rateRounding * r.sys.norm * dt)
	return r.defect > roughBy
}

// scale is the size of what a watch measures; a probe takes in what it has seen.
func (r *Run) scale(w *watch) float64 {
	size := r.volts
	switch {
	case w.isSlope:
		size = 0
	case w.isCurrent || w.isDiode && w.conducts:
		size = r.amps
	}
	if w.isDiode {
		return size + math.SmallestNonzeroFloat64
	}
	return math.Max(size, math.Max(math.Abs(w.top.V), math.Abs(w.low.V))) + math.SmallestNonzeroFloat64
}

// trouble tells whether a diode switches, or the stop level is reached, within the step tried.
func (r *Run) trouble(dt float64) bool {
	for k := range r.watch {
		if h, asked := r.ends(k); asked && h.crosses(dt) {
			return true
		}
	}
	return false
}

// aim notes about when the first crossing within the step tried comes, so that the steps to it can be chosen; nothing
// if there are only dips.
func (r *Run) aim(dt float64) {
	first := 2.0
	for k := range r.watch {
		h, asked := r.ends(k)
		if !asked || h.b > h.least {
			continue
		}
		first = math.Min(first, cubic(h.a-h.least, float64(h.da*dt), h.b-h.least, float64(h.db*dt)).crossing())
	}
	if r.goal = 0; first < 2 {
		r.goal, r.sight = r.tau+float64(first*dt), dt/sightShare
	}
}

// third is a cubic on [0, 1] by its coefficients.
type third [4]float64

// cubic gives the one through a and b with slopes da and db there.
func cubic(a, da, b, db float64) third {
	rise, twice := b-a, da+da
	double := rise + rise
	return third{a, da, double + rise - twice - db, da + db - double}
}

func (p third) at(t float64) float64 {
	return p[0] + float64(t*(p[1]+float64(t*(p[2]+float64(t*p[3])))))
}

// crossing gives about where the cubic, positive at 0 and not at 1, gets to zero.
func (p third) crossing() float64 {
	low, high := 0.0, 1.0
	for range 12 {
		if mid := 0.5 * (low + high); p.at(mid) > 0 {
			low = mid
		} else {
			high = mid
		}
	}
	return low
}

// dip gives a height that a curve with falling slope da at its start a and rising slope db at its end b does not go
// below within dt: the least value of the cubic through both ends, and a share of its depth for what the cubic misses
// (of a ring followed at 8 points a period, 1e-3 of its size).
func dip(a, da, b, db, dt float64) float64 {
	p := cubic(a, float64(da*dt), b, float64(db*dt))
	bottom := -p[1] / (p[2] + math.Sqrt(math.Max(0, float64(p[2]*p[2])-float64(3*p[3]*p[1]))))
	least := p.at(bottom)
	return least - float64(dipGuard*(math.Min(a, b)-least))
}

// event goes to the first switching point within a step of the finest length and switches, or stops there.
func (r *Run) event(dt float64) (stopped bool, err error) {
	s := r.sys
	s.expand(r.x, r.tau)
	first, who := dt, -1
	for k := range r.watch {
		w := &r.watch[k]
		if h, asked := r.ends(k); !asked || !h.crosses(dt) {
			continue
		}
		p := s.polynomial(k, r.tau)
		if w.isDiode {
			p[0] += w.tol
		} else {
			for i := range p {
				p[i] = -p[i]
			}
			p[0] += r.stop.level
		}
		unit := s.solver.unit()
		if at, found := firstRoot(p, first/unit); found && (who < 0 || at*unit < first) {
			first, who = at*unit, k
		}
	}
	if who < 0 { // a near miss that the rates could not rule out
		return false, r.accept(dt, r.retry(dt), r.tau+dt)
	}
	r.retry(first)
	if err := r.accept(first, -1, r.tau+first); err != nil {
		return false, err
	}
	if !r.watch[who].isDiode {
		r.stop.hit = true
		return true, nil
	}
	if err := r.headway(who); err != nil {
		return false, err
	}
	r.flush()
	r.keep()
	err = r.settle(r.c.branches[r.watch[who].branch].index)
	return r.stop.hit, err
}

// retry computes the step anew from the expanded polynomial and returns the level that says so.
func (r *Run) retry(dt float64) int {
	r.sys.along(r.next, dt)
	r.look(r.next, r.tau+dt)
	return -1
}

// headway ends a run in which diodes switch again and again at one moment.
func (r *Run) headway(who int) error {
	if now := r.Time(); now-r.crowd.since > 1e-6*r.sys.solver.levels[0].h {
		r.crowd = crowd{since: now}
	}
	if r.crowd.count++; r.crowd.count > mostCrowd {
		return fmt.Errorf("circuit: diode %q chatters at %g s; give it some resistance, or the node beside it a small capacitance",
			r.c.branches[r.watch[who].branch].name, r.Time())
	}
	return nil
}

// polynomial gives a watched quantity as a polynomial of the time after τ in units of the finest step.
func (s *system) polynomial(k int, tau float64) []float64 {
	n, p, f := s.solver.order, s.solver.scalar[:s.solver.terms], s.line(k)
	for i := range p {
		p[i] = dot(row(s.solver.poly, n, i), f)
	}
	p[0] += f[n] + float64(f[n+1]*tau)
	p[1] += float64(f[n+1] * s.solver.unit())
	return p
}

// firstRoot gives the first place in [0, dt] where a polynomial that starts positive falls to zero.
func firstRoot(p []float64, dt float64) (float64, bool) {
	if p[0] <= 0 {
		return 0, true
	}
	end := dt
	if horner(p, dt) > 0 {
		if !(slopeAt(p, 0) < 0 && slopeAt(p, dt) > 0) {
			return 0, false
		}
		end = turnOf(p, dt, -1)
		if horner(p, end) > 0 {
			return 0, false
		}
	}
	return rootOf(end, func(t float64) (v, slope float64) { return horner(p, t), slopeAt(p, t) }), true
}

// turnOf gives where a polynomial that starts with a slope of a sign turns round within [0, dt].
func turnOf(p []float64, dt, sign float64) float64 {
	return rootOf(dt, func(t float64) (v, slope float64) { return sign * slopeAt(p, t), sign * bendAt(p, t) })
}

// rootOf gives the place in [0, end] where a function positive at 0 stops being so, to the last digits. Newton's steps close
// in from one side; one twice as long then catches the other. Where they leave the bracket, or do not halve it in three, its
// middle is taken.
func rootOf(end float64, f func(float64) (v, slope float64)) float64 {
	low, high, at := 0.0, end, 0.5*end
	for slow := 0; ; {
		width := high - low
		v, slope := f(at)
		switch {
		case v > 0:
			low = at
		case v < 0:
			high = at
		default:
			return at
		}
		step := math.Abs(v / slope)
		if slow++; high-low <= 0.5*width {
			slow = 0
		} else {
			step *= 2
		}
		next := at + math.Copysign(math.Max(step, 2e-16*end), v)
		if !(next > low && next < high) || slow > 2 {
			next = low + float64(0.5*(high-low))
		}
		if next <= low || next >= high {
			return high
		}
		at = next
	}
}

func horner(p []float64, t float64) float64 {
	v := 0.0
	for k := len(p) - 1; k >= 0; k-- {
		v = float64(v*t) + p[k]
	}
	return v
}

func slopeAt(p []float64, t float64) float64 {
	v := 0.0
	for k := len(p) - 1; k >= 1; k-- {
		v = float64(v*t) + float64(float64(k)*p[k])
	}
	return v
}

func bendAt(p []float64, t float64) float64 {
	v := 0.0
	for k := len(p) - 1; k >= 2; k-- {
		v = float64(v*t) + float64(float64(k*(k-1))*p[k])
	}
	return v
}

// setStop arms the stop of To; a probe already above the level must fall below it first.
func (r *Run) setStop(probe int, level float64) {
	r.stop = stop{watch: -1}
	if probe < 0 {
		return
	}
	k := r.c.diodes + probe
	r.stop = stop{watch: k, level: level, armed: r.watch[k].now < level}
}
