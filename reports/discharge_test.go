package reports

import (
	"bytes"
	"encoding/json"
	"slices"
	"strings"
	"testing"

	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// dischargeBoards are four boards from a battery chopper to one of which nothing is known.
var dischargeBoards = []struct{ name, board string }{
	{"battery", "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 48 V, capacitance: 80 mF, fuse: none, halves: no}"},
	{"mains-clamp", "topology: low-side-chopper\nsupply: rectified-mains\nload: {kind: resistive}\nstages: {auxiliary: {fitted: no}}\n" +
		"bus: {nominal: 310 V, highest: 325 V, capacitance: 470 µF, bleeder: 220 kΩ, fuse: none, halves: no}\nsnubber: {kind: clamp, clamp_voltage: 480 V, capacitance: 1 µF}"},
	{"split", "topology: half-bridge\nsupply: rectified-mains\nload: {kind: resistive}\nstages: {auxiliary: {fitted: no}}\n" +
		"bus: {nominal: 700 V, highest: 800 V, capacitance: 4700 µF, bleeder: 100 kΩ, halves: yes, fuse: none}"},
	{"unknown", "title: Nothing is known of it"},
}

func dischargePlan(t *testing.T, board string) *safety.Plan {
	t.Helper()
	text := "drivemend: 1\ncase: bench-1\nopened: 2026-12-01\nboard:\n  " + strings.ReplaceAll(board, "\n", "\n  ") + "\n"
	f, err := measure.Parse("bench-1.yaml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	p, err := safety.Discharge(safety.InputOf(f.Case.Board))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func dischargeScreen(t *testing.T, p *safety.Plan, s Style) string {
	t.Helper()
	var b bytes.Buffer
	if err := Discharge(&b, p, s); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// TestDischargeScreens: what is done stands at the end under its cautions, all of it fits, nothing is cut and nothing hangs on color.
func TestDischargeScreens(t *testing.T) {
	for _, x := range dischargeBoards {
		p := dischargePlan(t, x.board)
		text := dischargeScreen(t, p, Style{})
		golden(t, "discharge-"+x.name+".txt", text)
		at := -1
		for _, head := range []string{"STORED  ", "\n resistor ", "\nTIMES  ", "\nMISSING  ", "\nLIMITS  ", "\nSOURCES  ", "\nCAUTION\n", "\nSTEPS\n"} {
			next := strings.Index(text, head)
			if next < 0 && head == "\nMISSING  " && len(p.Needs) == 0 {
				continue
			}
			if next <= at {
				t.Errorf("%s: %q is missing or stands too early", x.name, head)
			}
			at = next
		}
		if colored := dischargeScreen(t, p, Style{Color: true}); stripped(colored) != text || colored == text {
			t.Errorf("%s: color says something of its own, or nothing is colored", x.name)
		}
		for _, width := range []int{40, 80, 132} {
			screen := dischargeScreen(t, p, Style{Width: width})
			for i, line := range strings.Split(screen, "\n") {
				if columns(line) > width || strings.Contains(line, "…") {
					t.Errorf("%s: line %d does not fit %d columns: %s", x.name, i+1, width, line)
				}
			}
		}
	}
}

// TestDischargeFirstScreen: energy, resistor and times of a plain board stand on the first 24 lines.
func TestDischargeFirstScreen(t *testing.T) {
	for _, x := range dischargeBoards[:3] {
		lines := strings.Split(dischargeScreen(t, dischargePlan(t, x.board), Style{}), "\n")
		first := strings.Join(lines[:24], "\n")
		for _, want := range []string{"STORED", "resistor", "TIMES", "recovery"} {
			if !strings.Contains(first, want) {
				t.Errorf("%s: %s is not on the first screen:\n%s", x.name, want, first)
			}
		}
	}
}

// TestLimitsOnTheScreen: every limit of the plan stands on the screen, with its source in full, how it was read, and whether the
// board is above it.
func TestLimitsOnTheScreen(t *testing.T) {
	for _, x := range dischargeBoards {
		p := dischargePlan(t, x.board)
		_, block, _ := strings.Cut(dischargeScreen(t, p, Style{Width: 200}), "\nLIMITS  ")
		lines := strings.Split(block, "\n")
		flat := strings.Join(strings.Fields(block), " ")
		for _, l := range p.Limits {
			if l.Apart {
				line, _, _ := strings.Cut(l.Threshold, ":")
				_, apart, _ := strings.Cut(flat, "than this board's: ")
				if !strings.Contains(apart, line) {
					t.Errorf("%s: %s is not named as drawn for other boards: %s", x.name, line, apart)
				}
			} else if !slices.ContainsFunc(lines, func(line string) bool { return isRow(line, l) }) {
				t.Errorf("%s: the screen lacks %+v:\n%s", x.name, l, block)
			}
			if !strings.Contains(flat, l.Short+" "+l.Source) {
				t.Errorf("%s: the screen lacks the source %s", x.name, l.Source)
			}
		}
	}
}

// isRow tells whether a line of a wide screen is the first one of a limit.
func isRow(line string, l safety.Limit) bool {
	mark := map[bool]string{true: "* ", false: "- "}[l.Lowest]
	want := []string{l.Short, l.Board, standing(l), strings.Fields(string(l.Read))[0]}
	rest, ok := strings.CutPrefix(line, mark+fold(l.Threshold, 21)[0])
	for _, w := range want {
		var found bool
		_, rest, found = strings.Cut(rest, " "+w)
		ok = ok && found
	}
	return ok
}

// standing is the word of the screen, worked out anew.
func standing(l safety.Limit) string {
	if l.Unknown {
		return "?"
	}
	return map[bool]string{true: "ABOVE", false: "below"}[l.Above]
}

// TestDischargeJSONGivesTheLimits: the keys other programs rely on, null where the board's figure is not known.
func TestDischargeJSONGivesTheLimits(t *testing.T) {
	p := dischargePlan(t, dischargeBoards[2].board)
	var b bytes.Buffer
	if err := DischargeJSON(&b, p); err != nil {
		t.Fatal(err)
	}
	golden(t, "discharge-split.json", b.String())
	var v struct {
		Limits []map[string]any
		Stores []map[string]any
	}
	if err := json.Unmarshal(b.Bytes(), &v); err != nil || len(v.Limits) != len(p.Limits) {
		t.Fatalf("%d of %d limits, %v", len(v.Limits), len(p.Limits), err)
	}
	for i, l := range v.Limits {
		for _, key := range []string{"hazard", "threshold", "answers", "board", "source", "read"} {
			if text, ok := l[key].(string); !ok || text == "" {
				t.Errorf("limit %d has no %s: %v", i, key, l)
			}
		}
		var above any = p.Limits[i].Above
		if p.Limits[i].Unknown {
			above = nil
		}
		if got, ok := l["above"]; !ok || got != above || l["lowest"] != p.Limits[i].Lowest || l["applies"] != !p.Limits[i].Apart {
			t.Errorf("limit %d: %v, want above %v", i, l, above)
		}
	}
	if v.Stores[0]["out_of_balance"] != nil || v.Stores[1]["out_of_balance"].(map[string]any)["voltage_v"] != 800.0 {
		t.Errorf("the halves alone can be out of balance: %v", v.Stores)
	}
}

// TestLabelWords: a label leads to 60 V and is a lower bound; none is named where none is needed.
func TestLabelWords(t *testing.T) {
	for _, c := range []struct {
		b            safety.Bleeder
		has, has_not string
	}{
		{safety.Bleeder{Ohm: 1e5, PowerW: 6.4, LabelTimeS: 660}, "a label would name 11 min, which leads to 60 V and only while the bleeder is whole: a lower bound", "no label"},
		{safety.Bleeder{Ohm: 840, PowerW: 380, LabelTimeS: 60, WithinFiveS: true}, "within 5 s, so a board with it needs no label; a blown one is measured all the same", "would name"},
		{safety.Bleeder{Ohm: 1e4, PowerW: 0.2, WithinFiveS: true}, "10 kΩ", "label"},
	} {
		if got := labelWords(&c.b); !strings.Contains(got, c.has) || strings.Contains(got, c.has_not) {
			t.Errorf("%s", got)
		}
	}
}

// TestLongWaitsAreRoundedUp: minutes and hours, never less than it takes.
func TestLongWaitsAreRoundedUp(t *testing.T) {
	for x, want := range map[float64]string{0: "-", 0.4: "1 s", 118.2: "119 s", 120.1: "3 min", 494: "9 min", 540: "9 min", 7199: "120 min", 7201: "2.1 h", 100e3: "27.8 h"} {
		if got := waitOr(x); got != want {
			t.Errorf("%g s: %s, want %s", x, got, want)
		}
	}
}
