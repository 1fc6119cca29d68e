package diagnose

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"drivemend/measure"
)

// drawLayout makes one to three legs of one or two positions with one to four parts each.
func drawLayout(t *rapid.T) layout {
	var positions []measure.Position
	for leg := 0; leg < rapid.IntRange(1, 3).Draw(t, "legs"); leg++ {
		for side := 0; side < rapid.IntRange(1, 2).Draw(t, "sides"); side++ {
			p := measure.Position{Leg: string(rune('a' + leg)), Upper: side == 1}
			p.Name = p.Leg + []string{"-low", "-high"}[side]
			for k := 0; k < rapid.IntRange(1, 4-leg).Draw(t, "parts"); k++ {
				p.Parts = append(p.Parts, p.Name+string(rune('1'+k)))
			}
			positions = append(positions, p)
		}
	}
	if rapid.Bool().Draw(t, "third place") { // a leg of a board of another topology
		positions = append(positions, measure.Position{Name: "a-third", Leg: "a", Parts: []string{"third"}})
	}
	return newLayout(positions)
}

// patternOf names the pattern of a set of parts straight from its definition; "" for the empty set.
func (l layout) patternOf(set []bool) string {
	legs, banks, parts := map[int]bool{}, map[int]int{}, 0
	for i, in := range set {
		if in {
			parts++
			banks[l.bankOf[i]]++
			legs[l.banks[l.bankOf[i]].leg] = true
		}
	}
	switch {
	case parts == 0:
		return ""
	case len(legs) > 1:
		return "several-legs"
	case len(banks) > 1:
		return "both-of-leg"
	}
	for b, n := range banks {
		if n == len(l.banks[b].parts) {
			return "whole-bank"
		}
	}
	if parts == 1 {
		return "one-of-bank"
	}
	return "some-of-bank"
}

// bruteMeans walks every set of parts.
func (l layout) bruteMeans(f partFactors, must int) []float64 {
	sums, counts := make([]float64, len(patterns)), make([]float64, len(patterns))
	for mask := 1; mask < 1<<len(l.parts); mask++ {
		set := make([]bool, len(l.parts))
		p, any := 1.0, make([]bool, len(l.banks))
		for i := range set {
			set[i] = mask&(1<<i) != 0
			if set[i] {
				p *= f.in[i]
				any[l.bankOf[i]] = true
			} else {
				p *= f.out[i]
			}
		}
		for b := range any {
			if any[b] {
				p *= f.anyIn[b]
			} else {
				p *= f.noneIn[b]
			}
		}
		k := patternAt(l.patternOf(set))
		counts[k]++
		if must < 0 || set[must] {
			sums[k] += p * f.answer[k]
		}
	}
	for k := range sums {
		if counts[k] > 0 {
			sums[k] /= counts[k]
		}
	}
	return sums
}

func TestPatternMeansEqualEveryNamedSet(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := drawLayout(t)
		f := l.blank()
		factor := rapid.Float64Range(1e-4, 3)
		for _, xs := range [][]float64{f.in, f.out, f.anyIn, f.noneIn, f.answer} {
			for i := range xs {
				xs[i] = factor.Draw(t, "factor")
			}
		}
		must := rapid.IntRange(0, len(l.parts)-1).Draw(t, "part")
		compare(t, l.means(f), l.bruteMeans(f, -1))
		compare(t, l.withPart(f, must), l.bruteMeans(f, must))
	})
}

func compare(t *rapid.T, got, want []float64) {
	for k := range want {
		if math.Abs(got[k]-want[k]) > 1e-9*math.Max(1, math.Abs(want[k])) {
			t.Fatalf("%s: %g, want %g", patterns[k], got[k], want[k])
		}
	}
}

func TestBoardsShowOnlyTheirPatterns(t *testing.T) {
	part := func(n string, leg string, parts ...string) measure.Position {
		return measure.Position{Name: n, Leg: leg, Parts: parts}
	}
	for name, c := range map[string]struct {
		positions []measure.Position
		want      []string
	}{
		"one switch":        {[]measure.Position{part("low", "", "Q1")}, []string{"whole-bank"}},
		"two in parallel":   {[]measure.Position{part("low", "", "Q1", "Q2")}, []string{"one-of-bank", "whole-bank"}},
		"three in parallel": {[]measure.Position{part("low", "", "Q1", "Q2", "Q3")}, []string{"one-of-bank", "some-of-bank", "whole-bank"}},
		"half bridge":       {[]measure.Position{part("high", "", "Q1"), part("low", "", "Q2")}, []string{"whole-bank", "both-of-leg"}},
		"h bridge": {[]measure.Position{part("a-high", "a", "Q1"), part("a-low", "a", "Q2"), part("b-high", "b", "Q3"), part("b-low", "b", "Q4")},
			[]string{"whole-bank", "both-of-leg", "several-legs"}},
	} {
		l, shown := newLayout(c.positions), 0
		for _, p := range c.want {
			if !l.shows(p) {
				t.Errorf("%s does not show %s", name, p)
			}
		}
		for _, p := range patterns {
			if l.shows(p) {
				shown++
			}
		}
		if shown != len(c.want) {
			t.Errorf("%s shows %d patterns, want %d", name, shown, len(c.want))
		}
	}
}
