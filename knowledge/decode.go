package knowledge

import (
	"fmt"
	"strings"

	"gopkg.in/yaml.v3"
)

// decoder turns merged entries into a base. What needs the whole base to be judged is kept for crossCheck.
type decoder struct {
	*collector
	base  *Base
	later []func()
	links map[string]spot       // places of the links between events, by "from to"
	meant map[*yaml.Node]string // for a misspelt key, the one that is near
	rows  map[string]testRows   // by test id
}

// testRows are the rows of a test with their places.
type testRows struct {
	at              spot
	nominal         row
	present, absent row
	sound           bool // nothing was reported while the test was decoded
}

func newDecoder(faults *collector) *decoder {
	return &decoder{collector: faults, base: &Base{}, links: map[string]spot{}, meant: map[*yaml.Node]string{}, rows: map[string]testRows{}}
}

// decode fills the base from the lists in their order.
func (d *decoder) decode(m *merge) {
	for _, e := range m.entries["causes"] {
		if e.id == "unlisted" {
			d.unlisted(e)
			continue
		}
		d.base.Causes = append(d.base.Causes, d.cause(e))
	}
	for _, l := range []struct {
		list  string
		layer Layer
	}{{"stresses", Stress}, {"faults", Fault}, {"signs", Sign}} {
		for _, e := range m.entries[l.list] {
			d.base.Events = append(d.base.Events, d.event(e, l.layer))
			if below, replaces := m.below[l.list+" "+e.id]; replaces {
				d.later = append(d.later, func() { d.keepsEvent(e, below, l.layer) })
			}
		}
	}
	for _, e := range m.entries["tests"] {
		t := d.test(e)
		if below, replaces := m.below["tests "+e.id]; replaces && d.rows[e.id].sound {
			d.keepsTest(e, below, &t)
		}
		d.base.Tests = append(d.base.Tests, t)
	}
	for _, e := range m.entries["repairs"] {
		d.base.Repairs = append(d.base.Repairs, d.repair(e))
	}
	for _, e := range m.entries["cautions"] {
		d.base.Cautions = append(d.base.Cautions, d.caution(e))
	}
	for _, e := range m.entries["sources"] {
		d.base.Sources = append(d.base.Sources, d.source(e))
	}
}

// refer keeps a named id for the check that its entry exists.
func (d *decoder) refer(s spot, kind Kind, id string) {
	if id == "" {
		return
	}
	d.later = append(d.later, func() { d.exists(s, kind, id) })
}

// exists reports an id that no entry has.
func (d *decoder) exists(s spot, kind Kind, id string) bool {
	if d.base.has(kind, id) {
		return true
	}
	what := map[Kind]string{KindEvent: "stress, fault or sign"}[kind]
	if what == "" {
		what = string(kind)
	}
	d.add(s, "there is no "+what+" "+id, suggest(id, d.base.IDs(kind)))
	return false
}

// title gives the stated title, or the id with spaces for hyphens when there is none.
func (d *decoder) title(e entry, f map[string]spot, missing *[]string) string {
	if !f["title"].given() {
		*missing = append(*missing, "title")
		return strings.ReplaceAll(e.id, "-", " ")
	}
	return d.text(f["title"])
}

// shares reads the share of a cause by setting.
func (d *decoder) shares(s spot) map[string]Band {
	f := d.fields(s, Settings()...)
	shares := map[string]Band{}
	for _, setting := range Settings() {
		if b, ok := d.share(f[setting]); ok {
			shares[setting] = b
		}
	}
	if s.given() && s.node.Kind == yaml.MappingNode {
		d.need(s, "dc", "mains", "repeat")
	}
	return shares
}

// factors reads what service does to the share of a cause: any number of 0 and up.
func (d *decoder) factors(s spot) map[string]float64 {
	var factors map[string]float64
	f := d.fields(s, Services()...)
	for _, service := range Services() {
		if !f[service].given() {
			continue
		}
		v, ok := d.number(f[service])
		if ok && v < 0 {
			d.add(f[service], fmt.Sprintf("is %g; expected a factor of 0 and up", v), "")
		}
		if factors == nil {
			factors = map[string]float64{}
		}
		factors[service] = v
	}
	return factors
}

// unlisted reads the entry that stands for every cause the base does not know.
func (d *decoder) unlisted(e entry) {
	f := d.fields(e.spot, "id", "share", "note")
	d.need(e.spot, "share")
	d.text(f["note"])
	d.base.Unlisted = d.shares(f["share"])
}

