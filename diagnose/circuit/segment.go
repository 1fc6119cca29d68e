package circuit

import "math"

// segment is a stretch of time over which every source is a straight line or a curve.
type segment struct {
	id         int
	from, till float64
	longest    float64   // step
	rate       float64   // of the fastest bend
	value      []float64 // at from
	slope      []float64
	bends      []bend // the sources that bend, in their order
}

// bend is a source that bends: its curve from the start of the segment.
type bend struct {
	source int
	Curve
}

// size is the largest value that the curve of a source has at its ends in the segment; 0 if it does not bend.
func (g *segment) size(source int) float64 {
	for _, b := range g.bends {
		if b.source == source {
			return math.Max(math.Abs(b.Value), math.Abs(b.At(g.till)))
		}
	}
	return 0
}

// equations writes the two rows of a bend: of its deviation, which has the place at, and of the rate of that.
func (b *bend) equations(rows []float64, w, at int) {
	rows[at+1] = 1
	second := rows[w:]
	second[at], second[at+1] = -b.Spring, -b.Damping
	second[w-2], second[w-1] = b.Bend, -b.Spring*b.Slope
}

// bendAt is the second derivative of the source at a time with a deviation and its rate.
func (b *bend) bendAt(tau float64, v []float64) float64 {
	return b.Bend - float64(b.Damping*v[1]) - float64(b.Spring*(float64(b.Slope*tau)+v[0]))
}

// collapse gives a form over [states | deviations | 1 | τ] for a segment.
func (s *system) collapse(dst, form []float64, g *segment) {
	n := s.nx
	copy(dst, form[:n])
	for _, b := range g.bends {
		dst[n], dst[n+1] = form[s.value(b.source)], form[s.slope(b.source)]
		n += 2
	}
	u := form[s.nx : s.nx+s.nu]
	dst[n] = dot(u, g.value) + dot(form[s.nx+s.nu:s.nx+2*s.nu], g.slope) + form[s.width-1]
	dst[n+1] = dot(u, g.slope)
}

// jumpsAt tells whether a source jumps at t, the end of the present segment or a moment within it.
func (r *Run) jumpsAt(t float64) bool {
	for k, w := range r.waves {
		c, _ := w.piece(t)
		if was, _ := r.given(k); jumps(c.Value, was) && math.Abs(c.Value-was) > rounding*r.seg.size(k) {
			return true
		}
	}
	return false
}

// given is the present value and slope of a source.
func (r *Run) given(k int) (value, slope float64) {
	g := &r.seg
	value, slope = g.value[k]+float64(g.slope[k]*r.tau), g.slope[k]
	for i, b := range g.bends {
		if v := r.x[r.sys.nx+2*i:]; b.source == k {
			value, slope = value+v[0], slope+v[1]
		}
	}
	return value, slope
}

// locateSegment finds the stretch of all sources that begins at t and has no corner.
func (r *Run) locateSegment(t float64) {
	g := &r.seg
	g.id++
	g.from, g.till, g.rate, g.bends = t, math.Inf(1), 0, g.bends[:0]
	for k, w := range r.waves {
		c, straight := w.piece(t)
		g.value[k], g.slope[k] = c.Value, c.Slope
		g.till = math.Min(g.till, c.Till)
		if !straight {
			g.bends = append(g.bends, bend{k, c})
			g.rate = math.Max(g.rate, c.rate())
		}
	}
	if g.longest = math.Inf(1); len(g.bends) > 0 {
		points, _ := r.opts.follow()
		g.longest = (g.till - t) / float64(points/2)
	}
	r.tau = 0
	if r.sys != nil { // every curve begins without a deviation
		n := r.sys.nx
		r.stretch(n + 2*len(g.bends))
		clear(r.x[n:])
	}
}

// stretch makes room for so many states and deviations, and keeps what is there.
func (r *Run) stretch(n int) {
	for _, p := range []*[]float64{&r.x, &r.next} {
		if cap(*p) < n {
			old := *p
			*p = r.room.take(n)
			copy(*p, old)
		}
		*p = (*p)[:n]
	}
	if cap(r.spare) < 2*n {
		r.spare = r.room.take(2 * n)
	}
}

// enterSegment goes over a corner: diodes may switch if a source jumps or if a capacitor current follows its slope.
func (r *Run) enterSegment(t float64) error {
	r.flush()
	jump := r.jumpsAt(t)
	if jump {
		r.keep()
	}
	r.locateSegment(t)
	if jump {
		return r.settle(-1)
	}
	r.refresh()
	r.clearMoment()
	r.look(r.x, 0)
	for k := range r.watch {
		if w := &r.watch[k]; w.isDiode && w.then < -w.tol {
			r.keep()
			return r.settle(-1)
		}
	}
	r.sample()
	r.restart(true)
	return nil
}
