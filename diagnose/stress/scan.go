package stress

import (
	"fmt"
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

// bears tells whether the input has an interval and moves the edge at the highest bus and worst current.
func (in input) bears() bool {
	return in.open() && in.key != "bus.nominal" && in.key != "load.running_current" && in.key != "cooling.coldest_air"
}

// unknowns are the inputs that bear on that edge.
func (p *problem) unknowns() []input {
	var out []input
	for _, in := range p.in.values {
		if in.bears() {
			out = append(out, in)
		}
	}
	return out
}

func point(in input, k int) float64 { return in.at(float64(k) / (points - 1)) }

// peakWith is the gate-limited peak with one input at a value, all else at its middle: highest bus, worst current.
func (p *problem) peakWith(key string, value float64) (float64, error) {
	e, err := p.highest().quick().with(key, value).gateLimited()
	if err != nil {
		return 0, err
	}
	return e.Peak, nil
}

// scan moves every unknown over its interval, all else at its middle.
func (p *problem) scan() ([]scanned, error) {
	unknowns := p.unknowns()
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

// steepness is how the cut edge's slope is scanned, over its mean (1 to 2 times, judgement).
var steepness = []float64{1, 1.5, 2}

// worst gives the absolute corner, the higher one of both shapes of the edge, climbed to from the middle of every
// interval and from the highest board that was drawn.
func (p *problem) worst(highest scene) (Worst, error) {
	best := Worst{Edge: "turn-off"}
	for _, shape := range []struct {
		name  string
		solve edgeShape
		steep []float64
	}{{shapeCut, scene.cut, steepness}, {shapeGate, scene.gateLimited, []float64{1}}} {
		for _, from := range []scene{p.highest().quick(), highest} {
			s, peak, err := p.climb(from, shape.solve, shape.steep)
			if err != nil {
				return best, err
			}
			if peak > best.Peak {
				best.Peak, best.Shape, best.Corner = peak, shape.name, p.cornerOf(s, shape.name)
			}
		}
	}
	return best, nil
}

// climb goes to a corner: one unknown after the other is put where it raises the peak most, twice around.
func (p *problem) climb(s scene, shape edgeShape, steep []float64) (scene, float64, error) {
	e, err := shape(s)
	if err != nil {
		return s, 0, err
	}
	peak := e.Peak
	for range 2 {
		for _, in := range p.unknowns() {
			trials := make([]scene, points)
			for k := range trials {
				trials[k] = s.with(in.key, point(in, k))
			}
			if s, peak, err = highest(s, peak, trials, shape); err != nil {
				return s, peak, err
			}
		}
		trials := make([]scene, len(steep))
		for k := range trials {
			trials[k] = s
			trials[k].steep = steep[k]
		}
		if s, peak, err = highest(s, peak, trials, shape); err != nil {
			return s, peak, err
		}
	}
	return s, peak, nil
}

// highest gives the scene with the highest peak, the present one unless a trial goes higher.
func highest(s scene, peak float64, trials []scene, shape edgeShape) (scene, float64, error) {
	peaks := make([]float64, len(trials))
	err := each(len(trials), func(k int) error {
		e, err := shape(trials[k])
		if err == nil {
			peaks[k] = e.Peak
		}
		return err
	})
	for k, v := range peaks {
		if v > peak {
			s, peak = trials[k], v
		}
	}
	return s, peak, err
}

// cornerOf lists the conditions of a scene: bus, current, the unknowns that the shape knows, and the slope of a cut
// edge.
func (p *problem) cornerOf(s scene, shape string) []Corner {
	var out []Corner
	for _, in := range p.in.values {
		named := in.key == "bus.highest" || in.key == "load.stall_current"
		if idle := shape == shapeCut && in.key == "switch.rise_slope"; named || in.bears() && !idle {
			out = append(out, Corner{in.key, s.get(in.key), in.unit, in.assumed})
		}
	}
	if shape == shapeCut {
		out = append(out, Corner{"slope of the fall over its mean", max(s.steep, 1), quantity.Ratio, true})
	}
	return out
}
