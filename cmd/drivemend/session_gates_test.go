package main

import (
	"fmt"
	"math/rand"
	"os"
	"strings"
	"testing"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// doors are the things that open or shut a hold point, each in every state it can be in; a history is one of each.
var doors = []struct {
	name   string
	states map[string]string
}{
	{"link", map[string]string{"none": "", "fitted": "{fitted: 2026-12-01T09:50:00+01:00}", "off": "{fitted: 2026-12-01T09:10:00+01:00, removed: 2026-12-01T09:52:00+01:00}", "future": "{fitted: 2026-12-01T11:00:00+01:00}"}},
	{"dead", map[string]string{"fresh": "2026-12-01T09:46:00+01:00", "old": "2026-12-01T09:35:00+01:00", "future": "2026-12-01T10:46:00+01:00"}},
	{"power", map[string]string{"none": "", "since": "{what: powered-step, at: 2026-12-01T09:51:30+01:00}", "future": "{what: source, at: 2026-12-01T11:00:00+01:00}"}},
	{"rebuild", map[string]string{"done": "2026-12-01T09:30:00+01:00", "not": "", "future": "2026-12-01T11:00:00+01:00", "after the readings": "2026-12-01T09:49:00+01:00"}},
	{"conditions", map[string]string{"now": "2026-12-01T09:52:30+01:00", "none": "", "earlier": "2026-12-01T09:49:30+01:00", "stale": "2026-12-01T08:59:00+01:00", "lacking": "-"}},
}

// pastDoors writes the case of one history.
func pastDoors(state map[string]string) string {
	text := strings.Replace(proved, "2026-12-01T09:46:00+01:00", state["dead"], 1)
	rest := ""
	for _, key := range []string{"link", "power"} {
		if state[key] != "" {
			rest += "  " + map[string]string{"link": "link", "power": "energised"}[key] + ": [" + state[key] + "]\n"
		}
	}
	if at := state["conditions"]; at != "" {
		rest += "  before:\n"
		for _, step := range measure.BeforeWords() {
			rest += conditionsAt(step, at)
		}
	}
	text = strings.Replace(text, "observations:", rest+"observations:", 1)
	if state["rebuild"] == "" {
		return strings.Replace(text, "rebuild: {done: 2026-12-01T09:30:00+01:00}\n", "", 1)
	}
	return strings.Replace(text, "2026-12-01T09:30:00+01:00}\n", state["rebuild"]+"}\n", 1)
}

// fullStatements are the conditions of each step, all of them holding.
var fullStatements = map[string]string{
	measure.BeforeControlPower: "bus_disconnected: yes, " + poweredStatement, measure.BeforeLowBus: poweredStatement, measure.BeforeFull: poweredStatement,
	measure.BeforeDoublePulse: "shield: yes", measure.BeforeInsulation: "electronics_disconnected: yes", measure.BeforeScope: "probe: differential",
	measure.BeforeInjection: "sources_off: yes, gates_held: yes, limit_set: yes, attended: yes",
}

const poweredStatement = "motor: unplugged, bank: in-use, guard: yes, remote_off: yes, glasses: yes, second_person: yes, fuse: 2 A"

// conditionsAt is a full statement before a step, or one in which nothing holds.
func conditionsAt(step, at string) string {
	if at == "-" {
		return "    - {step: " + step + ", at: 2026-12-01T09:52:30+01:00}\n"
	}
	return "    - {step: " + step + ", " + fullStatements[step] + ", at: " + at + "}\n"
}

// histories calls back for every combination of states.
func histories(visit func(name string, state map[string]string)) {
	var walk func(i int, name string, state map[string]string)
	walk = func(i int, name string, state map[string]string) {
		if i == len(doors) {
			visit(name, state)
			return
		}
		for word, text := range doors[i].states {
			state[doors[i].name] = text
			walk(i+1, name+" "+doors[i].name+":"+word, state)
		}
	}
	walk(0, "", map[string]string{})
}

// workSteps are steps of every kind: how each is begun, its work, and what of it must not be seen while it is locked.
func workSteps(base *knowledge.Base) []workStep {
	var out []workStep
	for _, w := range safety.Works() {
		if w.Work.Need == safety.NeedDischarge || w.Work.Need == safety.NeedDeadCheck || w.Work.Tool == safety.ToolDoublePulse {
			continue // no test of a rule base is such work
		}
		t := &knowledge.Test{ID: "made-up", Title: "TITLE " + w.Title, Ask: "ASK?", How: "HOW IT IS DONE", Needs: string(w.Work.Need), Instrument: instrumentOf[w.Work.Tool],
			Results: []knowledge.Result{{ID: "good"}, {ID: "bad"}}, Minutes: 1}
		out = append(out, workStep{w.Title, w.Work, t.Title, t.How, func(s *session) *step { return s.testStep(diagnose.Candidate{Test: t}) }})
	}
	for _, r := range safety.RecordSteps() {
		if r.Work.Need == safety.NeedQuestion && r.Phase != safety.AfterRepair && r.ID != measure.StepPhotographed {
			continue // like the first of them
		}
		out = append(out, workStep{r.ID, r.Work, strings.ToUpper(string(r.Phase)) + ": " + r.Title, r.How, func(s *session) *step { return s.recordStep(r.ID) }})
	}
	return append(out, workStep{"dead check", safety.Work{Need: safety.NeedDeadCheck}, "DEAD CHECK at bus", "across it with insulated probes",
		func(s *session) *step { return s.checkStep("bus") }})
}

type workStep struct {
	name       string
	work       safety.Work
	title, how string
	step       func(s *session) *step
}

var instrumentOf = map[safety.Tool]string{safety.NoTool: "meter", safety.ToolScope: "scope", safety.ToolInjection: "supply", safety.ToolInsulation: "insulation-tester"}

// TestNothingIsShownPastAHoldPoint begins every kind of step in every history. Unless the hold points of its work allow
// it at this moment, and what it rests on was stated in this session, the step itself is not asked, and no word of how
// it is done stands on the screen; where they do, it is asked.
func TestNothingIsShownPastAHoldPoint(t *testing.T) {
	b := newBench(t, proved)
	kept := diagnose.For(b.base)
	steps := workSteps(b.base)
	open, shut := map[string]int{}, map[string]int{}
	histories(func(name string, state map[string]string) {
		var f *measure.File
		for _, w := range steps {
			if f == nil || !f.Saved() || string(f.Bytes()) != pastDoors(state) {
				f = b.anew(pastDoors(state))
			}
			b.out.Reset()
			a := &actor{most: 3, answer: func(ask.Question) ask.Answer { return ask.Answer{Kind: ask.Quit} }}
			s := &session{app: b.app, asker: a, file: f, base: b.base, start: time.Date(2026, 12, 1, 8, 51, 0, 0, time.UTC),
				putOff: map[string]bool{}, told: map[string]bool{}, stands: true, ranked: &diagnose.Ranking{},
				chain: &chain{base: b.base, kept: kept, c: f.Case}}
			want := s.check(w.work).Allowed && recordAllows(s, w.name) && (len(safety.Statements(w.work)) == 0 || state["conditions"] == doors[4].states["now"])
			if _, err := w.step(s).run(); err != nil {
				t.Fatalf("%s, %s: %v", name, w.name, err)
			}
			asked := false
			for _, q := range a.asked {
				asked = asked || q.Title == w.title
			}
			if asked != want {
				t.Errorf("%s, %s: asked %v, want %v (%q)", name, w.name, asked, want, titles(a.asked))
			}
			if seen := shownOf(a, b); !want && strings.Contains(seen, w.how) {
				t.Errorf("%s, %s: how it is done stands on the screen", name, w.name)
			}
			if want {
				open[w.name]++
			} else {
				shut[w.name]++
			}
		}
	})
	for _, w := range steps {
		if open[w.name] == 0 && w.name != "handed-over" && w.name != "followed-up" || shut[w.name] == 0 && w.work.Need != safety.NeedQuestion {
			t.Errorf("%s: allowed in %d histories, locked in %d", w.name, open[w.name], shut[w.name])
		}
	}
}

// anew puts a case on disk.
func (b *bench) anew(text string) *measure.File {
	b.t.Helper()
	if err := os.WriteFile(b.path, []byte(text), 0o644); err != nil {
		b.t.Fatal(err)
	}
	f, err := measure.Load(b.path)
	if err != nil {
		b.t.Fatalf("%v\n%s", err, text)
	}
	return f
}

// recordAllows tells whether a step of the record may be done; true for what is none.
func recordAllows(s *session, id string) bool {
	r := s.recordOf(id)
	return r == nil || len(r.Missing) == 0
}

// shownOf is all that stood on the screen: what was printed, what the questions showed, and what their asides open.
func shownOf(a *actor, b *bench) string {
	text := b.out.String()
	for _, q := range a.asked {
		text += fmt.Sprint(q.Title, q.Lines, q.Ask)
		for _, one := range q.Asides {
			if one.Show != nil {
				text += one.Show()
			}
		}
	}
	return strings.Join(strings.Fields(text), " ")
}

// TestNoLockedStepIsAskedAfterTheRepair walks at random through sessions on a rebuilt board, with power, skips, steps
// back and jumps of the clock: nothing is ever put whose hold points stand against it at that moment, and after a
// powered step no step at a dead board comes before a new isolation.
func TestNoLockedStepIsAskedAfterTheRepair(t *testing.T) {
	seen := map[string]int{}
	for seed := range int64(4) {
		r := rand.New(rand.NewSource(seed))
		b := newBench(t, proved)
		a := &actor{most: 90}
		powered := false
		a.answer = func(q ask.Question) ask.Answer {
			c := b.disk()
			w, known := b.workOf(q)
			if known {
				d := safety.Check(c, w, b.now, diagnose.EvidenceOf(b.base, c))
				if !d.Allowed {
					t.Errorf("seed %d: %q is asked while %v", seed, q.Title, d.Missing)
				}
				if w.Need == safety.NeedDead && powered {
					t.Errorf("seed %d: %q is asked under power", seed, q.Title)
				}
				powered = powered || w.Need.Powered()
				seen[string(w.Need)]++
			}
			if strings.HasPrefix(q.Title, "MAKE SAFE 3") {
				powered = false
			}
			b.now = b.now.Add(time.Second)
			switch n := r.Intn(24); {
			case q.NoSkip:
			case n == 0:
				return ask.Answer{Kind: ask.Back}
			case n == 1:
				return ask.Answer{Kind: ask.Later}
			case n == 2:
				return ask.Answer{Kind: ask.Skipped}
			case n < 6:
				b.now = b.now.Add(time.Duration(r.Intn(5)) * time.Minute)
			}
			if test := b.testOf(q); test != nil && w.Need == safety.NeedDead {
				if len(test.Static) > 0 {
					return ask.Answer{Text: test.Static[0]}
				}
				return ask.Answer{Kind: ask.Later} // one that fails would lock every power
			}
			return repairAnswer(q, r)
		}
		if err := b.app.bench(a, b.path); err != nil {
			t.Fatalf("seed %d: %v", seed, err)
		}
	}
	for _, need := range []safety.Need{safety.NeedDead, safety.NeedLowBus, safety.NeedFull} {
		if seen[string(need)] == 0 {
			t.Errorf("no step of %s was asked: %v", need, seen)
		}
	}
}

// workOf gives the work of a step that a question puts.
func (b *bench) workOf(q ask.Question) (safety.Work, bool) {
	if test := b.testOf(q); test != nil {
		return diagnose.WorkOf(test), true
	}
	if id, ok := afterRepair(q); ok {
		for _, r := range safety.RecordSteps() {
			if r.ID == id {
				return r.Work, true
			}
		}
	}
	return safety.Work{Need: safety.NeedDeadCheck}, strings.HasPrefix(q.Title, "DEAD CHECK")
}

// repairAnswer keeps a session on a rebuilt board going.
func repairAnswer(q ask.Question, r *rand.Rand) ask.Answer {
	switch {
	case strings.HasPrefix(q.Title, "BEFORE TOUCHING"):
		return ask.Answer{Kind: ask.Later}
	case strings.HasPrefix(q.Title, "BEFORE"):
		return sayConditions(q, map[string]string{"motor": "unplugged", "fuse": "2 A", "bank": "in-use", "probe": "differential"})
	case strings.HasPrefix(q.Title, "MAKE SAFE 2"):
		return ask.Answer{Text: "unplugged"}
	case strings.HasPrefix(q.Title, "MAKE SAFE 3"):
		return ask.Answer{Text: "none"}
	case strings.HasPrefix(q.Title, "MAKE SAFE"), q.Title == "REBUILT":
		return ask.Answer{Text: "yes"}
	case q.Title == "POWER":
		return ask.Answer{Text: q.Choices[r.Intn(len(q.Choices))].Word}
	case q.Ask == "What now?":
		return ask.Answer{Text: []string{"power", "power", "steps", "safe", "later"}[r.Intn(5)]}
	}
	return walkAnswer(q, r.Intn(8))
}
