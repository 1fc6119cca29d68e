package belief

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

func TestMalformedModels(t *testing.T) {
	nan := math.NaN()
	one := []Hypothesis{{Weight: 1}}
	dense := make([]Event, 60)
	for e := range dense {
		for p := range e {
			dense[e].Parents = append(dense[e].Parents, Parent{p, 0.5})
		}
	}
	tests := []struct {
		name   string
		events []Event
		hyps   []Hypothesis
		want   string
	}{
		{"parent after child", []Event{{Parents: []Parent{{1, 0.5}}}, {}}, one, "event 0: parent 1"},
		{"own parent", []Event{{}, {Parents: []Parent{{1, 0.5}}}}, one, "event 1: parent 1"},
		{"negative parent", []Event{{Parents: []Parent{{-1, 0.5}}}}, one, "event 0: parent -1"},
		{"parent twice", []Event{{}, {Parents: []Parent{{0, 0.5}, {0, 0.1}}}}, one, "listed twice"},
		{"leak above 1", []Event{{Leak: 1.01}}, one, "leak 1.01"},
		{"leak not a number", []Event{{Leak: nan}}, one, "leak NaN"},
		{"link below 0", []Event{{}, {Parents: []Parent{{0, -0.1}}}}, one, "link -0.1"},
		{"link not a number", []Event{{}, {Parents: []Parent{{0, nan}}}}, one, "link NaN"},
		{"trigger above 1", []Event{{}}, []Hypothesis{{Weight: 1, Triggers: []Trigger{{0, 2}}}}, "trigger 2"},
		{"trigger of no event", []Event{{}}, []Hypothesis{{Weight: 1, Triggers: []Trigger{{1, 0.5}}}}, "event 1"},
		{"negative weight", nil, []Hypothesis{{Weight: -1}}, "weight -1"},
		{"endless weight", nil, []Hypothesis{{Weight: math.Inf(1)}}, "weight +Inf"},
		{"weights overflow", nil, []Hypothesis{{Weight: 1.7e308}, {Weight: 1.7e308}}, "divide them"},
		{"no hypothesis", []Event{{}}, nil, "not Free"},
		{"only Free", []Event{{}}, []Hypothesis{{Weight: 1, Free: true}}, "not Free"},
		{"no weight", []Event{{}}, []Hypothesis{{}}, "weight above 0"},
		{"Free with triggers", []Event{{}}, []Hypothesis{{Weight: 1}, {Weight: 1, Free: true, Triggers: []Trigger{{0, 1}}}}, "hypothesis 1 is Free"},
		{"tangled", dense, one, "too tightly"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if _, err := New(tt.events, tt.hyps); err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("New gives %v, should say %q", err, tt.want)
			}
		})
	}
}

func TestMalformedEvidence(t *testing.T) {
	m := mustNew(t, []Event{{Leak: 0.1}}, []Hypothesis{{Weight: 1}, {Weight: 1}, {Weight: 1}})
	ok := []float64{0.5}
	for _, e := range []Evidence{
		{Event: 1, Absent: ok, Present: ok},
		{Event: 0, Absent: nil, Present: ok},
		{Event: 0, Absent: ok, Present: []float64{0.1, 0.2}},
		{Event: 0, Absent: ok, Present: []float64{-0.1}},
		{Event: 0, Absent: []float64{math.NaN()}, Present: ok},
		{Event: -1, Present: []float64{1, math.Inf(1), 1}},
		{Event: -1},
	} {
		ev := []Evidence{e}
		_, err1 := m.Infer(ev)
		_, _, err2 := m.Joint(ev)
		_, err3 := m.LeaveOut(ev)
		_, err4 := m.Prefixes(ev)
		for _, err := range []error{err1, err2, err3, err4} {
			if err == nil || !strings.Contains(err.Error(), "finding 0") {
				t.Errorf("evidence %+v gives %v", e, err)
			}
		}
	}
}

