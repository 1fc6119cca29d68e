package knowledge

import (
	"fmt"
	"math"
	"strings"
)

// crossCheck judges what takes the whole base: named ids, rows of causes, patterns, loops. Last it puts the
// events in order.
func (d *decoder) crossCheck() {
	for _, check := range d.later {
		check()
	}
	if len(d.base.Causes) == 0 && len(d.list) == 0 {
		d.add(spot{file: "causes.yaml"}, "the rule base has no cause", "")
	}
	d.orderEvents()
}

// oneLayer reports an event whose id another layer has too.
func (d *decoder) oneLayer(e entry, layer Layer) {
	for _, other := range d.base.Events {
		if other.ID != e.id {
			continue
		}
		if other.Layer != layer {
			d.add(e.spot, fmt.Sprintf("the id is already that of a %s (%s, line %d)", other.Layer, other.File, other.Line), "give one of the two another id")
		}
		return
	}
}

// checkAnswer compares the row of a cause with the nominal row it changes.
func (d *decoder) checkAnswer(p pair, r row) {
	id, at := p.key, p.at
	if !d.exists(at, KindTest, id) || !d.rows[id].sound || !r.sound {
		return
	}
	t := d.base.Test(id)
	if t.Observes != "" {
		d.add(at, fmt.Sprintf("the test %s observes %s; a cause can only answer a nominal test", id, t.Observes), "use leads_to: for "+t.Observes)
		return
	}
	results := idsOf(t.Results, func(r *Result) string { return r.ID })
	left := 0.0 // default mass that takes up the rest
	for _, result := range results {
		if !contains(r.order, result) && !contains(t.Silent, result) {
			left += t.Nominal[result].Mid
		}
	}
	for _, result := range r.order {
		key := spot{r.file, join(r.path, result), keyNode(r.node, result)}
		if d.isResult(key, result, results) && contains(t.Silent, result) {
			d.add(key, "the result "+result+" is silent: no cause changes it", "take it out")
		}
	}
	switch sum := r.sum(); {
	case sum > 1+sumTolerance:
		d.add(r.spot, fmt.Sprintf("the middle values sum to %.7g; expected at most 1", sum), "")
	case left == 0 && math.Abs(sum-1) > sumTolerance:
		d.add(r.spot, fmt.Sprintf("the middle values sum to %.7g, and no other result can take up the rest; expected 1", sum), "")
	}
}

// checkPattern reports a pattern test whose part test or results do not fit.
func (d *decoder) checkPattern(s spot, t Test) {
	if !d.exists(s, KindTest, t.PatternOf) || !d.rows[t.PatternOf].sound {
		return
	}
	part := d.base.Test(t.PatternOf)
	event := d.base.Event(part.Observes)
	switch {
	case part.Observes == "" || part.Per != "part":
		d.add(s, t.PatternOf+" is no test of single parts; expected one with observes: and per: part", "")
	case event != nil && event.Of != "switch":
		d.add(s, fmt.Sprintf("%s observes %s, which is no fault with of: switch", t.PatternOf, event.ID), "")
	}
	for i := range d.base.Tests {
		other := &d.base.Tests[i]
		if other.ID == t.ID {
			break
		}
		if other.PatternOf == t.PatternOf {
			d.add(s, "the test "+other.ID+" already gives the pattern of "+t.PatternOf, "")
		}
	}
	for _, id := range d.rows[t.ID].nominal.order {
		if !contains(Patterns(), id) {
			at := spot{s.file, t.ID + ".nominal." + id, keyNode(d.rows[t.ID].nominal.node, id)}
			d.add(at, id+" is no pattern; expected "+strings.Join(Patterns(), ", "), suggest(id, Patterns()))
		}
	}
}

// checkReplacement reports a chain of replacements that comes back to its start.
func (d *decoder) checkReplacement(s spot, id string) {
	seen := map[string]bool{}
	for t := d.base.Test(id); t != nil && t.ReplacedBy != "" && !seen[t.ID]; t = d.base.Test(t.ReplacedBy) {
		seen[t.ID] = true
		if t.ReplacedBy == id {
			d.add(s, "the replacements come back to "+id, "only the better test has no replaced_by")
			return
		}
	}
}

// orderEvents sorts the events so that parents stand before their children, otherwise as they were: always the
// first event of the list whose parents are all placed. A loop is reported.
func (d *decoder) orderEvents() {
	events := d.base.Events
	waiting := map[string]int{} // parents not yet placed
	for _, e := range events {
		for _, l := range e.LeadsTo {
			waiting[l.To]++
		}
	}
	ordered := make([]Event, 0, len(events))
	placed := map[string]bool{}
	for len(ordered) < len(events) {
		next := -1
		for i, e := range events {
			if !placed[e.ID] && waiting[e.ID] == 0 {
				next = i
				break
			}
		}
		if next < 0 {
			d.reportLoop(events, placed)
			return
		}
		placed[events[next].ID] = true
		ordered = append(ordered, events[next])
		for _, l := range events[next].LeadsTo {
			waiting[l.To]--
		}
	}
	d.base.Events = ordered
}

// reportLoop follows the parents of an event that cannot be placed until one comes again.
func (d *decoder) reportLoop(events []Event, placed map[string]bool) {
	parent := func(id string) string {
		for _, e := range events {
			for _, l := range e.LeadsTo {
				if l.To == id && !placed[e.ID] {
					return e.ID
				}
			}
		}
		return ""
	}
	var at string
	for _, e := range events {
		if !placed[e.ID] {
			at = e.ID
			break
		}
	}
	var trail []string
	for at != "" && !contains(trail, at) {
		trail = append(trail, at)
		at = parent(at)
	}
	if at == "" {
		return
	}
	loop := []string{at}
	for i := len(trail) - 1; i >= 0; i-- {
		loop = append(loop, trail[i])
		if trail[i] == at {
			break
		}
	}
	d.add(d.links[loop[0]+" "+loop[1]], "the links form a loop: "+strings.Join(loop, " -> "), "an event cannot bring itself about")
}
