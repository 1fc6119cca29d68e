package measure

import (
	"regexp"
	"strings"
	"sync"

	"drivemend/measure/quantity"
)

// Kind tells what may stand under a key.
type Kind string

// The kinds of key.
const (
	KindQuantity Kind = "quantity" // a number with a unit
	KindReading  Kind = "reading"  // what an instrument showed, any unit
	KindWord     Kind = "word"     // one of Words
	KindYesNo    Kind = "yes-no"   // yes, no, unknown
	KindCount    Kind = "count"    // a whole number
	KindRatio    Kind = "ratio"    // 0.3 or 30 %
	KindText     Kind = "text"
	KindName     Kind = "name"  // an id or a part: one word without blanks
	KindTime     Kind = "time"  // RFC 3339 with offset
	KindDate     Kind = "date"  // 2026-12-01
	KindList     Kind = "list"  // of names, or of maps whose keys are listed under PATH[]
	KindMap      Kind = "map"   // of the keys listed below it
	KindNamed    Kind = "named" // a map whose own keys are names: positions
)

// Typical is what is taken for a key that a case does not state.
type Typical struct {
	For    string // the class of board it holds for, "" for every board
	Text   string // as a technician writes it
	Source string // where it comes from, or how sure it is
}

// Key is one row of the key table.
type Key struct {
	Path     string // from the top of the file; * is a name of your own, [] an entry of a list
	Kind     Kind
	Unit     quantity.Unit // of a quantity
	Min, Max float64       // physical range in the SI unit, both ends allowed; Min = Max = 0: not limited
	Typical  []Typical     // in the order of the classes
	Words    []string      // allowed words
	Help     string        // one plain line
	Users    []string      // what needs it
	Required bool
	Form     *Form // what a name looks like beyond being one word; nil: anything
	// MayBeUnknown: the word unknown may stand in place of a value: it was asked and nobody can tell. The board then
	// answers as if the key were not stated. A quantity with Words takes these in place of a number (bleeder: none).
	MayBeUnknown bool
}

// Form is what a name must look like.
type Form struct {
	Pattern *regexp.Regexp // of the whole name; common to Go and ECMA 262, as it also stands in the schema
	Said    string         // in words
}

// Board gives the path as the board and the rule base know it: without "board.".
func (k Key) Board() string { return strings.TrimPrefix(k.Path, "board.") }

// rung is a key with the keys below it.
type rung struct {
	Key
	names []string // of the children, in table order
	below map[string]*rung
}

// child gives the key of a name below this one, and whether there is one.
func (r *rung) child(name string) (*rung, bool) {
	if c, ok := r.below[name]; ok {
		return c, true
	}
	c, ok := r.below["*"]
	return c, ok
}

// keyTable builds the tree once: rows in order and the tree over them.
var keyTable = sync.OnceValue(func() *table {
	t := &table{root: &rung{Key: Key{Kind: KindMap, Help: "one failed board"}, below: map[string]*rung{}}}
	for _, rows := range [][]Key{caseKeys(), boardKeys(), recordKeys(), historyKeys(), rebuildKeys(), outcomeKeys()} {
		for _, k := range rows {
			t.add(k)
		}
	}
	return t
})

// table is the key table in use.
type table struct {
	rows []Key
	root *rung
}

// add hangs a row below its parent, which stands in an earlier row.
func (t *table) add(k Key) {
	at := t.root
	parts := steps(k.Path)
	for _, name := range parts[:len(parts)-1] {
		if name == "[]" && at.below[name] == nil {
			at.below[name] = &rung{Key: Key{Path: at.Path + "[]", Kind: KindMap, Help: "one entry of " + at.Path}, below: map[string]*rung{}}
		}
		at = at.below[name]
	}
	last := parts[len(parts)-1]
	at.names = append(at.names, last)
	at.below[last] = &rung{Key: k, below: map[string]*rung{}}
	t.rows = append(t.rows, k)
}

// steps splits a table path: observations[].test is observations, [], test.
func steps(path string) []string {
	return strings.Split(strings.ReplaceAll(path, "[]", ".[]"), ".")
}

// Keys gives every key of a case file in table order. The slice is the caller's.
func Keys() []Key { return append([]Key(nil), keyTable().rows...) }

