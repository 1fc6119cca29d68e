package reports

import (
	"fmt"
	"io"
	"strconv"
	"strings"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure/quantity"
)

const (
	shownOthers  = 5 // tests listed after the one to do now
	shownReasons = 5 // things a locked group waits for; they are cleared in this order
)

// Next prints the test to do now with what its results mean, the ones after it, and what is locked with what unlocks
// it. The board's joules stand beside the cautions; plan may be nil, and then they are missing. A repair is named only
// while nothing is withheld or put off and the board is granted dead.
func Next(w io.Writer, base *knowledge.Base, n *diagnose.Suggestion, plan *safety.Plan, style Style, beside ...Beside) error {
	s, known := newScreen(style), besides(beside)
	allowed := n.Allowed()
	switch {
	case len(allowed) > 0:
		writeTest(s, base, allowed[0], plan, known, n.At)
		writeOthers(s, allowed[1:])
	case n.Stop != "":
		s.hang(strong, "STOP  ", n.Stop)
	case n.Locked != nil:
		s.hang(danger, "WITHHELD  ", "the test worth most is locked, and no allowed one is worth its minutes")
	default:
		s.hang(strong, "STOP  ", "no test is left that saves more minutes than it costs")
	}
	writeMayBeDone(s, n, plan, known)
	writeRepairs(s, base, n, known)
	writeLocked(s, n)
	s.say(neutral, "At "+moment(n.At)+".")
	return s.write(w)
}

func writeTest(s *screen, base *knowledge.Base, c diagnose.Candidate, plan *safety.Plan, known Beside, at time.Time) {
	t := c.Test
	s.ends(mandatory, "NEXT", t.Title, worth(c))
	s.item(strong, "where", placeOf(c))
	s.item(strong, "ask", t.Ask)
	s.item(strong, "how", t.How)
	if t.Instrument != "" && t.Instrument != "none" && t.Instrument != "question" {
		s.item(strong, "with", t.Instrument)
	}
	for i, r := range t.Results {
		label := ""
		if i == 0 {
			label = "means"
		}
		s.item(strong, label, resultWords(r, t.Unit))
	}
	writeConditions(s, known, diagnose.WorkOf(t), at, plan)
	for _, text := range cautionTexts(base, t.Cautions) {
		s.item(caution, "caution", text)
	}
	if c.Again != "" {
		s.item(caution, "again", c.Again)
	}
	s.item(strong, "why", whyNow(c))
	writeEnter(s, c)
}

// worth is the minutes of a test and what it saves: "6 min, saves about 40".
func worth(c diagnose.Candidate) string {
	text := mins(c.Minutes)
	switch {
	case c.Value >= 0.5:
		return text + ", saves about " + mins(c.Value)
	case c.Test.Must:
		return text + ", must be done"
	}
	return text
}

func whyNow(c diagnose.Candidate) string {
	const rebuilt, silent = "the board is rebuilt: ", "; it tells nothing more about the cause"
	switch {
	case c.Serves && c.Static:
		return rebuilt + "this has to be read anew, and right, before power goes on" + silent
	case c.Serves && c.Again != "":
		return rebuilt + "this was read since, and no power goes on until it reads right" + silent
	case c.Serves:
		return rebuilt + "this check was never done; power does not wait for it, but goes on no more once it reads wrong" + silent
	}
	text := fmt.Sprintf("tells %.2f bit about the cause", c.Bits)
	if c.Value > 0 {
		text = "on average it saves " + mins(c.Value) + " of wrong repairs and comebacks beyond its own " + mins(c.Minutes) + "; it " + text
	}
	switch {
	case c.Test.Must && c.Test.Needs == "question":
		text += "; history is asked first, while memories are fresh"
	case c.Test.Must:
		text += "; this check has to be done before a rebuild is called good"
	}
	return text
}

func placeOf(c diagnose.Candidate) string {
	switch {
	case c.Part != "" && c.Lifted:
		return c.Part + ", a lead lifted"
	case c.Part != "":
		return c.Part
	case c.Position != "":
		return c.Position + ", all its parts together, in circuit"
	}
	return "the board"
}

// resultWords is a result with its reading and meaning: "shorted (about 0.5 Ω, within a factor of 3): …".
func resultWords(r knowledge.Result, unit quantity.Unit) string {
	text := r.ID
	if r.Times > 1 {
		middle := "what " + strings.TrimPrefix(r.Expected, "expected.") + " gives for this board"
		if r.Expected == "" {
			middle = quantity.Format(r.Median, unit)
		}
		text += " (about " + middle + ", most within a factor of " + strconv.FormatFloat(r.Times, 'g', 3, 64) + ")"
	}
	if r.Means != "" {
		text += ": " + r.Means
	}
	return text
}

