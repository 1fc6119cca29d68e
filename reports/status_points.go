package reports

import (
	"fmt"
	"strconv"
	"strings"

	"drivemend/diagnose/safety"
	"drivemend/measure/quantity"
)

// holdTitles are the hold points in a few words, by number.
var holdTitles = [...]string{"cut off", "stores proved", "fresh, no link", "under power", "scope, current", "stored energy", "taken outside"}

var holdColumns = []column{{width: 2, right: true}, {width: 14}, {width: 5}, {}}

// writeHoldPoints says of each hold point whether it is kept, and of one that is not what is missing first.
func writeHoldPoints(s *screen, p StatusPage) {
	s.head("HOLD POINTS", "")
	for n, title := range holdTitles {
		state, text := p.holdPoint(n)
		s.add(holdColumns, []entry{{Text: strconv.Itoa(n)}, {Text: title}, state, {Text: text}})
	}
}

func (p StatusPage) holdPoint(n int) (state entry, text string) {
	switch n {
	case 5:
		return entry{Text: "-"}, storesWords(p.Safety)
	case 6:
		if len(p.Outside)+len(p.OutsideSteps) > 0 {
			return entry{"NOTE", caution}, outsideCount(len(p.Outside), len(p.OutsideSteps)) + " kept, and marked in the report"
		}
		return entry{"kept", normal}, "no reading and no step on record"
	}
	missing := p.missingAt(n)
	if len(missing) == 0 {
		if text = p.keptWords(n); text == "" {
			return entry{Text: "-"}, "not asked"
		}
		return entry{"kept", normal}, text
	}
	text = clause(missing[0].Text)
	if more := len(missing) - 1; more > 0 {
		text += fmt.Sprintf(" (+%d)", more)
	}
	if free, all := p.freeOf(n); free > 0 {
		text = fmt.Sprintf("kept for %d of %d kinds of work; ", free, all) + text
	}
	return entry{"OPEN", danger}, text
}

// outsideCount counts readings and steps: "1 reading and 2 steps are".
func outsideCount(readings, steps int) string {
	var parts []string
	for _, x := range []struct {
		n         int
		one, many string
	}{{readings, "reading", "readings"}, {steps, "step", "steps"}} {
		if x.n > 0 {
			parts = append(parts, count(x.n, x.one, x.many))
		}
	}
	verb := " are"
	if readings+steps == 1 {
		verb = " is"
	}
	return strings.Join(parts, " and ") + verb
}

// clause is what a text says before it goes into the details: up to its colon, semicolon or bracket, if that stands
// behind more than a few words.
func clause(text string) string {
	for i := range text {
		if columns(text[:i]) < leastClause {
			continue
		}
		for _, mark := range []string{": ", "; ", " ("} {
			if strings.HasPrefix(text[i:], mark) {
				return text[:i]
			}
		}
	}
	return text
}

// leastClause is how many columns a clause takes at least, so that a place in front ("at bus: …") is not all of it.
const leastClause = 24

// missingAt gathers what is missing at one hold point, each thing once; under power first what the powered steps lack.
func (p StatusPage) missingAt(n int) []safety.Missing {
	var out []safety.Missing
	named := map[string]bool{}
	add := func(missing []safety.Missing) {
		for _, m := range missing {
			if m.Point == n && !named[m.Text] {
				named[m.Text] = true
				out = append(out, m)
			}
		}
	}
	add(p.Safety.Isolation.Missing)
	for _, x := range p.Safety.Points {
		add(x.Missing)
	}
	for _, powered := range []bool{true, false} {
		for _, w := range p.Works {
			if w.Decision.Need.Powered() == powered {
				add(w.Decision.Missing)
			}
		}
	}
	if n == 2 && p.Safety.Link.Fitted && len(out) == 0 {
		out = []safety.Missing{{Point: 2, Text: "a shorting link is fitted"}}
	}
	return out
}

// freeOf counts the kinds of work under hold points 3 and 4, and those of them that lack nothing there.
func (p StatusPage) freeOf(n int) (free, all int) {
	for _, w := range p.Works {
		d := w.Decision
		under3 := d.Need.Powered() || d.Tool == safety.ToolInsulation
		under4 := d.Tool == safety.ToolScope || d.Tool == safety.ToolInjection
		if n == 3 && !under3 || n == 4 && !under4 || n < 3 {
			continue
		}
		all++
		if !lacksAt(d.Missing, n) {
			free++
		}
	}
	return free, all
}

func lacksAt(missing []safety.Missing, n int) bool {
	for _, m := range missing {
		if m.Point == n {
			return true
		}
	}
	return false
}

