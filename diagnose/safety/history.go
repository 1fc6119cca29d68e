package safety

import (
	"math"
	"slices"
	"strings"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// history is the safety record as it speaks at one moment. One principle runs through it: what speaks for a dead
// board counts only once its time has come; what speaks against it counts whatever its time says, and counts as
// never-ending where it carries none.
type history struct {
	now     time.Time
	safety  measure.Safety
	powered []time.Time     // observations of powered tests, and what the record holds of powered work
	boards  []measure.Board // as found; after the rebuild the rebuilt one, too
}

// historyOf gives the history of a case with what the rule base found to be powered.
func historyOf(c *measure.Case, now time.Time, powered []time.Time) history {
	return history{now: now, safety: c.Safety, powered: slices.Concat(powered, recordedPower(c)), boards: boardsOf(c)}
}

// recordedPower gives the times at which the record says that power was on without naming a test: a stage of the
// bring-up, a dated capture of a scope, and a step of the record that is done under power.
func recordedPower(c *measure.Case) []time.Time {
	var times []time.Time
	for _, s := range c.BringUp {
		times = append(times, s.At)
	}
	for _, e := range c.Steps {
		if step, ok := recordStep(e.Step); ok && step.Work.Need.Powered() && (e.Result == resultDone || e.Result == resultFailed) {
			times = append(times, e.At)
		}
	}
	for _, k := range c.Captures {
		if k.Kind == "scope" && !k.At.IsZero() {
			times = append(times, k.At)
		}
	}
	return times
}

// come tells whether a moment is stated and not in the future.
func (h history) come(at time.Time) bool { return !at.IsZero() && !at.After(h.now) }

// dated says of a time that has not come to be what is wrong with it.
func (h history) dated(at time.Time) string {
	if at.IsZero() {
		return "carries no time"
	}
	moment, _ := clocks(at, h.now)
	return "is dated " + moment + ", in the future"
}

// energised gives the last moment that has come to be at which energy was put in, zero without one. undated tells of a
// moment without a time or in the future: nothing recorded so far can be known to be newer than that.
func (h history) energised() (last time.Time, undated bool) {
	note := func(at time.Time) {
		switch {
		case !h.come(at):
			undated = true
		case at.After(last):
			last = at
		}
	}
	for _, e := range h.safety.Energised {
		note(e.At)
	}
	for _, at := range h.powered {
		note(at)
	}
	return last, undated
}

// sourceSeen gives the last dead check that read AC above DeadVolts: a bank gives no AC, so a source was still
// connected when it was made; nil without one. undated as for energised.
func (h history) sourceSeen() (last *measure.DeadCheck, undated bool) {
	for k := range h.safety.DeadChecks {
		d := &h.safety.DeadChecks[k]
		switch {
		case !above(highestOf(d.AC), DeadVolts):
		case !h.come(d.At):
			undated = true
		case last == nil || !d.At.Before(last.At):
			last = d
		}
	}
	return last, undated
}

// broken gives the last moment at which the board was certainly not cut off: energy put in, or a source seen.
func (h history) broken() (last time.Time, undated bool) {
	last, undated = h.energised()
	seen, seenUndated := h.sourceSeen()
	if seen != nil && seen.At.After(last) {
		last = seen.At
	}
	return last, undated || seenUndated
}

// isolation gives the latest statement that has come to be, a statement of the opposite even if it has not; nil
// without any. Of statements of one moment the later in the file counts.
func (h history) isolation() *measure.Isolation {
	var last *measure.Isolation
	at := func(i *measure.Isolation) time.Time {
		if h.come(i.At) {
			return i.At
		}
		return h.now
	}
	for k := range h.safety.Isolation {
		i := &h.safety.Isolation[k]
		if len(isolationFaults(h.boards, i)) == 0 && !h.come(i.At) {
			continue
		}
		if last == nil || !at(i).Before(at(last)) {
			last = i
		}
	}
	return last
}

// isolatedSince gives the moment from which the board has been cut off without a break: the first sound statement
// after the last energy, the last source seen and the last statement that was not sound, each statement followed by the
// next one before it lapsed. Zero when it is not cut off now.
func (h history) isolatedSince() time.Time {
	from, undated := h.broken()
	if undated {
		return time.Time{}
	}
	var sound []time.Time
	for k := range h.safety.Isolation {
		i := &h.safety.Isolation[k]
		unsound := len(isolationFaults(h.boards, i)) > 0
		come := h.come(i.At)
		switch {
		case unsound && !come:
			return time.Time{}
		case unsound && i.At.After(from):
			from = i.At
		case !unsound && come:
			sound = append(sound, i.At)
		}
	}
	return h.unlapsed(sound, from)
}

// unlapsed gives the first of the statements after a moment from which on none lapsed before the next one, or before
// now; zero when the last one has lapsed.
func (h history) unlapsed(statements []time.Time, from time.Time) time.Time {
	slices.SortFunc(statements, time.Time.Compare)
	var since, last time.Time
	for _, at := range statements {
		if !at.After(from) {
			continue
		}
		if since.IsZero() || lapsed(last, at.In(h.now.Location())) { // days as the one who asks counts them
			since = at
		}
		last = at
	}
	if lapsed(last, h.now) {
		return time.Time{}
	}
	return since
}

// lapsed tells whether a statement of isolation is too old to speak for a moment, or of another day of its calendar.
func lapsed(stated, at time.Time) bool {
	y, m, d := stated.In(at.Location()).Date()
	year, month, day := at.Date()
	return at.Sub(stated) > IsolationLife || y != year || m != month || d != day
}

// link gives whether a shorting link is fitted, and when the last one came off. One whose times contradict each other
// or lie in the future counts as fitted.
func (h history) link() LinkStatus {
	var s LinkStatus
	for _, l := range h.safety.Links {
		switch {
		case l.Removed.IsZero(), l.Removed.After(h.now), l.Removed.Before(l.Fitted):
			s.Fitted, s.Since = true, l.Fitted
		case l.Removed.After(s.Removed):
			s.Removed = l.Removed
		}
	}
	return s
}

// check gives the last dead check at a point that has come to be. A reading from the future does not count for the
// point; against it, it counts unless a later entry of the file has answered it.
func (h history) check(point string) *measure.DeadCheck {
	var last *measure.DeadCheck
	var against *measure.DeadCheck
	for k := range h.safety.DeadChecks {
		d := &h.safety.DeadChecks[k]
		if !samePoint(d.Point, point) {
			continue
		}
		if !h.come(d.At) {
			if above(highest(d), DeadVolts) {
				against = d
			}
			continue
		}
		if against != nil && (last == nil || !d.At.Before(last.At)) {
			against = nil
		}
		if last == nil || !d.At.Before(last.At) {
			last = d
		}
	}
	if against != nil {
		return against
	}
	return last
}

func samePoint(a, b string) bool { return strings.EqualFold(strings.TrimSpace(a), b) }

// highest is the larger of the DC and AC readings, whatever their sign, at the unkind end of their intervals.
func highest(d *measure.DeadCheck) float64 {
	return math.Max(highestOf(d.DC), highestOf(d.AC))
}

// highestOf is the size of one reading at the unkind end of its interval; infinite for what is not a number.
func highestOf(q quantity.Quantity) float64 {
	top := 0.0
	for _, v := range []float64{q.Value, q.Low, q.High} {
		if math.IsNaN(v) {
			return math.Inf(1)
		}
		top = math.Max(top, math.Abs(v))
	}
	return top
}

// above is true for a value that is not a number, too.
func above(value, limit float64) bool { return !(value <= limit) }
