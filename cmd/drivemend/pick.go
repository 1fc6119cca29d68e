package main

import (
	"bytes"
	"fmt"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/reports"
)

// history are the questions that come before any reading, while memories are fresh.
var history = []string{"failure-moment", "what-changed", "dead-parts"}

// firstRanking is the number of answers from which a ranking is worth showing.
const firstRanking = 3

// pick gives the step that comes next, nil when nothing is left to ask: first make safe, then what the board is, then
// what happened, then whatever the next test is.
func (s *session) pick() (func() *step, error) {
	if jump := s.jump; jump != nil {
		s.jump = nil
		return jump, nil
	}
	for _, id := range append(s.opening(), s.wanted...) {
		if id != "" && !s.putOff[id] && s.open(id) {
			return s.stepNamed(id), nil
		}
	}
	if len(s.laters) > 0 {
		c := s.laters[0]
		s.laters = s.laters[1:]
		return s.testOrKey(c), nil
	}
	n, err := s.chain.next(s.clock())
	if err != nil {
		return nil, err
	}
	return s.pickWork(n), nil
}

// pickWork gives the next step at the board: first what is to be done under the power that was stated for, then the
// tests, then what the record asks for after the repair.
func (s *session) pickWork(n *diagnose.Suggestion) func() *step {
	if n.Stop == "" {
		if next := s.pickPowered(n); next != nil {
			return next
		}
	}
	if next := s.pickRecord(true); next != nil {
		return next
	}
	if next := s.pickTest(n); next != nil {
		return next
	}
	return s.pickRecord(false)
}

// opening lists the first five minutes and the steps before touching: what is still open of them, "" for what is
// settled. Making safe comes first on a fresh case; later it comes again before the step that needs it. The picture as
// found comes before the first dead check, which already moves leads and covers.
func (s *session) opening() []string {
	var ids []string
	fresh := len(s.file.Case.Observations) == 0
	if fresh || s.held() {
		ids = append(ids, s.openIsolation())
	}
	ids = append(ids, s.openBefore(true)...)
	for _, key := range []string{"supply", "bus.nominal", "bus.capacitance"} {
		ids = append(ids, s.openValue(key))
	}
	if fresh {
		ids = append(ids, s.openChecks()...)
	}
	ids = append(ids, s.openValue("topology"), s.openValue("switch.kind"), s.openParts())
	for _, test := range history {
		ids = append(ids, s.openTest(test))
	}
	return append(append(ids, s.openValue("history")), s.openBefore(false)...)
}

// openTest names the step of a history question while it has no answer.
func (s *session) openTest(id string) string {
	if s.base.Test(id) == nil {
		return ""
	}
	for _, o := range s.file.Case.Current() {
		if o.Test == id {
			return ""
		}
	}
	return "test " + id
}

// stepNamed gives the maker of a step by its id.
func (s *session) stepNamed(id string) func() *step {
	kind, name, _ := strings.Cut(id, " ")
	switch kind {
	case "isolation":
		return s.isolationStep
	case "stands":
		return s.standStep
	case "check":
		return func() *step { return s.checkStep(name) }
	case "link":
		return s.linkStep
	case "parts":
		return s.partsStep
	case "record":
		return func() *step { return s.recordStep(name) }
	case "test":
		t := s.base.Test(name)
		return func() *step { return s.testStep(diagnose.Candidate{Test: t, Minutes: t.Minutes, Allowed: true}) }
	}
	return func() *step { return s.valueStep(name) }
}

// pickTest gives the most valuable test of a dead board, or question, that is not put off. Where only a hold point
// stands before it that can be settled now, that comes first.
func (s *session) pickTest(n *diagnose.Suggestion) func() *step {
	if n.Stop != "" {
		return nil
	}
	var spare *diagnose.Candidate // the most telling allowed test, for when only a pair of tests pays
	worth := false
	for i := range n.Tests {
		c := n.Tests[i]
		w := diagnose.WorkOf(c.Test)
		ready := c.Allowed && !s.heldBack(w)
		switch {
		case s.putOff[testID(c)] || w.Need.Powered():
			continue
		case c.Value <= 0 && !c.Must:
			if ready && (spare == nil || c.Bits > spare.Bits) {
				spare = &c
			}
			continue
		}
		worth = true
		if ready {
			return s.testOrKey(c)
		}
		if next := s.toward(w); next != nil {
			s.sayToward(c)
			return next
		}
	}
	if spare != nil && !worth && len(n.Allowed()) == 0 {
		return s.testOrKey(*spare)
	}
	return nil
}

