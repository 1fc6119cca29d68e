package stress

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"drivemend/measure/quantity"
)

// edgeShape solves one shape of the edge.
type edgeShape func(scene) (*Edge, error)

// points is where an interval is looked at: its ends and five points between.
const points = 7

// scanned is one unknown with the peak at each point of its interval.
type scanned struct {
	input input
	peaks [points]float64
}

func (s scanned) highest() float64 { return slices.Max(s.peaks[:]) }
func (s scanned) lowest() float64  { return slices.Min(s.peaks[:]) }

// bears tells whether the input has an interval and moves an edge at the highest bus and worst current.
func (p *problem) bears(in input, edge string) bool {
	idle := in.key == "bus.nominal" || in.key == "load.running_current" || in.key == "cooling.coldest_air"
	switch {
	case idle || !in.open() || in.edge == turnOn && !p.leg():
		return false
	case edge == turnOn:
		return in.edge != turnOff
	case edge != "":
		return in.edge != turnOn
	}
	return true
}

// unknowns are the inputs that bear on an edge, or on any.
func (p *problem) unknowns(edge string) []input {
	var out []input
	for _, in := range p.in.values {
		if p.bears(in, edge) {
			out = append(out, in)
		}
	}
	return out
}

func point(in input, k int) float64 { return in.at(float64(k) / (points - 1)) }

// peakWith is the highest peak of the graded edges with one input at a value, all else at its middle: highest bus, worst
// current.
func (p *problem) peakWith(key string, value float64) (float64, error) {
	e, err := p.highestEdge(p.highest().quick().with(key, value), p.edges...)
	if err != nil {
		return 0, err
	}
	return e.Peak, nil
}

// highestEdge solves edges in one scene and gives the one with the highest peak.
func (p *problem) highestEdge(s scene, edges ...graded) (*Edge, error) {
	var top *Edge
	s, err := s.settled()
	if err != nil {
		return nil, err
	}
	for _, g := range edges {
		e, err := g.in(s)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", g.name, err)
		}
		if top == nil || e.Peak > top.Peak {
			top = e
		}
	}
	return top, nil
}

// scan moves every unknown over its interval, all else at its middle.
func (p *problem) scan() ([]scanned, error) {
	unknowns := p.unknowns("")
	out := make([]scanned, len(unknowns))
	for k, in := range unknowns {
		out[k].input = in
	}
	return out, each(len(unknowns)*points, func(k int) error {
		in, at := unknowns[k/points], k%points
		peak, err := p.peakWith(in.key, point(in, at))
		out[k/points].peaks[at] = peak
		return err
	})
}

// rests names every assumed value that alone could take the peak over the limit, with the interval in which it does
// not: the one about its middle, or, when the middle is over the limit itself, about its best point.
func (p *problem) rests(scan []scanned, limit float64) ([]string, error) {
	var out []string
	for _, s := range scan {
		if !s.input.assumed || s.highest() <= limit {
			continue
		}
		low, high, err := p.safe(s, limit)
		if err != nil {
			return nil, err
		}
		out = append(out, fmt.Sprintf("within only while %s stays between %s and %s", inWords(s.input.key),
			quantity.Format(low, s.input.unit), quantity.Format(high, s.input.unit)))
	}
	return out, nil
}

// safe is the interval of one unknown in which the peak stays at or under the limit; both ends the best point when
// there is none.
func (p *problem) safe(s scanned, limit float64) (low, high float64, err error) {
	from := s.input.share(s.input.mid)
	middle, err := p.peakWith(s.input.key, s.input.mid)
	if err != nil {
		return 0, 0, err
	}
	if middle > limit {
		from = float64(slices.Index(s.peaks[:], s.lowest())) / (points - 1)
	}
	if low, err = p.safeEnd(s, limit, from, -1); err != nil {
		return 0, 0, err
	}
	high, err = p.safeEnd(s, limit, from, +1)
	return low, high, err
}

// safeEnd walks from a safe share of the interval to one side, until the peak passes the limit, and narrows that
// place down; the value given is on the safe side.
func (p *problem) safeEnd(s scanned, limit, safe float64, side int) (float64, error) {
	k := 0
	if side < 0 {
		k = points - 1
	}
	for ; k >= 0 && k < points; k += side {
		x := float64(k) / (points - 1)
		if (x-safe)*float64(side) <= 0 {
			continue
		}
		if s.peaks[k] > limit {
			return p.narrow(s.input, limit, safe, x)
		}
		safe = x
	}
	return s.input.at(safe), nil
}

// narrow halves the way between a safe and an unsafe share of the interval.
func (p *problem) narrow(in input, limit, safe, unsafe float64) (float64, error) {
	for range 10 {
		x := (safe + unsafe) / 2
		peak, err := p.peakWith(in.key, in.at(x))
		if err != nil {
			return 0, err
		}
		if peak > limit {
			unsafe = x
		} else {
			safe = x
		}
	}
	return in.at(safe), nil
}

// steepness is how a slope is scanned, over its mean (1 to 2 times, judgement).
var steepness = []float64{1, 1.5, 2}

const (
	lookouts    = 64 // boards spread evenly over the intervals that the search for the corner starts from
	climbs      = 2  // of them, the highest, from which it climbs
	mostCircles = 3  // times around all unknowns
	stands      = 3  // points of an interval that a climb tries: its ends and its middle
)

// footing is a scene, with the edge that is highest there.
type footing struct {
	s    scene
	edge graded
	peak float64
}