// cause reads one entry of causes.yaml.
func (d *decoder) cause(e entry) Cause {
	f := d.fields(e.spot, "id", "title", "role", "applies", "share", "factors", "leads_to", "answers", "repair", "note")
	d.need(e.spot, "role", "share", "repair")
	c := Cause{ID: e.id, File: e.file, Line: e.line()}
	c.Title = d.title(e, f, &c.missing)
	c.Role = d.word(f["role"], "role", Roles())
	c.Applies = d.conditions(f["applies"])
	c.Share = d.shares(f["share"])
	c.Factors = d.factors(f["factors"])
	c.LeadsTo = d.leadsTo(f["leads_to"])
	c.Answers = d.answers(f["answers"])
	c.Repair = d.name(f["repair"])
	d.refer(f["repair"], KindRepair, c.Repair)
	c.Note = d.text(f["note"])
	if !d.tried(e.spot, "leads_to") && !d.tried(e.spot, "answers") {
		d.add(e.spot, "leads to nothing and changes no answer, so nothing could ever speak for it", "add leads_to: or answers:")
	}
	return c
}

// event reads one entry of stresses.yaml, faults.yaml or signs.yaml.
func (d *decoder) event(e entry, layer Layer) Event {
	keys := []string{"id", "title", "leak", "leads_to", "applies", "note"}
	if layer == Fault {
		keys = append(keys, "of", "repair")
	}
	f := d.fields(e.spot, keys...)
	d.need(e.spot, "leak")
	ev := Event{ID: e.id, Layer: layer, File: e.file, Line: e.line()}
	ev.Title = d.title(e, f, &ev.missing)
	ev.Of = d.word(f["of"], "place of a fault", []string{"switch"})
	ev.Leak, _ = d.probability(f["leak"])
	ev.LeadsTo = d.leadsTo(f["leads_to"])
	ev.Applies = d.conditions(f["applies"])
	ev.Repair = d.name(f["repair"])
	d.refer(f["repair"], KindRepair, ev.Repair)
	ev.Note = d.text(f["note"])
	for _, l := range ev.LeadsTo {
		d.links[e.id+" "+l.To] = spot{e.file, join(f["leads_to"].path, l.To), keyNode(f["leads_to"].node, l.To)}
	}
	d.later = append(d.later, func() { d.oneLayer(e, layer) })
	return ev
}

// leadsTo reads links to events.
func (d *decoder) leadsTo(s spot) []Link {
	var links []Link
	for _, p := range d.pairs(s) {
		d.refer(p.at, KindEvent, p.key)
		if b, ok := d.probability(p.value); ok {
			links = append(links, Link{To: p.key, P: b, Line: p.at.line()})
		}
	}
	return links
}

// answers reads the rows with which a cause changes nominal tests; crossCheck compares them with the tests.
func (d *decoder) answers(s spot) map[string]map[string]Band {
	var all map[string]map[string]Band
	for _, p := range d.pairs(s) {
		r := d.row(p.value)
		if all == nil {
			all = map[string]map[string]Band{}
		}
		all[p.key] = r.bands
		d.later = append(d.later, func() { d.checkAnswer(p, r) })
	}
	return all
}

// repair reads one entry of repairs.yaml.
func (d *decoder) repair(e entry) Repair {
	f := d.fields(e.spot, "id", "title", "minutes", "parts", "steps")
	d.need(e.spot, "title", "minutes")
	return Repair{ID: e.id, Title: d.text(f["title"]), Minutes: d.minutes(f["minutes"]),
		Parts: d.texts(f["parts"]), Steps: d.texts(f["steps"]), File: e.file, Line: e.line()}
}

// caution reads one entry of cautions.yaml.
func (d *decoder) caution(e entry) Caution {
	f := d.fields(e.spot, "id", "text", "when", "source")
	d.need(e.spot, "text")
	c := Caution{ID: e.id, Text: d.text(f["text"]), When: d.text(f["when"]), Source: d.name(f["source"]),
		File: e.file, Line: e.line()}
	d.refer(f["source"], KindSource, c.Source)
	return c
}

// source reads one entry of sources.yaml.
func (d *decoder) source(e entry) Source {
	f := d.fields(e.spot, "id", "title", "where", "read")
	d.need(e.spot, "title")
	return Source{ID: e.id, Title: d.text(f["title"]), Where: d.text(f["where"]), Read: d.text(f["read"]),
		File: e.file, Line: e.line()}
}
