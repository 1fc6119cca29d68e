package diagnose

import (
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

const terminals = "power-terminals-resistance"

var (
	rebuildTime = time.Date(2026, 12, 1, 14, 0, 0, 0, time.UTC) // 15:00 at the bench, as in rebuilt
	afterwards  = rebuildTime.Add(17 * time.Minute)             // while the dead checks of 15:08 live
)

// rebuiltCase is a case whose rebuild was done at 15:00, isolated at 15:02 and proved dead at every store at 15:08; the
// answers are stamped 15:10 and later, a minute apart, unless they carry a time.
func rebuiltCase(t testing.TB, board, rebuild string, answers ...string) *measure.Case {
	t.Helper()
	for i, a := range answers {
		if !strings.Contains(a, "at:") {
			answers[i] = fmt.Sprintf("%s, at: 2026-12-01T15:%02d:00+01:00", a, 10+i)
		}
	}
	if rebuild == "" {
		rebuild = rebuilt
	}
	c := caseOf(t, board, rebuild, answers...)
	c.Safety.Isolation = []measure.Isolation{{Locked: true, Motor: "unplugged", OtherSources: "none", At: rebuildTime.Add(2 * time.Minute)}}
	for _, store := range safety.Stores(c.Board) {
		c.Safety.DeadChecks = append(c.Safety.DeadChecks, measure.DeadCheck{Point: store.Point, DC: quantity.Of(0.4, quantity.Volt),
			AC: quantity.Of(0, quantity.Volt), MeterProved: true, At: rebuildTime.Add(8 * time.Minute)})
	}
	return c
}

// static gives how a test stands at a position.
func static(t testing.TB, e safety.Evidence, test, position string) safety.Static {
	t.Helper()
	for _, s := range e.Statics {
		if s.Test == test && s.Position == position {
			return s
		}
	}
	t.Fatalf("no static test %s at %q among %d", test, position, len(e.Statics))
	return safety.Static{}
}

func TestWorkOfATest(t *testing.T) {
	for _, c := range []struct {
		needs, instrument string
		want              safety.Work
	}{
		{"question", "question", safety.Work{Need: safety.NeedQuestion}},
		{"dead", "meter", safety.Work{Need: safety.NeedDead}},
		{"dead", "insulation-tester", safety.Work{Need: safety.NeedDead, Tool: safety.ToolInsulation}},
		{"dead", "supply", safety.Work{Need: safety.NeedDead, Tool: safety.ToolInjection}},
		{"control-power", "scope", safety.Work{Need: safety.NeedControlPower, Tool: safety.ToolScope}},
		{"full", "camera", safety.Work{Need: safety.NeedFull}},
	} {
		if got := WorkOf(&knowledge.Test{Needs: c.needs, Instrument: c.instrument}); got != c.want {
			t.Errorf("%s with %s: %+v, want %+v", c.needs, c.instrument, got, c.want)
		}
	}
}

// TestStaticsOfOneBank enters readings of three parallel parts and asks how the test of their power terminals stands.
func TestStaticsOfOneBank(t *testing.T) {
	base := loadBase(t)
	part := func(q, rest string) string { return terminals + ", part: " + q + ", state: lifted, " + rest }
	bank := func(rest string) string { return terminals + ", position: low, " + rest }
	for _, c := range []struct {
		name    string
		answers []string
		because string
		minute  int // of the newest reading, 0 without one
	}{
		{"nothing read", nil, "not read since the rebuild of 15:00", 0},
		{"read before the rebuild", []string{bank("reading: OL, at: 2026-12-01T14:50:00+01:00")}, "not read since the rebuild of 15:00", 0},
		{"read as the rebuild was done", []string{bank("reading: OL, at: 2026-12-01T15:00:00+01:00")}, "not read since the rebuild of 15:00", 0},
		{"the bank in circuit", []string{bank("reading: OL")}, "", 10},
		{"one part in circuit is its bank", []string{terminals + ", part: Q2, reading: 22 MΩ"}, "", 10},
		{"no place, one position", []string{terminals + ", result: blocking"}, "", 10},
		{"a word for a reading", []string{bank("reading: blocking")}, "", 10},
		{"a result that does not pass", []string{bank("result: leaky")}, "reads leaky", 10},
		{"a short", []string{bank("reading: 0.4 Ω")}, "reads shorted", 10},
		{"lifted, one missing", []string{part("Q1", "reading: OL"), part("Q2", "reading: OL")}, "Q3 not read", 11},
		{"lifted, two missing", []string{part("Q1", "reading: OL")}, "Q2, Q3 not read", 10},
		{"lifted, all", []string{part("Q1", "reading: OL"), part("Q2", "reading: OL"), part("Q3", "reading: OL")}, "", 12},
		{"lifted, one shorted, one missing", []string{part("Q1", "reading: OL"), part("Q2", "reading: 0.4 Ω")}, "Q2 reads shorted; Q3 not read", 11},
		{"lifted, but not which", []string{terminals + ", position: low, state: lifted, reading: OL"}, "not read since the rebuild of 15:00", 0},
		{"a part shorted after its bank passed", []string{bank("reading: OL"), part("Q2", "reading: 0.4 Ω")}, "Q2 reads shorted", 11},
		{"the bank passed after the part was shorted", []string{part("Q2", "reading: 0.4 Ω"), bank("reading: OL")},
			"Q2 reads shorted; a later reading of its bank in circuit does not clear it, read the part lifted", 11},
		{"the part passed after it was shorted", []string{part("Q2", "reading: 0.4 Ω"), bank("reading: OL"), part("Q2", "reading: OL")}, "", 12},
		{"the part passed, but outside its hold point", []string{part("Q2", "reading: 0.4 Ω"), part("Q2", "reading: OL, at: 2026-12-01T15:19:00+01:00")}, "Q2 reads shorted; Q1, Q3 not read", 10},
		{"the part skipped after it was shorted", []string{part("Q2", "reading: 0.4 Ω"), bank("reading: OL"), part("Q2", "answer: skipped")}, "Q2 reads shorted", 11},
		{"the part unclear after it was shorted", []string{part("Q2", "reading: 0.4 Ω"), part("Q2", "reading: 385 kΩ"), bank("reading: OL")},
			"Q2 reads shorted; a later reading of its bank in circuit does not clear it, read the part lifted", 12},
		{"sound parts beside a bank that reads shorted", []string{bank("reading: 0.4 Ω"), part("Q1", "reading: OL"), part("Q2", "reading: OL"), part("Q3", "reading: OL")}, "reads shorted", 13},
		{"the newest by its time, not its line", []string{bank("reading: 0.4 Ω, at: 2026-12-01T15:12:00+01:00"), bank("reading: OL, at: 2026-12-01T15:11:00+01:00")}, "reads shorted", 12},
		{"of equal times the later line", []string{bank("reading: 0.4 Ω, at: 2026-12-01T15:12:00+01:00"), bank("reading: OL, at: 2026-12-01T15:12:00+01:00")}, "", 12},
		{"skipped", []string{bank("answer: skipped")}, "skipped", 10},
		{"put off after it passed", []string{bank("reading: OL"), bank("answer: later")}, "put off", 11},
		{"told by others", []string{bank("reading: OL, seen: on-arrival")}, "known on-arrival only, not read at the bench", 10},
		{"after the dead check has aged", []string{bank("reading: OL, at: 2026-12-01T15:19:00+01:00")}, "read outside its hold point", 19},
	} {
		got := static(t, EvidenceOf(base, rebuiltCase(t, chopper, "", c.answers...)), terminals, "low")
		if got.Because != c.because || got.Passed != (c.because == "") || got.Title == "" {
			t.Errorf("%s: passed %v, because %q, want %q", c.name, got.Passed, got.Because, c.because)
		}
		want := time.Time{}
		if c.minute > 0 {
			want = rebuildTime.Add(time.Duration(c.minute) * time.Minute)
		}
		if !got.At.Equal(want) {
			t.Errorf("%s: newest at %v, want %v", c.name, got.At, want)
		}
	}
}

// TestStaticsOfOtherTests: readings that are compared with the board, and tests of the whole board.
func TestStaticsOfOtherTests(t *testing.T) {
	base := loadBase(t)
	const stated = chopper + "\ngate: {pull_down: 10 kΩ}"
	const brake = "topology: low-side-chopper\nstages: {brake: {fitted: yes}}"
	for _, c := range []struct {
		name, board, rebuild, answer string
		test, position, because      string
	}{
		{"the bleed of three in parallel", stated, "", "gate-resistance, position: low, reading: 3.3 kΩ", "gate-resistance", "low", ""},
		{"the bleed of one, lifted", stated, "", "gate-resistance, position: low, reading: 10 kΩ", "gate-resistance", "low", "reads like a slip of the range or a lead"},
		{"a punched gate", stated, "", "gate-resistance, position: low, reading: 12 Ω", "gate-resistance", "low", "reads low"},
		{"an open bleed", stated, "", "gate-resistance, position: low, reading: OL", "gate-resistance", "low", "reads like a slip of the range or a lead"},
		{"the bleed of the rebuilt board", stated, "rebuild: {done: 2026-12-01T15:00:00+01:00, gate: {pull_down: 30 kΩ}}\n", "gate-resistance, position: low, reading: 10 kΩ", "gate-resistance", "low", ""},
		{"a bleed nobody stated", chopper, "", "gate-resistance, position: low, reading: 3.3 kΩ", "gate-resistance", "low",
			"cannot be judged: test gate-resistance compares with expected.gate_bleed, which this board does not state: give the result by name (good, low) or state the key"},
		{"by its name", chopper, "", "gate-resistance, position: low, result: good", "gate-resistance", "low", ""},
		{"as likely this as that", chopper, "", terminals + ", position: low, reading: 385 kΩ", terminals, "low", "may read blocking, 49 % sure only"},
		{"of the whole board", chopper, "", "freewheel-path-check, result: closed", "freewheel-path-check", "low", ""},
		{"of the whole board, open", chopper, "", "freewheel-path-check, result: open", "freewheel-path-check", "low", "reads open"},
		{"of every position at once", brake, "", "freewheel-diode-drop, result: normal", "freewheel-diode-drop", "brake", ""},
		{"of the other position", brake, "", "freewheel-diode-drop, position: low, result: normal", "freewheel-diode-drop", "brake", "not read since the rebuild of 15:00"},
		{"no place where there are four", bridge, "", terminals + ", reading: OL", terminals, "a-low", "not read since the rebuild of 15:00"},
		{"one of four", bridge, "", terminals + ", position: a-low, reading: OL", terminals, "a-low", ""},
		{"the other one of four", bridge, "", terminals + ", position: a-high, reading: OL", terminals, "a-low", "not read since the rebuild of 15:00"},
		{"the diode of a leg", bridge, "", "reverse-diode-drop, position: b-high, result: normal", "reverse-diode-drop", "b-high", ""},
		{"a bleed that is not fitted", bridge + "\ngate: {pull_down: none}", "", "gate-resistance, position: a-low, result: good", "gate-resistance", "a-low", ""},
		{"not done", chopper, "rebuild: {gate: {pull_down: 10 kΩ}}\n", terminals + ", position: low, reading: OL", terminals, "low", "no rebuild is entered as done, and a reading before rebuild.done does not count"},
	} {
		got := static(t, EvidenceOf(base, rebuiltCase(t, c.board, c.rebuild, c.answer)), c.test, c.position)
		if got.Because != c.because || got.Passed != (c.because == "") {
			t.Errorf("%s: passed %v, because %q, want %q", c.name, got.Passed, got.Because, c.because)
		}
	}
}

// TestStaticsCoverTheRebuiltBoard: every position has every static test that applies, on the parts that are in it now.
func TestStaticsCoverTheRebuiltBoard(t *testing.T) {
	base := loadBase(t)
	for _, c := range []struct {
		board, rebuild string
		want           string
	}{
		{chopper, "", "low: power-terminals-resistance gate-resistance freewheel-diode-drop freewheel-path-check gate-pull-down"},
		{bridge, "", "a-high: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down; a-low: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down; " +
			"b-high: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down; b-low: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down"},
		{"topology: half-bridge", "rebuild: {done: 2026-12-01T15:00:00+01:00, stages: {brake: {fitted: yes}}}\n",
			"high: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down; low: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down; " +
				"brake: power-terminals-resistance gate-resistance reverse-diode-drop gate-pull-down"},
	} {
		var got []string
		at := ""
		for _, s := range EvidenceOf(base, rebuiltCase(t, c.board, c.rebuild)).Statics {
			if s.Position != at {
				at, got = s.Position, append(got, s.Position+":")
			}
			got[len(got)-1] += " " + s.Test
		}
		if text := strings.Join(got, "; "); text != c.want {
			t.Errorf("%s:\ngot  %s\nwant %s", c.board, text, c.want)
		}
	}
	four := rebuiltCase(t, chopper, "rebuild: {done: 2026-12-01T15:00:00+01:00, positions: {low: {parts: [Q1, Q2, Q3, Q4]}}}\n",
		terminals+", part: Q1, state: lifted, reading: OL", terminals+", part: Q2, state: lifted, reading: OL", terminals+", part: Q3, state: lifted, reading: OL")
	if got := static(t, EvidenceOf(base, four), terminals, "low"); got.Because != "Q4 not read" {
		t.Errorf("a part that the rebuild added: %q", got.Because)
	}
}

// TestInsulationReadingsCountAsPowered: the tester leaves its voltage behind.
func TestInsulationReadingsCountAsPowered(t *testing.T) {
	base := loadBase(t)
	c := caseOf(t, chopper, "", "motor-insulation, reading: 200 MΩ, at: 2026-12-01T10:00:00+01:00", "board-insulation, answer: skipped, at: 2026-12-01T10:05:00+01:00",
		"winding-balance, result: balanced, at: 2026-12-01T10:10:00+01:00")
	if got := EvidenceOf(base, c).Powered; len(got) != 1 || got[0].UTC().Hour() != 9 || got[0].Minute() != 0 {
		t.Errorf("powered at %v, want at 10:00 at the bench only", got)
	}
	if got := EvidenceOf(base, nil); got.Powered != nil || got.Statics != nil {
		t.Errorf("no case: %+v", got)
	}
}

// withStatics gives a case its rebuild, and after it every static reading of every position, each of which passes.
func withStatics(base *knowledge.Base, c *measure.Case) *measure.Case {
	whole := *c
	whole.Rebuild = &measure.Rebuild{Done: rebuildTime, Board: c.Board}
	whole.Safety.Isolation = []measure.Isolation{{Locked: true, Motor: "unplugged", OtherSources: "none", At: rebuildTime.Add(2 * time.Minute)}}
	for _, store := range safety.Stores(c.Board) {
		whole.Safety.DeadChecks = append(whole.Safety.DeadChecks, measure.DeadCheck{Point: store.Point, DC: quantity.Of(0.4, quantity.Volt),
			AC: quantity.Of(0, quantity.Volt), MeterProved: true, At: rebuildTime.Add(8 * time.Minute)})
	}
	whole.Observations = append([]measure.Observation(nil), c.Observations...)
	for i := range whole.Observations {
		whole.Observations[i].At = rebuildTime.Add(-6 * time.Hour)
	}
	for i, s := range EvidenceOf(base, &whole).Statics {
		whole.Observations = append(whole.Observations, measure.Observation{Test: s.Test, Position: s.Position, Result: base.Test(s.Test).Static[0],
			At: rebuildTime.Add(10*time.Minute + time.Duration(i)*time.Second)})
	}
	return &whole
}

// TestStaticsOfTheFullCase: seven positions, all passed, but for one reading that was taken before the dead check.
func TestStaticsOfTheFullCase(t *testing.T) {
	base := loadBase(t)
	f, err := measure.Load("../testdata/full-case.yaml")
	if err != nil {
		t.Fatal(err)
	}
	c := withStatics(base, f.Case)
	e := EvidenceOf(base, c)
	if len(e.Statics) != 28 {
		t.Errorf("%d static tests, want four at each of seven positions", len(e.Statics))
	}
	for _, s := range e.Statics {
		if !s.Passed || s.Because != "" || !s.At.After(rebuildTime) {
			t.Errorf("%+v", s)
		}
	}
	c.Observations[len(c.Observations)-1].At = rebuildTime.Add(7 * time.Minute)
	for i, s := range EvidenceOf(base, c).Statics {
		if want := i < 27; s.Passed != want || !want && s.Because != "read outside its hold point" {
			t.Errorf("%d: %+v", i, s)
		}
	}
}

// askedOf tells whether a static test of a position is asked next: of the position, of one of its parts, or of the board.
func askedOf(base *knowledge.Base, c *measure.Case, s *Suggestion, x safety.Static) bool {
	var parts []string
	for _, p := range c.Board.Positions() {
		if p.Name == x.Position {
			parts = p.Parts
		}
	}
	return slices.ContainsFunc(s.Tests, func(cand Candidate) bool {
		whole := base.Test(x.Test).Per == "" && cand.Position == ""
		return cand.Static && cand.Test.ID == x.Test && (whole || cand.Position == x.Position || slices.Contains(parts, cand.Part))
	})
}

// TestEvidenceOfHostileCases: whatever stands in a case, each static test of each position is judged once, says why it
// does not pass, and is asked next for as long as it does not.
func TestEvidenceOfHostileCases(t *testing.T) {
	base := loadBase(t)
	rapid.Check(t, func(t *rapid.T) {
		c := drawCase(t, base)
		seen := map[string]bool{}
		s, err := Next(base, c, nil, afterwards)
		if err != nil {
			t.Fatal(err)
		}
		for _, x := range EvidenceOf(base, c).Statics {
			key := x.Test + " at " + x.Position
			if seen[key] || x.Passed != (x.Because == "") || x.Passed && !x.At.After(rebuildTime) {
				t.Fatalf("%+v, seen %v", x, seen[key])
			}
			seen[key] = true
			if asks := askedOf(base, c, s, x); x.Passed == asks && base.Test(x.Test).Per != "" || !x.Passed && !asks {
				t.Fatalf("%+v, asked next: %v", x, asks)
			}
		}
		if len(seen) < 3*len(c.Board.Positions()) {
			t.Fatalf("%d static tests at %d positions", len(seen), len(c.Board.Positions()))
		}
	})
}
