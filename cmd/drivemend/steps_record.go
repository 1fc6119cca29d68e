package main

import (
	"fmt"
	"slices"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// records tells how every step of the record stands at this moment.
func (s *session) records() []safety.RecordStatus {
	return safety.Record(s.file.Case, s.clock(), s.chain.evidence())
}

// openRecords lists the steps of a phase that this board asks for and that are not settled; of every phase for "".
func (s *session) openRecords(phase safety.Phase) []safety.RecordStatus {
	var out []safety.RecordStatus
	for _, r := range s.records() {
		if r.Applies && !r.Settled && (phase == "" || r.Step.Phase == phase) {
			out = append(out, r)
		}
	}
	return out
}

func (s *session) recordOf(id string) *safety.RecordStatus {
	for _, r := range s.records() {
		if r.Step.ID == id {
			return &r
		}
	}
	return nil
}

func recordID(id string) string { return "record " + id }

// openBefore names the steps before touching, each asked once a session: the picture as found, which is taken from
// outside the guard, or the short chapter of the others. A board that is rebuilt is no longer as it was found.
func (s *session) openBefore(picture bool) []string {
	var ids []string
	if s.isRebuilt() {
		return nil
	}
	for _, r := range s.openRecords(safety.BeforeTouching) {
		if (r.Step.ID == measure.StepPhotographed) == picture {
			ids = append(ids, recordID(r.Step.ID))
		}
	}
	return ids
}

// pickRecord gives the next step of the record after the repair whose hold points allow it now or can be brought to.
// Power is never led up to from here: powered steps come only under a statement that was asked for. What is only asked
// waits for every step before it.
func (s *session) pickRecord(powered bool) func() *step {
	before := false // a step stands open before this one
	for _, r := range s.openRecords(safety.AfterRepair) {
		id, w := r.Step.ID, r.Step.Work
		put, waits := s.putOff[recordID(id)], before && w.Need == safety.NeedQuestion
		before = before || !put
		if put || waits || w.Need.Powered() != powered {
			continue
		}
		if len(r.Missing) == 0 && !s.heldBack(w) {
			return func() *step { return s.recordStep(id) }
		}
		if powered || w.Need == safety.NeedQuestion {
			continue
		}
		if next := s.toward(w); next != nil {
			return next
		}
	}
	return nil
}

// recordStep asks one step of the record.
func (s *session) recordStep(id string) *step {
	return &step{recordID(id), func() (ask.Kind, error) {
		r := s.recordOf(id)
		if r == nil {
			return ask.Later, nil
		}
		if pass, kind, err := s.gate(r.Step.Work, r.Step.Title); !pass {
			return kind, err
		}
		if len(r.Missing) > 0 {
			return ask.Later, s.withheld(r.Step.Title, r.Missing)
		}
		if ok, err := s.powerOn(r.Step.Work); !ok {
			return ask.Later, err
		}
		return s.record(r.Step)
	}}
}

// record puts the question of a step whose hold points allow it.
func (s *session) record(r safety.RecordStep) (ask.Kind, error) {
	q := ask.Question{Title: strings.ToUpper(string(r.Phase)) + ": " + r.Title, Ask: r.Ask, Choices: recordChoices(r), Enter: "later",
		Asides: []ask.Aside{s.heldText(r.Work, r.Title, r.How)}}
	if r.Work.Need == safety.NeedQuestion {
		q.Lines = []string{r.How}
	} else {
		q.Danger, q.Lines = true, append(s.carried(r.Work), s.joules()...)
	}
	answer, err := s.put(q)
	if err != nil || answer.Kind != ask.Given {
		return answer.Kind, err
	}
	e := measure.StepEntry{Step: r.ID, Result: answer.Text, At: s.clock()}
	var asked error
	if why := recordReasons[answer.Text]; why != "" {
		e.Note, asked = s.oneLine(ask.Question{Title: r.Title, Ask: why, Free: "one line",
			Check: func(text string) error { return s.trial(func(f *measure.File) error { return withNote(f, e, text) }) }})
	}
	ok, err := s.keep(func(f *measure.File) error { return f.AddStep(e) })
	if err != nil || !ok {
		return ask.Later, err
	}
	s.say("  kept: " + r.ID + " " + e.Result)
	if asked != nil || e.Result != "done" {
		return ask.Given, asked
	}
	return ask.Given, s.recordMore(r)
}

// recordReasons are what is asked beside a result.
var recordReasons = map[string]string{"not-possible": "Why is it not possible?", "failed": "What was found?"}

// lacking says what not-fitted means at a step of what a board may lack.
var lacking = map[string]string{
	measure.StepFaultLogRead:        "this board keeps no fault memory",
	measure.StepSettingsSaved:       "this board has no settings",
	measure.StepSettingsRestored:    "this board has no settings",
	measure.StepMotorTested:         "it drives no motor",
	measure.StepCableTested:         "there is no cable",
	measure.StepBrakeResistorTested: "there is no brake resistor",
}

// recordChoices are the answers that make sense for a step.
func recordChoices(r safety.RecordStep) []ask.Choice {
	out := []ask.Choice{{Word: "done"}}
	if r.Phase == safety.AfterRepair {
		out = append(out, ask.Choice{Word: "failed", Means: "done, and not as it should be"})
	}
	out = append(out, ask.Choice{Word: "not-possible", Means: "why is asked next"})
	if safety.MayLack(r.ID) {
		out = append(out, ask.Choice{Word: "not-fitted", Means: lacking[r.ID]})
	}
	return out
}

// oneLine asks for a line of words; "" when there is none. The error is that of the end of the input.
func (s *session) oneLine(q ask.Question) (string, error) {
	q.Enter, q.NoBack = "later", true
	text, _, err := s.said(q)
	return text, err
}

// recordExtras are what a step that was done leaves to be kept beside it.
var recordExtras = map[string]struct {
	ask, free string
	add       func(f *measure.File, one string) error
}{
	measure.StepPhotographed: {"Where are the pictures? Enter alone: nothing more.", "file names, between commas",
		addPicture},
	measure.StepFaultLogRead: {"Which codes stand in it, the newest first? Enter alone: none.", "codes, between commas",
		func(f *measure.File, one string) error { return f.AddFaultCode(measure.FaultCode{Code: one}) }},
	measure.StepSettingsSaved: {"Which settings shall stand in the case? Enter alone: none.", "NAME = VALUE, between commas",
		func(f *measure.File, one string) error {
			name, value, _ := strings.Cut(one, "=")
			return f.AddSetting(measure.Setting{Name: strings.TrimSpace(name), Value: strings.TrimSpace(value)})
		}},
}

// addPicture keeps a picture, with length and sum where the file is here already.
func addPicture(f *measure.File, file string) error {
	p := measure.Photograph{Path: file}
	if one, err := summed(file); err == nil {
		p.Path, p.Bytes, p.SHA256 = fromCase(f.Path, file), one.bytes, one.sum
	}
	return f.AddPhotograph(p)
}

// recordMore asks for what a step leaves, and keeps it beside the step.
func (s *session) recordMore(r safety.RecordStep) error {
	extra, ok := recordExtras[r.ID]
	if !ok {
		return nil
	}
	addAll := func(f *measure.File, text string) error {
		for _, one := range strings.Split(text, ",") {
			if one = strings.TrimSpace(one); one == "" {
				continue
			}
			if err := extra.add(f, one); err != nil {
				return err
			}
		}
		return nil
	}
	text, err := s.oneLine(ask.Question{Title: r.Title, Ask: extra.ask, Free: extra.free,
		Check: func(text string) error { return s.trial(func(f *measure.File) error { return addAll(f, text) }) }})
	if err != nil || text == "" {
		return err
	}
	ok, err = s.keep(func(f *measure.File) error { return addAll(f, text) })
	if ok {
		s.say("  kept beside it: " + text)
	}
	return err
}

// withNote adds a step with a note.
func withNote(f *measure.File, e measure.StepEntry, note string) error {
	e.Note = note
	return f.AddStep(e)
}

// heldText is the instruction of a step, shown only as long as its hold points allow it.
func (s *session) heldText(w safety.Work, title, how string) ask.Aside {
	shown := s.text("how", "how it is done", how)
	return ask.Aside{Word: shown.Word, Means: shown.Means, Show: func() string {
		d := s.check(w)
		if d.Allowed {
			return shown.Show()
		}
		lines := []string{"WITHHELD  " + title}
		for _, m := range d.Missing {
			lines = append(lines, fmt.Sprintf("point %d: %s", m.Point, m.Text), "  "+m.Unlock)
		}
		return s.text("", "", strings.Join(lines, "\n")).Show()
	}}
}

// chooseRecord asks which open step of the record is taken up and gives the step that leads to it; nil for none.
func (s *session) chooseRecord() (func() *step, error) {
	open := s.openRecords("")
	if len(open) == 0 {
		s.say("No step of the record is open at this stage of the job.")
		return nil, nil
	}
	q := ask.Question{Title: "STEPS OF THE RECORD", Ask: "Which one?", NoSkip: true}
	for _, r := range open {
		means := r.Step.Title
		if len(r.Missing) > 0 {
			means += "; locked: " + r.Missing[0].Text
		}
		q.Choices = append(q.Choices, ask.Choice{Word: r.Step.ID, Means: means})
	}
	id, ok, err := s.said(q)
	if !ok {
		return nil, err
	}
	s.resume(recordID(id), "before ", "isolation", "stands", "link", "check ")
	i := slices.IndexFunc(open, func(r safety.RecordStatus) bool { return r.Step.ID == id })
	if len(open[i].Missing) > 0 {
		if next := s.toward(open[i].Step.Work); next != nil {
			return next, nil
		}
	}
	return func() *step { return s.recordStep(id) }, nil
}

// sayRecord says which step of the record comes next at this stage of the job, and what it waits for.
func (s *session) sayRecord() {
	open := slices.DeleteFunc(s.openRecords(""), func(r safety.RecordStatus) bool {
		return s.isRebuilt() && r.Step.Phase == safety.BeforeTouching
	})
	if len(open) == 0 {
		return
	}
	s.left += len(open)
	r := open[0]
	s.say(fmt.Sprintf("STEPS   %s of the record open; next: %s", counted(len(open), "step"), r.Step.Title))
	if len(r.Missing) > 0 {
		s.say("        locked: " + r.Missing[0].Text + ": " + r.Missing[0].Unlock)
	}
}

// rebuiltStep asks whether the repair is done: from then on readings speak for what was rebuilt.
func (s *session) rebuiltStep() *step {
	return &step{"rebuilt", func() (ask.Kind, error) {
		answer, err := s.put(ask.Question{Title: "REBUILT", Danger: true, Choices: yesNo,
			Lines: []string{"From then on every position is read anew, and only then power is given. Readings before it speak for the board as found.",
				"Where nothing had to be replaced it is said in the same way."},
			Ask:    "Is the repair finished, every part in its place and soldered? Type yes only if it is so now.",
			Asides: []ask.Aside{s.text("why", "why this is asked", "A board that was rebuilt is proved position by position before it gets power: parts that were fitted wrong, or died with the others, show here and cost nothing yet.")}})
		if err != nil || answer.Kind != ask.Given {
			return answer.Kind, err
		}
		if answer.Text == "no" {
			return ask.Later, nil
		}
		ok, err := s.keep(func(f *measure.File) error { return f.MarkRebuilt(s.clock()) })
		if err != nil || !ok {
			return ask.Later, err
		}
		s.resumeTests()
		s.say("Rebuilt at " + s.clock().Format("15:04") + ". Every position is read anew before power is given.")
		if r := s.recordOf(measure.StepDeadPartsBagged); r != nil && !r.Settled {
			s.jump = func() *step { return s.recordStep(measure.StepDeadPartsBagged) }
		}
		return ask.Given, nil
	}}
}

// resumeTests takes the tests at the board off the list of what was put off: they are asked of another board now.
func (s *session) resumeTests() {
	for i := range s.base.Tests {
		if t := &s.base.Tests[i]; t.Needs != string(safety.NeedQuestion) {
			s.resume("test " + t.ID)
		}
	}
}

// isRebuilt tells whether the rebuild was stated as done.
func (s *session) isRebuilt() bool {
	r := s.file.Case.Rebuild
	return r != nil && !r.Done.IsZero()
}
