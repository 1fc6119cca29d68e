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
	conducts  bool    // a diode's state
	a, b      int     // of a voltage probe
	now, then float64 // at the present moment, after the step tried
	tol       float64 // how far a diode's margin may fall below zero
	near      float64 // a margin above this needs no closer look
	best, at  float64 // highest value and its time
	low       float64
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
	k, ok := r.c.byName[name]
	if !ok {
		return -1
	}
	return r.addProbe(watch{branch: k, isCurrent: true})
}

func (r *Run) addProbe(w watch) int {
	r.watch = append(r.watch, w)
	k := len(r.watch) - 1
	for _, s := range r.cache {
		s.solver.forms = nil // made anew with the new probe
	}
	r.refresh()
	p := &r.watch[k]
	p.now = r.value(k, r.x, r.tau)
	p.best, p.at, p.low = p.now, r.Time(), p.now
	if r.opts.trace {
		p.trace = append(make([]Point, 0, 1024), Point{r.Time(), p.now})
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
	w := &r.watch[r.c.diodes+probe]
	return w.best, w.at
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
	for i := range n {
		s.collapse(row(v.dx, n+2, i), row(s.rate, s.width, i), &r.seg)
	}
	for k := range r.watch {
		s.collapse(s.line(k), row(v.forms, s.width, k), &r.seg)
	}
	v.segment = r.seg.id
	for k := range r.watch {
		if w := &r.watch[k]; w.isDiode {
			w.tol, w.near = trigger*r.tolerance(w), closeBy*r.volts
			if w.conducts {
				w.near = closeBy * r.amps
			}
		}
	}
}

// makeForms writes down the forms of all watches for the present system.
func (r *Run) makeForms() {
	s := r.sys
	v, n := &s.solver, s.nx
	v.forms = make([]float64, len(r.watch)*s.width)
	v.watch = make([]float64, len(r.watch)*(n+2))
	v.dx = make([]float64, n*(n+2))
	v.work = make([]float64, n+2)
	v.poly = make([]float64, (degree+1)*n)
	for k := range r.watch {
		f := row(v.forms, s.width, k)
		switch w := &r.watch[k]; {
		case w.isDiode:
			r.margin(f, w.branch)
		case w.isCurrent:
			copy(f, s.i(w.branch))
		default:
			s.difference(f, w.a, w.b)
		}
	}
}

func (s *system) line(k int) []float64 { return row(s.solver.watch, s.nx+2, k) }

// value evaluates a watch.
func (r *Run) value(k int, x []float64, tau float64) float64 {
	f, n := r.sys.line(k), r.sys.nx
	return dot(x, f) + (f[n] + float64(f[n+1]*tau))
}

// look evaluates all watches for the states given.
func (r *Run) look(x []float64, tau float64) {
	for k := range r.watch {
		r.watch[k].then = r.value(k, x, tau)
	}
}

// rates computes the derivative of the states.
func (s *system) rates(dst, x []float64, tau float64) {
	n := s.nx
	for i := range n {
		f := row(s.solver.dx, n+2, i)
		dst[i] = dot(x, f) + (f[n] + float64(f[n+1]*tau))
	}
}

// rateOf is the derivative of a watch for given derivatives of the states.
func (s *system) rateOf(k int, rates []float64) float64 {
	f := s.line(k)
	return dot(rates, f) + f[s.nx+1]
}

// record enters the step tried into scales, traces and peaks.
func (r *Run) record(dt float64, l int, at float64) {
	ready := false
	t := r.seg.from + at
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
		if near := w.best - float64(0.02*(w.best-w.low)); w.now < near && w.then < near {
			continue
		}
		if !ready {
			r.bothRates(dt)
			ready = true
		}
		da, db := r.sys.rateOf(k, r.rateOld), r.sys.rateOf(k, r.rateNew)
		if da > 0 && db < 0 && -tangents(-w.now, -da, -w.then, -db, dt) > w.best {
			r.summit(k, dt, l)
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
	if v > w.best {
		w.best, w.at = v, t
	}
	if v < w.low {
		w.low = v
	}
	if r.opts.trace {
		w.trace = append(w.trace, Point{t, v})
	}
}

// summit finds the top of a probe inside the step tried: halving by level, then on the polynomial.
func (r *Run) summit(k int, dt float64, l int) {
	s := r.sys
	levels := s.solver.levels
	x, half, rates := r.spare[:s.nx], r.spare[s.nx:2*s.nx], r.spare[2*s.nx:]
	tau := r.tau
	copy(x, r.x)
	for l >= 0 && l < len(levels)-1 {
		l++
		s.step(half, x, &levels[l], &r.seg, tau)
		s.rates(rates, half, tau+levels[l].h)
		if s.rateOf(k, rates) > 0 {
			copy(x, half)
			tau += levels[l].h
		}
		dt = levels[l].h
	}
	s.expand(x, tau)
	p := s.polynomial(k, tau)
	unit := s.solver.unit()
	top := bisect(dt/unit, func(t float64) bool { return slopeAt(p, t) > 0 })
	if v := horner(p, top); v > r.watch[k].best {
		r.watch[k].best, r.watch[k].at = v, r.seg.from+tau+float64(top*unit)
	}
}

// sample enters the values just after a jump or an event, and stops To if a jump crossed its level.
func (r *Run) sample() {
	for k := range r.watch {
		w := &r.watch[k]
		w.now = w.then
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
