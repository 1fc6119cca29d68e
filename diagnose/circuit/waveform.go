package circuit

import (
	"fmt"
	"math"
	"sort"
)

// Point is a corner of a piecewise-linear waveform: at T seconds the value is V (volt or ampere).
type Point struct{ T, V float64 }

// Waveform is piecewise linear, held before its first and after its last point. Two points at one time are a jump:
// the earlier one is the value just before, the later one the value from then on.
type Waveform []Point

// Constant gives a waveform that never changes.
func Constant(v float64) Waveform { return Waveform{{0, v}} }

// Check tells whether the waveform can be used: at least one point, finite, times that do not fall.
func (w Waveform) Check() error {
	if len(w) == 0 {
		return fmt.Errorf("the waveform has no points; give at least one")
	}
	for i, p := range w {
		if bad(p.T) || !(math.Abs(p.V) <= mostLevel) {
			return fmt.Errorf("point %d of the waveform (%g at %g s) is not finite or beyond ±%g", i+1, p.V, p.T, mostLevel)
		}
		if i > 0 && p.T < w[i-1].T {
			return fmt.Errorf("point %d of the waveform at %g s comes before the one at %g s; sort the points by time", i+1, p.T, w[i-1].T)
		}
	}
	return nil
}

// size is the largest magnitude the waveform takes.
func (w Waveform) size() float64 {
	most := 0.0
	for _, p := range w {
		most = math.Max(most, math.Abs(p.V))
	}
	return most
}

// At gives the value at time t; at a jump, the value after it.
func (w Waveform) At(t float64) float64 {
	v, _, _ := w.piece(t)
	return v
}

// piece gives the value at t, the slope from t on, and until when that slope holds.
func (w Waveform) piece(t float64) (value, slope, until float64) {
	i := sort.Search(len(w), func(i int) bool { return w[i].T > t })
	switch {
	case len(w) == 0:
		return 0, 0, math.Inf(1)
	case i == 0:
		return w[0].V, 0, w[0].T
	case i == len(w):
		return w[i-1].V, 0, math.Inf(1)
	}
	p, q := w[i-1], w[i]
	slope = (q.V - p.V) / (q.T - p.T)
	return p.V + float64(slope*(t-p.T)), slope, q.T
}

// cut gives the part of a waveform from one time to another, with the values at both ends: after a jump at the first,
// before a jump at the last. An infinite end is left as it is.
func (w Waveform) cut(from, till float64) Waveform {
	var part Waveform
	if !math.IsInf(from, 0) {
		part = append(part, Point{from, w.At(from)})
	}
	for _, p := range w {
		if p.T > from && p.T < till {
			part = append(part, p)
		}
	}
	if !math.IsInf(till, 0) {
		part = append(part, Point{till, w.before(till)})
	}
	return part
}

// join puts a part behind another one that ends where it begins; without a jump between them that point is kept once.
func (w Waveform) join(next Waveform) Waveform {
	if n := len(w); n > 0 && w[n-1].T == next[0].T && !jumps(w[n-1].V, next[0].V) {
		w = w[:n-1]
	}
	return append(w, next...)
}

// jumps tells whether two values are more than rounding apart.
func jumps(a, b float64) bool { return math.Abs(a-b) > 1e-9*(math.Abs(a)+math.Abs(b)) }

// before gives the value just before t.
func (w Waveform) before(t float64) float64 {
	i := sort.Search(len(w), func(i int) bool { return w[i].T >= t })
	switch {
	case i == 0:
		return w[0].V
	case i == len(w):
		return w[i-1].V
	}
	p, q := w[i-1], w[i]
	return p.V + float64((q.V-p.V)/(q.T-p.T)*(t-p.T))
}