func TestImpossibleEvidence(t *testing.T) {
	m := mustNew(t, []Event{{}}, []Hypothesis{{Weight: 1}, {Weight: 0, Triggers: []Trigger{{0, 1}}}})
	ev := []Evidence{{Event: 0, Absent: []float64{0}, Present: []float64{1}}}
	if _, err := m.Infer(ev); !errors.Is(err, ErrImpossible) {
		t.Errorf("Infer gives %v", err)
	}
	if _, _, err := m.Joint(ev); !errors.Is(err, ErrImpossible) {
		t.Errorf("Joint gives %v", err)
	}
}

// TestNoUnderflow: sixty findings of likelihood 1e-6 each, all below one certain event, and all against it. Plain
// numbers cannot hold 1e-360; the answer is known in closed form.
func TestNoUnderflow(t *testing.T) {
	const n, leak = 60, 0.25
	events := []Event{{Leak: leak}}
	var ev []Evidence
	for e := 1; e <= n; e++ {
		events = append(events, Event{Parents: []Parent{{0, 1}}})
		ev = append(ev, Evidence{Event: e, Absent: []float64{1}, Present: []float64{1e-6}})
	}
	m := mustNew(t, events, []Hypothesis{{Weight: 1}, {Weight: 1, Triggers: []Trigger{{0, 1}}}, {Weight: 1, Free: true}})
	sure := append([]Evidence{{Event: 0, Absent: []float64{0}, Present: []float64{1}}}, ev...)
	lnAll := n * math.Log(1e-6)
	for _, tt := range []struct {
		name string
		ev   []Evidence
		want [2]float64
	}{
		{"findings alone", ev, [2]float64{math.Log(1 - leak), lnAll}},
		{"with the event seen", sure, [2]float64{math.Log(leak) + lnAll, lnAll}},
	} {
		up, joint, err := m.Joint(tt.ev)
		if err != nil {
			t.Fatal(err)
		}
		prefixes, err := m.Prefixes(tt.ev)
		if err != nil {
			t.Fatal(err)
		}
		for h, want := range tt.want {
			if !near(up.LogLikelihood[h], want) || !near(prefixes[len(tt.ev)][h], want) {
				t.Errorf("%s: ln likelihood of %d is %v, last prefix %v, should be %v", tt.name, h, up.LogLikelihood[h], prefixes[len(tt.ev)][h], want)
			}
		}
		if !near(joint[1][n], 1) {
			t.Errorf("%s: P(event %d) under the sure hypothesis is %v", tt.name, n, joint[1][n])
		}
	}
	out, err := m.LeaveOut(sure)
	if err != nil {
		t.Fatal(err)
	}
	if !near(out[0][0], math.Log(1-leak)) || !near(out[1][0], math.Log(leak)+lnAll-math.Log(1e-6)) {
		t.Errorf("left out: %v and %v, should be %v and %v", out[0][0], out[1][0], math.Log(1-leak), math.Log(leak)+lnAll-math.Log(1e-6))
	}
}

// TestRareEventsKeepTheirDigits: P(present) of a leak of 1e-12 must not come from 1 − (1 − 1e-12).
func TestRareEventsKeepTheirDigits(t *testing.T) {
	m := mustNew(t, []Event{{Leak: 1e-12}, {Leak: 1e-13, Parents: []Parent{{0, 0.5}}}}, []Hypothesis{{Weight: 1, Triggers: []Trigger{{0, 3e-12}}}})
	up, err := m.Infer([]Evidence{{Event: 0, Absent: []float64{0}, Present: []float64{1}}})
	if err != nil {
		t.Fatal(err)
	}
	if want := 4e-12 - 3e-24; math.Abs(math.Exp(up.LogLikelihood[0])/want-1) > 1e-13 {
		t.Errorf("P(event) is %v, should be %v", math.Exp(up.LogLikelihood[0]), want)
	}
	if got, want := m.BaseRates()[1], 1e-13+0.5*4e-12; math.Abs(got/want-1) > 1e-11 {
		t.Errorf("base rate is %v, should be %v", got, want)
	}
}

