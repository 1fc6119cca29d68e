package safety

import (
	"slices"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Results of a step of the record.
const (
	resultDone        = "done"
	resultFailed      = "failed"
	resultNotPossible = "not-possible"
	resultNotFitted   = "not-fitted"
)

// RecordStatus is how one step of the record stands at a moment.
type RecordStatus struct {
	Step    RecordStep
	Last    *measure.StepEntry // what counts; nil without an entry
	Settled bool               // done, not possible, or not fitted where the board may lack it
	Because string             // why the entry that counts does not settle a step that was not done; "" else
	Applies bool               // this board and this stage of the job ask for it
	Due     time.Time          // of the follow-up; zero for the others
	Missing []Missing          // what withholds it now; empty when it may be done
}

// Record tells how every step of the record stands at a moment, in the order of the job. A nil case gives nil.
func Record(c *measure.Case, now time.Time, e Evidence) []RecordStatus {
	if c == nil {
		return nil
	}
	r := recordAt{c: c, now: now, evidence: e}
	var out []RecordStatus
	for _, step := range RecordSteps() {
		s := r.status(step)
		if step.ID == measure.StepHandedOver {
			s.Missing = append(s.Missing, beforeHandOver(out)...)
		}
		if step.ID == measure.StepFollowedUp {
			s = r.followUp(s, out)
		}
		out = append(out, s)
	}
	return out
}

// recordAt is the record of a case at a moment.
type recordAt struct {
	c        *measure.Case
	now      time.Time
	evidence Evidence
}

func (r recordAt) status(step RecordStep) RecordStatus {
	s := RecordStatus{Step: step, Last: entryOf(r.c.Steps, step.ID, r.now), Applies: r.applies(step)}
	s.Settled = s.Last != nil && settles(*s.Last) && !s.Last.At.IsZero() && !s.Last.At.After(r.now)
	if s.Last != nil && s.Last.Result == resultNotFitted && !MayLack(step.ID) {
		s.Because = notLacking
	}
	s.Missing = Check(r.c, step.Work, r.now, r.evidence).Missing
	return s
}

func settles(e measure.StepEntry) bool {
	return e.Result == resultDone || e.Result == resultNotPossible || e.Result == resultNotFitted && MayLack(e.Step)
}

// notLacking is why not-fitted does not settle a step that every board has.
const notLacking = "no board lacks this: where it cannot be done, enter not-possible with a note"

// MayLack tells whether a board may lack what a step is about: a fault memory, settings, a motor, its cable, a brake
// resistor. Only such a step is settled by not-fitted.
func MayLack(step string) bool {
	switch step {
	case measure.StepFaultLogRead, measure.StepSettingsSaved, measure.StepSettingsRestored,
		measure.StepMotorTested, measure.StepCableTested, measure.StepBrakeResistorTested:
		return true
	}
	return false
}

// weight orders the results of one moment: the one that says least for the board counts, and only done speaks for it.
var weight = map[string]int{resultDone: 0, resultNotFitted: 1, resultNotPossible: 2, resultFailed: 3}

// entryOf gives the entry of a step that counts. Done counts once its time has come, everything else whatever its time.
func entryOf(steps []measure.StepEntry, step string, now time.Time) *measure.StepEntry {
	return counting(now, steps, func(e *measure.StepEntry) (time.Time, int) {
		if e.Step != step {
			return e.At, notOfThis
		}
		return e.At, weight[e.Result]
	})
}

// applies tells whether this board, at this stage of the job, asks for a step.
func (r recordAt) applies(step RecordStep) bool {
	done := r.c.Rebuild != nil && !r.c.Rebuild.Done.IsZero()
	switch {
	case step.ID == measure.StepDeadPartsBagged:
		return done || r.hasDeadPart()
	case step.ID == measure.StepBrakeResistorTested:
		_, brake := storeAt(historyOf(r.c, r.now, nil).stores(), PointBrake)
		return done && brake
	case step.Phase == AfterRepair:
		return done
	}
	return true
}

// hasDeadPart tells whether the case names a part that is dead, or a reading that shows one.
func (r recordAt) hasDeadPart() bool {
	if r.c.Outcome != nil && len(r.c.Outcome.Parts) > 0 {
		return true
	}
	return slices.ContainsFunc(r.c.Observations, func(o measure.Observation) bool {
		word := o.Reading != nil && o.Reading.Kind == quantity.Word && o.Reading.Word == "shorted"
		return o.Part != "" && (word || o.Result == "shorted")
	})
}

// beforeHandOver says which steps still stand before the hand-over.
func beforeHandOver(done []RecordStatus) []Missing {
	behind := []string{measure.StepProtectionsProved, measure.StepSettingsRestored, measure.StepMotorTested, measure.StepCableTested,
		measure.StepBrakeResistorTested, measure.StepLoadTested}
	var m []Missing
	for _, s := range done {
		// The brake resistor is asked for only where the board has one; the others always.
		asked := s.Applies || s.Step.ID != measure.StepBrakeResistorTested
		if s.Settled || !asked || !slices.Contains(behind, s.Step.ID) {
			continue
		}
		why := "is not on record"
		if s.Last != nil {
			why = "is on record as " + s.Last.Result
		}
		if s.Because != "" {
			why += "; " + s.Because
		}
		m = append(m, Missing{3, "before the board is handed over: \"" + s.Step.Title + "\" " + why,
			"do it and enter it: drivemend record step CASE " + s.Step.ID + " done; where it cannot be done: drivemend record step CASE " + s.Step.ID + " not-possible --note WORDS"})
	}
	return m
}

// FollowUpDue gives the day on which a board that was handed over is asked about again, measure.HeldDays later. It counts
// calendar days, as the loader of a case does: the hour of the hand-over does not matter.
func FollowUpDue(over time.Time) time.Time {
	y, m, d := over.Date()
	return time.Date(y, m, d+measure.HeldDays, 0, 0, 0, 0, over.Location())
}

// followUp completes the status of the follow-up: due 30 days after the hand-over, and not to be had earlier.
func (r recordAt) followUp(s RecordStatus, done []RecordStatus) RecordStatus {
	var over *measure.StepEntry
	for _, d := range done {
		if d.Step.ID == measure.StepHandedOver && d.Last != nil && d.Last.Result == resultDone {
			over = d.Last
		}
	}
	s.Applies = over != nil
	if over == nil {
		s.Settled = false
		s.Missing = append(s.Missing, Missing{3, "the board is not on record as handed over", "enter it once it is: drivemend record step CASE " + measure.StepHandedOver + " done"})
		return s
	}
	s.Due = FollowUpDue(over.At)
	if s.Last != nil && s.Last.At.Before(s.Due) {
		s.Settled = false
	}
	if r.now.Before(s.Due) {
		s.Missing = append(s.Missing, Missing{3, "the follow-up is due at " + clock(s.Due) + ": a repair counts as held after 30 days", "ask again then; what fails before is a new case, with this one as its earlier repair"})
	}
	return s
}
