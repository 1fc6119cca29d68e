package diagnose

import (
	"encoding/json"
	"math"
	"runtime"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/meter"
)

const (
	chopper = "topology: low-side-chopper\nsupply: rectified-mains\nhistory: first-failure\nswitch: {kind: igbt, rated_voltage: 600 V}\nstages: {command: {kind: potentiometer}}\npositions: {low: {parts: [Q1, Q2, Q3]}}"
	bridge  = "topology: h-bridge\nsupply: battery\nhistory: first-failure\nswitch: {kind: mosfet, rated_voltage: 100 V}"
	rebuilt = "rebuild: {done: 2026-12-01T15:00:00+01:00}\n"
)

func loadBase(t testing.TB) *knowledge.Base {
	t.Helper()
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	return base
}

// caseOf reads a case from the lines of its board and its answers, each "test: …, result: …".
func caseOf(t testing.TB, board, rest string, answers ...string) *measure.Case {
	t.Helper()
	text := "drivemend: 1\ncase: small\nopened: 2026-12-01\nboard:\n  " + strings.ReplaceAll(board, "\n", "\n  ") + "\n" + rest + "observations:\n"
	for _, a := range answers {
		text += "  - {test: " + a + "}\n"
	}
	if len(answers) == 0 {
		text = strings.TrimSuffix(text, "observations:\n")
	}
	f, err := measure.Parse("small.yaml", []byte(text))
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return f.Case
}

func ranked(t testing.TB, base *knowledge.Base, c *measure.Case, spans map[string]stress.Span, about string) *Ranking {
	t.Helper()
	r, err := Rank(base, c, spans, about)
	if err != nil {
		t.Fatal(err)
	}
	for _, u := range r.Unbound {
		if strings.Contains(u.Why, "has no result") {
			t.Fatal(u.Why) // the test itself is wrong
		}
	}
	return r
}

// chanceOf gives the probability of a cause, stress, fault or "fault part".
func chanceOf(t testing.TB, r *Ranking, id string) float64 {
	t.Helper()
	id, part, _ := strings.Cut(id, " ")
	for _, l := range slices.Concat(r.Causes, r.Stresses, r.Faults) {
		if l.ID != id {
			continue
		}
		if part == "" {
			return l.Probability
		}
		for _, p := range l.Parts {
			if p.Part == part {
				return p.Probability
			}
		}
	}
	t.Fatalf("no line %s %s", id, part)
	return 0
}

func testsOf(findings []Finding) string {
	var ids []string
	for _, f := range findings {
		ids = append(ids, f.Test.ID)
	}
	return strings.Join(ids, " ")
}

// asBytes is everything a ranking shows, for comparison to the bit.
func asBytes(t testing.TB, x any) string {
	t.Helper()
	raw, err := json.Marshal(x)
	if err != nil {
		t.Fatal(err)
	}
	return string(raw)
}

// TestUnlistedLeadsWhenNothingFits is a board with a shorted switch on which every look and measurement found things
// as they should be: each listed cause ought to have left a mark.
func TestUnlistedLeadsWhenNothingFits(t *testing.T) {
	base := loadBase(t)
	answers := []string{"power-terminals-resistance, part: Q-A-LOW, reading: 0.4 Ω, state: lifted", "failure-moment, result: light-load",
		"what-changed, result: nothing", "trips-before, result: none", "weather, result: ordinary", "die-look, result: other"}
	for _, test := range base.Tests {
		if test.Observes == "" || test.Per != "" || test.Computed != "" || test.Observes == "violent-discharge" {
			continue
		}
		best := test.Results[0].ID
		for _, r := range test.Results {
			if test.Absent[r.ID].Mid > test.Absent[best].Mid {
				best = r.ID
			}
		}
		answers = append(answers, test.ID+", result: "+best)
	}
	r := ranked(t, base, caseOf(t, bridge, "", answers...), nil, "unlisted")
	if r.Unlisted < r.Causes[0].Probability || r.Unlisted < 2*r.UnlistedPrior {
		t.Errorf("unlisted went from %.3f to %.3f, leading cause %s %.3f", r.UnlistedPrior, r.Unlisted, r.Causes[0].ID, r.Causes[0].Probability)
	}
}

