package safety

import (
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// tableBoard has every store; the rebuild keeps it as it is.
const tableBoard = wholeBoard + "\n"

const tableRebuild = "rebuild: {done: 2026-12-01T08:00:00+01:00, loop: {inductance: 80 nH}}\n"

// ready is a bench at which everything may be done at 10:12: isolated at 09:40 with the shaft locked, stated at 10:00,
// every store checked at 10:07, motor and cable tested, every position proved.
func ready(t testing.TB) (*measure.Case, Evidence) {
	c := newCase(t)
	c.Safety.Isolation = []measure.Isolation{{Locked: true, Motor: motorShaftLocked, OtherSources: "none", At: at(t, "09:40")}}
	for _, s := range Stores(c.Board) {
		c.Safety.DeadChecks = append(c.Safety.DeadChecks, deadCheck(t, s.Point, "10:07"))
	}
	for _, step := range measure.BeforeWords() {
		c.Safety.Before = append(c.Safety.Before, fullStatement(step, at(t, "10:00")))
	}
	for _, step := range []string{measure.StepMotorTested, measure.StepCableTested, measure.StepBrakeResistorTested} {
		c.Steps = append(c.Steps, measure.StepEntry{Step: step, Result: "done", At: at(t, "09:00")})
	}
	var e Evidence
	for _, p := range c.Rebuild.Board.Positions() {
		e.Statics = append(e.Statics, Static{Test: "bank-ohms", Title: "collector-emitter resistance", Position: p.Name, Passed: true, At: at(t, "09:00")})
	}
	return c, e
}

// parsedTable is read once: a board is never changed.
var parsedTable *measure.Case

func newCase(t testing.TB) *measure.Case {
	if parsedTable == nil {
		parsedTable = parse(t, tableBoard, tableRebuild)
	}
	c, rebuild := *parsedTable, *parsedTable.Rebuild
	c.Rebuild = &rebuild
	return &c
}

func fullStatement(step string, at time.Time) measure.Before {
	return measure.Before{Step: step, At: at, Motor: motorUncoupled, BrakeResistor: "connected", Bank: "in-use", Fuse: quantity.Of(3.15, quantity.Ampere),
		Guard: true, RemoteOff: true, Glasses: true, SecondPerson: true, BusDisconnected: true, Shield: true, ElectronicsDisconnected: true,
		SourcesOff: true, GatesHeld: true, LimitSet: true, Attended: true, Probe: "earth-clip", ClipOn: "live-node", Supply: "isolated", EarthClips: 1}
}

// groups of works, for saying which of them a state of the record takes away.
func dead(w Work) bool { return w.Need == NeedDead }
func touching(w Work) bool {
	return w.Need == NeedDeadCheck || w.Need == NeedDischarge || w.Need == NeedDead
}
func powered(w Work) bool { return w.Need.Powered() }
func with(tools ...Tool) func(Work) bool {
	return func(w Work) bool { return slices.Contains(tools, w.Tool) }
}

// resting are the tools whose instruction rests on the statement of each tool; a double pulse is read with a scope.
var resting = map[Tool][]Tool{ToolDoublePulse: {ToolDoublePulse}, ToolInsulation: {ToolInsulation}, ToolInjection: {ToolInjection},
	ToolScope: {ToolScope, ToolDoublePulse}}

func needing(need Need) func(Work) bool { return func(w Work) bool { return w.Need == need } }
func none(Work) bool                    { return false }
func either(a, b func(Work) bool) func(Work) bool {
	return func(w Work) bool { return a(w) || b(w) }
}

// state is one state of one side of the record, and the works it takes away.
type state struct {
	name  string
	set   func(c *measure.Case, e *Evidence)
	takes func(Work) bool
}

func linkStates(t testing.TB) []state {
	link := func(fitted, removed string) func(*measure.Case, *Evidence) {
		l := measure.Link{Fitted: at(t, fitted)}
		if removed != "" {
			l.Removed = at(t, removed)
		}
		return func(c *measure.Case, _ *Evidence) { c.Safety.Links = append(c.Safety.Links, l) }
	}
	return []state{
		{"no link", func(*measure.Case, *Evidence) {}, none},
		{"link fitted", link("10:08", ""), either(dead, powered)},
		{"link removed before the checks", link("09:42", "09:44"), none},
		{"link removed after the checks", link("09:42", "10:11"), either(dead, powered)},
		{"link with its times swapped", link("09:44", "09:42"), either(dead, powered)},
		{"link removed in the future", link("09:42", "10:30"), either(dead, powered)},
	}
}

func powerStates(t testing.TB) []state {
	power := func(moment time.Time) func(*measure.Case, *Evidence) {
		return func(_ *measure.Case, e *Evidence) { e.Powered = append(e.Powered, moment) }
	}
	return []state{
		{"no power", func(*measure.Case, *Evidence) {}, none},
		{"power before", power(at(t, "09:30")), none},
		{"power after", power(at(t, "10:09")), touching},
		{"power at no time", power(time.Time{}), touching},
		{"power in the future", power(at(t, "10:30")), touching},
		{"a powered step of the record", func(c *measure.Case, _ *Evidence) {
			c.Steps = append(c.Steps, measure.StepEntry{Step: measure.StepLoadTested, Result: "done", At: at(t, "10:09")})
		}, touching},
		{"a stage of the bring-up at no time", func(c *measure.Case, _ *Evidence) { c.BringUp = []measure.Stage{{Stage: "first"}} }, touching},
	}
}

// storeStates are the ages of the check of one store, and the store without one.
func storeStates(t testing.TB, k int) []state {
	aged := func(age time.Duration) func(*measure.Case, *Evidence) {
		return func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks[k].At = at(t, "10:12").Add(-age) }
	}
	return []state{
		{"just checked", aged(0), none},
		{"checked 9:59 ago", aged(10*time.Minute - time.Second), none},
		{"checked 10:00 ago", aged(10 * time.Minute), dead},
		{"checked in the future", aged(-time.Minute), dead},
		{"checked the day before", aged(24 * time.Hour), dead},
		{"checked 8 h ago", aged(8 * time.Hour), dead},
		{"not checked", func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks[k].Point = "elsewhere" }, dead},
		{"above 5 V", func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks[k].DC = volts(5.01) }, dead},
		{"a source", func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks[k].AC = volts(5.01) }, touching},
		{"meter not proved", func(c *measure.Case, _ *Evidence) { c.Safety.DeadChecks[k].MeterProved = false }, dead},
	}
}

