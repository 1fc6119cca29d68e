package measure

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"drivemend/measure/quantity"
)

// sampleFiles reads the good sample files.
func sampleFiles(t testing.TB) map[string][]byte {
	t.Helper()
	paths, err := filepath.Glob("testdata/*.yaml")
	if err != nil || len(paths) == 0 {
		t.Fatalf("no sample files: %v", err)
	}
	out := map[string][]byte{}
	for _, p := range paths {
		raw, err := os.ReadFile(p)
		if err != nil {
			t.Fatal(err)
		}
		out[filepath.Base(p)] = raw
	}
	return out
}

// anyText draws texts that need quoting as often as not.
var anyText = rapid.OneOf(
	rapid.SampledFrom([]string{"", "x", "a: b", "a #b", "- a", "> 20 MΩ", "'", "\"", "it's", "[", "{a}", "a, b", "null", "~", "yes", "1", "%",
		"@", "`", "|", "a\nb", "\ta", " a ", "\u00a0", "µ", "<<", "...", "---", "*a", "&a", "!a", "?", ": ", "a:", "\\n", "#", "0x10", "2026-12-01",
		"\u2028", "\uFEFF", "\U0001F525", "a\r\nb", "\x00", "\u0085"}),
	rapid.StringN(0, 12, 40))

// anyChange draws one change of a case and says what it appends to: "" for a change of a value.
func anyChange(t *rapid.T) (change func(*File) error, list string) {
	text := anyText.Draw(t, "text")
	at := tenOClock.AddDate(0, 0, rapid.IntRange(0, 9).Draw(t, "day"))
	paths := []string{"story", "owner", "board.title", "board.bus.highest_because", "board.bus.esr", "board.switch.fall_time",
		"board.switch.fall_time.voltage", "board.positions.low.parts", "rebuild.snubber.capacitance", "rebuild.done", "outcome.causes"}
	path := rapid.SampledFrom(paths).Draw(t, "path")
	switch rapid.IntRange(0, 9).Draw(t, "change") {
	case 0, 1:
		return func(f *File) error { return f.Observe(Observation{Test: "x", Result: "y", Note: text, At: at}) }, "observations"
	case 2:
		return func(f *File) error { return f.FitLink(at) }, "link"
	case 3:
		return func(f *File) error { return f.RemoveLink(at) }, ""
	case 4:
		return func(f *File) error { return f.Energise(Energised{"source", at, 0}) }, "energised"
	case 5:
		return func(f *File) error { return f.Isolate(Isolation{true, "unplugged", text, at, 0}) }, "isolation"
	case 6:
		volts := quantity.Of(float64(rapid.IntRange(0, 400).Draw(t, "volt")), quantity.Volt)
		return func(f *File) error { return f.Check(DeadCheck{"bus", volts, volts, true, at, 0}) }, "dead_checks"
	case 7:
		value := rapid.SampledFrom([]string{"40 mΩ", "96 ns", "300 V", "Q1 Q2", "22 nF", "2026-12-01T15:00:00Z", "fan-stopped", text}).Draw(t, "value")
		return func(f *File) error { return f.Set(path, value) }, ""
	case 8:
		return func(f *File) error { return f.Clear(path) }, ""
	}
	return func(f *File) error { return f.SetStory(text) }, ""
}

// TestUnchangedBytesStay makes any changes and proves after each that every byte outside the one place of the change
// is as before, that appending only inserts, and that a refused change changes nothing.
func TestUnchangedBytesStay(t *testing.T) {
	files := sampleFiles(t)
	var names []string
	for name := range files {
		names = append(names, name)
	}
	slices.Sort(names)
	starts := rapid.SampledFrom(names)
	rapid.Check(t, func(t *rapid.T) {
		name := starts.Draw(t, "file")
		raw := files[name]
		if rapid.Bool().Draw(t, "windows") {
			raw = bytes.ReplaceAll(raw, []byte("\n"), []byte("\r\n"))
		}
		f, err := Parse(name, raw)
		if err != nil {
			t.Fatal(err)
		}
		for range rapid.IntRange(1, 6).Draw(t, "changes") {
			before := f.Bytes()
			change, list := anyChange(t)
			err := change(f)
			after := f.Bytes()
			if err != nil {
				if !bytes.Equal(before, after) {
					t.Fatalf("refused with %v, but changed", err)
				}
				continue
			}
			if err := onePlace(before, after, list != ""); err != nil {
				t.Fatalf("%v\nbefore\n%s\nafter\n%s", err, before, after)
			}
		}
	})
}

