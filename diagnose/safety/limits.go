package safety

import (
	"math"
	"strings"

	"drivemend/measure/quantity"
)

// Limit is one source's threshold for one hazard, held against this board. Where sources differ each stands by itself.
type Limit struct {
	ID        string // of the threshold, for the cautions that follow it
	Hazard    string // one of the hazards below
	Threshold string // "50 V", "100 V and 10 J"
	Answers   string // the question it answers: "when parts must be de-energised before work, US"
	Source    string
	Short     string // the source in a few letters, for a narrow column
	Read      Grade
	Board     string // this board's figures held against it: "bus 390 V, 200.8 J at +20 %"
	Above     bool   // this board is at or above it
	Unknown   bool   // this board's figure is not known, and Above says nothing
	Apart     bool   // the line is drawn for other voltages or sources than those of this board
	Lowest    bool   // the lowest for its hazard at a store of this board, and so the one this program goes by; equals share it
}

// The hazards of a Limit. Sources are comparable within one of them and not beyond.
const (
	HazardTouch      = "touch"
	HazardTouchAC    = "touch, AC"
	HazardCharge     = "residual charge"
	HazardEnergy     = "stored energy"
	HazardClass      = "hazard class"
	HazardBurn       = "burn, capacitors"
	HazardBurnSource = "burn, battery"
	HazardArc        = "arc flash, capacitors"
	HazardArcSource  = "arc flash, source"
	HazardNoise      = "noise"
	HazardMeter      = "meter and part"
)

// subject is the figure of a board that a threshold is held against.
type subject int

const (
	byVolt    subject = iota // the voltage of the highest store
	byBattery                // the same, where the supply is a battery or may be one
	byCharge                 // the charge of a store, capacitance at the top of its interval
	byEnergy                 // the energy of a store, likewise
	byTotal                  // the energy of all stores together, likewise
	byAC                     // nothing on an isolated board: only the dead check reads it
	bySource                 // what a battery or a shared bus can give: no case states it
)

// threshold is one line of one source.
type threshold struct {
	id, hazard, text, answers string
	from                      citation
	by                        subject
	// level is the line in the SI unit of its subject at a store of so many volts, +Inf where the line does not reach.
	level func(volt float64) float64
	over  bool // "more than": at the level itself nothing is above yet
}

// citation is a source as it was read.
type citation struct {
	short, long string
	read        Grade
}

// limits holds the thresholds of every source against the stores of a board.
func limits(h hazard) []Limit {
	out := make([]Limit, 0, len(thresholds))
	for _, t := range thresholds {
		l := Limit{ID: t.id, Hazard: t.hazard, Threshold: t.text, Answers: t.answers,
			Source: t.from.long, Short: t.from.short, Read: t.from.read, Lowest: h.lowest(t)}
		switch {
		case h.foreign(t):
			l.Apart, l.Board = true, "no vehicle ("+h.in.Supply+")"
		case t.by == byAC:
			l.Unknown, l.Apart, l.Board = true, true, "no AC is stored"
		case t.by == bySource:
			h.holdSource(t, &l)
		case t.by == byBattery:
			h.holdBattery(t, &l)
		default:
			h.holdStores(t, &l)
		}
		out = append(out, l)
	}
	return out
}

// foreign tells of a line about vehicles on a board that no battery feeds; one whose supply is not stated may be a
// vehicle's.
func (h hazard) foreign(t threshold) bool {
	return (t.from == citeVehicles || t.from == citeCrashed) && h.in.Supply != "" && !h.battery()
}

// lowest tells whether no other line of the same hazard lies lower at some store of this board that the line reaches.
func (h hazard) lowest(t threshold) bool {
	if h.foreign(t) {
		return false
	}
	for _, s := range h.in.Stores {
		own, least := t.level(s.Voltage.Value), math.Inf(1)
		for _, other := range thresholds {
			if other.hazard == t.hazard && !h.foreign(other) {
				least = min(least, other.level(s.Voltage.Value))
			}
		}
		if !math.IsInf(own, 1) && own <= least {
			return true
		}
	}
	return false
}

// figure is what a store puts against a line; ok is false for a place without a capacitor, where the line is about one.
func (h hazard) figure(by subject, s Store) (value float64, ok bool) {
	switch by {
	case byVolt, byBattery:
		return s.Voltage.Value, true
	case byTotal:
		return h.joule, true
	case byCharge:
		return s.ChargeC * h.in.spread(), s.Capacitance.Basis != None
	}
	return s.WorstJ, s.Capacitance.Basis != None
}

// passes tells whether a value is above the line at a voltage.
func (t threshold) passes(volt, value float64) bool {
	level := t.level(volt)
	return value > level || value == level && !t.over
}