// LookupKey finds the row of a key by its path, with or without "board." in front, a position's own name or a
// number in brackets standing for * and []: positions.low.parts, observations[3].test. The brackets may be left out:
// steps.step.
func LookupKey(path string) (Key, bool) {
	for _, full := range []string{path, "board." + path} {
		if r := keyTable().find(full); r != nil {
			return r.Key, true
		}
	}
	return Key{}, false
}

// listed is the step into a list: any entry, or one by number.
var listed = regexp.MustCompile(`^\[\d*\]$`)

// find walks to a path's rung; nil when the table has none.
func (t *table) find(path string) *rung {
	at := t.root
	for _, name := range strings.Split(strings.ReplaceAll(path, "[", ".["), ".") {
		if listed.MatchString(name) {
			name = "[]"
		}
		next, ok := at.child(name)
		if item := at.below["[]"]; !ok && item != nil {
			next, ok = item.child(name)
		}
		if !ok || (name == "[]") != (next.Path[len(next.Path)-1] == ']') {
			return nil
		}
		at = next
	}
	return at
}

// NearestKey gives the valid key whose path is most like the given one, as a path of the same form (without
// "board." when the given one had none); "" when nothing is near.
func NearestKey(path string) string {
	full := strings.HasPrefix(path, "board.")
	best, bestCost := "", 1+len(path)/3
	inEntry := 1 + len(path[strings.LastIndex(path, ".")+1:])/3 // the list's own name tells nothing of the key's
	for _, k := range keyTable().rows {
		if k.Kind == KindMap || strings.ContainsRune(k.Path, '*') {
			continue
		}
		for _, form := range []string{k.Path, k.Board()} {
			if full && form != k.Path {
				continue
			}
			cost := Distance(path, form)
			if inList := strings.ReplaceAll(form, "[]", ""); inList != form {
				if cost = Distance(bracket.ReplaceAllString(path, ""), inList); cost > inEntry {
					continue
				}
			}
			if cost < bestCost {
				best, bestCost = form, cost
			}
		}
	}
	if best == "" {
		return elsewhere(path[strings.LastIndex(path, ".")+1:], full)
	}
	return best
}

// bracket is the number of an entry in a path.
var bracket = regexp.MustCompile(`\[\d*\]`)

// nearHint names the nearest valid key, "" when none is near.
func nearHint(path string) string {
	if near := NearestKey(path); near != "" {
		return "nearest is " + near
	}
	return ""
}

// elsewhere finds a name that stands in another group than the one it was looked for in.
func elsewhere(name string, full bool) string {
	for _, k := range keyTable().rows {
		if strings.HasPrefix(k.Path, "rebuild.") || strings.ContainsAny(k.Path, "*[") {
			continue
		}
		if strings.HasSuffix(k.Path, "."+name) || k.Path == name {
			if full {
				return k.Path
			}
			return k.Board()
		}
	}
	return ""
}

// nearest gives the word most like the given one; "" when none is near.
func nearest(word string, among []string) string {
	best, bestCost := "", 1+max(1, len(word)/3)
	for _, w := range among {
		cost := min(Distance(word, w), Distance(joined(word), joined(w))) // handover for handed-over
		if stem := strings.TrimSuffix(strings.ToLower(word), "s"); len(stem) > 3 && strings.Contains(w, stem) {
			cost = min(cost, 1) // mains for rectified-mains, photos for photographs
		}
		if cost < bestCost {
			best, bestCost = w, cost
		}
	}
	return best
}

// joined takes the hyphens out of a word.
func joined(word string) string { return strings.ReplaceAll(word, "-", "") }

// Distance counts the letters to add, drop, change or swap with a neighbour to turn a into b, capitals left aside
// (optimal string alignment).
func Distance(a, b string) int {
	x, y := []rune(strings.ToLower(a)), []rune(strings.ToLower(b))
	if len(x) > 80 {
		x = x[:80] // a longer word is near to nothing
	}
	before, last, row := []int(nil), make([]int, len(y)+1), make([]int, len(y)+1)
	for j := range last {
		last[j] = j
	}
	for i := 1; i <= len(x); i++ {
		row[0] = i
		for j := 1; j <= len(y); j++ {
			cost := 1
			if x[i-1] == y[j-1] {
				cost = 0
			}
			row[j] = min(last[j]+1, row[j-1]+1, last[j-1]+cost)
			if i > 1 && j > 1 && x[i-1] == y[j-2] && x[i-2] == y[j-1] {
				row[j] = min(row[j], before[j-2]+1)
			}
		}
		before, last, row = last, row, make([]int, len(y)+1)
	}
	return last[len(y)]
}
