package diagnose

import (
	"math"
	"slices"

	"drivemend/measure"
)

// The patterns of dead parts: a closed partition of the non-empty sets of parts.
var patterns = []string{"one-of-bank", "some-of-bank", "whole-bank", "both-of-leg", "several-legs"}

func patternAt(id string) int {
	for i, p := range patterns {
		if p == id {
			return i
		}
	}
	return -1
}

// bank is the parallel parts of one position.
type bank struct {
	position string
	leg      int
	parts    []int
}

// layout is where the parts of a board sit.
type layout struct {
	parts  []string
	bankOf []int
	banks  []bank
	legs   [][]int   // banks of each leg
	counts []float64 // how many sets show each pattern
}

func newLayout(positions []measure.Position) layout {
	var l layout
	legAt := map[string]int{}
	for _, p := range positions {
		leg, ok := legAt[p.Leg]
		if !ok {
			leg = len(l.legs)
			legAt[p.Leg] = leg
			l.legs = append(l.legs, nil)
		}
		b := bank{position: p.Name, leg: leg}
		for _, name := range p.Parts {
			b.parts = append(b.parts, len(l.parts))
			l.parts, l.bankOf = append(l.parts, name), append(l.bankOf, len(l.banks))
		}
		l.legs[leg] = append(l.legs[leg], len(l.banks))
		l.banks = append(l.banks, b)
	}
	l.counts = l.sums(l.blank())
	return l
}

func (l layout) part(name string) int {
	for i, p := range l.parts {
		if p == name {
			return i
		}
	}
	return -1
}

func (l layout) bank(position string) int {
	for i, b := range l.banks {
		if b.position == position {
			return i
		}
	}
	return -1
}

// shows tells whether a set with this pattern exists on the board.
func (l layout) shows(pattern string) bool {
	k := patternAt(pattern)
	return k >= 0 && l.counts[k] > 0
}

// partFactors are the likelihoods of all readings about one fault: of each part in and out of the set of faulty
// parts, and of each bank as a whole (any part in, none in); answer weighs the patterns themselves. Each reading is
// scaled to a largest likelihood of one, so that those of hundreds of parts neither vanish nor overflow.
type partFactors struct {
	in, out       []float64
	anyIn, noneIn []float64
	answer        []float64
}

func (l layout) blank() partFactors {
	return partFactors{in: ones(len(l.parts)), out: ones(len(l.parts)), anyIn: ones(len(l.banks)), noneIn: ones(len(l.banks)), answer: ones(len(patterns))}
}

func (f partFactors) clone() partFactors {
	f.in, f.out = append([]float64(nil), f.in...), append([]float64(nil), f.out...)
	f.anyIn, f.noneIn = append([]float64(nil), f.anyIn...), append([]float64(nil), f.noneIn...)
	f.answer = append([]float64(nil), f.answer...)
	return f
}

func ones(n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = 1
	}
	return out
}

// see multiplies the factors by a reading, scaled to a largest likelihood of one, and gives that scale and the
// likelihood of the reading when no part has the fault.
func (vt *vote) see(f *partFactors) (scale, absent float64) {
	in, out := power(vt.present, vt.power), power(vt.absent, vt.power)
	scale = math.Max(in, out)
	switch vt.where {
	case onPart:
		f.in[vt.at] *= over(in, scale)
		f.out[vt.at] *= over(out, scale)
	case onBank:
		f.anyIn[vt.at] *= over(in, scale)
		f.noneIn[vt.at] *= over(out, scale)
	case onPattern:
		named := raise(vt.named, vt.power)
		scale = slices.Max(named)
		for k := range f.answer {
			f.answer[k] *= over(named[k], scale)
		}
	case onBoard: // the same for every set
		scale = in
	}
	return scale, out
}

// means gives, for each pattern, the mean likelihood over all sets that show it; 0 where none does.
func (l layout) means(f partFactors) []float64 {
	out := l.sums(f)
	for k := range out {
		if l.counts[k] > 0 {
			out[k] *= f.answer[k] / l.counts[k]
		}
	}
	return out
}

// withPart is means over the sets that hold the part, divided by the number of all sets of the pattern.
func (l layout) withPart(f partFactors, part int) []float64 {
	f = f.clone()
	f.out[part] = 0
	return l.means(f)
}

// withBank is withPart for any part of the bank.
func (l layout) withBank(f partFactors, b int) []float64 {
	f = f.clone()
	f.noneIn[b] = 0
	return l.means(f)
}

// sums adds the likelihoods of all sets of each pattern, by the sizes of the subsets in each bank.
func (l layout) sums(f partFactors) []float64 {
	none, one, some, whole := l.bankSums(f)
	filled := make([]float64, len(l.banks)) // any non-empty subset
	for b := range l.banks {
		filled[b] = one[b] + some[b] + whole[b]
	}
	out := make([]float64, len(patterns))
	for b := range l.banks {
		others := productExcept(none, b)
		out[0] += float64(one[b] * others)
		out[1] += float64(some[b] * others)
		out[2] += float64(whole[b] * others)
	}
	for _, leg := range l.legs {
		out[3] += l.severalBanks(leg, none, filled)
	}
	out[4] = l.severalLegs(none, filled)
	return out
}

// bankSums gives, for each bank, the sums over its empty, single, partial and full subsets. A bank of one is a
// whole bank.
func (l layout) bankSums(f partFactors) (none, one, some, whole []float64) {
	n := len(l.banks)
	none, one, some, whole = make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for b, bk := range l.banks {
		size := make([]float64, len(bk.parts)+1) // size[k]: sum over subsets of k parts
		size[0] = 1
		for done, p := range bk.parts {
			for k := done + 1; k > 0; k-- {
				size[k] = float64(size[k]*f.out[p]) + float64(size[k-1]*f.in[p])
			}
			size[0] *= f.out[p]
		}
		none[b] = size[0] * f.noneIn[b]
		whole[b] = size[len(bk.parts)] * f.anyIn[b]
		for k := 1; k < len(bk.parts); k++ {
			if k == 1 {
				one[b] = size[k] * f.anyIn[b]
			} else {
				some[b] += size[k] * f.anyIn[b]
			}
		}
	}
	return none, one, some, whole
}

// severalBanks adds the sets that reach into two or more places of one leg and nowhere else. A leg has two places;
// where a board of another topology states more without naming legs, any two of them count.
func (l layout) severalBanks(leg []int, none, filled []float64) float64 {
	zero, single, more := 1.0, 0.0, 0.0 // places touched so far
	inside := make([]bool, len(l.banks))
	for _, b := range leg {
		inside[b] = true
		more = float64(more*(none[b]+filled[b])) + float64(single*filled[b])
		single = float64(single*none[b]) + float64(zero*filled[b])
		zero *= none[b]
	}
	for b := range l.banks {
		if !inside[b] {
			more *= none[b]
		}
	}
	return more
}

// severalLegs adds the sets that reach into two or more legs.
func (l layout) severalLegs(none, filled []float64) float64 {
	zero, single, more := 1.0, 0.0, 0.0 // legs touched so far
	for _, leg := range l.legs {
		clean, touched := 1.0, 0.0
		for _, b := range leg {
			touched = float64(touched*(none[b]+filled[b])) + float64(clean*filled[b])
			clean *= none[b]
		}
		more = float64(more*(clean+touched)) + float64(single*touched)
		single = float64(single*clean) + float64(zero*touched)
		zero *= clean
	}
	return more
}

func productExcept(values []float64, except int) float64 {
	p := 1.0
	for i, v := range values {
		if i != except {
			p *= v
		}
	}
	return p
}
