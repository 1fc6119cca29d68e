package diagnose

import (
	"sort"
	"time"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// Finding is one observation as the ranking sees it.
type Finding struct {
	Test           *knowledge.Test
	Part, Position string
	Shown          string // the result or reading as entered
	Source         string // answered, measured, pattern, computed
	Assumed        []string
	Observation    int     // index into the case's observations, -1 for a computed value
	Seen           string  // on-arrival, at-bench, by-cure
	Decibans       float64 // for the asked statement, in the order of the findings
	Alone          float64 // the same with every other finding already known
}

// Unbound is an observation that takes no part in the ranking, and why.
type Unbound struct {
	Observation int
	Why         string
}

// WithoutCure gives the case as it stood before its cure: without what is known only because the cure worked. A
// ranking that is scored against the confirmed cause must not see that.
func WithoutCure(c *measure.Case) *measure.Case {
	before := *c
	before.Observations = nil
	for _, ob := range c.Observations {
		if ob.Seen != "by-cure" {
			before.Observations = append(before.Observations, ob)
		}
	}
	return &before
}

// bind turns the counting observations and the computed figures into votes in the fixed order, and lists what is
// left out, in file order.
func (v *view) bind(c *measure.Case, computed map[string]stress.Span) ([]vote, []Unbound) {
	var votes []vote
	obs, out := v.counting(c)
	for _, i := range obs {
		vt, why := v.vote(i, c.Observations[i])
		if why != "" {
			out = append(out, Unbound{i, why})
			continue
		}
		votes = append(votes, vt)
	}
	votes = append(votes, v.standing(votes, computed)...)
	votes, replaced := v.dropReplaced(votes)
	out = append(out, replaced...)
	sort.SliceStable(out, func(i, j int) bool { return out[i].Observation < out[j].Observation })
	v.order(votes)
	weighGroups(votes)
	return votes, out
}

// voteKey is what one vote is counted by: test and part, or test and bank for a reading of a bank as a whole.
type voteKey struct {
	test  string
	where place
	at    int
}

// counting gives the observations that vote, one for each test and part or bank: one from before the rebuild before
// one from after it, lifted before in circuit, then the last. A reading of a bank in circuit stands beside lifted
// readings of its parts: they are readings of different things, each with its own chance of error.
func (v *view) counting(c *measure.Case) ([]int, []Unbound) {
	var out []Unbound
	var keys []voteKey
	best := map[voteKey]int{}
	current := counted(c)
	for i, ob := range c.Observations {
		if why := v.silentBecause(c, ob, current[i]); why != "" {
			out = append(out, Unbound{i, why})
			continue
		}
		key := voteKey{test: ob.Test}
		key.where, key.at = v.placeOf(v.test(ob.Test), ob)
		j, seen := best[key]
		switch {
		case !seen:
			keys = append(keys, key)
			best[key] = i
		case outranks(c, ob, c.Observations[j]):
			best[key] = i
			out = append(out, Unbound{j, outranked})
		default:
			out = append(out, Unbound{i, outranked})
		}
	}
	var obs []int
	for _, k := range keys {
		obs = append(obs, best[k])
	}
	return obs, out
}

const outranked = "another reading at the same place counts: lifted before in circuit, then the last"

// outranks tells whether an answer takes the vote of an earlier one at the same place.
func outranks(c *measure.Case, later, earlier measure.Observation) bool {
	if c.After(later) != c.After(earlier) {
		return c.After(earlier)
	}
	return later.State == "lifted" || earlier.State != "lifted"
}

// counted marks the observations that no later one replaces. The current ones are a sequence within all; matched
// from the end, an observation and its exact repetition cannot be mistaken, as only the last of them is current.
func counted(c *measure.Case) []bool {
	out, current := make([]bool, len(c.Observations)), c.Current()
	for i := len(out) - 1; i >= 0 && len(current) > 0; i-- {
		if last := len(current) - 1; c.Observations[i] == current[last] {
			out[i], current = true, current[:last]
		}
	}
	return out
}

// silentBecause says why an observation has no vote, "" if it has.
func (v *view) silentBecause(c *measure.Case, ob measure.Observation, current bool) string {
	t := v.test(ob.Test)
	switch {
	case !current:
		return "superseded by a later answer"
	case ob.Answer != "":
		return ob.Answer
	case t == nil && v.base.Test(ob.Test) == nil:
		return "this rule base has no such test"
	case t == nil:
		return "does not apply to this board"
	case t.UsedIn == "prior":
		return "already in the starting odds"
	case ob.Part != "" && v.parts.part(ob.Part) < 0 && v.parts.bank(ob.Position) < 0:
		return "the board as found has no part " + ob.Part
	case c.After(ob) && t.Needs == "dead":
		return "taken after the rebuild: serves the bring-up only"
	case atTerminals(t) && underLink(c.Safety.Links, ob.At):
		return "taken with the shorting link fitted, when everything reads shorted: measure again"
	}
	return ""
}

// underLink tells whether a shorting link was fitted at a time.
func underLink(links []measure.Link, at time.Time) bool {
	for _, l := range links {
		if !at.IsZero() && !at.Before(l.Fitted) && (l.Removed.IsZero() || at.Before(l.Removed)) {
			return true
		}
	}
	return false
}

// place is what a test looked at.
type place int

const (
	onBoard   place = iota // the board as a whole
	onBank                 // all parts of a position at once
	onPart                 // one part
	onPattern              // the set of faulty parts, by the name of its pattern
)

// atTerminals tells whether a test is read through leads: then everything that is in parallel is in the reading.
func atTerminals(t *knowledge.Test) bool {
	return t.Instrument == "meter" || t.Instrument == "insulation-tester" || t.Instrument == "supply"
}

// placeOf gives what an observation looks at: a meter on parts still in circuit reads the whole bank, and a bank of
// one is its part. On a board with one position a reading that names no place is of that position.
// A test that observes no event is of the whole board, wherever it was asked.
func (v *view) placeOf(t *knowledge.Test, ob measure.Observation) (place, int) {
	if t.Observes == "" {
		return onBoard, 0
	}
	b := v.parts.bank(ob.Position)
	if p := v.parts.part(ob.Part); p >= 0 {
		b = v.parts.bankOf[p]
		if !atTerminals(t) || ob.State == "lifted" || len(v.parts.banks[b].parts) == 1 {
			return onPart, p
		}
	}
	if b < 0 && len(v.parts.banks) == 1 {
		b = 0
	}
	switch {
	case b < 0:
		return onBoard, 0
	case len(v.parts.banks[b].parts) == 1:
		return onPart, v.parts.banks[b].parts[0]
	}
	return onBank, b
}

// placeCount is how many places of a kind the board has; 0 for the board as a whole.
func (v *view) placeCount(where place) int {
	switch where {
	case onPart:
		return len(v.parts.parts)
	case onBank:
		return len(v.parts.banks)
	}
	return 0
}

// dropReplaced leaves out a figure whose measured replacement, or a replacement of that, has been answered.
func (v *view) dropReplaced(votes []vote) ([]vote, []Unbound) {
	answered := map[string]bool{}
	for _, vt := range votes {
		answered[vt.finding.Test.ID] = true
	}
	var kept []vote
	var out []Unbound
	for _, vt := range votes {
		by := v.test(vt.finding.Test.ReplacedBy)
		for by != nil && !answered[by.ID] {
			by = v.test(by.ReplacedBy)
		}
		switch {
		case by == nil:
			kept = append(kept, vt)
		case vt.finding.Observation >= 0:
			out = append(out, Unbound{vt.finding.Observation, "replaced by " + by.ID})
		}
	}
	return kept, out
}

var stages = map[string]int{"question": 0, "dead": 1, "computed": 2, "control-power": 3, "low-bus": 4, "full": 5}

// order sorts votes by stage, then the base's order of tests, then the board's order of parts. A replacement takes
// over the place of what it replaces, stage included, so that a ranking reads on in the same order once measured.
func (v *view) order(votes []vote) {
	type key [3]int
	keys, at := make([]key, len(votes)), make([]int, len(votes))
	first := v.testPlaces()
	for i := range votes {
		f := &votes[i].finding
		place := first[f.Test.ID]
		if f.Observation < 0 {
			place[0] = stages["computed"]
		}
		keys[i], at[i] = key{place[0], place[1], v.firstPart(*f)}, i
	}
	sort.SliceStable(at, func(i, j int) bool {
		a, b := keys[at[i]], keys[at[j]]
		for k := range a {
			if a[k] != b[k] {
				return a[k] < b[k]
			}
		}
		return false
	})
	sorted := make([]vote, len(votes))
	for i, from := range at {
		sorted[i] = votes[from]
	}
	copy(votes, sorted)
}

// testPlaces gives the stage of each test and its place in the base.
func (v *view) testPlaces() map[string][2]int {
	out := map[string][2]int{}
	for i, t := range v.tests {
		stage := stages[t.Needs]
		if t.Computed != "" {
			stage = stages["computed"]
		}
		out[t.ID] = [2]int{stage, i}
	}
	for _, t := range v.tests {
		at := out[t.ID]
		for by := v.test(t.ReplacedBy); by != nil; by = v.test(by.ReplacedBy) {
			out[by.ID] = at
		}
	}
	return out
}

func (v *view) firstPart(f Finding) int {
	if p := v.parts.part(f.Part); p >= 0 {
		return p
	}
	if b := v.parts.bank(f.Position); b >= 0 {
		return v.parts.banks[b].parts[0]
	}
	return -1
}

// weighGroups gives the answers of a group that move together the exponent 1/(1+0.4(n−1)).
func weighGroups(votes []vote) {
	n := map[string]int{}
	for _, vt := range votes {
		n[vt.finding.Test.Group]++
	}
	for i := range votes {
		if g := votes[i].finding.Test.Group; g != "" {
			votes[i].power = 1 / (1 + 0.4*float64(n[g]-1))
		}
	}
}
