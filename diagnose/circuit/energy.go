package circuit

import "math"

// gather adds the step tried to the second moments of the states, by Gauss-Legendre quadrature on the exact
// solution. Products of any two quantities of the circuit follow from them.
func (r *Run) gather(dt float64, l int) {
	s := r.sys
	n := len(r.x)
	m := n + 2
	y := r.scratch(m)
	for g := range gaussPoints {
		at := r.tau + float64(gaussNode[g]*dt)
		if l >= 0 {
			s.step(y[:n], r.x, &s.solver.gauss[g][l], r.tau)
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

// flush turns the moments of the stretch just ended into the integrals of the elements.
func (r *Run) flush() {
	if !r.opts.energy || len(r.moment) == 0 {
		return
	}
	s := r.sys
	m := len(r.x) + 2
	y := r.scratch(2 * m)
	v, i := y[:m], y[m:]
	for k := range r.totals {
		s.collapse(v, s.v(k), &r.seg)
		s.collapse(i, s.i(k), &r.seg)
		t := &r.totals[k]
		t.energy += quadratic(v, i, r.moment)
		t.charge += linear(i, r.moment)
		t.square += quadratic(i, i, r.moment)
	}
	clear(r.moment)
}

// clearMoment makes the moments fit the present states and empties them.
func (r *Run) clearMoment() {
	n := len(r.x) + 2
	r.room.resize(&r.moment, n*n)
}

// linear is the integral of a form over [states | 1 | τ]: the row of the moments that belongs to the 1.
func linear(i, m []float64) float64 {
	n := len(i)
	one := n - 2
	return dot(i[:one+1], m[one*n:]) + float64(i[n-1]*m[(n-1)*n+one])
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
func (r *Run) Energy(name string) float64 { return r.total(name).energy }

// Charge gives the charge in coulombs that has flowed through a named element so far, from its first to its second
// node: the integral of its current, from the same quadrature as Energy. NaN as there.
func (r *Run) Charge(name string) float64 { return r.total(name).charge }

// Square gives the integral of the squared current of a named element so far in A²·s, from the same quadrature as
// Energy, and never below zero, where rounding would bring it. The heat in a resistance R in series is R times this; over a
// period T the rms current is √(Square/T). NaN as for Energy.
func (r *Run) Square(name string) float64 { return math.Max(r.total(name).square, 0) }

// total holds the integrals of one element.
type total struct{ energy, charge, square float64 }

func (r *Run) total(name string) total {
	k, ok := r.find(name)
	if !ok || !r.opts.energy {
		return total{math.NaN(), math.NaN(), math.NaN()}
	}
	r.flush()
	return r.totals[k]
}

// Stored gives the energy a named capacitor or inductor holds at present (½·C·v² or ½·L·i², joules); NaN otherwise.
// The mutual energy of coupled inductors belongs to none of them and is left out.
func (r *Run) Stored(name string) float64 {
	k, ok := r.find(name)
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
