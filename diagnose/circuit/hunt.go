package circuit

import (
	"fmt"
	"math"
)

// closeBy is how near to its limit, relative to the scale of the circuit, a quantity must be at both ends of a step to
// be checked for a dip between them; at 40 points a ring a dip is below 0.4 % of the swing.
const closeBy = 0.02

// stop is the level at which To ends early.
type stop struct {
	watch      int // -1: none
	level      float64
	armed, hit bool
}

// trouble tells whether a diode switches, or the stop level is reached, within the step tried. A dip and return
// inside the step is seen from the slopes at its ends.
func (r *Run) trouble(dt float64) bool {
	ready := false
	for k := range r.watch {
		w := &r.watch[k]
		a, b, least, near := w.now, w.then, -w.tol, w.near
		if !w.isDiode {
			if k != r.stop.watch || !r.stop.armed {
				continue
			}
			a, b, least, near = r.stop.level-a, r.stop.level-b, 0, closeBy*(math.Abs(r.stop.level)+r.volts+r.amps)
		}
		if b <= least {
			return true
		}
		if a > near && b > near {
			continue
		}
		if !ready {
			r.bothRates(dt)
			ready = true
		}
		da, db := r.sys.rateOf(k, r.rateOld), r.sys.rateOf(k, r.rateNew)
		if !w.isDiode {
			da, db = -da, -db
		}
		if da < 0 && db > 0 && tangents(a, da, b, db, dt) < least {
			return true
		}
	}
	return false
}

// bothRates computes the derivatives of the states at the start and the end of the step tried.
func (r *Run) bothRates(dt float64) {
	r.sys.rates(r.rateOld, r.x, r.tau)
	r.sys.rates(r.rateNew, r.next, r.tau+dt)
}

// tangents gives the height at which the tangents at both ends of a step meet: no convex curve goes below it.
func tangents(a, da, b, db, dt float64) float64 {
	t := (b - a - float64(db*dt)) / (da - db)
	return a + float64(da*t)
}

// event goes to the first switching point within a step of the finest length and switches, or stops there.
func (r *Run) event(dt float64) (stopped bool, err error) {
	s := r.sys
	s.expand(r.x, r.tau)
	first, who := dt, -1
	for k := range r.watch {
		w := &r.watch[k]
		p := s.polynomial(k, r.tau)
		if w.isDiode {
			p[0] += w.tol
		} else if k == r.stop.watch && r.stop.armed {
			for i := range p {
				p[i] = -p[i]
			}
			p[0] += r.stop.level
		} else {
			continue
		}
		unit := s.solver.unit()
		if at, found := firstRoot(p, first/unit); found && (who < 0 || at*unit < first) {
			first, who = at*unit, k
		}
	}
	if who < 0 { // a near miss that the slopes could not rule out
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
func (s *system) polynomial(k int, tau float64) *[degree + 1]float64 {
	n, p, f := s.nx, &s.solver.scalar, s.line(k)
	for i := range p {
		p[i] = dot(row(s.solver.poly, n, i), f)
	}
	p[0] += f[n] + float64(f[n+1]*tau)
	p[1] += float64(f[n+1] * s.solver.unit())
	return p
}

// firstRoot gives the first place in [0, dt] where a polynomial that starts positive falls to zero.
func firstRoot(p *[degree + 1]float64, dt float64) (float64, bool) {
	if p[0] <= 0 {
		return 0, true
	}
	end := dt
	if horner(p, dt) > 0 {
		if !(slopeAt(p, 0) < 0 && slopeAt(p, dt) > 0) {
			return 0, false
		}
		end = bisect(dt, func(t float64) bool { return slopeAt(p, t) < 0 })
		if horner(p, end) > 0 {
			return 0, false
		}
	}
	return bisect(end, func(t float64) bool { return horner(p, t) > 0 }), true
}

// bisect gives the place in [0, end] where a condition true at 0 stops being true, to the last digit.
func bisect(end float64, holds func(float64) bool) float64 {
	low, high := 0.0, end
	for range 60 {
		mid := low + float64(0.5*(high-low))
		if mid <= low || mid >= high {
			break
		}
		if holds(mid) {
			low = mid
		} else {
			high = mid
		}
	}
	return high
}

func horner(p *[degree + 1]float64, t float64) float64 {
	v := p[degree]
	for k := degree - 1; k >= 0; k-- {
		v = float64(v*t) + p[k]
	}
	return v
}

func slopeAt(p *[degree + 1]float64, t float64) float64 {
	v := degree * p[degree]
	for k := degree - 1; k >= 1; k-- {
		v = float64(v*t) + float64(float64(k)*p[k])
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
