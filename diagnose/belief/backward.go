package belief

// want marks the likelihoods of some events, and all that follows from them, for the way back.
func (r *run) want(events []int) {
	for _, l := range r.lambda {
		if l != nil {
			l.wanted = false
		}
	}
	for _, e := range events {
		r.lambda[e].wanted = true
	}
	for _, o := range r.ops {
		o.out.wanted = o.a.wanted || o.b.wanted
	}
}

// backwards differentiates by the likelihoods of some events, on logarithms if plain numbers do not suffice. It gives
// the run to go on with.
func (r *run) backwards(q request, events []int) *run {
	r.want(events)
	if r.backward(); !r.squeezed {
		return r
	}
	r.release()
	again := r.m.newRun(true)
	again.scaled = r.scaled
	again.forward(q)
	again.want(events)
	again.backward()
	return again
}

// backward differentiates the probability of the evidence under each hypothesis by every table that leads to a wanted
// likelihood.
func (r *run) backward() {
	for k, t := range r.roots {
		t.adj = r.unit()
		t.adj.root = k
	}
	for k := len(r.ops) - 1; k >= 0 && !r.squeezed; k-- {
		o := &r.ops[k]
		if o.a.wanted {
			o.a.adj = r.derivative(o, o.a, o.wide, byFirst)
		}
		if o.b.wanted {
			o.b.adj = r.narrow(r.derivative(o, o.wide, o.a, bySecond), o.b.vars, o.digits)
		}
		if o.out.adj != nil && len(o.out.vars) > 0 { // a root is still needed
			r.arena.back(o.out.adj.val)
			o.out.adj = nil
		}
	}
}

// derivative by one factor of a product: that of the result times the other factor.
func (r *run) derivative(o *op, of, other *table, as roles) *table {
	up := o.out.adj
	met := r.m.meets.meet(up.part, other.part)
	adj := &table{vars: of.vars, part: met.p, val: r.arena.take(of.entries() * met.p.n), root: up.root}
	if r.scaled {
		adj.exp = joinExponents(up.exp, other.exp, met, up.part.n, other.part.n)
	}
	r.products(adj, o.terms, as, up, other, met)
	r.keepInRange(adj, up, other, len(o.terms))
	return adj
}
