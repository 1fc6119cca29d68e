package circuit

import (
	"fmt"
	"math"
	"slices"
)

// Option changes how a transient is run.
type Option func(*options)

type options struct {
	energy, trace bool
	longest       float64
	limit         int
}

// WithoutEnergy leaves the integrals out, which makes a run about twice as fast; Energy, Charge and Square then give NaN.
func WithoutEnergy() Option { return func(o *options) { o.energy = false } }

// WithoutTrace keeps no samples, and takes longer steps (16 a ring in place of 40, without energies 8); Peak, Lowest and
// events are located between the steps as ever, Trace gives nil. A ripple of less than a hundred-thousandth of the largest
// voltage may pass unseen.
func WithoutTrace() Option { return func(o *options) { o.trace = false } }

// WithStep sets the longest time between two samples (seconds, > 0); the exactness of the result does not depend on it.
func WithStep(longest float64) Option { return func(o *options) { o.longest = longest } }

// WithLimit sets how many steps one run may take before it ends in an error (default two million).
func WithLimit(steps int) Option { return func(o *options) { o.limit = steps } }

// Run is one transient in progress. It is not safe for use by several goroutines; different runs are.
type Run struct {
	c       *Circuit
	opts    options
	waves   []source
	turns   []turn // what Retarget did so far
	cache   []*system
	room    *room
	on      uint64 // conducting diodes
	sys     *system
	held    []float64 // per branch: capacitor voltage, inductor current at the last event
	x, next []float64 // states now and after the step tried
	spare   []float64
	seg     segment
	tau     float64 // time since the start of the segment
	volts   float64 // largest voltage and current seen, the scale of tolerances
	amps    float64
	goal    float64 // about when the crossing ahead comes, as tau counts; 0 if none is known
	sight   float64 // how near to the goal the estimate holds
	rung    int     // level of the next step, and how many more before it may grow
	left    int
	per     int     // steps at each length while growing
	calm    float64 // time since the last restart
	defect  float64 // what the last step missed, relative to the scale
	watch   []watch
	looked  []float64 // scratch, a value and a rate per watch
	stop    stop
	totals  []total   // per branch
	moment  []float64 // ∫ y·yᵀ over the present segment and pattern, y = [states | 1 | τ]
	y       []float64 // scratch
	steps   int
	crowd   crowd
	err     error
}

// pattern is the key of the cached systems.
type pattern struct {
	on    uint64
	leaky bool
}

// Start finds the diode states at t = 0 and begins a transient; errors name the element at fault. Energies and
// traces are kept unless options say otherwise.
func (c *Circuit) Start(opts ...Option) (*Run, error) {
	if err := c.check(); err != nil {
		return nil, err
	}
	r := &Run{c: c.view(), room: rooms.Get().(*room)}
	r.opts = options{energy: true, trace: true, longest: math.Inf(1), limit: 2_000_000}
	for _, o := range opts {
		o(&r.opts)
	}
	if !(r.opts.longest > 0) {
		return nil, fmt.Errorf("circuit: step %g s must be above zero", r.opts.longest)
	}
	r.held = r.room.take(len(c.branches))
	if r.opts.energy {
		r.totals = make([]total, len(c.branches))
	}
	r.watch, r.looked = make([]watch, 0, c.diodes+4), make([]float64, 0, 2*c.diodes+8)
	r.waves = make([]source, c.sources)
	for k := range r.c.branches {
		b := &r.c.branches[k]
		r.held[k] = b.start
		if b.kind == voltageSource || b.kind == currentSource {
			r.waves[b.index] = b.source()
		}
		if b.kind == diode {
			r.watch = append(r.watch, watch{branch: k, isDiode: true})
			r.looked = append(r.looked, 0, 0)
		}
	}
	r.seg = segment{value: r.room.take(c.sources), slope: r.room.take(c.sources), bends: make([]bend, 0, c.sources)}
	r.locateSegment(0)
	r.firstScale()
	if err := r.settle(-1); err != nil {
		return nil, err
	}
	return r, nil
}

