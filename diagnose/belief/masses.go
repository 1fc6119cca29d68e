package belief

import (
	"math"
	"sync"
)

// masses gives Σ weight·P(event present | evidence) over the lanes for every event, and the same of absent, for
// each list of weights, which are 0 where the evidence is impossible. The sum, not each lane, is differentiated
// backwards, so every derivative has the classes of its own table and the way back costs about twice the way there.
// It reports false if plain numbers do not suffice.
func (r *run) masses(weights ...[]float64) (present, absent [][]float64, ok bool) {
	present, absent = make([][]float64, len(weights)), make([][]float64, len(weights))
	fine := make([]bool, len(weights))
	var wait sync.WaitGroup
	for k := 1; k < len(weights); k++ {
		wait.Go(func() { present[k], absent[k], fine[k] = r.massesOf(weights[k]) })
	}
	present[0], absent[0], fine[0] = r.massesOf(weights[0])
	wait.Wait()
	ok = true
	for _, f := range fine {
		ok = ok && f
	}
	return present, absent, ok
}

// massesOf works on memory of its own, so that several can go side by side.
func (r *run) massesOf(weights []float64) (present, absent []float64, ok bool) {
	own := &run{m: r.m, logs: r.logs, arena: arenas.Get().(*arena)}
	defer own.release()
	adj := make([]*table, r.tables) // by number of the table
	for _, t := range r.roots {
		if t.asked {
			adj[t.id] = own.seed(t, weights)
		}
	}
	for k := len(r.ops) - 1; k >= 0; k-- {
		o := &r.ops[k]
		if !o.out.asked {
			continue
		}
		up := adj[o.out.id]
		own.unscale(up, o.scale)
		if o.a.asked {
			adj[o.a.id] = own.gathered(o, o.a, up, o.wide, byFirst)
		}
		if o.b.asked {
			adj[o.b.id] = own.narrow(own.gathered(o, o.wide, up, o.a, bySecond), o.b.vars, o.digits)
		}
		own.arena.back(up.val)
	}
	present, absent, ok = make([]float64, len(r.lambda)), make([]float64, len(r.lambda)), true
	for e, l := range r.lambda {
		n := l.part.n
		for c := range n {
			absent[e] += r.both(l.val[c], adj[l.id].val[c])
			present[e] += r.both(l.val[n+c], adj[l.id].val[n+c])
		}
		ok = ok && !math.IsNaN(absent[e]+present[e])
	}
	return present, absent, ok
}

// seed starts from a root: the weights of each class over its value, so that value times derivative is the weight.
func (r *run) seed(t *table, weights []float64) *table {
	sums := r.arena.take(t.part.n)
	clear(sums)
	scatter(sums, weights, t.part.of)
	for c, v := range t.val {
		switch {
		case r.logs && sums[c] == 0:
			sums[c] = math.Inf(-1)
		case r.logs:
			sums[c] = math.Log(sums[c]) - v
		case sums[c] > 0:
			sums[c] /= v
		}
	}
	return &table{part: t.part, val: sums}
}

// unscale turns the derivative by a result that was brought into range into that by the result before.
func (r *run) unscale(up *table, factors []float64) {
	for e := 0; factors != nil && e < up.entries(); e++ {
		row := up.row(int32(e))
		for c, s := range factors {
			row[c] *= s
		}
	}
}

// gathered is the derivative by one factor of an op: that of the result times the other factor, summed by the
// factor's own classes.
func (r *run) gathered(o *op, of, up, other *table, as roles) *table {
	adj := &table{vars: of.vars, part: of.part, val: r.arena.take(len(of.val))}
	to, from := o.met.left, o.met.right
	if as == bySecond {
		to, from = from, to
	}
	n := up.part.n
	row := r.arena.take(n)
	if from != nil {
		other, from = r.expanded(other, n, from, len(o.terms))
	}
	sorted, ends := r.grouped(o.terms, as, of.entries())
	start := int32(0)
	for e, end := range ends {
		dst := adj.row(int32(e))
		if len(dst) == n && to == nil {
			r.sum(dst, sorted[start:end], as, up, other, nil, from)
		} else {
			r.sum(row, sorted[start:end], as, up, other, nil, from)
			r.wipe(dst)
			r.addByClass(dst, row, to)
		}
		start = end
	}
	r.arena.back(row)
	return adj
}

// addByClass adds values to the classes that to leads to; nil: there is one class.
func (r *run) addByClass(dst, values []float64, to []int32) {
	switch {
	case r.logs:
		for i, x := range values {
			c := classAt(to, len(dst), i)
			dst[c] = logAdd(dst[c], x)
		}
	default:
		scatter(dst, values, to)
	}
}

// scatter adds plain values to the classes that to leads to. Neighbours are often of one class, and a sum has to wait
// for the one before; so four sums of each class are kept, while there are few classes.
func scatter(dst, values []float64, to []int32) {
	const few = 256
	n := len(dst)
	if n > few {
		for i, c := range to[:len(values)] {
			dst[c] += values[i]
		}
		return
	}
	var part [4][few]float64
	i := 0
	for ; to != nil && i+4 <= len(values); i += 4 {
		v, c := values[i:i+4:i+4], to[i:i+4:i+4]
		part[0][c[0]&(few-1)] += v[0]
		part[1][c[1]&(few-1)] += v[1]
		part[2][c[2]&(few-1)] += v[2]
		part[3][c[3]&(few-1)] += v[3]
	}
	for ; i < len(values); i++ {
		c := 0
		if to != nil {
			c = int(to[i])
		}
		part[i&3][c] += values[i]
	}
	for c := range dst {
		dst[c] += part[0][c] + part[1][c] + (part[2][c] + part[3][c])
	}
}

// both is a probability times a derivative, as a plain number.
func (r *run) both(value, derivative float64) float64 {
	if r.logs {
		return math.Exp(value + derivative)
	}
	return value * derivative
}
