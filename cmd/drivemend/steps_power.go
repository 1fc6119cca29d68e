package main

import (
	"fmt"
	"slices"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/reports"
)

// check tells whether the instruction for a work may be given at this moment.
func (s *session) check(w safety.Work) safety.Decision { return s.checkWith(w, s.clock()) }

// checkWith tells the same as if more had been stated.
func (s *session) checkWith(w safety.Work, now time.Time, more ...measure.Before) safety.Decision {
	c := *s.file.Case
	c.Safety.Before = append(slices.Clone(c.Safety.Before), more...)
	return safety.Check(&c, w, now, s.chain.evidence())
}

// withheld says why a step is not given.
func (s *session) withheld(title string, missing []safety.Missing) error {
	return reports.Withheld(s.out, title, missing, s.clock(), s.style())
}

// gate stands before every step at the board: unless its hold points allow it at this very moment, nothing is asked
// and nothing shown. pass is false where the step has ended, in the way kind says.
func (s *session) gate(w safety.Work, title string) (pass bool, kind ask.Kind, err error) {
	if st := s.heldStep(w); st != nil {
		kind, err := st.run()
		return false, kind, err
	}
	if d := s.check(w); !d.Allowed {
		return false, ask.Later, s.withheld(title, d.Missing)
	}
	s.remindPast(w)
	return true, ask.Given, nil
}

// remindPast stands before every step at the board in a session whose clock --at has set back: it is for writing down
// what was done then.
func (s *session) remindPast(w safety.Work) {
	if line := s.asItStood(s.clock()); line != "" && w.Need != safety.NeedQuestion {
		s.say("")
		s.say("! " + line)
	}
}

// heldBack tells whether a work rests on what an earlier session stated: until somebody has looked again and said so,
// it does not count.
func (s *session) heldBack(w safety.Work) bool { return s.heldStep(w) != nil }

// heldStep gives the step that asks whether what an earlier session stated still stands; nil when nothing waits for it.
func (s *session) heldStep(w safety.Work) *step {
	if w.Need == safety.NeedQuestion {
		return nil
	}
	if !w.Need.Powered() && s.held() {
		return s.standStep()
	}
	for _, word := range safety.Statements(w) {
		if !s.statedHere(word) && s.check(w).Allowed {
			return s.beforeStep(word, w)
		}
	}
	return nil
}

// statedHere tells whether the conditions of a step were stated since this session began.
func (s *session) statedHere(word string) bool {
	return slices.ContainsFunc(s.file.Case.Safety.Before, func(b measure.Before) bool {
		return b.Step == word && !b.At.Before(s.start.Truncate(time.Second))
	})
}

// ideal is a statement in which every condition holds; with it the hold points tell what else is missing.
func ideal(word string, at time.Time) measure.Before {
	b := measure.Before{Step: word, At: at, Motor: "unplugged", BrakeResistor: "disconnected", Bank: "in-use", Guard: true, RemoteOff: true,
		Glasses: true, SecondPerson: true, BusDisconnected: true, Shield: true, ElectronicsDisconnected: true, SourcesOff: true, GatesHeld: true,
		LimitSet: true, Attended: true, Probe: "differential", ClipOn: "earthed-node", Supply: "isolated", EarthClips: 1}
	_ = stateFuse(&b, leastFuse)
	return b
}

// leastFuse is the smallest fuse that a case can state, so that it is never too large.
const leastFuse = "1 mA"

// ideals are all statements of a work but one, with every condition held.
func ideals(w safety.Work, at time.Time, but string) []measure.Before {
	var out []measure.Before
	for _, word := range safety.Statements(w) {
		if word != but {
			out = append(out, ideal(word, at))
		}
	}
	return out
}

// waits tells what a work waits for: what no statement settles, and when that is nothing the statements to be made.
func (s *session) waits(w safety.Work) (others []safety.Missing, statements []string) {
	now := s.clock()
	if d := s.checkWith(w, now, ideals(w, now, "")...); !d.Allowed {
		return d.Missing, nil
	}
	for _, word := range safety.Statements(w) {
		if !s.statedHere(word) || !s.checkWith(w, now, ideals(w, now, word)...).Allowed {
			statements = append(statements, word)
		}
	}
	return nil, statements
}

// toward gives the step that brings a work nearer to being allowed: proving the board dead, then a statement; nil when
// nothing that can be asked does, or when it was put off.
func (s *session) toward(w safety.Work) func() *step {
	if w.Need != safety.NeedQuestion && !w.Need.Powered() && (!s.status().Dead || s.held()) {
		if id := s.unlocking(); id != "" {
			return s.stepNamed(id)
		}
		return nil
	}
	if w.Need.Powered() && s.status().Link.Fitted && !s.putOff["link"] {
		return s.linkStep
	}
	if _, words := s.waits(w); len(words) > 0 && !s.putOff["before "+words[0]] {
		return func() *step { return s.beforeStep(words[0], w) }
	}
	return nil
}

