package main

import (
	"bytes"
	"errors"
	"fmt"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
	"drivemend/reports"
)

// openIsolation names the isolation step while the board does not count as cut off, and the question whether it still
// does where an earlier session said so.
func (s *session) openIsolation() string {
	switch {
	case !s.status().Isolation.Isolated:
		return "isolation"
	case !s.stands:
		return "stands"
	}
	return ""
}

// openLink names the link step while a shorting link is on record as fitted.
func (s *session) openLink() string {
	if s.status().Link.Fitted {
		return "link"
	}
	return ""
}

// openChecks names a dead check for every store that is not proved dead. Without isolation none may be given; with one
// of them put off the others unlock nothing.
func (s *session) openChecks() []string {
	st := s.status()
	if !st.Isolation.Isolated || !s.stands {
		return nil
	}
	if st.Link.Fitted {
		return []string{"link"}
	}
	var ids []string
	for _, p := range st.Points {
		id := "check " + p.Store.Point
		switch {
		case p.Dead:
		case s.putOff[id]:
			return nil
		default:
			ids = append(ids, id)
		}
	}
	return ids
}

var yesNo = []ask.Choice{{Word: "yes"}, {Word: "no"}}

// isolationStep asks the three things an isolation is made of. It is kept as one statement, once all three are said.
func (s *session) isolationStep() *step {
	why := s.text("why", "why this is asked", "Nothing is measured, discharged or touched before the board is cut off from every source and stays so. A motor that turns charges the bus; a charger or control supply you forgot does too.")
	how := s.text("how", "how it is done", "Open the isolator, lock it and hang your tag on it. Unplug the motor, or lock its shaft. Look for a shared bus, a battery, a charger, an external 24 V supply, fan and relay supplies: switch them off and lock them.")
	questions := []ask.Question{
		{Title: "MAKE SAFE 1 of 3: isolator", Ask: "Is the isolator open, locked and tagged? Type yes only if it is so now.", Choices: yesNo},
		{Title: "MAKE SAFE 2 of 3: motor", Ask: "Is the motor unplugged, or its shaft locked? Type the whole word.",
			Choices: []ask.Choice{{Word: "unplugged", Means: "the motor cable is off the board"}, {Word: "shaft-locked", Means: "it cannot turn"}, {Word: "connected", Means: "neither"}}},
		{Title: "MAKE SAFE 3 of 3: other sources", Ask: "Does anything else feed the board? Name each one and say that it is off.",
			Choices: []ask.Choice{{Word: "none", Means: "nothing else feeds it"}}, Free: "such as: 24 V supply off, charger off"},
	}
	return &step{"isolation", func() (ask.Kind, error) {
		var said [3]string
		for i := 0; i < len(questions); i++ {
			q := questions[i]
			q.Danger, q.Asides = true, []ask.Aside{how, why}
			answer, err := s.put(q)
			if err != nil || answer.Kind != ask.Given && (answer.Kind != ask.Back || i == 0) {
				return s.unstated(answer.Kind, i, err)
			}
			if answer.Kind == ask.Back {
				i -= 2
				continue
			}
			said[i] = answer.Text
		}
		return s.isolated(said)
	}}
}

// unstated ends an isolation that was not said in full.
func (s *session) unstated(kind ask.Kind, parts int, err error) (ask.Kind, error) {
	if parts > 0 {
		s.say("An isolation counts only in full; this one is not kept and will be asked again.")
	}
	if err == nil && (kind == ask.Skipped || kind == ask.Later) {
		s.say("Without isolation no discharge, no dead check and no meter step is given. Questions go on.")
	}
	return kind, err
}

func (s *session) isolated(said [3]string) (ask.Kind, error) {
	ok, err := s.keep(func(f *measure.File) error {
		return f.Isolate(measure.Isolation{Locked: said[0] == "yes", Motor: said[1], OtherSources: said[2], At: s.clock()})
	})
	if err != nil || !ok {
		return ask.Later, err
	}
	st := s.status().Isolation
	if st.Isolated {
		s.stands = true
		s.say("Isolated since " + st.Since.Format("15:04") + ".")
		return ask.Given, nil
	}
	for _, m := range st.Missing {
		s.say("! " + m.Text + ": " + m.Unlock)
	}
	s.say("Until then no discharge, no dead check and no meter step is given. Questions go on.")
	s.say("To state it again: b goes back to it now; more, then isolation, states it at any time. It is asked again before the first meter step.")
	return ask.Later, nil
}

