package belief

import (
	"math"
	"math/bits"
	"slices"
	"sync"
)

// partition sorts the lanes (hypotheses that are not Free) into classes that share one value. of is nil for one class.
type partition struct {
	n  int
	of []int32
}

var oneClass = &partition{n: 1}

// at gives the class of a lane.
func (p *partition) at(lane int) int {
	if p.of == nil {
		return 0
	}
	return int(p.of[lane])
}

// meet is the coarsest partition finer than two others, with the way from its classes to theirs; a nil way is the
// identity, and for a single class there is none to take.
type meet struct {
	p           *partition
	left, right []int32
}

// meeter computes meets and remembers them, up to a bound. It may be used by several goroutines: the classes of a
// meet do not depend on who asks first.
type meeter struct {
	lanes       int
	mu          sync.Mutex
	memo        map[[2]*partition]meet
	known       []*partition // those of findings
	slots       *slots       // made when first needed, as is what follows
	left, right []int32
}

const (
	maxMeets = 1 << 14
	maxKnown = 64
)

func newMeeter(lanes int) *meeter {
	return &meeter{lanes: lanes, memo: map[[2]*partition]meet{}}
}

func (m *meeter) meet(a, b *partition) meet {
	switch {
	case a.n == 1:
		return meet{p: b}
	case b.n == 1 || a == b:
		return meet{p: a}
	}
	m.mu.Lock()
	defer m.mu.Unlock()
	if found, ok := m.memo[[2]*partition{a, b}]; ok {
		return found
	}
	if len(m.memo) > maxMeets {
		clear(m.memo)
	}
	made := m.make(a, b)
	m.memo[[2]*partition{a, b}] = made
	m.memo[[2]*partition{b, a}] = meet{p: made.p, left: made.right, right: made.left}
	return made
}

// same gives a partition met before that is equal to p, so that its meets are found again, or else p.
func (m *meeter) same(p *partition) *partition {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, k := range m.known {
		if slices.Equal(k.of, p.of) {
			return k
		}
	}
	if len(m.known) < maxKnown {
		m.known = append(m.known, p)
	}
	return p
}

// make keeps a partition that is fine enough already, so that later meets are found again.
func (m *meeter) make(a, b *partition) meet {
	if m.slots == nil {
		m.slots = newSlots(m.lanes)
		m.left, m.right = make([]int32, m.lanes), make([]int32, m.lanes)
	}
	if way := m.wayTo(a, b); way != nil {
		return meet{p: a, right: way}
	}
	if way := m.wayTo(b, a); way != nil {
		return meet{p: b, left: way}
	}
	m.slots.reset()
	of, n := make([]int32, m.lanes), int32(0)
	for lane, ca := range a.of {
		cb := b.of[lane]
		id, fresh := m.slots.id(int64(ca)<<32|int64(cb), n)
		if fresh {
			m.left[n], m.right[n] = ca, cb
			n++
		}
		of[lane] = id
	}
	return meet{p: &partition{n: int(n), of: of}, left: slices.Clone(m.left[:n]), right: slices.Clone(m.right[:n])}
}

// wayTo leads from the classes of a to those of b, if a is the finer one; else it is nil.
func (m *meeter) wayTo(a, b *partition) []int32 {
	if a.n < b.n {
		return nil
	}
	way := m.left[:a.n]
	clear(way)
	for lane, ca := range a.of {
		cb := b.of[lane] + 1 // 0: not yet seen
		if way[ca] == 0 {
			way[ca] = cb
		} else if way[ca] != cb {
			return nil
		}
	}
	for c := range way {
		way[c]--
	}
	return slices.Clone(way)
}

// slots numbers keys in the order of their first appearance: an open-addressing table, as maps are too slow here.
type slots struct {
	keys  []int64
	ids   []int32
	ages  []uint32 // a slot is taken if its age is the present one
	age   uint32
	shift uint
}

func newSlots(n int) *slots {
	size := bits.Len(uint(n)) + 1
	return &slots{keys: make([]int64, 1<<size), ids: make([]int32, 1<<size), ages: make([]uint32, 1<<size), age: 1, shift: uint(64 - size)}
}

// reset forgets all keys.
func (s *slots) reset() {
	s.age++
	if s.age == 0 { // ages have come round
		clear(s.ages)
		s.age = 1
	}
}

func (s *slots) id(key int64, next int32) (id int32, fresh bool) {
	i := int(uint64(key) * 0x9E3779B97F4A7C15 >> s.shift)
	for s.ages[i] == s.age {
		if s.keys[i] == key {
			return s.ids[i], false
		}
		i = (i + 1) & (len(s.keys) - 1)
	}
	s.keys[i], s.ids[i], s.ages[i] = key, next, s.age
	return next, true
}

// table is a function of yes/no variables, one value a class: val[entry*classes+class], bit k of the entry being the
// state of vars[k]. True values are val·2^exp[class] (exp nil: 0), or exp(val) in a run on logarithms.
type table struct {
	vars     []int // ascending
	part     *partition
	val      []float64
	exp      []int32
	low, top float64 // log2 bounds of the values that are not 0
	fixed    bool    // a link: its zeros are zeros of the model
	dirty    bool    // while the run is done again: its values have changed
	id       int     // of a likelihood or a result: its number in the run
	asked    bool    // some likelihood is part of it
	wanted   bool    // and one whose derivative is asked for by hypothesis
	root     int     // of a derivative: the root it was taken from
	adj      *table  // derivative of the evidence's probability by the values of this table
}