// pickPowered gives the powered test worth most of those whose power was stated for in this session. It comes before
// every test of a dead board: that ends the statement.
func (s *session) pickPowered(n *diagnose.Suggestion) func() *step {
	for _, c := range n.Tests {
		w := diagnose.WorkOf(c.Test)
		if !w.Need.Powered() || s.putOff[testID(c)] || c.Value <= 0 && !c.Must || !s.statedHere(string(w.Need)) {
			continue
		}
		others, words := s.waits(w)
		switch {
		case len(others) > 0 || slices.Contains(words, string(w.Need)):
		case len(words) == 0:
			return s.testOrKey(c)
		case !s.putOff["before "+words[0]]:
			return func() *step { return s.beforeStep(words[0], w) }
		}
	}
	return nil
}

// powerOn keeps, before the instruction of a powered step stands on the screen, that the board may have power from now
// on: whatever comes of the step, isolation and dead checks are over. ok is false when that could not be kept.
func (s *session) powerOn(w safety.Work) (ok bool, err error) {
	if !w.Need.Powered() || s.underPower() {
		return true, nil
	}
	ok, err = s.keep(func(f *measure.File) error {
		return f.Energise(measure.Energised{What: "powered-step", At: s.clock()})
	})
	if ok {
		s.resume("isolation", "stands", "link", "check ")
		s.say("")
		s.say("! From here on the board counts as powered: isolation and every dead check are over.")
	}
	return ok, err
}

// underPower tells whether energy was put in, or may have been, since the board was last isolated.
func (s *session) underPower() bool {
	i := s.status().Isolation
	return !i.Energised.IsZero() && (i.Last == nil || !i.Last.At.After(i.Energised))
}

// leftCharged keeps that a step with the insulation tester was shown and not answered: it may have left its charge.
func (s *session) leftCharged(w safety.Work) error {
	if w.Tool != safety.ToolInsulation || s.underPower() {
		return nil
	}
	ok, err := s.keep(func(f *measure.File) error { return f.Energise(measure.Energised{What: "source", At: s.clock()}) })
	if ok {
		s.resume("isolation", "stands", "link", "check ")
		s.say("! The insulation tester may have left its charge: isolation and every dead check are over.")
	}
	return err
}

// powers are the kinds of power in the order of a bring-up.
var powers = []ask.Choice{
	{Word: string(safety.NeedControlPower), Means: "control supply on, the bus disconnected"},
	{Word: string(safety.NeedLowBus), Means: "a low bus behind a current limit"},
	{Word: string(safety.NeedFull), Means: "the full bus"}}

// choosePower asks which power comes next and gives the statement that stands before it.
func (s *session) choosePower() (func() *step, error) {
	q := ask.Question{Title: "POWER", Ask: "Which power is wanted next? Nothing is switched on yet; type the whole word.", Choices: slices.Clone(powers),
		Danger: true, Lines: []string{"In this order, each only when the one before showed nothing wrong. The conditions are asked one by one; then come the tests that wait for it."}}
	for i := range q.Choices {
		if others, words := s.waits(safety.Work{Need: safety.Need(q.Choices[i].Word)}); len(others) > 0 {
			q.Choices[i].Means += "; locked: " + others[0].Text
		} else if len(words) == 0 {
			q.Choices[i].Means += "; its conditions are stated"
		}
	}
	word, ok, err := s.said(q)
	if !ok {
		return s.again, err
	}
	s.resume("before "+word, "before "+measure.BeforeScope, "before "+measure.BeforeDoublePulse)
	s.resumePowered()
	return func() *step { return s.beforeStep(word, safety.Work{Need: safety.Need(word)}) }, nil
}

// resumePowered takes what waits for power off the list of what was put off: whoever states power wants it asked.
func (s *session) resumePowered() {
	for _, r := range safety.RecordSteps() {
		if r.Work.Need.Powered() {
			s.resume(recordID(r.ID))
		}
	}
	for i := range s.base.Tests {
		if t := &s.base.Tests[i]; diagnose.WorkOf(t).Need.Powered() {
			s.resume("test " + t.ID)
		}
	}
}

// sayPowered says of the powered test worth most what it waits for.
func (s *session) sayPowered(n *diagnose.Suggestion) {
	for i := range n.Tests {
		c := &n.Tests[i]
		w := diagnose.WorkOf(c.Test)
		if !w.Need.Powered() || c.Value <= 0 && !c.Must {
			continue
		}
		others, words := s.waits(w)
		if len(others) == 0 && len(words) == 0 {
			return // it stands under NEXT
		}
		s.left++
		line := fmt.Sprintf("POWER   %s, %.0f min, needs %s: locked", c.Test.Title, c.Minutes, c.Test.Needs)
		if n.Locked != nil && n.Locked.Test == c.Test {
			line += "; it is worth most"
		}
		s.say(line)
		switch {
		case !s.isRebuilt():
			s.say("        the repair comes first; once it is finished: type rebuilt")
		case len(others) > 0:
			s.say("        " + others[0].Text + ": " + others[0].Unlock)
		default:
			s.say("        only the conditions before " + joinedWords(words) + " are missing: type power")
		}
		return
	}
}

func joinedWords(words []string) string {
	text := words[0]
	for _, w := range words[1:] {
		text += " and " + w
	}
	return text
}
