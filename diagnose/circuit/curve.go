package circuit

import (
	"fmt"
	"math"
)

// Curve is a bent piece of a source's waveform. From From to Till seconds the value u begins at Value (volt or ampere) with
// the slope Slope and goes by
//
//	u″ = Bend − Damping·(u′ − Slope) − Spring·(u − Value)
//
// which the solver follows exactly, as it does straight lines. Parabola, Cosine and Decay give the usual ones; damping (1/s)
// and spring (1/s²) are zero or above.
type Curve struct{ From, Till, Value, Slope, Bend, Damping, Spring float64 }

// Parabola begins at a value with a slope, which grows by bend each second.
func Parabola(from, till, value, slope, bend float64) Curve {
	return Curve{From: from, Till: till, Value: value, Slope: slope, Bend: bend}
}

// Cosine goes from one value to another on half a cosine, level at both ends.
func Cosine(from, till, value, end float64) Curve {
	rate := math.Pi / (till - from)
	return Curve{From: from, Till: till, Value: value, Bend: rate * rate * (end - value) / 2, Spring: rate * rate}
}

// Decay falls from a value towards zero with a time constant (seconds, above zero).
func Decay(from, till, value, time float64) Curve {
	return Curve{From: from, Till: till, Value: value, Slope: -value / time, Bend: value / (time * time), Damping: 1 / time}
}

// At gives the value at a time from From to Till.
func (c Curve) At(t float64) float64 { return c.on(t).Value }

// on gives the rest of the curve from a time on.
func (c Curve) on(t float64) Curve {
	v := c.deviation(t - c.From)
	c.From, c.Value, c.Slope, c.Bend = t, c.Value+float64(c.Slope*(t-c.From))+v[0], c.Slope+v[1],
		c.Bend-float64(c.Damping*v[1])-float64(c.Spring*(float64(c.Slope*(t-c.From))+v[0]))
	return c
}

// deviation is how far the curve is from its first tangent after a time, and the rate of that.
func (c Curve) deviation(t float64) [2]float64 {
	halvings := 0
	for h := t * c.rate(); h > smallNorm && halvings < mostLevels; h /= 2 {
		halvings++
	}
	l := c.short(math.Ldexp(t, -halvings))
	for range halvings {
		l = l.twice()
	}
	return [2]float64{l[0][2], l[1][2]}
}

// rate is that of its fastest change.
func (c Curve) rate() float64 { return math.Max(c.Damping, math.Sqrt(c.Spring)) }

// bent is what a step adds to deviation, its rate, 1 and the time: the first two rows of a matrix; the last place is the
// length of the step.
type bent [3][4]float64

// short is the matrix of a step that is short against the curve, by its Taylor series.
func (c Curve) short(h float64) (l bent) {
	var term bent
	term[0][1], term[1] = h, [4]float64{-c.Spring * h, -c.Damping * h, c.Bend * h, -c.Spring * c.Slope * h}
	for k := 2.0; ; k++ {
		for i := range 2 {
			for j := range 4 {
				l[i][j] += term[i][j]
			}
		}
		if k > degree+2 {
			l[2][0] = h
			return l
		}
		next := bent{term[1]}
		for j := range 4 {
			next[1][j] = -float64(c.Spring*term[0][j]) - float64(c.Damping*term[1][j])
		}
		if k == 2 { // the time has moved on
			next[1][2] -= float64(c.Spring * c.Slope * h)
		}
		for i := range 2 {
			for j := range 4 {
				next[i][j] *= h / k
			}
		}
		term = next
	}
}

// twice is the matrix of a step twice as long.
func (l bent) twice() (d bent) {
	for i := range 2 {
		for j := range 4 {
			d[i][j] = 2*l[i][j] + float64(l[i][0]*l[0][j]) + float64(l[i][1]*l[1][j])
		}
		d[i][2] += float64(l[i][3] * l[2][0])
	}
	d[2][0] = 2 * l[2][0]
	return d
}

// curvePoints is how many straight pieces stand for a curve where only those are possible.
const curvePoints = 96

// Check tells whether the curve can be used: finite, of some length, not growing by itself.
func (c Curve) Check() error {
	if !(c.From < c.Till) || bad(c.From) || bad(c.Till) {
		return fmt.Errorf("the curve from %g s to %g s has no length; let it end after it begins", c.From, c.Till)
	}
	if !(c.Damping >= 0) || !(c.Spring >= 0) || bad(c.Damping) || bad(c.Spring) {
		return fmt.Errorf("the curve at %g s has the damping %g and the spring %g; both must be zero or above", c.From, c.Damping, c.Spring)
	}
	t := c.Till - c.From // damping and spring only hold it back from the parabola that starts alike
	reach := math.Abs(c.Value) + float64(math.Abs(c.Slope)*t) + float64(math.Abs(c.Bend+float64(c.Damping*c.Slope))*t*t/2)
	if !(reach <= mostLevel) {
		return fmt.Errorf("the curve from %g s may reach %g, beyond ±%g; let it begin lower, less steep or for less time", c.From, reach, mostLevel)
	}
	return nil
}

// source is what a source does: a waveform, and curves in place of parts of it.
type source struct {
	wave   Waveform
	curves []Curve
}

// check tells whether waveform and curves can be used.
func (s source) check() error {
	if err := s.wave.Check(); err != nil {
		return err
	}
	for k, c := range s.curves {
		if err := c.Check(); err != nil {
			return err
		}
		if k > 0 && c.From < s.curves[k-1].Till {
			return fmt.Errorf("the curve at %g s begins before the one ahead of it ends (%g s); sort them and let them not overlap",
				c.From, s.curves[k-1].Till)
		}
	}
	return nil
}

// piece gives what the source does from t on, as a curve; straight tells that it does not bend.
func (s source) piece(t float64) (c Curve, straight bool) {
	next := math.Inf(1)
	for _, c := range s.curves {
		if c.From <= t && t < c.Till {
			return c.on(t), false
		}
		if t < c.From {
			next = math.Min(next, c.From)
		}
	}
	c.From = t
	c.Value, c.Slope, c.Till = s.wave.piece(t)
	c.Till = math.Min(c.Till, next)
	return c, true
}

// size is the largest magnitude that the source takes, at the ends of its pieces.
func (s source) size() float64 {
	most := s.wave.size()
	for _, c := range s.curves {
		most = math.Max(most, math.Max(math.Abs(c.Value), math.Abs(c.At(c.Till))))
	}
	return most
}

// straight gives the source in straight pieces.
func (s source) straight() Waveform {
	w := s.wave
	for _, c := range s.curves {
		bow := w.cut(math.Inf(-1), c.From)
		var arc Waveform
		for k := range curvePoints {
			t := c.From + float64((c.Till-c.From)*float64(k)/curvePoints)
			arc = append(arc, Point{t, c.At(t)})
		}
		arc = append(arc, Point{c.Till, c.At(c.Till)})
		w = bow.join(arc).join(w.cut(c.Till, math.Inf(1)))
	}
	return w
}
