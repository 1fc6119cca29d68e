package diagnose

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// drawCase writes a case file of a random board with random answers from the base and loads it.
func drawCase(t *rapid.T, base *knowledge.Base) *measure.Case {
	var b strings.Builder
	topology := rapid.SampledFrom([]string{"low-side-chopper", "half-bridge", "h-bridge", "three-phase", "other"}).Draw(t, "topology")
	fmt.Fprintf(&b, "drivemend: 1\ncase: drawn\nopened: 2026-12-01\nboard:\n  topology: %s\n", topology)
	word := func(key string, words ...string) string {
		w := rapid.SampledFrom(append(words, "")).Draw(t, key)
		if w != "" {
			fmt.Fprintf(&b, "  %s: %s\n", key, w)
		}
		return w
	}
	word("supply", "battery", "bench-supply", "rectified-mains", "shared-bus", "unknown")
	if word("history", "first-failure", "failed-after-repair", "never-worked") != "never-worked" {
		word("service", "10 h", "5200 h", "40000 h")
	}
	word("switch", "{kind: igbt}", "{kind: mosfet}", "{kind: bipolar}")
	word("snubber", "{kind: none}", "{kind: rcd}", "{kind: clamp}")
	word("gate", "{pull_down: 10 kΩ}")
	word("stages", "{brake: {fitted: yes}}", "{current_sensor: shunt}")
	parts, positions := drawPositions(t, &b, topology)
	b.WriteString("rebuild: {done: 2026-12-01T15:00:00+01:00}\nobservations:\n")
	for range rapid.IntRange(1, 14).Draw(t, "answers") {
		b.WriteString(drawAnswer(t, base, parts, positions))
	}
	f, err := measure.Parse("drawn.yaml", []byte(b.String()))
	if err != nil {
		t.Fatalf("the drawn case does not load: %v\n%s", err, b.String())
	}
	return f.Case
}

// drawPositions states the parts of some places, up to thirty in parallel.
func drawPositions(t *rapid.T, b *strings.Builder, topology string) (parts, positions []string) {
	names := map[string][]string{"low-side-chopper": {"low"}, "half-bridge": {"high", "low"}, "h-bridge": {"a-high", "a-low", "b-high", "b-low"},
		"three-phase": {"u-high", "u-low", "v-high", "v-low", "w-high", "w-low"}, "other": {"one", "two", "three", "x-high"}}[topology]
	b.WriteString("  positions:\n")
	for _, name := range names {
		n := rapid.SampledFrom([]int{1, 1, 2, 4, 30}).Draw(t, "parallel")
		var bank []string
		for range n {
			bank = append(bank, fmt.Sprint("Q", len(parts)+len(bank)+1))
		}
		fmt.Fprintf(b, "    %s: {parts: [%s]}\n", name, strings.Join(bank, ", "))
		parts = append(parts, bank...)
	}
	return parts, names
}

func drawAnswer(t *rapid.T, base *knowledge.Base, parts, positions []string) string {
	test := &base.Tests[rapid.IntRange(0, len(base.Tests)-1).Draw(t, "test")]
	if rapid.Bool().Draw(t, "of parts") {
		test = base.Test(rapid.SampledFrom([]string{"power-terminals-resistance", "gate-resistance", "reverse-diode-drop", "dead-parts"}).Draw(t, "part test"))
	}
	out := "  - {test: " + test.ID
	switch rapid.IntRange(0, 3).Draw(t, "place") {
	case 1:
		out += ", position: " + rapid.SampledFrom(positions).Draw(t, "position")
	case 2, 3:
		out += ", part: " + rapid.SampledFrom(parts).Draw(t, "part")
	}
	out += rapid.SampledFrom([]string{"", ", state: lifted", ", state: in-circuit"}).Draw(t, "state")
	out += rapid.SampledFrom([]string{"", ", seen: on-arrival", ", seen: by-cure"}).Draw(t, "seen")
	out += rapid.SampledFrom([]string{"", ", at: 2026-12-01T10:00:00+01:00", ", at: 2026-12-01T16:00:00+01:00"}).Draw(t, "at")
	if rapid.IntRange(0, 9).Draw(t, "skip") == 0 {
		return out + ", answer: " + rapid.SampledFrom([]string{"skipped", "later"}).Draw(t, "answer") + "}\n"
	}
	if test.Unit != "" && rapid.Bool().Draw(t, "as number") {
		return out + ", reading: " + drawReading(t, test.Unit) + "}\n"
	}
	r := rapid.IntRange(0, len(test.Results)-1).Draw(t, "result")
	return out + fmt.Sprintf(", result: %q}\n", test.Results[r].ID)
}

