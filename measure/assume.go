package measure

import (
	"slices"
	"strings"

	"gopkg.in/yaml.v3"
)

// section splits a path into the board section it stands in, board or rebuild, and the board key.
func section(path string) (name, key string) {
	if key, ok := strings.CutPrefix(path, "rebuild."); ok {
		return "rebuild", key
	}
	return "board", short(path)
}

// assumedIn gives the list of assumed keys of a section as written.
func (f *File) assumedIn(name string) []string {
	_, m := pair(f.root, name)
	if m == nil || m.Kind != yaml.MappingNode {
		return nil
	}
	_, list := pair(m, "assumed")
	if list == nil {
		return nil
	}
	var out []string
	for _, n := range list.Content {
		out = append(out, n.Value)
	}
	return out
}

// Assume lists a board key as assumed: typed or taken over, but not known to be true of this board. A key of the
// rebuild is named with rebuild. in front.
func (f *File) Assume(path string) error {
	name, key := section(path)
	for _, listed := range f.assumedIn(name) {
		if within(key, short(listed)) {
			return nil
		}
	}
	return f.change(name+".assumed", &content{item: scalar(key, true)}, true)
}

// Settle takes a board key off the list of assumed keys, once it is known to be true of this board. Where its whole
// group was listed, the other stated keys of the group stay on the list.
func (f *File) Settle(path string) error {
	name, key := section(path)
	board := f.Case.Board
	if name == "rebuild" && f.Case.Rebuild != nil {
		board = f.Case.Rebuild.Board
	}
	var rest []string
	found := false
	for _, listed := range f.assumedIn(name) {
		if !within(key, short(listed)) {
			if !slices.Contains(rest, listed) {
				rest = append(rest, listed)
			}
			continue
		}
		found = true
		for _, other := range board.Paths() {
			if within(other, short(listed)) && !within(other, key) && !slices.Contains(rest, other) {
				rest = append(rest, other)
			}
		}
	}
	switch {
	case !found:
		return nil
	case rest == nil:
		return f.Clear(name + ".assumed")
	}
	return f.Set(name+".assumed", strings.Join(rest, " "))
}