// Every work, with every store in turn in every state of its check, under every state of the link and of the power.
func TestEveryWorkAgainstEveryState(t *testing.T) {
	stores := Stores(boardOf(t, tableBoard))
	tried, allowed := 0, 0
	for k, store := range stores {
		for _, check := range storeStates(t, k) {
			for _, link := range linkStates(t) {
				for _, power := range powerStates(t) {
					c, e := ready(t)
					for _, s := range []state{check, link, power} {
						s.set(c, &e)
					}
					for _, w := range Works() {
						want := !check.takes(w.Work) && !link.takes(w.Work) && !power.takes(w.Work)
						if d := Check(c, w.Work, at(t, "10:12"), e); d.Allowed != want {
							t.Errorf("%s; %s: %s; %s; %s: allowed %v, missing %+v", w.Title, store.Point, check.name, link.name, power.name, d.Allowed, d.Missing)
						}
						tried++
						if want {
							allowed++
						}
					}
				}
			}
		}
	}
	t.Logf("%d combinations, %d allowed", tried, allowed)
	if len(stores) != 9 || allowed < tried/10 || allowed > tried*9/10 {
		t.Errorf("%d stores, %d of %d combinations allowed: the table says too little", len(stores), allowed, tried)
	}
}

// before changes the statement of one step.
func changed(step string, change func(b *measure.Before)) func(*measure.Case, *Evidence) {
	return func(c *measure.Case, _ *Evidence) {
		for k := range c.Safety.Before {
			if b := &c.Safety.Before[k]; b.Step == step {
				change(b)
			}
		}
	}
}

