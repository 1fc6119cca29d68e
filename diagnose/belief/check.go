package belief

import (
	"errors"
	"fmt"
	"math"
)

// maxTableValues bounds the largest table (values of 8 bytes): half a gibibyte.
const maxTableValues = 1 << 26

func validProbability(p float64) bool { return p >= 0 && p <= 1 } // false for NaN

func validWeight(w float64) bool { return w >= 0 && !math.IsInf(w, 1) }

func checkEvents(events []Event) error {
	for e, ev := range events {
		if !validProbability(ev.Leak) {
			return fmt.Errorf("belief: event %d: leak %v is not a probability; give 0 to 1", e, ev.Leak)
		}
		for k, p := range ev.Parents {
			switch {
			case p.Event < 0 || p.Event >= e:
				return fmt.Errorf("belief: event %d: parent %d must be an event that stands before it (0 to %d); reorder the events", e, p.Event, e-1)
			case listed(ev.Parents[:k], p.Event):
				return fmt.Errorf("belief: event %d: parent %d is listed twice; join the two links into one", e, p.Event)
			case !validProbability(p.P):
				return fmt.Errorf("belief: event %d: link %v from parent %d is not a probability; give 0 to 1", e, p.P, p.Event)
			}
		}
	}
	return nil
}

func listed(parents []Parent, event int) bool {
	for _, p := range parents {
		if p.Event == event {
			return true
		}
	}
	return false
}

func checkHypotheses(hyps []Hypothesis, events int) error {
	total := 0.0 // over those that are not Free
	for h, hy := range hyps {
		if !validWeight(hy.Weight) {
			return fmt.Errorf("belief: hypothesis %d: weight %v must be finite and not negative", h, hy.Weight)
		}
		if hy.Free && len(hy.Triggers) > 0 {
			return fmt.Errorf("belief: hypothesis %d is Free and has triggers; a Free hypothesis takes base rates only, remove its triggers", h)
		}
		for _, t := range hy.Triggers {
			if t.Event < 0 || t.Event >= events {
				return fmt.Errorf("belief: hypothesis %d: trigger of event %d, but events are 0 to %d", h, t.Event, events-1)
			}
			if !validProbability(t.P) {
				return fmt.Errorf("belief: hypothesis %d: trigger %v of event %d is not a probability; give 0 to 1", h, t.P, t.Event)
			}
		}
		if !hy.Free {
			total += hy.Weight
		}
	}
	switch {
	case total == 0:
		return errors.New("belief: no hypothesis with a weight above 0 that is not Free; base rates would be undefined, add one")
	case math.IsInf(total, 1):
		return errors.New("belief: the weights add up beyond the largest number; divide them all by one factor")
	}
	return nil
}

func checkWidth(width, lanes int) error {
	if width < 40 && (1<<width)*lanes <= maxTableValues {
		return nil
	}
	return fmt.Errorf("belief: the events hang together too tightly: exact sums need a table over %d of them for %d hypotheses; remove links or split events", width, lanes)
}

func (m *Model) checkEvidence(ev []Evidence) error {
	for k := range ev {
		e := &ev[k]
		if e.Event >= len(m.events) {
			return fmt.Errorf("belief: finding %d bears on event %d, but events are 0 to %d", k, e.Event, len(m.events)-1)
		}
		if e.Class != nil && len(e.Class) != len(m.hyps) {
			return fmt.Errorf("belief: finding %d: classes of %d hypotheses; give that of each of the %d", k, len(e.Class), len(m.hyps))
		}
		if err := m.checkLikelihood(k, "present", e, e.Present); err != nil {
			return err
		}
		if e.Event < 0 {
			continue
		}
		if err := m.checkLikelihood(k, "absent", e, e.Absent); err != nil {
			return err
		}
	}
	return nil
}

func (m *Model) checkLikelihood(k int, side string, e *Evidence, values []float64) error {
	if e.Class == nil && len(values) != 1 && len(values) != len(m.hyps) {
		return fmt.Errorf("belief: finding %d: %d likelihoods for %s; give 1 or one for each of the %d hypotheses", k, len(values), side, len(m.hyps))
	}
	for h, c := range e.Class {
		if c < 0 || int(c) >= len(values) && len(values) != 1 {
			return fmt.Errorf("belief: finding %d: hypothesis %d is of class %d, but %s has %d likelihoods", k, h, c, side, len(values))
		}
	}
	for h, v := range values {
		if !validWeight(v) {
			return fmt.Errorf("belief: finding %d: likelihood %v for %s at %d must be finite and not negative", k, v, side, h)
		}
	}
	return nil
}

func checkSameLength(weights, logLikelihood []float64) error {
	if len(weights) != len(logLikelihood) {
		return fmt.Errorf("belief: %d weights for %d log likelihoods; give one of each for every hypothesis", len(weights), len(logLikelihood))
	}
	return nil
}

func posteriorInputError(h int, w, l float64) error {
	return fmt.Errorf("belief: hypothesis %d: weight %v must be finite and not negative, log likelihood %v a number below infinity", h, w, l)
}
