package diagnose

import (
	"fmt"
	"math"

	"drivemend/diagnose/belief"
	"drivemend/knowledge"
)

const againstIt = -3.0 // dB: a finding that speaks this much against a line is shown as unexplained by it

// side is the posterior mass of the hypotheses for a statement, or against it.
type side struct {
	total           float64
	present, absent []float64 // of it, by event: with the event, and without
}

// sidesOf splits the belief by a statement: for it, and against. Nil: all is against.
func (s *state) sidesOf(in []bool) [2]side {
	var sides [2]side
	own := [2][]float64{make([]float64, len(s.hyps)), make([]float64, len(s.hyps))}
	for h, p := range s.update.Posterior {
		k := 1
		if in != nil && in[h] {
			k = 0
		}
		own[k][h] = p
		sides[k].total += p
	}
	present, absent := s.update.Masses(own[0], own[1])
	for k := range sides {
		sides[k].present, sides[k].absent = present[k], absent[k]
	}
	return sides
}

// weighFindings gives every finding its weight for the asked line, in the fixed order, and beside it the weight it
// has when every other finding is already known.
func (s *state) weighFindings(r *Ranking, in []bool, sides [2]side) error {
	weights, alone, err := s.weights(r.About, in, sides)
	if err != nil {
		return err
	}
	for k, vt := range s.votes {
		f := vt.finding
		f.Decibans, f.Alone = weights[k], alone[k]
		r.Findings = append(r.Findings, f)
		if f.Alone <= againstIt {
			r.Unexplained = append(r.Unexplained, f)
		}
	}
	return nil
}

func (s *state) weights(about string, in []bool, sides [2]side) (weights, alone []float64, err error) {
	if e, ok := s.eventAt[about]; ok && in == nil {
		return s.eventWeights(e)
	}
	if alone, err = s.aloneWeights(in, sides); err != nil {
		return nil, nil, err
	}
	prefixes, err := s.prefixes()
	if err != nil {
		return nil, nil, err
	}
	weights, err = belief.Decibans(priors(s.hyps), prefixes, in)
	return weights, alone, err
}

// statement gives the hypotheses under which the asked cause holds; nil for an event, which is judged within each.
func (s *state) statement(about string) ([]bool, error) {
	in := make([]bool, len(s.hyps))
	for c, cause := range s.causes {
		if cause.ID == about {
			for i, h := range s.hyps {
				in[i] = h.has(c)
			}
			return in, nil
		}
	}
	if about == "unlisted" {
		for i, h := range s.hyps {
			in[i] = h.unlisted
		}
		return in, nil
	}
	if _, ok := s.eventAt[about]; ok || about == "" {
		return nil, nil
	}
	if s.base.Cause(about) != nil || s.base.Event(about) != nil {
		return nil, fmt.Errorf("%s does not apply to this board", about)
	}
	return nil, fmt.Errorf("the rule base has no cause, stress, fault or sign %q; the nearest are %s and %s", about,
		s.base.Nearest(knowledge.KindCause, about), s.base.Nearest(knowledge.KindEvent, about))
}

// aloneWeights is the log odds with all findings less the log odds with all but one, in decibans. Leaving out a
// finding on an event changes only the likelihoods of that event, so it follows from the joint state: with J the
// chance of the event, P(all but k | h) = P(all | h)·(J/present_k + (1−J)/absent_k). For a finding that says the same
// under every hypothesis the sums of J and 1−J over both sides are enough.
func (s *state) aloneWeights(in []bool, sides [2]side) ([]float64, error) {
	all := 10 * math.Log10(sides[0].total/sides[1].total)
	out := make([]float64, len(s.votes))
	for k := range s.votes {
		present, absent, ok := s.effect(k)
		if e := s.votes[k].event; ok && e >= 0 && !s.votes[k].ofParts() {
			yes := float64(sides[0].present[e]/present[0]) + float64(sides[0].absent[e]/absent[0])
			no := float64(sides[1].present[e]/present[0]) + float64(sides[1].absent[e]/absent[0])
			out[k] = difference(all, 10*math.Log10(yes/no))
			continue
		}
		without, err := s.without(k, present, absent, ok)
		if err != nil {
			return nil, err
		}
		out[k] = difference(all, odds(without, in))
	}
	return out, nil
}

// difference of two log odds; none between two certainties of the same kind.
func difference(a, b float64) float64 {
	if a == b || math.IsNaN(a) || math.IsNaN(b) {
		return 0
	}
	return a - b
}

// without gives the beliefs, on any scale, when finding k is not known, from its effect.
func (s *state) without(k int, present, absent []float64, ok bool) ([]float64, error) {
	if !ok { // a likelihood of nothing cannot be divided out again
		u, err := s.model.Infer(s.evidence(s.votes, k))
		if err != nil {
			return nil, err
		}
		return u.Posterior, nil
	}
	out, e, class := make([]float64, len(s.hyps)), s.votes[k].event, s.ev[k].Class
	if e < 0 {
		for h, p := range s.update.Posterior {
			out[h] = p / at(present, class, h)
		}
		return out, nil
	}
	chances := s.chancesOf(e)
	for h, p := range s.update.Posterior {
		j := chances[h]
		out[h] = p * (float64(j/at(present, class, h)) + float64((1-j)/absent[0]))
	}
	return out, nil
}

