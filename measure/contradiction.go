package measure

import (
	"fmt"
	"slices"
	"strings"
)

// contradictions checks what only shows when keys are held against each other. Values are called contradictory
// when even their intervals leave no way out: what is merely unsuitable, such as a rating below the bus, is a finding.
func (r *reader) contradictions(root *entry, c *Case) {
	board, rebuild := root.child("board"), root.child("rebuild")
	boards := []Board{c.Board}
	if c.Rebuild != nil {
		boards = append(boards, c.Rebuild.Board)
	}
	latest := boards[len(boards)-1]
	r.checkAssumed(board)
	r.checkAssumed(rebuild)
	r.checkPositions(stack{layers: []layer{{board, true, true}}}, c.Board)
	r.checkPositions(rebuiltStack(board, rebuild), latest)
	r.checkSection(board, nil)
	r.checkSection(rebuild, board)
	r.checkRecord(root)
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

// conflict notes that a value and another one cannot both be true: the message names both keys and both values.
func (r *reader) conflict(at, other *entry, why, hint string) {
	if hint == "" {
		hint = "correct one of the two"
	}
	r.fault(at.node, at.path, fmt.Sprintf("%s contradicts %s %s: %s", at.shown(), other.path, other.shown(), why), hint)
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

// checkPositions proves that the positions of a section are those of the topology and that no part stands twice, in it
// and in what it lies over.
func (r *reader) checkPositions(s stack, b Board) {
	if len(s.layers) == 0 || s.layers[0].entry.child(positionsKey) == nil {
		return
	}
	topology, _ := b.Word("topology")
	known := topologyPositions[topology]
	restated := s.layers[0].entry.child(positionsKey)
	for _, p := range restated.below {
		if fitted := s.find("stages.brake.fitted"); p.name == brake && fitted.word() == "no" {
			r.fault(p.node, p.path, "the position contradicts "+fitted.path+" no: a board without a brake has no such position",
				"take the position out, or correct "+fitted.path)
			continue
		}
		if from := s.find("topology"); known != nil && p.name != brake && !slices.Contains(known, p.name) && from.entry != nil {
			r.fault(p.node, p.path, "a "+topology+" has no position "+p.name,
				"it has "+list(known)+"; or correct "+from.path+" "+topology)
		}
	}
	r.checkPartNames(s)
}

// checkPartNames proves that every part of a board has a name of its own. Where two sections name the parts of one
// position, the upper one counts.
func (r *reader) checkPartNames(s stack) {
	first := map[string]string{}
	for i := len(s.layers) - 1; i >= 0; i-- { // from below, so that a fault stands where it came in
		for _, p := range s.layers[i].entry.child(positionsKey).children() {
			parts := p.child("parts")
			if parts == nil || i > 0 && s.layers[0].entry.at(positionsKey+"."+p.name+".parts") != nil {
				continue
			}
			for j, part := range parts.bare {
				if at, ok := first[part]; ok && s.layers[i].own {
					r.fault(parts.bareNodes[j], fmt.Sprintf("%s[%d]", parts.path, j+1), part+" stands twice; first in "+at,
						"every part has a name of its own")
				}
				first[part] = p.name
			}
		}
	}
}

// answerKeys are the keys of which an observation has exactly one.
var answerKeys = []string{"result", "reading", "answer"}

// checkObservation proves that an observation has one answer.
func (r *reader) checkObservation(e *entry) {
	if !e.good || !e.stated {
		return
	}
	var given []string
	for _, name := range answerKeys {
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
		r.fault(part.node, part.path, part.text+" contradicts "+position.path+" "+position.text+": the part is not in that position",
			"it is in "+list(at)+"; correct one of the two")
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
