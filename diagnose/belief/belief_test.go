package belief

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"
)

// TestAgainstEnumeration holds every answer against the sum over all states, on 500 small bases.
func TestAgainstEnumeration(t *testing.T) {
	possible := 0
	for seed := uint64(0); seed < 500; seed++ {
		rng := rand.New(rand.NewPCG(seed, 7))
		events, hyps := randomBase(rng)
		m, err := New(events, hyps)
		if err != nil {
			t.Fatalf("base %d: %v", seed, err)
		}
		b := newBrute(events, hyps)
		ev := randomEvidence(rng, len(events), len(hyps))
		compareBaseRates(t, seed, m, b)
		if compareJoint(t, seed, m, b, ev) {
			possible++
		}
		compareLeaveOut(t, seed, m, b, ev)
		comparePrefixes(t, seed, m, b, ev)
		if t.Failed() {
			t.Fatalf("base %d: %+v\n%+v\nevidence %+v", seed, events, hyps, ev)
		}
	}
	if possible < 300 {
		t.Errorf("only %d of 500 random cases were possible at all; the generator is too harsh to test much", possible)
	}
}

func compareBaseRates(t *testing.T, seed uint64, m *Model, b *brute) {
	t.Helper()
	for e, got := range m.BaseRates() {
		if !near(got, b.base[e]) {
			t.Errorf("base %d: base rate of event %d is %v, enumeration says %v", seed, e, got, b.base[e])
		}
	}
}

// compareJoint reports whether the evidence was possible.
func compareJoint(t *testing.T, seed uint64, m *Model, b *brute, ev []Evidence) bool {
	t.Helper()
	up, joint, err := m.Joint(ev)
	only, inferErr := m.Infer(ev)
	mass, total := make([]float64, len(b.hyps)), 0.0
	rows := make([][]float64, len(b.hyps))
	for h, hy := range b.hyps {
		mass[h], rows[h] = b.sum(h, ev)
		total += mass[h] * hy.Weight
	}
	if total == 0 {
		if !errors.Is(err, ErrImpossible) || !errors.Is(inferErr, ErrImpossible) {
			t.Errorf("base %d: impossible evidence gives %v and %v", seed, err, inferErr)
		}
		return false
	}
	if err != nil || inferErr != nil {
		t.Errorf("base %d: %v, %v", seed, err, inferErr)
		return false
	}
	for h, hy := range b.hyps {
		if !near(up.LogLikelihood[h], math.Log(mass[h])) || !near(only.LogLikelihood[h], math.Log(mass[h])) {
			t.Errorf("base %d: ln likelihood of %d is %v (Joint), %v (Infer), enumeration says %v", seed, h, up.LogLikelihood[h], only.LogLikelihood[h], math.Log(mass[h]))
		}
		if want := mass[h] * hy.Weight / total; !near(up.Posterior[h], want) || !near(only.Posterior[h], want) {
			t.Errorf("base %d: posterior of %d is %v and %v, enumeration says %v", seed, h, up.Posterior[h], only.Posterior[h], want)
		}
		for e, got := range joint[h] {
			want := 0.0
			if mass[h] > 0 {
				want = rows[h][e] / mass[h]
			}
			if !near(got, want) {
				t.Errorf("base %d: P(event %d | evidence, %d) is %v, enumeration says %v", seed, e, h, got, want)
			}
		}
	}
	return true
}

func compareLeaveOut(t *testing.T, seed uint64, m *Model, b *brute, ev []Evidence) {
	t.Helper()
	out, err := m.LeaveOut(ev)
	if err != nil {
		t.Fatalf("base %d: %v", seed, err)
	}
	for k, row := range out {
		rest := append(append([]Evidence(nil), ev[:k]...), ev[k+1:]...)
		for h, got := range row {
			want, _ := b.sum(h, rest)
			if !near(got, math.Log(want)) {
				t.Errorf("base %d: without finding %d under %d: %v, enumeration says %v", seed, k, h, got, math.Log(want))
			}
		}
	}
}

func comparePrefixes(t *testing.T, seed uint64, m *Model, b *brute, ev []Evidence) {
	t.Helper()
	out, err := m.Prefixes(ev)
	if err != nil || len(out) != len(ev)+1 {
		t.Fatalf("base %d: %d prefixes, %v", seed, len(out), err)
	}
	for k, row := range out {
		for h, got := range row {
			want, _ := b.sum(h, ev[:k])
			if !near(got, math.Log(want)) {
				t.Errorf("base %d: first %d findings under %d: %v, enumeration says %v", seed, k, h, got, math.Log(want))
			}
		}
	}
}
