package belief

import "math"

// leaf is a table the elimination starts from, in plain numbers.
type leaf struct {
	vars []int
	part *partition
	val  []float64
}

// touch is what a hypothesis with triggers of an event makes of its leak.
type touch struct {
	lane            int
	absent, present float64
}

// compileLeaves makes the tables of leaks and links. The leak of an event is joined with the triggers of each
// hypothesis, and hypotheses with the same result share a class.
func (m *Model) compileLeaves() {
	touched := m.touches()
	most := 0
	for _, t := range touched {
		most = max(most, len(t))
	}
	pairs := newPairSlots(most)
	m.leaks, m.links = make([]leaf, len(m.events)), make([][]leaf, len(m.events))
	for e, ev := range m.events {
		m.leaks[e] = leakLeaf(e, ev, touched[e], len(m.lanes), pairs)
		for _, p := range ev.Parents {
			m.links[e] = append(m.links[e], linkLeaf(p, e))
		}
	}
}

func (m *Model) touches() [][]touch {
	touched, count := make([][]touch, len(m.events)), make([]int, len(m.events))
	for _, h := range m.lanes {
		for _, t := range m.hyps[h].Triggers {
			count[t.Event]++
		}
	}
	for e, n := range count {
		touched[e] = make([]touch, 0, n)
	}
	for lane, h := range m.lanes {
		for _, t := range m.hyps[h].Triggers {
			list := touched[t.Event]
			if len(list) == 0 || list[len(list)-1].lane != lane {
				leak := m.events[t.Event].Leak
				list = append(list, touch{lane, 1 - leak, leak})
			}
			last := &list[len(list)-1]
			// p + t·(1−p) keeps the digits of rare events, 1 − (1−p)(1−t) would not
			last.present += float64(t.P * last.absent)
			last.absent *= 1 - t.P
			touched[t.Event] = list
		}
	}
	return touched
}

func leakLeaf(e int, ev Event, touched []touch, lanes int, pairs *pairSlots) leaf {
	v := closedVar(e)
	if len(ev.Parents) > 0 {
		v = openVar(e)
	}
	var absent, present []float64
	if len(touched) < lanes { // class 0: the lanes that no trigger touches
		absent, present = append(absent, 1-ev.Leak), append(present, ev.Leak)
	}
	of := make([]int32, lanes)
	pairs.reset()
	offset := int32(len(absent))
	for _, t := range touched {
		id, fresh := pairs.id(t.absent, t.present)
		if fresh {
			absent, present = append(absent, t.absent), append(present, t.present)
		}
		of[t.lane] = id + offset
	}
	return leaf{vars: []int{v}, part: partitionOf(len(absent), of), val: append(absent, present...)}
}

func partitionOf(n int, of []int32) *partition {
	if n == 1 {
		return oneClass
	}
	return &partition{n: n, of: of}
}

// linkLeaf is the contribution of one parent: nothing when it is absent.
func linkLeaf(p Parent, child int) leaf {
	return leaf{ // the parent's variable is the lower one, so it is bit 0
		vars: []int{closedVar(p.Event), openVar(child)},
		part: oneClass,
		val:  []float64{1, 1 - p.P, 0, p.P},
	}
}

// pairSlots numbers pairs of values in the order of their first appearance.
type pairSlots struct {
	first, second, both    *slots
	firsts, seconds, pairs int32
}

func newPairSlots(n int) *pairSlots {
	return &pairSlots{first: newSlots(n), second: newSlots(n), both: newSlots(n)}
}

// reset forgets all pairs.
func (s *pairSlots) reset() {
	for _, x := range []*slots{s.first, s.second, s.both} {
		x.reset()
	}
	s.firsts, s.seconds, s.pairs = 0, 0, 0
}

func (s *pairSlots) id(a, b float64) (id int32, fresh bool) {
	ia, fresh := s.first.id(int64(math.Float64bits(a)), s.firsts)
	if fresh {
		s.firsts++
	}
	ib, fresh := s.second.id(int64(math.Float64bits(b)), s.seconds)
	if fresh {
		s.seconds++
	}
	id, fresh = s.both.id(int64(ia)<<32|int64(ib), s.pairs)
	if fresh {
		s.pairs++
	}
	return id, fresh
}

