package belief

import (
	"fmt"
	"math"
	"slices"
	"testing"
)

// twoLayers is the constructed base of causes and findings.
type twoLayers struct {
	Prior map[string]float64 `json:"prior"`
	Link  []struct {
		Cause, Finding string
		P              float64
	} `json:"link"`
	Leak  map[string]float64 `json:"leak"`
	Cases []struct {
		Evidence  map[string]int     `json:"evidence"`
		PEvidence float64            `json:"p_evidence"`
		Posterior map[string]float64 `json:"posterior"`
		Joint     map[string]float64 `json:"joint_D1D2D3"`
	} `json:"cases"`
}

var (
	layerCauses   = []string{"D1", "D2", "D3"}
	layerFindings = []string{"F1", "F2", "F3", "F4"}
)

// has tells whether hypothesis k, of the eight sets of causes, holds cause c.
func has(k, c int) bool { return k>>(2-c)&1 == 1 }

// flat holds the causes as hypotheses.
func (n twoLayers) flat(t *testing.T) *Model {
	events, hyps := make([]Event, len(layerFindings)), make([]Hypothesis, 8)
	for f, finding := range layerFindings {
		events[f].Leak = n.Leak[finding]
	}
	for k := range hyps {
		hyps[k].Weight = 1
		for c, cause := range layerCauses {
			if !has(k, c) {
				hyps[k].Weight *= 1 - n.Prior[cause]
				continue
			}
			hyps[k].Weight *= n.Prior[cause]
			for _, l := range n.Link {
				if l.Cause == cause {
					hyps[k].Triggers = append(hyps[k].Triggers, Trigger{slices.Index(layerFindings, l.Finding), l.P})
				}
			}
		}
	}
	return mustNew(t, events, hyps)
}

// deep holds the causes as events, under one hypothesis that says nothing.
func (n twoLayers) deep(t *testing.T) *Model {
	var events []Event
	for _, cause := range layerCauses {
		events = append(events, Event{Leak: n.Prior[cause]})
	}
	for _, finding := range layerFindings {
		e := Event{Leak: n.Leak[finding]}
		for _, l := range n.Link {
			if l.Finding == finding {
				e.Parents = append(e.Parents, Parent{slices.Index(layerCauses, l.Cause), l.P})
			}
		}
		events = append(events, e)
	}
	return mustNew(t, events, []Hypothesis{{Weight: 1}})
}

// seen turns observed findings into evidence; first is the event of the first finding.
func seen(observed map[string]int, first int) []Evidence {
	var ev []Evidence
	for f, finding := range layerFindings {
		if s, ok := observed[finding]; ok {
			ev = append(ev, Evidence{Event: first + f, Absent: []float64{float64(1 - s)}, Present: []float64{float64(s)}})
		}
	}
	return ev
}

// TestPublishedNoisyOr holds the constructed two-layer base, once with the causes as hypotheses and once as events.
func TestPublishedNoisyOr(t *testing.T) {
	var net twoLayers
	decode(t, readOracles(t)["noisy_or_two_layer_constructed"], &net)
	flat, deep := net.flat(t), net.deep(t)
	m := mapping{network: "noisy_or_two_layer_constructed", why: "causes as hypotheses, and as events"}
	for k, c := range net.Cases {
		up, err := flat.Infer(seen(c.Evidence, 0))
		if err != nil {
			t.Fatal(err)
		}
		sum := 0.0
		for h, l := range up.LogLikelihood {
			sum += flat.hyps[h].Weight * math.Exp(l)
			name := fmt.Sprintf("%03b", h)
			checkPrinted(t, m, k, name, up.Posterior[h], c.Joint[name], 10)
		}
		upDeep, joint, err := deep.Joint(seen(c.Evidence, len(layerCauses)))
		if err != nil {
			t.Fatal(err)
		}
		checkPrinted(t, m, k, "the evidence", sum, c.PEvidence, 12)
		checkPrinted(t, m, k, "the evidence", math.Exp(upDeep.LogLikelihood[0]), c.PEvidence, 12)
		for d, cause := range layerCauses {
			checkPrinted(t, m, k, cause, joint[0][d], c.Posterior[cause], 10)
		}
	}
	if len(net.Cases) != 7 {
		t.Errorf("%d cases, the file has 7", len(net.Cases))
	}
}

func mustNew(t *testing.T, events []Event, hyps []Hypothesis) *Model {
	t.Helper()
	m, err := New(events, hyps)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// TestPublishedFever holds the published noisy-OR table of fever, with the three diseases as hypotheses.
func TestPublishedFever(t *testing.T) {
	var net struct {
		Inhibition map[string]float64 `json:"inhibition"`
		NoFever    map[string]float64 `json:"p_no_fever"`
	}
	decode(t, readOracles(t)["noisy_or_fever"], &net)
	var hyps []Hypothesis
	var names []string
	for k := range 8 {
		h, name := Hypothesis{Weight: 1}, ""
		for d, disease := range []string{"Cold", "Flu", "Malaria"} {
			if k>>(2-d)&1 == 0 {
				name += "F"
				continue
			}
			name += "T"
			h.Triggers = append(h.Triggers, Trigger{0, 1 - net.Inhibition[disease]})
		}
		hyps, names = append(hyps, h), append(names, name)
	}
	m := mustNew(t, []Event{{}}, hyps)
	up, err := m.Infer([]Evidence{{Event: 0, Absent: []float64{1}, Present: []float64{0}}})
	if err != nil {
		t.Fatal(err)
	}
	for k, name := range names {
		if got := math.Exp(up.LogLikelihood[k]); math.Abs(got-net.NoFever[name]) > 1e-12 {
			t.Errorf("P(no fever | %s) is %v, published %v", name, got, net.NoFever[name])
		}
	}
	if len(net.NoFever) != len(names) {
		t.Errorf("%d rows published, %d checked", len(net.NoFever), len(names))
	}
}
