package safety

import (
	"time"

	"drivemend/measure"
)

// Phase is when in a job a step of the record is done.
type Phase string

// The phases, in the order of the job.
const (
	BeforeTouching Phase = "before touching"
	WhileRepairing Phase = "while repairing"
	AfterRepair    Phase = "after the repair"
)

// RecordStep is one step of the record: work that leaves no reading, but must not be forgotten.
type RecordStep struct {
	ID    string // one of measure.StepWords
	Phase Phase
	Title string // plain words
	Ask   string // the question, to be answered done, failed, not-possible, not-fitted
	How   string // how it is done, with the caution where the hazard is
	Work  Work   // the hold points it stands behind
}

// RecordStatus is how one step of the record stands at a moment.
type RecordStatus struct {
	Step    RecordStep
	Last    *measure.StepEntry // what counts; nil without an entry
	Settled bool               // done, not possible or not fitted
	Applies bool               // this board and this stage of the job ask for it
	Due     time.Time          // of the follow-up; zero for the others
	Missing []Missing          // what withholds it now; empty when it may be done
}

// RecordSteps lists every step of the record in the order of the job.
func RecordSteps() []RecordStep { return nil }

// Record tells how every step of the record stands at a moment, in the order of the job.
func Record(c *measure.Case, now time.Time, e Evidence) []RecordStatus { return nil }

// FollowUpAfter is the time from hand-over to the follow-up. A repair that held so long counts as held. Design of this
// program, a judgement.
const FollowUpAfter = 30 * 24 * time.Hour

// NamedWork is one kind of work with its name in plain words.
type NamedWork struct {
	Work  Work
	Title string // "ohms, diode, capacitance"
}

// Works lists every kind of work that has conditions, in the order of the job.
func Works() []NamedWork { return nil }
