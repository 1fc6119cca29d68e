package safety

import (
	"fmt"
	"slices"
	"strings"
	"time"

	"drivemend/measure"
)

// scene is everything that the conditions of a hold point look at.
type scene struct {
	history
	work     Work
	status   Status
	evidence Evidence
	steps    []measure.StepEntry
	done     time.Time // of the rebuild; zero while it is not stated
	reform   bool      // nothing else is missing: how the bank is re-formed may be told
}

func sceneOf(c *measure.Case, w Work, now time.Time, e Evidence) scene {
	s := scene{history: historyOf(c, now, e.Powered), work: w, evidence: e, steps: c.Steps}
	s.status = s.history.status()
	if c.Rebuild != nil {
		s.done = c.Rebuild.Done
	}
	return s
}

// condition is one thing that has to hold before a work: it says what is missing of it, nothing when it holds.
type condition func(s scene) []Missing

// The conditions.
var (
	isolated    condition = func(s scene) []Missing { return s.status.Isolation.Missing } // hold point 0
	everyStore  condition = openStores                                                    // 1, and 2 where a check has ended
	noLink      condition = openLink                                                      // 2
	rebuilt     condition = openRebuild                                                   // 3
	everyStatic condition = openStatics                                                   // 3
	noneFails   condition = openFailing                                                   // 3
	poweredUp   condition = func(s scene) []Missing { return s.openBefore(string(s.work.Need)) }
	reconnected condition = openReconnection // 3
)

var poweredConditions = []condition{noLink, rebuilt, everyStatic, noneFails, poweredUp, reconnected}

// needConditions are the conditions of a state of the board. A need that is not in the table is never given.
var needConditions = map[Need][]condition{
	NeedQuestion:     {},
	NeedDeadCheck:    {isolated},
	NeedDischarge:    {isolated},
	NeedDead:         {isolated, noLink, everyStore},
	NeedControlPower: poweredConditions,
	NeedLowBus:       poweredConditions,
	NeedFull:         poweredConditions,
}

// toolRule is what a tool asks for beside the state of the board, and the states it may be used in at all.
type toolRule struct {
	needs   []Need
	stated  []string // before which steps its conditions are stated; clauses.go says what each takes
	carries []string // what its instruction always says
}

// toolRules are the tools with conditions of their own. A tool that is not in the table is never given.
var toolRules = map[Tool]toolRule{
	NoTool: {needs: Needs()},
	ToolScope: {[]Need{NeedDead, NeedControlPower, NeedLowBus, NeedFull}, []string{measure.BeforeScope},
		[]string{"The earth clip of a passive probe is bonded to protective earth: on a live node it is a short to earth through the scope."}},
	ToolInjection: {[]Need{NeedDead, NeedControlPower, NeedLowBus}, []string{measure.BeforeInjection},
		[]string{"Set the limit of current and voltage before connecting, stay with it, stop at 40 K rise."}},
	ToolInsulation: {[]Need{NeedDead}, []string{measure.BeforeInsulation},
		[]string{"The tester charges what it tests: discharge it afterwards, prove it dead, and keep hands off while it runs."}},
	ToolDoublePulse: {[]Need{NeedLowBus, NeedFull}, []string{measure.BeforeDoublePulse, measure.BeforeScope},
		[]string{"Stay behind the shield until the bus is proved dead: a switch that fails takes the energy of the bank."}},
}

// Statements names the steps that conditions are stated before for a work (measure.BeforeWords): that of its power, then
// those of its tool.
func Statements(w Work) []string {
	var steps []string
	if w.Need.Powered() && needConditions[w.Need] != nil {
		steps = append(steps, string(w.Need))
	}
	return append(steps, toolRules[w.Tool].stated...)
}

// StandsOn gives the statements that a work stands on at a moment, the one that counts of each of its steps; a step
// without one is left out.
func StandsOn(c *measure.Case, w Work, now time.Time) []measure.Before {
	if c == nil {
		return nil
	}
	s := sceneOf(c, w, now, Evidence{})
	var out []measure.Before
	for _, step := range Statements(w) {
		if b, _ := s.statementOf(step); b != nil {
			out = append(out, *b)
		}
	}
	return out
}

// Carries gives what the instruction for a work always says, allowed or not.
func Carries(w Work) []string {
	out := slices.Clone(toolRules[w.Tool].carries)
	if w.Need.Powered() && needConditions[w.Need] != nil {
		out = append(out, "Power ends every dead check: afterwards isolate again, and prove every store dead before any ohm, diode or capacitance reading.")
	}
	return out
}

// missing says what stands between the technician and the work, the conditions of the board's state first.
func (s scene) missing() []Missing {
	conditions, known := needConditions[s.work.Need]
	if !known {
		return []Missing{{0, fmt.Sprintf("no step can need %q", string(s.work.Need)), "use one of " + joined(Needs())}}
	}
	rule, known := toolRules[s.work.Tool]
	if !known {
		return []Missing{{0, fmt.Sprintf("no step can use the tool %q", string(s.work.Tool)), "use one of " + joined(Tools()) + ", or none"}}
	}
	if !slices.Contains(rule.needs, s.work.Need) {
		return []Missing{{0, fmt.Sprintf("the tool %s has no place in a step that needs %s", s.work.Tool, s.work.Need), "it is used in " + joined(rule.needs)}}
	}
	all := slices.Clone(conditions)
	for _, step := range rule.stated {
		all = append(all, func(s scene) []Missing { return s.openBefore(step) })
	}
	m := s.open(all)
	if len(m) == 1 && s.bankAlone() {
		s.reform = true
		m = s.open(all)
	}
	return m
}

func (s scene) open(conditions []condition) []Missing {
	var m []Missing
	for _, c := range conditions {
		m = append(m, c(s)...)
	}
	return m
}

// bankAlone tells whether the statement before a powered step lacks the bank and nothing else.
func (s scene) bankAlone() bool {
	if !s.work.Need.Powered() {
		return false
	}
	b, lacks := s.statementOf(string(s.work.Need))
	return lacks && len(s.faults(*b)) == 1 && hasBank(s) && !bankHolds(s, *b)
}

func joined[T ~string](list []T) string {
	var words []string
	for _, w := range list {
		words = append(words, string(w))
	}
	return strings.Join(words, ", ")
}

// openStores says which stores are not proved dead. While a link is fitted it is silent: a check through the link says
// nothing, and the link comes off first.
func openStores(s scene) []Missing {
	if s.status.Link.Fitted {
		return nil
	}
	var m []Missing
	for _, p := range s.status.Points {
		m = append(m, p.Missing...)
	}
	return m
}

func openLink(s scene) []Missing {
	if !s.status.Link.Fitted {
		return nil
	}
	return []Missing{linkMissing(s.status)}
}
