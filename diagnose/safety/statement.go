package safety

import (
	"slices"
	"strings"
	"time"

	"drivemend/measure"
)

// stepTitles name in plain words what conditions are stated before.
var stepTitles = map[string]string{
	measure.BeforeControlPower: "control power",
	measure.BeforeLowBus:       "a current-limited bus",
	measure.BeforeFull:         "the full bus",
	measure.BeforeDoublePulse:  "a double pulse",
	measure.BeforeInjection:    "an injection",
	measure.BeforeInsulation:   "the insulation tester",
	measure.BeforeScope:        "a scope step",
}

// stepPoint is the hold point that asks for the statement.
func stepPoint(step string) int {
	if step == measure.BeforeScope || step == measure.BeforeInjection {
		return 4
	}
	return 3
}

// underPower tells whether a statement is made for a step that puts power on.
func underPower(step string) bool {
	return slices.Contains(poweredSteps, step) || step == measure.BeforeDoublePulse
}

// statementOf gives the newest statement before a step, and whether it lacks something. One that lacks something counts
// whatever its time says, and of two of one moment it is the one that counts; a full one counts once its time has come.
func (s scene) statementOf(step string) (last *measure.Before, lacks bool) {
	last = counting(s.now, s.safety.Before, func(b *measure.Before) (time.Time, int) {
		switch {
		case b.Step != step:
			return b.At, notOfThis
		case len(s.faults(*b)) > 0:
			return b.At, 1
		}
		return b.At, 0
	})
	return last, last != nil && len(s.faults(*last)) > 0
}

// notOfThis is the weight of an entry about something else.
const notOfThis = -1

// counting gives the entry of a list that counts at a moment, nil without one. Each has its time, and a weight against
// the board: 0 speaks for it and counts once its time has come; what is heavier counts whatever its time says, as of now
// where that has not come. The newest counts, of one moment the heaviest, of equal ones the later in the file.
func counting[T any](now time.Time, list []T, weigh func(*T) (at time.Time, against int)) *T {
	var last *T
	var lastAt time.Time
	heaviest := 0
	for k := range list {
		at, against := weigh(&list[k])
		come := !at.IsZero() && !at.After(now)
		if against == notOfThis || against == 0 && !come {
			continue
		}
		if !come {
			at = now
		}
		if last == nil || at.After(lastAt) || at.Equal(lastAt) && against >= heaviest {
			last, lastAt, heaviest = &list[k], at, against
		}
	}
	return last
}

// openBefore says what is missing of the statement before a step.
func (s scene) openBefore(step string) []Missing {
	b, lacks := s.statementOf(step)
	point := stepPoint(step)
	title := stepTitles[step]
	if b == nil {
		return []Missing{{point, "nothing is stated that counts before " + title + ": it takes " + s.needed(step) + s.notYet(step),
			"look at each of them, then state what holds: " + s.command(step, measure.Before{})}}
	}
	var m []Missing
	if !s.come(b.At) {
		m = append(m, Missing{point, "the statement before " + title + " " + s.dated(b.At) + ", and it lacks something: that counts against the step",
			"correct its time in the case file, then state everything anew: " + s.command(step, *b)})
	} else if old := s.stale(b); old != "" {
		m = append(m, Missing{point, "what was stated before " + title + " " + old, "look at everything again and state it anew: " + s.command(step, *b)})
	}
	if lacks {
		m = append(m, s.lack(step, *b))
	}
	return m
}

// lack puts what a statement lacks in one line, since one command states it all anew.
func (s scene) lack(step string, b measure.Before) Missing {
	var texts, dos []string
	for _, f := range s.faults(b) {
		texts, dos = append(texts, f.text), append(dos, f.do)
	}
	return Missing{stepPoint(step), "before " + stepTitles[step] + ": " + strings.Join(texts, "; "),
		strings.Join(dos, "; ") + "; then state everything anew: " + s.command(step, b)}
}

// notYet names a full statement that does not count because of its time; "" without one.
func (s scene) notYet(step string) string {
	for _, b := range s.safety.Before {
		if b.Step == step && !s.come(b.At) {
			return "; the statement on record " + s.dated(b.At) + ", and does not count before its time"
		}
	}
	return ""
}

// barrier is something after which conditions have to be looked at again.
type barrier struct {
	at   time.Time
	name string
}

// stale says why a statement is too old to speak; "" when it is not. It lives like an isolation, and only until the
// next one; a statement for power also ends at a link and at the rebuild. One of the very moment does not count, for the
// order cannot be told.
func (s scene) stale(b *measure.Before) string {
	if lapsed(b.At, s.now) {
		return "at " + clock(b.At) + " is " + hours(s.now.Sub(b.At)) + " old: it speaks for " + hours(IsolationLife) + ", and for its own day"
	}
	for _, bar := range s.barriers(b.Step) {
		if !b.At.After(bar.at) {
			made, since := clocks(b.At, bar.at)
			return "at " + made + " is not newer than " + bar.name + " of " + since
		}
	}
	return ""
}

func (s scene) barriers(step string) []barrier {
	var out []barrier
	for _, i := range s.safety.Isolation {
		at := i.At
		if at.IsZero() { // nothing can be known to be newer
			at = s.now
		}
		out = append(out, barrier{at, "the isolation"})
	}
	if !underPower(step) {
		return out
	}
	for _, l := range s.safety.Links {
		out = append(out, barrier{l.Fitted, "the fitting of the link"}, barrier{l.Removed, "the taking off of the link"})
	}
	return append(out, barrier{s.done, "the rebuild"}, barrier{s.failedUnderPower(), "the step under power that failed, entered with the time"})
}

// failedUnderPower is the last moment at which a step under power failed, zero without one: what was proved and stated
// before it may no longer be so. One of the future, or without a time, has failed now.
func (s scene) failedUnderPower() time.Time {
	var last time.Time
	for _, e := range s.steps {
		step, ok := recordStep(e.Step)
		if !ok || !step.Work.Need.Powered() || e.Result != resultFailed {
			continue
		}
		at := e.At
		if !s.come(at) {
			at = s.now
		}
		if at.After(last) {
			last = at
		}
	}
	return last
}
