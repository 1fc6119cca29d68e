package belief

import (
	"math/rand/v2"
	"testing"
)

// benchModel is an invented base of full size: 20 stresses, 24 faults and 22 signs, 52 causes with all their pairs and
// one Free hypothesis. Hubs (a shorted switch, a dead driver) have seven parents.
func benchModel(tb testing.TB) *Model {
	rng := rand.New(rand.NewPCG(3, 9))
	events := benchEvents(rng)
	m, err := New(events, benchHypotheses(rng, 52))
	if err != nil {
		tb.Fatal(err)
	}
	return m
}

func benchEvents(rng *rand.Rand) []Event {
	events := make([]Event, 66)
	for e := range events {
		events[e].Leak = 0.001 + 0.02*rng.Float64()
		switch {
		case e < 14: // stresses that only causes bring about
		case e < 20:
			link(rng, events, e, 0, 14, 1+rng.IntN(2))
		case e == 22 || e == 30 || e == 38:
			link(rng, events, e, 0, 20, 7)
		case e < 44:
			link(rng, events, e, 0, 20, 1+rng.IntN(3))
		case e == 50 || e == 60:
			link(rng, events, e, 20, 44, 6)
		default:
			link(rng, events, e, 20, 44, 1+rng.IntN(2))
		}
	}
	return events
}

// link gives an event n parents from a layer.
func link(rng *rand.Rand, events []Event, e, from, to, n int) {
	for _, p := range rng.Perm(to - from)[:n] {
		events[e].Parents = append(events[e].Parents, Parent{from + p, 0.2 + 0.75*rng.Float64()})
	}
}

func benchHypotheses(rng *rand.Rand, causes int) []Hypothesis {
	triggers := make([][]Trigger, causes)
	var hyps []Hypothesis
	for c := range triggers {
		for _, s := range rng.Perm(20)[:1+rng.IntN(2)] {
			triggers[c] = append(triggers[c], Trigger{s, 0.3 + 0.65*rng.Float64()})
		}
		if rng.IntN(3) == 0 {
			triggers[c] = append(triggers[c], Trigger{20 + rng.IntN(46), 1})
		}
		hyps = append(hyps, Hypothesis{Weight: 1 + rng.Float64(), Triggers: triggers[c]})
	}
	for i := range triggers {
		for j := 0; j < i; j++ {
			both := append(append([]Trigger(nil), triggers[i]...), triggers[j]...)
			hyps = append(hyps, Hypothesis{Weight: 0.01, Triggers: both})
		}
	}
	return append(hyps, Hypothesis{Weight: 1, Free: true})
}

// benchEvidence is a typical case: 30 findings, 18 at events, two of these different under every tenth hypothesis.
func benchEvidence(m *Model) []Evidence {
	rng := rand.New(rand.NewPCG(4, 9))
	var ev []Evidence
	for k := 0; k < 30; k++ {
		f := Evidence{Event: -1, Present: make([]float64, m.Hypotheses())}
		for h := range f.Present {
			f.Present[h] = 0.1 + 0.1*float64((h*7+k)%5)
		}
		if k%5 < 3 {
			f = Evidence{Event: rng.IntN(m.Events()), Absent: []float64{0.95}, Present: []float64{0.1}}
			if rng.IntN(3) == 0 {
				f.Absent[0], f.Present[0] = 0.02, 0.8
			}
		}
		ev = append(ev, f)
	}
	for _, k := range []int{5, 20} {
		ev[k].Present = make([]float64, m.Hypotheses())
		for h := range ev[k].Present {
			ev[k].Present[h] = 0.2
			if h%10 == 0 {
				ev[k].Present[h] = 0.05 * float64(1+h%7)
			}
		}
	}
	return ev
}

func BenchmarkNew(b *testing.B) {
	rng := rand.New(rand.NewPCG(3, 9))
	events := benchEvents(rng)
	hyps := benchHypotheses(rng, 52)
	for b.Loop() {
		if _, err := New(events, hyps); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkBaseRates(b *testing.B) {
	rng := rand.New(rand.NewPCG(3, 9))
	events := benchEvents(rng)
	hyps := benchHypotheses(rng, 52)
	for b.Loop() {
		m, err := New(events, hyps)
		if err != nil {
			b.Fatal(err)
		}
		m.BaseRates()
	}
}

func BenchmarkInfer(b *testing.B) {
	m := benchModel(b)
	ev := benchEvidence(m)
	m.BaseRates()
	for b.Loop() {
		if _, err := m.Infer(ev); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkJoint(b *testing.B) {
	m := benchModel(b)
	ev := benchEvidence(m)
	m.BaseRates()
	for b.Loop() {
		if _, _, err := m.Joint(ev); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkLeaveOut(b *testing.B) {
	m := benchModel(b)
	ev := benchEvidence(m)
	m.BaseRates()
	for b.Loop() {
		if _, err := m.LeaveOut(ev); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkPrefixes(b *testing.B) {
	m := benchModel(b)
	ev := benchEvidence(m)
	m.BaseRates()
	for b.Loop() {
		if _, err := m.Prefixes(ev); err != nil {
			b.Fatal(err)
		}
	}
}