// lacking are the conditions of points 3 and 4, each absent in turn.
func lacking(t testing.TB) []state {
	var out []state
	add := func(name string, takes func(Work) bool, set func(*measure.Case, *Evidence)) {
		out = append(out, state{name, set, takes})
	}
	for step, need := range map[string]Need{measure.BeforeControlPower: NeedControlPower, measure.BeforeLowBus: NeedLowBus, measure.BeforeFull: NeedFull} {
		for name, change := range map[string]func(b *measure.Before){
			"motor connected": func(b *measure.Before) { b.Motor = motorConnected }, "motor not stated": func(b *measure.Before) { b.Motor = "" },
			"brake resistor not stated": func(b *measure.Before) { b.BrakeResistor = "" }, "no guard": func(b *measure.Before) { b.Guard = false },
			"no fuse": func(b *measure.Before) { b.Fuse = quantity.Quantity{} }, "fuse too large": func(b *measure.Before) { b.Fuse = quantity.Of(63.1, quantity.Ampere) },
			"no remote off": func(b *measure.Before) { b.RemoteOff = false }, "no glasses": func(b *measure.Before) { b.Glasses = false },
			"alone": func(b *measure.Before) { b.SecondPerson = false }, "bank stored": func(b *measure.Before) { b.Bank = "stored" },
			"bank not stated": func(b *measure.Before) { b.Bank = "" }, "never stated": func(b *measure.Before) { b.Step = "another" },
			"stated before the isolation": func(b *measure.Before) { b.At = at(t, "09:39") }, "stated at the isolation": func(b *measure.Before) { b.At = at(t, "09:40") },
			"stated in the future": func(b *measure.Before) { b.At = at(t, "10:13") }, "stated at no time": func(b *measure.Before) { b.At = time.Time{} },
		} {
			add(step+": "+name, needing(need), changed(step, change))
		}
	}
	add("bus not disconnected", needing(NeedControlPower), changed(measure.BeforeControlPower, func(b *measure.Before) { b.BusDisconnected = false }))
	for tool, step := range map[Tool]string{ToolDoublePulse: measure.BeforeDoublePulse, ToolInsulation: measure.BeforeInsulation, ToolInjection: measure.BeforeInjection, ToolScope: measure.BeforeScope} {
		for name, change := range map[string]func(b *measure.Before){
			"lacking": func(b *measure.Before) {
				b.Shield, b.ElectronicsDisconnected, b.SourcesOff, b.Probe = false, false, false, ""
			},
			"never": func(b *measure.Before) { b.Step = "another" }, "before the isolation": func(b *measure.Before) { b.At = at(t, "09:39") },
			"in the future": func(b *measure.Before) { b.At = at(t, "10:13") },
		} {
			add(step+": "+name, with(resting[tool]...), changed(step, change))
		}
	}
	for name, change := range map[string]func(b *measure.Before){
		"gates not held": func(b *measure.Before) { b.GatesHeld = false }, "no limit": func(b *measure.Before) { b.LimitSet = false }, "not attended": func(b *measure.Before) { b.Attended = false },
	} {
		add(name, with(ToolInjection), changed(measure.BeforeInjection, change))
	}
	for name, change := range map[string]func(b *measure.Before){
		"clip not stated": func(b *measure.Before) { b.ClipOn = "" }, "supply not isolated": func(b *measure.Before) { b.Supply = "not-isolated" }, "supply not stated": func(b *measure.Before) { b.Supply = "" },
		"two clips": func(b *measure.Before) { b.EarthClips = 2 }, "clips not counted": func(b *measure.Before) { b.EarthClips = 0 },
	} {
		add(name, with(ToolScope, ToolDoublePulse), changed(measure.BeforeScope, change))
	}
	return append(out, recordStates(t)...)
}

