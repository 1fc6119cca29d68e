package diagnose

import (
	"fmt"
	"math"
	"testing"
	"time"

	"drivemend/knowledge"
	"drivemend/measure"
)

// TestValueEqualsEnteringTheAnswer prices every candidate of random small bases by entering each of its results as an
// observation, ranking anew and planning anew: G = V(e) − Σ P(r | e)·V(e, r) − minutes.
func TestValueEqualsEnteringTheAnswer(t *testing.T) {
	checked := 0
	for seed := range uint64(60) {
		b := newBrute(t, 1000+seed)
		for i := range b.base.Causes {
			id := fmt.Sprint("fix", i)
			b.base.Causes[i].Repair = id
			b.base.Repairs = append(b.base.Repairs, knowledge.Repair{ID: id, Minutes: 5 + 60*b.p()})
		}
		for i := range b.base.Tests {
			b.base.Tests[i].Minutes = 1 + 5*b.p()
		}
		got, err := Next(b.base, b.c, nil, time.Time{})
		if err != nil {
			t.Fatal(err)
		}
		before := rankedState(t, b, nil)
		for _, c := range got.Tests {
			want := enteredValue(t, b, before, c)
			if math.Abs(c.Value-want) > 1e-8 {
				t.Fatalf("base %d, %s %s%s: value %.10g, want %.10g", seed, c.Test.ID, c.Part, c.Position, c.Value, want)
			}
			checked++
		}
	}
	if checked < 100 {
		t.Fatalf("only %d candidates checked", checked)
	}
}

func rankedState(t *testing.T, b *bruteCase, extra *measure.Observation) *state {
	c := *b.c
	if extra != nil {
		c.Observations = append(c.Observations[:len(c.Observations):len(c.Observations)], *extra)
	}
	s, err := solve(b.base, &c, nil, true)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// evidence at large: ln of Σ weight·P(e | h).
func (s *state) logEvidence() float64 {
	sum := 0.0
	for i, h := range s.hyps {
		sum += h.weight * math.Exp(s.update.LogLikelihood[i])
	}
	return math.Log(sum)
}

func enteredValue(t *testing.T, b *bruteCase, before *state, c Candidate) float64 {
	price, _ := newPlanner(before.view).cost(before.update.Posterior)
	value := price - c.Minutes
	for _, r := range c.Test.Results {
		if c.Test.PatternOf != "" && !before.parts.shows(r.ID) {
			continue
		}
		ob := measure.Observation{Test: c.Test.ID, Part: c.Part, Position: c.Position, Result: r.ID}
		if c.Lifted {
			ob.State = "lifted"
		}
		after := rankedState(t, b, &ob)
		v, _ := newPlanner(after.view).cost(after.update.Posterior)
		value -= math.Exp(after.logEvidence()-before.logEvidence()) * v
	}
	if c.Test.PatternOf != "" {
		value -= nothingDead(before)
	}
	return value
}

// nothingDead is the part of the price for the answer that no part is dead.
func nothingDead(s *state) float64 {
	post, p := make([]float64, len(s.hyps)), 0.0
	for h := range post {
		post[h] = s.update.Posterior[h] * (1 - eyeError) * (1 - s.chancesOf(s.eventAt["dead"])[h])
		p += post[h]
	}
	for h := range post {
		post[h] /= p
	}
	v, _ := newPlanner(s.view).cost(post)
	return p * v
}
