package safety

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// A statement lives eight hours and never past its day, as an isolation does.
func TestAStatementLivesAsAnIsolationDoes(t *testing.T) {
	for _, row := range []struct {
		name, stated, now string
		counts            bool
	}{
		{"the same moment", "2026-12-01T10:00:00+01:00", "2026-12-01T10:00:00+01:00", true},
		{"eight hours", "2026-12-01T10:00:00+01:00", "2026-12-01T18:00:00+01:00", true},
		{"a second more", "2026-12-01T10:00:00+01:00", "2026-12-01T18:00:01+01:00", false},
		{"past midnight", "2026-12-01T23:50:00+01:00", "2026-12-02T00:10:00+01:00", false},
		{"past midnight where it was written only", "2026-12-01T23:50:00Z", "2026-12-02T01:10:00+01:00", true},
		{"in the future", "2026-12-01T10:00:01+01:00", "2026-12-01T10:00:00+01:00", false},
	} {
		c, e := ready(t)
		stated, _ := time.Parse(time.RFC3339, row.stated)
		now, _ := time.Parse(time.RFC3339, row.now)
		for k := range c.Safety.Before {
			c.Safety.Before[k].At = stated
		}
		for _, w := range Works() {
			if !w.Work.Need.Powered() {
				continue
			}
			if d := Check(c, w.Work, now, e); d.Allowed != row.counts {
				t.Errorf("%s, %s: allowed %v, missing %+v", w.Title, row.name, d.Allowed, d.Missing)
			}
		}
	}
}

func TestFuseFor(t *testing.T) {
	for _, row := range []struct {
		board                string
		control, low, full   float64
		becauseLow, fullSays string
	}{
		{"bus: {fuse: 63 A}", 3.15, 10, 63, "maker", "own bus fuse"},
		{"bus: {fuse: 5 A}\nload: {running_current: 20 A}", 3.15, 5, 5, "own bus fuse", "own bus fuse"},
		{"load: {running_current: 20 A}", 3.15, 10, 40, "maker", "twice the running current"},
		{"load: {running_current: 2 A}\nbus: {fuse: none}", 3.15, 10, 4, "maker", "twice the running current"},
		{"bus: {fuse: unknown}", 3.15, 10, 10, "maker", "judgement"},
		{"bus: {fuse: 63 A}\nassumed: [bus.fuse]", 3.15, 10, 63, "maker", "assumed"},
	} {
		b := boardOf(t, row.board)
		for need, want := range map[Need]float64{NeedControlPower: row.control, NeedLowBus: row.low, NeedFull: row.full, NeedDead: 0} {
			if f := FuseFor(b, need); f.Value != want || f.Unit != quantity.Ampere || (f.Because == "") != (need == NeedDead) {
				t.Errorf("%s, %s: %+v, want %g A with its reason", row.board, need, f, want)
			}
		}
		if low, full := FuseFor(b, NeedLowBus).Because, FuseFor(b, NeedFull).Because; !strings.Contains(low, row.becauseLow) || !strings.Contains(full, row.fullSays) {
			t.Errorf("%s: because %q, %q", row.board, low, full)
		}
	}
}

// The fuse counts at the unkind end of its interval, and by the rebuilt board.
func TestTheFuseIsHeldAgainstTheBoardAsItStands(t *testing.T) {
	c, e := ready(t)
	set := func(q quantity.Quantity) bool {
		changed(measure.BeforeFull, func(b *measure.Before) { b.Fuse = q })(c, &e)
		return Check(c, Work{Need: NeedFull}, at(t, "10:12"), e).Allowed
	}
	if !set(quantity.Of(63, quantity.Ampere)) || set(quantity.Quantity{Value: 60, Low: 55, High: 65, Unit: quantity.Ampere}) || set(quantity.Of(63, quantity.Volt)) {
		t.Error("63 A is the limit, whatever the interval")
	}
	c.Rebuild.Board = c.Rebuild.Board.With("bus.fuse", quantity.Of(16, quantity.Ampere))
	if set(quantity.Of(63, quantity.Ampere)) || !set(quantity.Of(16, quantity.Ampere)) {
		t.Error("the rebuild fitted 16 A")
	}
	c.Rebuild.Board = c.Rebuild.Board.WithWord("bus.capacitance", "none")
	changed(measure.BeforeFull, func(b *measure.Before) { b.Bank = "" })(c, &e)
	if !set(quantity.Of(16, quantity.Ampere)) {
		t.Error("a board without bus capacitors has none to re-form")
	}
}

