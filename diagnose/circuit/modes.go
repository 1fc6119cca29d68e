package circuit

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"sort"
)

// Mode is one natural mode of the present diode pattern.
type Mode struct {
	Rate      complex128 // eigenvalue in 1/s; the imaginary part is zero or positive
	Frequency float64    // of the damped ring in hertz, 0 if it does not ring
	Damping   float64    // damping ratio, -Re/|rate|; 1 if it does not ring, 0 for a mode that never moves
}

// String gives a mode in a line.
func (m Mode) String() string {
	return fmt.Sprintf("%.4g Hz, damping %.3g", m.Frequency, m.Damping)
}

// Modes gives the natural modes of the present diode pattern, the fastest first. A conjugate pair is one mode.
func (r *Run) Modes() ([]Mode, error) {
	if r.sys == nil {
		return nil, r.err
	}
	rates, err := r.sys.eigenvalues()
	if err != nil {
		return nil, err
	}
	var modes []Mode
	for _, l := range rates {
		if imag(l) < 0 {
			continue
		}
		m := Mode{Rate: l, Frequency: imag(l) / (2 * math.Pi)}
		if size := cmplx.Abs(l); size > 0 {
			m.Damping = -real(l) / size
		}
		modes = append(modes, m)
	}
	sort.SliceStable(modes, func(i, j int) bool { return cmplx.Abs(modes[i].Rate) > cmplx.Abs(modes[j].Rate) })
	return modes, nil
}

// eigenvalues gives, until the next are asked for, the rates of the scaled state matrix; values that are zero but for
// rounding are returned as zero.
func (s *system) eigenvalues() ([]complex128, error) {
	if s.nx == 0 {
		return nil, nil
	}
	a := s.scaled()
	for _, v := range a {
		if bad(v) {
			return nil, errors.New("circuit: a time constant is too short for a number; leave out the smallest element")
		}
	}
	rates, ok := eigenvaluesOf(a, s.room.take(2*s.nx), s.nx, s.room.rates[:0])
	if s.room.rates = rates; !ok {
		return nil, errors.New("circuit: the natural modes could not be found; change a value slightly")
	}
	largest := 0.0
	for _, l := range rates {
		largest = math.Max(largest, cmplx.Abs(l))
	}
	for k, l := range rates {
		if cmplx.Abs(l) < 1e-13*largest {
			rates[k] = 0
		}
	}
	return rates, nil
}

// scaled gives the state matrix with states counted in √joule, which puts all its entries on the scale of a rate. It
// holds until the next is asked for.
func (s *system) scaled() []float64 {
	a := s.room.moment(s.nx * s.nx)
	for i := range s.nx {
		for j := range s.nx {
			a[i*s.nx+j] = row(s.rate, s.width, i)[j] * math.Sqrt(s.mass[i]/s.mass[j])
		}
	}
	return a
}
