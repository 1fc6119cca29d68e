package measure

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"

	"gopkg.in/yaml.v3"

	"drivemend/measure/quantity"
)

// refusal is a change that was refused before it was tried.
func refusal(key, message, hint string) error {
	return Problems{{Key: key, Message: message, Hint: hint}}
}

// Set puts a value under a key, given by its whole path (board.bus.nominal, outcome.stress, story), as a technician
// writes it. Lists of names take them parted by commas or blanks. The error is a Problems, and then nothing is changed.
func (f *File) Set(path, text string) error {
	k, ok := LookupKey(path)
	if ok && k.Path != path && (!strings.ContainsRune(k.Path, '*') || strings.Contains(k.Path, "[]") && !strings.ContainsRune(path, '[')) {
		ok = false // found only with board. in front, or with the entries of a list left out
	}
	switch {
	case !ok:
		return refusal(path, "unknown key", nearHint(path))
	case strings.ContainsRune(path, '['), k.Kind == KindMap, k.Kind == KindNamed, k.Kind == KindList && hasItems(k):
		return refusal(path, "this key holds other keys", "set one of them")
	}
	path = f.plainPath(path)
	c := value(text)
	if k.Kind == KindList {
		c = names(text)
	}
	return f.change(path, c, false)
}

// plainPath takes .value off the path of a quantity that has no conditions.
func (f *File) plainPath(path string) string {
	quantityPath, ok := strings.CutSuffix(path, ".value")
	n := f.root
	for _, name := range strings.Split(quantityPath, ".") {
		if n != nil && n.Kind == yaml.MappingNode {
			_, n = pair(n, name)
		}
	}
	if !ok || n != nil && n.Kind == yaml.MappingNode {
		return path
	}
	return quantityPath
}

// hasItems tells whether a list holds maps.
func hasItems(k Key) bool {
	r := keyTable().find(k.Path)
	return r != nil && len(r.below) > 0
}

// names is the content of a list of names.
func names(text string) *content {
	words := strings.FieldsFunc(text, func(r rune) bool { return strings.ContainsRune(" ,;[]\t\r\n", r) })
	return &content{text: func(bool) string {
		out := make([]string, len(words))
		for i, w := range words {
			out[i] = scalar(w, true)
		}
		return "[" + strings.Join(out, ", ") + "]"
	}}
}

// SetBoard sets one board key to a value as a technician writes it: SetBoard("bus.nominal", "310 V").
func (f *File) SetBoard(path, text string) error { return f.Set("board."+short(path), text) }

// SetRebuild sets one board key of the chosen rebuild.
func (f *File) SetRebuild(path, text string) error {
	return f.Set("rebuild."+strings.TrimPrefix(path, "rebuild."), text)
}

// SetStory sets what happened, in the owner's words.
func (f *File) SetStory(text string) error { return f.Set("story", text) }

// MarkRebuilt says when the rebuild was done.
func (f *File) MarkRebuilt(at time.Time) error { return f.Set("rebuild.done", stamp(at)) }

// Clear takes a stated key out, with everything below it. Clearing what is not stated changes nothing.
func (f *File) Clear(path string) error {
	m, parts := f.root, strings.Split(path, ".")
	for _, name := range parts[:len(parts)-1] {
		if _, m = pair(m, name); m == nil || m.Kind != yaml.MappingNode {
			return nil
		}
	}
	key, old := pair(m, parts[len(parts)-1])
	if key == nil {
		return nil
	}
	e := &editor{f.src, styleOf(f.src, f.root)}
	return f.adopt(applied(f.src.raw, e.remove(m, key, old)), path)
}

// Observe appends an observation; the case is parsed anew and every problem is returned with nothing changed.
// A reading without a text is written out from its numbers. Line is not used.
func (f *File) Observe(o Observation) error {
	accuracy, reach := "", ""
	if o.Accuracy != 0 {
		accuracy = strconv.FormatFloat(o.Accuracy, 'g', -1, 64)
	}
	if o.Range != 0 {
		unit := quantity.Ohm
		if o.Reading != nil && o.Reading.Unit != quantity.Any && o.Reading.Unit != "" {
			unit = o.Reading.Unit
		}
		reach = exact(o.Range, unit)
	}
	return f.appendTo("observations", fields("test", o.Test, "part", o.Part, "position", o.Position, "at", timeText(o.At),
		"result", o.Result, "reading", readingText(o.Reading), "twin", readingText(o.Twin), "answer", o.Answer, "seen", o.Seen,
		"polarity", o.Polarity, "state", o.State, "motor", o.Motor, "surface", o.Surface, "instrument", o.Instrument,
		"accuracy", accuracy, "range", reach, "note", o.Note))
}

// Isolate appends a statement that the board is cut off from every source.
func (f *File) Isolate(i Isolation) error {
	return f.appendTo("safety.isolation", fields("locked", yesNoText(i.Locked), "motor", i.Motor, "other_sources", i.OtherSources, "at", timeText(i.At)))
}

// Check appends a dead check; an AC voltage without unit was not read.
func (f *File) Check(d DeadCheck) error {
	ac := ""
	if d.AC.Unit != "" || d.AC.Text != "" {
		ac = quantityText(d.AC)
	}
	return f.appendTo("safety.dead_checks", fields("point", d.Point, "dc", quantityText(d.DC), "ac", ac, "meter_proved", yesNoText(d.MeterProved), "at", timeText(d.At)))
}

// FitLink appends a shorting link fitted at a time.
func (f *File) FitLink(at time.Time) error {
	return f.appendTo("safety.link", fields("fitted", timeText(at)))
}

