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
	powered []time.Time // observations of powered tests
}

// energised gives the last moment that has come to be at which energy was put in, zero without one. undated tells of a
// moment without a time or in the future: nothing recorded so far can be known to be newer than that.
func (h history) energised() (last time.Time, undated bool) {
	note := func(at time.Time) {
		switch {
		case at.IsZero() || at.After(h.now):
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
		case d.At.IsZero() || d.At.After(h.now):
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
func (h history) isolation(b measure.Board) *measure.Isolation {
	var last *measure.Isolation
	at := func(i *measure.Isolation) time.Time {
		if i.At.IsZero() || i.At.After(h.now) {
			return h.now
		}
		return i.At
	}
	for k := range h.safety.Isolation {
		i := &h.safety.Isolation[k]
		if len(isolationFaults(b, i)) == 0 && (i.At.IsZero() || i.At.After(h.now)) {
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
func (h history) isolatedSince(b measure.Board) time.Time {
	from, undated := h.broken()
	if undated {
		return time.Time{}
	}
	var sound []time.Time
	for k := range h.safety.Isolation {
		i := &h.safety.Isolation[k]
		unsound := len(isolationFaults(b, i)) > 0
		come := !i.At.IsZero() && !i.At.After(h.now)
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
		if since.IsZero() || lapsed(last, at) {
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
		if d.At.IsZero() || d.At.After(h.now) {
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

// asOf keeps what had happened by a moment; what carries no time has always happened if it speaks against.
func asOf(s measure.Safety, powered []time.Time, at time.Time) (measure.Safety, []time.Time) {
	var out measure.Safety
	for _, i := range s.Isolation {
		if !i.At.After(at) {
			out.Isolation = append(out.Isolation, i)
		}
	}
	for _, d := range s.DeadChecks {
		if !d.At.After(at) {
			out.DeadChecks = append(out.DeadChecks, d)
		}
	}
	for _, l := range s.Links {
		if l.Fitted.After(at) {
			continue
		}
		if l.Removed.After(at) {
			l.Removed = time.Time{}
		}
		out.Links = append(out.Links, l)
	}
	for _, e := range s.Energised {
		if !e.At.After(at) {
			out.Energised = append(out.Energised, e)
		}
	}
	var before []time.Time
	for _, p := range powered {
		if !p.After(at) {
			before = append(before, p)
		}
	}
	return out, before
}
