package safety

import (
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// While the board is not cut off, nothing tells how a store is measured or emptied.
func TestNothingIsToldAtALiveStore(t *testing.T) {
	for _, row := range []struct {
		name  string
		spoil func(c *measure.Case)
		told  bool
	}{
		{"never checked, isolated", func(c *measure.Case) { c.Safety.DeadChecks = nil }, true},
		{"never checked", func(c *measure.Case) { c.Safety.DeadChecks, c.Safety.Isolation = nil, nil }, false},
		{"read high", func(c *measure.Case) { c.Safety.DeadChecks[0].DC, c.Safety.Isolation = volts(300), nil }, false},
		{"checks that have aged", func(c *measure.Case) {
			for k := range c.Safety.DeadChecks {
				c.Safety.DeadChecks[k].At = at(t, "09:50")
			}
			c.Safety.Isolation[0].Locked = false
		}, false},
	} {
		for _, w := range []Work{{Need: NeedDead}, {NeedDead, ToolInjection}, {NeedDead, ToolInsulation}} {
			c, e := ready(t)
			row.spoil(c)
			stores := 0
			for _, m := range Check(c, w, at(t, "10:12"), e).Missing {
				if m.Point == 0 || m.Point > 2 || m.Unlock == alarmUnlock {
					continue
				}
				stores++
				if told := !strings.HasPrefix(m.Unlock, "after the isolation: the dead check at "); told != row.told {
					t.Errorf("%s, %s: %+v", row.name, w.Tool, m)
				}
			}
			if stores == 0 {
				t.Errorf("%s, %s: no store is missing", row.name, w.Tool)
			}
		}
	}
}

// How a bank is re-formed puts power on: it is told only when nothing else is missing.
func TestReformingIsToldAlone(t *testing.T) {
	for _, row := range []struct {
		name  string
		spoil func(c *measure.Case, e *Evidence)
		told  bool
	}{
		{"the bank alone", func(*measure.Case, *Evidence) {}, true},
		{"no guard", changed(measure.BeforeFull, func(b *measure.Before) { b.Guard = false }), false},
		{"a failing test", func(_ *measure.Case, e *Evidence) {
			e.Failing = []Static{{Test: "look", Title: "look", Because: "reads burnt"}}
		}, false},
		{"no rebuild", func(c *measure.Case, _ *Evidence) { c.Rebuild = nil }, false},
		{"a link", func(c *measure.Case, _ *Evidence) { c.Safety.Links = []measure.Link{{Fitted: at(t, "09:50")}} }, false},
		{"an old statement", func(c *measure.Case, _ *Evidence) {
			c.Safety.Isolation = append(c.Safety.Isolation, sound(t, "10:05"))
		}, false},
	} {
		for _, bank := range []string{"stored", ""} {
			c, e := ready(t)
			changed(measure.BeforeFull, func(b *measure.Before) { b.Bank = bank })(c, &e)
			row.spoil(c, &e)
			d := Check(c, Work{Need: NeedFull}, at(t, "10:12"), e)
			text := missingText(d.Missing)
			if d.Allowed || strings.Contains(text, "rated voltage through") != row.told || strings.Contains(text, "told when nothing else is missing") == row.told {
				t.Errorf("%s, bank %q: %+v", row.name, bank, d.Missing)
			}
		}
	}
	c, e := ready(t)
	changed(measure.BeforeFull, func(b *measure.Before) { b.Bank = "stored" })(c, &e)
	changed(measure.BeforeScope, func(b *measure.Before) { b.Probe = "" })(c, &e)
	if text := missingText(Check(c, Work{NeedFull, ToolScope}, at(t, "10:12"), e).Missing); strings.Contains(text, "rated voltage through") {
		t.Errorf("the probe is missing as well: %s", text)
	}
}

func TestAnIsolationOfTheFutureIsNamed(t *testing.T) {
	for _, row := range []struct {
		name       string
		isolations []measure.Isolation
		want, not  string
	}{
		{"none", nil, "no isolation is stated", "in the future"},
		{"ahead", []measure.Isolation{sound(t, "11:00")}, "the isolation on record is dated 2026-12-01 11:00, in the future", "no isolation is stated"},
		{"no time", []measure.Isolation{{Locked: true, Motor: motorUnplugged, OtherSources: "none"}}, "the isolation on record carries no time", "no isolation is stated"},
		{"unlocked, and one ahead", []measure.Isolation{{Motor: motorUnplugged, OtherSources: "none", At: at(t, "09:00")}, sound(t, "11:00")}, "is not locked; the isolation on record is dated", "no isolation is stated"},
	} {
		c, e := ready(t)
		c.Safety.Isolation = row.isolations
		m := Check(c, Work{Need: NeedDeadCheck}, at(t, "10:12"), e).Missing
		if text := missingText(m); !strings.Contains(text, row.want) || strings.Contains(text, row.not) || !strings.Contains(text, "safe isolation CASE") {
			t.Errorf("%s: %+v", row.name, m)
		}
	}
}

func TestWhatIsSparedIsSaid(t *testing.T) {
	c, e := ready(t)
	if s := StatusOf(c, at(t, "10:12"), e); len(s.Spared) != 0 {
		t.Errorf("the shaft is only locked: %v", s.Spared)
	}
	c.Safety.Isolation[0].Motor = motorUnplugged
	s := StatusOf(c, at(t, "10:12"), e)
	if !slices.Equal(s.Spared, []string{"phases: needs no check while the motor is unplugged"}) || slices.ContainsFunc(s.Points, func(p PointStatus) bool { return p.Store.Point == PointPhases }) {
		t.Errorf("spared %v, points %+v", s.Spared, s.Points)
	}
	c.Safety.Isolation = nil
	if s := StatusOf(c, at(t, "10:12"), e); len(s.Spared) != 0 {
		t.Errorf("not isolated: %v", s.Spared)
	}
}

// A half of a split bank is told with what it holds in balance and with what it can hold out of it.
func TestAHalfIsToldOutOfBalance(t *testing.T) {
	p, err := Discharge(InputOf(boardOf(t, "supply: rectified-mains\nbus: {highest: 800 V, capacitance: 2000 µF, halves: yes}")))
	if err != nil {
		t.Fatal(err)
	}
	for _, d := range p.Stores {
		text := storeSteps(d, p.Resistor)[0].Text
		both := "; out of balance at 800 V, the whole bus, " + quantity.Format(Energy(4000e-6*1.2, 800), quantity.Joule)
		if strings.Contains(text, both) != (d.Uneven != nil) || d.Uneven != nil && !strings.Contains(text, "It can stand at 400 V") {
			t.Errorf("%s: %s", d.Store.Point, text)
		}
	}
	if p.uneven() == nil {
		t.Error("the bank is not split")
	}
}

// Before the rebuild is entered a static reading is no use, and the text says so.
func TestStaticsComeAfterTheRebuild(t *testing.T) {
	for done, want := range map[string]bool{"": true, "10:13": true, "08:00": false} {
		c, e := ready(t)
		c.Rebuild.Done = time.Time{}
		if done != "" {
			c.Rebuild.Done = at(t, done)
		}
		e.Statics[0] = Static{Test: "bank-ohms", Title: "ohms", Position: "u-high", Part: "Q2", Lifted: true, Because: "reads leaky"}
		text := missingText(Check(c, Work{Need: NeedLowBus}, at(t, "10:12"), e).Missing)
		if strings.Contains(text, "first enter rebuild.done, a reading before it does not count") != want || !strings.Contains(text, "enter CASE bank-ohms RESULT --part Q2 --lifted") {
			t.Errorf("rebuilt %q: %s", done, text)
		}
	}
}

// A failing reading is named with its test, place, reading and time, and with what to do.
func TestAFailingReadingIsNamed(t *testing.T) {
	for _, row := range []struct {
		failing Static
		good    string
		wants   []string
	}{
		{Static{Position: "u-high", At: at(t, "09:30")}, "", []string{"\"gate look\" speaks for a fault at u-high: reads burnt at 2026-12-01 09:30", "gate-look RESULT --position u-high", "rebuild.done"}},
		{Static{Position: "u-high", Part: "Q2", Lifted: true, At: at(t, "09:30")}, "", []string{"at Q2 (u-high)", "RESULT --part Q2 --lifted"}},
		{Static{Part: "R14", At: at(t, "10:30")}, "", []string{"at R14: reads burnt", "in the future", "RESULT --part R14"}},
		{Static{}, "", []string{"speaks for a fault: reads burnt", "carries no time", "gate-look RESULT;"}},
		{Static{At: at(t, "09:30")}, "10:30", []string{"the good reading since is dated 2026-12-01 10:30, in the future"}},
	} {
		c, e := ready(t)
		f := row.failing
		f.Test, f.Title, f.Because = "gate-look", "gate look", "reads burnt"
		if row.good == "" {
			e.Failing = []Static{f}
		} else {
			e.Mended = []Mended{{f, at(t, row.good)}}
		}
		for _, want := range row.wants {
			if text := missingText(Check(c, Work{Need: NeedFull}, at(t, "10:12"), e).Missing); !strings.Contains(text, want) {
				t.Errorf("%+v: %q is not in %s", f, want, text)
			}
		}
	}
}

func TestOutsideStep(t *testing.T) {
	entry := func(step, result, clock string) measure.StepEntry {
		e := measure.StepEntry{Step: step, Result: result}
		if clock != "" {
			e.At = at(t, clock)
		}
		return e
	}
	for _, row := range []struct {
		name  string
		entry measure.StepEntry
		spoil func(c *measure.Case, e *Evidence)
		want  string
	}{
		{"within", entry(measure.StepLoadTested, "done", "10:12"), func(*measure.Case, *Evidence) {}, ""},
		{"within, stated away later", entry(measure.StepLoadTested, "done", "10:12"), func(c *measure.Case, e *Evidence) {
			c.Safety.Isolation = append(c.Safety.Isolation, sound(t, "10:30"))
			c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "10:31")})
			e.Failing = []Static{{Test: "look", Because: "reads burnt", At: at(t, "10:40")}}
		}, ""},
		{"stated only later", entry(measure.StepLoadTested, "done", "09:50"), func(*measure.Case, *Evidence) {}, "nothing is stated that counts"},
		{"it failed", entry(measure.StepProtectionsProved, "failed", "09:50"), func(*measure.Case, *Evidence) {}, "nothing is stated that counts"},
		{"a failing test", entry(measure.StepLoadTested, "done", "10:12"), func(_ *measure.Case, e *Evidence) {
			e.Failing = []Static{{Test: "look", Title: "look", Because: "reads burnt", At: at(t, "09:30")}}
		}, "speaks for a fault"},
		{"with the tester", entry(measure.StepCableTested, "done", "10:12"), func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks = c.Safety.DeadChecks[1:] }, "no dead check at bus"},
		{"not done at all", entry(measure.StepLoadTested, "not-possible", "09:50"), func(*measure.Case, *Evidence) {}, ""},
		{"a question", entry(measure.StepHandedOver, "done", "09:50"), func(c *measure.Case, _ *Evidence) { c.Safety = measure.Safety{} }, ""},
		{"no time", entry(measure.StepLoadTested, "done", ""), func(*measure.Case, *Evidence) {}, "carries no time"},
	} {
		c, e := ready(t)
		c.Steps = append(c.Steps, row.entry)
		row.spoil(c, &e)
		before := slices.Clone(c.Steps)
		m := OutsideStep(c, len(c.Steps)-1, e)
		if text := missingText(m); (len(m) == 0) != (row.want == "") || !strings.Contains(text, row.want) {
			t.Errorf("%s: %+v, want %q", row.name, m, row.want)
		}
		if !slices.Equal(before, c.Steps) {
			t.Errorf("%s: the case was changed", row.name)
		}
	}
	c, e := ready(t)
	if OutsideStep(c, -1, e) != nil || OutsideStep(c, len(c.Steps), e) != nil || OutsideStep(nil, 0, e) != nil {
		t.Error("an entry that is not there")
	}
}

