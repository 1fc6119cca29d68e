package main

import (
	"strings"
	"testing"
	"time"

	"drivemend/measure"
)

func TestKeyText(t *testing.T) {
	half := measure.Board{}.WithWord("topology", "half-bridge").WithParts("high", "Q1", "Q2")
	for _, c := range []struct{ path, text, want string }{
		{"board.positions.low.parts", "3", "Q3, Q4, Q5"},
		{"positions.low.parts", "[2]", "Q3, Q4"},
		{"board.positions.high.parts", "3", "Q1, Q2, Q3"},
		{"board.positions.low.parts", "T1 T2", "T1 T2"},
		{"board.positions.low.parts", "0", ""},
		{"board.positions.low.parts", "99", ""},
		{"board.switch.kind", "IGBT", "igbt"},
		{"board.snubber.kind", " RCD ", "rcd"},
		{"rebuild.snubber.kind", "RC", "rc"},
		{"board.bus.nominal", "310 V", "310 V"},
		{"story", "IGBT", "IGBT"},
	} {
		got, err := keyText(half, c.path, c.text)
		if got != c.want || (err != nil) != (c.want == "") {
			t.Errorf("%s %q gives %q, %v; want %q", c.path, c.text, got, err, c.want)
		}
	}
}

func TestKeyTitle(t *testing.T) {
	for path, want := range map[string]string{"board.load.running_current": "load: ", "board.bus.esr": "bus: ", "board.stages.brake.resistor": "brake: ", "board.title": ""} {
		k, ok := measure.LookupKey(path)
		if got := keyTitle(k); !ok || !strings.HasPrefix(got, want) || strings.Contains(got, "its ") {
			t.Errorf("%s has the title %q", path, got)
		}
	}
}

func TestAgo(t *testing.T) {
	for d, want := range map[time.Duration]string{30 * time.Second: "just now", 59 * time.Minute: "59 min", 7*time.Hour + 5*time.Minute: "7 h 5 min", 73 * time.Hour: "3 days"} {
		if got := ago(d); !strings.Contains(got, want) {
			t.Errorf("%v is %q, want %q", d, got, want)
		}
	}
}

// TestYesNoIsOfferedOnce proves that no board value offers a word twice.
func TestYesNoIsOfferedOnce(t *testing.T) {
	b := newBench(t, arrived)
	f, err := measure.Load(b.path)
	if err != nil {
		t.Fatal(err)
	}
	for _, k := range measure.Keys() {
		if k.Kind != measure.KindYesNo || !strings.HasPrefix(k.Path, "board.") {
			continue
		}
		q := (&session{app: b.app, file: f}).valueQuestion(k)
		seen := map[string]bool{}
		for _, c := range q.Choices {
			if seen[c.Word] {
				t.Errorf("%s offers %s twice", k.Path, c.Word)
			}
			seen[c.Word] = true
		}
		if !seen["yes"] || !seen["no"] {
			t.Errorf("%s does not offer yes and no", k.Path)
		}
	}
}

// TestEveryKeyHasAnExampleThatLoads proves that the line which keys NAME shows can be copied into the file of a board with
// two parts in parallel, and states that very key.
func TestEveryKeyHasAnExampleThatLoads(t *testing.T) {
	shown := 0
	for _, k := range measure.Keys() {
		line := exampleOf(k)
		if line == "" {
			if !holdsKeys(k) {
				t.Errorf("%s has no example", k.Path)
			}
			continue
		}
		shown++
		head := ""
		for _, must := range []string{"drivemend: 1", "case: one", "board: {topology: low-side-chopper, positions: {low: {parts: [Q1, Q2]}}}"} {
			if name, _, _ := strings.Cut(must, ":"); !strings.HasPrefix(line, name+":") {
				head += must + "\n"
			}
		}
		if _, err := measure.Parse("example", []byte(head+line+"\n")); err != nil {
			t.Errorf("%s: %s\n%v", k.Path, line, err)
		}
		if last := k.Path[strings.LastIndex(k.Path, ".")+1:]; !strings.Contains(line, last+":") {
			t.Errorf("%s is not stated by its example %s", k.Path, line)
		}
	}
	if shown < 150 {
		t.Errorf("only %d examples", shown)
	}
}
