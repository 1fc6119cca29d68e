package knowledge

import (
	"fmt"

	"gopkg.in/yaml.v3"
)

// testStatic reads what makes a test one of those that every position passes before power: the results that pass, and
// the boards it counts on. It runs last, when results and board state are known.
func (d *decoder) testStatic(f map[string]spot, t *Test) {
	s := f["static"]
	t.StaticOn = d.conditions(f["static_on"])
	if !s.given() {
		if f["static_on"].given() {
			d.add(f["static_on"], "stands without static", "name the results that pass: static: [result]")
		}
		return
	}
	ids := idsOf(t.Results, func(r *Result) string { return r.ID })
	for _, item := range d.items(s) {
		id := d.name(item)
		switch {
		case id == "":
		case contains(t.Static, id):
			d.add(item, "the result "+id+" stands twice", "")
		case d.isResult(item, id, ids):
			t.Static = append(t.Static, id)
		}
	}
	d.soundStatic(s, t, len(ids))
}

// soundStatic reports a static test that could not hold back power.
func (d *decoder) soundStatic(s spot, t *Test, results int) {
	switch {
	case t.Needs != "dead":
		d.add(s, fmt.Sprintf("a static test is done on a dead board, this one needs %s", t.Needs), "take static out")
	case t.Observes == "" || t.Computed != "" || t.AnsweredBy != nil:
		d.add(s, "a static test is a reading at the board: it has observes, and neither computed nor answered_by", "take static out")
	case s.node.Kind == yaml.SequenceNode && len(s.node.Content) == 0:
		d.add(s, "names no result that passes", "name at least one, or take static out")
	case results > 0 && len(t.Static) == results:
		d.add(s, "names every result, so the test could never fail", "name only those that pass")
	}
}

// StaticFor tells whether every position of a board passes this test before power; lookup is that of Applies, which
// decides beside it whether the board has the test at all.
func (t *Test) StaticFor(lookup func(path string) (word string, number float64, known bool)) bool {
	return len(t.Static) > 0 && Applies(t.StaticOn, lookup)
}

// Passes tells whether a result of a static test is one that passes.
func (t *Test) Passes(result string) bool { return contains(t.Static, result) }
