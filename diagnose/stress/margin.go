package stress

import (
	"slices"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// The verdict bounds, as shares of the rating at the coldest junction (judgement; the 80 % of rated voltage
// is a commercial rule of thumb, from memory).
const (
	withinShare = 0.80
	thinShare   = 0.91
	bareShare   = 1.00
)

// Margin is what the switch saw and what the chosen rebuild will see.
type Margin struct {
	Case    string
	Rated   float64  // V, at the coldest junction
	Stated  float64  // V, as the case states it
	Allowed float64  // V, 80 % of rated
	AsFound *Figures // nil when too little is known; Needs says what
	Rebuild *Figures // nil when no rebuild is stated, or when it cannot be worked out; Needs says why
	Chosen  bool     // a rebuild is stated
	Assumed []Assumed
	Needs   []Need
}

// Figures are the peaks of one board with one network.
type Figures struct {
	Network      Network
	Position     string
	Rated        float64 // V, at the coldest junction, of this board's switch
	Nominal      *Edge   // gate-limited, nominal bus, running current
	Cut          *Edge   // cut, nominal bus, running current
	Highest      *Edge   // gate-limited, highest bus, worst current, middle of every interval
	ShortCircuit *Edge   // gate-limited, highest bus, stated short-circuit current; nil when that is not stated
	Worst        Worst
	P999         Percentile
	Verdict      Verdict
	LiftedBy     []string // the answers that would lift a verdict held down for want of them
	Rests        []string // what a verdict rests on, in words with the safe interval
}

// Network is a snubber with its parts.
type Network struct {
	Kind  string
	Parts []Part
}

// Part is one stated part of a network.
type Part struct {
	Key   string
	Value quantity.Quantity
}

// Worst is the absolute corner: the highest bus, the worst current and every unknown at the point that raises the
// peak most, with what would have to be true for it. It is the cut edge's unless the gate-limited edge, which can
// hand the current to a network faster, goes higher.
type Worst struct {
	Peak   float64
	Edge   string // turn-off
	Shape  string // cut, gate-limited
	Corner []Corner
}

// Corner is one value of the absolute corner.
type Corner struct {
	Key     string
	Value   float64
	Unit    quantity.Unit
	Assumed bool
}

// Percentile is the 99.9th percentile of the gate-limited peak.
type Percentile struct {
	Peak    float64
	Samples int
}

// Verdict grades a board on the 99.9th percentile against its rating.
type Verdict string

// The verdicts.
const (
	Within  Verdict = "within"
	Thin    Verdict = "thin"
	Bare    Verdict = "bare"
	OverIt  Verdict = "over"
	Unknown Verdict = "unknown"
)

// Grade gives the verdict for a share of the rating: within to 80 %, thin to 91 %, bare to 100 %, over above; a
// share that is no number is unknown.
func Grade(share float64) Verdict {
	switch {
	case share != share:
		return Unknown
	case share <= withinShare:
		return Within
	case share <= thinShare:
		return Thin
	case share <= bareShare:
		return Bare
	}
	return OverIt
}

// Compute works out the margin of the board as found and of the chosen rebuild. Seed makes the draws of the
// percentile; equal seeds give equal figures. What is missing is no error but a need, and so is a board whose values
// the solver refuses; the error is always nil so far.
func Compute(c *measure.Case, seed uint64) (*Margin, error) {
	m := &Margin{Case: c.ID}
	m.AsFound = m.figures(c.Board, seed)
	if c.Rebuild != nil && len(c.Rebuild.Keys) > 0 {
		m.Chosen = true
		m.Rebuild = m.figures(c.Rebuild.Board, seed)
	}
	return m, nil
}

// figures works out one board and adds its assumptions and needs to the margin; nil when it cannot be worked out.
func (m *Margin) figures(b measure.Board, seed uint64) *Figures {
	p, needs := prepare(b)
	m.addNeeds(needs)
	if p == nil {
		return nil
	}
	if m.Rated == 0 {
		m.Rated, m.Stated, m.Allowed = p.rated, p.stated, withinShare*p.rated
	}
	f := &Figures{Network: p.network(), Position: p.position, Rated: p.rated}
	err := p.edges(f)
	if err == nil {
		err = m.judge(f, p, seed)
	}
	if err != nil {
		m.addNeeds([]Need{{unsolved, []string{forMargin, err.Error()}}})
		return nil
	}
	return f
}

// edges solves the edges that are shown with their waveforms.
func (p *problem) edges(f *Figures) error {
	solve := func(into **Edge, s scene, shape edgeShape) error {
		e, err := shape(s)
		if err == nil {
			e.Position = p.position
			*into = e
		}
		return err
	}
	if err := solve(&f.Nominal, p.nominal(), scene.gateLimited); err != nil {
		return err
	}
	if err := solve(&f.Cut, p.nominal(), scene.cut); err != nil {
		return err
	}
	if err := solve(&f.Highest, p.highest(), scene.gateLimited); err != nil {
		return err
	}
	if s, ok := p.shortCircuit(); ok {
		return solve(&f.ShortCircuit, s, scene.gateLimited)
	}
	return nil
}

// judge scans the unknowns, draws the percentile and gives the verdict.
func (m *Margin) judge(f *Figures, p *problem, seed uint64) error {
	scan, err := p.scan()
	if err != nil {
		return err
	}
	m.addAssumed(p, scan)
	var highest scene
	if f.P999, highest, err = p.percentile(seed); err != nil {
		return err
	}
	if f.Worst, err = p.worst(highest); err != nil {
		return err
	}
	f.P999.Peak = min(f.P999.Peak, f.Worst.Peak) // no draw can pass the corner
	f.LiftedBy = p.lifts()
	return p.verdict(f, scan)
}

// verdict grades the percentile. Within is given only when the gate is known and no assumed value alone could take
// the peak over the bound; else it is thin.
func (p *problem) verdict(f *Figures, scan []scanned) error {
	f.Verdict = Grade(f.P999.Peak / p.rated)
	if f.Verdict != Within {
		return nil
	}
	var err error
	if f.Rests, err = p.rests(scan, withinShare*p.rated); err != nil {
		return err
	}
	if len(f.Rests)+len(f.LiftedBy) > 0 {
		f.Verdict = Thin
	}
	return nil
}

func (m *Margin) addNeeds(needs []Need) {
	for _, n := range needs {
		if !slices.ContainsFunc(m.Needs, func(have Need) bool { return have.Key == n.Key }) {
			m.Needs = append(m.Needs, n)
		}
	}
}

// addAssumed lists every value that was not simply stated, with what it moves.
func (m *Margin) addAssumed(p *problem, scan []scanned) {
	for _, in := range p.in.values {
		if !in.assumed && in.why == "" || slices.ContainsFunc(m.Assumed, func(have Assumed) bool { return have.Key == in.key }) {
			continue
		}
		a := Assumed{Key: in.key, Why: in.why, Value: quantity.Quantity{Value: in.mid, Low: in.low, High: in.high, Unit: in.unit}}
		for _, s := range scan {
			if s.input.key == in.key {
				a.MovesPeak = s.highest() - s.lowest()
			}
		}
		m.Assumed = append(m.Assumed, a)
	}
}

// coldRating lowers the rated voltage by 0.1 %/K below 25 °C at the coldest junction.
func coldRating(rated, coldest float64) float64 {
	return rated * (1 - 0.001*max(0, 25-coldest))
}
