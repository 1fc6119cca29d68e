package main

import (
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/spf13/cobra"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// TestEveryCommandSaysWhatItInstructs proves that the table has a row for each command of the tree, and none beside.
func TestEveryCommandSaysWhatItInstructs(t *testing.T) {
	a := &app{}
	found := map[string]bool{}
	var walk func(c *cobra.Command)
	walk = func(c *cobra.Command) {
		path := pathOf(c)
		found[path] = true
		if _, ok := instructs[path]; !ok {
			t.Errorf("%q has no row: say which work it instructs, and prove its hold points here", path)
		}
		for _, sub := range c.Commands() {
			walk(sub)
		}
	}
	root := a.command()
	root.InitDefaultHelpCmd()
	walk(root)
	for path, works := range instructs {
		if !found[path] {
			t.Errorf("%q has a row but is no command", path)
		}
		if works != nil && proofs[path] == nil {
			t.Errorf("%q instructs, and nothing here proves its hold points", path)
		}
	}
}

// state is one safety record of a board with eight stores, rebuilt and tested, as it is written into a case file.
type state struct {
	name                       string
	statement                  string // the statement that alone differs from the sound state, "" for any other difference
	isolation, link, energised string
	checks                     map[string]string // what differs from a good check, by store; "-" for no check
	done                       string            // when the rebuild was done; "" while it is planned
	statics                    string            // observations after the rebuild
	before                     []string
	now                        string
}

const (
	gridNow     = "2026-12-01T10:00:00+01:00"
	gridBoard   = "{topology: low-side-chopper, supply: battery, bus: {nominal: 48 V, capacitance: 4700 µF, halves: yes, fuse: 8 A, reservoir: 100 µF}, positions: {low: {parts: [Q1]}}, switch: {kind: mosfet}, snubber: {kind: clamp, capacitance: 1 µF}, load: {kind: dc-motor}, stages: {auxiliary: {primary_capacitance: 47 µF}}, history: first-failure}"
	gridStatics = "power-terminals-resistance: blocking, gate-resistance: good, gate-pull-down: present, freewheel-diode-drop: normal, freewheel-path-check: closed"
	goodGear    = "motor: unplugged, fuse: 3 A, bank: in-use, guard: yes, remote_off: yes, glasses: yes, second_person: yes"
)

// gridStores are the stores of the grid's board, as isolated with the shaft locked.
var gridStores = []string{"bus", "upper-half", "lower-half", "fused-bank", "reservoir", "clamp", "phases", "auxiliary"}

// sound is the state in which every kind of work may be done.
func sound() state {
	at := "at: 2026-12-01T09:59:00+01:00, "
	s := state{name: "everything stated", now: gridNow, checks: map[string]string{}, done: "2026-12-01T09:55:30+01:00", statics: gridStatics,
		isolation: "{locked: yes, motor: shaft-locked, other_sources: none, at: 2026-12-01T09:50:00+01:00}"}
	for _, step := range []string{"low-bus", "full"} {
		s.before = append(s.before, "{step: "+step+", "+at+goodGear+"}")
	}
	s.before = append(s.before, "{step: control-power, "+at+goodGear+", bus_disconnected: yes}", "{step: double-pulse, "+at+"shield: yes}",
		"{step: insulation, "+at+"electronics_disconnected: yes}", "{step: scope, "+at+"probe: differential}",
		"{step: injection, "+at+"sources_off: yes, gates_held: yes, limit_set: yes, attended: yes}")
	return s
}

// text is the case file of a state.
func (s state) text() string {
	var b strings.Builder
	fmt.Fprintf(&b, "drivemend: 1\ncase: grid\nboard: %s\nsafety:\n", gridBoard)
	for key, list := range map[string]string{"isolation": s.isolation, "link": s.link, "energised": s.energised, "before": strings.Join(s.before, ", ")} {
		if list != "" {
			fmt.Fprintf(&b, "  %s: [%s]\n", key, list)
		}
	}
	b.WriteString("  dead_checks:\n")
	for _, store := range gridStores {
		check := "dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:55:00+01:00"
		if other, ok := s.checks[store]; ok {
			check = other
		}
		if check != "-" {
			fmt.Fprintf(&b, "    - {point: %s, %s}\n", store, check)
		}
	}
	b.WriteString("observations:\n  - {test: failure-moment, result: turn-off}\n  - {test: what-changed, result: nothing}\n  - {test: dead-parts, result: whole-bank}\n")
	for _, one := range strings.Split(s.statics, ", ") {
		if test, result, ok := strings.Cut(one, ": "); ok {
			fmt.Fprintf(&b, "  - {test: %s, part: Q1, result: %s, at: 2026-12-01T09:56:00+01:00}\n", test, result)
		}
	}
	if s.done != "" {
		fmt.Fprintf(&b, "rebuild: {done: %s}\n", s.done)
	}
	return b.String()
}

// but is a state that differs from the sound one in one thing.
func but(name string, change func(*state)) state {
	s := sound()
	s.name = name
	change(&s)
	return s
}

// grid are the states that the instructions are tried in: each store unproved in turn, every age, the isolation, the
// link, power, the rebuild, and each condition of a statement left out.
func grid() []state {
	nothing := state{name: "nothing stated", now: gridNow, checks: map[string]string{}}
	out := []state{sound(), nothing}
	for _, store := range gridStores {
		nothing.checks[store] = "-"
		out = append(out, but("no check at "+store, func(s *state) { s.checks[store] = "-" }))
	}
	for name, check := range map[string]string{
		"5.1 V read": "dc: 5.1 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:55:00+01:00", "AC read": "dc: 0.2 V, ac: 5.1 V, meter_proved: yes, at: 2026-12-01T09:55:00+01:00",
		"AC not read": "dc: 0.2 V, meter_proved: yes, at: 2026-12-01T09:55:00+01:00", "meter not proved": "dc: 0.2 V, ac: 0.0 V, at: 2026-12-01T09:55:00+01:00",
		"check just alive": "dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:50:01+01:00", "check run out": "dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:50:00+01:00",
		"check in the future": "dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T10:00:01+01:00",
	} {
		stores := gridStores
		if testing.Short() {
			stores = stores[4:5]
		}
		for _, store := range stores {
			out = append(out, but(name+" at "+store, func(s *state) { s.checks[store] = check }))
		}
	}
	for name, isolation := range map[string]string{
		"no isolation": "", "not locked": "{locked: no, motor: unplugged, other_sources: none, at: 2026-12-01T09:50:00+01:00}",
		"motor connected": "{locked: yes, motor: connected, other_sources: none, at: 2026-12-01T09:50:00+01:00}", "motor unplugged": "{locked: yes, motor: unplugged, other_sources: none, at: 2026-12-01T09:50:00+01:00}",
		"a source on": "{locked: yes, motor: unplugged, other_sources: charger, at: 2026-12-01T09:50:00+01:00}", "isolated yesterday": "{locked: yes, motor: unplugged, other_sources: none, at: 2026-11-30T23:59:00+01:00}",
		"isolated in the future": "{locked: yes, motor: unplugged, other_sources: none, at: 2026-12-01T10:00:01+01:00}",
	} {
		out = append(out, but(name, func(s *state) { s.isolation = isolation }))
	}
	out = append(out,
		but("link fitted", func(s *state) { s.link = "{fitted: 2026-12-01T09:56:00+01:00}" }),
		but("link off since the checks", func(s *state) { s.link = "{fitted: 2026-12-01T09:54:00+01:00, removed: 2026-12-01T09:57:00+01:00}" }),
		but("link off before the checks", func(s *state) { s.link = "{fitted: 2026-12-01T09:51:00+01:00, removed: 2026-12-01T09:54:00+01:00}" }),
		but("source on since", func(s *state) { s.energised = "{what: source, at: 2026-12-01T09:57:00+01:00}" }),
		but("shaft turned since", func(s *state) { s.energised = "{what: shaft, at: 2026-12-01T09:57:00+01:00}" }),
		but("power before the isolation", func(s *state) { s.energised = "{what: powered-step, at: 2026-12-01T09:49:00+01:00}" }),
		but("rebuild not done", func(s *state) { s.done = "" }),
		but("rebuild done since", func(s *state) { s.done = "2026-12-01T09:59:30+01:00" }),
		but("eight hours on", func(s *state) { s.now = "2026-12-01T17:59:00+01:00" }),
		but("next day", func(s *state) { s.now = "2026-12-02T00:01:00+01:00" }))
	for _, static := range strings.Split(gridStatics, ", ") {
		out = append(out, but("without "+static, func(s *state) { s.statics = strings.ReplaceAll(s.statics, static, "") }))
	}
	for i, statement := range sound().before {
		out = append(out, but("without "+statement, func(s *state) { s.before = slices.Delete(s.before, i, i+1) }))
	}
	return append(out, conditionsLeftOut()...)
}

// conditionsLeftOut are the states in which one condition of one statement is not stated, or is stated as it may not be.
func conditionsLeftOut() []state {
	var out []state
	for i, statement := range sound().before {
		words := strings.Split(strings.Trim(statement, "{}"), ", ")
		for j := 2; j < len(words); j++ {
			if strings.Contains(words[0], "full") && j > 3 {
				break // its conditions are those of low-bus
			}
			left := "{" + strings.Join(slices.Concat(words[:j], words[j+1:]), ", ") + "}"
			out = append(out, but(words[0]+" without "+words[j], func(s *state) { s.statement, s.before[i] = statement, left }))
		}
	}
	for from, to := range map[string]string{"motor: unplugged": "motor: connected", "motor: unplugged,": "motor: uncoupled,", "fuse: 3 A": "fuse: 20 A",
		"bank: in-use": "bank: stored", "probe: differential": "probe: earth-clip, clip_on: live-node, supply: isolated, earth_clips: 2",
		"at: 2026-12-01T09:59:00": "at: 2026-12-01T10:59:00"} {
		out = append(out, but(from+" as "+to, func(s *state) {
			s.statement = from
			for i := range s.before {
				s.before[i] = strings.ReplaceAll(s.before[i], from, to)
			}
		}))
	}
	return out
}

// judged is a state with what the hold points say of it.
type judged struct {
	state
	t    *testing.T
	base *knowledge.Base
	c    *measure.Case
	at   time.Time
	path string
	seen map[string]map[bool]bool // by work: whether it was found allowed, and withheld, in any state

	asked map[string]int // what was given: questions of tests that sessions put, by need, and reports with a discharge
}

// allowed is what the hold points say of a work.
func (j judged) allowed(w safety.Work) bool {
	yes := safety.Check(j.c, w, j.at, diagnose.EvidenceOf(j.base, j.c)).Allowed
	name := strings.TrimSpace(string(w.Need) + " " + string(w.Tool))
	if j.seen[name] == nil {
		j.seen[name] = map[bool]bool{}
	}
	j.seen[name][yes] = true
	return yes
}

// run runs a command of the program on the case, at the moment of the state.
func (j judged) run(args ...string) ran {
	j.t.Helper()
	return runs(j.t, j.now, args...)
}

// proofs prove for every command that instructs that an instruction appears exactly when its work is allowed.
var proofs = map[string]func(j judged){"next": proveNext, "discharge": proveDischarge, "bench": proveBench, "report": proveReport}

func TestInstructionsStandBehindTheirHoldPoints(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	seen, asked := map[string]map[bool]bool{}, map[string]int{}
	for _, s := range grid() {
		path := written(t, s.text())
		j := judged{s, t, base, loaded(t, path), mustTime(t, s.now), path, seen, asked}
		for command, proof := range proofs {
			// What differs in a statement alone bears on no step of these.
			if s.statement == "" || command == "next" {
				proof(j)
			}
		}
	}
	// The grid is worth what it tells apart: each work that a command was asked for is allowed in one state and withheld
	// in another.
	for name, both := range seen {
		if name != "question" && (!both[true] || !both[false]) {
			t.Errorf("%s is not both allowed and withheld: %v", name, both)
		}
	}
	if len(seen) < 8 {
		t.Errorf("only %d kinds of work were asked for", len(seen))
	}
	if asked["dead"] == 0 {
		t.Errorf("no session came to a meter step: %v", asked)
	}
	if asked["discharge in a report"] == 0 {
		t.Error("no report holds the discharge, so that none can withhold it")
	}
}

// proveNext: a test is marked as allowed exactly when its work is; the one that is shown with its how is allowed; nothing
// allowed and something worth its minutes ends with 3, with what is missing.
func proveNext(j judged) {
	r := j.run("next", j.path, "--json")
	var page struct {
		Tests []struct {
			ID        string   `json:"id"`
			Allowed   bool     `json:"allowed"`
			BlockedBy []string `json:"blocked_by"`
		} `json:"tests"`
	}
	if err := json.Unmarshal([]byte(r.out), &page); err != nil || len(page.Tests) < 20 {
		j.t.Fatalf("%s: %d tests, %v", j.name, len(page.Tests), err)
	}
	for _, one := range page.Tests {
		want := j.allowed(diagnose.WorkOf(j.base.Test(one.ID)))
		if one.Allowed != want || want != (len(one.BlockedBy) == 0) {
			j.t.Errorf("next, %s: %s is allowed %v, want %v; blocked by %v", j.name, one.ID, one.Allowed, want, one.BlockedBy)
		}
	}
	plain := j.run("next", j.path)
	if plain.status != r.status {
		j.t.Errorf("next, %s: status %d in JSON, %d in words", j.name, r.status, plain.status)
	}
	given := j.instructed(plain.out)
	if withheld := plain.status == exitWithheld; withheld && (len(given) > 0 || !strings.Contains(plain.out, "LOCKED")) {
		j.t.Errorf("next, %s: withheld, and shows %v", j.name, given)
	}
}

// instructed lists the tests whose how stands in an output, and proves that each of them is allowed.
func (j judged) instructed(out string) []string {
	flat := strings.Join(strings.Fields(out), " ")
	var given []string
	for i := range j.base.Tests {
		t := &j.base.Tests[i]
		if how := strings.Join(strings.Fields(t.How), " "); len(how) < 20 || !strings.Contains(flat, how) {
			continue
		}
		given = append(given, t.ID)
		if !j.allowed(diagnose.WorkOf(t)) {
			j.t.Errorf("%s: %s is instructed outside its hold point", j.name, t.ID)
		}
	}
	return given
}

// proveDischarge: the steps with their resistor stand there exactly when discharging is allowed.
func proveDischarge(j judged) {
	want := j.allowed(safety.Work{Need: safety.NeedDischarge})
	r := j.run("discharge", j.path)
	steps := strings.Contains(r.out, "STEPS") && strings.Contains(r.out, "put ")
	raw := j.run("discharge", j.path, "--json")
	given := strings.Contains(raw.out, `"resistor_ohm"`)
	status := exitWithheld
	if want {
		status = exitDone
	}
	if steps != want || given != want || r.status != status || raw.status != status {
		j.t.Errorf("discharge, %s: allowed %v; steps %v, JSON %v, status %d and %d\n%s", j.name, want, steps, given, r.status, raw.status, r.out)
	}
	if !want && (!strings.Contains(r.out, "point 0") || raw.err == "") {
		j.t.Errorf("discharge, %s: withheld without a reason:\n%s%s", j.name, r.out, raw.err)
	}
}

// benchAnswers say that the isolation still stands, or begin to state one, which is not kept; then they put every question
// off.
var benchAnswers = "yes\n" + strings.Repeat("n\n", 12)

// proveBench: whatever the session asks, a question of a test stands there only while its work is allowed. It works on a
// file of its own, and what it says of the lock at its beginning belongs to the record that is judged.
func proveBench(j judged) {
	var out strings.Builder
	j.path = written(j.t, j.text())
	status := run(env{args: []string{"bench", j.path, "--plain"}, in: strings.NewReader(benchAnswers), out: &out, err: &out,
		getenv: func(string) string { return "" }, now: func() time.Time { return j.at }})
	if status == exitCommand || !strings.Contains(out.String(), "Local codes") {
		j.t.Fatalf("bench, %s: status %d\n%s", j.name, status, out.String())
	}
	j.c = loaded(j.t, j.path)
	flat := strings.Join(strings.Fields(out.String()), " ")
	for i := range j.base.Tests {
		t := &j.base.Tests[i]
		if !strings.Contains(flat, strings.Join(strings.Fields(t.Ask), " ")) {
			continue
		}
		j.asked[t.Needs]++
		if !j.allowed(diagnose.WorkOf(t)) {
			j.t.Errorf("bench, %s: %s is asked outside its hold point", j.name, t.ID)
		}
	}
	if !j.allowed(safety.Work{Need: safety.NeedDeadCheck}) && strings.Contains(flat, "DEAD CHECK at") {
		j.t.Errorf("bench, %s: a dead check is asked for without isolation", j.name)
	}
}
