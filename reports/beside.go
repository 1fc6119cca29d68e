package reports

import (
	"fmt"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// Beside is what is known beside the result that an output is written from. Every member may be left out; what rests
// on it is then not said.
type Beside struct {
	Ranking *diagnose.Ranking // for the leading cause beside a repair
	Safety  *safety.Status    // for a dead board of which no test is left; at the moment of the suggestion
	Outside []Outside         // for the mark of readings taken outside their hold points
	Case    *measure.Case     // for the conditions stated before a step, and for readings that are lower bounds
	// Record is how the steps of the record stand at the moment of the suggestion, for those that stand open.
	Record []safety.RecordStatus
}

// beside is what a report knows beside each of its results.
func (r Report) beside() Beside {
	return Beside{Ranking: r.Ranking, Safety: &r.Safety, Outside: r.Outside, Case: r.Case}
}

// besides gives the one that was passed along, if any.
func besides(given []Beside) Beside {
	if len(given) == 0 {
		return Beside{}
	}
	return given[0]
}

// of gives what is known beside a result, with the case it is of.
func (b Beside) of(c *measure.Case) Beside {
	if b.Case == nil {
		b.Case = c
	}
	return b
}

// outside tells whether a finding's reading was taken outside its hold point.
func (b Beside) outside(f diagnose.Finding) bool {
	for _, x := range b.Outside {
		if x.Observation >= 0 && x.Observation == f.Observation {
			return true
		}
	}
	return false
}

// name is a finding's name with an asterisk where its reading was taken outside its hold point.
func (b Beside) name(f diagnose.Finding) string { return findingName(f) + b.mark(f) }

func (b Beside) mark(f diagnose.Finding) string {
	if b.outside(f) {
		return "*"
	}
	return ""
}

// note explains the asterisk, "" where no finding carries one.
func (b Beside) note(findings []diagnose.Finding) string {
	n := 0
	for _, f := range findings {
		if b.outside(f) {
			n++
		}
	}
	if n == 0 {
		return ""
	}
	return "* taken outside a hold point, and counted all the same: " + fmt.Sprintf("%d of %s.", n, count(len(findings), "finding", "findings"))
}

// repairHeld says what comes before a repair, "" when one may be asked for now. Whoever reads it opens the board.
func repairHeld(n *diagnose.Suggestion, known Beside) string {
	switch {
	case !deadGranted(n, known):
		return "after the board is proved dead"
	case n.Locked != nil:
		return "after the locked test that is worth more than every allowed one"
	case putOff(n):
		return "after the tests that were put off"
	}
	return ""
}

// deadGranted tells whether safety grants a dead board: every test that needs one is allowed; where none is left, the
// status says so.
func deadGranted(n *diagnose.Suggestion, known Beside) bool {
	asked := false
	for _, c := range n.Tests {
		if safety.Need(c.Test.Needs) != safety.NeedDead {
			continue
		}
		if !c.Allowed {
			return false
		}
		asked = true
	}
	return asked || known.Safety != nil && known.Safety.Dead
}

func putOff(n *diagnose.Suggestion) bool {
	for _, c := range n.Tests {
		if c.Deferred && (c.Value > 0 || c.Must || c.Test.Must) {
			return true
		}
	}
	return false
}

// stateOfKnowledge says how little or much a repair rests on.
func (b Beside) stateOfKnowledge() string {
	text := "worth doing at this state of knowledge"
	if b.Ranking != nil && len(b.Ranking.Causes) > 0 {
		text += " (leading cause " + percent(b.Ranking.Causes[0].Probability) + ")"
	}
	return text
}

// heldOf judges the statement that a repair held by the follow-up on record, as it stands at a moment: it has to be
// done, 30 days after the hand-over or later. A zero moment is the last one on record. A case without either step, as
// older ones are, goes by its dates.
func heldOf(c *measure.Case, at time.Time) (proved bool, record string) {
	if at.IsZero() {
		at = lastStep(c)
	}
	steps := safety.Record(c, at, safety.Evidence{})
	f := followUpOf(steps)
	switch {
	case f == nil, f.Last == nil && f.Due.IsZero():
		return heldByDates(c, at)
	case f.Last != nil && f.Last.Result == "failed":
		return false, "the follow-up of " + day(f.Last.At) + " says that it failed"
	case f.Last != nil && f.Settled && f.Last.Result == "done":
		return true, "followed up " + day(f.Last.At)
	case f.Last != nil && f.Settled:
		return false, "the follow-up of " + day(f.Last.At) + " was " + stepName(f.Last.Result)
	case f.Due.IsZero():
		return false, "the record does not say when the machine was handed over"
	case f.Last != nil && f.Last.Result == "done":
		return false, "the follow-up of " + day(f.Last.At) + " came before the 30 days were over, on " + day(f.Due)
	}
	return false, "no follow-up is on record; it is due " + day(f.Due)
}

// heldByDates judges a case whose record has neither hand-over nor follow-up: from the day the rebuild was done to the
// day the case was closed, or to the day of asking where that is earlier or no other is stated.
func heldByDates(c *measure.Case, at time.Time) (proved bool, record string) {
	if c.Rebuild == nil || c.Rebuild.Done.IsZero() {
		return false, "the record does not say when the rebuild was done"
	}
	end := time.Time{}
	if c.Outcome != nil {
		end = c.Outcome.Closed
	}
	if end.IsZero() || !at.IsZero() && at.Before(end) {
		end = at
	}
	if end.IsZero() {
		return false, "the record does not say when the case was closed"
	}
	days := int(dateOf(end).Sub(dateOf(c.Rebuild.Done)).Hours() / 24)
	if days < 0 {
		return false, "by the record the rebuild was done only after that day"
	}
	return days >= measure.HeldDays, "the record shows " + count(days, "day", "days") + " from rebuild to closing, and no follow-up"
}

func dateOf(t time.Time) time.Time {
	y, m, d := t.Date()
	return time.Date(y, m, d, 0, 0, 0, 0, time.UTC)
}

// followUpOf gives the step that asks whether a repair held; nil where the record has none.
func followUpOf(record []safety.RecordStatus) *safety.RecordStatus {
	for i := range record {
		if record[i].Step.ID == measure.StepFollowedUp {
			return &record[i]
		}
	}
	return nil
}

// lastStep is the latest moment that a step of the record carries.
func lastStep(c *measure.Case) time.Time {
	var last time.Time
	for _, s := range c.Steps {
		if s.At.After(last) {
			last = s.At
		}
	}
	return last
}

// confirmedWords is how the outcome was confirmed; a repair held is only said where the record bears it out.
func confirmedWords(c *measure.Case, at time.Time) string {
	by := c.Outcome.ConfirmedBy
	if by != "held-30-days" {
		return by
	}
	if proved, record := heldOf(c, at); !proved {
		return "stated as held 30 days, but " + record
	}
	return by
}