// An observation is judged by what had been written at its time.
func TestAReadingIsJudgedByTheRecordOfItsMoment(t *testing.T) {
	for _, row := range []struct {
		name    string
		spoil   func(c *measure.Case, e *Evidence)
		outside func(Work) bool
	}{
		{"as it was", func(*measure.Case, *Evidence) {}, none},
		{"stated only later", func(c *measure.Case, _ *Evidence) {
			for k := range c.Safety.Before {
				c.Safety.Before[k].At = at(t, "10:13")
			}
		}, func(w Work) bool { return w.Need.Powered() || w.Tool != NoTool }},
		{"overtaken only later", func(c *measure.Case, _ *Evidence) {
			c.Safety.Isolation = append(c.Safety.Isolation, measure.Isolation{At: at(t, "10:13")})
			c.Safety.Before = append(c.Safety.Before, measure.Before{Step: measure.BeforeFull, At: at(t, "10:14")})
			c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "10:14")})
			c.Safety.Energised = append(c.Safety.Energised, measure.Energised{At: at(t, "10:15")})
			c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepMotorTested, Result: "failed", At: at(t, "10:15")})
			c.BringUp = append(c.BringUp, measure.Stage{Stage: "first", At: at(t, "10:15")})
		}, none},
		{"rebuilt only later", func(c *measure.Case, _ *Evidence) { c.Rebuild.Done = at(t, "10:13") }, powered},
		{"motor tested only later", func(c *measure.Case, _ *Evidence) { c.Steps[0].At = at(t, "10:13") }, powered},
		{"static test read only later", func(_ *measure.Case, e *Evidence) { e.Statics[0].At = at(t, "10:13") }, powered},
		{"checked only later", func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks[0].At = at(t, "10:13") }, dead},
		{"a link with its times swapped around it", func(c *measure.Case, _ *Evidence) {
			c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "10:30"), Removed: at(t, "10:05")})
		}, either(dead, powered)},
		{"a link still on", func(c *measure.Case, _ *Evidence) {
			c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "09:42"), Removed: at(t, "10:13")})
		}, either(dead, powered)},
	} {
		for _, w := range Works() {
			c, e := ready(t)
			row.spoil(c, &e)
			if w.Work.Energises() { // the reading itself is part of the evidence
				e.Powered = append(e.Powered, at(t, "10:12"))
			}
			want := row.outside(w.Work) && w.Work.Need != NeedQuestion
			outside, missing := OutsideHoldPoint(c, measure.Observation{Result: "good", At: at(t, "10:12")}, w.Work, e)
			if outside != want || outside != (len(missing) > 0) {
				t.Errorf("%s, %s: outside %v, missing %+v", w.Title, row.name, outside, missing)
			}
			if undated, m := OutsideHoldPoint(c, measure.Observation{Result: "good"}, w.Work, e); undated != (w.Work.Need != NeedQuestion) || undated != (len(m) > 0) {
				t.Errorf("%s: a reading without a time: outside %v", w.Title, undated)
			}
		}
	}
}

// Two readings with the insulation tester: the first one leaves charge, so that the second stands outside.
func TestTheInsulationTesterPutsEnergyIn(t *testing.T) {
	c, e := ready(t)
	e.Powered = []time.Time{at(t, "10:09"), at(t, "10:11")}
	work := Work{NeedDead, ToolInsulation}
	if outside, m := OutsideHoldPoint(c, measure.Observation{Result: "good", At: at(t, "10:09")}, work, e); outside {
		t.Errorf("the first reading: %+v", m)
	}
	if outside, _ := OutsideHoldPoint(c, measure.Observation{Result: "good", At: at(t, "10:11")}, work, e); !outside {
		t.Error("the second reading was taken on what the first had charged")
	}
	if outside, _ := OutsideHoldPoint(c, measure.Observation{Result: "good", At: at(t, "10:09")}, Work{Need: NeedDead}, e); !outside {
		t.Error("ohms at the moment of the tester")
	}
	if !work.Energises() || (Work{Need: NeedDead}).Energises() || !(Work{Need: NeedLowBus}).Energises() {
		t.Error("what puts energy in")
	}
}

