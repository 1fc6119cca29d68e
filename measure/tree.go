package measure

import (
	"fmt"
	"strconv"
	"strings"
	"time"

	"gopkg.in/yaml.v3"

	"drivemend/measure/quantity"
)

// entry is one key of a file together with what stands under it, already checked against its row.
type entry struct {
	row       *rung
	name      string // as in the file; "" for entries of a list
	path      string // names and numbers filled in: positions.low.parts, observations[3].test
	node      *yaml.Node
	line, col int    // of the value
	text      string // a word, name or text; yes-no as yes, no, unknown
	quantity  quantity.Quantity
	reading   *quantity.Reading
	time      time.Time
	bare      []string // names of a list of names
	bareNodes []*yaml.Node
	below     []*entry
	good      bool // the value could be read
	stated    bool // false for an empty value
}

// child gives the entry of a name below this one; nil when not stated. A nil entry has no children.
func (e *entry) child(name string) *entry {
	if e == nil {
		return nil
	}
	for _, c := range e.below {
		if c.name == name {
			return c
		}
	}
	return nil
}

// at walks down a dotted path, list[2] being the second entry of a list; nil when any step is not stated.
func (e *entry) at(path string) *entry {
	for _, step := range strings.Split(path, ".") {
		name, number, inList := strings.Cut(step, "[")
		e = e.child(name)
		if n, err := strconv.Atoi(strings.TrimSuffix(number, "]")); inList && e != nil {
			if err != nil || n < 1 || n > len(e.below) {
				return nil
			}
			e = e.below[n-1]
		}
	}
	return e
}

// word gives the text of a child, "" when not stated.
func (e *entry) word(name string) string {
	if c := e.child(name); c != nil && c.good {
		return c.text
	}
	return ""
}

// when gives the time of a child, zero when not stated.
func (e *entry) when(name string) time.Time {
	if c := e.child(name); c != nil {
		return c.time
	}
	return time.Time{}
}

// amount gives the quantity of a child and whether it is stated.
func (e *entry) amount(name string) (quantity.Quantity, bool) {
	if c := e.child(name); c != nil && c.good && c.stated {
		return c.quantity, true
	}
	return quantity.Quantity{}, false
}

// names gives the list of names of a child.
func (e *entry) names(name string) []string {
	if c := e.child(name); c != nil {
		return append([]string(nil), c.bare...)
	}
	return nil
}

// reader checks a node tree against the key table and gathers every fault.
type reader struct {
	problems Problems
	cut      bool // the file could be read only down to a fault of its YAML: what seems missing may follow below
}

// lack notes that something is missing, which only a whole file shows.
func (r *reader) lack(n *yaml.Node, key, message, hint string) {
	if !r.cut {
		r.fault(n, key, message, hint)
	}
}

// fault notes a problem at a node.
func (r *reader) fault(n *yaml.Node, key, message, hint string) {
	p := Problem{Key: key, Message: message, Hint: hint, Line: 1, Column: 1}
	if n != nil && n.Line > 0 {
		p.Line, p.Column = n.Line, n.Column
	}
	r.problems = append(r.problems, p)
}

// read checks one value against its row.
func (r *reader) read(n *yaml.Node, row *rung, name, path string, depth int) *entry {
	e := &entry{row: row, name: name, path: path, node: n, line: n.Line, col: n.Column}
	switch {
	case depth > deepest:
		r.fault(n, path, fmt.Sprintf("nested more than %d deep", deepest), "")
	case r.foreign(n, path):
	case row.Kind == KindMap || row.Kind == KindNamed || len(row.below) > 0 && row.Kind != KindList && n.Kind == yaml.MappingNode:
		r.readMap(e, depth)
	case row.Kind == KindList:
		r.readList(e, depth)
	default:
		r.readScalar(e)
	}
	return e
}

// foreign refuses anchors, aliases and tags.
func (r *reader) foreign(n *yaml.Node, path string) bool {
	switch {
	case n.Kind == yaml.AliasNode:
		r.fault(n, path, "an alias (*"+n.Value+") stands here; a case file has none", "write the value out")
	case n.Anchor != "":
		r.fault(n, path, "an anchor (&"+n.Anchor+") stands here; a case file has none", "take it out")
	case n.Style&yaml.TaggedStyle != 0:
		r.fault(n, path, "a YAML tag ("+n.Tag+") stands here; a case file has none", "take it out")
	default:
		return false
	}
	return true
}

// empty tells whether nothing stands under a key.
func empty(n *yaml.Node) bool {
	return n.Kind == 0 || n.Kind == yaml.ScalarNode && n.Tag == "!!null" && n.Style == 0
}

