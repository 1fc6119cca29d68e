package safety

import (
	"fmt"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Missing is one thing that stands between the technician and a step.
type Missing struct {
	Point  int    // the hold point that withholds the step, 0 to 6
	Text   string // what is missing
	Unlock string // what to do, or what to enter
}

// Decision is the answer to whether the instruction for a step may be given now.
type Decision struct {
	Need    Need
	Tool    Tool
	At      time.Time // the time that was used
	Allowed bool
	Missing []Missing // empty exactly when allowed
	Carries []string  // what the instruction for this work always carries with it, allowed or not
	Status  Status
}

// Check tells whether the instruction for this work may be given at the time now, on the safety record of the case and
// what the rule base reads out of its observations. It never errs towards allowing: an unknown need or tool, a time that
// is missing, or one in the future is taken against the step.
func Check(c *measure.Case, w Work, now time.Time, e Evidence) Decision {
	d := Decision{Need: w.Need, Tool: w.Tool, At: now, Carries: Carries(w)}
	if c == nil {
		d.Missing = []Missing{{0, "there is no case", "start one"}}
		return d
	}
	s := sceneOf(c, w, now, e)
	d.Status = s.status
	d.Missing = s.missing()
	d.Allowed = len(d.Missing) == 0
	return d
}

func linkMissing(s Status) Missing {
	const off = "take the link off and enter it: drivemend safe link CASE removed; then check every store again"
	if s.Link.Since.After(s.At) {
		fitted, _ := clocks(s.Link.Since, s.At)
		return Missing{2, "a shorting link is dated " + fitted + ", in the future: it counts as fitted", "correct its time in the case file, or ask for a later moment; then " + off}
	}
	return Missing{2, "a shorting link has been fitted since " + clock(s.Link.Since) + ": everything would read shorted, and power would go straight into it", off}
}

// OutsideHoldPoint tells what was missing when an observation was made, judged from the record as it stood at that
// moment: what was stated, checked, observed, done or rebuilt later does not count. Nothing when it was made within its
// hold points. Such a reading is kept, and marked. A question and an answer without a reading (skipped, later) are never
// outside. A static test counts at the time the evidence gives it: hand over the evidence of AsOf(c, o.At), so that a
// test repeated later does not hide that it had passed before.
func OutsideHoldPoint(c *measure.Case, o measure.Observation, w Work, e Evidence) (outside bool, missing []Missing) {
	if (w.Need == NeedQuestion && w.Tool == NoTool) || o.Answer != "" {
		return false, nil
	}
	if o.At.IsZero() || c == nil {
		return true, []Missing{undatedReading(w)}
	}
	then := evidenceAsOf(e, o.At)
	if w.Energises() {
		then.Powered = without(then.Powered, o.At)
	}
	d := Check(AsOf(c, o.At), w, o.At, then)
	return !d.Allowed, d.Missing
}

// OutsideStep tells what was missing when an entry of the steps was made, number i of the case's list, judged from the
// record as it stood at that moment; e is the evidence as of then. No step's work rests on that step, so that the entry
// itself says nothing. Nil when it was made within its hold points, when its work is a question, and when nothing was
// done at the board.
func OutsideStep(c *measure.Case, i int, e Evidence) []Missing {
	if c == nil || i < 0 || i >= len(c.Steps) {
		return nil
	}
	entry := c.Steps[i]
	step, known := recordStep(entry.Step)
	if !known || step.Work == look || (entry.Result != resultDone && entry.Result != resultFailed) {
		return nil
	}
	if entry.At.IsZero() {
		return []Missing{undatedReading(step.Work)}
	}
	return Check(AsOf(c, entry.At), step.Work, entry.At, evidenceAsOf(e, entry.At)).Missing
}

func undatedReading(w Work) Missing {
	if w.Need.Powered() {
		return Missing{3, "the reading carries no time, so no statement of the conditions can be shown to stand before it", "give the reading its time"}
	}
	return Missing{2, "the reading carries no time, so no dead check can be shown to stand before it", "give the reading its time"}
}

// touch says in words what a reading at a store allows; burn adds the warning that stands below the shock limit.
func touch(volts float64, burn bool) string {
	switch {
	case !above(volts, DeadVolts):
		return "dead"
	case volts < LiveVolts:
		text := fmt.Sprintf("above %s, below %s: may be touched, no ohms", format(DeadVolts, quantity.Volt), format(LiveVolts, quantity.Volt))
		if burn {
			text += "; burn hazard: no rings or watch, insulated tools"
		}
		return text
	}
	return "live: do not touch"
}

// burns tells whether a board can burn below the shock limit: a battery, or 100 J stored.
func burns(boards []measure.Board, stores []Store) bool {
	for _, b := range boards {
		if supply, _ := b.Word("supply"); supply == "battery" {
			return true
		}
	}
	return worstEnergy(stores) >= 100
}
