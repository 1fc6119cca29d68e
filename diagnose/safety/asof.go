package safety

import (
	"time"

	"drivemend/measure"
)

// AsOf gives a case as its record stood at a moment: what is stated, checked, observed, done or rebuilt later is left
// out. What carries no time has always happened. The case itself is not changed; nil gives nil.
func AsOf(c *measure.Case, at time.Time) *measure.Case {
	if c == nil {
		return nil
	}
	then := *c
	then.Safety = safetyAsOf(c.Safety, at)
	then.Observations = upTo(at, c.Observations, func(o measure.Observation) time.Time { return o.At })
	then.Steps = upTo(at, c.Steps, func(s measure.StepEntry) time.Time { return s.At })
	then.Captures = upTo(at, c.Captures, func(k measure.Capture) time.Time { return k.At })
	then.BringUp = upTo(at, c.BringUp, func(s measure.Stage) time.Time { return s.At })
	if c.Rebuild != nil && c.Rebuild.Done.After(at) {
		rebuild := *c.Rebuild
		rebuild.Done = time.Time{}
		then.Rebuild = &rebuild
	}
	return &then
}

func safetyAsOf(s measure.Safety, at time.Time) measure.Safety {
	out := measure.Safety{
		Isolation:  upTo(at, s.Isolation, func(i measure.Isolation) time.Time { return i.At }),
		DeadChecks: upTo(at, s.DeadChecks, func(d measure.DeadCheck) time.Time { return d.At }),
		Links:      upTo(at, s.Links, earlier),
		Energised:  upTo(at, s.Energised, func(e measure.Energised) time.Time { return e.At }),
		Before:     upTo(at, s.Before, func(b measure.Before) time.Time { return b.At }),
	}
	for k := range out.Links {
		if out.Links[k].Removed.After(at) {
			out.Links[k].Removed = time.Time{}
		}
	}
	return out
}

// earlier is when a link is first spoken of. One that came off before it was fitted contradicts itself, and stands
// against the board from then on.
func earlier(l measure.Link) time.Time {
	if !l.Removed.IsZero() && l.Removed.Before(l.Fitted) {
		return l.Removed
	}
	return l.Fitted
}

// upTo gives a new list of the entries that do not lie after a moment.
func upTo[T any](at time.Time, entries []T, when func(T) time.Time) []T {
	var out []T
	for _, e := range entries {
		if !when(e).After(at) {
			out = append(out, e)
		}
	}
	return out
}

// evidenceAsOf keeps of the evidence what had been read by a moment. The static tests are taken as they stand in the
// evidence: one that rests on a later reading is not passed yet.
func evidenceAsOf(e Evidence, at time.Time) Evidence {
	out := Evidence{Powered: upTo(at, e.Powered, func(p time.Time) time.Time { return p })}
	for _, s := range e.Statics {
		if s.Passed && s.At.After(at) {
			s.Passed, s.Because = false, "read only at "+clock(s.At)
		}
		out.Statics = append(out.Statics, s)
	}
	out.Failing = upTo(at, e.Failing, func(s Static) time.Time { return s.At })
	out.Mended = upTo(at, e.Mended, func(m Mended) time.Time { return m.At })
	return out
}

// without takes one entry of a moment out of a list: the energy that a reading puts in does not speak against itself.
func without(times []time.Time, at time.Time) []time.Time {
	for k, t := range times {
		if t.Equal(at) {
			return append(append([]time.Time(nil), times[:k]...), times[k+1:]...)
		}
	}
	return times
}