// odds of a statement in decibans, from beliefs on any scale.
func odds(belief []float64, in []bool) float64 {
	yes, no := 0.0, 0.0
	for h, p := range belief {
		if in[h] {
			yes += p
		} else {
			no += p
		}
	}
	return 10 * math.Log10(yes/no)
}

// effect gives the factors by which finding k changed the likelihoods of its event, present and absent; false when
// one of them is nothing. For a reading of parts these are, by row of the patterns, the joint likelihood of all readings over that without k.
func (s *state) effect(k int) (present, absent []float64, ok bool) {
	vt := &s.votes[k]
	switch {
	case vt.event < 0:
		present, absent = s.ev[k].Present, []float64{1}
	case vt.places > 0: // the places of a test bear on each other
		return nil, nil, false
	case vt.ofParts():
		present, absent = s.partEffect(k)
	default:
		present, absent = s.ev[k].Present, s.ev[k].Absent
	}
	return present, absent, allPositive(present) && allPositive(absent)
}

func (s *state) partEffect(k int) (present, absent []float64) {
	vt, others := &s.votes[k], s.parts.blank()
	for i := range s.votes {
		if other := &s.votes[i]; i != k && other.event == vt.event && other.ofParts() {
			other.see(&others)
		}
	}
	all, rest := s.partState(vt.event), s.parts.means(others)
	scale, out := vt.see(&others)
	present = all.set.sums(rest)
	for c, joint := range all.set.sums(all.all) {
		present[c] = scale * over(joint, present[c])
	}
	return present, []float64{out}
}

// allPositive tells whether every value can be divided by.
func allPositive(xs []float64) bool {
	for _, x := range xs {
		if !(x > 0) || math.IsInf(x, 1) {
			return false
		}
	}
	return true
}

// at reads a likelihood that is the same for every hypothesis, or one for each class.
func at(x []float64, class []int32, h int) float64 {
	if class == nil {
		return x[0]
	}
	return x[class[h]]
}

// eventWeights does the same for a stress, fault or sign. The odds of an event after each finding are the likelihood
// of the findings with the event pinned present over that with it pinned absent.
func (s *state) eventWeights(event int) (weights, alone []float64, err error) {
	present, absent := pinned(event, s.ev, true), pinned(event, s.ev, false)
	yes, err := s.model.Prefixes(present)
	if err != nil {
		return nil, nil, err
	}
	no, err := s.model.Prefixes(absent)
	if err != nil {
		return nil, nil, err
	}
	prior := priors(s.hyps)
	weights = make([]float64, len(s.ev))
	before := logRatio(prior, yes[1], no[1])
	for k := range weights {
		now := logRatio(prior, yes[k+2], no[k+2])
		weights[k], before = difference(now, before), now
	}
	alone, err = s.eventAlone(event, present, absent, before)
	return weights, alone, err
}

// eventAlone gives for each finding the log odds of the event with all of them less those without it.
func (s *state) eventAlone(event int, present, absent []belief.Evidence, all float64) ([]float64, error) {
	yes, err := s.model.LeaveOut(present)
	if err != nil {
		return nil, err
	}
	no, err := s.model.LeaveOut(absent)
	if err != nil {
		return nil, err
	}
	prior, alone := priors(s.hyps), make([]float64, len(s.votes))
	for k := range s.votes {
		y, n := yes[k+1], no[k+1]
		if vt := &s.votes[k]; vt.ofParts() || vt.places > 0 { // its term depends on those before it
			rest := s.evidence(s.votes, k)
			if y, err = s.lastPrefix(pinned(event, rest, true)); err != nil {
				return nil, err
			}
			if n, err = s.lastPrefix(pinned(event, rest, false)); err != nil {
				return nil, err
			}
		}
		alone[k] = difference(all, logRatio(prior, y, n))
	}
	return alone, nil
}

// pinned puts the event's presence or absence before the findings.
func pinned(event int, ev []belief.Evidence, present bool) []belief.Evidence {
	pin := belief.Evidence{Event: event, Absent: []float64{1}, Present: []float64{0}}
	if present {
		pin.Absent, pin.Present = pin.Present, pin.Absent
	}
	return append([]belief.Evidence{pin}, ev...)
}

func (s *state) lastPrefix(ev []belief.Evidence) ([]float64, error) {
	all, err := s.model.Prefixes(ev)
	if err != nil {
		return nil, err
	}
	return all[len(all)-1], nil
}

// logRatio is 10·log10 of Σ weight·exp(yes) over Σ weight·exp(no).
func logRatio(weights, yes, no []float64) float64 {
	return 10 / math.Ln10 * (logSum(weights, yes) - logSum(weights, no))
}

func logSum(weights, logs []float64) float64 {
	top := math.Inf(-1)
	for h, l := range logs {
		if weights[h] > 0 {
			top = math.Max(top, l)
		}
	}
	if math.IsInf(top, -1) {
		return top
	}
	sum := 0.0
	for h, l := range logs {
		sum += float64(weights[h] * math.Exp(l-top))
	}
	return top + math.Log(sum)
}
