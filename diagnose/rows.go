package diagnose

import "drivemend/knowledge"

// rowSet holds P(result | hypothesis) of one nominal or pattern test over the results this board can show. Hypotheses
// with the same causes that name the test share a row.
type rowSet struct {
	results []string
	pattern []int       // of a pattern test: place of each result in the list of patterns
	class   []int32     // by hypothesis: its row
	rows    [][]float64 // [row][result], without answering errors
	base    []float64   // over the listed hypotheses by their weights
}

// rowsOf gives the rows of a nominal or pattern test; a pattern test drops what this board cannot show.
func (v *view) rowsOf(t *knowledge.Test) *rowSet {
	if r, ok := v.rows[t.ID]; ok {
		return r
	}
	set := &rowSet{}
	for _, r := range t.Results {
		if t.PatternOf == "" || v.parts.shows(r.ID) {
			set.add(r.ID)
		}
	}
	v.fill(t, set)
	v.rows[t.ID] = set
	return set
}

func (r *rowSet) add(result string) {
	r.results, r.pattern = append(r.results, result), append(r.pattern, patternAt(result))
}

// sums is Σ row(pattern)·means(pattern) for each row.
func (r *rowSet) sums(means []float64) []float64 {
	out := make([]float64, len(r.rows))
	for c, row := range r.rows {
		for k, p := range row {
			out[c] += float64(p * means[r.pattern[k]])
		}
	}
	return out
}

// fill builds the rows. The base row is the mean over the listed hypotheses by their weights, and the row of the
// unlisted cause; that of a pattern is not weighed by the chance of its fault, as it is the row given the fault.
func (v *view) fill(t *knowledge.Test, set *rowSet) {
	named := [][]float64{keep(set.results, causeRow(t, nil))} // the default, then the rows of the causes that name the test
	of := make([]int, len(v.causes))
	for i, c := range v.causes {
		if answers, ok := c.Answers[t.ID]; ok {
			of[i] = len(named)
			named = append(named, keep(set.results, causeRow(t, answers)))
		}
	}
	set.base, set.class = make([]float64, len(set.results)), make([]int32, len(v.hyps))
	ids := make([]int32, len(named)*len(named)) // by the two names a hypothesis has: 1 + its row
	weights, listed := []float64{}, 0.0
	for i := range v.hyps {
		h := &v.hyps[i]
		if h.unlisted {
			continue
		}
		a, b := names(h.causes, of)
		id := &ids[a*len(named)+b]
		if *id == 0 {
			set.rows, weights = append(set.rows, mergeRows(named, a, b)), append(weights, 0)
			*id = int32(len(set.rows))
		}
		set.class[i] = *id - 1
		weights[*id-1] += h.weight
		listed += h.weight
	}
	for c, row := range set.rows {
		for k, p := range row {
			set.base[k] += float64(weights[c] / listed * p)
		}
	}
	for i := range v.hyps {
		if v.hyps[i].unlisted {
			set.class[i] = int32(len(set.rows))
		}
	}
	set.rows = append(set.rows, set.base)
}

// names gives the places of the rows that the causes of a hypothesis name, 0 for none, the first not 0 if one is not.
func names(causes []int, of []int) (a, b int) {
	for _, c := range causes {
		a, b = of[c], a
	}
	if a == 0 {
		a, b = b, a
	}
	return a, b
}

// mergeRows gives a pair the row of the cause that names the test, the mean if both do, the default if neither.
func mergeRows(named [][]float64, a, b int) []float64 {
	if b == 0 {
		return named[a]
	}
	return mean(named[a], named[b])
}

func mean(a, b []float64) []float64 {
	out := make([]float64, len(a))
	for k := range out {
		out[k] = (a[k] + b[k]) / 2
	}
	return out
}

// causeRow completes the entries a cause names: a silent result keeps its default, the entries are fractions of
// what is left, and the rest is shared in proportion to the defaults.
func causeRow(t *knowledge.Test, answers map[string]knowledge.Band) map[string]float64 {
	silent := map[string]bool{}
	left := 1.0
	for _, r := range t.Silent {
		silent[r] = true
		left -= t.Nominal[r].Mid
	}
	named, rest := 0.0, 0.0
	for _, r := range t.Results {
		if b, ok := answers[r.ID]; ok {
			named += b.Mid
		} else if !silent[r.ID] {
			rest += t.Nominal[r.ID].Mid
		}
	}
	row := map[string]float64{}
	for _, r := range t.Results {
		b, ok := answers[r.ID]
		switch {
		case silent[r.ID]:
			row[r.ID] = t.Nominal[r.ID].Mid
		case ok:
			row[r.ID] = b.Mid * left
		case rest > 0:
			row[r.ID] = left * (1 - named) * t.Nominal[r.ID].Mid / rest
		}
	}
	return row
}

// keep restricts a row to some results and scales it to sum to one; an empty row becomes even.
func keep(results []string, row map[string]float64) []float64 {
	out, sum := make([]float64, len(results)), 0.0
	for k, r := range results {
		out[k] = row[r]
		sum += out[k]
	}
	for k := range out {
		if sum > 0 {
			out[k] /= sum
		} else {
			out[k] = 1 / float64(len(out))
		}
	}
	return out
}
