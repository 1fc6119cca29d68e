package measure

import (
	"bytes"
	"math"
	"os"
	"reflect"
	"strings"
	"testing"

	"gopkg.in/yaml.v3"

	"drivemend/measure/quantity"
)

func TestSamplesLoad(t *testing.T) {
	for name, raw := range sampleFiles(t) {
		f, err := Parse(name, raw)
		if err != nil {
			t.Errorf("%v", err)
			continue
		}
		if !bytes.Equal(f.Bytes(), raw) {
			t.Errorf("%s: bytes changed by reading", name)
		}
	}
}

// TestExample proves that the example of the design loads as it stands and says what it says.
func TestExample(t *testing.T) {
	f, err := Load("testdata/orchard-pump-3.yaml")
	if err != nil {
		t.Fatal(err)
	}
	c := f.Case
	if c.ID != "orchard-pump-3" || c.Opened.Format("2006-01-02") != "2026-12-01" || c.Owner != "Orchard cooperative" {
		t.Errorf("head is %+v", c)
	}
	for path, want := range map[string]float64{"bus.nominal": 310, "bus.capacitance": 2200e-6, "switch.rated_voltage": 600,
		"switch.output_capacitance": 250e-12, "switch.fall_time": 96e-9, "loop.inductance": 120e-9, "positions.parallel": 3,
		"service": 5200 * 3600, "freewheel.recovery_charge": 0.9e-6} {
		if q, ok := c.Board.Quantity(path); !ok || math.Abs(q.Value/want-1) > 1e-12 {
			t.Errorf("%s is %v, %v", path, q, ok)
		}
	}
	if w, ok := c.Board.Word("freewheel.fitted"); w != "yes" || !ok {
		t.Errorf("freewheel.fitted is %q", w)
	}
	if !c.Board.Assumed("loop.inductance") || c.Board.Assumed("loop.resistance") {
		t.Error("assumed keys are wrong")
	}
	if len(c.Safety.DeadChecks) != 2 || c.Safety.DeadChecks[1].DC.Value != 0.4 || !c.Safety.Isolation[0].Locked ||
		c.Safety.Links[0].Removed.IsZero() || len(c.Safety.Energised) != 0 {
		t.Errorf("safety is %+v", c.Safety)
	}
	if len(c.Observations) != 3 || c.Observations[0].Seen != "on-arrival" || c.Observations[1].Reading.Value != 0.4 ||
		c.Observations[1].Twin.Kind != quantity.Over || c.Observations[2].Answer != "skipped" || c.Observations[2].Line != 29 {
		t.Errorf("observations are %+v", c.Observations)
	}
	if len(c.Locate) != 1 || c.Locate[0].Rises[1].Rise.Value != 6.1 || c.Locate[0].Drops[0].To != "Q2" {
		t.Errorf("locate is %+v", c.Locate)
	}
	wantKeys := []string{"snubber.kind", "snubber.capacitance", "snubber.resistance", "gate.turn_off_resistance", "loop.inductance"}
	if !reflect.DeepEqual(c.Rebuild.Keys, wantKeys) || c.Rebuild.Done.IsZero() {
		t.Errorf("rebuild is %+v", c.Rebuild.Keys)
	}
	if q, _ := c.Rebuild.Board.Quantity("loop.inductance"); q.Value != 80e-9 || c.Rebuild.Board.Assumed("loop.inductance") {
		t.Errorf("rebuilt loop is %v", q)
	}
	if c.Outcome.ConfirmedBy != "held-30-days" || c.Outcome.Causes[0] != "clamp-missing" {
		t.Errorf("outcome is %+v", c.Outcome)
	}
}

// TestLineEndsAndMarks proves that line ends and a byte order mark change nothing of what a file says.
func TestLineEndsAndMarks(t *testing.T) {
	raw := sampleFiles(t)["every-key.yaml"]
	want, err := Parse("x", raw)
	if err != nil {
		t.Fatal(err)
	}
	for name, other := range map[string][]byte{
		"CRLF": bytes.ReplaceAll(raw, []byte("\n"), []byte("\r\n")),
		"CR":   bytes.ReplaceAll(raw, []byte("\n"), []byte("\r")),
		"BOM":  append([]byte(byteOrderMark), raw...),
	} {
		got, err := Parse("x", other)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if !reflect.DeepEqual(got.Case, want.Case) {
			t.Errorf("%s: the case differs", name)
		}
	}
}

