package reports

import (
	"bytes"
	"errors"
	"io"
	"slices"
	"strings"
	"testing"

	"drivemend/diagnose/stress"
	"drivemend/measure/quantity"
)

func marginText(t *testing.T, r Report) string {
	t.Helper()
	return rendered(t, output{"margin", func(w io.Writer, r Report, s Style) error { return MarginInFull(w, r.Case, r.Margin, s) }}, r, Style{})
}

// rowOf gives the line of a screen that begins with a name; "" without one.
func rowOf(text, name string) string {
	for _, line := range strings.Split(text, "\n") {
		if strings.HasPrefix(line, name) {
			return line
		}
	}
	return ""
}

// TestRowsStandOnlyWithSomethingToSay: what does not arise on a board takes no line.
func TestRowsStandOnlyWithSomethingToSay(t *testing.T) {
	chopper, leg, open := marginText(t, frozen(t)), marginText(t, with(frozen(t), frozenLeg())), marginText(t, with(frozen(t), frozenReservoir()))
	for name, in := range map[string]string{"short circuit": leg, "avalanche, how often": leg + open, "clamp held at": leg + open, "reservoir with its tie open": open, "last part to open": leg,
		"measured edge": leg, "loop found from it": leg, "closing, at freewheel diode": chopper + open, "emptied, shortest on-time": chopper} {
		for which, text := range map[string]string{"chopper": chopper, "leg": leg, "open": open} {
			if stands := rowOf(text, name) != ""; stands != strings.Contains(in, text) {
				t.Errorf("%s: row %q stands: %v", which, name, stands)
			}
		}
	}
	for _, text := range []string{chopper, leg, open} {
		for _, line := range strings.Split(text, "\n") {
			if cells := strings.Fields(line[min(len(line), marginNameWidth):]); len(cells) > 0 && !slices.ContainsFunc(cells, func(c string) bool { return c != "none" }) {
				t.Errorf("an empty row: %s", line)
			}
		}
	}
}

// TestDecidingStandsFirst: what decides fits one screen, the rest stands under its heading.
func TestDecidingStandsFirst(t *testing.T) {
	for name, r := range map[string]Report{"chopper": frozen(t), "leg": with(frozen(t), frozenLeg()), "reservoir": with(frozen(t), frozenReservoir()), "real": pump(t)} {
		text := marginText(t, r)
		deciding, details, found := strings.Cut(text, "\nDETAILS")
		if n := strings.Count(deciding, "\n"); !found || n > 44 {
			t.Errorf("%s: %d lines before the details (%v)", name, n, found)
		}
		if short := rendered(t, output{"margin", func(w io.Writer, r Report, s Style) error { return Margin(w, r.Margin, s) }}, r, Style{}); strings.TrimSpace(short) != strings.TrimSpace(deciding) {
			t.Errorf("%s: the short form is not what decides", name)
		}
		if !strings.Contains(details, "would need") {
			t.Errorf("%s: details:\n%s", name, details)
		}
	}
}

// TestWatts: energy times frequency for what is lost, none for what is kept, none without a frequency.
func TestWatts(t *testing.T) {
	text := marginText(t, frozen(t))
	if row := rowOf(text, "- lost, switch"); !strings.Contains(row, "3.4 mJ, 27.2 W") {
		t.Error(row)
	}
	if row := rowOf(text, "- kept, output capacitance"); row == "" || strings.Contains(row, "W") {
		t.Error(row)
	}
	if strings.Contains(text, "bus esr") {
		t.Error("a loss of no account takes a line")
	}
	r := with(frozen(t), frozenReservoir())
	r.Case = nil
	text = marginText(t, r)
	if strings.Contains(text, " W\n") || !strings.Contains(text, "watts\n         need pwm.frequency") {
		t.Errorf("without a frequency:\n%s", text)
	}
}

// TestEdgesAreNamed: of a leg every peak says whose edge it is; a chopper's are all openings but its diode's.
func TestEdgesAreNamed(t *testing.T) {
	leg := marginText(t, with(frozen(t), frozenLeg()))
	if row := rowOf(leg, "worst case"); !strings.Contains(row, "635 V, opposite closes") || !strings.Contains(row, "440 V, all gates off") {
		t.Error(row)
	}
	r := frozen(t)
	r.Margin.Rebuild.Highest.Current = 90
	if row := rowOf(marginText(t, r), "worst case"); !strings.Contains(row, "635 V at 390 V, 120 A") || !strings.Contains(row, "440 V at 390 V, 90 A") {
		t.Errorf("unlike currents: %s", row)
	}
	if row := rowOf(marginText(t, r), "running, 310 V, 60 A"); !strings.Contains(row, " 485 V ") {
		t.Errorf("like currents: %s", row)
	}
}

// TestNoAssumedValueIsLost: every assumed value stands on the full screen once, the idle ones at the end.
func TestNoAssumedValueIsLost(t *testing.T) {
	r := frozen(t)
	for _, key := range []string{"bus.esl", "cooling.coldest_air", "freewheel.softness"} {
		r.Margin.Assumed = append(r.Margin.Assumed, stress.Assumed{Key: key, Value: quantity.Of(1, quantity.Ratio), Why: "because of " + key})
	}
	text := marginText(t, r)
	deciding, end, _ := strings.Cut(text, "\nDETAILS")
	if !strings.Contains(deciding, "4 more move it") || rowOf(deciding, "loop.inductance") == "" || rowOf(deciding, "   bus.esl") != "" {
		t.Error(deciding)
	}
	for _, a := range r.Margin.Assumed {
		if n := strings.Count(text, "\n"+a.Key+" ") + strings.Count(end, "\n   "+a.Key+" "); n != 1 {
			t.Errorf("%s stands %d times:\n%s", a.Key, n, text)
		}
	}
}