func TestAnInjectionAlwaysCarriesItsLimits(t *testing.T) {
	c, e := ready(t)
	d := Check(c, Work{NeedDead, ToolInjection}, at(t, "10:12"), e)
	text := strings.Join(d.Carries, " ")
	if !d.Allowed || !strings.Contains(text, "before connecting") || !strings.Contains(text, "stay with it") || !strings.Contains(text, "40 K") {
		t.Errorf("allowed %v, carries %q", d.Allowed, text)
	}
	for _, w := range Works() {
		if plain := w.Work.Tool == NoTool && !w.Work.Need.Powered(); (len(Check(c, w.Work, at(t, "10:12"), e).Carries) == 0) != plain {
			t.Errorf("%s carries %v", w.Title, Check(c, w.Work, at(t, "10:12"), e).Carries)
		}
	}
}

// What a technician reads when points 3 and 4 withhold a step, on one board, from nothing on record to a stale statement.
func TestTextsOfPointsThreeAndFour(t *testing.T) {
	text := ""
	show := func(title string, c *measure.Case, e Evidence, works ...Work) {
		for _, w := range works {
			text += strings.TrimSpace(string(w.Need)+" "+string(w.Tool)) + ", " + title + "\n"
			for _, m := range Check(c, w, at(t, "10:12"), e).Missing {
				text += "  " + string(rune('0'+m.Point)) + "  " + m.Text + "\n     -> " + m.Unlock + "\n"
			}
		}
	}
	low := Work{Need: NeedLowBus}
	c := parse(t, tableBoard, "")
	c.Safety.Isolation = []measure.Isolation{sound(t, "09:40")}
	show("nothing on record", c, Evidence{}, Work{Need: NeedControlPower}, low, Work{Need: NeedFull})
	c, e := ready(t)
	changed(measure.BeforeLowBus, func(b *measure.Before) {
		*b = measure.Before{Step: b.Step, At: b.At, Motor: motorConnected, Fuse: quantity.Of(16, quantity.Ampere), Bank: "stored"}
	})(c, &e)
	e.Statics[0].Passed, e.Statics[0].Because = false, "not read after the rebuild"
	e.Statics[2].Passed, e.Statics[2].Because = false, "not read after the rebuild"
	e.Statics[4].Passed, e.Statics[4].Because = false, "Q9 reads leaky at 09:10"
	show("most of it lacking", c, e, low)
	c, e = ready(t)
	c.Safety.Isolation = append(c.Safety.Isolation, sound(t, "10:05"))
	show("isolated again since", c, e, low, Work{NeedLowBus, ToolScope}, Work{NeedLowBus, ToolDoublePulse}, Work{NeedDead, ToolInsulation}, Work{NeedDead, ToolInjection})
	c, e = ready(t)
	c.Steps = []measure.StepEntry{{Step: measure.StepMotorTested, Result: "failed", At: at(t, "09:00")}}
	changed(measure.BeforeScope, func(b *measure.Before) { b.EarthClips = 2 })(c, &e)
	changed(measure.BeforeInjection, func(b *measure.Before) { b.GatesHeld, b.LimitSet = false, false })(c, &e)
	show("not tested, two clips, gates open", c, e, Work{NeedFull, ToolScope}, Work{NeedDead, ToolInjection})
	golden(t, filepath.Join("testdata", "conditions.golden"), text)
}

// A rebuild of the future is named as what it is, whatever else stands against the step.
func TestARebuildOfTheFutureIsNamed(t *testing.T) {
	c, e := ready(t)
	c.Rebuild.Done = at(t, "10:13")
	for now, want := range map[string]bool{"10:12": true, "10:13": false} {
		if d := Check(c, Work{Need: NeedFull}, at(t, now), e); names(d.Missing, 3, "the repair is dated") != want {
			t.Errorf("%s: %+v", now, d.Missing)
		}
	}
}