// snapshot is a copy whose elements can be changed.
func (c *Circuit) snapshot() *Circuit {
	d := *c
	d.nodes = slices.Clone(c.nodes)
	d.branches = slices.Clone(c.branches)
	d.couples = slices.Clone(c.couples)
	return &d
}

// view keeps a run apart from elements added later: they come behind, or into another list.
func (c *Circuit) view() *Circuit {
	d := *c
	d.nodes, d.branches, d.couples = slices.Clip(c.nodes), slices.Clip(c.branches), slices.Clip(c.couples)
	return &d
}

// firstScale takes the scale of tolerances from sources, initial values and thresholds.
func (r *Run) firstScale() {
	for k := range r.c.branches {
		switch b := &r.c.branches[k]; b.kind {
		case capacitor:
			r.volts = math.Max(r.volts, math.Abs(r.held[k]))
		case inductor:
			r.amps = math.Max(r.amps, math.Abs(r.held[k]))
		case voltageSource:
			r.volts = math.Max(r.volts, b.source().size())
		case currentSource:
			r.amps = math.Max(r.amps, b.source().size())
		case diode:
			r.volts = math.Max(r.volts, math.Abs(b.volt))
		}
	}
}

// Time is the present moment in seconds.
func (r *Run) Time() float64 { return r.seg.from + r.tau }

// fail keeps the first error; a run that failed stays failed.
func (r *Run) fail(err error) {
	if r.err == nil && err != nil {
		r.err = err
	}
}

// To advances to time t (absolute, seconds), or to the moment the probe first rises through level (stop = true) when
// probe >= 0. An error names the moment and what to change; the run cannot go on after it.
func (r *Run) To(t float64, probe int, level float64) (stop bool, err error) {
	if bad(t) || t < r.Time() {
		return false, fmt.Errorf("circuit: To(%g s): the run already stands at %g s", t, r.Time())
	}
	if probe >= r.probes() {
		return false, fmt.Errorf("circuit: To: probe %d does not exist, there are %d", probe, r.probes())
	}
	r.setStop(probe, level)
	for r.err == nil && r.Time() < t {
		stopped, err := r.advance(t)
		r.fail(err)
		if stopped {
			return true, r.err
		}
	}
	return false, r.err
}

// advance takes one step towards t, or goes over a corner of a waveform.
func (r *Run) advance(t float64) (stopped bool, err error) {
	if r.Time() >= r.seg.till {
		err = r.enterSegment(r.seg.till)
		return r.stop.hit, err
	}
	if r.steps++; r.steps > r.opts.limit {
		return false, fmt.Errorf("circuit: %d steps taken and only %g s reached; ask for a shorter time or take out the fastest ring", r.opts.limit, r.Time())
	}
	end := math.Min(t, r.seg.till)
	fresh, err := r.sys.prepare(t-r.Time(), &r.seg, &r.opts)
	if err != nil {
		return false, err
	}
	if fresh {
		r.rung = mostLevels + 1
	}
	r.refresh()
	room := end - r.seg.from - r.tau
	if room <= 0 { // the rest is below the rounding of the time
		r.tau = until(r.seg.from, end)
		return false, nil
	}
	dt, l := r.choose(room)
	r.try(dt, l)
	if r.opts.quick() && l >= 0 && r.rough(dt) && l < len(r.sys.solver.levels)-1 {
		r.rung, r.left = l+1, r.per
		return false, nil
	}
	if r.trouble(dt) {
		if l >= 0 && l < len(r.sys.solver.levels)-1 {
			if !r.opts.trace { // the samples of a trace are to be even
				r.aim(dt)
			}
			r.rung, r.left = l+1, r.per
			return false, nil
		}
		return r.event(dt)
	}
	at := r.tau + dt
	if r.seg.from+at >= end || end-r.seg.from-at <= 1e-13*end {
		at = until(r.seg.from, end)
	}
	if at <= r.tau {
		return false, fmt.Errorf("circuit: the step of %g s is lost in the time %g s; start the waveforms nearer to zero", dt, r.Time())
	}
	return false, r.accept(dt, l, at)
}

