package stress

import (
	"fmt"
	"slices"
	"strings"

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

// Figures are the peaks of one board with one network, at the position where they are highest over the rating.
type Figures struct {
	Network  Network
	Position string
	Alike    []string // positions with the same figures, this one first
	Rated    float64  // V, at the coldest junction, of this position's switch
	Nominal  *Edge    // gate-limited, nominal bus, running current: the edge that is highest
	Cut      *Edge    // cut, nominal bus, running current
	Highest  *Edge    // gate-limited, highest bus, worst current, middle of every interval: the edge that is highest
	// Edges are the edges at nominal bus and running current. A chopper's turn-on is seen at its diode, and only given when
	// the diode's recovery and the slope of the current are stated.
	Edges        []*Edge
	ShortCircuit *Edge // gate-limited, highest bus, stated short-circuit current; nil when that is not stated
	Worst        Worst
	P999         Percentile
	Avalanche    *Avalanched // nil when the chip stays below its rating, or cannot avalanche
	Clamp        *Clamped    // nil without a clamp
	PumpUp       *PumpedUp   // nil unless the tie of a recovery network is open
	Duty         *Duty       // nil without a network
	LastPart     *LastPart   // nil without parallel parts and a stated spread of their delays
	Measured     *FromCapture
	Verdict      Verdict
	LiftedBy     []string // the answers that would lift a verdict held down for want of them
	Rests        []string // what a verdict rests on or leaves out, in words, assumed values with their safe interval
}

// Avalanched is what a MOSFET takes up in avalanche, at the highest bus and worst current; all of it on the one device
// that breaks down first, at its rating.
type Avalanched struct {
	Prospective float64 // V, the peak if it did not avalanche
	Volt        float64 // V, taken as its breakdown
	Energy      float64 // J, each edge
	Time        float64 // s
	Current     float64 // A, highest
	Rise        float64 // K of the junction in one pulse; 0 when no thermal ladder is stated
	EveryCycle  bool    // at the nominal bus and running current too
	OverEnergy  bool    // above the rated energy
	OverCurrent bool    // above the rated current
	Rated       bool    // energy and current of one pulse are stated
}

// Clamped is the balance of a clamp at the PWM frequency and worst current.
type Clamped struct {
	Volt   float64 // V, held; as stated, or where the resistor leaves it
	Stated bool
	// Watts go into the resistor, at the PWM frequency; 0 when that is not stated, below zero where the clamp is stated to be
	// held under the bus, which then feeds it.
	Watts  float64
	Charge float64 // C, each edge
	Ripple float64 // V, each edge
}

// PumpedUp is the reservoir of a recovery network whose tie is open.
type PumpedUp struct {
	FirstEdge float64 // V, gained by the first edge at the running current
	End       float64 // V, where it ends
	EndsBy    string  // breakdown
	Edges     float64 // until then
	Time      float64 // s until then; 0 when the PWM frequency is not stated
}

// Duty is what the network goes through each PWM cycle, at the nominal bus and running current.
type Duty struct {
	CapacitorRMS  float64 // A; 0 when the PWM frequency is not stated
	CapacitorPeak float64 // A
	Slope         float64 // V/s, of the capacitor
	ResistorWatts float64 // W; 0 when the PWM frequency is not stated
	Discharge     float64 // A, into the switch that closes
	Emptied       float64 // share of its charge that leaves within the shortest on-time
}

// LastPart is the part of a bank that opens last.
type LastPart struct {
	Current float64 // A, highest
	Energy  float64 // J, each opening, at the worst current
	Share   float64 // of the bank's current that it carries in the end
}

// FromCapture is the edge at the highest bus and worst current as a measured edge foretells it.
type FromCapture struct {
	Name           string  // of the capture or the stage
	Low, Mid, High float64 // V, peak
	Why            string  // what was carried over, and how far
	Near           bool    // bus and current were raised by little, so that the upper end says something of the board
	Loop           float64 // H, loop inductance found from it; 0 when it does not say enough
	LoopLow        float64
	LoopHigh       float64
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
	Edge   string // turn-off, turn-on, all-off
	Shape  string // cut, gate-limited, ramp
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
	found, rebuilt := openingsOf(c)
	m.AsFound = m.figures(c.Board, found, seed)
	if c.Rebuild != nil && len(c.Rebuild.Keys) > 0 {
		m.Chosen = true
		m.Rebuild = m.figures(c.Rebuild.Board, rebuilt, seed)
	}
	return m, nil
}

// figures works out one board and adds its assumptions and needs to the margin; nil when it cannot be worked out. Of
// several unlike positions the one counts that comes nearest to its rating, or furthest over it.
func (m *Margin) figures(b measure.Board, openings []seen, seed uint64) *Figures {
	problems, needs := prepareAll(b)
	m.addNeeds(needs)
	var worst *Figures
	for _, p := range problems {
		f := &Figures{Network: p.network(), Position: p.position, Alike: p.alike, Rated: p.rated}
		err := p.edgesOf(f)
		if err == nil {
			f.Measured, err = p.fromCapture(openings)
		}
		if err == nil {
			err = m.judge(f, p, seed)
		}
		if err != nil {
			m.addNeeds([]Need{{unsolved, []string{forMargin, p.refusal(err)}}})
			return nil
		}
		if worst == nil || f.P999.Peak/f.Rated > worst.P999.Peak/worst.Rated {
			worst = f
			m.Rated, m.Stated, m.Allowed = p.rated, p.stated, withinShare*p.rated
		}
	}
	return worst
}

// edgesOf solves the edges that are shown with their waveforms, and what follows from them.
func (p *problem) edgesOf(f *Figures) error {
	edges, err := p.cycle()
	if err != nil {
		return err
	}
	for _, e := range edges {
		if e.Name != turnOn || p.closingKnown() {
			f.Edges = append(f.Edges, e)
		}
	}
	f.Duty = p.duty(edges)
	f.Nominal = topEdge(f.Edges, p.leg())
	if f.Cut, err = p.placed(isCut, p.nominal()); err != nil {
		return err
	}
	for _, g := range p.edges {
		e, err := p.placed(g, p.highest())
		if err != nil {
			return err
		}
		if f.Highest == nil || e.Peak > f.Highest.Peak {
			f.Highest = e
		}
	}
	if p.leg() && !p.closingKnown() {
		e, err := p.placed(closes, p.highest().quick())
		if err != nil {
			return err
		}
		f.Rests = append(f.Rests, fmt.Sprintf("every edge but the closing of the opposite switch, which is not graded for want of %s; with typical values it would reach %s",
			strings.Join(p.liftsClosing(), " and "), quantity.Format(e.Peak, quantity.Volt)))
	}
	if s, ok := p.shortCircuit(); ok {
		if f.ShortCircuit, err = p.placed(opens, s); err != nil {
			return err
		}
	}
	return p.consequences(f)
}

// cycle is the opening and, where something takes the current over, the closing, at the nominal bus and running current.
func (p *problem) cycle() ([]*Edge, error) {
	list := []graded{opens}
	if p.base.free {
		list = append(list, closes)
	}
	var out []*Edge
	for _, g := range list {
		e, err := p.placed(g, p.nominal())
		if err != nil {
			return nil, err
		}
		out = append(out, e)
	}
	return out, nil
}

// closingKnown tells whether the closing edge is shown and, in a leg, graded. Without the recovery of the diode and the
// slope of the current it is guesswork: with typical values alone most sound bridges would stand above their rating.
func (p *problem) closingKnown() bool { return len(p.liftsClosing()) == 0 }

// topEdge is the highest of the edges that count; the closing of a chopper does not, its peak stands at the diode.
func topEdge(edges []*Edge, leg bool) *Edge {
	var top *Edge
	for _, e := range edges {
		if (e.Name != turnOn || leg) && (top == nil || e.Peak > top.Peak) {
			top = e
		}
	}
	return top
}

// placed solves an edge and names where its voltage stands.
func (p *problem) placed(g graded, s scene) (*Edge, error) {
	e, err := g.in(s)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", g.name, err)
	}
	if e.Position = p.position; g.name == turnOn && !p.leg() {
		e.Position = atFreewheel
	}
	return e, nil
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
	f.LiftedBy = p.lifts(f.Measured != nil && f.Measured.Near)
	return p.verdict(f, scan)
}

