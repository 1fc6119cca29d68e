package measure

import (
	"fmt"
	"slices"
	"strings"

	"gopkg.in/yaml.v3"

	"drivemend/measure/quantity"
)

// contradictions checks what only shows when keys are held against each other. Values are called contradictory
// when even their intervals leave no way out.
func (r *reader) contradictions(root *entry, c *Case) {
	board, rebuild := root.child("board"), root.child("rebuild")
	for _, e := range []*entry{board, rebuild} {
		r.checkAssumed(e)
		r.checkPositions(e, c.Board)
	}
	r.checkBoard(board, nil)
	r.checkBoard(rebuild, board)
	r.checkTimes(root)
	boards := []Board{c.Board}
	if c.Rebuild != nil {
		boards = append(boards, c.Rebuild.Board)
	}
	places := r.placesKnown()
	for _, e := range root.items("observations") {
		r.checkObservation(e)
		if places {
			r.checkPlace(e, boards)
		}
	}
	for _, e := range root.items("locate") {
		if places {
			r.checkBank(e, c.Board)
		}
	}
}

// placesKnown tells whether the positions could be read; if not, every part would be called unknown.
func (r *reader) placesKnown() bool {
	for _, p := range r.problems {
		for _, key := range []string{"topology", "positions", "stages.brake"} {
			if p.Key == "board" || within(p.Key, "board."+key) || within(p.Key, "rebuild."+key) {
				return false
			}
		}
	}
	return true
}

// order is a pair of keys of which the first may not be above the second.
type order struct{ small, great, why string }

// orders are the pairs of board keys with a fixed order.
var orders = []order{
	{"bus.nominal", "bus.highest", "the highest bus voltage is below the working voltage"},
	{"switch.rated_current", "switch.pulse_current", "the pulse current is below the continuous current"},
	{"gate.off_voltage", "gate.on_voltage", "the gate's on voltage is below its off voltage"},
	{"loop.link", "loop.inductance", "the share common to all legs is more than the whole loop"},
	{"cooling.coldest_air", "cooling.air", "the coldest air is warmer than the working air"},
}

// layered gives the value of a key in a section, or in the one below it; own tells which.
func layered(e, below *entry, path string) (v *entry, own bool) {
	if v := e.at(path).value(); v != nil {
		return v, true
	}
	return below.at(path).value(), false
}

// checkBoard holds the keys of a board section against each other, and against the section it lies over.
func (r *reader) checkBoard(e, below *entry) {
	for _, o := range orders {
		small, ownSmall := layered(e, below, o.small)
		great, ownGreat := layered(e, below, o.great)
		if small == nil || great == nil || !ownSmall && !ownGreat || small.quantity.Low <= great.quantity.High {
			continue
		}
		at, other := great, small
		if !ownGreat {
			at, other = small, great
		}
		r.fault(at.node, at.path, fmt.Sprintf("%s contradicts %s %s: %s", at.shown(), other.path, other.shown(), o.why),
			"correct one of the two")
	}
	r.checkPeriod(e, below)
	if b := e.at("bus.balancing"); b != nil && e.child("bus").word("halves") == "no" {
		r.fault(b.node, b.path, "contradicts bus.halves no: only a split bank has balancing resistors", "correct one of the two")
	}
	r.checkAbsent(e.child("snubber"), "kind", "none")
	r.checkAbsent(e.child("freewheel"), "fitted", "no")
	r.checkAbsent(e.at("stages.brake"), "fitted", "no")
	r.checkAbsent(e.at("stages.auxiliary"), "fitted", "no")
}

// checkAbsent refuses figures of something that is said not to be there.
func (r *reader) checkAbsent(e *entry, key, absent string) {
	if e.word(key) != absent {
		return
	}
	for _, c := range e.below {
		if c.name != key && c.text != "none" && c.text != unknown {
			r.fault(c.node, c.path, "contradicts "+key+" "+absent+": what is not there has no "+c.name,
				"take the key out, or correct "+key)
		}
	}
}

// checkPeriod holds the shortest times against the period.
func (r *reader) checkPeriod(e, below *entry) {
	f, own := layered(e, below, "pwm.frequency")
	if f == nil || f.quantity.Low <= 0 {
		return
	}
	period := 1 / f.quantity.Low
	sum := 0.0
	for _, name := range []string{"shortest_on_time", "shortest_off_time"} {
		t, ownTime := layered(e, below, "pwm."+name)
		if t == nil {
			continue
		}
		own = own || ownTime
		if sum += t.quantity.Low; sum > period*(1+1e-9) && own {
			at := t
			if !ownTime {
				at = f
			}
			r.fault(at.node, at.path, fmt.Sprintf("%s %s does not fit in the period of %s %s, which is %s", t.path, t.shown(),
				f.path, f.shown(), quantity.Format(period, quantity.Second)), "the shortest times fit in one period together")
			return
		}
	}
}

// value gives the entry that holds the number of a key: itself or its value; nil when there is none.
func (e *entry) value() *entry {
	if e != nil && e.node.Kind == yaml.MappingNode {
		e = e.child("value")
	}
	if e == nil || !e.numeric() {
		return nil
	}
	return e
}

// shown gives the text of a value as written.
func (e *entry) shown() string { return strings.TrimSpace(e.node.Value) }