// worst gives the absolute corner, the highest of all edges and shapes, climbed to from the highest of boards spread
// evenly over all intervals, from the middle of every interval, and from the highest board drawn if that is still
// higher. The same board gives the same corner, whatever the draws.
func (p *problem) worst(drawn scene) (Worst, error) {
	starts, err := p.lookout()
	if err != nil {
		return Worst{}, err
	}
	best := footing{}
	for _, f := range starts {
		if best, err = p.better(best, f); err != nil {
			return Worst{}, err
		}
	}
	for _, g := range p.edges {
		e, err := g.in(drawn)
		if err != nil {
			return Worst{}, err
		}
		if e.Peak > best.peak {
			if best, err = p.better(best, footing{drawn, g, e.Peak}); err != nil {
				return Worst{}, err
			}
		}
	}
	return Worst{Peak: best.peak, Edge: best.edge.name, Shape: best.edge.shape, Corner: p.cornerOf(best)}, nil
}

// better climbs from a footing and gives the higher one.
func (p *problem) better(best, from footing) (footing, error) {
	top, err := p.climb(from)
	if err == nil && top.peak > best.peak {
		return top, nil
	}
	return best, err
}

// corners are the edges and shapes of the absolute corner.
func (p *problem) corners() []graded {
	out := append([]graded{isCut}, p.edges...)
	if p.leg() && !p.closingKnown() {
		out = append(out, closes)
	}
	if p.bridge {
		out = append(out, isCutEach)
	}
	return out
}

// lookout gives the highest boards out of some spread evenly, and the middle, each with its highest edge.
func (p *problem) lookout() ([]footing, error) {
	unknowns, edges := p.unknowns(""), p.corners()
	all := make([]footing, (lookouts+1)*len(edges))
	for k := range lookouts + 1 {
		s := p.highest().quick()
		if k > 0 {
			s.x = slices.Clone(s.x)
			for n, x := range spread(k, len(unknowns)) {
				s = s.set(unknowns[n].key, unknowns[n].at(x))
			}
		}
		for n, g := range edges {
			all[k*len(edges)+n] = footing{s: s, edge: g}
		}
	}
	err := each(len(all), func(k int) error {
		s := all[k].s
		s.steep = slices.Max(all[k].edge.steep)
		e, err := all[k].edge.in(s)
		if err == nil {
			all[k].peak = e.Peak
		}
		return err
	})
	middle := all[:len(edges):len(edges)]
	rest := slices.Clone(all[len(edges):])
	slices.SortStableFunc(rest, func(a, b footing) int { return cmp.Compare(b.peak, a.peak) })
	return append(rest[:min(climbs, len(rest))], slices.MaxFunc(middle, func(a, b footing) int { return cmp.Compare(a.peak, b.peak) })), err
}

// spread is point k of a sequence that fills a cube evenly: an additive recurrence whose steps are the powers of the
// generalised golden ratio (Roberts 2018, from memory).
func spread(k, dimensions int) []float64 {
	ratio := 2.0
	for range 60 {
		ratio = math.Pow(1+ratio, 1/float64(dimensions+1))
	}
	out := make([]float64, dimensions)
	step := 1.0
	for n := range out {
		step /= ratio
		_, out[n] = math.Modf(0.5 + float64(k)*step)
	}
	return out
}

// climb goes to a corner: one unknown after the other is put where it raises the peak most, around until nothing does.
func (p *problem) climb(f footing) (footing, error) {
	f.s.steep = slices.Max(f.edge.steep)
	e, err := f.edge.in(f.s)
	if err != nil {
		return f, err
	}
	f.peak = e.Peak
	unknowns := p.unknowns(f.edge.name)
	for range mostCircles {
		before := f.peak
		for _, in := range unknowns {
			trials := make([]scene, stands)
			for k := range trials {
				trials[k] = f.s.with(in.key, in.at(float64(k)/(stands-1)))
			}
			if err := f.highest(trials); err != nil {
				return f, err
			}
		}
		trials := make([]scene, len(f.edge.steep))
		for k := range trials {
			trials[k] = f.s
			trials[k].steep = f.edge.steep[k]
		}
		if err := f.highest(trials); err != nil || f.peak <= before*(1+1e-4) {
			return f, err
		}
	}
	return f, nil
}

// highest moves to the trial with the highest peak, unless the present scene is higher.
func (f *footing) highest(trials []scene) error {
	peaks := make([]float64, len(trials))
	err := each(len(trials), func(k int) error {
		e, err := f.edge.in(trials[k])
		if err == nil {
			peaks[k] = e.Peak
		}
		return err
	})
	for k, v := range peaks {
		if v > f.peak {
			f.s, f.peak = trials[k], v
		}
	}
	return err
}

// cornerOf lists the conditions of a footing: bus, current, the unknowns that its edge knows, and the scanned slope.
func (p *problem) cornerOf(f footing) []Corner {
	var out []Corner
	for _, in := range p.in.values {
		named := in.key == "bus.highest" || in.key == "load.stall_current"
		if idle := f.edge.shape == shapeCut && in.key == "switch.rise_slope"; named || p.bears(in, f.edge.name) && !idle {
			out = append(out, Corner{in.key, f.s.get(in.key), in.unit, in.assumed})
		}
	}
	switch {
	case f.edge.shape == shapeCut:
		out = append(out, Corner{"slope of the fall over its mean", max(f.s.steep, 1), quantity.Ratio, true})
	case len(f.edge.steep) > 1:
		out = append(out, Corner{"slope of the closing current over its mean", max(f.s.steep, 1), quantity.Ratio, true})
	}
	return out
}