func TestWhatABoardMayLack(t *testing.T) {
	lack := []string{measure.StepFaultLogRead, measure.StepSettingsSaved, measure.StepSettingsRestored, measure.StepMotorTested, measure.StepCableTested, measure.StepBrakeResistorTested}
	for _, id := range measure.StepWords() {
		if may := slices.Contains(lack, id); MayLack(id) != may {
			t.Errorf("%s: %v", id, MayLack(id))
		}
		c, e := ready(t)
		c.Steps = []measure.StepEntry{{Step: id, Result: "not-fitted", At: at(t, "09:00")}}
		if s := statusOf(t, c, at(t, "10:12"), e, id); id != measure.StepFollowedUp && (s.Settled != MayLack(id) || (s.Because == "") != MayLack(id)) {
			t.Errorf("%s: settled %v, because %q", id, s.Settled, s.Because)
		}
	}
	if MayLack("") || MayLack("another") {
		t.Error("a step nobody knows")
	}
	c, e := ready(t)
	c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepLoadTested, Result: "not-fitted", At: at(t, "09:00")})
	if s := statusOf(t, c, at(t, "10:12"), e, measure.StepHandedOver); !names(s.Missing, 3, "on record as not-fitted; no board lacks this: where it cannot be done, enter not-possible with a note") {
		t.Errorf("%+v", s.Missing)
	}
}

// The load test stays on the bench, at the running current.
func TestTheLoadTestStaysOnTheBench(t *testing.T) {
	step, _ := recordStep(measure.StepLoadTested)
	text := step.Title + " " + step.Ask + " " + step.How
	for _, want := range []string{"on the bench", "dummy load", "shaft free", "wheels up", "running current", "local rules"} {
		if !strings.Contains(text, want) {
			t.Errorf("%q is not in %s", want, text)
		}
	}
	if step.Work != (Work{Need: NeedFull}) {
		t.Errorf("work %+v", step.Work)
	}
}
