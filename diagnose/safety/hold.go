package safety

import (
	"fmt"
	"strings"
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
	Status  Status
}

// Check tells whether the instruction for this work may be given at the time now, on the safety record of the case and
// what the rule base reads out of its observations. It never errs towards allowing: an unknown need or tool, a time that
// is missing, or one in the future is taken against the step.
func Check(c *measure.Case, w Work, now time.Time, e Evidence) Decision {
	d := Decision{Need: w.Need, Tool: w.Tool, At: now}
	if c == nil {
		d.Missing = []Missing{{0, "there is no case", "start one"}}
		return d
	}
	h := history{now: now, safety: c.Safety, powered: e.Powered}
	d.Status = h.status(c.Board)
	d.Missing = h.missing(w.Need, d.Status)
	d.Allowed = len(d.Missing) == 0
	return d
}

func (h history) missing(need Need, s Status) []Missing {
	switch need {
	case NeedQuestion:
		return nil
	case NeedDeadCheck, NeedDischarge:
		return s.Isolation.Missing
	case NeedDead:
		m := append([]Missing(nil), s.Isolation.Missing...)
		if s.Link.Fitted {
			return append(m, linkMissing(s))
		}
		for _, p := range s.Points {
			m = append(m, p.Missing...)
		}
		return m
	case NeedControlPower, NeedLowBus, NeedFull:
		return poweredMissing(s)
	}
	return []Missing{{0, fmt.Sprintf("no step can need %q", string(need)), "use one of " + needNames()}}
}

func needNames() string {
	var names []string
	for _, n := range Needs() {
		names = append(names, string(n))
	}
	return strings.Join(names, ", ")
}

func linkMissing(s Status) Missing {
	const off = "take the link off and enter it: drivemend safe link CASE removed; then check every store again"
	if s.Link.Since.After(s.At) {
		fitted, _ := clocks(s.Link.Since, s.At)
		return Missing{2, "a shorting link is dated " + fitted + ", in the future: it counts as fitted", "correct its time in the case file, or ask for a later moment; then " + off}
	}
	return Missing{2, "a shorting link has been fitted since " + clock(s.Link.Since) + ": everything would read shorted, and power would go straight into it", off}
}

func poweredMissing(s Status) []Missing {
	m := []Missing{{3, "hold points 3 and 4 (guards, fuse, second person; probe reference) are not kept by this version, so it gives no powered step",
		"nothing unlocks it in this version; powered work follows your own procedure under local rules"}}
	if s.Link.Fitted {
		m = append(m, linkMissing(s))
	}
	return m
}

// OutsideHoldPoint tells what was missing when an observation was made, from the safety history as it stood at that
// moment; nothing when it was made within its hold points. Such a reading is kept, and marked. A question and an
// answer without a reading (skipped, later) are never outside; a reading of a powered test always is as long as this
// version keeps no record of hold point 3.
func OutsideHoldPoint(c *measure.Case, o measure.Observation, w Work, e Evidence) (outside bool, missing []Missing) {
	if w.Need == NeedQuestion || o.Answer != "" {
		return false, nil
	}
	if w.Need.Powered() {
		return true, poweredOutside(c, o.At)
	}
	if o.At.IsZero() || c == nil {
		return true, []Missing{{2, "the reading carries no time, so no dead check can be shown to stand before it", "give the reading its time"}}
	}
	then := *c
	then.Safety, e.Powered = asOf(c.Safety, e.Powered, o.At)
	d := Check(&then, w, o.At, e)
	return !d.Allowed, d.Missing
}

// poweredOutside is what a reading under power lacked at its moment: hold point 3, and 2 where a link was fitted.
func poweredOutside(c *measure.Case, at time.Time) []Missing {
	m := []Missing{{3, "what was asked before power went on is not on record: hold point 3 is not kept by this version",
		"say in the report who stood by, and which fuse and guard were fitted"}}
	if c == nil || at.IsZero() {
		return m
	}
	record, _ := asOf(c.Safety, nil, at)
	if link := (history{now: at, safety: record}).link(); link.Fitted {
		m = append(m, Missing{2, "a shorting link was fitted, since " + clock(link.Since) + ": power went straight into it", "say in the report what became of it, or correct the times of the link"})
	}
	return m
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
func burns(b measure.Board, stores []Store) bool {
	supply, _ := b.Word("supply")
	return supply == "battery" || worstEnergy(stores) >= 100
}
