package knowledge

import (
	"fmt"
	"slices"
	"strings"
)

// keptKey is a key that a test keeps from the one it takes the place of: the hold points rest on it.
type keptKey struct {
	key    string
	static bool // kept only where the test below is a static one
	wider  bool // may be left out, so that it holds for more boards
	of     func(t *Test) string
}

var keptKeys = []keptKey{
	{key: "needs", of: func(t *Test) string { return t.Needs }},
	{key: "instrument", of: func(t *Test) string { return t.Instrument }},
	{key: "observes", static: true, of: func(t *Test) string { return t.Observes }},
	{key: "per", static: true, of: func(t *Test) string { return t.Per }},
	{key: "unit", static: true, of: func(t *Test) string { return unitWord(t.Unit) }},
	{key: "results", static: true, of: resultsText},
	{key: "applies", static: true, wider: true, of: func(t *Test) string { return conditionsText(t.Applies) }},
	{key: "static_on", static: true, wider: true, of: func(t *Test) string { return conditionsText(t.StaticOn) }},
}

// under decodes an entry that another one has taken the place of. What is wrong with it is nobody's concern any more.
func under() *decoder { return newDecoder(&collector{}) }

// keepsTest reports a test that would let a step past a hold point before which the test below it stood: it keeps what
// decides which hold points those are, and a static test stays as hard to pass.
func (d *decoder) keepsTest(e, below entry, t *Test) {
	old := under().test(below)
	for _, k := range keptKeys {
		got, want := k.of(t), k.of(&old)
		if got == want || k.static && len(old.Static) == 0 || k.wider && got == "" {
			continue
		}
		d.changed(d.place(e.spot, k.key), k.key, got, want, below.asTest()+"; the hold points rest on it", "leave it as it is there, or give the test an id of its own")
	}
	d.keepsStatic(e, below, t, &old)
	d.keepsLean(e, below, t, &old)
	for _, c := range old.Cautions {
		if !contains(t.Cautions, c) {
			d.add(d.place(e.spot, "cautions"), "lacks the caution "+c+" of "+below.asTest(), "add it under cautions:; more may stand beside it")
		}
	}
}

// changed reports a key that is not what it was. Where the key is absent the place is the entry, and the key is named.
func (d *decoder) changed(s spot, key, got, want, whose, hint string) {
	lead := "is "
	if !strings.HasSuffix(s.path, "."+key) {
		lead = key + " is "
	}
	d.add(s, lead+orNone(got)+", but "+orNone(want)+" in "+whose, hint)
}

// asTest names a test that another one takes the place of.
func (e entry) asTest() string {
	return fmt.Sprintf("the test it replaces (%s, line %d)", e.file, e.line())
}

// keepsStatic reports passing results that were dropped, or that did not pass before.
func (d *decoder) keepsStatic(e, below entry, t, old *Test) {
	if len(old.Static) == 0 {
		return
	}
	from, pass := below.asTest(), strings.Join(old.Static, ", ")
	if len(t.Static) == 0 {
		d.add(d.place(e.spot, "static"), "has no result that passes before power, but "+from+" is one that every position passes", "write static: ["+pass+"]")
	}
	for _, id := range t.Static {
		if !contains(old.Static, id) {
			d.add(d.place(e.spot, "static"), "lets "+id+" pass before power, but "+from+" does not", "allowed: "+pass+", or fewer of them")
		}
	}
}

// keepsLean reports a result of a dead test that spoke for the fault and does so no more: after the rebuild such a
// reading holds back power.
func (d *decoder) keepsLean(e, below entry, t, old *Test) {
	if old.Needs != "dead" || old.Observes == "" {
		return
	}
	for _, r := range old.Results {
		now, stays := t.Present[r.ID]
		if stays && old.Present[r.ID].Mid > old.Absent[r.ID].Mid && now.Mid <= t.Absent[r.ID].Mid {
			d.add(d.place(e.spot, "present"), "makes "+r.ID+" speak against "+t.Observes+", but it speaks for the fault in "+below.asTest(),
				"give it more under present: than under absent:")
		}
	}
}

// keepsEvent reports an event that would hold for fewer boards than the one below it, and with it the static tests that
// observe it. It runs when all tests are known.
func (d *decoder) keepsEvent(e, below entry, layer Layer) {
	static := slices.IndexFunc(d.base.Tests, func(t Test) bool { return t.Observes == e.id && len(t.Static) > 0 })
	now := d.base.Event(e.id)
	if static < 0 || now == nil {
		return
	}
	old := under().event(below, layer)
	if got, want := conditionsText(now.Applies), conditionsText(old.Applies); got != "" && got != want {
		d.changed(d.place(e.spot, "applies"), "applies", got, want, fmt.Sprintf("the entry it replaces (%s, line %d); the static test %s before power rests on it",
			below.file, below.line(), d.base.Tests[static].ID), "leave it as it is there, or leave it out")
	}
}

// conditionsText writes conditions out; "" for none.
func conditionsText(list []Condition) string {
	texts := make([]string, len(list))
	for i, c := range list {
		texts[i] = c.Path + " " + strings.Join(c.Words, ", ")
		if c.Op != "" {
			texts[i] = strings.TrimSpace(fmt.Sprintf("%s %s %g %s", c.Path, c.Op, c.Number, c.Unit))
		}
	}
	return strings.Join(texts, "; ")
}

// resultsText writes out what the results of a test read.
func resultsText(t *Test) string {
	texts := make([]string, len(t.Results))
	for i, r := range t.Results {
		texts[i] = r.ID
		switch {
		case r.Expected != "":
			texts[i] += fmt.Sprintf(" %s times %g", r.Expected, r.Times)
		case r.Median > 0:
			texts[i] += fmt.Sprintf(" %g times %g", r.Median, r.Times)
		}
	}
	return strings.Join(texts, "; ")
}

func orNone(text string) string {
	if text == "" {
		return "not given"
	}
	return text
}
