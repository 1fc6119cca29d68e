package diagnose

import (
	"fmt"
	"sort"
	"strings"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/meter"
	"drivemend/measure/quantity"
)

// surePass is the share the passing results must have of a reading, one of them being the likeliest, for a static test
// to count as passed: as likely as not is not enough to put power on. Judgement.
const surePass = 0.5

// standing is how a reading of a static test stands, the worst last.
type standing int

const (
	passes    standing = iota
	unsettled          // put off or skipped
	unclear            // what it reads cannot be told
	outside            // taken outside its hold point
	fails              // reads what does not pass
)

// verdict is how one reading stands, and in words why it does not pass.
type verdict struct {
	how     standing
	because string
}

// openStatic is a static test that still stands between a position and power.
type openStatic struct {
	test     *knowledge.Test
	position string
	parts    []string // the parts that are open
	lifted   []string // those of them that were read lifted and failed: their bank in circuit cannot clear them
	worst    verdict  // of what was read; it passes when a part was only not read
}

// staticPlace is what a dead reading was taken of: a part, a bank as a whole, or the board as a whole.
type staticPlace struct {
	test       string
	bank, part int    // -1: as a whole
	name       string // "" unless the reading names a place that the board does not have, or not which one
}

// statics judges the static tests of a board on the readings taken since its rebuild.
type statics struct {
	c         *measure.Case
	board     measure.Board
	held      *held
	rebuilt   bool
	tests     []*knowledge.Test
	positions []measure.Position
	base      *knowledge.Base
	readings  map[staticPlace][]int // the observations at each place, the oldest first
	placeOf   map[int]staticPlace   // of each of them
	verdicts  map[int]verdict       // of each observation that was asked about
}

func newStatics(base *knowledge.Base, c *measure.Case, powered []time.Time) *statics {
	s := &statics{c: c, board: c.Board, base: base, readings: map[staticPlace][]int{}, placeOf: map[int]staticPlace{}, verdicts: map[int]verdict{}}
	if s.rebuilt = c.Rebuild != nil && !c.Rebuild.Done.IsZero(); s.rebuilt {
		s.board = c.Rebuild.Board
	}
	s.positions = s.board.Positions()
	sight := &view{base: base, board: s.board}
	for i := range base.Tests {
		if t := &base.Tests[i]; len(t.Static) > 0 && t.StaticFor(sight.lookup) && sight.applies(t.Applies) && sight.hasEvent(t.Observes) {
			s.tests = append(s.tests, t)
		}
	}
	if s.rebuilt {
		s.gather()
		s.held = newHeld(c, powered)
		for i, place := range s.placeOf {
			s.held.note(WorkOf(base.Test(place.test)), c.Observations[i].At)
		}
	}
	return s
}

// hasEvent tells whether an event can be on the board.
func (v *view) hasEvent(id string) bool {
	e := v.base.Event(id)
	return e != nil && v.applies(e.Applies)
}

// gather lists the readings of dead tests at each place, the oldest first: a time decides, of equal ones the later entry.
func (s *statics) gather() {
	tests, banks, parts := s.deadTests(), map[string]int{}, map[string][2]int{}
	for b, p := range s.positions {
		banks[p.Name] = b
		for i, name := range p.Parts {
			parts[name] = [2]int{b, i}
		}
	}
	for i := range s.c.Observations {
		ob := &s.c.Observations[i]
		t := tests[ob.Test]
		if t == nil || !s.c.After(*ob) {
			continue
		}
		place, ok := s.place(t, ob, banks, parts)
		if !ok {
			place.name = strings.Join([]string{ob.Position, ob.Part, ob.State}, "/")
		}
		s.placeOf[i] = place
		s.readings[place] = append(s.readings[place], i)
	}
	for _, list := range s.readings {
		s.inOrder(list)
	}
}

// deadTests gives the tests of a dead board that observe something.
func (s *statics) deadTests() map[string]*knowledge.Test {
	tests := map[string]*knowledge.Test{}
	for i := range s.base.Tests {
		if t := &s.base.Tests[i]; t.Needs == "dead" && t.Observes != "" {
			tests[t.ID] = t
		}
	}
	return tests
}

// inOrder puts observations into the order of their times, those of one moment into that of their entry.
func (s *statics) inOrder(list []int) {
	sort.Slice(list, func(a, b int) bool {
		i, j := list[a], list[b]
		x, y := s.c.Observations[i].At, s.c.Observations[j].At
		return x.Before(y) || x.Equal(y) && i < j
	})
}

