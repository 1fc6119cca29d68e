package measure

import (
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// node is a case as it is generated: maps, lists and texts as they are written.
type node struct {
	keys  []string
	below map[string]*node
	text  string
}

// put sets a text at a table path, one entry in each list.
func (n *node) put(path, text string) {
	at := n
	for _, step := range steps(strings.ReplaceAll(path, "*", "low")) {
		if at.below == nil {
			at.below = map[string]*node{}
		}
		if at.below[step] == nil {
			at.below[step] = &node{}
			at.keys = append(at.keys, step)
		}
		at = at.below[step]
	}
	at.text = text
}

// flow writes a node in flow style.
func (n *node) flow() string {
	if n.below == nil {
		return n.text
	}
	if item := n.below["[]"]; item != nil {
		return "[" + item.flow() + "]"
	}
	var parts []string
	for _, k := range n.keys {
		parts = append(parts, k+": "+n.below[k].flow())
	}
	return "{" + strings.Join(parts, ", ") + "}"
}

// drawValue draws a valid value of a key, as it is written in flow style.
func drawValue(t *rapid.T, k Key) string {
	sample, _ := sampleOf(k)
	choices := []string{scalar(sample, true)}
	switch k.Kind {
	case KindList:
		return "[Q1, 'Q 2', 3, true]"
	case KindReading:
		choices = []string{"0.4 Ω", "OL", "'> 20 MΩ'", "above 20 MΩ", "shorted", "no", "true", "4 kΩ to 6 kΩ", "\"0.2\\u00a0\\u2126\"", "30 %", "3 pieces"}
	case KindYesNo:
		choices = []string{"yes", "no", "unknown", "true", "False", "'YES'", "nO"}
	case KindText:
		choices = []string{"plain", "''", "0042", "1.20", "null", "true", "'a: b'"}
	case KindName:
		choices = []string{"a", "42", "true", "Q1", "'2026-12-01'"}
		if k.Form != nil {
			choices = []string{strings.Repeat("a1", 32), strings.Repeat("1", 64)}
		}
	case KindTime:
		choices = []string{"2026-12-01T09:40:00+01:00", "2026-12-01T09:40:00.5Z", "' 2026-12-01T09:40:00Z '"}
	case KindWord:
		choices = k.Words
	case KindCount, KindRatio:
		choices = append(choices, "1", "'1'")
		if k.Min > 1 || k.Max < 1 && k.Max != 0 {
			choices = choices[:1]
		}
	case KindQuantity:
		choices = append(choices, "'"+strings.ReplaceAll(sample, " ", "\u00a0")+"'", scalar(strings.NewReplacer("µ", "\u03bc", "Ω", "\u2126").Replace(sample), true))
	}
	if k.MayBeUnknown {
		choices = append(choices, unknown)
	}
	if slices.Contains(k.Words, "none") {
		choices = append(choices, "none")
	}
	return rapid.SampledFrom(choices).Draw(t, "value")
}

// TestSchemaProperty draws cases from the table, whole and spoiled in one place, and proves that loader and schema
// agree. Contradictions, which no schema sees, are left out of the comparison.
func TestSchemaProperty(t *testing.T) {
	s := compiledSchema(t)
	var leaves []Key
	for _, k := range Keys() {
		if !holdsKeys(k.Path) && k.Path != "drivemend" && k.Path != "case" {
			leaves = append(leaves, k)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		root := &node{}
		root.put("drivemend", "1")
		root.put("case", "a")
		for _, k := range rapid.SliceOfN(rapid.SampledFrom(leaves), 1, 12).Draw(t, "keys") {
			fill(t, root, k)
		}
		spoiled := rapid.Bool().Draw(t, "spoiled")
		if spoiled {
			spoil(t, root, rapid.SampledFrom(leaves).Draw(t, "victim"))
		}
		text := root.flow() + "\n"
		v, ok := editorReads([]byte(text))
		if !ok {
			t.Fatalf("no YAML: %s", text)
		}
		refused := s.Validate(v)
		_, err := Parse("x", []byte(text))
		if spoiled && err == nil {
			t.Fatalf("the spoiled case loads: %s", text)
		}
		if err != nil && between(err) {
			err = nil
		}
		if (err == nil) != (refused == nil) {
			t.Fatalf("loader: %v\nschema: %v\n%s", err, refused, text)
		}
	})
}

// fill puts a valid value under a key, with the keys that its map requires. A figure with conditions stays plain
// unless a condition is drawn.
func fill(t *rapid.T, root *node, k Key) {
	parent := k.Path[:max(strings.LastIndex(k.Path, "."), 0)]
	for _, other := range Keys() {
		if other.Required && strings.HasPrefix(k.Path, other.Path[:max(strings.LastIndex(other.Path, "."), 0)]+".") && !hasItems(other) {
			root.put(other.Path, drawValue(t, other))
		}
	}
	if up, ok := LookupKey(parent); ok && up.Kind == KindQuantity || len(keyTable().find(k.Path).below) > 0 {
		if !ok || up.Kind != KindQuantity {
			k, _ = LookupKey(k.Path + ".value")
		}
	}
	root.put(k.Path, drawValue(t, k))
}

// spoil makes one value wrong, or adds a key that is none.
func spoil(t *rapid.T, root *node, k Key) {
	fill(t, root, k)
	if len(keyTable().find(k.Path).below) > 0 {
		k, _ = LookupKey(k.Path + ".value")
	}
	wrong := []string{"{a: 1}"}
	switch k.Kind {
	case KindQuantity:
		wrong = []string{"3", "'3'", "3 parsec", "''", "three", "[]"}
		if k.Unit != "A" && k.Unit != "?" {
			wrong = append(wrong, "3 A", "3 kA ±5 %")
		}
	case KindReading:
		wrong = []string{"3", "3 parsec", "two words", "nan", "V", "4 kΩ or so"}
	case KindWord:
		wrong = []string{"no-such-word", "''", "1", "[]", "true"}
	case KindYesNo:
		wrong = []string{"maybe", "1", "''", "on"}
	case KindCount:
		wrong = []string{"-1", "1.5", "many", "3 V", "true"}
	case KindRatio:
		wrong = []string{"1e9", "much", "3 V", "-1000"}
	case KindTime:
		wrong = []string{"2026-12-01", "2026-13-01T09:40:00Z", "2026-12-01T09:40:00", "noon"}
	case KindDate:
		wrong = []string{"2026-12-32", "1.12.2026", "2026-12-01T09:40:00Z"}
	case KindName:
		wrong = []string{"two words", "''", "null", "[]"}
	case KindList:
		wrong = []string{"Q1", "[null]", "['']", "{}"}
	case KindText:
		wrong = []string{"[]", "{}"}
	}
	if rapid.Bool().Draw(t, "unknown key") {
		root.put(k.Path[:strings.LastIndex(k.Path, ".")+1]+"zzz-none", "1")
		return
	}
	root.put(k.Path, rapid.SampledFrom(wrong).Draw(t, "wrong"))
}

// between tells whether every fault of a file lies between keys: none in a key or a value by itself.
func between(err error) bool {
	p, ok := err.(Problems)
	for _, fault := range p {
		if strings.Contains(fault.Message, "this condition belongs to") {
			return false
		}
		if !strings.Contains(fault.Message, "contradicts") && !slices.ContainsFunc([]string{"does not fit in the period", "has no part", "has no position",
			"not a board key", "listed as assumed", "stands twice; first in"}, func(s string) bool { return strings.Contains(fault.Message, s) }) {
			return false
		}
	}
	return ok
}
