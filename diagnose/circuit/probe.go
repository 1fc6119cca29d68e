package circuit

import (
	"math"
	"slices"
)

// watch is a quantity followed through the run: the margin of a diode or a probe.
type watch struct {
	branch    int // of a diode or a current probe
	isDiode   bool
	isCurrent bool
	isSlope   bool
	conducts  bool    // a diode's state
	a, b      int     // of a voltage probe
	now, then float64 // at the present moment, after the step tried
	rate      float64 // at the present moment
	rateThen  float64 // after the step tried
	tol       float64 // how far a diode's margin may fall below zero
	top, low  Point   // highest and lowest value with its time
	trace     []Point
}

// Probe records a voltage v(a) - v(b) from now on and gives its handle; -1 if a node does not exist.
func (r *Run) Probe(a, b int) int {
	if !r.hasNodes(a, b) {
		return -1
	}
	return r.addProbe(watch{a: a, b: b})
}

// ProbeCurrent records the current of a named element from now on and gives its handle; -1 if there is none.
func (r *Run) ProbeCurrent(name string) int {
	k, ok := r.find(name)
	if !ok {
		return -1
	}
	return r.addProbe(watch{branch: k, isCurrent: true})
}

// ProbeSlope records the rate of v(a) - v(b) in volts per second from now on, exact like the voltage itself, so that
// Peak and Lowest give the steepest rise and fall; -1 if a node does not exist. Where the voltage itself jumps (with a
// source, or with a current that is forced through a resistance) the rate has no value; those on both sides count.
func (r *Run) ProbeSlope(a, b int) int {
	if !r.hasNodes(a, b) {
		return -1
	}
	return r.addProbe(watch{a: a, b: b, isSlope: true})
}

func (r *Run) addProbe(w watch) int {
	r.watch = append(r.watch, w)
	k := len(r.watch) - 1
	r.looked = append(r.looked, 0, 0)
	for _, s := range r.cache {
		s.solver.forms = nil // made anew with the new probe
	}
	r.refresh()
	r.look(r.x, r.tau)
	r.arrive()
	p := &r.watch[k]
	p.top = Point{r.Time(), p.now}
	p.low = p.top
	if r.opts.trace {
		p.trace = append(make([]Point, 0, 1024), p.top)
	}
	return k - r.c.diodes
}

func (r *Run) probes() int { return len(r.watch) - r.c.diodes }

// Peak gives the highest value a probe took since it was placed and when, located between steps; NaN for a handle
// that does not exist.
func (r *Run) Peak(probe int) (value, at float64) {
	if probe < 0 || probe >= r.probes() {
		return math.NaN(), math.NaN()
	}
	p := r.watch[r.c.diodes+probe].top
	return p.V, p.T
}

// Lowest gives the lowest value a probe took since it was placed and when, as Peak gives the highest.
func (r *Run) Lowest(probe int) (value, at float64) {
	if probe < 0 || probe >= r.probes() {
		return math.NaN(), math.NaN()
	}
	p := r.watch[r.c.diodes+probe].low
	return p.V, p.T
}

// Trace gives the sampled waveform of a probe: every step and both sides of a jump; nil for an unknown handle. Steps
// grow where nothing rings; a smooth picture of a slow curve needs WithStep.
func (r *Run) Trace(probe int) []Point {
	if probe < 0 || probe >= r.probes() {
		return nil
	}
	return slices.Clone(r.watch[r.c.diodes+probe].trace)
}

// refresh makes the collapsed rows of the present system hold for the present segment and probes.
func (r *Run) refresh() {
	s := r.sys
	v, n := &s.solver, s.nx
	if v.forms == nil {
		r.makeForms()
		v.segment = -1
	}
	if v.segment == r.seg.id {
		return
	}
	v.order = n + 2*len(r.seg.bends)
	w := v.order + 2
	r.room.resize(&v.watch, 2*len(r.watch)*w)
	r.room.resize(&v.dx, v.order*w)
	r.room.resize(&v.poly, (degree+1)*v.order)
	for i := range n {
		s.collapse(row(v.dx, w, i), row(s.rate, s.width, i), &r.seg)
	}
	for i, b := range r.seg.bends {
		b.equations(v.dx[(n+2*i)*w:], w, n+2*i)
	}
	for k := range r.watch {
		s.collapse(s.line(k), row(v.forms, s.width, k), &r.seg)
		s.differentiate(s.line(len(r.watch)+k), s.line(k))
		if w := &r.watch[k]; w.isDiode {
			w.tol = trigger * r.tolerance(w)
		}
	}
	v.segment = r.seg.id
}

// differentiate gives the collapsed row of the rate of a collapsed row.
func (s *system) differentiate(dst, row []float64) {
	n := s.solver.order
	addRows(dst, row[:n], s.solver.dx, n+2)
	dst[n] += row[n+1]
}

