package knowledge

import (
	"fmt"
	"strings"

	"drivemend/measure/quantity"
	"gopkg.in/yaml.v3"
)

// testKeys are the keys of an entry of tests.yaml.
var testKeys = []string{"id", "title", "ask", "how", "instrument", "minutes", "needs", "means", "group", "must",
	"silent", "observes", "pattern_of", "nominal", "present", "absent", "per", "unit", "results", "computed",
	"replaced_by", "answered_by", "used_in", "applies", "cautions", "static", "static_on"}

// usualMinutes stands for a missing `minutes` (judgement); Check reports the gap.
var usualMinutes = map[string]float64{"question": 1, "dead": 5, "control-power": 10, "low-bus": 20, "full": 30}

// test reads one entry of tests.yaml.
func (d *decoder) test(e entry) Test {
	before := len(d.list)
	f := d.fields(e.spot, testKeys...)
	t := Test{ID: e.id, File: e.file, Line: e.line()}
	d.testText(e, f, &t)
	d.testUse(f, &t)
	rows := d.testRows(e, f, &t)
	d.testResults(f, &t, rows)
	d.testLinks(f, &t)
	d.testGaps(f, &t)
	d.testWork(e, f, &t)
	d.testStatic(f, &t)
	rows.at, rows.sound = e.spot, len(d.list) == before
	d.rows[e.id] = rows
	return t
}

// testText reads what a technician is shown.
func (d *decoder) testText(e entry, f map[string]spot, t *Test) {
	t.Title = d.title(e, f, &t.missing)
	t.Ask, t.How = d.text(f["ask"]), d.text(f["how"])
	t.Instrument = d.word(f["instrument"], "instrument", Instruments())
}

// testUse reads when and where the test is done and what it counts for.
func (d *decoder) testUse(f map[string]spot, t *Test) {
	t.Needs = d.word(f["needs"], "board state", Needs())
	t.Minutes = d.minutes(f["minutes"])
	t.Group = d.name(f["group"])
	t.Must = d.yes(f["must"])
	t.Per = d.word(f["per"], "place of a test", []string{"part", "position"})
	t.UsedIn = d.word(f["used_in"], "use", []string{"prior"})
	t.Applies = d.conditions(f["applies"])
	for _, s := range d.items(f["cautions"]) {
		id := d.name(s)
		d.refer(s, KindCaution, id)
		if id != "" {
			t.Cautions = append(t.Cautions, id)
		}
	}
	if f["unit"].given() {
		t.Unit = quantity.Any // after a misspelt unit, so that only this is reported
	}
	if name := d.word(f["unit"], "unit", UnitNames()); name != "" {
		t.Unit = unitNames[name]
	}
}

// testRows reads the rows and reports keys that do not go together.
func (d *decoder) testRows(e entry, f map[string]spot, t *Test) testRows {
	var r testRows
	observes, nominal := f["observes"].given(), f["nominal"].given()
	switch {
	case observes && nominal:
		d.add(f["nominal"], "stands beside observes; a test has rows for an event or a nominal row, not both", "")
	case observes:
		d.need(e.spot, "present", "absent")
		d.forbid(f, "a test with observes has no", "silent", "pattern_of")
	case nominal || f["pattern_of"].given():
		d.need(e.spot, "nominal")
		d.forbid(f, "a test with nominal has no", "present", "absent", "per")
	default:
		d.add(e.spot, "neither observes an event nor has a nominal row", "add observes: with present: and absent:, or nominal:")
	}
	t.Observes, t.PatternOf = d.name(f["observes"]), d.name(f["pattern_of"])
	r.present, r.absent, r.nominal = d.wholeRow(f["present"]), d.wholeRow(f["absent"]), d.wholeRow(f["nominal"])
	if observes {
		t.Present, t.Absent = r.present.bands, r.absent.bands
	} else {
		t.Nominal = r.nominal.bands
	}
	return r
}

// forbid reports keys that have no meaning in this kind of test.
func (d *decoder) forbid(f map[string]spot, why string, keys ...string) {
	for _, k := range keys {
		if f[k].given() {
			d.add(f[k], why+" "+k, "take it out")
		}
	}
}

