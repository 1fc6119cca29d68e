package main

import (
	"os"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// proved is a board that was rebuilt and whose positions passed since: for power it waits for the conditions only.
const proved = `drivemend: 1
case: bench
opened: 2026-12-01
board: {topology: low-side-chopper, supply: battery, load: {kind: dc-motor}, bus: {nominal: 48 V, capacitance: 4700 µF}, gate: {pull_down: 10 kΩ}, freewheel: {fitted: no}, positions: {low: {parts: [Q1]}}, switch: {kind: mosfet}, history: first-failure}
safety:
  isolation: [{locked: yes, motor: unplugged, other_sources: none, at: 2026-12-01T09:00:00+01:00}]
  dead_checks: [{point: bus, dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:46:00+01:00}]
observations:
  - {test: failure-moment, result: turn-off}
  - {test: what-changed, result: nothing}
  - {test: power-terminals-resistance, position: low, result: blocking, at: 2026-12-01T09:47:00+01:00}
  - {test: gate-resistance, position: low, result: good, at: 2026-12-01T09:48:00+01:00}
  - {test: gate-pull-down, position: low, result: present, at: 2026-12-01T09:48:30+01:00}
rebuild: {done: 2026-12-01T09:30:00+01:00}
`

// lowBus and scoped are what is answered to the conditions, by the title of the question.
var lowBus = map[string]string{"motor": "unplugged", "fuse": "2 A", "bank": "in-use", "brake resistor": "disconnected"}

// sayConditions answers a question of a statement: what the test says, else as it has to be.
func sayConditions(q ask.Question, said map[string]string) ask.Answer {
	_, name, _ := strings.Cut(q.Title, ", ")
	if text := said[name]; text != "" {
		return ask.Answer{Text: text}
	}
	return ask.Answer{Text: "yes"}
}

// readied is a session on a proved board, begun at the time of newBench, with an actor.
func readied(t *testing.T, text string, most int, answer func(s *session, q ask.Question) ask.Answer) (*session, *actor, *bench) {
	t.Helper()
	b := newBench(t, text)
	f, err := measure.Load(b.path)
	if err != nil {
		t.Fatal(err)
	}
	a := &actor{most: most}
	s := &session{app: b.app, asker: a, file: f, base: b.base, start: b.now, putOff: map[string]bool{}, told: map[string]bool{}, stands: true}
	a.answer = func(q ask.Question) ask.Answer { return answer(s, q) }
	if err := s.refresh(); err != nil {
		t.Fatal(err)
	}
	return s, a, b
}

var (
	lowBusWork  = safety.Work{Need: safety.NeedLowBus}
	controlWork = safety.Work{Need: safety.NeedControlPower} // its tests with a meter need no other statement
)

func TestConditionsAreOneStatement(t *testing.T) {
	s, a, b := readied(t, proved, 30, func(s *session, q ask.Question) ask.Answer {
		if len(s.file.Case.Safety.Before) > 0 {
			t.Errorf("%q is asked, and a statement is kept already", q.Title)
		}
		if !q.Danger || q.Enter != "" {
			t.Errorf("Enter alone may answer %q", q.Title)
		}
		return sayConditions(q, lowBus)
	})
	kind, err := s.beforeStep("low-bus", lowBusWork).run()
	if err != nil || kind != ask.Given {
		t.Fatalf("%v, %v\n%s", kind, err, b.out.String())
	}
	before := b.disk().Safety.Before
	if len(before) != 1 || before[0].Motor != "unplugged" || before[0].Fuse.Value != 2 || !before[0].SecondPerson || before[0].Shield || before[0].BusDisconnected {
		t.Errorf("on record is %+v", before)
	}
	i := slices.IndexFunc(a.asked, func(q ask.Question) bool { return strings.HasSuffix(q.Title, ", fuse") })
	if i < 0 || !strings.Contains(strings.Join(a.asked[i].Lines, " "), "At most 10 A") {
		t.Errorf("the fuse's limit is not named: %q", titles(a.asked))
	}
	if !s.check(lowBusWork).Allowed {
		t.Error("the step is still locked")
	}
}

// TestHalfStatementIsNotKept ends a statement at each of its questions in every way.
func TestHalfStatementIsNotKept(t *testing.T) {
	for _, end := range []ask.Kind{ask.Quit, ask.Later, ask.Skipped, ask.Moved, -1} {
		for at := 1; at <= 7; at++ {
			n := 0
			s, a, b := readied(t, proved, 30, func(_ *session, q ask.Question) ask.Answer {
				if n++; n == at {
					return ask.Answer{Kind: end}
				}
				return sayConditions(q, lowBus)
			})
			if end < 0 {
				a.most = at - 1
			}
			_, err := s.beforeStep("low-bus", lowBusWork).run()
			if (err != nil) != (end < 0) {
				t.Fatalf("end %d at %d: %v", end, at, err)
			}
			if kept := len(b.disk().Safety.Before); kept != 0 || s.check(lowBusWork).Allowed {
				t.Errorf("end %d at question %d: %d statements are kept", end, at, kept)
			}
			if says := "count only in full; these are not kept"; strings.Contains(unbroken(b), says) != (at > 1) {
				t.Errorf("end %d at question %d: it says\n%s", end, at, b.out.String())
			}
		}
	}
}

// unbroken is the screen without its line breaks.
func unbroken(b *bench) string { return strings.Join(strings.Fields(b.out.String()), " ") }

func TestBackWithinTheConditions(t *testing.T) {
	n := 0
	s, _, b := readied(t, proved, 30, func(_ *session, q ask.Question) ask.Answer {
		if n++; n == 2 {
			return ask.Answer{Kind: ask.Back}
		}
		if n == 1 {
			return ask.Answer{Text: "connected"}
		}
		return sayConditions(q, lowBus)
	})
	if _, err := s.beforeStep("low-bus", lowBusWork).run(); err != nil {
		t.Fatal(err)
	}
	if before := b.disk().Safety.Before; len(before) != 1 || before[0].Motor != "unplugged" {
		t.Errorf("on record is %+v", before)
	}
}

// TestWhatDoesNotHoldStaysLocked says each condition as it must not be: it is kept, said at once, and nothing opens.
func TestWhatDoesNotHoldStaysLocked(t *testing.T) {
	scope := safety.Work{Need: safety.NeedLowBus, Tool: safety.ToolScope}
	for _, c := range []struct {
		word string
		work safety.Work
		said map[string]string
		says string
		open bool
	}{
		{"low-bus", lowBusWork, map[string]string{"motor": "connected"}, "motor", false},
		{"low-bus", lowBusWork, map[string]string{"motor": "uncoupled"}, "the motor is connected (uncoupled)", false},
		{"low-bus", lowBusWork, map[string]string{"fuse": "16 A"}, "10 A", false},
		{"low-bus", lowBusWork, map[string]string{"fuse": "none"}, "fuse", false},
		{"low-bus", lowBusWork, map[string]string{"guard": "no"}, "guard", false},
		{"low-bus", lowBusWork, map[string]string{"second person": "no"}, "second person", false},
		{"low-bus", lowBusWork, map[string]string{"bank": "stored"}, "bank", false},
		{"low-bus", lowBusWork, map[string]string{"bank": "re-formed"}, "", true},
		{"scope", scope, map[string]string{"probe": "earth-clip", "clip on": "live-node", "supply": "not-isolated", "earth clips": "1"}, "earth", false},
		{"scope", scope, map[string]string{"probe": "earth-clip", "clip on": "live-node", "supply": "isolated", "earth clips": "2"}, "earth", false},
		{"scope", scope, map[string]string{"probe": "earth-clip", "clip on": "live-node", "supply": "isolated", "earth clips": "1"}, "", true},
		{"scope", scope, map[string]string{"probe": "earth-clip", "clip on": "earthed-node"}, "", true},
		{"scope", scope, map[string]string{"probe": "differential"}, "", true},
	} {
		s, a, b := readied(t, proved, 30, func(_ *session, q ask.Question) ask.Answer {
			if text := sayConditions(q, c.said).Text; text != "yes" {
				return ask.Answer{Text: text}
			}
			return sayConditions(q, lowBus)
		})
		if c.word == "scope" {
			if err := s.file.StateBefore(measure.Before{Step: "low-bus", At: b.now.Add(-time.Minute), Motor: "unplugged", Bank: "in-use", Guard: true, RemoteOff: true,
				Glasses: true, SecondPerson: true, Fuse: amperes(t, "2 A")}); err != nil {
				t.Fatal(err)
			}
		}
		kind, err := s.beforeStep(c.word, c.work).run()
		if err != nil || (kind == ask.Given) != c.open || s.check(c.work).Allowed != c.open {
			t.Errorf("%v: %v, %v, allowed %v\n%s", c.said, kind, err, s.check(c.work).Allowed, b.out.String())
		}
		if !strings.Contains(unbroken(b), c.says) || strings.Contains(unbroken(b), "stays locked") == c.open {
			t.Errorf("%v: it says\n%s", c.said, b.out.String())
		}
		if n := len(b.disk().Safety.Before); n == 0 {
			t.Errorf("%v: nothing is kept after %q", c.said, titles(a.asked))
		}
	}
}

func amperes(t *testing.T, text string) quantity.Quantity {
	t.Helper()
	q, err := quantity.Parse(text, quantity.Ampere)
	if err != nil {
		t.Fatal(err)
	}
	return q
}

// TestConditionsAreNotAskedBeforeTheBoardIsReady: what no statement settles is said first, and nothing is asked.
func TestConditionsAreNotAskedBeforeTheBoardIsReady(t *testing.T) {
	for name, text := range map[string]string{
		"no rebuild":    strings.Replace(proved, "rebuild: {done: 2026-12-01T09:30:00+01:00}\n", "", 1),
		"not read":      strings.Replace(proved, "  - {test: gate-resistance, position: low, result: good, at: 2026-12-01T09:48:00+01:00}\n", "", 1),
		"read too soon": strings.Replace(proved, "09:48", "09:29", 1),
		"a link":        strings.Replace(proved, "observations:", "  link: [{fitted: 2026-12-01T09:50:00+01:00}]\nobservations:", 1),
	} {
		s, a, b := readied(t, text, 30, func(_ *session, q ask.Question) ask.Answer { return sayConditions(q, lowBus) })
		kind, err := s.beforeStep("low-bus", lowBusWork).run()
		if err != nil || kind != ask.Later || len(a.asked) > 0 || !strings.Contains(b.out.String(), "WITHHELD") {
			t.Errorf("%s: %v, %v, asked %q\n%s", name, kind, err, titles(a.asked), b.out.String())
		}
	}
}

// TestStatementOfAnEarlierSessionIsAskedAgain: what was stated before this session began speaks only when somebody has
// looked again.
func TestStatementOfAnEarlierSessionIsAskedAgain(t *testing.T) {
	for answer, want := range map[string]int{"yes": 2, "no": 2, "": 1} {
		s, a, b := readied(t, strings.Replace(proved, "observations:", "  before: [{step: control-power, bus_disconnected: yes, motor: unplugged, bank: in-use, guard: yes, remote_off: yes, glasses: yes, second_person: yes, fuse: 2 A, at: 2026-12-01T09:51:00+01:00}]\nobservations:", 1), 30,
			func(_ *session, q ask.Question) ask.Answer {
				if strings.HasSuffix(q.Title, "do they still stand?") {
					if answer == "" {
						return ask.Answer{Kind: ask.Later}
					}
					return ask.Answer{Text: answer}
				}
				return sayConditions(q, lowBus)
			})
		if d := s.check(controlWork); !d.Allowed {
			t.Fatalf("the case is locked: %v", d.Missing)
		}
		test := s.base.Test("driver-supply")
		if _, err := s.testStep(diagnose.Candidate{Test: test}).run(); err != nil {
			t.Fatal(err)
		}
		if slices.Contains(titles(a.asked), test.Title) {
			t.Errorf("%q: the test is asked on an old statement: %q", answer, titles(a.asked))
		}
		if n := len(b.disk().Safety.Before); n != want {
			t.Errorf("%q: %d statements, want %d: %q", answer, n, want, titles(a.asked))
		}
	}
}

// TestPowerEndsTheDeadChecks: before the instruction of a powered test stands on the screen it is kept that power may be
// on, and whatever is answered, isolation comes before the next step at a dead board.
func TestPowerEndsTheDeadChecks(t *testing.T) {
	for _, answer := range []ask.Answer{{Text: "steady"}, {Kind: ask.Later}, {Kind: ask.Skipped}, {Kind: ask.Back}, {Kind: ask.Quit}} {
		var b *bench
		s, a, b2 := readied(t, proved, 40, func(s *session, q ask.Question) ask.Answer {
			if strings.HasPrefix(q.Title, "BEFORE") {
				return sayConditions(q, lowBus)
			}
			if c := b.disk(); len(c.Safety.Energised) != 1 || c.Safety.Energised[0].What != "powered-step" {
				t.Errorf("%q stands on the screen, and on record is %+v", q.Title, c.Safety.Energised)
			}
			return answer
		})
		b = b2
		if _, err := s.beforeStep("control-power", controlWork).run(); err != nil {
			t.Fatal(err)
		}
		b.now = b.now.Add(time.Minute)
		if _, err := s.testStep(diagnose.Candidate{Test: s.base.Test("driver-supply")}).run(); err != nil {
			t.Fatal(err)
		}
		if last := a.asked[len(a.asked)-1].Title; last != "Supply of each driver" {
			t.Fatalf("the last question is %q\n%s", last, b.out.String())
		}
		dead := diagnose.Candidate{Test: s.base.Test("gate-pull-down")}
		n := len(a.asked)
		if _, err := s.testStep(dead).run(); err != nil || len(a.asked) != n {
			t.Errorf("after %v a meter test is asked: %q, %v", answer, titles(a.asked[n:]), err)
		}
		if id := s.unlocking(); id != "isolation" {
			t.Errorf("after %v comes %q, want the isolation", answer, id)
		}
		if !s.check(controlWork).Allowed {
			t.Errorf("after %v the next powered step is locked", answer)
		}
		s.farewell()
		if !strings.Contains(unbroken(b), "The board counts as powered: switch off") {
			t.Errorf("the end says\n%s", b.out.String())
		}
	}
}

// TestPoweredTestIsHeldWhenItsConditionsEnd moves clock and record between the statement and the step.
func TestPoweredTestIsHeldWhenItsConditionsEnd(t *testing.T) {
	for name, change := range map[string]func(s *session, b *bench) error{
		"nothing": func(*session, *bench) error { return nil },
		"a day":   func(_ *session, b *bench) error { b.now = b.now.Add(9 * time.Hour); return nil },
		"a link":  func(s *session, b *bench) error { return s.file.FitLink(b.now) },
		"isolation": func(s *session, b *bench) error {
			return s.file.Isolate(measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "none", At: b.now})
		},
		"a no": func(s *session, b *bench) error {
			return s.file.StateBefore(measure.Before{Step: "control-power", At: b.now})
		},
	} {
		s, a, b := readied(t, proved, 40, func(_ *session, q ask.Question) ask.Answer {
			if strings.HasPrefix(q.Title, "BEFORE") {
				return sayConditions(q, lowBus)
			}
			return ask.Answer{Kind: ask.Later}
		})
		if _, err := s.beforeStep("control-power", controlWork).run(); err != nil {
			t.Fatal(err)
		}
		b.now = b.now.Add(time.Minute)
		if err := change(s, b); err != nil {
			t.Fatal(err)
		}
		st := s.testStep(diagnose.Candidate{Test: s.base.Test("driver-supply")})
		n := len(a.asked)
		if _, err := st.run(); err != nil || (len(a.asked) == n) == (name == "nothing") {
			t.Errorf("%s: asked %q, %v", name, titles(a.asked[n:]), err)
		}
	}
}