func cautionTexts(base *knowledge.Base, ids []string) []string {
	var out []string
	for _, id := range ids {
		if c := base.Caution(id); c != nil {
			out = append(out, c.Text)
		} else {
			out = append(out, id+" (not in this rule base)")
		}
	}
	return out
}

var otherColumns = []column{{width: 2}, {}, {width: 16}, {width: 7, right: true}, {width: 10, right: true}}

func writeOthers(s *screen, others []diagnose.Candidate) {
	if len(others) == 0 {
		return
	}
	s.head("THEN", "")
	s.grid(otherColumns, otherRows(others, shownOthers))
	if more := len(others) - shownOthers; more > 0 {
		s.line(neutral, fmt.Sprintf("   and %d more", more))
	}
}

func otherRows(others []diagnose.Candidate, most int) [][]entry {
	var rows [][]entry
	for i, c := range others {
		if i == most {
			break
		}
		value := "must do"
		if c.Value >= 0.5 {
			value = "saves " + strconv.FormatFloat(c.Value, 'f', 0, 64)
		}
		rows = append(rows, []entry{{}, {Text: c.Test.Title}, {Text: fit(plain(placeShort(c)), 16)}, {Text: mins(c.Minutes)}, {Text: value}})
	}
	return rows
}

func placeShort(c diagnose.Candidate) string {
	if c.Part != "" && c.Lifted {
		return c.Part + " lifted"
	}
	return place(c.Part, c.Position)
}

func writeRepairs(s *screen, base *knowledge.Base, n *diagnose.Suggestion, known Beside) {
	if len(n.Repair) == 0 {
		return
	}
	if before := repairHeld(n, known); before != "" {
		s.hang(caution, "repair: ", before)
		return
	}
	for _, id := range n.Repair {
		text := id
		if r := base.Repair(id); r != nil {
			text = r.Title + ", " + mins(r.Minutes)
		}
		s.hang(strong, "REPAIR  ", text+": "+known.stateOfKnowledge())
	}
}

// writeLocked lists the most valuable locked tests once for each thing that locks them.
func writeLocked(s *screen, n *diagnose.Suggestion) {
	groups := lockedGroups(n)
	if len(groups) == 0 {
		return
	}
	s.head("LOCKED", "")
	quiet, powered := 0, 0
	for _, g := range groups {
		if !g.worthIt() {
			on := g.powered()
			quiet, powered = quiet+len(g.tests)-on, powered+on
			continue
		}
		s.hang(caution, "   ", g.titles())
		for _, c := range g.tests {
			if c.Again != "" {
				s.item(caution, "again", c.Test.Title+": "+c.Again)
			}
		}
		for i, why := range g.why {
			if i == shownReasons {
				s.item(neutral, "", "and "+count(len(g.why)-i, "thing more", "things more")+" (drivemend next --json lists all)")
				break
			}
			unlock := ""
			if i < len(g.unlock) {
				unlock = g.unlock[i]
			}
			writeLack(s, "because", lackOf(why, unlock))
		}
	}
	if quiet > 0 {
		s.hang(neutral, "   ", count(quiet, "other test is", "other tests are")+" locked; none is worth its minutes now.")
	}
	if powered > 0 {
		s.hang(neutral, "   ", count(powered, "powered test stays", "powered tests stay")+" locked until hold points 3 and 4 are kept (drivemend status says what is missing); none is worth its minutes by itself now.")
	}
}

// lockedGroup is locked tests that wait for the same things.
type lockedGroup struct {
	tests       []diagnose.Candidate
	why, unlock []string
}

func (g lockedGroup) worthIt() bool {
	for _, c := range g.tests {
		if c.Value > 0 || c.Test.Must {
			return true
		}
	}
	return false
}

// powered counts the tests that put energy into the board.
func (g lockedGroup) powered() int {
	n := 0
	for _, c := range g.tests {
		if safety.Need(c.Test.Needs).Powered() {
			n++
		}
	}
	return n
}

func (g lockedGroup) titles() string {
	var out []string
	for i, c := range g.tests {
		if i == 3 {
			out = append(out, fmt.Sprintf("and %d more", len(g.tests)-3))
			break
		}
		text := c.Test.Title
		if p := placeShort(c); p != "board" {
			text += ", " + p
		}
		if c.Value >= 0.5 {
			text += " (saves about " + mins(c.Value) + ")"
		}
		out = append(out, text)
	}
	return strings.Join(out, "; ")
}

func lockedGroups(n *diagnose.Suggestion) []lockedGroup {
	var groups []lockedGroup
	at := map[string]int{}
	for _, c := range n.Tests {
		if c.Allowed {
			continue
		}
		key := strings.Join(c.BlockedBy, "\x00")
		k, ok := at[key]
		if !ok {
			k = len(groups)
			at[key] = k
			groups = append(groups, lockedGroup{why: c.BlockedBy, unlock: c.UnlockedBy})
		}
		groups[k].tests = append(groups[k].tests, c)
	}
	return groups
}
