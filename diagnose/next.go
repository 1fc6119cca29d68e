package diagnose

import (
	"sort"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// hazardMinutes is the price of a test's danger, beyond the minutes it takes. Judgement.
var hazardMinutes = map[string]float64{"low-bus": 10, "full": 30}

// liftMinutes is what it takes to lift a lead and put it back, beyond the reading itself. Judgement.
const liftMinutes = 4

// Candidate is one test that could be done now, with what it is worth.
type Candidate struct {
	Test           *knowledge.Test
	Part, Position string
	Lifted         bool    // take the part's reading with a lead lifted
	Must           bool    // a check that stands until it is done
	Serves         bool    // a dead test after the rebuild: it serves the hold points, does not vote and saves nothing
	Static         bool    // a test that every position passes before power: it has to be read, and right
	Again          string  // a dead test that was read after the rebuild and stands against power: what was read, and what to do
	Deferred       bool    // put off by the technician; comes after the rest
	Value          float64 // minutes saved, net of the test's own minutes and hazard price
	Bits           float64 // expected information about the causes
	Minutes        float64
	Allowed        bool
	BlockedBy      []string
	UnlockedBy     []string
}

// Suggestion is the next test to do, the rest in order of value, and why to stop when there is nothing left.
type Suggestion struct {
	Case   string
	At     time.Time
	Tests  []Candidate // most valuable first
	Stop   string      // "" while a test is worth doing
	Locked *Candidate  // a locked test worth more than every allowed one, or a must-do check when all of them are locked
	Repair []string    // repairs worth doing at this state of belief
	Price  float64     // expected minutes if no further test is done
}

// Withheld tells whether a test worth its minutes exists but no allowed one does.
func (s Suggestion) Withheld() bool { return s.Locked != nil && len(s.Allowed()) == 0 }

// Allowed gives the tests worth their minutes, and must-do checks, that the safety state grants.
func (s Suggestion) Allowed() []Candidate {
	var out []Candidate
	for _, c := range s.Tests {
		if c.Allowed && (c.Value > 0 || c.Must) {
			out = append(out, c)
		}
	}
	return out
}

// Next values every test that has not been answered. The safety state at time now decides which are allowed.
func Next(base *knowledge.Base, c *measure.Case, computed map[string]stress.Span, now time.Time) (*Suggestion, error) {
	return For(base).Next(c, computed, now)
}

func (v *view) next(c *measure.Case, computed map[string]stress.Span, now time.Time) (*Suggestion, error) {
	s, err := v.solve(c, computed, false)
	if err != nil {
		return nil, err
	}
	defer s.update.Release()
	s.prepare(func(int) bool { return true })
	plan := newPlanner(s.view)
	price, chosen := plan.cost(s.update.Posterior)
	out := &Suggestion{Case: c.ID, At: now, Price: price}
	for i, yes := range chosen {
		if yes {
			out.Repair = append(out.Repair, plan.ids[i])
		}
	}
	gates := newGates(v.base, c, now)
	voting, serving := s.candidates(c), []Candidate(nil)
	if rebuiltBy(c, now) {
		voting, serving = afterRebuild(voting, gates.evidence.Statics, gates.open)
	}
	s.valueAll(voting, price)
	out.Tests = append(voting, serving...)
	for i := range out.Tests {
		gates.apply(&out.Tests[i])
	}
	sort.SliceStable(out.Tests, func(i, j int) bool { return out.Tests[i].before(out.Tests[j]) })
	out.conclude(s)
	return out, nil
}

// before orders candidates: what was put off comes last; the history comes first, in the order of the base; what saves
// minutes stands by its value; of the rest, which save nothing by themselves yet, the must-do checks come first, in the
// order of the base, then the most information for the minute.
func (c Candidate) before(d Candidate) bool {
	switch {
	case c.Deferred != d.Deferred:
		return d.Deferred
	case c.history() || d.history():
		return c.history() && !d.history()
	case c.Value > 0 || d.Value > 0:
		return c.Value > d.Value
	case c.Must != d.Must:
		return c.Must
	case c.Must:
		return false
	}
	return c.Bits*d.Minutes > d.Bits*c.Minutes
}

// history tells whether a candidate is a question that must be asked: memories fade, and it costs no meter.
func (c Candidate) history() bool { return c.Must && c.Test.Needs == "question" }

// gates answers which needs the safety state grants, each asked once.
type gates struct {
	c        *measure.Case
	now      time.Time
	evidence safety.Evidence
	open     toRead // what of it stands against power
	seen     map[safety.Work]safety.Decision
}

func newGates(base *knowledge.Base, c *measure.Case, now time.Time) *gates {
	evidence, open := evidenceOf(base, c)
	return &gates{c, now, evidence, open, map[safety.Work]safety.Decision{}}
}

func (g *gates) apply(c *Candidate) {
	work := WorkOf(c.Test)
	d, ok := g.seen[work]
	if !ok {
		d = safety.Check(g.c, work, g.now, g.evidence)
		g.seen[work] = d
	}
	c.Allowed = d.Allowed
	for _, m := range d.Missing {
		c.BlockedBy = append(c.BlockedBy, m.Text)
		c.UnlockedBy = append(c.UnlockedBy, m.Unlock)
	}
}

// conclude says whether to stop, and names a locked test that is worth more than every allowed one; when nothing
// allowed is left, a must-do check that is locked is worth its minutes whatever it saves.
func (s *Suggestion) conclude(st *state) {
	for i := range s.Tests {
		if c := &s.Tests[i]; c.Value > 0 && (s.Locked == nil || c.Value > s.Locked.Value) {
			s.Locked = c
		}
	}
	if s.Locked != nil && s.Locked.Allowed {
		s.Locked = nil
	}
	for i := range s.Tests {
		if c := &s.Tests[i]; c.Must && !c.Allowed && s.Locked == nil && len(s.Allowed()) == 0 {
			s.Locked = c
		}
	}
	if !s.anyPays() && !s.mustStands() && !st.pairPays(s.Tests, s.Price) {
		s.Stop = "no test or pair of tests saves more minutes than it costs"
	}
}

func (s *Suggestion) anyPays() bool {
	for _, c := range s.Tests {
		if c.Value > 0 {
			return true
		}
	}
	return false
}

func (s *Suggestion) mustStands() bool {
	for _, c := range s.Tests {
		if c.Must {
			return true
		}
	}
	return false
}