// TestLogarithmsAgree: the fallback on logarithms is the same elimination, so it must find the same numbers.
func TestLogarithmsAgree(t *testing.T) {
	for seed := uint64(0); seed < 60; seed++ {
		rng := rand.New(rand.NewPCG(seed, 21))
		events, hyps := randomBase(rng)
		m := mustNew(t, events, hyps)
		like := m.gather(randomEvidence(rng, len(events), len(hyps)))
		sums := make([][]float64, 2)
		present := make([][]float64, 2)
		for k, logs := range []bool{false, true} {
			r := m.newRun(logs)
			r.forward(request{likelihoods: like, wanted: m.everyEvent()})
			r.backward()
			sums[k] = make([]float64, len(hyps))
			r.addTo(sums[k], -1)
			for e := range events {
				present[k] = append(present[k], r.marginal(e)...)
			}
		}
		for h := range sums[0] {
			if !near(sums[1][h], sums[0][h]) {
				t.Errorf("base %d: ln likelihood of %d is %v on logarithms, %v in plain numbers", seed, h, sums[1][h], sums[0][h])
			}
		}
		for i := range present[0] {
			if !near(present[1][i], present[0][i]) {
				t.Errorf("base %d: marginal %d is %v on logarithms, %v in plain numbers", seed, i, present[1][i], present[0][i])
			}
		}
	}
}

// TestDeterminism: a second model, and a second call on the same one, give the same bits.
func TestDeterminism(t *testing.T) {
	first := ""
	for range 3 {
		m := benchModel(t)
		ev := benchEvidence(m)
		for range 2 {
			up, joint, err := m.Joint(ev)
			if err != nil {
				t.Fatal(err)
			}
			out, err := m.LeaveOut(ev)
			if err != nil {
				t.Fatal(err)
			}
			prefixes, err := m.Prefixes(ev)
			if err != nil {
				t.Fatal(err)
			}
			got := fmt.Sprintf("%x", bitsOf(up.LogLikelihood, up.Posterior, m.BaseRates(), joint[7], joint[900], out[3], out[4], prefixes[20], joint[len(joint)-1]))
			if first == "" {
				first = got
			}
			if got != first {
				t.Fatal("the same model gave other bits the second time")
			}
		}
	}
}

func bitsOf(lists ...[]float64) []uint64 {
	var out []uint64
	for _, l := range lists {
		for _, v := range l {
			out = append(out, math.Float64bits(v))
		}
	}
	return out
}

// TestFullSizeAgreesWithItself: at full size nothing can be enumerated, but the four questions must fit together.
func TestFullSizeAgreesWithItself(t *testing.T) {
	m := benchModel(t)
	ev := benchEvidence(m)
	up, joint, err := m.Joint(ev)
	if err != nil {
		t.Fatal(err)
	}
	prefixes, err := m.Prefixes(ev)
	if err != nil {
		t.Fatal(err)
	}
	left, err := m.LeaveOut(ev)
	if err != nil {
		t.Fatal(err)
	}
	for _, k := range []int{0, 5, 11, 29} {
		rest := append(append([]Evidence(nil), ev[:k]...), ev[k+1:]...)
		again, err := m.Infer(rest)
		if err != nil {
			t.Fatal(err)
		}
		for h := range again.LogLikelihood {
			if !near(left[k][h], again.LogLikelihood[h]) {
				t.Fatalf("without finding %d under %d: %v, inferred anew %v", k, h, left[k][h], again.LogLikelihood[h])
			}
		}
	}
	for e := range m.Events() {
		seen, err := m.Infer(append(ev[:len(ev):len(ev)], Evidence{Event: e, Absent: []float64{0}, Present: []float64{1}}))
		if err != nil {
			t.Fatal(err)
		}
		for h := range joint {
			if want := math.Exp(seen.LogLikelihood[h] - up.LogLikelihood[h]); !near(joint[h][e], want) {
				t.Fatalf("P(event %d | evidence, %d) is %v, from two runs %v", e, h, joint[h][e], want)
			}
			if !near(prefixes[len(ev)][h], up.LogLikelihood[h]) {
				t.Fatalf("last prefix under %d is %v, inferred %v", h, prefixes[len(ev)][h], up.LogLikelihood[h])
			}
		}
	}
}

