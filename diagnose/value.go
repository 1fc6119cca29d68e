package diagnose

import (
	"math"
	"runtime"
	"sort"
	"sync"

	"drivemend/knowledge"
)

// prospect is what a test may show: P(result | evidence, hypothesis), either as rows for each result or, for a test of
// an event, by the chance that what it looks at is there.
type prospect struct {
	rows            [][]float64 // [result][hypothesis]
	chance          []float64   // by hypothesis
	present, absent []float64   // by result
}

func (p *prospect) results() int { return max(len(p.rows), len(p.present)) }

// row gives P(result | evidence, hypothesis) for every hypothesis; out is where to write it.
func (p *prospect) row(k int, out []float64) []float64 {
	if p.rows != nil {
		return p.rows[k]
	}
	in, not := p.present[k], p.absent[k]
	for h, q := range p.chance {
		out[h] = float64(q*in) + float64((1-q)*not)
	}
	return out
}

// valueAll values the candidates, shared among the processors; each value depends on its candidate alone. Places that
// the readings do not tell apart are valued once.
func (s *state) valueAll(cands []Candidate, price float64) {
	type same struct {
		test   *knowledge.Test
		chance *float64
	}
	first, firstOf, open := map[same]int{}, make([]int, len(cands)), []int{}
	prospects := make([]prospect, len(cands))
	for i := range cands {
		prospects[i], firstOf[i] = s.prospect(&cands[i]), i
		if chance := prospects[i].chance; len(chance) > 0 {
			key := same{cands[i].Test, &chance[0]}
			if j, ok := first[key]; ok {
				firstOf[i] = j
				continue
			}
			first[key] = i
		}
		open = append(open, i)
	}
	s.valueEach(open, prospects, cands, price)
	for i, j := range firstOf {
		if i != j {
			cands[i].Bits = cands[j].Bits
			cands[i].Value = cands[j].Value + cands[j].Minutes - cands[i].Minutes
		}
	}
}

func (s *state) valueEach(open []int, prospects []prospect, cands []Candidate, price float64) {
	var wait sync.WaitGroup
	workers := runtime.GOMAXPROCS(0)
	for w := range workers {
		wait.Go(func() {
			v := newValuer(s, price)
			for k := w; k < len(open); k += workers {
				c := &cands[open[k]]
				c.Value, c.Bits = v.value(&prospects[open[k]])
				c.Value -= c.price()
			}
		})
	}
	wait.Wait()
}

// price is the minutes a test takes and the price of its danger.
func (c *Candidate) price() float64 { return c.Minutes + hazardMinutes[c.Test.Needs] }

// valuer values tests with its own scratch memory.
type valuer struct {
	s         *state
	plan      *planner
	price     float64
	row, post []float64
	spread    []float64 // of the test at hand, by hypothesis: Σ over results of −p·log2 p
}

func newValuer(s *state, price float64) *valuer {
	n := len(s.hyps)
	return &valuer{s: s, plan: newPlanner(s.view), price: price, row: make([]float64, n), post: make([]float64, n), spread: make([]float64, n)}
}

// value gives what a test is worth before its own price, the expected fall of the plan's price, and its expected
// information in bits: the entropy of the result less that within each hypothesis.
func (v *valuer) value(p *prospect) (value, bits float64) {
	now, expected := v.s.update.Posterior, 0.0
	clear(v.spread)
	for k := range p.results() {
		row, total := p.row(k, v.row), 0.0
		last, surprise := -1.0, 0.0
		for h, q := range row {
			v.post[h] = float64(now[h] * q)
			total += v.post[h]
			if q != last {
				last, surprise = q, surpriseOf(q)
			}
			v.spread[h] += surprise
		}
		if total > 0 {
			expected += v.plan.expected(v.post, total)
			bits += surpriseOf(total)
		}
	}
	for h, x := range v.spread {
		bits -= float64(now[h] * x)
	}
	return v.price - expected, math.Max(bits, 0)
}

// surpriseOf is −p·log2 p.
func surpriseOf(p float64) float64 {
	if p <= 0 {
		return 0
	}
	return -p * math.Log2(p)
}

