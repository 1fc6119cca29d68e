package diagnose

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"drivemend/knowledge"
	"drivemend/measure"
)

// The small base: three to five causes, two stresses, two faults of which one sits in parts, one sign; a nominal
// test, a pattern test, a part test, and a test of each other event. The board: a leg with two and one part.
const bruteBoard = `drivemend: 1
case: brute
board:
  topology: half-bridge
  supply: battery
  positions:
    high: {parts: [Q1, Q2]}
    low: {parts: [Q3]}
`

type bruteCase struct {
	base *knowledge.Base
	c    *measure.Case
	r    *rand.Rand
}

func (b *bruteCase) p() float64 { return 0.02 + 0.96*b.r.Float64() }

func (b *bruteCase) row(ids ...string) map[string]knowledge.Band {
	row, sum, w := map[string]knowledge.Band{}, 0.0, make([]float64, len(ids))
	for i := range ids {
		w[i] = b.p()
		sum += w[i]
	}
	for i, id := range ids {
		row[id] = band(w[i] / sum)
	}
	return row
}

func results(ids ...string) []knowledge.Result {
	var out []knowledge.Result
	for _, id := range ids {
		out = append(out, knowledge.Result{ID: id})
	}
	return out
}

func newBrute(t *testing.T, seed uint64) *bruteCase {
	f, err := measure.Parse("brute.yaml", []byte(bruteBoard))
	if err != nil {
		t.Fatal(err)
	}
	b := &bruteCase{base: &knowledge.Base{Unlisted: map[string]knowledge.Band{}}, c: f.Case, r: rand.New(rand.NewPCG(seed, 9))}
	b.events()
	b.causes()
	b.tests()
	b.observe()
	return b
}

func (b *bruteCase) events() {
	link := func(to ...string) []knowledge.Link {
		var out []knowledge.Link
		for _, id := range to {
			if b.r.Float64() < 0.8 {
				out = append(out, knowledge.Link{To: id, P: band(b.p())})
			}
		}
		return out
	}
	leak := func() knowledge.Band { return band(0.3 * b.p()) }
	b.base.Events = []knowledge.Event{
		{ID: "s0", Layer: knowledge.Stress, Leak: leak(), LeadsTo: link("s1", "dead", "open")},
		{ID: "s1", Layer: knowledge.Stress, Leak: leak(), LeadsTo: link("dead", "open")},
		{ID: "dead", Layer: knowledge.Fault, Of: "switch", Leak: leak(), LeadsTo: link("open", "sign")},
		{ID: "open", Layer: knowledge.Fault, Leak: leak(), LeadsTo: link("sign")},
		{ID: "sign", Layer: knowledge.Sign, Leak: leak()},
	}
}

func (b *bruteCase) causes() {
	for i := range 3 + b.r.IntN(3) {
		c := knowledge.Cause{ID: fmt.Sprint("c", i), Role: []string{"latent", "trigger", "sufficient"}[b.r.IntN(3)],
			Share: map[string]knowledge.Band{"dc": band(b.p())}, Answers: map[string]map[string]knowledge.Band{}}
		for _, e := range []string{"s0", "s1", "dead", "open"} {
			if b.r.Float64() < 0.5 {
				c.LeadsTo = append(c.LeadsTo, knowledge.Link{To: e, P: band(b.p())})
			}
		}
		if b.r.Float64() < 0.6 {
			c.Answers["when"] = map[string]knowledge.Band{"day": band(0.7 * b.p())}
		}
		if b.r.Float64() < 0.6 {
			c.Answers["which"] = map[string]knowledge.Band{"whole-bank": band(0.7 * b.p())}
		}
		b.base.Causes = append(b.base.Causes, c)
	}
	b.base.Unlisted["dc"] = band(b.p())
}

func (b *bruteCase) tests() {
	observing := func(id, event, per, instrument string) knowledge.Test {
		return knowledge.Test{ID: id, Observes: event, Per: per, Instrument: instrument, Needs: "dead", Minutes: 1,
			Results: results("yes", "no"), Present: b.row("yes", "no"), Absent: b.row("yes", "no")}
	}
	b.base.Tests = []knowledge.Test{
		{ID: "when", Needs: "question", Nominal: b.row("day", "night", "nobody"), Silent: []string{"nobody"}, Results: results("day", "night", "nobody")},
		{ID: "which", Needs: "question", PatternOf: "ohms", Nominal: b.row(patterns...), Results: results(patterns...)},
		observing("ohms", "dead", "part", "meter"),
		observing("look", "dead", "part", "eye"),
		observing("try-open", "open", "", "meter"),
		observing("see-sign", "sign", "", "eye"),
		observing("hear-s0", "s0", "", "question"),
	}
}