// sayToward says once for which test the board is made ready.
func (s *session) sayToward(c diagnose.Candidate) {
	if s.told["unlocking "+testID(c)] {
		return
	}
	s.told["unlocking "+testID(c)] = true
	needs := " It needs a board that is proved dead."
	if s.status().Dead && !s.held() {
		needs = ""
	}
	s.say("The test worth most now is: " + c.Test.Title + "." + needs)
}

// unlocking names the step that would bring the board back to proved dead, "" when it is put off. An isolation that
// was put off, or said and not complete, is offered once more.
func (s *session) unlocking() string {
	first := s.openIsolation()
	if s.putOff[first] && !s.told["again "+first] {
		s.told["again "+first] = true
		delete(s.putOff, first)
	}
	if first != "" && s.putOff[first] {
		return ""
	}
	for _, id := range append([]string{first, s.openLink()}, s.openChecks()...) {
		if id != "" && !s.putOff[id] {
			return id
		}
	}
	return ""
}

// show tells where the case stands after an answer: the ranking in full once there are three answers, then in a line.
func (s *session) show() error {
	if s.given() < firstRanking || s.told["ranking"] {
		return nil
	}
	s.told["ranking"] = true
	fmt.Fprintln(s.out)
	return reports.Ranking(s.out, s.file.Case, s.ranked, s.style(), reports.Beside{Outside: s.chain.outside()})
}

// given counts the answers that say something.
func (s *session) given() int {
	n := 0
	for _, o := range s.file.Case.Current() {
		if o.Answer == "" {
			n++
		}
	}
	return n
}

// standing is the line above a question: the safety state, and what leads in each layer.
func (s *session) standing() string {
	st := s.status()
	state := "NOT proved dead"
	if st.Dead {
		state = "proved dead"
		if p := soonest(st); p != nil {
			state = fmt.Sprintf("proved dead until %s", p.ExpiresAt.Format("15:04"))
		}
	}
	line := fmt.Sprintf("%s | %s | %s", s.file.Case.ID, counted(s.given(), "answer"), state)
	if s.given() < firstRanking {
		return line
	}
	for _, layer := range [][]diagnose.Line{s.ranked.Faults, s.ranked.Stresses, s.ranked.Causes} {
		if len(layer) > 0 {
			line += " | " + layer[0].ID + " " + percent(layer[0].Probability)
		}
	}
	return line
}

// percent prints a probability; it is never shown as certain.
func percent(p float64) string {
	switch {
	case p > 0.99:
		return ">99 %"
	case p < 0.01:
		return "<1 %"
	}
	return fmt.Sprintf("%.0f %%", 100*p)
}

// soonest is the dead check that ends first.
func soonest(st safety.Status) *safety.PointStatus {
	var first *safety.PointStatus
	for i := range st.Points {
		if p := &st.Points[i]; first == nil || p.ExpiresAt.Before(first.ExpiresAt) {
			first = p
		}
	}
	return first
}

func (s *session) status() safety.Status {
	return safety.StatusOf(s.file.Case, s.clock(), s.chain.evidence())
}

// rankingAside shows the ranking from within a question.
func (s *session) rankingAside() ask.Aside {
	return ask.Aside{Word: "ranking", Means: "the ranking so far", Show: func() string {
		var page bytes.Buffer
		if err := reports.Ranking(&page, s.file.Case, s.ranked, reports.Style{Width: s.width}, reports.Beside{Outside: s.chain.outside()}); err != nil {
			return err.Error()
		}
		return page.String()
	}}
}

// text is an aside of plain words.
func (s *session) text(word, means, body string) ask.Aside {
	return ask.Aside{Word: word, Means: means, Show: func() string {
		var out []string
		for _, line := range strings.Split(body, "\n") {
			out = append(out, ask.Wrapped(line, "  ", "  ", s.columns())...)
		}
		return strings.Join(out, "\n")
	}}
}