// until gives the least d with from + d >= end in rounded arithmetic.
func until(from, end float64) float64 {
	d := end - from
	for from+d < end {
		d = math.Nextafter(d, math.Inf(1))
	}
	return d
}

// choose gives the length of the next step and its level, or level -1 for a short remainder taken by polynomial.
func (r *Run) choose(room float64) (dt float64, l int) {
	levels := r.sys.solver.levels
	if r.rung >= len(levels) {
		r.rung = r.sys.solver.grade
	}
	l = r.rung
	if left := r.goal - r.tau; left > r.sight {
		room = math.Min(room, left)
	} else if r.goal > 0 { // near enough to look again
		for r.goal = 0; l < len(levels)-1 && levels[l].h > 2*r.sight; l++ {
		}
		r.rung, r.left = l, r.per
	}
	room = math.Min(room, r.seg.longest)
	for l < len(levels) && levels[l].h > room*(1+1e-12) {
		l++
	}
	if l == len(levels) {
		return room, -1
	}
	r.sys.fill(l, &r.seg)
	return levels[l].h, l
}

// try computes the states one step ahead without accepting them.
func (r *Run) try(dt float64, l int) {
	if l >= 0 {
		r.sys.step(r.next, r.x, &r.sys.solver.levels[l], r.tau)
	} else {
		r.sys.expand(r.x, r.tau)
		r.sys.along(r.next, dt)
	}
	r.look(r.next, r.tau+dt)
}

// accept makes the step tried the present state: energies, probes, scales, growth of the step.
func (r *Run) accept(dt float64, l int, at float64) error {
	if r.opts.energy {
		r.gather(dt, l)
	}
	r.record(dt, l, at)
	r.x, r.next = r.next, r.x
	r.tau = at
	r.arrive()
	for _, v := range r.x {
		if !(math.Abs(v) < 1e150) {
			return fmt.Errorf("circuit: the solution grows without bound at %g s; check the sources", r.Time())
		}
	}
	r.grow(dt)
	return nil
}

// grow lengthens the steps as the time since the last event grows; rings hold them back until they have died away.
func (r *Run) grow(dt float64) {
	r.calm += dt
	if r.left--; r.left <= 0 && r.defect <= roughBy/8 && r.rung > r.lowest() {
		r.rung--
		r.left = r.per
	}
}

// lowest is the level to which the steps may grow as yet.
func (r *Run) lowest() int {
	lowest := 0
	for _, g := range r.sys.solver.rings {
		if r.calm <= g.quiet && g.level > lowest {
			lowest = g.level
		}
	}
	return lowest
}

// restart makes the steps short again after an event or a corner of a waveform, so that fast modes are followed.
func (r *Run) restart(corner bool) {
	per := r.opts.pace(corner)
	r.rung, r.left, r.per, r.calm, r.goal, r.defect = mostLevels+1, per, per, 0, 0, 0
}

// form evaluates a form at the present moment.
func (r *Run) form(f []float64) float64 {
	s := r.sys
	v := dot(r.x[:s.nx], f) + f[s.width-1]
	for u := range s.nu {
		value, slope := r.given(u)
		v += float64(f[s.value(u)]*value) + float64(f[s.slope(u)]*slope)
	}
	return v
}

// bending is what the second derivatives of the sources add to the derivative of a form.
func (r *Run) bending(f []float64) float64 {
	v := 0.0
	for i, b := range r.seg.bends {
		v += float64(f[r.sys.slope(b.source)] * b.bendAt(r.tau, r.x[r.sys.nx+2*i:]))
	}
	return v
}