// prospect gives what a candidate may show. The answer counts in full here, also in a group of answers that move
// together: their exponent is of the ranking and would not leave probabilities. That a measured figure displaces a
// computed one is not counted either.
func (s *state) prospect(c *Candidate) prospect {
	t, e := c.Test, answerError(c.Test, "at-bench")
	switch {
	case t.PatternOf != "":
		return prospect{rows: s.patternOutcomes(t, e)}
	case t.Observes == "":
		return prospect{rows: s.nominalOutcomes(t, e)}
	}
	p := prospect{chance: s.chance(c)}
	p.present, p.absent = s.observing(t, e)
	return p
}

func (s *state) nominalOutcomes(t *knowledge.Test, e float64) [][]float64 {
	set := s.rowsOf(t)
	rows := make([][]float64, len(set.results))
	for k := range rows {
		rows[k] = make([]float64, len(s.hyps))
		stray := float64(e * set.base[k])
		for h, c := range set.class {
			rows[k][h] = float64((1-e)*set.rows[c][k]) + stray
		}
	}
	return rows
}

// chance gives, for each hypothesis, the probability that what the candidate looks at is there.
func (s *state) chance(c *Candidate) []float64 {
	event := s.eventAt[c.Test.Observes]
	where, at := s.placeOf(c.Test, c.observation())
	if s.events[event].Of != "" && where == onPart {
		return s.holds(event, at).byHyp
	}
	if s.events[event].Of != "" && where == onBank {
		return s.bankHolds(event, at).byHyp
	}
	share := s.placeShare(c.Test, where)
	out, chances := make([]float64, len(s.hyps)), s.chancesOf(event)
	for h := range out {
		out[h] = chances[h] * share
	}
	return out
}

// placeShare is the chance that an event which the board has once, and has, sits at a place not looked at yet.
func (s *state) placeShare(t *knowledge.Test, where place) float64 {
	places := s.placeCount(where)
	if places == 0 {
		return 1
	}
	seen := map[string]*lookedAt{}
	for i := range s.votes {
		if vt := &s.votes[i]; vt.finding.Test == t && vt.places > 0 {
			look(seen, vt)
		}
	}
	if l := seen[t.ID]; l != nil { // a place of another kind than those looked at is one more
		return over(l.clear, l.joint(max(places, l.count+1)))
	}
	return 1 / float64(places)
}

// patternOutcomes gives the chance of each pattern being named, and last the chance that none can be named because no
// part has the fault; a stray answer names a pattern all the same.
func (s *state) patternOutcomes(t *knowledge.Test, e float64) [][]float64 {
	event := s.eventAt[s.observed(t)]
	f, chances := s.partState(event), s.chancesOf(event)
	rows := make([][]float64, len(f.set.results)+1)
	for k := range rows {
		rows[k] = make([]float64, len(s.hyps))
	}
	totals := f.set.sums(f.all)
	for h, c := range f.set.class {
		q := chances[h]
		for k, p := range f.set.pattern {
			there := over(f.set.rows[c][k]*f.all[p], totals[c])
			rows[k][h] = float64((1-e)*float64(q*there)) + float64(e*f.set.base[k])
		}
		rows[len(f.set.results)][h] = float64((1 - e) * (1 - q))
	}
	return rows
}

// pairsTried is how many of the most informative tests are valued in pairs when no single test pays; all pairs of a
// hundred tests would take seconds, and a pair that pays has a test that informs.
const pairsTried = 4

// pairPays tells whether two tests together save more than they cost when neither does alone.
func (st *state) pairPays(tests []Candidate, price float64) bool {
	by := append([]Candidate(nil), tests...)
	sort.SliceStable(by, func(i, j int) bool { return by[i].Bits > by[j].Bits })
	by = by[:min(len(by), pairsTried)]
	v := newValuer(st, price)
	for i := range by {
		for j := i + 1; j < len(by); j++ {
			if v.pair(&by[i], &by[j]) > 0 {
				return true
			}
		}
	}
	return false
}

// pair values two tests done together, their results taken as independent within a hypothesis, less their price.
func (v *valuer) pair(a, b *Candidate) float64 {
	expected, now := 0.0, v.s.update.Posterior
	first, second := v.s.prospect(a), v.s.prospect(b)
	for i := range first.results() {
		ra := append([]float64(nil), first.row(i, v.row)...)
		for j := range second.results() {
			rb, total := second.row(j, v.row), 0.0
			for h := range v.post {
				v.post[h] = float64(float64(now[h]*ra[h]) * rb[h])
				total += v.post[h]
			}
			if total > 0 {
				expected += v.plan.expected(v.post, total)
			}
		}
	}
	return v.price - expected - a.price() - b.price()
}