// TestDangersStandWithTheVerdict: what kills a board whatever its peak stands beside the verdict, on the first page too.
func TestDangersStandWithTheVerdict(t *testing.T) {
	for name, c := range map[string]struct {
		m    *stress.Margin
		want string
	}{"reservoir": {frozenReservoir(), "pump it up to 600 V, where the switch breaks down"}, "avalanche": {frozenLeg(), "breaks down in every PWM cycle"}} {
		c.m.AsFound.Verdict = stress.Within
		c.m.Rebuild = nil
		r := with(frozen(t), c.m)
		if _, verdict, _ := strings.Cut(marginText(t, r), "WITHIN:"); !strings.Contains(strings.Join(strings.Fields(verdict), " "), c.want) {
			t.Errorf("%s: the screen does not warn:\n%s", name, verdict)
		}
		if first, _, _ := strings.Cut(said(t, r, "report.html"), "<nav"); !strings.Contains(first, c.want) {
			t.Errorf("%s: the first page does not warn", name)
		}
	}
	if text := marginText(t, frozen(t)); strings.Contains(text, "pump it up") || strings.Contains(text, "every PWM cycle") {
		t.Error("a warning without a danger")
	}
}

// TestClampHeat: watts into the resistor, none without a frequency, and a clamp under the bus is fed by it.
func TestClampHeat(t *testing.T) {
	for watts, want := range map[float64]string{3.9: "3.9 W", 0: "needs pwm.frequency", -2.5: "fed by the bus"} {
		m := frozenLeg()
		m.Rebuild.Clamp.Watts = watts
		if row := rowOf(marginText(t, with(frozen(t), m)), "clamp, into its resistor"); !strings.Contains(row, want) {
			t.Errorf("%g W: %q, want %q", watts, row, want)
		}
	}
}

func TestAvalancheAgainstItsRating(t *testing.T) {
	for _, c := range []struct {
		a    stress.Avalanched
		want string
		tone tone
	}{{stress.Avalanched{}, "not stated for it", caution}, {stress.Avalanched{OverEnergy: true}, "not stated for it", caution}, {stress.Avalanched{Rated: true}, "under, for one pulse", normal}, {stress.Avalanched{Rated: true, OverEnergy: true}, "OVER its energy", danger},
		{stress.Avalanched{Rated: true, OverCurrent: true}, "OVER its current", danger}, {stress.Avalanched{Rated: true, OverEnergy: true, OverCurrent: true}, "OVER energy and current", danger}} {
		if got := avalancheRated(marginBoard{f: &stress.Figures{Avalanche: &c.a}}); got != (entry{c.want, c.tone}) {
			t.Errorf("%+v: %v", c.a, got)
		}
	}
}

func TestChooseEdge(t *testing.T) {
	leg, alone := frozenLeg(), frozenReservoir()
	for _, c := range []struct {
		m    *stress.Margin
		word string
		want *stress.Edge
	}{{leg, "", leg.Rebuild.Highest}, {leg, "all-off", leg.Rebuild.Highest}, {leg, "turn-off", leg.Rebuild.Edges[0]}, {leg, "turn-on", leg.Rebuild.Edges[1]}, {leg, "cut", leg.Rebuild.Cut}, {leg, "short-circuit", leg.Rebuild.ShortCircuit},
		{alone, "", alone.AsFound.Highest}, {alone, "turn-off", alone.AsFound.Highest}, {alone, "turn-on", alone.AsFound.Edges[1]}, {alone, "all-off", nil}, {alone, "short-circuit", nil}} {
		got, err := ChooseEdge(c.m, c.word)
		if got.Edge != c.want || (err == nil) != (c.want != nil) {
			t.Errorf("%q: %v, %v", c.word, got.Edge, err)
		}
		if err != nil && !strings.Contains(err.Error(), "there are: turn-off, turn-on, cut") {
			t.Error(err)
		}
	}
	if _, err := ChooseEdge(&stress.Margin{}, ""); !errors.Is(err, ErrNoFigures) {
		t.Error(err)
	}
	r := frozen(t)
	chosen, err := ChooseEdge(r.Margin, "")
	var b bytes.Buffer
	if err != nil || Netlist(&b, r.Case, r.Margin, chosen) == nil || b.Len() > 0 {
		t.Errorf("an edge whose circuit was not kept was written: %v, %s", err, b.String())
	}
}

// TestFiguresOfALeg: the edge that decides, the opening and the closing; a chopper has the one.
func TestFiguresOfALeg(t *testing.T) {
	for name, c := range map[string]struct {
		m    *stress.Margin
		want []string
	}{"chopper": {frozenMargin(), []string{"edge"}}, "leg": {frozenLeg(), []string{"edge", "edge-turn-off", "edge-turn-on"}}} {
		html := rendered(t, pages[10], with(frozen(t), c.m), Style{})
		if n := strings.Count(html, "<svg"); n != len(c.want) {
			t.Errorf("%s: %d figures, want %d", name, n, len(c.want))
		}
		for _, id := range c.want {
			if strings.Count(html, `id="`+id+`-text"`) != 1 {
				t.Errorf("%s: no figure %s", name, id)
			}
		}
	}
	svg, err := decidingFigure(frozenLeg()).svg(frozenLeg())
	if err != nil || !strings.Contains(svg, "as found: opposite closes, peak 635 V") || !strings.Contains(svg, "rebuild: all gates off, peak 440 V") {
		t.Errorf("the legend does not name the edges: %v", err)
	}
}