// scaled is mant·2^exp with mant in [0.5, 1), or 0: a product of likelihoods that cannot underflow.
type scaled struct {
	mant float64
	exp  int
}

var scaledOne = scaled{0.5, 1}

func (s scaled) times(x float64) scaled {
	mant, e := math.Frexp(x)
	mant, carry := math.Frexp(s.mant * mant)
	if mant == 0 {
		return scaled{}
	}
	return scaled{mant, s.exp + e + carry}
}

func (s scaled) log() float64 { return logOf(s.mant, int32(s.exp)) }

// logOf gives ln(val·2^exp), minus infinity for 0.
func logOf(val float64, exp int32) float64 {
	return math.Log(val) + float64(float64(exp)*math.Ln2)
}

// likelihood is what all findings at one event say, by class of lanes.
type likelihood struct {
	part            *partition
	absent, present []scaled
}

// gather joins the findings at each event, leaving out finding skip (−1: none). Events without findings stay nil.
func (m *Model) gather(ev []Evidence) []*likelihood {
	byEvent := make([][]Evidence, len(m.events))
	for _, f := range ev {
		if f.Event >= 0 {
			byEvent[f.Event] = append(byEvent[f.Event], f)
		}
	}
	out := make([]*likelihood, len(m.events))
	for e, findings := range byEvent {
		if len(findings) > 0 {
			out[e] = m.likelihoodOf(findings)
		}
	}
	return out
}

func (m *Model) likelihoodOf(findings []Evidence) *likelihood {
	part := oneClass
	for _, f := range findings {
		part = m.meets.meet(part, m.classesOf(f)).p
	}
	l := newLikelihood(part)
	rep := representatives(part, len(m.lanes))
	for k := range findings {
		m.multiply(l, &findings[k], rep)
	}
	return l
}

// noFinding is the likelihood where nothing was observed.
var noFinding = newLikelihood(oneClass)

func newLikelihood(part *partition) *likelihood {
	l := &likelihood{part: part, absent: make([]scaled, part.n), present: make([]scaled, part.n)}
	for c := range l.absent {
		l.absent[c], l.present[c] = scaledOne, scaledOne
	}
	return l
}

// moderateBits is how far from 1 (as a power of two) likelihoods may lie to be used as they are.
const moderateBits = 64

// moderate reports whether all values that are not 0 lie near 1.
func (l *likelihood) moderate() bool {
	for c := range l.absent {
		if abs(l.absent[c].exp) > moderateBits || abs(l.present[c].exp) > moderateBits {
			return false
		}
	}
	return true
}

func abs(x int) int { return max(x, -x) }

// multiply takes one more finding in; rep holds one lane of each class.
func (m *Model) multiply(l *likelihood, f *Evidence, rep []int) {
	for c, lane := range rep {
		l.absent[c] = l.absent[c].times(f.value(f.Absent, m.lanes[lane]))
		l.present[c] = l.present[c].times(f.value(f.Present, m.lanes[lane]))
	}
}

func (m *Model) classesOf(f Evidence) *partition {
	if len(f.Absent) == 1 && len(f.Present) == 1 {
		return oneClass
	}
	of, n := make([]int32, len(m.lanes)), int32(0)
	if f.Class != nil {
		ids := make([]int32, max(len(f.Absent), len(f.Present))) // 0: not yet seen
		for lane, h := range m.lanes {
			c := f.Class[h]
			if ids[c] == 0 {
				n++
				ids[c] = n
			}
			of[lane] = ids[c] - 1
		}
	} else {
		pairs := newPairSlots(len(m.lanes))
		for lane, h := range m.lanes {
			of[lane], _ = pairs.id(f.value(f.Absent, h), f.value(f.Present, h))
		}
		n = pairs.pairs
	}
	if n == 1 {
		return oneClass
	}
	return m.meets.same(partitionOf(int(n), of))
}

// representatives gives one lane of each class.
func representatives(p *partition, lanes int) []int {
	rep := make([]int, p.n)
	for lane := lanes - 1; lane >= 0; lane-- {
		rep[p.at(lane)] = lane
	}
	return rep
}
