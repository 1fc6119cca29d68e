package circuit

import "math"

// BranchCurrent gives the present current of a named element, from its first to its second node; NaN if there is none.
func (r *Run) BranchCurrent(name string) float64 { return r.branchForm(name, r.sys.i) }

// BranchVoltage gives the present voltage of a named element, first node minus second; NaN if there is none.
func (r *Run) BranchVoltage(name string) float64 { return r.branchForm(name, r.sys.v) }

func (r *Run) branchForm(name string, form func(int) []float64) float64 {
	k, ok := r.find(name)
	if !ok {
		return math.NaN()
	}
	return r.form(form(k))
}

// Voltage gives the present v(a) - v(b); NaN if a node does not exist.
func (r *Run) Voltage(a, b int) float64 {
	if !r.hasNodes(a, b) {
		return math.NaN()
	}
	return r.form(row(r.sys.node, r.sys.width, a)) - r.form(row(r.sys.node, r.sys.width, b))
}

// Slope gives the present rate of v(a) - v(b) in volts per second, exact; NaN if a node does not exist.
func (r *Run) Slope(a, b int) float64 {
	if !r.hasNodes(a, b) {
		return math.NaN()
	}
	s := r.sys
	f, d := make([]float64, s.width), make([]float64, s.width)
	s.difference(f, a, b)
	s.derive(d, f, 1)
	return r.form(d)
}

func (r *Run) hasNodes(a, b int) bool {
	return r.sys != nil && a >= 0 && b >= 0 && a < len(r.c.nodes) && b < len(r.c.nodes)
}

// Conducts tells whether a named diode conducts at present.
func (r *Run) Conducts(name string) bool {
	k, ok := r.find(name)
	return ok && r.c.branches[k].kind == diode && r.on>>uint(r.c.branches[k].index)&1 == 1
}
