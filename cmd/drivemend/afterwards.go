package main

import (
	"fmt"
	"strings"
	"time"

	"drivemend/diagnose"
	"drivemend/measure"
)

// afterwards says what stands against an observation that was just kept: that it does not count in the ranking, or
// that it was taken outside its hold point.
func (k *chain) afterwards(r *diagnose.Ranking) []string {
	var lines []string
	last := len(k.c.Observations) - 1
	o := k.c.Observations[last]
	if o.Answer == "" && len(k.served()) == 0 {
		for _, u := range r.Unbound {
			if u.Observation == last {
				lines = append(lines, "kept, but not counted in the ranking: "+k.uncounted(o, u.Why))
			}
		}
	}
	if missing := k.missedAt(o); len(missing) > 0 {
		lines = append(lines, "kept, and marked as taken outside its hold point:")
		for _, m := range missing {
			lines = append(lines, fmt.Sprintf("  point %d: %s", m.Point, m.Text))
		}
	}
	return lines
}

// uncounted is why a reading does not count: where a value of the board is missing, the key of that value and the
// command that states it, else what the ranking says.
func (k *chain) uncounted(o measure.Observation, why string) string {
	t := k.base.Test(o.Test)
	if t == nil || o.Reading == nil {
		return why
	}
	key := uncompared(k.c.Board, t, o.State == "lifted")
	if key == "" {
		return why
	}
	return "it is compared with board." + key + ", which is not stated; state what is fitted: drivemend enter CASE board." + key + " 10k, or enter the result by name: " + strings.Join(resultIDs(t), ", ")
}

// served says of an observation that was just kept, and that a static test of the rebuilt board rests on, whether its
// position has now passed, and what is still open before power. Empty for every other observation.
func (k *chain) served() []string {
	o := k.c.Observations[len(k.c.Observations)-1]
	if o.Answer != "" || !k.c.After(o) {
		return nil
	}
	place := o.Position
	if o.Part != "" {
		place = k.c.Rebuild.Board.PositionOf(o.Part)
	}
	var lines, open []string
	for _, s := range k.evidence().Statics {
		mine := s.Test == o.Test && (place == "" || s.Position == place)
		switch {
		case mine && s.Passed:
			lines = append(lines, "static test \""+s.Title+"\" passed at "+s.Position)
		case mine:
			lines = append(lines, "static test \""+s.Title+"\" still open at "+s.Position+": "+s.Because)
		case !s.Passed:
			open = append(open, s.Title+" at "+s.Position)
		}
	}
	switch {
	case lines == nil:
	case len(open) > 0:
		lines = append(lines, "still to be read before power: "+firstFew(open))
	case len(lines) == 1 && strings.Contains(lines[0], " passed at "):
		lines = append(lines, "every static test of every position has passed; drivemend status CASE says what else power waits for")
	}
	return lines
}

// mostListed bounds a list within a line.
const mostListed = 4

// firstFew joins the first names of a list and says how many more there are.
func firstFew(names []string) string {
	if len(names) <= mostListed {
		return strings.Join(names, ", ")
	}
	return fmt.Sprintf("%s and %d more", strings.Join(names[:mostListed], ", "), len(names)-mostListed)
}

// nowAfter names the readings that count as taken after the rebuild since its time was entered, and how that is mended
// where they were not.
func nowAfter(before, c *measure.Case) []string {
	var names []string
	for _, o := range c.Observations {
		if c.After(o) && !before.After(o) {
			names = append(names, strings.TrimSpace(o.Test+" "+o.Part+o.Position)+" of "+shortClock(o.At, c.Rebuild.Done))
		}
	}
	if len(names) == 0 {
		return nil
	}
	return []string{"taken after the rebuild, from now on: " + counted(len(names), "reading") + " of the record: " + firstFew(names),
		"if they were taken of the board as found, enter the time at which the repair was finished: drivemend enter CASE rebuild.done TIME"}
}

// replaces says which answer the one that was entered last takes the place of.
func replaces(before, c *measure.Case) []string {
	var lines []string
	last := c.Observations[len(c.Observations)-1]
	for i, o := range before.Observations {
		if !c.Superseded(i) || before.Superseded(i) {
			continue
		}
		text := o.Result + o.Answer
		if o.Reading != nil {
			text = o.Reading.Text
		}
		if !o.At.IsZero() {
			text += " of " + shortClock(o.At, last.At)
		}
		lines = append(lines, "replaces "+text+", which stays in the file")
		if o.At.After(last.At) {
			lines = append(lines, "note: it was taken before what it replaces; the one entered last counts")
		}
	}
	return lines
}

// shortClock is a moment as it is told at another one: the time of day alone on the same day.
func shortClock(t, now time.Time) string {
	t = t.In(now.Location())
	if t.Format(time.DateOnly) == now.Format(time.DateOnly) {
		return t.Format("15:04")
	}
	return t.Format("2006-01-02 15:04")
}
