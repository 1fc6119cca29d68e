package measure

import (
	"bytes"
	"fmt"
	"strings"

	"pgregory.net/rapid"
)

// written is a file that the generator wrote, with the places of its keys.
type written struct {
	raw    []byte
	places map[string]place
}

// place is where a key stands.
type place struct {
	line, key, value, end, next int // of the line, the key, the value, the end of the value, the next line
	before, after               int // of a key in { }: after the text before it, and before the text after it
	flow                        bool
}

// touchOf gives the stretch that a change of a key owns; nil when the key is not there.
func (w written) touchOf(path string, clears bool) *touch {
	p, ok := w.places[path]
	switch {
	case !ok:
		return nil
	case !clears:
		return &touch{p.value, p.end}
	case p.flow:
		return &touch{p.before, p.after}
	}
	return &touch{p.line, p.next}
}

// writer writes a file in a style drawn piece by piece.
type writer struct {
	t      *rapid.T
	b      bytes.Buffer
	end    string
	step   int
	places map[string]place
}

func (w *writer) draw(among ...string) string { return rapid.SampledFrom(among).Draw(w.t, "piece") }

// lines writes comments and blank lines.
func (w *writer) lines() {
	for range rapid.IntRange(0, 2).Draw(w.t, "lines") {
		w.b.WriteString(w.draw("", "  ", "# note", "   # µ: {not a key}", "#") + w.end)
	}
}

// rest ends a line.
func (w *writer) rest() { w.b.WriteString(w.draw("", "", " ", "  # tail: [x]", " #") + w.end) }

// key writes a key and its colon and gives where it began.
func (w *writer) key(name string) int {
	at := w.b.Len()
	quote := w.draw("", "", "'", "\"")
	w.b.WriteString(quote + name + quote + ":")
	return at
}

// scalar writes a value.
func (w *writer) scalar(text string) {
	quote := w.draw("", "", "'", "\"")
	w.b.WriteString(quote + text + quote)
}

// item is a key of the generated file: with a value, keys below it, or entries.
type item struct {
	name, value string
	below       []item
	entries     [][]item
	list        bool
}

// block writes keys in lines.
func (w *writer) block(indent int, path string, items []item) {
	for _, it := range items {
		w.lines()
		w.one(indent, w.b.Len(), strings.Repeat(" ", indent), join(path, it.name), it)
	}
}

// one writes a key in lines behind what begins its line.
func (w *writer) one(indent, line int, lead, path string, it item) {
	w.b.WriteString(lead)
	p := place{line: line, key: w.key(it.name)}
	switch {
	case it.value != "":
		w.b.WriteString(w.draw(" ", "  ", "    "))
		p.value = w.b.Len()
		w.scalar(it.value)
		p.end = w.b.Len()
		w.rest()
	case it.list && len(it.entries) == 0:
		w.b.WriteString(w.draw(" []", "", " null", " ~", "  []", " [ ]"))
		w.rest()
	case it.list:
		w.list(indent, path, it.entries)
	case rapid.Bool().Draw(w.t, "flow"):
		w.b.WriteString(" ")
		w.flow(path, it.below)
		w.rest()
	default:
		w.rest()
		w.block(indent+w.step, path, it.below)
	}
	p.next = w.b.Len()
	if it.value != "" {
		w.places[path] = p
	}
}

// list writes entries, in lines or in brackets.
func (w *writer) list(indent int, path string, entries [][]item) {
	if rapid.Bool().Draw(w.t, "brackets") {
		w.b.WriteString(" [")
		for i, e := range entries {
			if i > 0 {
				w.b.WriteString(w.draw(",", ", ", ","+w.end+strings.Repeat(" ", indent+1)))
			}
			w.flow(fmt.Sprintf("%s[%d]", path, i), e)
		}
		w.b.WriteString(w.draw("]", " ]"))
		w.rest()
		return
	}
	w.rest()
	dash := indent + rapid.SampledFrom([]int{0, w.step}).Draw(w.t, "dash")
	for i, e := range entries {
		w.lines()
		w.b.WriteString(strings.Repeat(" ", dash) + "- ")
		at := fmt.Sprintf("%s[%d]", path, i)
		if rapid.Bool().Draw(w.t, "flow") {
			w.flow(at, e)
			w.rest()
			continue
		}
		for j, it := range e {
			if j == 0 {
				w.one(dash+2, w.b.Len(), "", join(at, it.name), it)
			} else {
				w.one(dash+2, w.b.Len(), strings.Repeat(" ", dash+2), join(at, it.name), it)
			}
		}
	}
}