// keptWords says on what a hold point rests that is kept; "" where nothing on this page bears on it.
func (p StatusPage) keptWords(n int) string {
	switch n {
	case 0:
		if i := p.Safety.Isolation; i.Isolated {
			return "stated " + ago(i.Age) + ": speaks for " + hoursWords(safety.IsolationLife) + ", and for its own day"
		}
	case 1:
		if len(p.Safety.Points) > 0 {
			return "the last reading of each store is " + volts(safety.DeadVolts) + " or less"
		}
	case 2:
		if left, known := leastLeft(p.Safety); known {
			return p.noLink() + "; the first check lapses in " + left
		}
	case 3, 4:
		if _, all := p.freeOf(n); all > 0 {
			return "the conditions are stated, and they hold"
		}
	}
	return ""
}

func (p StatusPage) noLink() string {
	if at := p.Safety.Link.Removed; !at.IsZero() {
		return "no link since " + clockAt(at, p.At)
	}
	return "no link"
}

// storesWords names the store that can hold most, with its figures.
func storesWords(st safety.Status) string {
	var most *safety.Store
	for i := range st.Points {
		if x := &st.Points[i].Store; most == nil || x.EnergyJ > most.EnergyJ {
			most = x
		}
	}
	if most == nil {
		return "not worked out: treat the board as live"
	}
	text := "most: " + most.Point + ", up to " + volts(most.Voltage.Value)
	if most.EnergyJ > 0 {
		text += ", " + quantity.Format(most.EnergyJ, quantity.Joule)
	}
	if !most.Known() {
		text += " (assumed)"
	}
	return text
}

func moreWords(n int) string {
	if n <= 0 {
		return ""
	}
	return fmt.Sprintf(" (+%d more)", n)
}

// workGroup is kinds of work that wait for the same thing first.
type workGroup struct {
	titles  []string
	first   safety.Missing
	most    int  // things missing for the one that lacks most
	powered bool // one of them puts energy into the board
}

// shownHeld is how many kinds of work that wait for the same thing are named.
const shownHeld = 2

// writeWorks says what may be done now, and of the rest what is missing first; kinds of work that wait for the same
// thing share a line. Of what stands in the way of the job it says what to do. Asking is always allowed, and only named
// alone.
func writeWorks(s *screen, works []WorkLine, rebuilding bool) {
	var allowed []string
	for _, w := range works {
		if w.Decision.Allowed && w.Decision.Need != safety.NeedQuestion {
			allowed = append(allowed, w.Title)
		}
	}
	if len(works) > 0 && len(allowed) == 0 {
		allowed = []string{"asking and looking only"}
	}
	if len(allowed) > 0 {
		s.hang(normal, "MAY DO  ", strings.Join(allowed, "; "))
	}
	groups := heldWorks(works)
	next := inTheWay(groups, rebuilding)
	for i, g := range groups {
		s.hang(caution, "NOT YET ", fmt.Sprintf("%s: point %d, %s", someOf(g.titles, shownHeld, "; "), g.first.Point, clause(g.first.Text))+moreWords(g.most-1))
		if i == next && g.first.Unlock != "" {
			writeInTheWay(s, lackOf(g.first.Text, g.first.Unlock))
		}
	}
}

// writeInTheWay says what is missing for the work that keeps the job from going on, and what to do.
func writeInTheWay(s *screen, l lack) {
	for _, c := range l.conditions {
		s.hang(caution, "        - ", c.what)
		if c.do != "" {
			s.hang(mandatory, "          → ", c.do)
		}
	}
	mark := "do this "
	for _, do := range l.do {
		s.hang(mandatory, mark, do)
		mark = strings.Repeat(" ", len(mark))
	}
}

// inTheWay gives the group that keeps the job from going on: what the dead board lacks, and once a rebuild is stated
// what power lacks; -1 for none.
func inTheWay(groups []workGroup, rebuilding bool) int {
	for i, g := range groups {
		if g.first.Point <= 2 || rebuilding && g.powered {
			return i
		}
	}
	return -1
}

func heldWorks(works []WorkLine) []workGroup {
	var groups []workGroup
	at := map[string]int{}
	for _, w := range works {
		missing := w.Decision.Missing
		if w.Decision.Allowed {
			continue
		}
		if len(missing) == 0 {
			missing = []safety.Missing{{Text: "the hold points say no, and not why"}}
		}
		k, known := at[missing[0].Text]
		if !known {
			k = len(groups)
			at[missing[0].Text] = k
			groups = append(groups, workGroup{first: missing[0]})
		}
		groups[k].titles = append(groups[k].titles, w.Title)
		groups[k].most = max(groups[k].most, len(missing))
		groups[k].powered = groups[k].powered || w.Decision.Need.Powered()
	}
	return groups
}