// checkAssumed proves that the keys listed as assumed are keys, and are stated.
func (r *reader) checkAssumed(e *entry) {
	list := e.child("assumed")
	if list == nil {
		return
	}
	for i, key := range list.bare {
		path := fmt.Sprintf("%s[%d]", list.path, i+1)
		if _, ok := LookupKey("board." + short(key)); !ok {
			hint := ""
			if len(r.problems) < mostProblems {
				hint = nearHint(short(key))
			}
			r.fault(list.bareNodes[i], path, quoted(key)+" is not a board key", hint)
			continue
		}
		if at := e.at(short(key)); at == nil {
			r.fault(list.bareNodes[i], path, key+" is listed as assumed but not stated", "state it, or take it off the list")
		}
	}
}

// checkPositions proves that the positions are those of the topology and that no part stands twice.
func (r *reader) checkPositions(e *entry, b Board) {
	positions := e.child("positions")
	if positions == nil {
		return
	}
	topology, _ := b.Word("topology")
	known := topologyPositions[topology]
	first := map[string]string{}
	for _, p := range positions.below {
		switch {
		case p.name == brake && !b.brakeFitted():
			r.fault(p.node, p.path, "this board has no brake", "correct stages.brake.fitted")
		case known != nil && p.name != brake && !slices.Contains(known, p.name):
			r.fault(p.node, p.path, "a "+topology+" has no position "+p.name, "it has "+list(known))
		}
		parts := p.child("parts")
		if parts == nil {
			continue
		}
		for i, part := range parts.bare {
			if at, ok := first[part]; ok {
				r.fault(parts.bareNodes[i], fmt.Sprintf("%s[%d]", parts.path, i+1), part+" stands twice; first in "+at,
					"every part has a name of its own")
			}
			first[part] = p.name
		}
	}
}

// checkObservation proves that an observation has one answer.
func (r *reader) checkObservation(e *entry) {
	if !e.good || !e.stated {
		return
	}
	var given []string
	for _, name := range []string{"result", "reading", "answer"} {
		if e.child(name) != nil {
			given = append(given, name)
		}
	}
	if len(given) != 1 {
		found := "none"
		if len(given) > 0 {
			found = list(given)
		}
		r.fault(e.node, e.path, "an observation has exactly one of result, reading and answer; here is "+found,
			"keep the one that was observed")
	}
	if t := e.child("twin"); t != nil && e.child("reading") == nil {
		r.fault(t.node, t.path, "a twin without a reading says nothing", "add the reading")
	}
}

// checkPlace proves that a part and a position are on one of the boards, found or rebuilt, and the part in the
// position.
func (r *reader) checkPlace(e *entry, boards []Board) {
	part, position := e.child("part"), e.child("position")
	if position != nil && position.good && !r.checkPosition(position, position.text, boards[len(boards)-1]) {
		return
	}
	if part == nil || !part.good {
		return
	}
	var at []string
	for _, b := range boards {
		if p := b.PositionOf(part.text); p != "" {
			at = append(at, p)
		}
	}
	switch {
	case at == nil:
		r.fault(part.node, part.path, "this board has no part "+part.text,
			"it has "+some(allParts(boards[0]))+"; parts are named under board.positions")
	case position != nil && position.good && !slices.Contains(at, position.text):
		r.fault(part.node, part.path, part.text+" is not in position "+position.text, "it is in "+at[0])
	}
}

// checkPosition proves that a position is on the board.
func (r *reader) checkPosition(e *entry, name string, b Board) bool {
	names := b.positionNames()
	if slices.Contains(names, name) {
		return true
	}
	hint := "it has " + list(names)
	if name == brake {
		hint += "; a brake is stated under board.stages.brake"
	}
	r.fault(e.node, e.path, "this board has no position "+name, hint)
	return false
}

// allParts gives every part of the board in order.
func allParts(b Board) []string {
	var out []string
	for _, p := range b.Positions() {
		out = append(out, p.Parts...)
	}
	return out
}

// checkBank proves that located parts stand in the bank they were read in.
func (r *reader) checkBank(e *entry, b Board) {
	if !r.checkPosition(e, e.name, b) {
		return
	}
	var parts []string
	for _, p := range b.Positions() {
		if p.Name == e.name {
			parts = p.Parts
		}
	}
	named := []*entry{e.child("feed")}
	for _, c := range e.items("rises") {
		named = append(named, c.child("part"))
	}
	for _, c := range e.items("drops") {
		named = append(named, c.child("from"), c.child("to"))
	}
	for _, n := range named {
		if n != nil && n.good && !slices.Contains(parts, n.text) {
			r.fault(n.node, n.path, "position "+e.name+" has no part "+n.text, "it has "+list(parts))
		}
	}
}

// checkTimes proves that what ends does not end before it began.
func (r *reader) checkTimes(root *entry) {
	for _, e := range root.at("safety").items("link") {
		fitted, removed := e.when("fitted"), e.when("removed")
		if !fitted.IsZero() && !removed.IsZero() && removed.Before(fitted) {
			n := e.child("removed")
			r.fault(n.node, n.path, "removed before it was fitted, "+e.child("fitted").text, "correct one of the two")
		}
	}
	opened := root.child("opened")
	if opened == nil || !opened.good {
		return
	}
	for _, path := range []string{"outcome.closed", "rebuild.done"} {
		end := root.at(path)
		if end == nil || !end.good {
			continue
		}
		// A time is compared by the date it was written with: the case was opened on a day of the same bench.
		if end.time.Format("2006-01-02") < opened.text {
			r.fault(end.node, end.path, end.text+" lies before the day the case was opened, "+opened.text, "correct one of the two")
		}
	}
}
