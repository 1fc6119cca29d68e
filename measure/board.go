package measure

import (
	"maps"
	"slices"
	"strings"

	"drivemend/measure/quantity"
)

// Board answers for the keys of the key table by path ("switch.rated_voltage"; "board." in front may stand or
// not; an entry of a list as cooling.foster[1].time). The zero Board states nothing. A Board is never changed: With and its kin give another one.
type Board struct{ fields map[string]Field }

// Field is one stated key: exactly one of the value members is meaningful, by the key's kind.
type Field struct {
	Quantity quantity.Quantity // of quantity, count and ratio keys, in SI
	Word     string            // of word, yes-no and text keys
	Names    []string          // of lists: positions.low.parts; the stated positions under positions
	Assumed  bool              // listed under board.assumed
	Line     int               // in the file, 0 when not from a file
	numeric  bool
	silent   bool // a word that nobody can tell: answers as if not stated
}

// partsOfPosition, positionsKey and parallelKey are paths that the board itself answers for.
const (
	positionsKey = "positions"
	parallelKey  = "positions.parallel" // derived: parts of the largest bank
)

// short takes "board." off a path.
func short(path string) string { return strings.TrimPrefix(path, "board.") }

// Quantity gives the stated value of a quantity, count or ratio key, and whether it is stated. A quantity
// with conditions answers under its own name, its conditions below it: switch.fall_time.gate_resistance.
// The derived path positions.parallel gives the number of parts in the largest bank, brake left out.
func (b Board) Quantity(path string) (quantity.Quantity, bool) {
	path = short(path)
	if f, ok := b.fields[path]; ok && f.numeric {
		return f.Quantity, true
	}
	if path == parallelKey {
		return b.parallel()
	}
	return quantity.Quantity{}, false
}

// parallel counts the largest bank; unknown while neither topology nor parts are stated.
func (b Board) parallel() (quantity.Quantity, bool) {
	most, known := 0, false
	for _, p := range b.Positions() {
		if _, ok := b.fields[partsKey(p.Name)]; ok && p.Leg != brake {
			known = true
			most = max(most, len(p.Parts))
		}
	}
	return quantity.Of(float64(most), quantity.Count), known
}

// Word gives a stated word, yes/no/unknown or text key, and whether it is stated. A word key that is stated as
// unknown is not; a quantity that is stated in words (bleeder: none, capacitance: unknown) gives the word.
func (b Board) Word(path string) (string, bool) {
	f, ok := b.fields[short(path)]
	if !ok || f.numeric || f.silent || f.Names != nil {
		return "", false
	}
	return f.Word, true
}

// Unknown tells whether a key is stated as unknown: it was asked, and nobody can tell.
func (b Board) Unknown(path string) bool { return b.fields[short(path)].Word == unknown }

// Names gives a stated list of names (positions.low.parts), and whether it is stated.
func (b Board) Names(path string) ([]string, bool) {
	f, ok := b.fields[short(path)]
	return slices.Clone(f.Names), ok && f.Names != nil
}

// Stated tells whether a key, or any key below it, is stated.
func (b Board) Stated(path string) bool {
	path = short(path)
	for p := range b.fields {
		if within(p, path) {
			return true
		}
	}
	return false
}

// Paths gives every stated key in the order of the key table, keys of positions and lists sorted by name.
func (b Board) Paths() []string {
	rank := map[string]int{}
	for i, k := range keyTable().rows {
		rank[k.Board()] = i
	}
	order := func(path string) int {
		k, ok := LookupKey("board." + path)
		if !ok {
			return len(rank)
		}
		return rank[k.Board()]
	}
	paths := slices.Sorted(maps.Keys(b.fields))
	slices.SortStableFunc(paths, func(x, y string) int { return order(x) - order(y) })
	return paths
}

// Assumed tells whether a key, or the group it stands in, is listed under assumed.
func (b Board) Assumed(path string) bool { return b.fields[short(path)].Assumed }

// At gives the board as one position sees it: its overrides laid over the board's switch keys. A position
// without overrides, or that is not there, gives the board itself.
func (b Board) At(position string) Board {
	prefix := positionsKey + "." + position + "."
	out := b
	for _, path := range slices.Sorted(maps.Keys(b.fields)) {
		if own, ok := strings.CutPrefix(path, prefix); ok && own != "parts" {
			out = out.put("switch."+own, b.fields[path])
		}
	}
	return out
}

// With gives the board with one quantity, count or ratio key set; conditions of the old value fall away.
// Tests, scans and the rebuild use it; the range is not checked.
func (b Board) With(path string, q quantity.Quantity) Board {
	path = short(path)
	f := b.fields[path]
	return b.put(path, Field{Quantity: q, numeric: true, Assumed: f.Assumed, Line: f.Line})
}

// WithWord gives the board with one word, yes-no or text key set.
func (b Board) WithWord(path, word string) Board {
	path = short(path)
	f := b.fields[path]
	return b.put(path, Field{Word: word, Assumed: f.Assumed, Line: f.Line})
}

// WithParts gives the board with the parts of one position set.
func (b Board) WithParts(position string, parts ...string) Board {
	stated := b.fields[positionsKey]
	if !slices.Contains(stated.Names, position) {
		stated.Names = append(slices.Clone(stated.Names), position)
	}
	return b.put(partsKey(position), Field{Names: slices.Clone(parts)}).put(positionsKey, stated)
}

// Without gives the board with a key and everything below it taken out.
func (b Board) Without(path string) Board {
	path = short(path)
	out := Board{fields: maps.Clone(b.fields)}
	maps.DeleteFunc(out.fields, func(p string, _ Field) bool { return within(p, path) })
	return out
}

// put sets a field. A value stated anew loses the conditions of the one before.
func (b Board) put(path string, f Field) Board {
	out := Board{fields: maps.Clone(b.fields)}
	if out.fields == nil {
		out.fields = map[string]Field{}
	}
	if f.numeric && path != positionsKey {
		maps.DeleteFunc(out.fields, func(p string, _ Field) bool { return p != path && within(p, path) })
	}
	out.fields[path] = f
	return out
}

// partsKey is the path of a position's parts.
func partsKey(position string) string { return positionsKey + "." + position + ".parts" }

// cloneFields copies fields, never nil.
func cloneFields(in map[string]Field) map[string]Field {
	out := maps.Clone(in)
	if out == nil {
		out = map[string]Field{}
	}
	return out
}
