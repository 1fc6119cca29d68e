package reports

import (
	"io"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// benchTime is after the rebuild of the whole job, under the conditions stated for the low bus.
var benchTime = time.Date(2026, 12, 1, 15, 30, 0, 0, time.UTC)

// job is the frozen report on a case that holds every part of the record, long after its follow-up.
func job(t *testing.T) Report {
	t.Helper()
	file, err := measure.Load("testdata/whole-job.yaml")
	if err != nil {
		t.Fatal(err)
	}
	r := frozen(t)
	r.Case = file.Case
	r.Record = frozenRecord(file.Case)
	r.Base.Tests = append(r.Base.Tests,
		knowledge.Test{ID: "case-temperature", Title: "Case temperature", Needs: "full", Minutes: 10, Instrument: "camera", Unit: quantity.Celsius},
		knowledge.Test{ID: "scoped-edge", Title: "Edge at the terminals", Ask: "What is the peak?", How: "Short loop of lead.", Needs: "low-bus", Minutes: 6, Instrument: "scope", Results: []knowledge.Result{{ID: "low"}}},
	)
	r.Ranking.Findings = append(r.Ranking.Findings, diagnose.Finding{Test: r.Base.Test("case-temperature"), Part: "Q1", Shown: "36 °C", Source: "measured", Observation: 3, Decibans: 1.5, Alone: 1.5})
	return r
}

// frozenRecord is how the steps of the record stand, filled by hand.
func frozenRecord(c *measure.Case) []safety.RecordStatus {
	phases := map[string]safety.Phase{measure.StepPhotographed: safety.BeforeTouching, measure.StepFaultLogRead: safety.BeforeTouching, measure.StepSettingsSaved: safety.BeforeTouching,
		measure.StepPositionsMarked: safety.BeforeTouching, measure.StepDeadPartsBagged: safety.WhileRepairing}
	var record []safety.RecordStatus
	for _, id := range measure.StepWords() {
		r := safety.RecordStatus{Step: safety.RecordStep{ID: id, Phase: safety.AfterRepair, Title: capital(stepName(id))}, Applies: true}
		if phase, ok := phases[id]; ok {
			r.Step.Phase = phase
		}
		for k := range c.Steps {
			if c.Steps[k].Step == id {
				r.Last, r.Settled = &c.Steps[k], c.Steps[k].Result != "failed"
			}
		}
		if id == measure.StepFollowedUp && record[len(record)-1].Settled {
			r.Due = time.Date(2027, 1, 1, 11, 0, 0, 0, time.UTC)
		}
		record = append(record, r)
	}
	return record
}

// halfway is the status of the whole job at the bench: some steps are done, one failed, the rest stands open.
func halfway(t *testing.T) StatusPage {
	r := job(t)
	c := *r.Case
	c.Outcome, c.Steps = nil, append([]measure.StepEntry(nil), c.Steps[:6]...)
	st := frozenStatus()
	st.Unplaced, st.At = nil, benchTime
	st.Isolation = safety.IsolationStatus{Missing: []safety.Missing{{Point: 0, Text: "the board had energy put in at 2026-12-01 16:30, after it was isolated at 2026-12-01 09:40", Unlock: "isolate it again and state it"}}, Last: st.Isolation.Last}
	dead := append(append([]safety.Missing(nil), st.Isolation.Missing...), st.Points[0].Missing...)
	no := func(need safety.Need, tool safety.Tool, missing ...safety.Missing) safety.Decision {
		return safety.Decision{Need: need, Tool: tool, Missing: missing}
	}
	yes := func(need safety.Need, tool safety.Tool) safety.Decision {
		return safety.Decision{Need: need, Tool: tool, Allowed: true}
	}
	nobody := safety.Missing{Point: 3, Text: "full bus: nothing is stated before it", Unlock: "look at each condition, then: drivemend safe before CASE full …"}
	return StatusPage{Case: &c, At: benchTime, Safety: st, Record: frozenRecord(&c), Stated: 23, Assumed: 1, Outside: r.Outside,
		Works: []WorkLine{{"questions", yes(safety.NeedQuestion, safety.NoTool)}, {"dead check, discharge", no(safety.NeedDeadCheck, safety.NoTool, dead[0])},
			{"ohms, diode, capacitance", no(safety.NeedDead, safety.NoTool, dead...)}, {"injection", no(safety.NeedDead, safety.ToolInjection, append(dead, safety.Missing{Point: 4, Text: "injection: nothing is stated before it"})...)},
			{"low bus", yes(safety.NeedLowBus, safety.NoTool)}, {"low bus with scope", yes(safety.NeedLowBus, safety.ToolScope)}, {"full bus", no(safety.NeedFull, safety.NoTool, nobody)}},
		Open:  []OpenTest{{"Gate path of each switch", "gate-resistance", "must be done"}, {"Snubber parts", "snubber-parts", "must be done"}, {"Fan turns", "fan-turns", "skipped"}},
		Needs: []stress.Need{{Key: "gate.turn_off_resistance", For: []string{"margin"}}}}
}

// underPower suggests a scope test on the low bus that the hold points allow.
func underPower(t *testing.T) (*diagnose.Suggestion, Report) {
	r := job(t)
	n := &diagnose.Suggestion{Case: r.Case.ID, At: benchTime, Tests: []diagnose.Candidate{{Test: r.Base.Test("scoped-edge"), Position: "low", Value: 30, Bits: 0.5, Minutes: 6, Allowed: true},
		{Test: r.Base.Test("power-terminals-resistance"), Position: "low", Must: true, Serves: true, Minutes: 2, BlockedBy: []string{"the board is not isolated"}, UnlockedBy: []string{"isolate it"}, Again: "low reads leaky: read it again"}}}
	return n, r
}

var jobOutputs = []output{
	{"job-status.txt", nil}, {"job-status.json", nil}, {"job-next.txt", nil}, {"job-next.json", nil},
	{"job-report.md", func(w io.Writer, r Report, _ Style) error { return Markdown(w, r) }},
	{"job-report.html", func(w io.Writer, r Report, _ Style) error { return HTML(w, r) }},
	{"job-report.json", func(w io.Writer, r Report, _ Style) error { return ReportJSON(w, r) }},
	{"job-why.txt", func(w io.Writer, r Report, s Style) error { return Why(w, r.Case, r.Ranking, s, r.beside()) }},
}

// jobWriters gives every output of the whole job with its writer.
func jobWriters(t *testing.T) []output {
	page := halfway(t)
	next, r := underPower(t)
	known := r.beside()
	out := append([]output(nil), jobOutputs...)
	out[0].write = func(w io.Writer, _ Report, s Style) error { return Status(w, page, s) }
	out[1].write = func(w io.Writer, _ Report, _ Style) error { return StatusJSON(w, page) }
	out[2].write = func(w io.Writer, r Report, s Style) error { return Next(w, r.Base, next, r.Discharge, s, known) }
	out[3].write = func(w io.Writer, _ Report, _ Style) error { return NextJSON(w, next, known) }
	return out
}

func TestJobGolden(t *testing.T) {
	r := job(t)
	for _, o := range jobWriters(t) {
		golden(t, o.name, rendered(t, o, r, Style{}))
	}
}

func TestJobScreensFit(t *testing.T) {
	r := job(t)
	for _, o := range jobWriters(t) {
		if !strings.HasSuffix(o.name, ".txt") {
			continue
		}
		for _, width := range []int{40, 80, 132} {
			for i, line := range strings.Split(rendered(t, o, r, Style{Width: width}), "\n") {
				if n := columns(line); n > width {
					t.Errorf("%s, line %d takes %d of %d columns: %s", o.name, i+1, n, width, line)
				}
			}
		}
	}
}
