package diagnose

import (
	"math"
	"sort"
	"sync"

	"drivemend/diagnose/belief"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// Line is one ranked cause, stress or fault.
type Line struct {
	ID, Title, Role string
	Probability     float64
	Parts           []PartChance // a fault of parts: in the board's order
}

// PartChance is the probability that one part has a fault.
type PartChance struct {
	Part        string
	Probability float64
}

// Ranking is the three layers for one case, each line with its exact posterior probability. Two causes can act
// together, so the column of causes may pass one.
type Ranking struct {
	Case, Setting            string
	Causes, Stresses, Faults []Line // most probable first, ties in base order
	Unlisted                 float64
	UnlistedPrior            float64
	Prior                    []Line // causes before any answer, in base order
	About                    string // id of the line the findings' decibans are for
	Findings                 []Finding
	Unexplained              []Finding  // speak against the line by 3 dB or more
	Alike                    [][]string // causes that the answers tell apart by less than 1 dB
	Unbound                  []Unbound
}

// state is everything the ranking and the next test are read from.
type state struct {
	*view
	votes   []vote
	unbound []Unbound
	ev      []belief.Evidence
	update  *belief.Solution
	chances [][]float64 // by event: P(event | evidence, hypothesis) by hypothesis; nil until asked for, see chancesOf
	faults  map[int]*partState

	prefixes func() ([][]float64, error) // ln P(first k findings | hypothesis); nil unless asked for
}

// partState is what the readings say about a fault of parts.
type partState struct {
	set     *rowSet
	factors partFactors
	all     []float64   // means over the sets of each pattern
	shares  []partShare // one for every distinct answer to "which sets hold it?", filled when first needed
}

// partShare is the chance of a part or bank: parts that the readings do not tell apart have one between them.
type partShare struct {
	with   []float64 // means over the sets that hold it
	byHyp  []float64 // P(it has the fault | evidence, hypothesis)
	chance float64   // P(it has the fault | evidence)
}

// solve works out the state of belief; prefixes asks for those of the findings too.
func solve(base *knowledge.Base, c *measure.Case, computed map[string]stress.Span, prefixes bool) (*state, error) {
	v, err := newView(base, c.Board)
	if err != nil {
		return nil, err
	}
	return v.solve(c, computed, prefixes)
}

func (v *view) solve(c *measure.Case, computed map[string]stress.Span, prefixes bool) (*state, error) {
	s := &state{view: v, faults: map[int]*partState{}, chances: make([][]float64, len(v.events))}
	s.votes, s.unbound = v.bind(c, computed)
	s.ev = v.evidence(s.votes, -1)
	return s, s.infer(prefixes)
}

// infer solves for the findings, and beside that for their prefixes if these are asked for.
func (s *state) infer(prefixes bool) error {
	s.prefixes = func() ([][]float64, error) { return nil, nil }
	if prefixes {
		s.prefixes = sync.OnceValues(func() ([][]float64, error) { return s.model.Prefixes(s.ev) })
		go s.prefixes()
	}
	var err error
	s.update, err = s.model.Solve(s.ev)
	return err
}

// chancesOf gives P(event | evidence, hypothesis) for every hypothesis.
func (s *state) chancesOf(event int) []float64 {
	if s.chances[event] == nil {
		s.prepare(func(e int) bool { return e == event })
	}
	return s.chances[event]
}

// prepare works out the chances of several events in one go.
func (s *state) prepare(wanted func(event int) bool) {
	var events []int
	for e := range s.events {
		if s.chances[e] == nil && wanted(e) {
			events = append(events, e)
		}
	}
	for k, chances := range s.update.Present(events) {
		s.chances[events[k]] = chances
	}
}

// partState gathers the readings on a fault of parts.
func (s *state) partState(event int) *partState {
	if p, ok := s.faults[event]; ok {
		return p
	}
	p := &partState{set: s.patternRows(s.events[event].ID), factors: s.parts.blank()}
	for i := range s.votes {
		if vt := &s.votes[i]; vt.event == event && vt.ofParts() {
			vt.see(&p.factors)
		}
	}
	p.all = s.parts.means(p.factors)
	s.faults[event] = p
	return p
}

// Rank gives the three layers. About names the cause, stress or fault whose decibans are wanted; "" takes the
// leading cause.
func Rank(base *knowledge.Base, c *measure.Case, computed map[string]stress.Span, about string) (*Ranking, error) {
	return For(base).Rank(c, computed, about)
}

func (v *view) rank(c *measure.Case, computed map[string]stress.Span, about string) (*Ranking, error) {
	s, err := v.solve(c, computed, v.base.Event(about) == nil)
	if err != nil {
		return nil, err
	}
	defer s.update.Release()
	s.prepare(func(e int) bool { return s.events[e].Of != "" })
	r := &Ranking{Case: c.ID, Setting: s.setting, Unbound: s.unbound, About: about}
	r.Causes = s.causeLines(s.update.Posterior)
	sortLines(r.Causes)
	r.Prior = s.causeLines(priors(s.hyps))
	r.Unlisted, r.UnlistedPrior = s.unlistedChance(s.update.Posterior), s.unlistedChance(priors(s.hyps))
	if r.About == "" && len(r.Causes) > 0 {
		r.About = r.Causes[0].ID
	}
	in, err := s.statement(r.About)
	if err != nil {
		return nil, err
	}
	sides := s.sidesOf(in)
	r.Stresses, r.Faults = s.eventLines(knowledge.Stress, sides), s.eventLines(knowledge.Fault, sides)
	if err := s.weighFindings(r, in, sides); err != nil {
		return nil, err
	}
	r.Alike = s.alike(r.Causes)
	return r, nil
}

func priors(hyps []hypothesis) []float64 {
	out := make([]float64, len(hyps))
	for i, h := range hyps {
		out[i] = h.weight
	}
	return out
}

func (s *state) unlistedChance(post []float64) float64 {
	sum := 0.0
	for i, h := range s.hyps {
		if h.unlisted {
			sum += post[i]
		}
	}
	return sum
}

func (s *state) causeLines(post []float64) []Line {
	lines := make([]Line, len(s.causes))
	for i, c := range s.causes {
		lines[i] = Line{ID: c.ID, Title: c.Title, Role: c.Role}
	}
	for i, h := range s.hyps {
		for _, c := range h.causes {
			lines[c].Probability += post[i]
		}
	}
	return lines
}

// eventLines gives the lines of one layer.
func (s *state) eventLines(layer knowledge.Layer, sides [2]side) []Line {
	var lines []Line
	for i, e := range s.events {
		if e.Layer != layer {
			continue
		}
		line := Line{ID: e.ID, Title: e.Title, Probability: sides[0].present[i] + sides[1].present[i]}
		if e.Of != "" {
			line.Parts = s.partChances(i)
		}
		lines = append(lines, line)
	}
	sortLines(lines)
	return lines
}

func sortLines(lines []Line) {
	sort.SliceStable(lines, func(i, j int) bool { return lines[i].Probability > lines[j].Probability })
}

// partChances gives each part's chance of a fault: over the hypotheses, the fault's chance times the share of the
// sets that hold the part.
func (s *state) partChances(event int) []PartChance {
	out := make([]PartChance, len(s.parts.parts))
	for i, name := range s.parts.parts {
		out[i].Part = name
		out[i].Probability = s.holds(event, i).chance
	}
	return out
}

// holds gives the chance that the part has the fault.
func (s *state) holds(event, part int) partShare {
	f := s.partState(event)
	return s.shareOf(event, s.parts.withPart(f.factors, part))
}

// bankHolds is holds for "any part of the bank".
func (s *state) bankHolds(event, b int) partShare {
	f := s.partState(event)
	return s.shareOf(event, s.parts.withBank(f.factors, b))
}

// sameShare is how far two means may differ, relative, by rounding alone: parts alike then share one answer, so that
// ties between them stay ties.
const sameShare = 1e-13

func (s *state) shareOf(event int, with []float64) partShare {
	f := s.partState(event)
	for _, known := range f.shares {
		if alikeWithin(known.with, with, sameShare) {
			return known
		}
	}
	total, share := f.set.sums(f.all), f.set.sums(with)
	for c := range share {
		if total[c] > 0 {
			share[c] = math.Min(share[c]/total[c], 1)
		} else {
			share[c] = 0
		}
	}
	out, chances := make([]float64, len(s.hyps)), s.chancesOf(event)
	chance := 0.0
	for h, c := range f.set.class {
		out[h] = chances[h] * share[c]
		chance += float64(s.update.Posterior[h] * out[h])
	}
	f.shares = append(f.shares, partShare{with, out, chance})
	return f.shares[len(f.shares)-1]
}

func alikeWithin(a, b []float64, tolerance float64) bool {
	for k := range a {
		if math.Abs(a[k]-b[k]) > tolerance*math.Abs(a[k]) {
			return false
		}
	}
	return true
}

// alike groups the leading causes whose likelihoods differ by less than 1 dB: no answer so far tells them apart.
func (s *state) alike(lines []Line) [][]string {
	const within, notable = 0.1 * math.Ln10, 0.05
	var groups [][]string
	taken := map[string]bool{}
	for i, a := range lines {
		if a.Probability < notable || taken[a.ID] {
			continue
		}
		group := []string{a.ID}
		for _, b := range lines[i+1:] {
			if b.Probability >= notable && !taken[b.ID] && math.Abs(s.logLikelihood(a.ID)-s.logLikelihood(b.ID)) < within {
				group = append(group, b.ID)
				taken[b.ID] = true
			}
		}
		if len(group) > 1 {
			groups = append(groups, group)
		}
	}
	return groups
}

func (s *state) logLikelihood(cause string) float64 {
	for i, h := range s.hyps {
		if len(h.causes) == 1 && s.causes[h.causes[0]].ID == cause {
			return s.update.LogLikelihood[i]
		}
	}
	return math.Inf(-1)
}
