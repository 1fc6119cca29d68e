package belief

import (
	"math"
	"math/bits"
	"slices"
)

// step is one move of the elimination. merge closes an event: the contributions of all its parents have met, and from
// then on it is an ordinary yes/no variable. The other kind sums the event out. merge comes before the sum.
type step struct {
	event int
	merge bool
}

// Every event has two faces in table scopes: where contributions to it still meet by OR, and where it is closed.
func closedVar(event int) int { return 2 * event }
func openVar(event int) int   { return 2*event + 1 }
func isOpen(v int) bool       { return v&1 == 1 }

// effort is what a step takes: the variables it joins and leaves, the estimated values of its input tables, and the
// estimated classes of its result.
type effort struct {
	joined, result  int
	inputs, classes float64
}

// rule scores a candidate step; the lowest goes first.
type rule func(e effort) float64

// rules are the greedy orders that are tried; the cheapest one found is kept.
var rules = []rule{
	func(e effort) float64 { return size(e.result) * e.classes },
	func(e effort) float64 { return float64(size(e.result)*e.classes) - e.inputs },
	func(e effort) float64 { return float64(size(e.result)*32) - e.inputs/e.classes },
}

func size(vars int) float64 { return float64(uint64(1) << min(vars, 60)) }

// plan is an elimination order with what it costs.
type plan struct {
	steps []step
	cost  float64 // estimated products over all classes
	width int     // variables of the largest table
}

// planBook holds the elimination order of one network. It may be shared by models that differ in numbers only; its
// estimates are those of the first.
type planBook struct {
	events []Event
	spread []float64 // by event: how far its triggers split the hypotheses, see classes
	lanes  float64
	plan   plan
}

// newPlanBook keeps the cheapest of the greedy orders for all events.
func newPlanBook(m *Model) *planBook {
	b := &planBook{events: m.events, lanes: float64(len(m.lanes)), plan: plan{cost: -1}}
	for _, l := range m.leaks {
		b.spread = append(b.spread, math.Sqrt(2*float64(l.part.n-1)))
	}
	for _, r := range rules {
		p := newPlanner(b)
		p.run(r)
		if b.plan.cost < 0 || p.plan.cost < b.plan.cost {
			b.plan = p.plan
		}
	}
	return b
}

// fits reports whether a model has the network the book was made for.
func (b *planBook) fits(m *Model) bool {
	if len(b.events) != len(m.events) || b.lanes != float64(len(m.lanes)) {
		return false
	}
	for e, ev := range b.events {
		if !slices.EqualFunc(ev.Parents, m.events[e].Parents, func(p, q Parent) bool { return p.Event == q.Event }) {
			return false
		}
	}
	return true
}

// classes estimates into how many classes a table falls: k causes of which at most two act together make about k²/2.
func (b *planBook) classes(spread float64) float64 {
	pairs := float64(spread * spread / 2) // converted, as no product may be fused with the sum
	return math.Min(b.lanes, 1+pairs)
}

// order gives the steps for the events in use. Every parent of an event in use is in use; what is left of the order
// then joins no table that the whole of it would not.
func (b *planBook) order(use []bool) []step {
	steps := make([]step, 0, len(b.plan.steps))
	for _, s := range b.plan.steps {
		if use[s.event] {
			steps = append(steps, s)
		}
	}
	return steps
}

// planner plays an elimination on scopes alone. A scope is a set of variables, as bits.
type planner struct {
	plan
	book   *planBook
	words  int
	scopes [][]uint64 // by table; nil once it is used up
	spread []float64  // by table
	at     [][]int32  // by variable: the tables that may hold it
	next   []int8     // by event: 0 merge, 1 sum, 2 done
	score  []float64
	stale  []bool
	joined []uint64 // scratch
}

func newPlanner(b *planBook) *planner {
	n := len(b.events)
	p := &planner{
		book:  b,
		words: (2*n + 63) / 64, at: make([][]int32, 2*n), next: make([]int8, n),
		score: make([]float64, n), stale: make([]bool, n),
	}
	p.joined = make([]uint64, p.words)
	for e, ev := range b.events {
		p.stale[e] = true
		p.add(0, closedVar(e)) // the likelihood of its findings
		if len(ev.Parents) == 0 {
			p.next[e] = 1
			p.add(b.spread[e], closedVar(e))
			continue
		}
		p.next[e] = 0
		p.add(b.spread[e], openVar(e))
		for _, pa := range ev.Parents {
			p.add(0, closedVar(pa.Event), openVar(e))
		}
	}
	return p
}

func (p *planner) add(spread float64, vars ...int) {
	scope := make([]uint64, p.words)
	for _, v := range vars {
		scope[v/64] |= 1 << (v % 64)
		p.at[v] = append(p.at[v], int32(len(p.scopes)))
	}
	p.scopes, p.spread = append(p.scopes, scope), append(p.spread, spread)
}

func (p *planner) run(r rule) {
	for {
		best := -1
		for e, stage := range p.next {
			if stage == 2 {
				continue
			}
			if p.stale[e] {
				p.score[e], p.stale[e] = p.rate(p.face(e), r), false
			}
			if best < 0 || p.score[e] < p.score[best] {
				best = e
			}
		}
		if best < 0 {
			return
		}
		p.steps = append(p.steps, step{event: best, merge: p.next[best] == 0})
		p.take(best)
	}
}

// face is the variable the next step of an event works on.
func (p *planner) face(e int) int {
	if p.next[e] == 0 {
		return openVar(e)
	}
	return closedVar(e)
}

// join collects the variables of all tables that hold v, and gives their number, that of the tables, how far they
// split the hypotheses, and their values.
func (p *planner) join(v int) (vars, tables int, spread, inputs float64) {
	clear(p.joined)
	for _, t := range p.at[v] {
		if p.scopes[t] == nil {
			continue
		}
		own := 0
		for w, x := range p.scopes[t] {
			p.joined[w] |= x
			own += bits.OnesCount64(x)
		}
		tables, spread, inputs = tables+1, spread+p.spread[t], inputs+float64(size(own)*p.book.classes(p.spread[t]))
	}
	for _, x := range p.joined {
		vars += bits.OnesCount64(x)
	}
	return vars, tables, spread, inputs
}

func (p *planner) rate(v int, r rule) float64 {
	vars, _, spread, inputs := p.join(v)
	e := effort{joined: vars, result: vars, inputs: inputs, classes: p.book.classes(spread)}
	if !isOpen(v) {
		e.result--
	}
	return r(e)
}

func (p *planner) take(e int) {
	v := p.face(e)
	vars, tables, spread, _ := p.join(v)
	for _, t := range p.at[v] {
		p.scopes[t] = nil
	}
	p.width = max(p.width, vars)
	p.cost += float64(float64(tables) * size(vars) * p.book.classes(spread))
	p.next[e]++
	p.joined[v/64] &^= 1 << (v % 64)
	if isOpen(v) {
		c := closedVar(e)
		p.joined[c/64] |= 1 << (c % 64)
	}
	made := append([]uint64(nil), p.joined...)
	for w, x := range made {
		for ; x != 0; x &= x - 1 {
			u := w*64 + bits.TrailingZeros64(x)
			p.at[u] = append(p.at[u], int32(len(p.scopes)))
			p.stale[u/2] = true
		}
	}
	p.scopes, p.spread = append(p.scopes, made), append(p.spread, spread)
	p.stale[e] = true
}