// testResults reads the results and compares them with the rows: the results of a test are those it lists, or
// else those of its first row.
func (d *decoder) testResults(f map[string]spot, t *Test, rows testRows) {
	first := rows.nominal
	if f["observes"].given() {
		first = rows.present
	}
	before := len(d.list)
	if f["results"].given() {
		t.Results = d.results(f["results"], t.Unit)
	} else {
		for _, id := range first.order {
			t.Results = append(t.Results, Result{ID: id})
		}
	}
	if len(d.list) == before {
		d.numeric(f["unit"], t)
	}
	ids := idsOf(t.Results, func(r *Result) string { return r.ID })
	for _, r := range []row{rows.present, rows.absent, rows.nominal} {
		if r.sound && len(ids) > 0 {
			d.sameResults(r, ids)
		}
	}
	for _, p := range d.pairs(f["means"]) {
		if d.isResult(p.at, p.key, ids) {
			t.Result(p.key).Means = d.text(p.value)
		}
	}
	for _, s := range d.items(f["silent"]) {
		if id := d.name(s); id != "" && d.isResult(s, id, ids) {
			t.Silent = append(t.Silent, id)
		}
	}
}

// sameResults reports results that a row leaves out or invents.
func (d *decoder) sameResults(r row, ids []string) {
	for _, id := range r.order {
		at := spot{r.file, join(r.path, id), keyNode(r.node, id)}
		d.isResult(at, id, ids)
	}
	var left []string
	for _, id := range ids {
		if !contains(r.order, id) {
			left = append(left, id)
		}
	}
	if len(left) > 0 {
		d.add(r.spot, "does not name the results "+strings.Join(left, ", "), "name every result; 0 is allowed")
	}
}

// isResult reports a word that is no result of the test.
func (d *decoder) isResult(s spot, id string, ids []string) bool {
	if contains(ids, id) {
		return true
	}
	hint := suggest(id, ids)
	if hint == "" {
		hint = "results: " + strings.Join(ids, ", ")
	}
	d.add(s, "there is no result "+id+" in this test", hint)
	return false
}

// keyNode gives the node of a key in a group.
func keyNode(n *yaml.Node, key string) *yaml.Node {
	for i := 0; i+1 < len(n.Content); i += 2 {
		if n.Content[i].Value == key {
			return n.Content[i]
		}
	}
	return n
}

// results reads the results of a test: a list of names, or names with median and times, or the word `named` for a
// result that no number stands for.
func (d *decoder) results(s spot, unit quantity.Unit) []Result {
	var list []Result
	if s.node.Kind == yaml.SequenceNode {
		for _, item := range d.items(s) {
			id := d.name(item)
			if id != "" && contains(idsOf(list, func(r *Result) string { return r.ID }), id) {
				d.add(item, "the result "+id+" stands twice", "")
			} else if id != "" {
				list = append(list, Result{ID: id})
			}
		}
		return list
	}
	for _, p := range d.pairs(s) {
		if !kebab.MatchString(p.key) {
			d.add(p.at, "is no id of a result; expected small letters and digits with hyphens between words", "")
			continue
		}
		r := Result{ID: p.key}
		if p.value.node.Value != "named" {
			d.spread(p.value, unit, &r)
		}
		list = append(list, r)
	}
	return list
}

// numeric reports a test with a unit none of whose results says how readings spread.
func (d *decoder) numeric(s spot, t *Test) {
	for _, r := range t.Results {
		if r.Median > 0 || r.Expected != "" {
			return
		}
	}
	if t.Unit != "" {
		d.add(s, "a test with a unit has at least one result with median and times", "write {result: {median: ..., times: ...}}")
	}
}

// spread reads the log-normal spread of the readings of a result.
func (d *decoder) spread(s spot, unit quantity.Unit, r *Result) {
	if unit == "" {
		d.add(s, "gives a reading, but the test has no unit", "add unit:, for instance ohm or volt")
		return
	}
	if s.node.Kind != yaml.MappingNode {
		d.add(s, "is "+describe(s.node)+"; expected {median: ..., times: ...}", "a result that no number stands for is written as the word named")
		return
	}
	f := d.fields(s, "median", "times")
	d.need(s, "median", "times")
	if m := f["median"]; m.given() {
		d.median(m, unit, r)
	}
	if f["times"].given() {
		v, ok := d.number(f["times"])
		if ok && v <= 1 {
			d.add(f["times"], fmt.Sprintf("is %g; expected one sigma as a factor above 1", v), "")
		}
		r.Times = v
	}
}

