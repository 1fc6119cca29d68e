package belief

import (
	"math"
	"math/rand/v2"
)

// brute answers every question of the package by listing all states of all events.
type brute struct {
	events []Event
	hyps   []Hypothesis
	base   []float64
}

func newBrute(events []Event, hyps []Hypothesis) *brute {
	b := &brute{events: events, hyps: hyps, base: make([]float64, len(events))}
	total := 0.0
	for _, hy := range hyps {
		if !hy.Free {
			total += hy.Weight
		}
	}
	for h, hy := range hyps {
		if hy.Free {
			continue
		}
		_, present := b.sum(h, nil)
		for e := range present {
			b.base[e] += hy.Weight / total * present[e]
		}
	}
	return b
}

// prior gives P(state | h).
func (b *brute) prior(h, state int) float64 {
	p := 1.0
	for e, ev := range b.events {
		absent := 1 - ev.Leak
		for _, pa := range ev.Parents {
			if state>>pa.Event&1 == 1 {
				absent *= 1 - pa.P
			}
		}
		for _, t := range b.hyps[h].Triggers {
			if t.Event == e {
				absent *= 1 - t.P
			}
		}
		if b.hyps[h].Free {
			absent = 1 - b.base[e]
		}
		if state>>e&1 == 1 {
			p *= 1 - absent
		} else {
			p *= absent
		}
	}
	return p
}

// sum gives P(evidence | h) and P(evidence, event present | h).
func (b *brute) sum(h int, ev []Evidence) (total float64, present []float64) {
	present = make([]float64, len(b.events))
	for state := 0; state < 1<<len(b.events); state++ {
		p := b.prior(h, state)
		for _, f := range ev {
			side := f.Present
			if f.Event >= 0 && state>>f.Event&1 == 0 {
				side = f.Absent
			}
			p *= f.value(side, h)
		}
		total += p
		for e := range present {
			if state>>e&1 == 1 {
				present[e] += p
			}
		}
	}
	return total, present
}

// randomProbability is now and then exactly 0 or 1, or rare.
func randomProbability(rng *rand.Rand) float64 {
	switch rng.IntN(10) {
	case 0:
		return 0
	case 1:
		return 1
	case 2:
		return 1e-4 * rng.Float64()
	default:
		return rng.Float64()
	}
}

// randomBase is a small layered model with single causes, pairs and Free hypotheses.
func randomBase(rng *rand.Rand) ([]Event, []Hypothesis) {
	events := make([]Event, 1+rng.IntN(8))
	for e := range events {
		events[e].Leak = 0.3 * randomProbability(rng)
		for p := 0; p < e; p++ {
			if rng.IntN(5) < 2 {
				events[e].Parents = append(events[e].Parents, Parent{p, randomProbability(rng)})
			}
		}
	}
	causes := make([][]Trigger, 2+rng.IntN(4))
	var hyps []Hypothesis
	for c := range causes {
		for n := rng.IntN(3); n > 0; n-- {
			causes[c] = append(causes[c], Trigger{rng.IntN(len(events)), randomProbability(rng)})
		}
		hyps = append(hyps, Hypothesis{Weight: rng.Float64() + 0.01, Triggers: causes[c]})
	}
	for i := range causes {
		for j := 0; j < i; j++ {
			both := append(append([]Trigger(nil), causes[i]...), causes[j]...)
			hyps = append(hyps, Hypothesis{Weight: rng.Float64(), Triggers: both})
		}
	}
	at := rng.IntN(len(hyps) + 1)
	free := Hypothesis{Weight: rng.Float64(), Free: true}
	hyps = append(hyps[:at:at], append([]Hypothesis{free}, hyps[at:]...)...)
	return events, hyps
}

// randomEvidence has findings at events and at none, common to all hypotheses and not, some of them certain.
func randomEvidence(rng *rand.Rand, events, hyps int) []Evidence {
	ev := make([]Evidence, rng.IntN(8))
	for k := range ev {
		ev[k].Event = rng.IntN(events+1) - 1
		n, m := 1, 1
		if rng.IntN(3) == 0 {
			n = hyps
		}
		if rng.IntN(3) == 0 {
			m = hyps
		}
		ev[k].Absent, ev[k].Present = randomLikelihoods(rng, n), randomLikelihoods(rng, m)
	}
	return ev
}

func randomLikelihoods(rng *rand.Rand, n int) []float64 {
	levels := []float64{rng.Float64(), 3 * rng.Float64(), 1e-6}
	if rng.IntN(4) == 0 {
		levels[2] = 0
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = levels[rng.IntN(3)]
	}
	return out
}

// near compares logarithms or probabilities to a share of 1e-9, infinities exactly.
func near(got, want float64) bool {
	if math.IsInf(want, 0) || math.IsInf(got, 0) {
		return got == want
	}
	return math.Abs(got-want) <= 1e-9*(1+math.Abs(want))
}