// RemoveLink says when the link that is fitted was taken off. Without a fitted link it is refused.
func (f *File) RemoveLink(at time.Time) error {
	links := f.Case.Safety.Links
	open := -1
	for i, l := range links {
		if l.Removed.IsZero() {
			open = i
		}
	}
	if open < 0 {
		return refusal("safety.link", "no link is fitted", "")
	}
	_, safety := pair(f.root, "safety")
	_, list := pair(safety, "link")
	e := &editor{f.src, styleOf(f.src, f.root)}
	edits := e.set(list.Content[open], []string{"removed"}, value(stamp(at)))
	return f.adopt(applied(f.src.raw, edits), "")
}

// Energise appends a moment at which energy was put into the board.
func (f *File) Energise(n Energised) error {
	return f.appendTo("safety.energised", fields("what", n.What, "at", timeText(n.At)))
}

// appendTo adds an entry to a list.
func (f *File) appendTo(path string, m flowMap) error {
	return f.change(path, &content{item: m.String()}, true)
}

// change plans the edits for a content under a path and takes them over.
func (f *File) change(path string, c *content, grows bool) error {
	e := &editor{f.src, styleOf(f.src, f.root)}
	raw := applied(f.src.raw, e.set(f.root, strings.Split(path, "."), c))
	if grows {
		path = ""
	}
	return f.adopt(raw, path)
}

// adopt takes new bytes over if they load and say the same as before everywhere but below the changed path; without
// a path, if they say all that was said before and more.
func (f *File) adopt(raw []byte, path string) error {
	next, err := Parse(f.Path, raw)
	if err != nil {
		if p, ok := err.(Problems); ok {
			return p.placeless()
		}
		return err
	}
	before, after := facts(f.root, "", path), facts(next.root, "", path)
	if path == "" && !contains(after, before) || path != "" && !slices.Equal(before, after) {
		return refusal(path, "this file is written in a way that cannot be changed without touching other lines",
			"change it in an editor")
	}
	f.Case, f.src, f.root = next.Case, next.src, next.root
	return nil
}

// contains tells whether all facts stand in another list in the same order.
func contains(all, some []string) bool {
	for _, fact := range all {
		if len(some) > 0 && some[0] == fact {
			some = some[1:]
		}
	}
	return len(some) == 0
}

// facts lists what a tree says outside a path: the proof that a change left everything else alone. Maps and lists
// that hold nothing count as not there.
func facts(n *yaml.Node, path, outside string) []string {
	if path == outside && path != "" {
		return nil
	}
	switch n.Kind {
	case yaml.MappingNode:
		var out []string
		for i := 0; i+1 < len(n.Content); i += 2 {
			name := n.Content[i].Value
			if at := join(path, name); name == "value" && at != outside && strings.HasPrefix(outside, path+".") {
				name = "" // a plain value that gets a condition says the same under value
			}
			at := path
			if name != "" {
				at = join(path, name)
			}
			out = append(out, facts(n.Content[i+1], at, outside)...)
		}
		return out
	case yaml.SequenceNode:
		var out []string
		for i, c := range n.Content {
			out = append(out, facts(c, fmt.Sprintf("%s[%d]", path, i), outside)...)
		}
		return out
	}
	if empty(n) {
		return nil
	}
	return []string{path + " = " + n.Value}
}

// flowMap gathers keys of an entry written as { }.
type flowMap struct{ keys []string }

// fields makes an entry of keys and their texts by turns; a key without a text is left out.
func fields(pairs ...string) flowMap {
	var m flowMap
	for i := 0; i+1 < len(pairs); i += 2 {
		if pairs[i+1] != "" {
			m.keys = append(m.keys, pairs[i]+": "+scalar(pairs[i+1], true))
		}
	}
	return m
}

// String gives the map as it is written.
func (m *flowMap) String() string { return "{" + strings.Join(m.keys, ", ") + "}" }

// yesNoText writes a yes-no value.
func yesNoText(yes bool) string {
	if yes {
		return "yes"
	}
	return "no"
}

// timeText writes a time; none is left out.
func timeText(at time.Time) string {
	if at.IsZero() {
		return ""
	}
	return stamp(at)
}

// stamp writes a time with its offset.
func stamp(at time.Time) string { return at.Format(time.RFC3339Nano) }

// quantityText gives a quantity as written, or written out.
func quantityText(q quantity.Quantity) string {
	if q.Text != "" {
		return q.Text
	}
	if q.Low == q.Value && q.High == q.Value {
		return exact(q.Value, q.Unit)
	}
	return q.String()
}

// exact writes a number without losing a digit: in its SI unit, or with a prefix where that would need a power of ten.
func exact(v float64, unit quantity.Unit) string {
	plain := strconv.FormatFloat(v, 'g', -1, 64)
	short := quantity.Format(v, unit)
	if q, err := quantity.Parse(short, unit); strings.Contains(plain, "e") && err == nil && q.Value == v {
		return short
	}
	return plain + " " + string(unit)
}

// readingText gives a reading as written, or written out.
func readingText(r *quantity.Reading) string {
	switch {
	case r == nil:
		return ""
	case r.Text != "":
		return r.Text
	}
	switch r.Kind {
	case quantity.Between:
		return exact(r.Low, r.Unit) + " to " + exact(r.High, r.Unit)
	case quantity.Above:
		return "> " + exact(r.Low, r.Unit)
	case quantity.Below:
		return "< " + exact(r.High, r.Unit)
	case quantity.Over:
		return "OL"
	case quantity.Word:
		return r.Word
	}
	return exact(r.Value, r.Unit)
}
