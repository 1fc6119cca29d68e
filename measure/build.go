package measure

import (
	"fmt"
	"slices"
	"strings"

	"drivemend/measure/quantity"
)

// buildCase makes the typed case of a checked tree.
func buildCase(root *entry) *Case {
	c := &Case{
		ID: root.word("case"), Opened: root.when("opened"), Owner: root.word("owner"), Technician: root.word("technician"),
		Serial: root.word("serial"), Firmware: root.word("firmware"), Story: root.word("story"),
		Board: buildBoard(root.child("board")), Safety: buildSafety(root.child("safety")),
	}
	if s := root.child("source"); s != nil {
		c.Source = Source{s.word("title"), s.word("site"), s.word("year"), s.word("address"), s.word("read")}
	}
	for _, e := range root.items("observations") {
		c.Observations = append(c.Observations, buildObservation(e))
	}
	for _, e := range root.items("locate") {
		c.Locate = append(c.Locate, buildBank(e))
	}
	for _, e := range root.items("captures") {
		c.Captures = append(c.Captures, buildCapture(e))
	}
	for _, e := range root.items("bring_up") {
		c.BringUp = append(c.BringUp, Stage{Stage: e.word("stage"), Note: e.word("note"), At: e.when("at"),
			Figures: e.figures(), Line: e.line})
	}
	if e := root.child("rebuild"); e != nil {
		c.Rebuild = buildRebuild(c.Board, e)
	}
	if o := root.child("outcome"); o != nil && o.stated {
		c.Outcome = &Outcome{Faults: o.names("faults"), Parts: o.names("parts"), Causes: o.names("causes"),
			Stress: o.word("stress"), ConfirmedBy: o.word("confirmed_by"), Closed: o.when("closed")}
	}
	buildRecord(c, root)
	return c
}

// items gives what stands below a child; none when it is not stated.
func (e *entry) items(name string) []*entry {
	if c := e.child(name); c != nil {
		return c.below
	}
	return nil
}

// figures gives the quantities of an entry by their names.
func (e *entry) figures() map[string]quantity.Quantity {
	out := map[string]quantity.Quantity{}
	for _, c := range e.below {
		if c.numeric() {
			out[c.name] = c.quantity
		}
	}
	return out
}

// numeric tells whether an entry holds a number that could be read.
func (e *entry) numeric() bool {
	switch e.row.Kind {
	case KindQuantity, KindRatio, KindCount:
		return e.good && e.stated && len(e.below) == 0 && e.text == ""
	}
	return false
}

// buildSafety makes the safety history.
func buildSafety(s *entry) Safety {
	var out Safety
	for _, e := range s.items("isolation") {
		out.Isolation = append(out.Isolation, Isolation{Locked: e.word("locked") == "yes", Motor: e.word("motor"),
			OtherSources: e.word("other_sources"), At: e.when("at"), Line: e.line})
	}
	for _, e := range s.items("dead_checks") {
		d := DeadCheck{Point: e.word("point"), MeterProved: e.word("meter_proved") == "yes", At: e.when("at"), Line: e.line}
		d.DC, _ = e.amount("dc")
		d.AC, _ = e.amount("ac")
		out.DeadChecks = append(out.DeadChecks, d)
	}
	for _, e := range s.items("link") {
		out.Links = append(out.Links, Link{Fitted: e.when("fitted"), Removed: e.when("removed"), Line: e.line})
	}
	for _, e := range s.items("energised") {
		out.Energised = append(out.Energised, Energised{What: e.word("what"), At: e.when("at"), Line: e.line})
	}
	for _, e := range s.items("before") {
		out.Before = append(out.Before, buildBefore(e))
	}
	return out
}

// buildObservation makes one observation.
func buildObservation(e *entry) Observation {
	o := Observation{Test: e.word("test"), Part: e.word("part"), Position: e.word("position"), At: e.when("at"),
		Result: e.word("result"), Answer: e.word("answer"), Seen: e.word("seen"), Polarity: e.word("polarity"),
		State: e.word("state"), Motor: e.word("motor"), Surface: e.word("surface"), Instrument: e.word("instrument"), Note: e.word("note"), Line: e.line}
	if c := e.child("reading"); c != nil {
		o.Reading = c.reading
	}
	if c := e.child("twin"); c != nil {
		o.Twin = c.reading
	}
	if q, ok := e.amount("accuracy"); ok {
		o.Accuracy = q.Value
	}
	if q, ok := e.amount("range"); ok {
		o.Range = q.Value
	}
	return o
}

