package measure

import (
	"bytes"
	"fmt"
	"maps"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"gopkg.in/yaml.v3"
	"pgregory.net/rapid"
)

// What is proved here is proved without the editor: from the bytes before and after, from places that the generator of
// the file wrote down, and from what the YAML library alone reads in both.

// alteration is one change of a file together with what it may touch.
type alteration struct {
	name  string
	do    func(*File) error
	list  string            // the list that grows, "" when none does
	entry map[string]string // what the new entry says
	path  string            // the key that is set or taken out, "" when none is
	value string            // what it is set to; "" takes it out
}

// statements reads what a file says, path by path, by the library alone.
func statements(t failer, raw []byte) map[string]string {
	var doc yaml.Node
	if err := yaml.Unmarshal(raw, &doc); err != nil {
		t.Fatalf("no YAML any more: %v\n%s", err, raw)
	}
	out := map[string]string{}
	var walk func(n *yaml.Node, path string)
	walk = func(n *yaml.Node, path string) {
		for i, c := range n.Content {
			switch n.Kind {
			case yaml.DocumentNode:
				walk(c, "")
			case yaml.SequenceNode:
				walk(c, fmt.Sprintf("%s[%d]", path, i))
			case yaml.MappingNode:
				if i%2 == 1 {
					walk(c, path+"."+n.Content[i-1].Value)
				}
			}
		}
		if n.Kind == yaml.ScalarNode && n.Tag != "!!null" {
			out[path] = n.Value
		}
	}
	walk(&doc, "")
	return out
}

// failer is what a test and a property share.
type failer interface{ Fatalf(string, ...any) }

// touch is a stretch of the old bytes that a change may replace.
type touch struct{ from, to int }

// kept tells whether the new bytes are the old ones but for one stretch.
func kept(before, after []byte, s touch) bool {
	return len(after) >= s.from+len(before)-s.to && bytes.HasPrefix(after, before[:s.from]) && bytes.HasSuffix(after, before[s.to:])
}

// onlyInserted tells whether the new bytes are the old ones with one text put in.
func onlyInserted(before, after []byte) bool {
	head := 0
	for head < len(before) && head < len(after) && before[head] == after[head] {
		head++
	}
	return len(after) >= len(before) && bytes.HasSuffix(after, before[head:])
}

// grown tells whether a list grew and nothing else changed: one text was put in, and at most the sign of an empty list,
// with the blanks before it, went away.
func grown(before, after []byte) bool {
	if onlyInserted(before, after) {
		return true
	}
	for _, sign := range []string{"[]", "[ ]", "null", "~", "Null", "NULL"} {
		for at := 0; ; at++ {
			next := bytes.Index(before[at:], []byte(sign))
			if next < 0 {
				break
			}
			at += next
			for from := at; from >= 0 && (from == at || before[from] == ' '); from-- {
				if onlyInserted(slices.Concat(before[:from], before[at+len(sign):]), after) {
					return true
				}
			}
		}
	}
	return false
}

// lineEnds gives the kinds of line end of a text.
func lineEnds(raw []byte) []string {
	var out []string
	rest := strings.ReplaceAll(string(raw), "\r\n", "")
	for kind, there := range map[string]bool{"\r\n": len(rest) < len(raw), "\n": strings.Contains(rest, "\n"), "\r": strings.Contains(rest, "\r")} {
		if there {
			out = append(out, kind)
		}
	}
	slices.Sort(out)
	return out
}

// checkKept makes a change and proves that it did what it should and nothing else. Allowed gives the stretch a set or
// cleared key owns; nil where the key is new. It tells whether the change was made.
func checkKept(t failer, f *File, a alteration, allowed *touch) bool {
	before, was := f.Bytes(), f.Case
	said := statements(t, before)
	fail := func(format string, args ...any) {
		now := f.Bytes()
		at := 0
		for at < len(before) && at < len(now) && before[at] == now[at] {
			at++
		}
		t.Fatalf("%s: %s\nfrom byte %d on, before\n%.400q\nafter\n%.400q", a.name, fmt.Sprintf(format, args...), max(0, at-60), before[max(0, at-60):], now[max(0, at-60):])
	}
	if err := a.do(f); err != nil {
		if !bytes.Equal(f.Bytes(), before) || f.Case != was {
			fail("refused with %v, but changed", err)
		}
		return false
	}
	after := f.Bytes()
	if bytes.Equal(before, after) {
		return true
	}
	switch {
	case a.list != "" && !grown(before, after):
		fail("more was changed than the list that grew")
	case a.list == "" && allowed == nil && !onlyInserted(before, after):
		fail("more was changed than one key put in")
	case a.list == "" && allowed != nil && !kept(before, after, *allowed):
		fail("bytes outside %d to %d changed", allowed.from, allowed.to)
	}
	if ends := lineEnds(before); len(ends) == 1 && !slices.Equal(lineEnds(after), ends) {
		fail("line ends were %q, are %q", ends, lineEnds(after))
	}
	if want, got := a.expected(said), statements(t, after); !maps.Equal(want, got) {
		fail("the file says\n%.600v\nnot\n%.600v", fmt.Sprint(got), fmt.Sprint(want))
	}
	if again, err := Parse("x", after); err != nil {
		fail("does not load any more: %v", err)
	} else if !bytes.Equal(again.Bytes(), after) {
		fail("the bytes read are not those written")
	}
	return true
}