// linkStep asks for a link that is on record as fitted: with it on, everything reads shorted.
func (s *session) linkStep() *step {
	return &step{"link", func() (ask.Kind, error) {
		since := s.status().Link.Since
		answer, err := s.asker.Ask(ask.Question{Title: "Shorting link", Danger: true,
			Lines: []string{"A link is on record as fitted since " + since.Format("15:04") + ". With it on everything reads shorted."},
			Ask:   "Has it been taken off? Type yes only if it is off now.", Choices: yesNo})
		if err != nil || answer.Kind != ask.Given {
			return answer.Kind, err
		}
		if answer.Text == "no" {
			return ask.Later, nil
		}
		_, err = s.keep(func(f *measure.File) error { return f.RemoveLink(s.clock()) })
		return ask.Given, err
	}}
}

// checkStep asks for the dead check of one store. The plan of the discharge stands before the first of them.
func (s *session) checkStep(point string) *step {
	for _, p := range s.status().Points {
		if p.Store.Point == point {
			return &step{"check " + point, func() (ask.Kind, error) { return s.deadCheck(p) }}
		}
	}
	return nil
}

func (s *session) deadCheck(p safety.PointStatus) (ask.Kind, error) {
	if s.held() {
		return s.standStep().run()
	}
	if d := s.check(safety.Work{Need: safety.NeedDeadCheck}); !d.Allowed {
		return ask.Later, s.withheld("the dead check at "+p.Store.Point, d.Missing)
	}
	s.remindPast(safety.Work{Need: safety.NeedDeadCheck})
	plan, err := s.chain.discharge(s.clock())
	if err != nil {
		s.say("! no discharge plan: " + err.Error())
	}
	s.showPlan(plan)
	d := measure.DeadCheck{Point: p.Store.Point}
	kind, err := s.readCheck(p, plan, &d)
	if d.DC.Unit == "" || kind == ask.Back { // nothing was read, or it is read anew
		if err == nil && (kind == ask.Skipped || kind == ask.Later) {
			s.say("Until " + p.Store.Point + " is proved dead every meter step stays locked; everything that is only asked goes on. To take it up: more, then dead-check.")
		}
		return kind, err
	}
	// A reading is kept even if the rest was not said; it proves nothing then.
	d.At = s.clock()
	if ok, e := s.keep(func(f *measure.File) error { return f.Check(d) }); e != nil || !ok {
		return kind, errors.Join(err, e)
	}
	for _, now := range s.status().Points {
		if now.Store.Point != point(p) {
			continue
		}
		if now.Dead {
			s.say(fmt.Sprintf("%s is proved dead until %s.", now.Store.Point, now.ExpiresAt.Format("15:04")))
		}
		for _, m := range now.Missing {
			s.say("! " + m.Text + ": " + m.Unlock)
		}
	}
	return kind, err
}

func point(p safety.PointStatus) string { return p.Store.Point }

// urgent are the cautions that stand on the screen before the first dead check; all of them stand in the plan.
var urgent = map[string]bool{"arc-flash": true, "arc-flash-source": true, "stored-energy": true, "stored-energy-low-limit": true,
	"burn": true, "battery": true, "no-short": true, "resistor": true, "halves": true, "pumped": true}

// showPlan says once what to take and what not to do, with this board's joules.
func (s *session) showPlan(plan *safety.Plan) {
	if s.told["plan"] || plan == nil {
		return
	}
	s.told["plan"] = true
	s.say("")
	for _, m := range plan.Withheld {
		s.say("! " + m.Text + ": " + m.Unlock)
	}
	if len(plan.Withheld) > 0 {
		return
	}
	s.say("DISCHARGE " + quantity.Format(max(plan.TotalEnergyJ, plan.WorstEnergyJ), quantity.Joule) + " in all, up to " + quantity.Format(plan.BusV, quantity.Volt) + known(plan))
	for _, st := range plan.Steps[1:] { // the isolation is there already
		if st.Point != "" {
			break
		}
		s.say("  " + st.Text)
	}
	for _, c := range plan.Cautions {
		if urgent[c.ID] {
			s.say("  ! " + c.Text)
		}
	}
}

// known says where the energy rests on what is not stated.
func known(p *safety.Plan) string {
	var taken []string
	if p.BusBasis == safety.Assumed {
		taken = append(taken, "highest bus voltage")
	}
	if p.CapacitanceBasis == safety.Assumed {
		taken = append(taken, "bus capacitance")
	}
	if len(taken) == 0 {
		return ""
	}
	return "; the worst case is taken for the " + strings.Join(taken, " and the ") + ", which is not stated"
}

// planAside shows the whole plan: every step, time and caution with its source.
func (s *session) planAside(plan *safety.Plan) ask.Aside {
	return ask.Aside{Word: "plan", Means: "every step, time and caution", Show: func() string {
		var page bytes.Buffer
		if err := reports.Discharge(&page, plan, reports.Style{Width: s.width}); err != nil {
			return err.Error()
		}
		return page.String()
	}}
}
