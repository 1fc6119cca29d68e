package diagnose

import (
	"math"
	"slices"
	"testing"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// TestLeavingOneOutEqualsRankingWithoutIt compares the divided-out likelihoods of the fully answered board with a
// fresh inference over all findings but one.
func TestLeavingOneOutEqualsRankingWithoutIt(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	f, err := measure.Load("../testdata/full-case.yaml")
	if err != nil {
		t.Fatal(err)
	}
	s, err := solve(base, f.Case, nil, true)
	if err != nil {
		t.Fatal(err)
	}
	if len(s.votes) < 30 {
		t.Fatalf("only %d findings vote: %+v", len(s.votes), s.unbound)
	}
	in, err := s.statement("clamp-missing")
	if err != nil {
		t.Fatal(err)
	}
	alone, err := s.aloneWeights(in, s.sidesOf(in))
	if err != nil {
		t.Fatal(err)
	}
	for k, vt := range s.votes {
		present, absent, ok := s.effect(k)
		got, err := s.without(k, present, absent, ok)
		if err != nil {
			t.Fatal(err)
		}
		u, err := s.model.Infer(s.evidence(s.votes, k))
		if err != nil {
			t.Fatal(err)
		}
		sum := 0.0
		for _, p := range got {
			sum += p
		}
		for h, want := range u.Posterior {
			if math.Abs(got[h]/sum-want) > 1e-9 {
				t.Fatalf("without %s %s, hypothesis %d: %.12g, want %.12g", vt.finding.Test.ID, vt.finding.Part, h, got[h], want)
			}
		}
		if want := odds(s.update.Posterior, in) - odds(u.Posterior, in); math.Abs(alone[k]-want) > 1e-9*math.Max(1, math.Abs(want)) {
			t.Errorf("%s %s weighs %.12g dB alone, ranked without it %.12g dB", vt.finding.Test.ID, vt.finding.Part, alone[k], want)
		}
	}
	checkDecibans(t, s, f.Case.ID)
}

// TestEventsAddUp: the weights of the findings for an event add up to its posterior less its prior log odds.
func TestEventsAddUp(t *testing.T) {
	base, spans := loadBase(t), map[string]stress.Span{"turn_off.peak_over_rated": {Low: 0.9, High: 1.2, Assumed: []string{"loop.inductance"}}}
	c := caseOf(t, chopper, "", "failure-moment, result: turn-off", "bang-or-flash, result: bang", "dead-parts, result: one-of-bank",
		"power-terminals-resistance, position: low, reading: 0.4 Ω", "power-terminals-resistance, part: Q2, reading: 0.5 Ω, state: lifted", "driver-look, position: low, result: cratered")
	for _, about := range []string{"turn-off-spike", "switch-shorted", "violent-discharge"} {
		s, err := solve(base, c, spans, true)
		if err != nil {
			t.Fatal(err)
		}
		e, sum := s.eventAt[about], 0.0
		for _, f := range ranked(t, base, c, spans, about).Findings {
			sum += f.Decibans
		}
		want := 10 * (math.Log10(s.eventOdds(e)) - math.Log10(s.priorOdds(e)))
		if math.Abs(sum-want) > 1e-6*math.Max(1, math.Abs(want)) {
			t.Errorf("%s: findings sum to %.10g dB, the log odds moved by %.10g dB", about, sum, want)
		}
	}
}

func (s *state) eventOdds(e int) float64 {
	p := 0.0
	for h, q := range s.update.Posterior {
		p += q * s.chancesOf(e)[h]
	}
	return p / (1 - p)
}

// priorOdds are over all hypotheses; under the unlisted one an event has its base rate.
func (s *state) priorOdds(e int) float64 { return s.rates()[e] / (1 - s.rates()[e]) }

// TestAloneIsRankingWithoutIt leaves each observation out of the case and ranks again, for causes and events.
func TestAloneIsRankingWithoutIt(t *testing.T) {
	base := loadBase(t)
	answers := []string{"failure-moment, result: turn-off", "dead-parts, result: one-of-bank", "bang-or-flash, result: bang", "power-terminals-resistance, position: low, reading: 0.4 Ω",
		"power-terminals-resistance, part: Q2, reading: 0.5 Ω, state: lifted", "driver-look, part: Q1, result: whole", "driver-look, part: Q2, result: cratered"}
	odds := func(about string, answers []string) float64 {
		r := ranked(t, base, caseOf(t, chopper, "", answers...), nil, "")
		p := chanceOf(t, r, about)
		return 10 * math.Log10(p/(1-p))
	}
	for _, about := range []string{"clamp-missing", "turn-off-spike", "switch-shorted", "driver-dead"} {
		all := odds(about, answers)
		for _, f := range ranked(t, base, caseOf(t, chopper, "", answers...), nil, about).Findings {
			rest := slices.Delete(slices.Clone(answers), f.Observation, f.Observation+1)
			if want := all - odds(about, rest); math.Abs(f.Alone-want) > 1e-5 {
				t.Errorf("%s, %s: alone %.8g dB, want %.8g dB", about, f.Test.ID, f.Alone, want)
			}
		}
	}
}