// recordStates are the conditions of powered steps that no statement gives.
func recordStates(t testing.TB) []state {
	entry := func(step, result, clock string) func(*measure.Case, *Evidence) {
		return func(c *measure.Case, _ *Evidence) {
			c.Steps = append(c.Steps, measure.StepEntry{Step: step, Result: result, At: at(t, clock)})
		}
	}
	static := func(change func(s *Static)) func(*measure.Case, *Evidence) {
		return func(_ *measure.Case, e *Evidence) { change(&e.Statics[3]) }
	}
	failing := func(clock, good string) func(*measure.Case, *Evidence) {
		return func(_ *measure.Case, e *Evidence) {
			s := Static{Test: "gate-look", Title: "look of the gates", Position: "u-high", Because: "reads burnt"}
			if clock != "" {
				s.At = at(t, clock)
			}
			if good == "" {
				e.Failing = append(e.Failing, s)
			} else {
				e.Mended = append(e.Mended, Mended{s, at(t, good)})
			}
		}
	}
	return []state{
		{"no rebuild", func(c *measure.Case, _ *Evidence) { c.Rebuild = nil }, powered},
		{"rebuild not done", func(c *measure.Case, _ *Evidence) { c.Rebuild.Done = time.Time{} }, powered},
		{"rebuild in the future", func(c *measure.Case, _ *Evidence) { c.Rebuild.Done = at(t, "10:13") }, powered},
		{"rebuilt after it was stated", func(c *measure.Case, e *Evidence) {
			c.Rebuild.Done = at(t, "10:01")
			for k := range e.Statics {
				e.Statics[k].At = at(t, "10:02")
			}
		}, powered},
		{"no static test", func(_ *measure.Case, e *Evidence) { e.Statics = nil }, powered},
		{"a position without a static test", static(func(s *Static) { s.Position = "u-high" }), powered},
		{"a static test not passed", static(func(s *Static) { s.Passed, s.Because = false, "reads leaky" }), powered},
		{"a static test at no time", static(func(s *Static) { s.At = time.Time{} }), powered},
		{"a static test in the future", static(func(s *Static) { s.At = at(t, "10:13") }), powered},
		{"a static test before the rebuild", static(func(s *Static) { s.At = at(t, "07:59") }), powered},
		{"a dead test that fails", failing("09:30", ""), powered},
		{"a dead test that fails in the future", failing("10:30", ""), powered},
		{"a dead test that fails at no time", failing("", ""), powered},
		{"a dead test that failed, and passed since", failing("09:30", "09:45"), none},
		{"a dead test that failed, and passes in the future", failing("09:30", "10:13"), powered},
		{"a dead test that failed before the rebuild", failing("07:59", ""), none},
		{"motor not tested", func(c *measure.Case, _ *Evidence) { c.Steps = c.Steps[1:] }, powered},
		{"motor failed since", entry(measure.StepMotorTested, "failed", "09:30"), powered},
		{"motor failed in the future", entry(measure.StepMotorTested, "failed", "11:30"), powered},
		{"motor failed earlier", entry(measure.StepMotorTested, "failed", "08:30"), none},
		{"motor test not possible", entry(measure.StepMotorTested, "not-possible", "09:30"), powered},
		{"cable failed at the same moment", entry(measure.StepCableTested, "failed", "09:00"), powered},
		{"brake resistor not tested", func(c *measure.Case, _ *Evidence) { c.Steps = c.Steps[:2] }, powered},
		{"tests in the future", func(c *measure.Case, _ *Evidence) {
			for k := range c.Steps {
				c.Steps[k].At = at(t, "10:13")
			}
		}, powered},
		{"nothing connected, nothing tested", func(c *measure.Case, _ *Evidence) {
			c.Steps = nil
			for k := range c.Safety.Before {
				c.Safety.Before[k].Motor, c.Safety.Before[k].BrakeResistor = motorUnplugged, "disconnected"
			}
		}, none},
		{"a later statement that lacks something", func(c *measure.Case, _ *Evidence) {
			c.Safety.Before = append([]measure.Before{{Step: measure.BeforeFull, At: at(t, "10:05")}}, c.Safety.Before...)
		}, needing(NeedFull)},
		{"one of the same moment that lacks something", func(c *measure.Case, _ *Evidence) {
			c.Safety.Before = append([]measure.Before{{Step: measure.BeforeFull, At: at(t, "10:00")}}, c.Safety.Before...)
		}, needing(NeedFull)},
		{"one at no time that lacks something", func(c *measure.Case, _ *Evidence) {
			c.Safety.Before = append([]measure.Before{{Step: measure.BeforeFull}}, c.Safety.Before...)
		}, needing(NeedFull)},
		{"an isolation in the future", func(c *measure.Case, _ *Evidence) {
			c.Safety.Isolation = append(c.Safety.Isolation, sound(t, "10:30"))
		}, func(w Work) bool { return w.Need.Powered() || w.Tool != NoTool }},
	}
}

// Every work with each condition of hold points 3 and 4 absent in turn, under every state of link and power.
func TestEveryConditionOfPointsThreeAndFour(t *testing.T) {
	for _, lack := range lacking(t) {
		for _, link := range linkStates(t)[:2] {
			for _, power := range powerStates(t)[1:3] {
				c, e := ready(t)
				for _, s := range []state{lack, link, power} {
					s.set(c, &e)
				}
				for _, w := range Works() {
					want := !lack.takes(w.Work) && !link.takes(w.Work) && !power.takes(w.Work)
					d := Check(c, w.Work, at(t, "10:12"), e)
					if d.Allowed != want {
						t.Errorf("%s; %s; %s; %s: allowed %v, missing %+v", w.Title, lack.name, link.name, power.name, d.Allowed, d.Missing)
					}
					if fault := incomplete(d); fault != "" {
						t.Errorf("%s; %s: %s", w.Title, lack.name, fault)
					}
					if lack.takes(w.Work) && !strings.Contains(missingText(d.Missing), "drivemend ") {
						t.Errorf("%s; %s: no command unlocks it: %+v", w.Title, lack.name, d.Missing)
					}
				}
			}
		}
	}
}