// buildBank makes the readings of one bank under injection.
func buildBank(e *entry) Bank {
	b := Bank{Position: e.name, Feed: e.word("feed"), Line: e.line}
	b.Current, _ = e.child("injection").amount("current")
	b.Voltage, _ = e.child("injection").amount("voltage")
	for _, c := range e.items("rises") {
		q, _ := c.amount("rise")
		b.Rises = append(b.Rises, Rise{Part: c.word("part"), Rise: q, Surface: c.word("surface")})
	}
	for _, c := range e.items("drops") {
		q, _ := c.amount("drop")
		b.Drops = append(b.Drops, Drop{From: c.word("from"), To: c.word("to"), Drop: q})
	}
	return b
}

// buildCapture makes one capture.
func buildCapture(e *entry) Capture {
	c := Capture{Name: e.word("name"), SHA256: e.word("sha256"), Kind: e.word("kind"), Position: e.word("position"),
		Edge: e.word("edge"), Note: e.word("note"), At: e.when("at"), Figures: e.figures(), Line: e.line}
	c.Bytes = int64(c.Figures["bytes"].Value)
	delete(c.Figures, "bytes")
	return c
}

// buildBoard makes the board of its section.
func buildBoard(e *entry) Board {
	b := Board{fields: map[string]Field{}}
	if e == nil {
		return b
	}
	for _, f := range flatten(e, "") {
		b.fields[f.path] = f.Field
	}
	b.assume(e.names("assumed"))
	return b
}

// assume marks the keys that are listed as assumed; a group marks what stands in it.
func (b Board) assume(keys []string) {
	for path, f := range b.fields {
		for _, key := range keys {
			if within(path, short(key)) {
				f.Assumed = true
				b.fields[path] = f
			}
		}
	}
}

// statedField is a field with its path.
type statedField struct {
	path string
	Field
}

// flatten gives every stated field below an entry in file order; the condition value of a quantity goes under the
// quantity's own name, the steps of a list under their number.
func flatten(e *entry, path string) []statedField {
	var out []statedField
	if path == positionsKey {
		out = append(out, statedField{path, Field{Names: e.childNames(), Line: e.line}})
	}
	for i, c := range e.below {
		at := join(path, c.name)
		switch {
		case c.name == "": // of a list
			at = fmt.Sprintf("%s[%d]", path, i+1)
		case c.name == "value" && e.row.Kind == KindQuantity:
			at = path
		}
		if f, ok := c.field(); ok {
			out = append(out, statedField{at, f})
			continue
		}
		out = append(out, flatten(c, at)...)
	}
	return out
}

// childNames gives the names below an entry in file order.
func (e *entry) childNames() []string {
	var out []string
	for _, c := range e.below {
		out = append(out, c.name)
	}
	return out
}

// field gives the field of an entry that holds one value; false for maps, lists of maps and what could not be read.
func (e *entry) field() (Field, bool) {
	switch {
	case !e.good || !e.stated:
		return Field{}, false
	case e.numeric():
		return Field{Quantity: e.quantity, Line: e.line, numeric: true}, true
	case len(e.bare) > 0:
		return Field{Names: slices.Clone(e.bare), Line: e.line}, true
	case len(e.below) > 0 || e.row.Kind == KindMap || e.row.Kind == KindNamed || e.row.Kind == KindList:
		return Field{}, false
	}
	return Field{Word: e.text, Line: e.line, silent: e.text == unknown && e.row.Kind == KindWord}, true
}

// buildRebuild lays the rebuild's keys over the board: a stated snubber replaces the whole network, everything else
// goes key by key. A switch key of the rebuild also replaces what single positions had of their own before.
// A restated key is assumed only if the rebuild says so.
func buildRebuild(found Board, e *entry) *Rebuild {
	r := &Rebuild{Done: e.when("done"), Line: e.line, Board: found}
	if s := e.child("snubber"); s != nil && s.stated {
		r.Board = r.Board.Without("snubber")
	}
	if e.at("cooling.foster") != nil {
		r.Board = r.Board.Without("cooling.foster")
	}
	for _, f := range flatten(e, "") {
		if f.path == "done" || f.path == "assumed" {
			continue
		}
		r.Keys = append(r.Keys, f.path)
		r.Board = r.Board.lay(f.path, f.Field)
	}
	r.Board = Board{fields: cloneFields(r.Board.fields)}
	for _, path := range r.Keys {
		f := r.Board.fields[path]
		f.Assumed = false
		r.Board.fields[path] = f
	}
	r.Board.assume(e.names("assumed"))
	return r
}

// lay puts a field of the rebuild over the board.
func (b Board) lay(path string, f Field) Board {
	if path == positionsKey {
		for _, name := range b.fields[positionsKey].Names {
			if !slices.Contains(f.Names, name) {
				f.Names = append(f.Names, name)
			}
		}
	}
	if own, ok := strings.CutPrefix(path, "switch."); ok {
		for _, p := range b.Positions() {
			b = b.Without(positionsKey + "." + p.Name + "." + own)
		}
	}
	return b.put(path, f)
}