func TestCameraAsksTheSurfaceFirst(t *testing.T) {
	before := `  before: [{step: full, motor: unplugged, bank: in-use, guard: yes, remote_off: yes, glasses: yes, second_person: yes, fuse: 2 A, at: 2026-12-01T09:53:00+01:00}]
observations:`
	for surface, bound := range map[string]bool{"bare-metal": true, "": true, "tape": false} {
		s, a, b := readied(t, strings.Replace(proved, "observations:", before, 1), 5, func(_ *session, q ask.Question) ask.Answer {
			switch {
			case q.Ask != "What does the camera look at?":
				return ask.Answer{Text: "1.2"}
			case surface == "":
				return ask.Answer{Kind: ask.Skipped}
			}
			return ask.Answer{Text: surface}
		})
		if _, err := s.testStep(diagnose.Candidate{Test: s.base.Test("case-to-sink-drop")}).run(); err != nil {
			t.Fatal(err)
		}
		o := b.disk().Observations
		if last := o[len(o)-1]; len(a.asked) != 2 || last.Test != "case-to-sink-drop" || last.Surface != surface {
			t.Errorf("%q: asked %q, kept %+v", surface, titles(a.asked), last)
		}
		if got := strings.Contains(strings.Join(a.asked[1].Lines, " "), "lower bound"); got != bound {
			t.Errorf("%q: lower bound said %v, want %v", surface, got, bound)
		}
	}
}