// readMap checks the keys of a map.
func (r *reader) readMap(e *entry, depth int) {
	n := e.node
	if empty(n) {
		e.good = e.row.Path == "" || !anyRequired(e.row)
		if !e.good {
			r.lack(n, e.path, "nothing stands here", "it needs "+list(e.row.required()))
		}
		return
	}
	if n.Kind != yaml.MappingNode {
		r.fault(n, e.path, "a map of keys belongs here, not "+shape(n), "write {key: value}: "+some(e.row.names))
		return
	}
	e.good, e.stated = true, true
	first := map[string]int{}
	split := splitByComma(n)
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, value := n.Content[i], n.Content[i+1]
		if at, ok := split[i]; ok {
			if at == i {
				first[key.Value] = key.Line
				r.fault(value, join(e.path, key.Value), "a comma inside { } ends the value",
					"write "+value.Value+"."+n.Content[i+2].Value+" with a point")
			}
			continue
		}
		r.readKey(e, key, value, first, depth)
	}
	for _, name := range e.row.required() {
		if _, ok := first[name]; !ok {
			r.lack(n, join(e.path, name), "this key is missing", "add "+name+" ("+e.row.below[name].Help+")")
		}
	}
}

// readKey checks one key of a map and what stands under it.
func (r *reader) readKey(e *entry, key, value *yaml.Node, first map[string]int, depth int) {
	if key.Kind != yaml.ScalarNode || key.Anchor != "" || key.Style&yaml.TaggedStyle != 0 {
		r.fault(key, e.path, "a key must be a plain word without anchor, alias or tag", "")
		return
	}
	name := key.Value
	path := join(e.path, name)
	if line, ok := first[name]; ok {
		r.fault(key, path, fmt.Sprintf("stated twice; first in line %d", line), "keep one of them")
		return
	}
	first[name] = key.Line
	row, ok := e.row.child(name)
	switch {
	case name == "<<":
		r.fault(key, path, "merging of maps has no place in a case file", "write the keys out")
	case !ok || name == "[]":
		r.fault(key, path, "unknown key", r.suggest(e.row, path, name))
	case row.Path[len(row.Path)-1] == '*' && !plainName(name):
		r.fault(key, path, "a name is small letters, digits and hyphens", "")
	default:
		e.below = append(e.below, r.read(value, row, name, path, depth+1))
	}
}

// splitByComma finds values of a flow map that a decimal comma cut in two: "0,47 Ω" reads as the value 0 and an
// empty key "47 Ω". It gives, for both places, the place of the first.
func splitByComma(n *yaml.Node) map[int]int {
	if n.Style&yaml.FlowStyle == 0 {
		return nil
	}
	var out map[int]int
	for i := 2; i+1 < len(n.Content); i += 2 {
		key, value, before := n.Content[i], n.Content[i+1], n.Content[i-1]
		if !empty(value) || key.Kind != yaml.ScalarNode || key.Value == "" || key.Value[0] < '0' || key.Value[0] > '9' {
			continue
		}
		if _, err := strconv.Atoi(strings.TrimLeft(before.Value, "+-~<> \u2212"+string(foldedMark))); err != nil {
			continue
		}
		if out == nil {
			out = map[int]int{}
		}
		out[i-2], out[i] = i-2, i-2
	}
	return out
}

// suggest gives the nearest valid key, or the keys that may stand here.
func (r *reader) suggest(row *rung, path, name string) string {
	if len(r.problems) >= mostProblems {
		return "" // this fault is not listed any more, and searching takes its time
	}
	if near := nearest(name, row.names); near != "" && near != "*" && near != "[]" {
		return "nearest is " + near
	}
	if near := NearestKey(path); near != "" {
		return "nearest is " + near
	}
	return "here may stand " + some(row.names)
}

// readList checks the entries of a list.
func (r *reader) readList(e *entry, depth int) {
	n := e.node
	if empty(n) {
		e.good = true
		return
	}
	if n.Kind != yaml.SequenceNode {
		r.fault(n, e.path, "a list belongs here, not "+shape(n), "write [ ] around it")
		return
	}
	e.good, e.stated = true, true
	item, maps := e.row.below["[]"]
	for i, c := range n.Content {
		path := fmt.Sprintf("%s[%d]", e.path, i+1)
		if maps {
			e.below = append(e.below, r.read(c, item, "", path, depth+1))
			continue
		}
		if r.foreign(c, path) {
			continue
		}
		if c.Kind != yaml.ScalarNode || empty(c) || strings.TrimSpace(c.Value) == "" {
			r.fault(c, path, "a name belongs here, not "+shape(c), "")
			continue
		}
		e.bare, e.bareNodes = append(e.bare, c.Value), append(e.bareNodes, c)
	}
}

// required gives the names that must be stated below a key.
func (r *rung) required() []string {
	var out []string
	for _, name := range r.names {
		if r.below[name].Required {
			out = append(out, name)
		}
	}
	return out
}

// anyRequired tells whether something must be stated below a key.
func anyRequired(r *rung) bool { return len(r.required()) > 0 }

// shape says what kind of thing a node is.
func shape(n *yaml.Node) string {
	switch {
	case n.Kind == yaml.MappingNode:
		return "a map"
	case n.Kind == yaml.SequenceNode:
		return "a list"
	case empty(n):
		return "nothing"
	}
	return quoted(n.Value)
}

// join adds a name to a dotted path.
func join(path, name string) string {
	if path == "" {
		return name
	}
	return path + "." + name
}