// TestAnswersThatSayNothing compares rankings with and without answers that must not count.
func TestAnswersThatSayNothing(t *testing.T) {
	base := loadBase(t)
	before, after := ", at: 2026-12-01T10:00:00+01:00", ", at: 2026-12-01T16:00:00+01:00"
	for _, c := range []struct {
		name         string
		with, counts []string // answers, and those of them that count
		why          string   // of the first answer that does not
	}{
		{"skipped", []string{"bang-or-flash, result: bang", "failure-moment, answer: skipped"}, []string{"bang-or-flash, result: bang"}, "skipped"},
		{"put off", []string{"failure-moment, answer: later"}, nil, "later"},
		{"changed", []string{"failure-moment, result: stall", "failure-moment, result: turn-off"}, []string{"failure-moment, result: turn-off"}, "superseded by a later answer"},
		{"already in the prior", []string{"after-repair, result: \"yes\""}, nil, "already in the starting odds"},
		{"unknown test", []string{"no-such-test, result: good"}, nil, "this rule base has no such test"},
		{"not of this board", []string{"latch-check, result: flows-on", "fan-turns, result: stopped"}, []string{"fan-turns, result: stopped"}, "does not apply to this board"},
		{"in circuit after lifted", []string{"power-terminals-resistance, part: Q-A-LOW, reading: 0.4 Ω, state: lifted", "power-terminals-resistance, position: a-low, reading: OL, state: in-circuit"},
			[]string{"power-terminals-resistance, part: Q-A-LOW, reading: 0.4 Ω, state: lifted"}, outranked},
		{"dead after the rebuild", []string{"fan-turns, result: stopped" + after}, nil, "taken after the rebuild: serves the bring-up only"},
		{"again after the rebuild", []string{"bus-ripple, result: high" + before, "bus-ripple, result: as-computed" + after}, []string{"bus-ripple, result: high" + before}, outranked},
		{"after the rebuild, written first", []string{"bus-ripple, result: as-computed" + after, "bus-ripple, result: high" + before}, []string{"bus-ripple, result: high" + before}, outranked},
	} {
		with := ranked(t, base, caseOf(t, bridge, rebuilt, c.with...), nil, "")
		alone := ranked(t, base, caseOf(t, bridge, rebuilt, c.counts...), nil, "")
		if asBytes(t, with.Causes) != asBytes(t, alone.Causes) || asBytes(t, with.Faults) != asBytes(t, alone.Faults) {
			t.Errorf("%s: the answer counts", c.name)
		}
		if c.why != "" && (len(with.Unbound) != 1 || with.Unbound[0].Why != c.why) {
			t.Errorf("%s: left out are %+v, want one: %s", c.name, with.Unbound, c.why)
		}
	}
}

// TestAnswersThatCount are answers that must move the ranking.
func TestAnswersThatCount(t *testing.T) {
	base := loadBase(t)
	after := ", at: 2026-12-01T16:00:00+01:00"
	for _, c := range []struct{ board, answer, line string }{
		{bridge, "bus-ripple, result: high" + after, "bus-ripple-high"},
		{bridge, "bang-or-flash, result: bang" + after, "switch-shorted"},
		{chopper, "power-terminals-resistance, reading: 0.4 Ω", "switch-shorted Q2"},
		{chopper, "power-terminals-resistance, position: low, reading: < 1 Ω", "switch-shorted Q2"},
		{chopper, "dead-parts, result: whole-bank", "switch-shorted Q3"},
	} {
		none, some := ranked(t, base, caseOf(t, c.board, rebuilt), nil, ""), ranked(t, base, caseOf(t, c.board, rebuilt, c.answer), nil, "")
		if a, b := chanceOf(t, none, c.line), chanceOf(t, some, c.line); !(b > a+0.001) {
			t.Errorf("%s: %s goes from %.4f to %.4f", c.answer, c.line, a, b)
		}
	}
}

// TestHearsayWeighsLess compares the same answer told on arrival and found at the bench.
func TestHearsayWeighsLess(t *testing.T) {
	base := loadBase(t)
	for _, answer := range []string{"failure-moment, result: turn-off", "fan-turns, result: stopped", "power-terminals-resistance, part: Q1, reading: 0.4 Ω, state: lifted"} {
		about := map[bool]string{true: "clamp-missing", false: "cooling-air-blocked"}[strings.HasPrefix(answer, "failure")]
		if strings.HasPrefix(answer, "power") {
			about = "switch-shorted"
		}
		told := ranked(t, base, caseOf(t, chopper, "", answer+", seen: on-arrival"), nil, about).Findings[0].Decibans
		found := ranked(t, base, caseOf(t, chopper, "", answer), nil, about).Findings[0].Decibans
		if !(told > 0 && told < found) {
			t.Errorf("%s for %s: told %.2f dB, found %.2f dB", answer, about, told, found)
		}
	}
}

