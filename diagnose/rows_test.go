package diagnose

import (
	"math"
	"testing"

	"drivemend/knowledge"
)

func band(p float64) knowledge.Band { return knowledge.Band{Low: p, Mid: p, High: p} }

// TestCauseRowSharesTheRest checks the rule by hand: turn-off 0.5 of what the silent result leaves (0.95), the rest
// in proportion to the defaults.
func TestCauseRowSharesTheRest(t *testing.T) {
	moment := &knowledge.Test{ID: "failure-moment", Silent: []string{"nobody-there"}, Nominal: map[string]knowledge.Band{}}
	for _, r := range []struct {
		id string
		p  float64
	}{{"start", 0.30}, {"turn-off", 0.25}, {"hot-run", 0.40}, {"nobody-there", 0.05}} {
		moment.Results = append(moment.Results, knowledge.Result{ID: r.id})
		moment.Nominal[r.id] = band(r.p)
	}
	row := causeRow(moment, map[string]knowledge.Band{"turn-off": band(0.5)})
	for id, want := range map[string]float64{"nobody-there": 0.05, "turn-off": 0.475, "start": 0.475 * 3 / 7, "hot-run": 0.475 * 4 / 7} {
		if math.Abs(row[id]-want) > 1e-12 {
			t.Errorf("%s: %g, want %g", id, row[id], want)
		}
	}
}

// TestWeights checks the formulas of the prior: one cause (1−q)·s/(S+u), two causes q·m·s·s/Σ, the unlisted rest.
func TestWeights(t *testing.T) {
	causes := []*knowledge.Cause{{ID: "a", Role: "latent"}, {ID: "b", Role: "trigger"}, {ID: "c", Role: "sufficient"}}
	hyps := weigh(causes, []float64{2, 3, 5}, 10)
	want := []float64{0.88 * 2 / 20, 0.88 * 3 / 20, 0.88 * 5 / 20, 0.12 * 18 / 43, 0.12 * 10 / 43, 0.12 * 15 / 43, 0.88 * 10 / 20}
	sum := 0.0
	for i, h := range hyps {
		sum += h.weight
		if math.Abs(h.weight-want[i]) > 1e-12 {
			t.Errorf("hypothesis %v: weight %g, want %g", h.causes, h.weight, want[i])
		}
	}
	if math.Abs(sum-1) > 1e-12 || !hyps[6].unlisted {
		t.Errorf("weights sum to %g", sum)
	}
	if lone := weigh(causes[:1], []float64{4}, 4); len(lone) != 2 || lone[0].weight != 0.5 {
		t.Errorf("one cause alone: %+v", lone)
	}
}
