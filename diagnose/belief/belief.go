// Package belief is exact inference over rival hypotheses that share a layered noisy-OR network of yes/no events.
// It knows nothing of drives.
//
// Every event is summed out by variable elimination. A noisy-OR with many parents is never written out as one table:
// the contributions of its parents meet by OR-combination while they are summed out (Zhang & Poole, "Exploiting
// causal independence in Bayesian network inference", JAIR 5, 1996), which needs no subtraction, so rare events keep
// all their digits. Marginals come from differentiating the same elimination backwards (Darwiche, "A differential
// approach to inference in Bayesian networks", JACM 50, 2003). Every table holds one value per class of hypotheses
// that cannot differ in it, and that is where the speed comes from.
//
// Orders are fixed and no multiply-add is fused, so equal input gives equal output on every platform up to the
// last bits of the logarithm and the exponential.
package belief

import (
	"errors"
	"math"
	"sync"
)

// ErrImpossible says that no hypothesis of positive weight allows the evidence: every likelihood is zero.
var ErrImpossible = errors.New("belief: the evidence is impossible under every hypothesis; look for a finding with likelihood 0")

// Parent is a link into an event: the parent alone brings the event about with probability P, from 0 to 1.
type Parent struct {
	Event int
	P     float64
}

// Event is a noisy-OR of its parents and a leak: P(absent) = (1-Leak)·Π(1-P) over the parents that are present.
// Parents come before their children.
type Event struct {
	Leak    float64 // 0 to 1
	Parents []Parent
}

// Trigger is a link from a hypothesis straight to an event, P from 0 to 1. Several on one event act as noisy-OR.
type Trigger struct {
	Event int
	P     float64
}

// Hypothesis is one of the rivals.
type Hypothesis struct {
	Weight   float64   // prior, any positive scale; 0 takes the hypothesis out of every posterior
	Triggers []Trigger // combined with the leak and the parents as noisy-OR
	// Free marks the hypothesis under which every event is present with its base rate, independently of its parents.
	// It has no triggers.
	Free bool
}

// Evidence is the likelihood of one finding. Event < 0: it bears on the hypotheses directly, Present[h] = P(finding | h).
// Otherwise Absent and Present are P(finding | event absent / present), of length 1 (same for every hypothesis)
// or one value a hypothesis, or, with Class, one value a class. Values are finite and not negative; densities may
// exceed 1.
type Evidence struct {
	Event           int
	Absent, Present []float64
	Class           []int32 // by hypothesis: its place in the lists above; nil: its own
}

// value picks a hypothesis' likelihood from one of the lists.
func (f *Evidence) value(list []float64, h int) float64 {
	switch {
	case len(list) == 1:
		return list[0]
	case f.Class != nil:
		return list[f.Class[h]]
	}
	return list[h]
}

// Update is what the evidence does to the model.
type Update struct {
	LogLikelihood []float64 // ln P(evidence | h), minus infinity if impossible under h
	Posterior     []float64 // over the hypotheses, sums to 1
}

// Model is a fixed set of events and hypotheses. It is safe for use by several goroutines at once.
type Model struct {
	events  []Event
	hyps    []Hypothesis
	lanes   []int // the hypotheses that are not Free, in order
	laneOf  []int // by hypothesis; -1 for Free
	plans   *planBook
	meets   *meeter
	leaks   []leaf   // by event: the effective leaks
	links   [][]leaf // by event and parent
	baseRun sync.Once
	base    []float64
}

// New checks and compiles a model. It copies what it keeps. Errors: a probability outside 0 to 1 or not a number, a
// parent that does not stand before its child, a weight that is negative, no hypothesis with weight that is not Free,
// and a network so tangled that exact sums would not fit in memory.
func New(events []Event, hyps []Hypothesis) (*Model, error) {
	return build(events, hyps, nil)
}

// Redraw is New for other numbers on the same network (events with the same parents, as many hypotheses that are not
// Free): it takes over the elimination orders worked out for m, which saves time when the same evidence meets many
// draws. On another network it is New. Answers are exact either way; the last bits may differ from those of New, as
// the order may.
func (m *Model) Redraw(events []Event, hyps []Hypothesis) (*Model, error) {
	return build(events, hyps, m.plans)
}

// build makes a model, with the plans of another one if they fit.
func build(events []Event, hyps []Hypothesis, plans *planBook) (*Model, error) {
	if err := checkEvents(events); err != nil {
		return nil, err
	}
	if err := checkHypotheses(hyps, len(events)); err != nil {
		return nil, err
	}
	m := &Model{events: copyEvents(events), hyps: copyHypotheses(hyps), laneOf: make([]int, len(hyps))}
	for h := range hyps {
		m.laneOf[h] = -1
		if !hyps[h].Free {
			m.laneOf[h] = len(m.lanes)
			m.lanes = append(m.lanes, h)
		}
	}
	m.meets = newMeeter(len(m.lanes))
	m.compileLeaves()
	if m.plans = plans; plans == nil || !plans.fits(m) {
		m.plans = newPlanBook(m)
	}
	if err := checkWidth(m.plans.plan.width, len(m.lanes)); err != nil {
		return nil, err
	}
	return m, nil
}

func copyEvents(events []Event) []Event {
	out := make([]Event, len(events))
	for e, ev := range events {
		out[e] = Event{Leak: ev.Leak, Parents: append([]Parent(nil), ev.Parents...)}
	}
	return out
}

// copyHypotheses puts all triggers into one piece of memory.
func copyHypotheses(hyps []Hypothesis) []Hypothesis {
	n := 0
	for h := range hyps {
		n += len(hyps[h].Triggers)
	}
	out, all := make([]Hypothesis, len(hyps)), make([]Trigger, 0, n)
	for h, hy := range hyps {
		all = append(all, hy.Triggers...)
		hy.Triggers = all[len(all)-len(hy.Triggers) : len(all) : len(all)]
		out[h] = hy
	}
	return out
}

// Hypotheses gives their number.
func (m *Model) Hypotheses() int { return len(m.hyps) }

// Events gives their number.
func (m *Model) Events() int { return len(m.events) }

// Posterior turns weights and log likelihoods into probabilities that sum to 1. Weights are not negative, of any scale;
// log likelihoods may be minus infinity. Errors: unequal lengths, a value that is not a number or plus infinity, and
// ErrImpossible when nothing is left.
func Posterior(weights, logLikelihood []float64) ([]float64, error) {
	if err := checkSameLength(weights, logLikelihood); err != nil {
		return nil, err
	}
	top := math.Inf(-1)
	for h, w := range weights {
		if !validWeight(w) || math.IsNaN(logLikelihood[h]) || math.IsInf(logLikelihood[h], 1) {
			return nil, posteriorInputError(h, w, logLikelihood[h])
		}
		if w > 0 {
			top = math.Max(top, math.Log(w)+logLikelihood[h])
		}
	}
	if math.IsInf(top, -1) {
		return nil, ErrImpossible
	}
	post, sum := make([]float64, len(weights)), 0.0
	for h, w := range weights {
		if w > 0 {
			post[h] = math.Exp(math.Log(w) + logLikelihood[h] - top)
			sum += post[h]
		}
	}
	for h := range post {
		post[h] /= sum
	}
	return post, nil
}