// place gives what a reading was taken of. Leads on a part in circuit read its whole bank. A reading that names no
// place is of the only position, or of the board; a part that the board does not have, a lifted one that is not named,
// and a position nobody named on a board with several say nothing.
func (s *statics) place(t *knowledge.Test, ob *measure.Observation, banks map[string]int, parts map[string][2]int) (staticPlace, bool) {
	whole := staticPlace{test: t.ID, bank: -1, part: -1}
	if ob.Part != "" {
		at, known := parts[ob.Part]
		if t.Per == "part" && (!atTerminals(t) || ob.State == "lifted") {
			return staticPlace{test: t.ID, bank: at[0], part: at[1]}, known
		}
		return staticPlace{test: t.ID, bank: at[0], part: -1}, known
	}
	b, known := banks[ob.Position]
	switch {
	case ob.Position != "" && !known:
		return whole, false
	case ob.Position == "" && len(s.positions) > 1:
		return whole, t.Per == ""
	}
	unnamed := t.Per == "part" && ob.State == "lifted" && len(s.positions[b].Parts) > 1
	return staticPlace{test: t.ID, bank: b, part: -1}, !unnamed
}

// judge gives every static test of every position, position by position, and those that are open.
func (s *statics) judge() ([]safety.Static, []openStatic) {
	all := make([]safety.Static, 0, len(s.positions)*len(s.tests))
	var open []openStatic
	for b := range s.positions {
		for _, t := range s.tests {
			st, left := s.one(b, t)
			all = append(all, st)
			if !st.Passed {
				open = append(open, left)
			}
		}
	}
	return all, open
}

// one judges a static test of one position: every part has a newest reading that passes, and so has the bank as a whole
// if it was read. A short beside sound parts is a short all the same.
func (s *statics) one(b int, t *knowledge.Test) (safety.Static, openStatic) {
	p := &s.positions[b]
	st := safety.Static{Test: t.ID, Title: t.Title, Position: p.Name}
	left := openStatic{test: t, position: p.Name}
	if !s.rebuilt {
		st.Because, left.parts = "no rebuild is entered as done, and a reading before rebuild.done does not count", p.Parts
		return st, left
	}
	var wrong, missing []string
	bank := s.newer(s.at(t, -1, -1), s.at(t, b, -1))
	read := func(i int) bool {
		if ob := &s.c.Observations[i]; ob.At.After(st.At) {
			st.At = ob.At
		}
		v := s.verdict(t, p, i)
		if v.how != passes {
			wrong = appendNew(wrong, v.because)
		}
		if v.how > left.worst.how {
			left.worst = v
		}
		return v.how == passes
	}
	whole := bank >= 0 && !read(bank)
	for i := range p.Parts {
		failed := s.stands(t, p, b, i)
		switch own := s.newer(bank, s.part(t, b, i)); {
		case failed >= 0:
			read(failed)
			if own == bank {
				wrong = appendNew(wrong, "a later reading of its bank in circuit does not clear it, read the part lifted")
			}
			left.parts = append(left.parts, p.Parts[i])
			if atTerminals(t) {
				left.lifted = append(left.lifted, p.Parts[i])
			}
		case own >= 0 && own != bank && !read(own):
			left.parts = append(left.parts, p.Parts[i])
		case own < 0:
			missing, left.parts = append(missing, p.Parts[i]), append(left.parts, p.Parts[i])
		}
	}
	if whole {
		left.parts = p.Parts
	}
	if len(left.lifted) == 1 && len(left.parts) == 1 {
		st.Part, st.Lifted = left.lifted[0], true
	}
	switch {
	case len(missing) == len(p.Parts):
		wrong = append(wrong, "not read since the rebuild of "+s.c.Rebuild.Done.Format("15:04"))
	case len(missing) > 0:
		wrong = append(wrong, named(missing)+" not read")
	}
	st.Because = strings.Join(wrong, "; ")
	st.Passed = st.Because == ""
	return st, left
}

// named lists parts, the first few of many.
func named(parts []string) string {
	const most = 6
	if len(parts) <= most {
		return strings.Join(parts, ", ")
	}
	return fmt.Sprintf("%s and %d more", strings.Join(parts[:most], ", "), len(parts)-most)
}

func appendNew(list []string, text string) []string {
	for _, known := range list {
		if known == text {
			return list
		}
	}
	return append(list[:len(list):len(list)], text)
}

