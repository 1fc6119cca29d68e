package knowledge

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"regexp"
	"strconv"
	"strings"

	"gopkg.in/yaml.v3"
)

// syntaxError takes the line out of an error text of the YAML parser.
var syntaxError = regexp.MustCompile(`^yaml: (?:line (\d+): )?`)

// parseList gives the entries of one rule file: a single document that is a list.
func parseList(file string, raw []byte, faults *collector) []spot {
	before := len(faults.list)
	defer func() { faults.unreadable = faults.unreadable || len(faults.list) > before }()
	documents, err := parseDocuments(raw)
	if err != nil {
		faults.add(syntaxSpot(file, err))
		return nil
	}
	if len(documents) == 0 {
		faults.add(spot{file: file, node: &yaml.Node{Line: 1, Column: 1}}, "holds no list", "write [] for a list without entries")
		return nil
	}
	if len(documents) > 1 {
		faults.add(spot{file: file, node: documents[1]}, "a second document begins here; a rule file holds one list",
			"take out the line ---")
	}
	root := spot{file: file, node: documents[0]}
	if len(root.node.Content) == 1 {
		root.node = root.node.Content[0]
	}
	if refuseReferences(root, faults); len(faults.list) > before {
		return nil
	}
	if root.node.Kind != yaml.SequenceNode {
		faults.add(root, "is "+describe(root.node)+"; expected a list of entries", "begin every entry with \"- id: \"")
		return nil
	}
	entries := make([]spot, len(root.node.Content))
	for i, n := range root.node.Content {
		entries[i] = spot{file: file, path: fmt.Sprintf("entry %d", i+1), node: n}
	}
	return entries
}

// parseDocuments reads at most two documents: the second is only needed for the place where it begins. A failure
// inside the parser comes back as an error, never as a panic.
func parseDocuments(raw []byte) (documents []*yaml.Node, err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("yaml: the parser gave up: %v", r)
		}
	}()
	decoder := yaml.NewDecoder(bytes.NewReader(raw))
	for len(documents) < 2 {
		node := &yaml.Node{}
		if err := decoder.Decode(node); errors.Is(err, io.EOF) {
			return documents, nil
		} else if err != nil {
			return documents, err
		}
		documents = append(documents, node)
	}
	return documents, nil
}

// syntaxSpot turns an error of the YAML parser into place, message and hint.
func syntaxSpot(file string, err error) (spot, string, string) {
	text := err.Error()
	at := spot{file: file}
	if m := syntaxError.FindStringSubmatch(text); m != nil {
		text = text[len(m[0]):]
		if line, err := strconv.Atoi(m[1]); err == nil {
			at.node = &yaml.Node{Line: line}
		}
	}
	hint := ""
	switch {
	case strings.Contains(text, "tab character"), strings.Contains(text, "cannot start any token"),
		strings.Contains(text, "expected comment or line break"):
		hint = "indent with spaces, and put a value that begins with >, @, % or ` in quotes"
	case strings.Contains(text, "mapping values are not allowed"):
		hint = "put a text that holds a colon and a space in quotes"
	}
	return at, "is no valid YAML near this line: " + text, hint
}

// refuseReferences reports anchors, aliases and tags: they make one line change another out of sight.
func refuseReferences(s spot, faults *collector) {
	n := s.node
	switch {
	case n.Kind == yaml.AliasNode:
		faults.add(s, "the alias *"+n.Value+" is not allowed", "write the value out")
		return
	case n.Anchor != "":
		faults.add(s, "the anchor &"+n.Anchor+" is not allowed", "take it out")
	case n.Style&yaml.TaggedStyle != 0:
		faults.add(s, "the tag "+n.Tag+" is not allowed", "take it out")
	}
	for _, child := range n.Content {
		refuseReferences(spot{file: s.file, path: s.path, node: child}, faults)
	}
}

// describe names the kind of a node for messages.
func describe(n *yaml.Node) string {
	switch n.Kind {
	case yaml.MappingNode:
		return "a group of keys"
	case yaml.SequenceNode:
		return "a list"
	case yaml.AliasNode:
		return "an alias"
	}
	if isNull(n) {
		return "empty"
	}
	return strconv.Quote(shorten(n.Value))
}

// shorten keeps quoted input from filling the screen.
func shorten(text string) string {
	const most = 60
	if runes := []rune(text); len(runes) > most {
		return string(runes[:most]) + "…"
	}
	return text
}

// isNull tells whether a value is left empty, ~ or null.
func isNull(n *yaml.Node) bool { return n.Kind == yaml.ScalarNode && n.ShortTag() == "!!null" }

// merge holds the entries of all layers by list, in order.
type merge struct {
	*collector
	entries map[string][]entry
	at      map[string]int   // place of an entry in its list, by "list id"
	below   map[string]entry // the first entry of an id that another one has taken the place of, by "list id"
}

// entry is one entry of a list and its id.
type entry struct {
	spot
	id string
}

func newMerge(faults *collector) *merge {
	return &merge{faults, map[string][]entry{}, map[string]int{}, map[string]entry{}}
}

// kebab is the form of every id: words of small letters and digits with hyphens between them.
var kebab = regexp.MustCompile(`^[a-z0-9]+(-[a-z0-9]+)*$`)

// add reads a file and lays its entries over those already there: a known id is replaced where it stands.
func (m *merge) add(list, file string, raw []byte) {
	here := map[string]int{}
	for _, s := range parseList(file, raw, m.collector) {
		id, ok := m.entryID(s)
		if !ok {
			continue
		}
		s.path = id
		if first, twice := here[id]; twice {
			m.collector.add(s, "the id stands twice in this file, first on line "+strconv.Itoa(first), "give one of the two another id")
			continue
		}
		here[id] = s.node.Line
		m.put(list, entry{s, id})
	}
}

// put replaces the entry of the same id or adds a new one.
func (m *merge) put(list string, e entry) {
	key := list + " " + e.id
	if i, known := m.at[key]; known {
		if _, twice := m.below[key]; !twice {
			m.below[key] = m.entries[list][i]
		}
		m.entries[list][i] = e
		return
	}
	m.at[key] = len(m.entries[list])
	m.entries[list] = append(m.entries[list], e)
}

// entryID gives the id of an entry, or reports why it has none.
func (m *merge) entryID(s spot) (string, bool) {
	if s.node.Kind != yaml.MappingNode {
		m.collector.add(s, "is "+describe(s.node)+"; expected keys, the first of them id", "")
		return "", false
	}
	for i := 0; i+1 < len(s.node.Content); i += 2 {
		if s.node.Content[i].Value != "id" || s.node.Content[i].Kind != yaml.ScalarNode {
			continue
		}
		value := s.node.Content[i+1]
		if value.Kind == yaml.ScalarNode && kebab.MatchString(value.Value) {
			return value.Value, true
		}
		m.collector.add(spot{file: s.file, path: s.path + ".id", node: value},
			"is "+describe(value)+"; expected small letters and digits with hyphens between words, as in gate-leaky", "")
		return "", false
	}
	m.collector.add(s, "has no id", "add id: with small letters, digits and hyphens, as in gate-leaky")
	return "", false
}