// TestFallsBackOnLogarithms: sixty findings against one event, which its certain child proves: the two sides of the
// event lie 2^1200 apart, and only logarithms hold both.
func TestFallsBackOnLogarithms(t *testing.T) {
	const leak = 0.25
	m := mustNew(t, []Event{{Leak: leak}, {Parents: []Parent{{0, 1}}}}, []Hypothesis{{Weight: 1}})
	ev := []Evidence{{Event: 1, Absent: []float64{0}, Present: []float64{1}}}
	for range 60 {
		ev = append(ev, Evidence{Event: 0, Absent: []float64{1}, Present: []float64{1e-6}})
	}
	r := m.eliminate(request{likelihoods: m.gather(ev)})
	defer r.release()
	if !r.logs {
		t.Error("the run stayed on plain numbers")
	}
	up, joint, err := m.Joint(ev)
	if err != nil {
		t.Fatal(err)
	}
	want := math.Log(leak) + 60*math.Log(1e-6)
	if !near(up.LogLikelihood[0], want) || !near(joint[0][0], 1) {
		t.Errorf("ln likelihood %v, P(event) %v; should be %v and 1", up.LogLikelihood[0], joint[0][0], want)
	}
	prefixes, err := m.Prefixes(ev)
	if err != nil || !near(prefixes[len(ev)][0], want) {
		t.Errorf("last prefix %v, %v; should be %v", prefixes[len(ev)][0], err, want)
	}
	left, err := m.LeaveOut(ev)
	if err != nil || !near(left[0][0], math.Log(1-leak)) || !near(left[5][0], want-math.Log(1e-6)) {
		t.Errorf("left out: %v, %v, %v; should be %v, %v", left[0][0], left[5][0], err, math.Log(1-leak), want-math.Log(1e-6))
	}
}

// TestRedraw: other numbers on the same network, and another network, both answer as a new model does.
func TestRedraw(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	events, hyps := randomBase(rng)
	m := mustNew(t, events, hyps)
	other := append([]Event(nil), events...)
	other[0].Leak = 0.123
	longer := append(append([]Event(nil), events...), Event{Leak: 0.5, Parents: []Parent{{0, 0.9}}})
	for _, changed := range [][]Event{other, longer} {
		got, err := m.Redraw(changed, hyps)
		if err != nil {
			t.Fatal(err)
		}
		if shared := got.plans == m.plans; shared != (len(changed) == len(events)) {
			t.Errorf("%d events: plans shared: %v", len(changed), shared)
		}
		want := newBrute(changed, hyps)
		for e, p := range got.BaseRates() {
			if !near(p, want.base[e]) {
				t.Errorf("base rate of event %d is %v, enumeration says %v", e, p, want.base[e])
			}
		}
	}
	if _, err := m.Redraw([]Event{{Leak: 2}}, hyps); err == nil {
		t.Error("a malformed redraw is accepted")
	}
}

// FuzzModel: whatever the numbers, an answer or an error, never a panic and never a NaN.
func FuzzModel(f *testing.F) {
	f.Add(0.1, 0.5, 1.0, 1.0, 0.2, 0.9, 0)
	f.Add(0.0, 1.0, 0.0, 1.0, 0.0, 1.0, 1)
	f.Add(1e-300, 1e-300, 1e-300, 1e300, 1e-300, 1e-300, 1)
	f.Add(math.NaN(), -1.0, 2.0, math.Inf(1), -0.5, math.NaN(), -7)
	f.Fuzz(func(t *testing.T, leak, link, trigger, weight, absent, present float64, at int) {
		m, err := New(
			[]Event{{Leak: leak}, {Leak: leak / 2, Parents: []Parent{{0, link}}}},
			[]Hypothesis{{Weight: weight, Triggers: []Trigger{{0, trigger}}}, {Weight: 1}, {Weight: 1, Free: true}})
		if err != nil {
			return
		}
		ev := []Evidence{{Event: at, Absent: []float64{absent}, Present: []float64{present}}, {Event: 0, Absent: []float64{present}, Present: []float64{absent}}}
		up, joint, err := m.Joint(ev)
		if err != nil {
			return
		}
		for _, list := range append(joint, up.LogLikelihood, up.Posterior) {
			for _, v := range list {
				if math.IsNaN(v) {
					t.Fatalf("NaN in %v", list)
				}
			}
		}
		if _, err := m.LeaveOut(ev); err != nil {
			t.Fatal(err)
		}
		if _, err := m.Prefixes(ev); err != nil {
			t.Fatal(err)
		}
	})
}
