package belief

import (
	"errors"
	"fmt"
	"math"
	"sync"
)

// decibansPerNat turns natural logarithms into decibans.
const decibansPerNat = 10 / math.Ln10

// Decibans gives the weight of evidence of each finding for the statement "h is in" against the rest, in decibans:
// W_k = 10·log10 [P(e_k | in, e_<k) / P(e_k | not in, e_<k)], both sides weighted by their posteriors given the
// findings before (Good, "Probability and the weighing of evidence", 1950). prefixes are those of Model.Prefixes.
// The values add up to the posterior minus the prior log odds. A finding that rules one side out weighs ±infinity;
// once a side is ruled out the later findings weigh 0. Errors: unequal lengths, no prefix, malformed weights.
func Decibans(prior []float64, prefixes [][]float64, in []bool) ([]float64, error) {
	if err := checkDecibans(prior, prefixes, in); err != nil {
		return nil, err
	}
	weights, odds := make([]float64, len(prefixes)-1), allOdds(prior, prefixes, in)
	before := odds[0]
	for k := range weights {
		after := odds[k+1]
		if !math.IsInf(before, 0) && !math.IsNaN(before) && !math.IsNaN(after) {
			weights[k] = decibansPerNat * (after - before)
		}
		before = after
	}
	return weights, nil
}

// allOdds gives the log odds after every prefix, one half beside the other.
func allOdds(prior []float64, prefixes [][]float64, in []bool) []float64 {
	odds := make([]float64, len(prefixes))
	from := func(start int) {
		for k := start; k < len(odds); k += 2 {
			odds[k] = logOdds(prior, prefixes[k], in)
		}
	}
	var wait sync.WaitGroup
	wait.Go(func() { from(1) })
	from(0)
	wait.Wait()
	return odds
}

func checkDecibans(prior []float64, prefixes [][]float64, in []bool) error {
	if len(prefixes) == 0 {
		return errors.New("belief: no prefixes; give those of Model.Prefixes, the first being the state before any finding")
	}
	if len(in) != len(prior) {
		return fmt.Errorf("belief: %d weights for %d marks of the statement; give one of each for every hypothesis", len(prior), len(in))
	}
	for k, row := range prefixes {
		if err := checkSameLength(prior, row); err != nil {
			return fmt.Errorf("prefix %d: %w", k, err)
		}
		for h, l := range row {
			if !validWeight(prior[h]) || math.IsNaN(l) || math.IsInf(l, 1) {
				return posteriorInputError(h, prior[h], l)
			}
		}
	}
	return nil
}

// logOdds gives ln of the odds of the statement, infinite where one side is ruled out, not a number where both are.
func logOdds(prior, logs []float64, in []bool) float64 {
	top := [2]float64{math.Inf(-1), math.Inf(-1)} // of the sides, the statement second
	for h, w := range prior {
		if side := statementSide(in[h]); w > 0 && logs[h] > top[side] {
			top[side] = logs[h]
		}
	}
	sum := [2]float64{}
	for h, w := range prior {
		if side := statementSide(in[h]); w > 0 && logs[h] > math.Inf(-1) {
			sum[side] += float64(w * math.Exp(logs[h]-top[side]))
		}
	}
	return (top[1] + math.Log(sum[1])) - (top[0] + math.Log(sum[0]))
}

func statementSide(in bool) int {
	if in {
		return 1
	}
	return 0
}