// TestReadingsEndToEnd reads the same part in the ways an instrument can show it.
func TestReadingsEndToEnd(t *testing.T) {
	base := loadBase(t)
	at := func(reading string) float64 {
		c := caseOf(t, chopper, "", "power-terminals-resistance, part: Q2, state: lifted, "+reading)
		return chanceOf(t, ranked(t, base, c, nil, ""), "switch-shorted Q2")
	}
	prior := chanceOf(t, ranked(t, base, caseOf(t, chopper, ""), nil, ""), "switch-shorted Q2")
	over, above, far := at("reading: OL"), at("reading: '> 20 MΩ'"), at("reading: OL, range: 200 MΩ")
	if over != above || !(over < prior/5) || !(far < prior/5) {
		t.Errorf("OL %.4g, > 20 MΩ %.4g, OL above 200 MΩ %.4g, prior %.4g", over, above, far, prior)
	}
	for _, r := range []string{"reading: 0.4 Ω", "reading: '< 0.2 Ω'", "reading: shorted", "result: shorted", "reading: 0 Ω"} {
		if p := at(r); !(p > 0.9) {
			t.Errorf("%s: Q2 shorted with %.4f", r, p)
		}
	}
}

// TestMeasuredReplacesComputed: the scoped peak takes the computed one's vote and its place in the order.
func TestMeasuredReplacesComputed(t *testing.T) {
	base, spans := loadBase(t), map[string]stress.Span{"turn_off.peak_over_rated": {Low: 1, High: 1.2}}
	answers := []string{"gate-off-hold, result: held", "failure-moment, result: turn-off", "fan-turns, result: turns", "bus-ripple, result: as-computed"}
	computed := testsOf(ranked(t, base, caseOf(t, bridge, "", answers...), spans, "").Findings)
	if want := "failure-moment fan-turns predicted-peak gate-off-hold bus-ripple"; computed != want {
		t.Errorf("order %s, want %s", computed, want)
	}
	scoped := caseOf(t, bridge, "", append(answers, "scoped-overshoot, reading: 60 %")...)
	measured := ranked(t, base, scoped, spans, "turn-off-spike")
	if got, want := testsOf(measured.Findings), strings.Replace(computed, "predicted-peak", "scoped-overshoot", 1); got != want {
		t.Errorf("order %s, want %s", got, want)
	}
	if asBytes(t, measured.Causes) != asBytes(t, ranked(t, base, scoped, nil, "").Causes) {
		t.Error("the computed peak still counts beside the measured one")
	}
	high := ranked(t, base, caseOf(t, bridge, "", answers...), spans, "turn-off-spike")
	if !(chanceOf(t, measured, "turn-off-spike") < chanceOf(t, high, "turn-off-spike")/3) {
		t.Error("the measured low peak does not speak against the spike")
	}
}

// TestGroupsShareTheirWeight: n answers of a group count with the exponent 1/(1+0.4(n−1)) each.
func TestGroupsShareTheirWeight(t *testing.T) {
	base := loadBase(t)
	answers := []string{"driver-supply, result: low", "gate-on-voltage, result: low", "driver-delay, result: slow", "bang-or-flash, result: bang"}
	for n := 1; n <= 3; n++ {
		s, err := solve(base, caseOf(t, bridge, "", append(answers[:n:n], answers[3])...), nil, false)
		if err != nil {
			t.Fatal(err)
		}
		if len(s.votes) != n+1 {
			t.Fatalf("%d answers vote: %+v", len(s.votes), s.unbound)
		}
		for k, vt := range s.votes {
			exponent := 1 / (1 + 0.4*float64(n-1))
			if vt.finding.Test.Group == "" {
				exponent = 1
			}
			if got, want := s.ev[k].Present[0], math.Pow(vt.present, exponent); math.Abs(got-want) > 1e-12 {
				t.Errorf("%d in the group, %s: %g, want %g", n, vt.finding.Test.ID, got, want)
			}
		}
	}
}

// TestKeysAnswerTests: a stated network answers the look for one, unless somebody looked.
func TestKeysAnswerTests(t *testing.T) {
	base := loadBase(t)
	stated := ranked(t, base, caseOf(t, bridge+"\nsnubber: {kind: none}", ""), nil, "clamp-missing")
	if testsOf(stated.Findings) != "snubber-look" || stated.Findings[0].Observation != -1 || !(stated.Findings[0].Decibans > 3) {
		t.Errorf("findings %+v", stated.Findings)
	}
	looked := ranked(t, base, caseOf(t, bridge+"\nsnubber: {kind: none}", "", "snubber-look, result: fitted"), nil, "clamp-missing")
	if testsOf(looked.Findings) != "snubber-look" || looked.Findings[0].Observation != 0 || looked.Findings[0].Decibans > 0 {
		t.Errorf("findings %+v", looked.Findings)
	}
}