// TestInsulationTesterLeavesItsCharge: a test with it that was shown and not answered ends the dead checks too.
func TestInsulationTesterLeavesItsCharge(t *testing.T) {
	for _, answer := range []ask.Answer{{Text: "sound"}, {Kind: ask.Later}, {Kind: ask.Back}} {
		s, a, b := readied(t, proved, 5, func(_ *session, q ask.Question) ask.Answer {
			if strings.HasPrefix(q.Title, "BEFORE INSULATION") {
				return ask.Answer{Text: "yes"}
			}
			return answer
		})
		test := s.base.Test("sink-insulation")
		w := diagnose.WorkOf(test)
		if _, err := s.beforeStep("insulation", w).run(); err != nil || !s.check(w).Allowed {
			t.Fatalf("%v\n%s", err, b.out.String())
		}
		if _, err := s.testStep(diagnose.Candidate{Test: test, Position: "low"}).run(); err != nil || len(a.asked) != 2 {
			t.Fatalf("asked %q, %v\n%s", titles(a.asked), err, b.out.String())
		}
		if s.status().Isolation.Isolated || !s.underPower() {
			t.Errorf("after %v the board counts as isolated", answer)
		}
	}
}

// TestUnwrittenPowerGivesNoInstruction: where it cannot be kept that power goes on, the step is not shown.
func TestUnwrittenPowerGivesNoInstruction(t *testing.T) {
	s, a, b := readied(t, proved, 40, func(_ *session, q ask.Question) ask.Answer {
		if strings.HasPrefix(q.Title, "BEFORE") {
			return sayConditions(q, lowBus)
		}
		return ask.Answer{Kind: ask.Quit}
	})
	if _, err := s.beforeStep("control-power", controlWork).run(); err != nil {
		t.Fatal(err)
	}
	if err := os.Remove(b.path); err != nil {
		t.Fatal(err)
	}
	_, err := s.testStep(diagnose.Candidate{Test: s.base.Test("driver-supply")}).run()
	if err == nil || slices.Contains(titles(a.asked), "Supply of each driver") {
		t.Errorf("%v, asked %q", err, titles(a.asked))
	}
}
