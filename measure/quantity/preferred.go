package quantity

import (
	"fmt"
	"math"
	"sort"
	"strconv"
)

// Rounding says which neighbour in a preferred-value series is wanted.
type Rounding int

// The roundings.
const (
	Nearest Rounding = iota // in ratio
	Up
	Down
)

// The series of IEC 60063 over one decade, as three-digit numbers. E3 to E24 must be stored: eight members of E24
// are not the rounded geometric series.
var series = map[int][]int{
	3:  {100, 220, 470},
	6:  {100, 150, 220, 330, 470, 680},
	12: {100, 120, 150, 180, 220, 270, 330, 390, 470, 560, 680, 820},
	24: {100, 110, 120, 130, 150, 160, 180, 200, 220, 240, 270, 300, 330, 360, 390, 430, 470, 510, 560, 620, 680, 750, 820, 910},
	48: {100, 105, 110, 115, 121, 127, 133, 140, 147, 154, 162, 169, 178, 187, 196, 205, 215, 226, 237, 249, 261, 274, 287, 301,
		316, 332, 348, 365, 383, 402, 422, 442, 464, 487, 511, 536, 562, 590, 619, 649, 681, 715, 750, 787, 825, 866, 909, 953},
	96: {100, 102, 105, 107, 110, 113, 115, 118, 121, 124, 127, 130, 133, 137, 140, 143, 147, 150, 154, 158, 162, 165, 169, 174,
		178, 182, 187, 191, 196, 200, 205, 210, 215, 221, 226, 232, 237, 243, 249, 255, 261, 267, 274, 280, 287, 294, 301, 309,
		316, 324, 332, 340, 348, 357, 365, 374, 383, 392, 402, 412, 422, 432, 442, 453, 464, 475, 487, 499, 511, 523, 536, 549,
		562, 576, 590, 604, 619, 634, 649, 665, 681, 698, 715, 732, 750, 768, 787, 806, 825, 845, 866, 887, 909, 931, 953, 976},
}

// hit is the relative distance at which a computed value counts as a preferred value itself.
const hit = 1e-9

// Preferred gives the preferred value of IEC 60063 series E3, E6, E12, E24, E48 or E96 next to v. v must be finite
// and above zero; a value that is preferred stays. Nearest compares ratios, as the series are geometric.
func Preferred(number int, v float64, r Rounding) (float64, error) {
	members, found := series[number]
	if !found {
		return 0, fmt.Errorf("no preferred-value series E%d; there are E3, E6, E12, E24, E48 and E96", number)
	}
	if !(v > 0) || math.IsInf(v, 0) {
		return 0, fmt.Errorf("no preferred value next to %v; the value must be finite and above zero", v)
	}
	lower, upper := neighbours(members, v)
	chosen := lower
	if r == Up || r == Nearest && upper/v < v/lower {
		chosen = upper
	}
	if chosen == 0 || math.IsInf(chosen, 0) {
		return 0, fmt.Errorf("no preferred value next to %v; it is at the end of the computable numbers", v)
	}
	return chosen, nil
}

// neighbours gives the members next to v below and above; both are the member that v is.
func neighbours(members []int, v float64) (lower, upper float64) {
	decade := int(math.Floor(math.Log10(v)))
	around := make([]float64, 0, 3*len(members))
	for d := decade - 1; d <= decade+1; d++ {
		for _, m := range members {
			// Read as decimal digits, so that 4.7e-9 is exactly the float64 that a source text means.
			value, _ := strconv.ParseFloat(strconv.Itoa(m)+"e"+strconv.Itoa(d-2), 64)
			around = append(around, value)
		}
	}
	above := sort.Search(len(around), func(i int) bool { return around[i] >= v*(1-hit) })
	if above == len(around) {
		return around[above-1], math.Inf(1)
	}
	if above == 0 || around[above] <= v*(1+hit) {
		return around[above], around[above]
	}
	return around[above-1], around[above]
}