// TestAnyTextComesBack proves that a text is read back as it was set, wherever it stands.
func TestAnyTextComesBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := strings.ToValidUTF8(anyText.Draw(t, "text"), "")
		f, err := Parse("x", []byte(rapid.SampledFrom([]string{head, "{drivemend: 1, case: a}"}).Draw(t, "file")))
		if err != nil {
			t.Fatal(err)
		}
		if err := f.SetStory(text); err != nil {
			t.Fatal(err)
		}
		if err := f.SetBoard("bus.highest_because", text); err != nil {
			t.Fatal(err)
		}
		if err := f.Observe(Observation{Test: "x", Result: "y", Note: text}); err != nil {
			t.Fatal(err)
		}
		because, _ := f.Case.Board.Word("bus.highest_because")
		for _, got := range []string{f.Case.Story, because, f.Case.Observations[0].Note} {
			if got != text {
				t.Fatalf("%q came back as %q in\n%s", text, got, f.Bytes())
			}
		}
	})
}

// onePlace proves that two texts are alike but for one run of lines, and that an append takes out nothing but an
// empty list's brackets.
func onePlace(before, after []byte, appends bool) error {
	head := 0
	for head < len(before) && head < len(after) && before[head] == after[head] {
		head++
	}
	tail := 0
	for tail < len(before)-head && tail < len(after)-head && before[len(before)-1-tail] == after[len(after)-1-tail] {
		tail++
	}
	gone := string(before[head : len(before)-tail])
	if appends && strings.Trim(strings.SplitN(gone, "#", 2)[0], " []\r\n") != "" {
		return fmt.Errorf("appending took out %q", gone)
	}
	if strings.Count(gone, "\n") > 6 {
		return fmt.Errorf("a change of one value took out %q", gone)
	}
	return nil
}

// FuzzParse proves that no input makes the loader panic, that what loads comes back byte for byte, and that it can be
// added to.
func FuzzParse(f *testing.F) {
	for _, raw := range sampleFiles(f) {
		f.Add(raw)
	}
	broken, _ := filepath.Glob("../testdata/broken-cases/*.yaml")
	for _, p := range broken {
		if raw, err := os.ReadFile(p); err == nil {
			f.Add(raw)
		}
	}
	f.Fuzz(func(t *testing.T, raw []byte) {
		file, err := Parse("case.yaml", raw)
		if err != nil {
			if p, ok := err.(Problems); !ok || len(p) == 0 || len(p) > mostProblems+1 || p.Error() == "" {
				t.Errorf("error is %#v", err)
			}
			return
		}
		if !bytes.Equal(file.Bytes(), raw) {
			t.Error("the bytes changed by reading")
		}
		n := len(file.Case.Observations)
		if err := file.Observe(Observation{Test: "fan-turns", Result: "no"}); err == nil && len(file.Case.Observations) != n+1 {
			t.Errorf("added one observation to %d, now %d", n, len(file.Case.Observations))
		}
		if err := file.SetStory("new: #1"); err == nil && file.Case.Story != "new: #1" {
			t.Errorf("the story became %q", file.Case.Story)
		}
		if err := file.SetBoard("switch.fall_time.voltage", "300 V"); err == nil {
			if q, ok := file.Case.Board.Quantity("switch.fall_time.voltage"); !ok || q.Value != 300 {
				t.Errorf("the voltage became %v", q)
			}
		}
		if err := file.Clear("board"); err == nil && file.Case.Board.Stated("bus") {
			t.Error("the board is still there")
		}
	})
}
