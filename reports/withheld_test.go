package reports

import (
	"encoding/json"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// TestNoReportTellsHowToDischargeABoardThatIsNotIsolated: in every form the steps are gone, what is missing stands there,
// and the times are figures.
func TestNoReportTellsHowToDischargeABoardThatIsNotIsolated(t *testing.T) {
	never := func(r Report) Report {
		c := *r.Case
		c.Safety = measure.Safety{}
		r.Case, r.Safety = &c, safety.StatusOf(&c, r.At, safety.Evidence{})
		return r
	}
	unasked := func(r Report) Report {
		r.Safety = safety.Status{}
		return r
	}
	for name, r := range map[string]Report{"no isolation is stated": never(pump(t)), "whether the board is isolated was not looked at": unasked(pump(t))} {
		if p := r.plan(); len(p.Steps) != 0 || len(p.Withheld) == 0 || len(r.Discharge.Steps) == 0 {
			t.Errorf("%d steps, withheld %v", len(p.Steps), p.Withheld)
		}
		for _, form := range []string{"report.md", "report.html", "report.json"} {
			text := strings.ReplaceAll(said(t, r, form), "**", "")
			if !strings.Contains(text, name) {
				t.Errorf("%s lacks %q", form, name)
			}
			for _, step := range []string{"put 440 Ω across it", "with insulated clips", "Discharge. Through"} {
				if strings.Contains(strings.ReplaceAll(text, "</b>", ""), step) {
					t.Errorf("%s still says %q", form, step)
				}
			}
			if form != "report.json" && (!strings.Contains(text, "DISCHARGE WITHHELD.") || !strings.Contains(text, "it would take: 60 V after 3 s")) {
				t.Errorf("%s does not withhold the discharge, or loses its figures", form)
			}
		}
		var got struct {
			Discharge struct {
				Steps, Withheld []any
				Resistor        float64 `json:"resistor_ohm"`
			}
		}
		if err := json.Unmarshal([]byte(rendered(t, pages[8], r, Style{})), &got); err != nil || len(got.Discharge.Steps) != 0 || len(got.Discharge.Withheld) == 0 || got.Discharge.Resistor != 440 {
			t.Errorf("%v, %+v", err, got.Discharge)
		}
	}
	r := pump(t)
	if text := said(t, r, "report.json"); !strings.Contains(text, "put 440 Ω across it") || r.plan() != r.Discharge {
		t.Error("the steps are gone although the board is isolated")
	}
	if text := said(t, r, "report.md"); !strings.Contains(text, "**Discharge.** Through 440 Ω") {
		t.Error("the times are gone although the board is isolated")
	}
}

// TestAResistorLikeAShortHasNoTimes: what is withheld by itself has no figures either.
func TestAResistorLikeAShortHasNoTimes(t *testing.T) {
	r := frozen(t)
	p := *r.Discharge
	p.Withheld = []safety.Missing{{Text: "that resistor is as good as a short", Unlock: "take 440 Ω"}}
	r.Discharge = &p
	if text := said(t, r, "report.md"); !strings.Contains(text, "as good as a short") || strings.Contains(text, "Figures alone") {
		t.Error("the report names times of a resistor that is withheld")
	}
}

// outsideJob is the whole job with two readings and three steps outside their hold points.
func outsideJob(t *testing.T) Report {
	r := job(t)
	lacks := []safety.Missing{{Point: 3, Text: "nothing is stated that counts before a current-limited bus: it takes a guard; a fuse", Unlock: "state it"}}
	r.OutsideSteps = []OutsideStep{{5, lacks}, {6, lacks}, {8, []safety.Missing{{Point: 3, Text: "nothing is stated that counts before the insulation tester"}}}, {99, lacks}, {-1, lacks}}
	return r
}

// TestStepsOutsideAreMarked in the table of steps, on the first page and in the object; a superseded entry is called so.
func TestStepsOutsideAreMarked(t *testing.T) {
	r := outsideJob(t)
	text := strings.ReplaceAll(rendered(t, jobOutputs[4], r, Style{}), `\*`, "*")
	first, rest, _ := strings.Cut(text, "## To the design team")
	for _, want := range []string{"| Step: Protections proved | record | failed (superseded) |", "| Step: Motor tested | record | done |", "hold point 3: nothing is stated that counts before a current-limited bus |"} {
		if !strings.Contains(first, want) {
			t.Errorf("the first page lacks %q", want)
		}
	}
	for _, want := range []string{"| Protections proved* | after the repair | failed (superseded) |", "| Protections proved* | after the repair | **done** |", "| Motor tested* |", "| Cable tested |",
		"* OUTSIDE A HOLD POINT.", "Step: Protections proved, done, 2026-12-01 17:10 +01:00: hold point 3: nothing is stated that counts before a current-limited bus: it takes a guard; a fuse", "## All readings and steps outside a hold point"} {
		if !strings.Contains(rest, want) {
			t.Errorf("the later pages lack %q", want)
		}
	}
	var got struct {
		Steps []struct {
			Step       string
			Superseded bool
			Outside    bool `json:"outside_hold_point"`
			Missing    []any
		}
	}
	if err := json.Unmarshal([]byte(rendered(t, jobOutputs[6], r, Style{})), &got); err != nil {
		t.Fatal(err)
	}
	for i, s := range got.Steps {
		if outside := i == 5 || i == 6 || i == 8; s.Outside != outside || (len(s.Missing) > 0) != outside || s.Superseded != (i == 5) {
			t.Errorf("entry %d reads %+v", i, s)
		}
	}
}

// TestStatusCountsWhatIsOutside: readings and steps, one or many.
func TestStatusCountsWhatIsOutside(t *testing.T) {
	for want, n := range map[string][2]int{"1 reading and 2 steps are": {1, 2}, "1 reading is": {1, 0}, "1 step is": {0, 1}, "3 readings are": {3, 0}, "2 readings and 1 step are": {2, 1}} {
		if got := outsideCount(n[0], n[1]); got != want {
			t.Errorf("got %q, want %q", got, want)
		}
	}
	p := halfway(t)
	p.Outside, p.OutsideSteps = p.Outside[:1], []OutsideStep{{0, nil}, {1, nil}}
	if text := strings.Join(strings.Fields(statusText(t, p)), " "); !strings.Contains(text, "6 taken outside NOTE 1 reading and 2 steps are kept") {
		t.Error(text)
	}
}

// TestWhichEntryCounts: done before its time and without one does not count, an older one is superseded.
func TestWhichEntryCounts(t *testing.T) {
	last := measure.StepEntry{Step: "motor-tested", Result: "done", At: testTime}
	x := safety.RecordStatus{Last: &last}
	for _, c := range []struct {
		at   time.Time
		want string
	}{{testTime, ""}, {testTime.Add(-time.Hour), "superseded"}, {time.Time{}, "no time stated: does not count"}, {testTime.Add(time.Hour), "dated later than this report: does not count"}} {
		if got := notCounting(measure.StepEntry{Step: "motor-tested", Result: "done", At: c.at}, x, testTime.Add(time.Minute)); got != c.want {
			t.Errorf("%v: %q, want %q", c.at, got, c.want)
		}
	}
	if got := notCounting(last, safety.RecordStatus{}, testTime); got != "" {
		t.Errorf("a step without an entry that counts: %q", got)
	}
}

// TestTheFirstPageCountsWhatVotes, and says how much of the record does not.
func TestTheFirstPageCountsWhatVotes(t *testing.T) {
	r := frozen(t)
	want := "2 answers, 1 finding from the values of the board and the rule base. " + count(len(r.Case.Observations)-2, "further entry does", "further entries do") + " not count; each stands with its reason under: " + leftOutTitle + "."
	if got := r.basis(); got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	real := pump(t)
	left, voting := real.leftOut(), map[int]bool{}
	for _, f := range real.Ranking.Findings {
		voting[f.Observation] = f.Observation >= 0
	}
	delete(voting, -1)
	if n := len(left.Blocks[0].Table.Rows); n != len(real.Case.Observations)-len(voting) {
		t.Errorf("%d entries are listed as not counting, %d of %d vote", n, len(voting), len(real.Case.Observations))
	}
}

// TestTheSafetyLogHoldsEverythingThatPutEnergyIn: readings under power, of the insulation tester and of unknown tests, and
// steps done under power; not what was skipped, nor a step that could not be done.
func TestTheSafetyLogHoldsEverythingThatPutEnergyIn(t *testing.T) {
	r := job(t)
	c := *r.Case
	read := &quantity.Reading{Kind: quantity.Word, Word: "low"}
	c.Observations = append(c.Observations[:len(c.Observations):len(c.Observations)], measure.Observation{Test: "scoped-edge", Result: "low", At: benchTime}, measure.Observation{Test: "scoped-edge", Answer: "skipped", At: benchTime},
		measure.Observation{Test: "winding", Result: "good", At: benchTime}, measure.Observation{Test: "of another base", Reading: read, At: benchTime})
	c.Steps = append(c.Steps[:len(c.Steps):len(c.Steps)], measure.StepEntry{Step: measure.StepLoadTested, Result: "not-possible", At: benchTime})
	c.BringUp = []measure.Stage{{Stage: "lamp", At: benchTime}}
	r.Case, r.Base.Tests = &c, append(r.Base.Tests, *r.Base.Test("failure-moment"))
	last := &r.Base.Tests[len(r.Base.Tests)-1]
	last.ID, last.Title, last.Needs, last.Instrument = "winding", "Winding to frame", "dead", "insulation-tester"
	var got []string
	for _, l := range r.logEntries() {
		if text, ok := strings.CutPrefix(l.text, countsAs); ok {
			got = append(got, text)
		}
	}
	all := strings.Join(got, "\n")
	for text, n := range map[string]int{"reading Case temperature": 3, "reading Edge at the terminals": 1, "Winding to frame": 1, "rule base does not know": 1, "step protections proved": 2, "tested under load": 1, "bring-up, stage lamp": 1, "motor tested": 0, "Power terminals": 0} {
		if strings.Count(all, text) != n {
			t.Errorf("%q stands %d times, want %d:\n%s", text, strings.Count(all, text), n, all)
		}
	}
	if n := len(r.poweredReadings()) + len(r.poweredRecord()); n != len(got) {
		t.Errorf("%d of %d", len(got), n)
	}
}

// TestFiguresOfAnUnsolvedTopology: what is stated is not asked for again; why there is no figure is said instead.
func TestFiguresOfAnUnsolvedTopology(t *testing.T) {
	r, err := chain("../testdata/cases/case-36-robot-h-bridge-four-parallel.yaml")
	if err != nil {
		t.Fatal(err)
	}
	c := *r.Case
	c.Board = c.Board.WithWord("topology", "other")
	m, err := stress.Compute(&c, 1)
	if err != nil {
		t.Fatal(err)
	}
	r.Case = &c
	p := pageOf(r, testTime)
	p.Needs = m.Needs
	text := boardKnown(p)
	if strings.Contains(text, "wait for board.topology") || !strings.Contains(text, "; figures: ") || !strings.Contains(text, "stated as other") {
		t.Error(text)
	}
	p.Case = &measure.Case{}
	if text := boardKnown(p); !strings.Contains(text, "figures wait for board.topology") {
		t.Error(text)
	}
}

// TestAgesAreRoundedUp: minutes to two hours, hours to two days, then days.
func TestAgesAreRoundedUp(t *testing.T) {
	for d, want := range map[time.Duration][2]string{
		30 * time.Second: {"1 min", "1 min ago"}, 119*time.Minute + time.Second: {"120 min", "2 h 0 min ago"}, 121 * time.Minute: {"3 h", "2 h 1 min ago"},
		1447 * time.Minute: {"25 h", "24 h 7 min ago"}, 49 * time.Hour: {"3 days", "3 days ago"}, -time.Second: {"future", ""}} {
		if got := ageWords(safety.PointStatus{Age: d}); got != want[0] {
			t.Errorf("%v: %s, want %s", d, got, want[0])
		}
		if got := ago(d); want[1] != "" && got != want[1] {
			t.Errorf("%v: %s, want %s", d, got, want[1])
		}
	}
}

// TestConditionsStandOneALine with what to do about each, as safety words them.
func TestConditionsStandOneALine(t *testing.T) {
	r := pump(t)
	c := *r.Case
	c.Safety.Before = []measure.Before{{Step: measure.BeforeInjection, At: testTime.Add(-time.Minute), SourcesOff: true, GatesHeld: true}}
	c.Safety.Isolation = append(c.Safety.Isolation[:0:0], c.Safety.Isolation...)
	d := safety.Check(&c, safety.Work{Need: safety.NeedDead, Tool: safety.ToolInjection}, testTime, diagnose.EvidenceOf(r.Base, &c))
	last := d.Missing[len(d.Missing)-1]
	s := newScreen(Style{})
	writeMissing(s, []safety.Missing{last})
	want := ` point 4  before an injection:
          - not stated: the limit of current and voltage set before connecting
            → set the limit on the open output, before connecting
          - not stated: somebody who stays with it and stops at 40 K rise
            → stay with it, and stop at 40 K rise
 do this  state everything anew: drivemend safe before CASE injection
          --sources-off --gates-held --limit-set --attended
`
	if s.String() != want {
		t.Errorf("got\n%swant\n%s", s.String(), want)
	}
}

// TestLacks: a list is one from three conditions on, or of a statement; brackets and alternatives are not taken apart.
func TestLacks(t *testing.T) {
	for _, c := range []struct {
		text, unlock string
		about        string
		conditions   []condition
		do           []string
	}{
		{"at bus: 30 V read; touch nothing", "discharge it; check again", "at bus: 30 V read; touch nothing", nil, []string{"discharge it", "check again"}},
		{"nothing is stated that counts before it: it takes a guard; a fuse of at most 3 A (judgement; small); glasses", "look at each of them, then state it", "nothing is stated that counts before it: it takes",
			[]condition{{"a guard", ""}, {"a fuse of at most 3 A (judgement; small)", ""}, {"glasses", ""}}, []string{"look at each of them, then state it"}},
		{"before a scope step: a clip on a live node", "use a differential probe; or an isolated supply; then state everything anew: cmd", "before a scope step:",
			[]condition{{"a clip on a live node", "use a differential probe; or an isolated supply"}}, []string{"state everything anew: cmd"}},
		{"one; two; three", "", "", []condition{{"one", ""}, {"two", ""}, {"three", ""}}, []string{""}},
	} {
		got := lackOf(c.text, c.unlock)
		if got.about != c.about || len(got.conditions) != len(c.conditions) || strings.Join(got.do, "|") != strings.Join(c.do, "|") {
			t.Errorf("%q: %+v", c.text, got)
			continue
		}
		for i := range c.conditions {
			if got.conditions[i] != c.conditions[i] {
				t.Errorf("%q: %+v", c.text, got.conditions[i])
			}
		}
	}
	s := newScreen(Style{})
	writeLack(s, "point 3", lackOf("one; two; three", ""))
	if s.String() != " point 3  - one\n          - two\n          - three\n" {
		t.Errorf("got\n%s", s.String())
	}
}

// TestStatusWords: the title of a store is folded and not cut, what is spared a check says why, and the follow-up is called by its name.
func TestStatusWords(t *testing.T) {
	p := pageOf(pump(t), testTime)
	text := statusText(t, p)
	if flat := strings.Join(strings.Fields(text), " "); !strings.Contains(flat, "primary capacitor of the") || !strings.Contains(text, "\n            auxiliary supply\n") {
		t.Errorf("the auxiliary supply is cut:\n%s", text)
	}
	p.Safety.Spared = []string{"phases: needs no check while the motor is unplugged"}
	if text := statusText(t, p); !strings.Contains(text, "\n spared   phases: needs no check while the motor is unplugged\nHOLD POINTS") {
		t.Errorf("what is spared does not stand under the dead checks:\n%s", text)
	}
	p = halfway(t)
	p.Record = frozenRecord(job(t).Case)
	p.Record[len(p.Record)-1].Last, p.Record[len(p.Record)-1].Settled = nil, false
	if text := statusText(t, p); !strings.Contains(text, "\nFOLLOW-UP  due 2027-01-01\n") {
		t.Errorf("the follow-up is not named:\n%s", text)
	}
}