func (t *table) row(entry int32) []float64 {
	n := t.part.n
	return t.val[int(entry)*n : int(entry)*n+n : int(entry)*n+n]
}

// entries gives the number of rows.
func (t *table) entries() int { return len(t.val) / t.part.n }

// bounds sets low and top from the values.
func (t *table) bounds() {
	least, most := math.Inf(1), 0.0
	for _, v := range t.val {
		if v > most {
			most = v
		}
		if v > 0 && v < least {
			least = v
		}
	}
	t.low, t.top = 0, 0
	if most > 0 {
		_, low := math.Frexp(least)
		_, top := math.Frexp(most)
		t.low, t.top = float64(low-1), float64(top)
	}
}

// rescale multiplies every class by a power of two that brings its largest value just below 1, which is exact, and
// gives these factors.
func (t *table) rescale() (factors []float64) {
	n := t.part.n
	largest := make([]float64, n)
	for at := 0; at < len(t.val); at += n {
		for c, v := range t.val[at : at+n] {
			if v > largest[c] {
				largest[c] = v
			}
		}
	}
	exp := make([]int32, n)
	copy(exp, t.exp)
	for c, v := range largest {
		_, shift := math.Frexp(v)
		exp[c] += int32(shift)
		largest[c] = math.Ldexp(1, -shift)
	}
	for at := 0; at < len(t.val); at += n {
		row := t.val[at : at+n]
		for c, factor := range largest {
			row[c] *= factor
		}
	}
	t.exp = exp
	t.bounds()
	return largest
}

// term is one product in the making of a table: out += a·b, by entries; that of b in its wide form.
type term struct{ out, a, b int32 }

// combine lists the products that make out = a ∘ b with variable sum (−1: none) summed out. Closed variables that both
// hold must agree. Open ones meet by OR: present is a present and b whatever it is, or a absent and b present. So b is
// read in a wide form, which for these variables (digits 3, others 2) has a third state, the sum of both.
func combine(a, b *table, sum int) (vars []int, terms []term, digits []int32) {
	all := union(a.vars, b.vars)
	vars = all
	if sum >= 0 {
		vars = without(all, sum)
	}
	digits = digitsOf(a, b)
	terms = make([]term, 1, 64)
	for k := len(vars) - 1; k >= 0; k-- {
		terms = extend(terms, vars[k], a, b, digits, 1<<k)
	}
	if sum >= 0 {
		terms = extend(terms, sum, a, b, digits, 0)
	}
	return vars, terms, digits
}

// digitsOf gives the states of each variable of b in its wide form.
func digitsOf(a, b *table) []int32 {
	digits := make([]int32, len(b.vars))
	for k, v := range b.vars {
		digits[k] = 2
		if isOpen(v) && contains(a.vars, v) {
			digits[k] = 3
		}
	}
	return digits
}

// extend multiplies the list by the states of one more variable; out is its weight in the result's entry.
func extend(terms []term, v int, a, b *table, digits []int32, out int32) []term {
	inA, wa := weightOf(a.vars, v)
	inB, wb := false, int32(1)
	for k, x := range b.vars {
		if inB = x == v; inB {
			break
		}
		wb *= digits[k]
	}
	if !inB {
		wb = 0
	}
	n := len(terms)
	for _, t := range terms[:n] {
		if inA && inB && isOpen(v) {
			terms = append(terms, term{t.out + out, t.a + wa, t.b + 2*wb}, term{t.out + out, t.a, t.b + wb})
		} else {
			terms = append(terms, term{t.out + out, t.a + wa, t.b + wb})
		}
	}
	return terms
}

func weightOf(vars []int, v int) (bool, int32) {
	for k, x := range vars {
		if x == v {
			return true, 1 << k
		}
	}
	return false, 0
}

// dropZeros leaves out products with a zero of the model; wide is b in its wide form.
func dropZeros(terms []term, a, wide *table) []term {
	if !a.fixed && !wide.fixed {
		return terms
	}
	kept := terms[:0]
	for _, t := range terms {
		if (a.fixed && a.val[t.a] == 0) || (wide.fixed && wide.val[t.b] == 0) {
			continue
		}
		kept = append(kept, t)
	}
	return kept
}

// diagonal lists the states of a table where the open and the closed face of an event agree, the open one dropped.
func diagonal(vars []int, event int) []term {
	kept := without(vars, openVar(event))
	_, open := weightOf(vars, openVar(event))
	terms := make([]term, 1<<len(kept))
	for entry := range terms {
		from := int32(0)
		for k, v := range kept {
			if entry>>k&1 == 0 {
				continue
			}
			_, w := weightOf(vars, v)
			from += w
			if v == closedVar(event) {
				from += open
			}
		}
		terms[entry] = term{out: int32(entry), a: from}
	}
	return terms
}

// union of two ascending lists of variables.
func union(a, b []int) []int {
	out := make([]int, 0, len(a)+len(b))
	i, j := 0, 0
	for i < len(a) && j < len(b) {
		switch {
		case a[i] < b[j]:
			out = append(out, a[i])
			i++
		case a[i] > b[j]:
			out = append(out, b[j])
			j++
		default:
			out = append(out, a[i])
			i, j = i+1, j+1
		}
	}
	out = append(out, a[i:]...)
	return append(out, b[j:]...)
}

func contains(scope []int, v int) bool {
	for _, s := range scope {
		if s == v {
			return true
		}
	}
	return false
}

func without(scope []int, v int) []int {
	out := make([]int, 0, len(scope))
	for _, s := range scope {
		if s != v {
			out = append(out, s)
		}
	}
	return out
}