// observe makes up answers to a random part of the tests.
func (b *bruteCase) observe() {
	say := func(o measure.Observation) {
		if b.r.Float64() < 0.7 {
			b.c.Observations = append(b.c.Observations, o)
		}
	}
	yesNo := func() string { return []string{"yes", "no"}[b.r.IntN(2)] }
	say(measure.Observation{Test: "when", Result: []string{"day", "night", "nobody"}[b.r.IntN(3)], Seen: "on-arrival"})
	say(measure.Observation{Test: "which", Result: []string{"one-of-bank", "whole-bank", "both-of-leg"}[b.r.IntN(3)]})
	say(measure.Observation{Test: "ohms", Position: "high", Result: yesNo(), State: "in-circuit"})
	for _, part := range []string{"Q1", "Q2", "Q3"} {
		say(measure.Observation{Test: "ohms", Part: part, Result: yesNo(), State: "lifted"})
		say(measure.Observation{Test: "look", Part: part, Result: yesNo()})
	}
	for _, id := range []string{"try-open", "see-sign", "hear-s0"} {
		say(measure.Observation{Test: id, Result: yesNo()})
	}
}

// bruteHyp is a hypothesis with its weight, built again from the definition.
type bruteHyp struct {
	causes []int
	weight float64
	free   bool
}

func (b *bruteCase) hyps() []bruteHyp {
	var out []bruteHyp
	u, sum, pairSum := b.base.Unlisted["dc"].Mid, 0.0, 0.0
	share := func(i int) float64 { return b.base.Causes[i].Share["dc"].Mid }
	for i := range b.base.Causes {
		sum += share(i)
	}
	for i := range b.base.Causes {
		out = append(out, bruteHyp{[]int{i}, 0.88 * share(i) / (sum + u), false})
	}
	for i := range b.base.Causes {
		for j := i + 1; j < len(b.base.Causes); j++ {
			w := share(i) * share(j)
			if r := b.base.Causes[i].Role + b.base.Causes[j].Role; r == "latenttrigger" || r == "triggerlatent" {
				w *= 3
			}
			pairSum += w
			out = append(out, bruteHyp{[]int{i, j}, w, false})
		}
	}
	for k := range out {
		if len(out[k].causes) == 2 {
			out[k].weight *= 0.12 / pairSum
		}
	}
	return append(out, bruteHyp{nil, 0.88 * u / (sum + u), true})
}

// eventsGiven is P(a state of all events | h); rates are used when h is the unlisted cause.
func (b *bruteCase) eventsGiven(h bruteHyp, state int, rates []float64) float64 {
	p := 1.0
	for e, ev := range b.base.Events {
		quiet := 1 - ev.Leak.Mid
		stop := func(links []knowledge.Link) {
			for _, l := range links {
				if l.To == ev.ID {
					quiet *= 1 - l.P.Mid
				}
			}
		}
		for _, c := range h.causes {
			stop(b.base.Causes[c].LeadsTo)
		}
		for q, parent := range b.base.Events {
			if state&(1<<q) != 0 {
				stop(parent.LeadsTo)
			}
		}
		on := 1 - quiet
		if h.free {
			on = rates[e]
		}
		if state&(1<<e) == 0 {
			on = 1 - on
		}
		p *= on
	}
	return p
}

func (b *bruteCase) rates(hyps []bruteHyp) []float64 {
	rates, total := make([]float64, len(b.base.Events)), 0.0
	for _, h := range hyps {
		if h.free {
			continue
		}
		total += h.weight
		for state := range 1 << len(rates) {
			p := h.weight * b.eventsGiven(h, state, nil)
			for e := range rates {
				if state&(1<<e) != 0 {
					rates[e] += p
				}
			}
		}
	}
	for e := range rates {
		rates[e] /= total
	}
	return rates
}

