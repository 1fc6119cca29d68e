package knowledge

import (
	"fmt"
	"strings"
)

// Check gives what a sound base should still have: titles, questions, how-to, meanings, something that leads to
// every event, a use for every repair and source, conditions that a board can state. None of it keeps the base from working. The order is
// that of the lists; there is no upper limit.
func (b *Base) Check() Problems {
	c := &collector{}
	b.checkCauses(c)
	b.checkEvents(c)
	b.checkTests(c)
	b.checkUse(c)
	return c.list
}

// warn adds a warning about an entry.
func (c *collector) warn(file string, line int, id, message, hint string) {
	p := Problem{File: file, Line: line, Key: id, Message: message, Hint: hint}
	if line > 0 {
		p.Column = 1
	}
	c.list = append(c.list, p)
}

// warnMissing adds one warning for all the keys an entry should have.
func (c *collector) warnMissing(file string, line int, id string, keys []string) {
	if len(keys) > 0 {
		c.warn(file, line, id, "has no "+strings.Join(keys, ", "), "")
	}
}

func (b *Base) checkCauses(c *collector) {
	if len(b.Unlisted) == 0 {
		c.warn("causes.yaml", 0, "", "the entry unlisted is missing: the base can never say that none of its causes fits", "add {id: unlisted, share: {...}}")
	}
	for _, e := range b.Causes {
		c.warnMissing(e.File, e.Line, e.ID, e.missing)
		c.checkConditions(e.File, e.Line, e.ID, e.Applies)
		if b.Event(e.ID) != nil {
			c.warn(e.File, e.Line, e.ID, "a cause and a "+string(b.Event(e.ID).Layer)+" have the same id", "a technician who asks for it cannot tell which is meant")
		}
	}
}

func (b *Base) checkEvents(c *collector) {
	led, seen := map[string]bool{}, map[string]bool{}
	for _, e := range b.Causes {
		noteTargets(led, e.LeadsTo)
	}
	for _, e := range b.Events {
		noteTargets(led, e.LeadsTo)
	}
	for _, t := range b.Tests {
		seen[t.Observes] = true
	}
	for _, e := range b.Events {
		c.warnMissing(e.File, e.Line, e.ID, e.missing)
		c.checkConditions(e.File, e.Line, e.ID, e.Applies)
		if !led[e.ID] {
			c.warn(e.File, e.Line, e.ID, "no cause and no event leads to it", "add it under leads_to: of what brings it about")
		}
		if !seen[e.ID] && len(e.LeadsTo) == 0 {
			c.warn(e.File, e.Line, e.ID, "no test observes it and it leads to nothing, so it cannot matter", "")
		}
	}
}

func noteTargets(led map[string]bool, links []Link) {
	for _, l := range links {
		led[l.To] = true
	}
}

func (b *Base) checkTests(c *collector) {
	for _, t := range b.Tests {
		c.warnMissing(t.File, t.Line, t.ID, t.missing)
		c.checkConditions(t.File, t.Line, t.ID, t.Applies)
		c.checkConditions(t.File, t.Line, t.ID, t.StaticOn)
		c.checkAnsweredBy(t)
		var plain []string
		for _, r := range t.Results {
			if r.Means == "" {
				plain = append(plain, r.ID)
			}
		}
		if len(plain) > 0 && !contains(t.missing, "means") {
			c.warn(t.File, t.Line, t.ID, "does not say what these results mean: "+strings.Join(plain, ", "), "add them under means:")
		}
		if e := b.Event(t.Observes); t.Per == "part" && e != nil && e.Of != "switch" {
			c.warn(t.File, t.Line, t.ID, fmt.Sprintf("is done on every part, but %s is no fault with of: switch", e.ID), "its readings would all speak for one event")
		}
		if t.Nominal != nil && t.UsedIn == "" && t.PatternOf == "" && !b.answered(t.ID) {
			c.warn(t.File, t.Line, t.ID, "no cause answers it, so its result changes nothing", "name it under answers: of a cause")
		}
	}
}

// answered tells whether a cause changes the row of a nominal test.
func (b *Base) answered(test string) bool {
	for _, e := range b.Causes {
		if e.Answers[test] != nil {
			return true
		}
	}
	return false
}

// checkUse warns of repairs, cautions and sources that nothing names.
func (b *Base) checkUse(c *collector) {
	used := b.used()
	for _, e := range b.Repairs {
		if !used[string(KindRepair)+e.ID] {
			c.warn(e.File, e.Line, e.ID, "no cause and no fault names this repair", "")
		}
		if len(e.Steps) == 0 {
			c.warn(e.File, e.Line, e.ID, "has no steps", "")
		}
	}
	for _, e := range b.Sources {
		if !used[string(KindSource)+e.ID] {
			c.warn(e.File, e.Line, e.ID, "no number names this source", "")
		}
	}
}

// used gives the repairs and sources that are named, by kind and id.
func (b *Base) used() map[string]bool {
	used := map[string]bool{}
	source := func(band Band) { used[string(KindSource)+band.Source] = true }
	rows := func(rows ...map[string]Band) {
		for _, r := range rows {
			for _, band := range r {
				source(band)
			}
		}
	}
	links := func(list []Link) {
		for _, l := range list {
			source(l.P)
		}
	}
	rows(b.Unlisted)
	for _, e := range b.Causes {
		used[string(KindRepair)+e.Repair] = true
		links(e.LeadsTo)
		rows(e.Share)
		for _, r := range e.Answers {
			rows(r)
		}
	}
	for _, e := range b.Events {
		used[string(KindRepair)+e.Repair] = true
		links(e.LeadsTo)
		source(e.Leak)
	}
	for _, t := range b.Tests {
		rows(t.Nominal, t.Present, t.Absent)
	}
	for _, e := range b.Cautions {
		used[string(KindSource)+e.Source] = true
	}
	return used
}
