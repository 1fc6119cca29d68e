package safety

import (
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/measure"
)

func statusOf(t testing.TB, c *measure.Case, now time.Time, e Evidence, id string) RecordStatus {
	t.Helper()
	for _, s := range Record(c, now, e) {
		if s.Step.ID == id {
			return s
		}
	}
	t.Fatalf("no step %s", id)
	return RecordStatus{}
}

// The record holds every step of the case file, in the same order, and each says what to ask and how it is done.
func TestEveryStepOfTheRecordIsTold(t *testing.T) {
	var ids []string
	works := map[Work]bool{}
	for _, w := range Works() {
		works[w.Work] = true
	}
	for _, s := range RecordSteps() {
		ids = append(ids, s.ID)
		if s.Title == "" || !strings.HasSuffix(s.Ask, "?") || len(s.How) < 60 || s.Phase == "" || !works[s.Work] {
			t.Errorf("%s is not told: %+v", s.ID, s)
		}
		if insulated := s.Work.Tool == ToolInsulation; insulated != (strings.Contains(s.How, "Electronics disconnected") && strings.Contains(strings.ToLower(s.How), "discharge")) {
			t.Errorf("%s: the caution of the insulation tester: %s", s.ID, s.How)
		}
	}
	if !slices.Equal(ids, measure.StepWords()) {
		t.Errorf("steps %v, want %v", ids, measure.StepWords())
	}
	proved, _ := recordStep(measure.StepProtectionsProved)
	for _, word := range []string{"trip set low", "emergency stop", "over-temperature", "under- and over-voltage"} {
		if !strings.Contains(proved.How, word) {
			t.Errorf("the protections do not name %q", word)
		}
	}
	RecordSteps()[0].ID = "changed"
	if RecordSteps()[0].ID == "changed" {
		t.Error("the table can be changed from outside")
	}
}

func TestWhichStepsApply(t *testing.T) {
	const motor = "topology: low-side-chopper\nsupply: battery\npositions: {low: {parts: [Q1, Q2]}}\nload: {kind: dc-motor}\n"
	after := []string{measure.StepProtectionsProved, measure.StepSettingsRestored, measure.StepMotorTested, measure.StepCableTested, measure.StepLoadTested, measure.StepHandedOver}
	before := []string{measure.StepPhotographed, measure.StepFaultLogRead, measure.StepSettingsSaved, measure.StepPositionsMarked}
	bagged := []string{measure.StepDeadPartsBagged}
	const done = "rebuild: {done: 2026-12-01T08:00:00+01:00, loop: {inductance: 80 nH}}\n"
	for _, row := range []struct {
		name, board, rest string
		want              []string
	}{
		{"a new case", motor, "", before},
		{"a planned rebuild", motor, "rebuild: {loop: {inductance: 80 nH}}\n", before},
		{"rebuilt", motor, done, slices.Concat(before, bagged, after)},
		{"rebuilt, with a brake", motor + "stages: {brake: {fitted: yes}}", done, slices.Concat(before, bagged, after, []string{measure.StepBrakeResistorTested})},
		{"rebuilt, perhaps with a brake", motor + "stages: {brake: {fitted: unknown}}", done, slices.Concat(before, bagged, after, []string{measure.StepBrakeResistorTested})},
		{"a part named dead", motor, "outcome: {parts: [Q2]}\n", slices.Concat(before, bagged)},
		{"a part read shorted", motor, "observations: [{test: ohms, part: Q2, at: 2026-12-01T09:00:00+01:00, reading: shorted}]\n", slices.Concat(before, bagged)},
		{"a part read good", motor, "observations: [{test: ohms, part: Q2, at: 2026-12-01T09:00:00+01:00, reading: OL}]\n", before},
		{"handed over", motor, done + "steps: [{step: handed-over, result: done, at: 2026-12-01T09:00:00+01:00}]\n", slices.Concat(before, bagged, after, []string{measure.StepFollowedUp})},
	} {
		var got []string
		for _, s := range Record(parse(t, row.board, row.rest), at(t, "10:12"), Evidence{}) {
			if s.Applies {
				got = append(got, s.Step.ID)
			}
		}
		slices.Sort(got)
		if want := slices.Sorted(slices.Values(row.want)); !slices.Equal(got, want) {
			t.Errorf("%s: %v, want %v", row.name, got, want)
		}
	}
	if Record(nil, at(t, "10:12"), Evidence{}) != nil {
		t.Error("a record without a case")
	}
}

func TestWhatSettlesAStep(t *testing.T) {
	entry := func(result, clock string) measure.StepEntry {
		e := measure.StepEntry{Step: measure.StepSettingsRestored, Result: result}
		if clock != "" {
			e.At = at(t, clock)
		}
		return e
	}
	for _, row := range []struct {
		name    string
		steps   []measure.StepEntry
		last    string
		settled bool
	}{
		{"nothing", nil, "", false},
		{"done", []measure.StepEntry{entry("done", "09:00")}, "done", true},
		{"not possible", []measure.StepEntry{entry("not-possible", "09:00")}, "not-possible", true},
		{"not fitted", []measure.StepEntry{entry("not-fitted", "09:00")}, "not-fitted", true},
		{"failed", []measure.StepEntry{entry("failed", "09:00")}, "failed", false},
		{"done, then failed", []measure.StepEntry{entry("done", "09:00"), entry("failed", "09:30")}, "failed", false},
		{"failed, then done, in another order", []measure.StepEntry{entry("done", "09:30"), entry("failed", "09:00")}, "done", true},
		{"both at one moment", []measure.StepEntry{entry("failed", "09:00"), entry("done", "09:00")}, "failed", false},
		{"done in the future", []measure.StepEntry{entry("done", "11:00")}, "", false},
		{"not possible in the future", []measure.StepEntry{entry("not-possible", "11:00")}, "not-possible", false},
		{"failed in the future", []measure.StepEntry{entry("done", "09:00"), entry("failed", "11:00")}, "failed", false},
		{"done at no time", []measure.StepEntry{entry("done", "")}, "", false},
	} {
		c, e := ready(t)
		c.Steps = row.steps
		s := statusOf(t, c, at(t, "10:12"), e, measure.StepSettingsRestored)
		last := ""
		if s.Last != nil {
			last = s.Last.Result
		}
		if last != row.last || s.Settled != row.settled {
			t.Errorf("%s: last %q, settled %v", row.name, last, s.Settled)
		}
	}
}