func TestUnreadable(t *testing.T) {
	deep := head + "board: " + strings.Repeat("{bus: ", 9000) + strings.Repeat("}", 9000) + "\n"
	tests := []struct{ name, text, want string }{
		{"too long", head + strings.Repeat("# filler\n", mostBytes/8), "x:1:1: the file is longer than 1 MB"},
		{"UTF-16", "\xff\xfed\x00r\x00", "UTF-16"},
		{"deep", deep, "x:3:15: board.bus.bus: unknown key"},
		{"deeper", head + strings.Repeat("[", 20000), "x:3:1"},
		{"deep lines", head + deepLines(300), "unknown key"},
		{"line separator", head + "story: a\u2028b\n", "x:3:9: the invisible character U+2028"},
		{"byte order mark inside", head + "story: a\uFEFFb\n", "U+FEFF"},
		{"directive", "%YAML 1.1\n---\n" + head, "x:1:1: YAML directives"},
		{"list at the top", "- drivemend: 1\n", "a case file is a map of keys, not a list"},
		{"one word", "bang\n", `not "bang"`},
		{"key of braces", head + "? {a: b}\n: c\n", "a key must be a plain word"},
		{"version word", "drivemend: one\ncase: a\n", "x:1:12: drivemend: "},
		{"version 0", "drivemend: 0\ncase: a\n", "x:1:12: drivemend: "},
		{"version far off", "drivemend: 9999999999999999999999\ncase: a\n", "x:1:12: drivemend: "},
		{"not a number", head + "board: {bus: {nominal: .nan}}\n", "board.bus.nominal"},
		{"endless", head + "board: {bus: {nominal: .inf}}\n", "board.bus.nominal"},
		{"folded reading", head + "observations:\n  - test: x\n    reading: >2\n     MΩ\n", "x:5:14: observations[1].reading: " + overMessage},
		{"second document unreadable", head + "---\n[\n", "x:4:1: a value is missing"},
		{"text after the end", head + "]\n", "x:3:1: the line does not fit"},
		{"literal tab", head + "board:\n\tbus: {}\n", "x:4:2: a tab stands"},
		{"value with at sign", head + "owner: @home\n", "put the value in quotes"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			_, err := Parse("x", []byte(tt.text))
			if _, ok := err.(Problems); !ok || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
		})
	}
}

func TestMarkFolded(t *testing.T) {
	tests := []struct{ text, want string }{
		{"reading: > 20 MΩ\n", "reading: @ 20 MΩ\n"},
		{"- {reading: >20 MΩ, twin: >= 1 Ω}\nx: >.5 V", "- {reading: @20 MΩ, twin: @= 1 Ω}\nx: @.5 V"},
		{"a: '> 20 MΩ' # was: > 3", "a: '> 20 MΩ' # was: > 3"},
		{"story: \"it said: > 20\"", "story: \"it said: > 20\""},
		{"story: it's: > 20", "story: it's: @ 20"},
		{"story: >\n  folded", "story: >\n  folded"},
	}
	for _, tt := range tests {
		want := strings.ReplaceAll(tt.want, "@", string(foldedMark))
		if got := string(markFolded([]byte(tt.text))); got != want {
			t.Errorf("%q becomes %q, want %q", tt.text, got, want)
		}
	}
}

// deepLines nests a key in lines.
func deepLines(n int) string {
	var b strings.Builder
	for i := range n {
		b.WriteString(strings.Repeat(" ", i) + "a:\n")
	}
	return b.String()
}

// TestEveryKeyIsRead proves that the sample states every key of the table.
func TestEveryKeyIsRead(t *testing.T) {
	raw, err := os.ReadFile("testdata/every-key.yaml")
	if err != nil {
		t.Fatal(err)
	}
	doc, _, problems := document(raw)
	if problems != nil {
		t.Fatal(problems)
	}
	stated := map[string]bool{}
	mark(doc.Content[0], keyTable().root, stated)
	for _, k := range Keys() {
		if within(k.Path, "rebuild") || within(k.Path, "board.positions.*") {
			continue // the same rows as the board's; TestEveryKeyCanBeSet reads them
		}
		if !stated[k.Path] {
			t.Errorf("%s is not in the sample", k.Path)
		}
	}
}

// mark notes the table path of every key below a node.
func mark(n *yaml.Node, row *rung, stated map[string]bool) {
	stated[row.Path] = true
	for i, c := range n.Content {
		name := "[]"
		if n.Kind == yaml.MappingNode {
			if i%2 == 0 {
				continue
			}
			name = n.Content[i-1].Value
		}
		if next, ok := row.child(name); ok {
			mark(c, next, stated)
		}
	}
}

func BenchmarkParse(b *testing.B) {
	raw, err := os.ReadFile("testdata/orchard-pump-3.yaml")
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if _, err := Parse("x", raw); err != nil {
			b.Fatal(err)
		}
	}
}