// expected gives what a file says after a change.
func (a alteration) expected(said map[string]string) map[string]string {
	out := maps.Clone(said)
	if a.list != "" {
		n := 0
		for n < 1000 && slices.ContainsFunc(slices.Collect(maps.Keys(said)), func(p string) bool {
			return strings.HasPrefix(p, fmt.Sprintf(".%s[%d]", a.list, n))
		}) {
			n++
		}
		for key, value := range a.entry {
			out[strings.TrimSuffix(fmt.Sprintf(".%s[%d].%s", a.list, n, key), ".")] = value
		}
		return out
	}
	maps.DeleteFunc(out, func(p, _ string) bool { return within(p, "."+a.path) })
	if a.value != "" {
		out["."+a.path] = a.value
	}
	return out
}

// TestPreserve makes every change on every file that is drawn, in all styles. A change of a key that is there may replace its value and
// nothing else, or its line when it is taken out; every other change puts one text in.
func TestPreserve(t *testing.T) {
	made, refused := map[string]int{}, map[string]int{}
	rapid.Check(t, func(t *rapid.T) {
		w := drawFile(t)
		text := rapid.SampledFrom([]string{"", "plain", "it's: #1", "größer – µ", "a, [b] {c}", "> 20 MΩ", "two\nlines"}).Draw(t, "text")
		read := func() *File {
			f, err := Parse("x", w.raw)
			if err != nil {
				t.Fatalf("%v\n%q", err, w.raw)
			}
			return f
		}
		for _, a := range append(appends(text), changes(read(), text)...) {
			f := read()
			_, there := w.places[a.path]
			if !there && a.value == "" && a.list == "" {
				continue
			}
			if checkKept(t, f, a, w.touchOf(a.path, a.value == "")) {
				made[a.name]++
				continue
			}
			refused[a.name]++
			if _, stated := w.places["board.bus.esr"]; a.list == "board.assumed" && !stated {
				continue
			}
			t.Fatalf("%s was refused: %v\n%q", a.name, a.do(f), w.raw)
		}
	})
	t.Logf("made %v, refused %v", made, refused)
	if len(made) < 15 {
		t.Errorf("only these changes were made: %v, refused: %v", made, refused)
	}
}

// offsetOf gives the byte of a node.
func offsetOf(raw []byte, n *yaml.Node) int {
	at := 0
	if bytes.HasPrefix(raw, []byte(byteOrderMark)) {
		at = len(byteOrderMark)
	}
	for line := 1; line < n.Line && at < len(raw); at++ {
		if raw[at] == '\n' || raw[at] == '\r' && (at+1 == len(raw) || raw[at+1] != '\n') {
			line++
		}
	}
	for c := 1; c < n.Column && at < len(raw); c++ {
		_, size := utf8.DecodeRune(raw[at:])
		at += size
	}
	return at
}

// treeTouch gives the stretch from the key before a path, or its value, to whatever stands next in the tree; nil when
// the key is not there.
func treeTouch(raw []byte, path string, clears bool) *touch {
	var doc yaml.Node
	if yaml.Unmarshal(raw, &doc) != nil || len(doc.Content) == 0 {
		return nil
	}
	out := touch{-1, len(raw)}
	previous, inside := 0, false
	var walk func(n *yaml.Node, at string)
	walk = func(n *yaml.Node, at string) {
		for i, c := range n.Content {
			name := fmt.Sprintf("%s[%d]", at, i)
			if n.Kind == yaml.MappingNode {
				if name = join(at, n.Content[i-i%2].Value); i%2 == 0 {
					switch {
					case name == path && out.from < 0:
						out.from = offsetOf(raw, c)
						if clears {
							out.from = previous
						}
						inside = true
					case inside && !within(name, path):
						out.to, inside = offsetOf(raw, c), false
					}
					previous = offsetOf(raw, c) + 1
					continue
				}
			}
			if inside && !within(name, path) {
				out.to, inside = offsetOf(raw, c), false
			}
			if c.Kind == yaml.ScalarNode || isFlow(c) { // a map in lines begins with its first key
				previous = offsetOf(raw, c) + 1
			}
			walk(c, name)
		}
	}
	walk(doc.Content[0], "")
	if out.from < 0 {
		return nil
	}
	return &out
}

// FuzzPreserve proves the same of any file that loads, with the stretches read from the tree.
func FuzzPreserve(f *testing.F) {
	for _, raw := range sampleFiles(f) {
		for which := range 34 {
			f.Add(raw, byte(which), "it's: #1")
		}
	}
	for _, tt := range changeCases {
		f.Add([]byte(tt.before), byte(0), "x")
		f.Add([]byte(tt.before), byte(20), "x")
	}
	f.Fuzz(func(t *testing.T, raw []byte, which byte, text string) {
		file, err := Parse("x", raw)
		if err != nil || !utf8.ValidString(text) {
			return
		}
		all := append(appends(text), changes(file, text)...)
		a := all[int(which)%len(all)]
		if a.list == "board.assumed" && slices.Contains(file.assumedIn("board"), "bus") {
			return
		}
		checkKept(t, file, a, treeTouch(raw, a.path, a.value == ""))
	})
}
