package diagnose

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// TestPlanIsTheCheapest compares the planner with every set of repairs, priced from its definition.
func TestPlanIsTheCheapest(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		causes := rapid.IntRange(2, 7).Draw(t, "causes")
		p := &planner{}
		for r := 0; r < rapid.IntRange(1, causes).Draw(t, "repairs"); r++ {
			p.minutes = append(p.minutes, rapid.Float64Range(1, 120).Draw(t, "minutes"))
			p.ids = append(p.ids, "r")
		}
		for c := 0; c < causes; c++ {
			p.fix = append(p.fix, rapid.IntRange(0, len(p.ids)-1).Draw(t, "fix"))
			p.hyps = append(p.hyps, hypothesis{causes: []int{c}})
			for d := 0; d < c; d++ {
				p.hyps = append(p.hyps, hypothesis{causes: []int{d, c}})
			}
		}
		p.hyps = append(p.hyps, hypothesis{unlisted: true})
		post, sum := make([]float64, len(p.hyps)), 0.0
		for i := range post {
			post[i] = rapid.Float64Range(1e-6, 1).Draw(t, "p")
			sum += post[i]
		}
		for i := range post {
			post[i] /= sum
		}
		got, _ := p.ready().cost(post)
		best := math.Inf(1)
		for mask := 0; mask < 1<<len(p.ids); mask++ {
			best = math.Min(best, p.priceOf(post, mask))
		}
		if math.Abs(got-best) > 1e-9 {
			t.Fatalf("plan costs %g, the cheapest %g", got, best)
		}
	})
}

// priceOf prices one set of repairs straight from the definition.
func (p *planner) priceOf(post []float64, mask int) float64 {
	price := 0.0
	for r, m := range p.minutes {
		if mask&(1<<r) != 0 {
			price += m
		}
	}
	for i, h := range p.hyps {
		removed := !h.unlisted
		for _, c := range h.causes {
			removed = removed && mask&(1<<p.fix[c]) != 0
		}
		if !removed {
			price += comeback * post[i]
		}
	}
	return price
}