// verdict grades the percentile, or what a measured opening foretells where that is worse. Within is given only when the
// gate is known or an opening was measured near the highest bus and worst current, no assumed value alone could take the
// peak over the bound, such an opening does not reach over it, and the edges follow all that the board states; else it is
// thin.
func (p *problem) verdict(f *Figures, scan []scanned) error {
	f.Verdict = Grade(max(f.P999.Peak, f.foretold()) / p.rated)
	if f.PumpUp != nil && f.PumpUp.EndsBy == StopBreakdown {
		f.Verdict = OverIt // whatever a single edge does
	}
	if f.foretold() > f.P999.Peak {
		f.Rests = append(f.Rests, fmt.Sprintf("the opening measured as %s, which foretells %s at the highest bus and worst current",
			f.Measured.Name, quantity.Format(f.foretold(), quantity.Volt)))
	}
	doubts := p.limits(f)
	if f.Verdict == Within {
		assumed, err := p.rests(scan, withinShare*p.rated)
		if err != nil {
			return err
		}
		doubts = append(doubts, assumed...)
		if f.Measured != nil && f.Measured.Near && f.Measured.High > withinShare*p.rated {
			doubts = append(doubts, fmt.Sprintf("the opening measured as %s, which may reach %s at the highest bus and worst current",
				f.Measured.Name, quantity.Format(f.Measured.High, quantity.Volt)))
		}
		if len(doubts)+len(f.LiftedBy) > 0 {
			f.Verdict = Thin
		}
	}
	f.Rests = append(f.Rests, doubts...)
	return nil
}

// foretold is the peak that a measured opening lets expect; 0 without one.
func (f *Figures) foretold() float64 {
	if f.Measured == nil {
		return 0
	}
	return f.Measured.Mid
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