// A step of the record stands behind the hold points of its work.
func TestAStepStandsBehindItsHoldPoints(t *testing.T) {
	c, e := ready(t)
	for _, s := range Record(c, at(t, "10:12"), e) {
		want := slices.Contains([]string{measure.StepHandedOver, measure.StepFollowedUp}, s.Step.ID)
		if (len(s.Missing) > 0) != want {
			t.Errorf("%s: %+v", s.Step.ID, s.Missing)
		}
	}
	c.Safety.Before = nil
	for id, point := range map[string]int{measure.StepProtectionsProved: 3, measure.StepMotorTested: 3, measure.StepCableTested: 3, measure.StepBrakeResistorTested: 3, measure.StepLoadTested: 3} {
		if s := statusOf(t, c, at(t, "10:12"), e, id); !names(s.Missing, point, "") {
			t.Errorf("%s: %+v", id, s.Missing)
		}
	}
	if s := statusOf(t, c, at(t, "10:12"), e, measure.StepPhotographed); len(s.Missing) > 0 {
		t.Errorf("photographs need nothing: %+v", s.Missing)
	}
}

func TestHandOverComesAfterTheOthers(t *testing.T) {
	c, e := ready(t)
	c.Steps = nil
	behind := []string{measure.StepProtectionsProved, measure.StepSettingsRestored, measure.StepMotorTested, measure.StepCableTested, measure.StepBrakeResistorTested, measure.StepLoadTested}
	for k, id := range behind {
		s := statusOf(t, c, at(t, "10:12"), e, measure.StepHandedOver)
		if len(s.Missing) != len(behind)-k || !strings.Contains(missingText(s.Missing), "record step CASE "+id+" done") {
			t.Errorf("before %s: %+v", id, s.Missing)
		}
		c.Steps = append(c.Steps, measure.StepEntry{Step: id, Result: "not-possible", At: at(t, "09:00")})
	}
	if s := statusOf(t, c, at(t, "10:12"), e, measure.StepHandedOver); len(s.Missing) != 0 {
		t.Errorf("everything is settled: %+v", s.Missing)
	}
	c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepLoadTested, Result: "failed", At: at(t, "09:30")})
	if s := statusOf(t, c, at(t, "10:12"), e, measure.StepHandedOver); !names(s.Missing, 3, "failed") {
		t.Errorf("the load test failed: %+v", s.Missing)
	}
}

func TestTheFollowUpIsDueThirtyDaysLater(t *testing.T) {
	day := func(n int, hour int) time.Time {
		return time.Date(2026, 12, 1+n, hour, 0, 0, 0, at(t, "10:00").Location())
	}
	for _, row := range []struct {
		name     string
		followed []time.Time
		result   string
		now      time.Time
		settled  bool
		mayAsk   bool
	}{
		{"not yet", nil, "", day(29, 23), false, false},
		{"due", nil, "", day(30, 7), false, true},
		{"followed up", []time.Time{day(30, 7)}, "done", day(31, 9), true, true},
		{"followed up too early", []time.Time{day(29, 23)}, "done", day(31, 9), false, true},
		{"it did not hold", []time.Time{day(30, 7)}, "failed", day(31, 9), false, true},
		{"followed up in the future", []time.Time{day(40, 7)}, "done", day(31, 9), false, true},
	} {
		c, e := ready(t)
		c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepHandedOver, Result: "done", At: day(0, 15)})
		for _, f := range row.followed {
			c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepFollowedUp, Result: row.result, At: f})
		}
		s := statusOf(t, c, row.now, e, measure.StepFollowedUp)
		if !s.Applies || s.Settled != row.settled || (len(s.Missing) == 0) != row.mayAsk || !s.Due.Equal(day(30, 0)) {
			t.Errorf("%s: applies %v, settled %v, due %s, missing %+v", row.name, s.Applies, s.Settled, s.Due, s.Missing)
		}
	}
	c, e := ready(t)
	c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepHandedOver, Result: "failed", At: day(0, 15)})
	if s := statusOf(t, c, day(40, 0), e, measure.StepFollowedUp); s.Applies || len(s.Missing) == 0 {
		t.Errorf("it was never handed over: %+v", s)
	}
}

// The list of works names each state of the board, in the order of the job, with every tool in each state it is used in.
func TestWorksNameEverything(t *testing.T) {
	seen, titles, last := map[Work]bool{}, map[string]bool{}, 0
	for _, w := range Works() {
		order := slices.Index(Needs(), w.Work.Need)
		if seen[w.Work] || titles[w.Title] || w.Title == "" || order < last {
			t.Errorf("%+v stands twice, without a title, or out of order", w)
		}
		seen[w.Work], titles[w.Title], last = true, true, order
	}
	for _, n := range Needs() {
		for tool, rule := range toolRules {
			scopeOnDead := tool == ToolScope && n == NeedDead // allowed, but no work of its own
			if want := slices.Contains(rule.needs, n) && !scopeOnDead; seen[Work{n, tool}] != want {
				t.Errorf("%s with %q: listed %v", n, tool, !want)
			}
		}
	}
}