// holdStores names the store that goes farthest above a line, and the others above it; or the one that comes nearest.
func (h hazard) holdStores(t threshold, l *Limit) {
	share, also := math.Inf(-1), map[string]bool{}
	top := ""
	for _, s := range h.ordered(t.by) {
		value, ok := h.figure(t.by, s)
		level := t.level(s.Voltage.Value)
		if !ok || math.IsInf(level, 1) {
			continue
		}
		if t.passes(s.Voltage.Value, value) {
			l.Above, also[s.Point] = true, true
		}
		if r := value / level; r > share {
			share, top, l.Board = r, s.Point, h.figureText(t, s, value)
		}
	}
	if top == "" {
		s := h.ordered(byVolt)[0]
		l.Apart, l.Board = true, "no store in its range ("+s.Point+" "+format(s.Voltage.Value, quantity.Volt)+")"
		return
	}
	l.Board += h.alsoText(also, top)
}

// alsoText names further stores in the order of the board, but for parts of the one that is named: "; also clamp".
func (h hazard) alsoText(also map[string]bool, top string) string {
	var names []string
	for _, s := range h.in.Stores {
		if also[s.Point] && s.Point != top && s.PartOf != top {
			names = append(names, s.Point)
		}
	}
	if len(names) == 0 {
		return ""
	}
	return "; also " + strings.Join(names, ", ")
}

// ordered gives the stores a line is held against: for a voltage the highest one alone, for what all hold together the
// bank in their stead.
func (h hazard) ordered(by subject) []Store {
	switch by {
	case byVolt, byBattery:
		top := h.in.Stores[0]
		for _, s := range h.in.Stores {
			if s.Voltage.Value > top.Voltage.Value {
				top = s
			}
		}
		return []Store{top}
	case byTotal:
		return h.in.Stores[:1]
	}
	return h.in.Stores
}

// figureText is a store's figure in words: "bus 390 V, 200.8 J at +20 %".
func (h hazard) figureText(t threshold, s Store, value float64) string {
	where := s.Point + " " + format(s.Voltage.Value, quantity.Volt)
	switch {
	case t.by == byVolt || t.by == byBattery:
		return where
	case t.by == byCharge:
		return where + ", " + format(value, quantity.Coulomb) + " " + atTop(h.in.spread())
	case t.by == byTotal:
		return h.worst(value) + " in all"
	case t.hazard == HazardClass:
		return where + ", " + h.worst(value) + ": " + classAt(s.Voltage.Value, value)
	}
	return where + ", " + h.worst(value)
}

// holdBattery holds a line about the voltage of batteries against a board that has one, or may have.
func (h hazard) holdBattery(t threshold, l *Limit) {
	if h.battery() || h.in.Supply == "" {
		h.holdStores(t, l)
		return
	}
	l.Apart, l.Board = true, "no battery ("+h.in.Supply+")"
}

// holdSource holds a line about a source against a board whose source's amperes no case states: one that may be able to
// counts as above.
func (h hazard) holdSource(t threshold, l *Limit) {
	bus := h.in.Stores[0].Voltage.Value
	at := format(bus, quantity.Volt)
	switch {
	case math.IsInf(t.level(bus), 1):
		l.Apart, l.Board = true, "out of its range ("+PointBus+" "+at+")"
	case h.source(t):
		l.Above, l.Board = true, h.in.Supply+" "+at+"; what it can give is not stated, counted as above"
	case h.in.Supply == "":
		l.Unknown, l.Board = true, "supply not stated, "+at+"; if it is a battery count it as above"
	default:
		l.Apart, l.Board = true, "no such source ("+h.in.Supply+")"
	}
}

// source tells whether the supply is one that a line about sources is drawn for.
func (h hazard) source(t threshold) bool {
	return h.battery() || t.hazard == HazardArcSource && h.in.Supply == "shared-bus"
}

// limit gives the threshold of an id as it stands against the board.
func (p *Plan) limit(id string) Limit {
	for _, l := range p.Limits {
		if l.ID == id {
			return l
		}
	}
	return Limit{}
}

// goneBy gives the line this board is above among the lowest of a hazard, of equals the one that was read best; its
// Above is false where the board is above none of them.
func (p *Plan) goneBy(hazard string) Limit {
	var best Limit
	for _, l := range p.Limits {
		if l.Hazard == hazard && l.Lowest && l.Above && (!best.Above || grades[l.Read] < grades[best.Read]) {
			best = l
		}
	}
	return best
}

// grades orders the grades, the best first.
var grades = map[Grade]int{Read: 0, SecondHand: 1, Memory: 2, CommonPractice: 3}
