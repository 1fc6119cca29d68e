package main

import (
	"fmt"
	"path/filepath"
	"slices"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/stress"
	"drivemend/measure/quantity"
	"drivemend/reports"
)

// finish shows where the case stands when nothing is left to ask, and offers what can be done. It gives the step to go
// on with, nil to end.
func (s *session) finish() (func() *step, error) {
	if err := s.conclude(); err != nil {
		return nil, err
	}
	for {
		answer, err := s.put(s.closing())
		if err == nil && answer.Kind == ask.Moved {
			return s.again, nil
		}
		if err != nil || answer.Kind != ask.Given {
			return nil, err
		}
		switch answer.Text {
		case "report":
			if err := s.offerReport(); err != nil {
				return nil, err
			}
		case "margin":
			if err := reports.Margin(s.out, s.margin, s.style()); err != nil {
				return nil, err
			}
		case "safe":
			s.resume("isolation", "stands", "link", "check ")
			return s.stepNamed(s.unlocking()), nil
		case "values":
			s.resume("value ")
			if s.wanted = s.wantedValues(); len(s.wanted) > 0 {
				return s.stepNamed(s.wanted[0]), nil
			}
		case "later":
			s.laters = s.putOffTests()
			return s.pick()
		case "rebuilt":
			return s.rebuiltStep, nil
		case "power":
			return s.choosePower()
		case "steps":
			if next, err := s.chooseRecord(); next != nil || err != nil {
				return next, err
			}
		default:
			return nil, nil
		}
	}
}

// again is a step that does nothing: what comes next is chosen anew.
func (s *session) again() *step { return nil }

// conclude says in a few lines where the case stands: what leads, what comes next, what is locked by what, and the
// commands that show more.
func (s *session) conclude() error {
	n, err := s.chain.next(s.clock())
	if err != nil {
		return err
	}
	err = s.slowly("the margin", func() error {
		var err error
		s.margin, err = s.chain.margin()
		return err
	})
	if err != nil {
		return err
	}
	s.left = 0
	s.say("")
	for _, layer := range []struct {
		word  string
		lines []diagnose.Line
	}{{"FAULT", s.ranked.Faults}, {"STRESS", s.ranked.Stresses}, {"CAUSE", s.ranked.Causes}} {
		if len(layer.lines) > 0 && s.given() >= firstRanking {
			s.say(fmt.Sprintf("%-7s %s, %s", layer.word, layer.lines[0].Title, percent(layer.lines[0].Probability)))
		}
	}
	s.sayNext(n)
	s.sayLocked(n)
	s.sayPowered(n)
	s.sayRecord()
	s.say(marginLine(s.margin, needed(s.wantedValues())))
	s.say("MORE    drivemend rank, next, margin or status " + quoted(s.file.Path))
	return nil
}

// sayNext says which test is worth most of those that can be done now.
func (s *session) sayNext(n *diagnose.Suggestion) {
	for _, c := range n.Tests {
		if c.Allowed && (c.Value > 0 || c.Must) && n.Stop == "" && !(diagnose.WorkOf(c.Test).Need.Powered() && s.heldBack(diagnose.WorkOf(c.Test))) {
			s.left++
			if s.left == 1 {
				s.say(fmt.Sprintf("NEXT    %s, %.0f min", strings.TrimSuffix(c.Test.Title+": "+s.placeOf(c), ": "), c.Minutes))
			}
		}
	}
	switch {
	case n.Stop != "":
		s.say("STOP    " + n.Stop)
	case s.left == 0:
		s.say("NEXT    nothing that can be done at this moment is worth its minutes")
	}
}

// mostLocks bounds the reasons that are listed at the end.
const mostLocks = 2

// sayLocked says how many tests wait for what.
func (s *session) sayLocked(n *diagnose.Suggestion) {
	var reasons, unlock []string
	tests := map[string]int{}
	for _, c := range n.Tests {
		if c.Allowed || c.Value <= 0 && !c.Must || len(c.BlockedBy) == 0 || diagnose.WorkOf(c.Test).Need.Powered() {
			continue
		}
		s.left++
		why := c.BlockedBy[0]
		if tests[why]++; tests[why] == 1 {
			reasons = append(reasons, why)
			unlock = append(unlock, strings.Join(c.UnlockedBy[:min(1, len(c.UnlockedBy))], ""))
		}
	}
	for i, why := range reasons[:min(mostLocks, len(reasons))] {
		s.say("LOCKED  " + counted(tests[why], "test") + ": " + why)
		if unlock[i] != "" {
			s.say("        " + unlock[i])
		}
	}
}

