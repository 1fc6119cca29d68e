package diagnose

import (
	"fmt"
	"sort"

	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Share is how well a reading fits one result of its test.
type Share struct {
	Result string // "misread" for a slip of hand, range or lead
	P      float64
}

// ReadAs says which results of a test a reading fits, each as likely beforehand, best first: what a technician
// checks a slip of the range against. Nothing is reckoned from it. It is empty for a named answer and where the
// board does not state what the reading is compared with.
func ReadAs(t *knowledge.Test, b measure.Board, ob measure.Observation) []Share {
	if ob.Reading == nil || ob.Reading.Kind == quantity.Word {
		return nil
	}
	v := &view{board: b, parts: newLayout(b.Positions())}
	shares, err := readAs(t, ob, v.expected(t, ob))
	if err != nil {
		return nil
	}
	return shares
}

// readAs is ReadAs for a reading in numbers, against what the board should show.
func readAs(t *knowledge.Test, ob measure.Observation, expected func(string) (float64, bool)) ([]Share, error) {
	whole, stray, err := readAgainst(t, ob, expected)
	if err != nil {
		return nil, err
	}
	shares, sum := []Share{{"misread", stray}}, stray
	for k, r := range t.Results {
		if p := whole[k] - stray; whole[k] > 0 {
			shares, sum = append(shares, Share{r.ID, max(p, 0)}), sum+max(p, 0)
		}
	}
	if !(sum > 0) {
		return nil, fmt.Errorf("the reading fits no result of test %s: %s", t.ID, resultList(t))
	}
	for i := range shares {
		shares[i].P /= sum
	}
	sort.SliceStable(shares, func(i, j int) bool { return shares[i].P > shares[j].P })
	return shares, nil
}

// Shows gives the patterns of dead parts that a board can show, in their fixed order.
func Shows(b measure.Board) []string {
	l := newLayout(b.Positions())
	var out []string
	for _, p := range patterns {
		if l.shows(p) {
			out = append(out, p)
		}
	}
	return out
}