// flow writes keys in { }.
func (w *writer) flow(path string, items []item) {
	space := w.draw("", "", " ")
	w.b.WriteString("{" + space)
	after := w.b.Len()
	var last string
	for i, it := range items {
		if i > 0 {
			before := w.b.Len()
			w.b.WriteString(w.draw(",", ", ", ",  "))
			if p, ok := w.places[last]; ok {
				p.after = w.b.Len()
				w.places[last] = p
			}
			after = before
		}
		p := place{flow: true, before: after, key: w.key(it.name)}
		w.b.WriteString(" ")
		last = join(path, it.name)
		switch {
		case it.list && len(it.entries) == 0:
			w.b.WriteString(w.draw("[]", "[ ]", "null", "~"))
			continue
		case it.list:
			w.b.WriteString("[")
			for j, e := range it.entries {
				w.b.WriteString(strings.Repeat(", ", min(j, 1)))
				w.flow(fmt.Sprintf("%s[%d]", last, j), e)
			}
			w.b.WriteString("]")
			continue
		case it.value == "":
			w.flow(last, it.below)
			continue
		}
		p.value = w.b.Len()
		w.scalar(it.value)
		p.end = w.b.Len()
		p.after = w.b.Len()
		w.places[last] = p
	}
	w.b.WriteString(space + "}")
}

// drawFile writes a case with some of the keys, in any style.
func drawFile(t *rapid.T) written {
	w := &writer{t: t, places: map[string]place{}, end: rapid.SampledFrom([]string{"\n", "\n", "\r\n", "\r"}).Draw(t, "line end"),
		step: rapid.IntRange(1, 5).Draw(t, "step")}
	w.b.WriteString(w.draw("", byteOrderMark))
	some := func(items ...item) []item {
		out := items[:0:0]
		for _, it := range items {
			if rapid.IntRange(0, 3).Draw(t, "there") > 0 {
				out = append(out, it)
			}
		}
		return out
	}
	group := func(name string, items ...item) item {
		if items = some(items...); len(items) == 0 {
			items = []item{{name: "title", value: "x"}}
			if name != "board" {
				return item{}
			}
		}
		return item{name: name, below: items}
	}
	link := []item{{name: "fitted", value: "2026-12-01T09:53:00+01:00"}}
	seen := []item{{name: "test", value: "driver-look"}, {name: "result", value: "whole"}, {name: "note", value: "brown at R14 – größer"}}
	items := append([]item{{name: "drivemend", value: "1"}, {name: "case", value: "a"}}, some(
		item{name: "owner", value: "Orchard cooperative"},
		item{name: "story", value: "Es lief voll – sofort"},
		group("board", item{name: "title", value: "pump"}, group("bus", item{name: "nominal", value: "310 V"}, item{name: "esr", value: "40 mΩ"}),
			group("switch", item{name: "kind", value: "igbt"}, item{name: "fall_time", value: "96 ns"}), group("loop", item{name: "inductance", value: "120 nH"})),
		group("safety", item{name: "link", list: true, entries: [][]item{link}[:rapid.IntRange(0, 1).Draw(t, "links")]},
			item{name: "isolation", list: true}),
		item{name: "observations", list: true, entries: [][]item{seen, seen}[:rapid.IntRange(0, 2).Draw(t, "observations")]},
		item{name: "steps", list: true},
		group("rebuild", group("snubber", item{name: "kind", value: "rcd"})),
	)...)
	w.block(0, "", dropEmpty(items))
	w.lines()
	raw := w.b.Bytes()
	if rapid.Bool().Draw(t, "no last line end") {
		raw = bytes.TrimRight(raw, "\r\n")
	}
	for path, p := range w.places {
		p.next = min(p.next, len(raw))
		w.places[path] = p
	}
	return written{raw, w.places}
}

// dropEmpty takes out groups that got no key.
func dropEmpty(items []item) []item {
	var out []item
	for _, it := range items {
		it.below = dropEmpty(it.below)
		if it.name != "" && (it.value != "" || it.list || it.below != nil) {
			out = append(out, it)
		}
	}
	return out
}