// marginLine is the margin in a line, or what it waits for.
func marginLine(m *stress.Margin, needs []string) string {
	text := "MARGIN  "
	switch {
	case m.AsFound == nil && len(needs) == 0:
		return text + "not computable for this board"
	case m.AsFound == nil:
		return text + "not computable yet; it needs " + strings.Join(needs, ", ")
	}
	text += fmt.Sprintf("99.9 %% peak %s as found (%s)", quantity.Format(m.AsFound.P999.Peak, quantity.Volt), m.AsFound.Verdict)
	if m.Rebuild != nil {
		text += fmt.Sprintf(", %s rebuilt (%s)", quantity.Format(m.Rebuild.P999.Peak, quantity.Volt), m.Rebuild.Verdict)
	}
	return text + ", rated " + quantity.Format(m.Rated, quantity.Volt)
}

func needed(steps []string) []string {
	var keys []string
	for _, id := range steps {
		keys = append(keys, strings.TrimPrefix(id, "value "))
	}
	return keys
}

// closing is the question at the end: what there is to do beside stopping.
func (s *session) closing() ask.Question {
	title := "WHERE IT STANDS"
	if s.left == 0 {
		title = "NOTHING LEFT TO ASK NOW"
	}
	q := ask.Question{Title: title, Ask: "What now?", NoBack: true, NoSkip: true,
		Choices: []ask.Choice{{Word: "report", Means: "write the fault report"}}}
	if s.margin != nil && s.margin.AsFound != nil {
		q.Choices = append(q.Choices, ask.Choice{Word: "margin", Means: "show the figures of the edge in full"})
	}
	if !s.status().Dead || s.held() {
		q.Choices = append(q.Choices, ask.Choice{Word: "safe", Means: "make safe and prove dead, which unlocks the meter steps"})
	}
	if n := len(s.wantedValues()); n > 0 {
		q.Choices = append(q.Choices, ask.Choice{Word: "values", Means: "enter " + counted(n, "board value") + " for the edge and the margin"})
	}
	if n := len(s.putOffTests()); n > 0 {
		q.Choices = append(q.Choices, ask.Choice{Word: "later", Means: fmt.Sprintf("ask the %d tests that were put off", n)})
	}
	if n := len(s.openRecords("")); n > 0 {
		q.Choices = append(q.Choices, ask.Choice{Word: "steps", Means: fmt.Sprintf("take up one of %d open steps of the record", n)})
	}
	if s.isRebuilt() {
		q.Choices = append(q.Choices, ask.Choice{Word: "power", Means: "state the conditions for power, then do what waits for it"})
	} else {
		q.Choices = append(q.Choices, ask.Choice{Word: "rebuilt", Means: "the repair is done: prove the board, then bring it up"})
	}
	q.Choices = append(q.Choices, ask.Choice{Word: "stop", Means: "leave the session"})
	return q
}

// resume takes steps off the list of what was put off.
func (s *session) resume(prefixes ...string) {
	for id := range s.putOff {
		for _, p := range prefixes {
			if strings.HasPrefix(id, p) {
				delete(s.putOff, id)
			}
		}
	}
}

// wantedValues names the board values that the figures of this board wait for.
func (s *session) wantedValues() []string {
	var ids []string
	for _, n := range s.chain.needs {
		for _, key := range strings.Split(n.Key, " and ") {
			key = strings.TrimPrefix(key, "board.")
			if id := "value " + key; s.valueStep(key) != nil && s.open(id) && !slices.Contains(ids, id) {
				ids = append(ids, id)
			}
		}
	}
	return ids
}

// putOffTests lists the tests whose last answer is later.
func (s *session) putOffTests() []diagnose.Candidate {
	var out []diagnose.Candidate
	for _, o := range s.file.Case.Current() {
		t := s.base.Test(o.Test)
		if o.Answer == "later" && t != nil {
			out = append(out, diagnose.Candidate{Test: t, Part: o.Part, Position: o.Position, Lifted: o.State == "lifted", Minutes: t.Minutes})
		}
	}
	return out
}

// offerReport asks for the name of the report and writes it.
func (s *session) offerReport() error {
	name := strings.TrimSuffix(s.file.Path, filepath.Ext(s.file.Path)) + ".html"
	answer, err := s.asker.Ask(ask.Question{Title: "Report", Ask: "Which file?", Free: "a name ending in .html, .md or .json", Enter: name,
		Check: func(text string) error {
			if formats[strings.ToLower(filepath.Ext(text))] == nil {
				return fmt.Errorf("a report is written as .html, .md or .json; end the name in one of them")
			}
			return nil
		}, NoBack: true})
	if err != nil || answer.Kind != ask.Given {
		return err
	}
	r, err := s.chain.report(s.clock())
	if err != nil {
		return err
	}
	if err := writeReport(answer.Text, r); err != nil {
		s.refused(err)
		return nil
	}
	s.say("written: " + answer.Text)
	return nil
}