// median reads a value with its unit or the name of an expected value.
func (d *decoder) median(s spot, unit quantity.Unit, r *Result) {
	text := d.text(s)
	if strings.HasPrefix(text, "expected.") {
		r.Expected = d.figure(s, text, "expected value", unit, Expected())
		return
	}
	if unit == quantity.Any || text == "" {
		return
	}
	q, err := quantity.Parse(text, unit)
	switch {
	case err != nil:
		d.add(s, err.Error(), "")
	case q.Low != q.High:
		d.add(s, "is an interval; expected one value", "the spread goes into times:")
	case q.Value <= 0:
		d.add(s, fmt.Sprintf("%s is not above 0; a log-normal reading needs a positive median", text), "")
	}
	r.Median = q.Value
}

// figure gives a name out of a closed list, whose unit must be that of the test.
func (d *decoder) figure(s spot, name, what string, unit quantity.Unit, list []Figure) string {
	for _, one := range list {
		if one.Name != name {
			continue
		}
		if one.Unit != unit && unit != quantity.Any {
			d.add(s, fmt.Sprintf("%s is in %s, the test in %s", name, unitWord(one.Unit), unitWord(unit)), "")
		}
		return name
	}
	names := figureNames(list)
	d.add(s, fmt.Sprintf("%q is no %s; expected %s", shorten(name), what, strings.Join(names, ", ")), suggest(name, names))
	return ""
}

// unitWord gives the word of tests.yaml for a unit.
func unitWord(unit quantity.Unit) string {
	for _, name := range UnitNames() {
		if unitNames[name] == unit {
			return name
		}
	}
	return "no unit"
}

// testLinks reads what a test observes and what takes its place, and keeps them for the check.
func (d *decoder) testLinks(f map[string]spot, t *Test) {
	d.refer(f["observes"], KindEvent, t.Observes)
	if s := f["computed"]; s.given() {
		t.Computed = d.figure(s, d.text(s), "computed figure", t.Unit, Computed())
	}
	t.ReplacedBy = d.name(f["replaced_by"])
	d.refer(f["replaced_by"], KindTest, t.ReplacedBy)
	t.AnsweredBy = d.answeredBy(f["answered_by"], t)
	if s, id := f["pattern_of"], t.PatternOf; id != "" {
		self := *t
		d.later = append(d.later, func() { d.checkPattern(s, self) })
	}
	if s, id := f["replaced_by"], t.ID; s.given() {
		d.later = append(d.later, func() { d.checkReplacement(s, id) })
	}
}

// answeredBy reads the board key whose words answer the test.
func (d *decoder) answeredBy(s spot, t *Test) *AnsweredBy {
	all := d.pairs(s)
	if !s.given() || s.node.Kind != yaml.MappingNode {
		return nil
	}
	if len(all) != 1 {
		d.add(s, fmt.Sprintf("has %d board keys; expected one", len(all)), "write answered_by: {board.history: {word: result}}")
		return nil
	}
	a := &AnsweredBy{Path: d.boardPath(all[0].at, all[0].key), Results: map[string]string{}}
	ids := idsOf(t.Results, func(r *Result) string { return r.ID })
	for _, p := range d.pairs(all[0].value) {
		word := d.boardWord(p.at, p.key)
		if id := d.text(p.value); id != "" && word != "" && d.isResult(p.value, id, ids) {
			a.Results[word] = id
		}
	}
	return a
}

// testGaps fills what a test may leave out and notes what a reader would miss. A missing board state is taken as
// `dead`, which puts the test behind the hold points, unless the test needs nobody.
func (d *decoder) testGaps(f map[string]spot, t *Test) {
	unattended := t.Computed != "" || t.AnsweredBy != nil
	for _, k := range []string{"needs", "minutes", "instrument", "ask", "how", "means"} {
		if !f[k].given() && !(t.Computed != "" && k != "means") {
			t.missing = append(t.missing, k)
		}
	}
	if t.Needs == "" {
		t.Needs = "dead"
		if unattended {
			t.Needs = "question"
		}
	}
	if t.Minutes == 0 && t.Computed == "" {
		t.Minutes = usualMinutes[t.Needs]
	}
}