// nominal gives P(result | h) over some results; the unlisted cause has the mean over the listed ones.
func (b *bruteCase) nominal(hyps []bruteHyp, test string, ids []string) [][]float64 {
	t := b.base.Test(test)
	one := func(answers map[string]knowledge.Band) []float64 {
		row, sum := make([]float64, len(ids)), 0.0
		full := causeRow(t, answers)
		for k, id := range ids {
			row[k] = full[id]
			sum += row[k]
		}
		for k := range row {
			row[k] /= sum
		}
		return row
	}
	out, mean, total := make([][]float64, len(hyps)), make([]float64, len(ids)), 0.0
	for i, h := range hyps {
		row, named := one(nil), 0
		for _, c := range h.causes {
			if a, ok := b.base.Causes[c].Answers[test]; ok {
				mine := one(a)
				for k := range row {
					if named == 0 {
						row[k] = 0
					}
					row[k] = (row[k]*float64(named) + mine[k]) / float64(named+1)
				}
				named++
			}
		}
		out[i] = row
		if !h.free {
			total += h.weight
			for k := range mean {
				mean[k] += h.weight * row[k]
			}
		}
	}
	for k := range mean {
		mean[k] /= total
	}
	out[len(out)-1] = mean
	return out
}

// posterior enumerates hypotheses, events and sets of dead parts.
func (b *bruteCase) posterior() []float64 {
	hyps := b.hyps()
	rates := b.rates(hyps)
	when := b.nominal(hyps, "when", []string{"day", "night", "nobody"})
	shown := []string{"one-of-bank", "whole-bank", "both-of-leg"}
	which := b.nominal(hyps, "which", shown)
	sets := map[int]string{1: "one-of-bank", 2: "one-of-bank", 3: "whole-bank", 4: "whole-bank", 5: "both-of-leg", 6: "both-of-leg", 7: "both-of-leg"}
	counts := map[string]float64{"one-of-bank": 2, "whole-bank": 2, "both-of-leg": 3}
	post, total := make([]float64, len(hyps)), 0.0
	for i, h := range hyps {
		for state := range 1 << len(b.base.Events) {
			p := b.eventsGiven(h, state, rates)
			if state&4 == 0 {
				post[i] += p * b.seen(hyps, i, state, 0, rates, when, which, "", shown)
				continue
			}
			for set, pattern := range sets {
				at := map[string]int{"one-of-bank": 0, "whole-bank": 1, "both-of-leg": 2}[pattern]
				post[i] += p * which[i][at] / counts[pattern] * b.seen(hyps, i, state, set, rates, when, which, pattern, shown)
			}
		}
		post[i] *= h.weight
		total += post[i]
	}
	for i := range post {
		post[i] /= total
	}
	return post
}

// seen is P(all answers | hypothesis i, events, set of dead parts).
func (b *bruteCase) seen(hyps []bruteHyp, i, state, set int, rates []float64, when, which [][]float64, pattern string, shown []string) float64 {
	p := 1.0
	mean := len(hyps) - 1
	for _, o := range b.c.Observations {
		t := b.base.Test(o.Test)
		e := map[string]float64{"meter": 0.02, "eye": 0.05, "question": 0.05}[t.Instrument]
		switch o.Test {
		case "when":
			k := map[string]int{"day": 0, "night": 1, "nobody": 2}[o.Result]
			p *= 0.9*when[i][k] + 0.1*when[mean][k]
		case "which":
			k := map[string]int{"one-of-bank": 0, "whole-bank": 1, "both-of-leg": 2}[o.Result]
			hit := 0.0
			if pattern == o.Result {
				hit = 1
			}
			p *= 0.95*hit + 0.05*which[mean][k]
		default:
			at := map[string]int{"dead": 2, "open": 3, "sign": 4, "s0": 0}[t.Observes]
			there := state&(1<<at) != 0
			if at == 2 {
				bit := map[string]int{"Q1": 1, "Q2": 2, "Q3": 4}[o.Part]
				if o.Part == "" {
					bit = 3
				}
				there = set&bit != 0
			}
			row := t.Absent[o.Result].Mid
			if there {
				row = t.Present[o.Result].Mid
			}
			base := rates[at]*t.Present[o.Result].Mid + (1-rates[at])*t.Absent[o.Result].Mid
			p *= (1-e)*row + e*base
		}
	}
	return p
}

// TestPosteriorsEqualEnumeration: 500 random small bases with random answers, to 1e-9.
func TestPosteriorsEqualEnumeration(t *testing.T) {
	for seed := range uint64(500) {
		b := newBrute(t, seed)
		s, err := solve(b.base, b.c, nil, true)
		if err != nil {
			t.Fatal(err)
		}
		for i, want := range b.posterior() {
			if got := s.update.Posterior[i]; math.Abs(got-want) > 1e-9 {
				t.Fatalf("base %d, hypothesis %d: %.12g, want %.12g (%d answers)", seed, i, got, want, len(b.c.Observations))
			}
		}
		checkDecibans(t, s, fmt.Sprint("base ", seed))
	}
}