// at gives the newest observation at a place, -1 without one.
func (s *statics) at(t *knowledge.Test, bank, part int) int {
	list := s.readings[staticPlace{test: t.ID, bank: bank, part: part}]
	if len(list) == 0 {
		return -1
	}
	return list[len(list)-1]
}

// stands gives the reading of a part by itself that failed and has not been followed by one that passes; -1 without one.
// A bank read in circuit does not answer it: it cannot see a part with its lead up.
func (s *statics) stands(t *knowledge.Test, p *measure.Position, bank, part int) int {
	list := s.readings[staticPlace{test: t.ID, bank: bank, part: part}]
	for k := len(list) - 1; k >= 0 && t.Per == "part"; k-- {
		switch s.verdict(t, p, list[k]).how {
		case passes:
			return -1
		case fails:
			return list[k]
		}
	}
	return -1
}

// part is at for one part; a test of a whole position has no readings of parts.
func (s *statics) part(t *knowledge.Test, bank, part int) int {
	if t.Per != "part" {
		return -1
	}
	return s.at(t, bank, part)
}

// newer gives the later of two observations; -1 stands for none.
func (s *statics) newer(i, j int) int {
	if i < 0 || j < 0 {
		return max(i, j)
	}
	a, b := s.c.Observations[i].At, s.c.Observations[j].At
	if a.After(b) || a.Equal(b) && i > j {
		return i
	}
	return j
}

// verdict judges an observation; each is judged once.
func (s *statics) verdict(t *knowledge.Test, p *measure.Position, i int) verdict {
	v, known := s.verdicts[i]
	if !known {
		ob := s.c.Observations[i]
		if v = s.reads(t, p, ob); v.how != passes {
			v.because = strings.TrimSpace(ob.Part + " " + v.because)
		}
		s.verdicts[i] = v
	}
	return v
}

// reads says what speaks against a reading.
func (s *statics) reads(t *knowledge.Test, p *measure.Position, ob measure.Observation) verdict {
	switch {
	case ob.Answer == "later":
		return verdict{unsettled, "put off"}
	case ob.Answer != "":
		return verdict{unsettled, ob.Answer}
	case ob.Seen != "" && ob.Seen != "at-bench":
		return verdict{unclear, "known " + ob.Seen + " only, not read at the bench"}
	}
	result, why := s.result(t, p, ob)
	switch {
	case why != "":
		return verdict{unclear, why}
	case !t.Passes(result):
		return verdict{fails, "reads " + result}
	}
	if s.held.outside(WorkOf(t), ob) {
		return verdict{outside, "read outside its hold point"}
	}
	return verdict{}
}

// sure is the share of the likeliest result, of a passing one together with the others that pass.
func sure(t *knowledge.Test, shares []Share) float64 {
	if !t.Passes(shares[0].Result) {
		return shares[0].P
	}
	sum := 0.0
	for _, s := range shares {
		if t.Passes(s.Result) {
			sum += s.P
		}
	}
	return sum
}

// fits gives the named result of an observation, or what its number fits, the likeliest first; parts are those of its
// bank.
func (s *statics) fits(t *knowledge.Test, parts int, ob measure.Observation) (word string, shares []Share, err error) {
	switch {
	case ob.Reading == nil:
		return ob.Result, nil, nil
	case ob.Reading.Kind == quantity.Word:
		return ob.Reading.Word, nil, nil
	}
	at := meter.Place{Parallel: 1, Lifted: ob.State == "lifted"}
	if t.Per == "part" && atTerminals(t) && !at.Lifted {
		at.Parallel = max(parts, 1)
	}
	shares, err = readAs(t, ob, expectedOn(s.board, at))
	return "", shares, err
}

// result gives what a reading shows, or why it cannot be told: a named result, or the likeliest one of a number.
func (s *statics) result(t *knowledge.Test, p *measure.Position, ob measure.Observation) (result, why string) {
	word, shares, err := s.fits(t, len(p.Parts), ob)
	switch {
	case word != "":
		return word, ""
	case err != nil:
		return "", "cannot be judged: " + err.Error()
	case shares[0].Result == "misread":
		return "", "reads like a slip of the range or a lead"
	case !(sure(t, shares) > surePass):
		return "", fmt.Sprintf("may read %s, %.0f %% sure only", shares[0].Result, 100*shares[0].P)
	}
	return shares[0].Result, ""
}