func drawReading(t *rapid.T, u quantity.Unit) string {
	value := func() string {
		x := math.Pow(10, rapid.Float64Range(-2, 6).Draw(t, "decades"))
		if u == quantity.Ratio {
			return fmt.Sprintf("%.0f %%", 100*x)
		}
		return quantity.Format(x, u)
	}
	switch rapid.IntRange(0, 4).Draw(t, "kind") {
	case 0:
		return "'> " + value() + "'"
	case 1:
		return "'< " + value() + "'"
	case 2:
		if u == quantity.Ohm {
			return "OL"
		}
	}
	return "'" + value() + "'"
}

// TestHostileCasesKeepTheirSums ranks random boards with random, often contradictory answers.
func TestHostileCasesKeepTheirSums(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	check := rapid.MakeCheck(func(t *rapid.T) {
		c := drawCase(t, base)
		low := rapid.Float64Range(0, 3).Draw(t, "low")
		spans := map[string]stress.Span{"turn_off.peak_over_rated": {Low: low, High: low + rapid.SampledFrom([]float64{0, 0.5, 5000}).Draw(t, "width")}}
		s, err := solve(base, c, spans, true)
		if err != nil {
			t.Fatal(err)
		}
		r, err := Rank(base, c, spans, "")
		if err != nil {
			t.Fatal(err)
		}
		checkRanking(t, s, r, c)
		if rapid.IntRange(0, 3).Draw(t, "next") == 0 {
			checkNext(t, base, c, spans)
		}
	})
	rounds := 3 // of a hundred
	if testing.Short() {
		rounds = 1
	}
	for i := range rounds {
		t.Run(fmt.Sprint("round ", i+1), check)
	}
}

func checkRanking(t *rapid.T, s *state, r *Ranking, c *measure.Case) {
	one, causes, want := 0.0, 0.0, 0.0
	for h, p := range s.update.Posterior {
		one += p
		want += p * float64(len(s.hyps[h].causes))
	}
	for _, l := range r.Causes {
		causes += checkChance(t, l.ID, l.Probability)
	}
	if math.Abs(one-1) > 1e-9 || math.Abs(causes-want) > 1e-9 {
		t.Fatalf("the hypotheses sum to %g, the causes to %g, want %g", one, causes, want)
	}
	checkChance(t, "unlisted", r.Unlisted)
	for _, l := range append(append([]Line(nil), r.Stresses...), r.Faults...) {
		checkChance(t, l.ID, l.Probability)
		any := 0.0
		for _, p := range l.Parts {
			if checkChance(t, l.ID+" "+p.Part, p.Probability) > l.Probability+1e-9 {
				t.Fatalf("%s of %s is likelier than %s", l.ID, p.Part, l.ID)
			}
			any += p.Probability
		}
		if l.Parts != nil && any < l.Probability-1e-9 {
			t.Fatalf("%s: the parts sum to %g, some part has it with %g", l.ID, any, l.Probability)
		}
	}
	for _, f := range r.Findings {
		if math.IsNaN(f.Decibans) || math.IsNaN(f.Alone) {
			t.Fatalf("%s weighs %g, alone %g", f.Test.ID, f.Decibans, f.Alone)
		}
	}
	checkAccount(t, r, c)
}

// checkAccount proves that every observation either votes or is listed with the reason why not.
func checkAccount(t *rapid.T, r *Ranking, c *measure.Case) {
	seen := make([]int, len(c.Observations))
	for _, f := range r.Findings {
		if f.Observation >= 0 {
			seen[f.Observation]++
		}
	}
	for _, u := range r.Unbound {
		seen[u.Observation]++
	}
	for i, n := range seen {
		if n != 1 {
			t.Fatalf("observation %d (%s) is accounted for %d times", i, c.Observations[i].Test, n)
		}
	}
}

func checkChance(t *rapid.T, what string, p float64) float64 {
	if !(p >= 0 && p <= 1+1e-9) {
		t.Fatalf("%s: probability %g", what, p)
	}
	return p
}

func checkNext(t *rapid.T, base *knowledge.Base, c *measure.Case, spans map[string]stress.Span) {
	n, err := Next(base, c, spans, time.Date(2026, 12, 1, 12, 0, 0, 0, time.UTC))
	if err != nil {
		t.Fatal(err)
	}
	if !(n.Price >= 0 && n.Price <= comeback) {
		t.Fatalf("the price is %g", n.Price)
	}
	for _, cand := range n.Tests {
		gross := cand.Value + cand.price()
		if !(gross >= -1e-9 && gross <= n.Price+1e-9) {
			t.Fatalf("%s %s%s saves %g of %g before its own price", cand.Test.ID, cand.Part, cand.Position, gross, n.Price)
		}
		if most := math.Log2(float64(len(cand.Test.Results) + 1)); !(cand.Bits >= 0 && cand.Bits <= most) {
			t.Fatalf("%s gives %g bits", cand.Test.ID, cand.Bits)
		}
	}
}
