package reports

import (
	"bytes"
	"encoding/json"
	"slices"
	"strings"
	"testing"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// TestEnterLine: a command that can be pasted but for its value, in one piece, with the place where there is one.
func TestEnterLine(t *testing.T) {
	results := func(ids ...string) []knowledge.Result {
		var out []knowledge.Result
		for _, id := range ids {
			out = append(out, knowledge.Result{ID: id})
		}
		return out
	}
	look := &knowledge.Test{ID: "snubber-look", Results: results("missing", "fitted")}
	ohms := &knowledge.Test{ID: "power-terminals-resistance", Unit: quantity.Ohm, Results: results("shorted", "leaky")}
	many := &knowledge.Test{ID: "failure-moment", Results: results("power-on", "start", "turn-off", "deceleration", "hot-run", "stall", "light-load")}
	ratio := &knowledge.Test{ID: "esr", Unit: quantity.Ratio, Instrument: "camera"}
	for _, c := range []struct {
		c    diagnose.Candidate
		want string
	}{
		{diagnose.Candidate{Test: look}, " enter    drivemend enter CASE snubber-look missing|fitted\n"},
		{diagnose.Candidate{Test: look, Position: "low"}, " enter    drivemend enter CASE snubber-look missing|fitted --position low\n"},
		{diagnose.Candidate{Test: look, Part: "Q 2's"}, ` enter    drivemend enter CASE snubber-look missing|fitted --part 'Q 2'\''s'` + "\n"},
		{diagnose.Candidate{Test: ohms, Part: "Q1", Position: "low", Lifted: true}, " enter\n drivemend enter CASE power-terminals-resistance READING --part Q1 --lifted\n          READING: a number, in Ω unless its unit stands with it; or shorted |\n          leaky\n"},
		{diagnose.Candidate{Test: many}, " enter    drivemend enter CASE failure-moment RESULT\n          RESULT: power-on | start | turn-off | deceleration | hot-run | stall |\n          light-load\n"},
		{diagnose.Candidate{Test: ratio}, " enter    drivemend enter CASE esr READING\n          READING: a number without a unit, a ratio\n          with --surface matt-dot|tape|moulded|painted|bare-metal: what it\n          looked at\n"},
	} {
		s := newScreen(Style{})
		writeEnter(s, c.c)
		if s.String() != c.want {
			t.Errorf("got\n%swant\n%s", s.String(), c.want)
		}
	}
}

// TestWhatMayBeDoneIsNamed: after a STOP the powered tests that are allowed stand with the conditions they rest on and
// their cautions, and the steps of the record that may be done; what is locked, what is asked for anyway and what is
// settled does not stand there.
func TestWhatMayBeDoneIsNamed(t *testing.T) {
	_, r := underPower(t)
	scoped, hot := r.Base.Test("scoped-edge"), r.Base.Test("case-temperature")
	n := &diagnose.Suggestion{Case: r.Case.ID, At: benchTime, Stop: "nothing saves minutes", Tests: []diagnose.Candidate{
		{Test: scoped, Position: "low", Value: -3, Minutes: 6, Allowed: true}, {Test: hot, Value: -40, Minutes: 10, BlockedBy: []string{"full bus: nothing is stated"}},
		{Test: r.Base.Test("power-terminals-resistance"), Value: -1, Minutes: 2, Allowed: true}}}
	known := r.beside()
	known.Record = nil
	for _, x := range []struct {
		id               string
		settled, applies bool
		missing          []safety.Missing
	}{{measure.StepProtectionsProved, false, true, nil}, {measure.StepSettingsRestored, true, true, nil}, {measure.StepLoadTested, false, true, []safety.Missing{{Point: 3}}}, {measure.StepDeadPartsBagged, false, false, nil}, {measure.StepMotorTested, false, true, nil}} {
		known.Record = append(known.Record, safety.RecordStatus{Step: safety.RecordStep{ID: x.id}, Settled: x.settled, Applies: x.applies, Missing: x.missing})
	}
	var screen, page bytes.Buffer
	if err := Next(&screen, r.Base, n, r.Discharge, Style{}, known); err != nil {
		t.Fatal(err)
	}
	text := strings.Join(strings.Fields(screen.String()), " ")
	for _, want := range []string{"STOP nothing saves minutes", "MAY BE DONE under the conditions stated at 15:24 for low, current-limited bus, 15:26 for scope scoped-edge Edge at the terminals low 6 min", "caution this board can hold 167.3 J at up to 390 V, and keeps it when power goes off",
		"caution Power ends every dead check", "caution The earth clip", "RECORD open, and may be done now: protections-proved, motor-tested entered by", "1 powered test stays locked"} {
		if !strings.Contains(text, want) {
			t.Errorf("lacks %q:\n%s", want, screen.String())
		}
	}
	before, _, _ := strings.Cut(text, "LOCKED")
	for _, not := range []string{"Case temperature", "Power terminals", "load-tested", "settings-restored", "dead-parts-bagged"} {
		if strings.Contains(before, not) {
			t.Errorf("names %q:\n%s", not, screen.String())
		}
	}
	if err := NextJSON(&page, n, known); err != nil {
		t.Fatal(err)
	}
	var got struct {
		Steps []string `json:"open_steps"`
	}
	if err := json.Unmarshal(page.Bytes(), &got); err != nil || !slices.Equal(got.Steps, []string{"protections-proved", "motor-tested"}) {
		t.Errorf("%v, %v", err, got.Steps)
	}
	n.Tests[0].Allowed = false
	if text := nextText(t, r, n); strings.Contains(text, "MAY BE DONE") {
		t.Errorf("a locked test may be done:\n%s", text)
	}
	n.Tests[0].Allowed, n.Tests[0].Must = true, true
	if text := nextText(t, r, n); strings.Contains(text, "MAY BE DONE") || !strings.Contains(text, "NEXT Edge at the terminals") {
		t.Errorf("a test that must be done stands twice:\n%s", text)
	}
}
