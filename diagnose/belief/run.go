package belief

import "math"

// safeBits is how far apart (as a power of two) the values of a table may lie before a product of two could
// underflow; beyond it the whole run is repeated on logarithms.
const safeBits = 480

// op is one combination that was done, kept for the way back.
type op struct {
	out, a, b *table
	wide      *table // b in its wide form, see combine
	digits    []int32
	terms     []term
	met       meet
	scale     []float64 // by class: what the result was multiplied by to stay in range; nil: nothing
}

// run is one elimination.
type run struct {
	m        *Model
	logs     bool
	arena    *arena
	scaled   bool // derivatives keep their exponents
	squeezed bool // plain numbers do not suffice
	live     []*table
	roots    []*table
	ops      []op
	tables   int    // how many have a number
	sorted   []term // scratch, as is what follows
	ends     []int32
	lambda   []*table // by event
}

// request says what a run is for.
type request struct {
	likelihoods []*likelihood // by event, nil: nothing observed
	wanted      []bool        // by event: it may be asked about; nil for none
	scaled      bool          // the derivatives are needed to scale, not only their ratio
}

// eliminate runs forwards; on logarithms if plain numbers do not suffice.
func (m *Model) eliminate(q request) *run {
	for _, logs := range []bool{false, true} {
		r := m.newRun(logs)
		r.scaled = q.scaled
		r.forward(q)
		if !r.squeezed {
			return r
		}
		r.release()
	}
	return nil // not reached: a run on logarithms is never squeezed
}

func (m *Model) newRun(logs bool) *run {
	return &run{m: m, logs: logs, arena: arenas.Get().(*arena), lambda: make([]*table, len(m.events))}
}

// release ends a run: its tables may not be used any more.
func (r *run) release() { r.arena.release() }

// inUse marks the events that have a finding, or are asked for, at or below them; the others sum to 1.
func (m *Model) inUse(q request) []bool {
	use := make([]bool, len(m.events))
	for e := len(m.events) - 1; e >= 0; e-- {
		use[e] = use[e] || q.likelihoods[e] != nil || (q.wanted != nil && q.wanted[e])
		if use[e] {
			for _, p := range m.events[e].Parents {
				use[p.Event] = true
			}
		}
	}
	return use
}

func (r *run) forward(q request) {
	use := r.m.inUse(q)
	for e := range r.m.events {
		if !use[e] {
			continue
		}
		wanted := q.wanted != nil && q.wanted[e]
		if q.likelihoods[e] != nil || wanted {
			r.lambda[e] = r.likelihoodTable(e, q.likelihoods[e], wanted)
			r.live = append(r.live, r.lambda[e])
		}
		r.live = append(r.live, r.leafTable(r.m.leaks[e], false))
		for _, l := range r.m.links[e] {
			r.live = append(r.live, r.leafTable(l, true))
		}
	}
	for _, s := range r.m.plans.order(use) {
		if !r.squeezed {
			r.take(s)
		}
	}
}

func (r *run) leafTable(l leaf, fixed bool) *table {
	t := &table{vars: l.vars, part: l.part, val: l.val, fixed: fixed && !r.logs}
	t.bounds()
	r.squeezed = r.squeezed || (!r.logs && t.low < -safeBits)
	if r.logs {
		t.val = logsOf(l.val)
	}
	return t
}

func logsOf(values []float64) []float64 {
	out := make([]float64, len(values))
	for i, v := range values {
		out[i] = math.Log(v)
	}
	return out
}

func (r *run) likelihoodTable(e int, l *likelihood, wanted bool) *table {
	if l == nil {
		l = noFinding
	}
	t := &table{vars: []int{closedVar(e)}, part: l.part, val: make([]float64, 2*l.part.n), asked: true, wanted: wanted, id: r.tables}
	r.tables++
	r.setLikelihood(t, l)
	return t
}

// setLikelihood fills in a likelihood; it has the classes of the table.
func (r *run) setLikelihood(t *table, l *likelihood) {
	n := t.part.n
	if r.logs {
		for c := 0; c < n; c++ {
			t.val[c], t.val[n+c] = l.absent[c].log(), l.present[c].log()
		}
		return
	}
	t.exp = nil
	if !l.moderate() {
		t.exp = make([]int32, n)
	}
	for c := 0; c < n; c++ {
		a, p, shift := l.absent[c], l.present[c], 0
		if t.exp != nil {
			shift = commonShift(a, p)
			t.exp[c] = int32(shift)
		}
		t.val[c], t.val[n+c] = math.Ldexp(a.mant, a.exp-shift), math.Ldexp(p.mant, p.exp-shift)
		lost := (t.val[c] == 0) != (a.mant == 0) || (t.val[n+c] == 0) != (p.mant == 0)
		r.squeezed = r.squeezed || lost
	}
	t.bounds()
	r.squeezed = r.squeezed || t.low < -safeBits
}

// commonShift is the power of two that brings the larger of two values just below 1.
func commonShift(a, b scaled) int {
	switch {
	case a.mant == 0:
		return b.exp
	case b.mant == 0:
		return a.exp
	default:
		return max(a.exp, b.exp)
	}
}

