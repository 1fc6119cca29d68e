package circuit

import "math"

// gather adds the step tried to the second moments of the states, by Gauss-Legendre quadrature on the exact
// solution. Products of any two quantities of the circuit follow from them.
func (r *Run) gather(dt float64, l int) {
	s := r.sys
	n := s.nx
	m := n + 2
	y := r.scratch(m)
	for g := range gaussPoints {
		at := r.tau + float64(gaussNode[g]*dt)
		if l >= 0 {
			s.step(y[:n], r.x, &s.solver.gauss[g][l], &r.seg, r.tau)
		} else {
			s.along(y[:n], gaussNode[g]*dt)
		}
		y[n], y[n+1] = 1, at
		weight := gaussWeight[g] * dt
		for i := range m {
			addTo(row(r.moment, m, i)[:i+1], y[:i+1], weight*y[i])
		}
	}
}

func (r *Run) scratch(n int) []float64 {
	if cap(r.y) < n {
		r.y = make([]float64, n)
	}
	return r.y[:n]
}

// flush turns the moments of the stretch just ended into the energies of the elements.
func (r *Run) flush() {
	if !r.opts.energy || len(r.moment) == 0 {
		return
	}
	s := r.sys
	m := s.nx + 2
	v, i := make([]float64, m), make([]float64, m)
	for k := range r.energy {
		s.collapse(v, s.v(k), &r.seg)
		s.collapse(i, s.i(k), &r.seg)
		r.energy[k] += quadratic(v, i, r.moment)
	}
	clear(r.moment)
}

// quadratic is vᵀ·M·i for a symmetric M of which the lower half is kept.
func quadratic(v, i, m []float64) float64 {
	sum, n := 0.0, len(v)
	for a := range n {
		for b := range a {
			sum += float64(m[a*n+b] * (float64(v[a]*i[b]) + float64(v[b]*i[a])))
		}
		sum += float64(m[a*n+a] * float64(v[a]*i[a]))
	}
	return sum
}

// Energy gives the energy in joules absorbed by a named element so far (negative: given), the integral of its own
// v·i by five-point Gauss-Legendre quadrature on the exact solution of every step. NaN for an unknown element or a
// run started without energies.
func (r *Run) Energy(name string) float64 {
	k, ok := r.c.byName[name]
	if !ok || !r.opts.energy {
		return math.NaN()
	}
	r.flush()
	return r.energy[k]
}

// Stored gives the energy a named capacitor or inductor holds at present (½·C·v² or ½·L·i², joules); NaN otherwise.
// The mutual energy of coupled inductors belongs to none of them and is left out.
func (r *Run) Stored(name string) float64 {
	k, ok := r.c.byName[name]
	if !ok {
		return math.NaN()
	}
	switch b := &r.c.branches[k]; b.kind {
	case capacitor:
		v := r.BranchVoltage(name)
		return 0.5 * b.value * v * v
	case inductor:
		i := r.BranchCurrent(name)
		return 0.5 * b.value * i * i
	}
	return math.NaN()
}