// TestTwoDefectsOnOneBoard: of two independent defects, each with its own marks, both lead, their pair is the likeliest
// of all pairs, and the answers favour it a hundredfold over either alone. That it need not lead follows from the prior.
func TestTwoDefectsOnOneBoard(t *testing.T) {
	base := loadBase(t)
	c := caseOf(t, chopper, "", "fan-turns, result: stopped", "hot-smell-before, result: smelt", "trips-before, result: over-temperature",
		"command-wire-check, result: open", "speed-command, result: full-speed", "bench-command, result: ignores")
	r := ranked(t, base, c, nil, "")
	if got := r.Causes[0].ID + " " + r.Causes[1].ID; got != "cooling-air-blocked command-wire-open" {
		t.Errorf("leading are %s", got)
	}
	s, err := solve(base, c, nil, true)
	if err != nil {
		t.Fatal(err)
	}
	best, gain := -1, map[string]float64{}
	for h, hyp := range s.hyps {
		var ids []string
		for _, k := range hyp.causes {
			ids = append(ids, s.causes[k].ID)
		}
		gain[strings.Join(ids, " ")] = s.update.Posterior[h] / hyp.weight
		if len(ids) == 2 && (best < 0 || s.update.Posterior[h] > s.update.Posterior[best]) {
			best = h
		}
	}
	pair := s.causes[s.hyps[best].causes[0]].ID + " " + s.causes[s.hyps[best].causes[1]].ID
	if pair != "cooling-air-blocked command-wire-open" {
		t.Errorf("the likeliest pair is %s", pair)
	}
	for _, alone := range strings.Fields(pair) {
		if gain[pair] < 100*gain[alone] {
			t.Errorf("the answers favour %s by %.3g over %s alone", pair, gain[pair]/gain[alone], alone)
		}
	}
}

// TestPositionsOfAnotherTopology: on a board without named legs any two places can be dead together.
func TestPositionsOfAnotherTopology(t *testing.T) {
	c := caseOf(t, "topology: other\npositions: {one: {parts: [Q1]}, two: {parts: [Q2]}, three: {parts: [Q3]}}", "",
		"power-terminals-resistance, part: Q1, reading: 0.3 Ω", "power-terminals-resistance, part: Q3, reading: 0.3 Ω", "power-terminals-resistance, part: Q2, reading: OL")
	r := ranked(t, loadBase(t), c, nil, "")
	for part, want := range map[string]float64{"Q1": 1, "Q2": 0, "Q3": 1} {
		if p := chanceOf(t, r, "switch-shorted "+part); math.Abs(p-want) > 0.05 {
			t.Errorf("%s: %.3f", part, p)
		}
	}
}

// TestBankOfOneIsItsPart: naming the place or its only part is the same reading, so the later one counts.
func TestBankOfOneIsItsPart(t *testing.T) {
	base := loadBase(t)
	c := caseOf(t, bridge, "", "power-terminals-resistance, position: a-low, reading: OL", "power-terminals-resistance, part: Q-A-LOW, reading: 0.4 Ω")
	if r := ranked(t, base, c, nil, ""); len(r.Findings) != 1 || !(chanceOf(t, r, "switch-shorted Q-A-LOW") > 0.9) {
		t.Errorf("findings %+v", r.Findings)
	}
}

func TestEqualCasesGiveEqualBytes(t *testing.T) {
	base := loadBase(t)
	f, err := measure.Load("../testdata/full-case.yaml")
	if err != nil {
		t.Fatal(err)
	}
	f.Case.Observations = f.Case.Observations[:24] // leave enough open to value
	spans := map[string]stress.Span{"turn_off.peak_over_rated": {Low: 0.8, High: 1.1}}
	var first string
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	for i, procs := range []int{1, 1, 2, 7} {
		runtime.GOMAXPROCS(procs)
		n, err := Next(loadBase(t), f.Case, spans, time.Date(2026, 12, 1, 12, 0, 0, 0, time.UTC))
		if err != nil {
			t.Fatal(err)
		}
		got := asBytes(t, []any{ranked(t, base, f.Case, spans, ""), n})
		if i == 0 {
			first = got
		} else if got != first {
			t.Fatalf("run %d with %d processors gives other bytes", i, procs)
		}
	}
}

// TestExpectedNamesAreKnown: what the base may call expected is known to the meter, in the unit it states.
func TestExpectedNamesAreKnown(t *testing.T) {
	c := caseOf(t, chopper+"\ngate: {pull_down: 10 kΩ}", "")
	for _, e := range knowledge.Expected() {
		for _, at := range []meter.Place{{Parallel: 3}, {Parallel: 3, Lifted: true}, {Parallel: 1}} {
			if q, ok, err := meter.Expected(c.Board, e.Name, at); err != nil || !ok || q.Unit != e.Unit || !(q.Value > 0) {
				t.Errorf("%s at %+v: %v %s %v %v", e.Name, at, q.Value, q.Unit, ok, err)
			}
		}
	}
}
