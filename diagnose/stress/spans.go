package stress

import (
	"math"
	"slices"

	"drivemend/measure"
)

// Span is a computed figure with the interval that the unknowns leave it.
type Span struct {
	Low, High float64
	Assumed   []string // keys of the assumed values that move it
}

// movesSpan is the least share of the rating by which an assumed value has to move the peak to be named.
const movesSpan = 0.005

// unsolved is the need of a board whose edge the solver refused.
const unsolved = "values the edge can be solved with"

// Spans gives the computed figures that tests of the rule base may name, for the board as found. A figure that
// cannot be worked out is left out and its needs are listed, the solver's reason too; the error is always nil so far.
//
//	turn_off.peak_over_rated  peak of the gate-limited edge over the rating at the coldest junction, from the
//	                          running current at nominal bus to the worst current at the highest bus, every unknown
//	                          in turn at either end of its interval
func Spans(b measure.Board) (map[string]Span, []Need, error) {
	p, needs := prepare(b)
	if p == nil {
		return map[string]Span{}, needs, nil
	}
	span, err := p.peakSpan()
	if err != nil {
		return map[string]Span{}, append(needs, Need{unsolved, []string{"turn_off.peak_over_rated", err.Error()}}), nil
	}
	return map[string]Span{"turn_off.peak_over_rated": span}, needs, nil
}

// peakSpan is the span of the gate-limited peak over the rating: nominal and highest edge as they are, then with
// every unknown at either end.
func (p *problem) peakSpan() (Span, error) {
	unknowns := p.unknowns()
	trials := []scene{p.nominal().quick(), p.highest().quick()}
	for _, in := range unknowns {
		for _, s := range []scene{p.nominal().quick(), p.highest().quick()} {
			trials = append(trials, s.with(in.key, in.low), s.with(in.key, in.high))
		}
	}
	peaks := make([]float64, len(trials))
	err := each(len(trials), func(k int) error {
		e, err := trials[k].gateLimited()
		if err == nil {
			peaks[k] = e.Peak
		}
		return err
	})
	span := Span{Low: slices.Min(peaks) / p.rated, High: slices.Max(peaks) / p.rated}
	for k, in := range unknowns {
		ends := peaks[2+4*k : 6+4*k]
		if moves := max(math.Abs(ends[0]-ends[1]), math.Abs(ends[2]-ends[3])); in.assumed && moves > movesSpan*p.rated {
			span.Assumed = append(span.Assumed, in.key)
		}
	}
	return span, err
}