// makeForms writes down the forms of all watches for the present system.
func (r *Run) makeForms() {
	s := r.sys
	v := &s.solver
	v.forms = r.room.take(len(r.watch) * s.width)
	for k := range r.watch {
		f := row(v.forms, s.width, k)
		switch w := &r.watch[k]; {
		case w.isDiode:
			r.margin(f, w.branch)
		case w.isCurrent:
			copy(f, s.i(w.branch))
		case w.isSlope:
			plain := r.room.take(s.width)
			s.difference(plain, w.a, w.b)
			s.derive(f, plain, 1)
		default:
			s.difference(f, w.a, w.b)
		}
	}
}

func (s *system) line(k int) []float64 { return row(s.solver.watch, s.solver.order+2, k) }

// seen evaluates a watch, or its rate, which stands behind all watches.
func (s *system) seen(k int, x []float64, tau float64) float64 {
	f, n := s.line(k), s.solver.order
	return dot(x, f) + (f[n] + float64(f[n+1]*tau))
}

// look evaluates all watches and their rates for the states given.
func (r *Run) look(x []float64, tau float64) {
	n, m := r.sys.solver.order, r.sys.solver.watch
	v, w := r.looked, n+2
	apply(v, m, w, x)
	for i := range v {
		v[i] += m[i*w+n] + float64(m[i*w+n+1]*tau)
	}
	rates := v[len(r.watch):]
	for k := range r.watch {
		w := &r.watch[k]
		w.then, w.rateThen = v[k], rates[k]
	}
}

// arrive makes what look saw last the present.
func (r *Run) arrive() {
	for k := range r.watch {
		w := &r.watch[k]
		w.now, w.rate = w.then, w.rateThen
	}
}

// record enters the step tried into scales, traces and peaks.
func (r *Run) record(dt float64, l int, at float64) {
	t := math.Min(r.seg.from+at, r.seg.till) // the sum may be a rounding beyond the corner, from which the next samples count
	for k := range r.watch {
		w := &r.watch[k]
		if w.isDiode {
			r.widen(w)
			continue
		}
		r.note(w, t, w.then)
		if k == r.stop.watch && w.then < r.stop.level {
			r.stop.armed = true
		}
		if w.rate > 0 && w.rateThen < 0 && -dip(-w.now, -w.rate, -w.then, -w.rateThen, dt) > w.top.V {
			r.extreme(k, dt, l, 1)
		}
		if w.rate < 0 && w.rateThen > 0 && dip(w.now, w.rate, w.then, w.rateThen, dt) < w.low.V {
			r.extreme(k, dt, l, -1)
		}
	}
}

// widen lets the scale of tolerances follow a diode.
func (r *Run) widen(w *watch) {
	size := math.Abs(w.then)
	if w.conducts && size > r.amps {
		r.amps = size
	} else if !w.conducts && size > r.volts {
		r.volts = size
	}
}

// note enters one sample of a probe.
func (r *Run) note(w *watch, t, v float64) {
	w.reach(t, v)
	if r.opts.trace {
		w.trace = append(w.trace, Point{t, v})
	}
}

// reach widens the range a probe has covered.
func (w *watch) reach(t, v float64) {
	if v > w.top.V {
		w.top = Point{t, v}
	}
	if v < w.low.V {
		w.low = Point{t, v}
	}
}

// extreme finds the top (sign 1) or bottom (-1) of a probe inside the step tried: halving by level, then on the
// polynomial.
func (r *Run) extreme(k int, dt float64, l int, sign float64) {
	s := r.sys
	levels := s.solver.levels
	n := s.solver.order
	x, half := r.spare[:n], r.spare[n:2*n]
	tau := r.tau
	copy(x, r.x)
	for l >= 0 && l < len(levels)-1 {
		l++
		s.step(half, x, &levels[l], tau)
		if sign*s.seen(len(r.watch)+k, half, tau+levels[l].h) > 0 {
			copy(x, half)
			tau += levels[l].h
		}
		dt = levels[l].h
	}
	s.expand(x, tau)
	p := s.polynomial(k, tau)
	unit := s.solver.unit()
	turn := turnOf(p, dt/unit, sign)
	r.watch[k].reach(r.seg.from+tau+float64(turn*unit), horner(p, turn))
}

// sample enters the values just after a jump or an event, and stops To if a jump crossed its level.
func (r *Run) sample() {
	for k := range r.watch {
		w := &r.watch[k]
		w.now, w.rate = w.then, w.rateThen
		if w.isDiode {
			continue
		}
		if n := len(w.trace); n == 0 || w.trace[n-1] != (Point{r.Time(), w.now}) {
			r.note(w, r.Time(), w.now)
		}
		if k != r.stop.watch {
			continue
		}
		if r.stop.armed && w.now >= r.stop.level {
			r.stop.hit = true
		}
		r.stop.armed = r.stop.armed || w.now < r.stop.level
	}
}