// take does one step: all live tables with the variable become one.
func (r *run) take(s step) {
	v := closedVar(s.event)
	if s.merge {
		v = openVar(s.event)
	}
	var joined []*table
	kept := r.live[:0] // in place: never ahead of what is read
	for _, t := range r.live {
		if contains(t.vars, v) {
			joined = append(joined, t)
		} else {
			kept = append(kept, t)
		}
	}
	for len(joined) > 2 {
		a := takeSmallest(&joined)
		b := takeSmallest(&joined)
		joined = append(joined, r.product(a, b, -1))
	}
	var out *table
	if s.merge {
		out = r.merged(joined, s.event)
	} else {
		if len(joined) == 1 {
			joined = append(joined, r.unit())
		}
		out = r.product(joined[0], joined[1], v)
	}
	r.live = kept
	if len(out.vars) == 0 {
		r.roots = append(r.roots, out)
		return
	}
	r.live = append(r.live, out)
}

// takeSmallest removes the table with the fewest values, the first of equals.
func takeSmallest(tables *[]*table) *table {
	list := *tables
	best := 0
	for i, t := range list {
		if len(t.val) < len(list[best].val) {
			best = i
		}
	}
	t := list[best]
	*tables = append(list[:best:best], list[best+1:]...)
	return t
}

// unit is the table of no variables with value 1.
func (r *run) unit() *table {
	t := &table{part: oneClass, val: []float64{1}}
	if r.logs {
		t.val[0] = 0
	}
	return t
}

// merged joins the last contributions to an event and closes it. A table that already held the closed event (through
// a child that was closed first) keeps the states where both faces agree.
func (r *run) merged(joined []*table, event int) *table {
	out := joined[0]
	if len(joined) == 2 {
		out = r.product(joined[0], joined[1], -1)
	}
	if contains(out.vars, closedVar(event)) {
		return r.apply(op{a: out, b: r.unit(), terms: diagonal(out.vars, event)}, without(out.vars, openVar(event)))
	}
	vars := append([]int(nil), out.vars...)
	for i, v := range vars {
		if v == openVar(event) {
			vars[i] = closedVar(event)
		}
	}
	out.vars = vars
	return out
}

// product combines two tables, summing out a variable (−1: none).
func (r *run) product(a, b *table, sum int) *table {
	if len(a.val) < len(b.val) {
		a, b = b, a
	}
	vars, terms, digits := combine(a, b, sum)
	return r.apply(op{a: a, b: b, terms: terms, digits: digits}, vars)
}

// apply does a list of products and keeps it for the way back.
func (r *run) apply(o op, vars []int) *table {
	o.met = r.m.meets.meet(o.a.part, o.b.part)
	o.out = r.blank(vars, o.met.p)
	o.out.id = r.tables
	r.tables++
	o.out.asked, o.out.wanted = o.a.asked || o.b.asked, o.a.wanted || o.b.wanted
	o.wide = r.widen(o.b, o.digits)
	o.terms = dropZeros(o.terms, o.a, o.wide)
	r.do(&o)
	r.ops = append(r.ops, o)
	return o.out
}

// do computes the result of an op whose values are still blank.
func (r *run) do(o *op) {
	o.out.exp = joinExponents(o.a.exp, o.b.exp, o.met, o.a.part.n, o.b.part.n)
	r.products(o.out, o.terms, forwards, o.a, o.wide, o.met)
	// a wide form sums up to (3/2)^k entries in one
	o.scale = r.keepInRange(o.out, o.a, o.b, len(o.terms)*o.wide.entries()/o.b.entries())
}

// redo computes anew what depends on the likelihood of one event, after that has changed.
func (r *run) redo(changed *table) {
	changed.dirty = true
	for k := range r.ops {
		o := &r.ops[k]
		if o.out.dirty = o.a.dirty || o.b.dirty; !o.out.dirty {
			continue
		}
		if o.b.dirty && o.wide != o.b {
			o.wide = r.widen(o.b, o.digits)
		}
		r.do(o)
	}
	changed.dirty = false
}

// blank is a table whose values are still to be set.
func (r *run) blank(vars []int, part *partition) *table {
	return &table{vars: vars, part: part, val: r.arena.take(part.n << len(vars))}
}

// wipe sets values to 0.
func (r *run) wipe(values []float64) {
	if !r.logs {
		clear(values)
		return
	}
	for i := range values {
		values[i] = math.Inf(-1)
	}
}

// keepInRange carries the bounds on and rescales before they allow an underflow; it gives the factors, nil for none.
func (r *run) keepInRange(out, a, b *table, terms int) []float64 {
	if r.logs {
		return nil
	}
	out.low, out.top = a.low+b.low, a.top+b.top+math.Log2(float64(terms+1))
	if out.low > -safeBits && out.top < safeBits {
		return nil
	}
	if out.bounds(); out.low > -safeBits && out.top < safeBits { // what was carried on was too careful
		return nil
	}
	factors := out.rescale()
	r.squeezed = r.squeezed || out.low < -safeBits
	return factors
}

// joinExponents adds the exponents of two tables, class by class.
func joinExponents(a, b []int32, met meet, na, nb int) []int32 {
	if a == nil && b == nil {
		return nil
	}
	out := make([]int32, met.p.n)
	addExponents(out, a, met.left, na)
	addExponents(out, b, met.right, nb)
	return out
}

func addExponents(out, from, way []int32, n int) {
	if from == nil {
		return
	}
	for c := range out {
		switch {
		case n == 1:
			out[c] += from[0]
		case way == nil:
			out[c] += from[c]
		default:
			out[c] += from[way[c]]
		}
	}
}
