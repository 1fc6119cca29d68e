package main

import (
	"strings"
	"testing"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// gated is a session that stands before a step, with an asker that must not be asked.
func gated(t *testing.T, text string, now string) (*session, *actor) {
	t.Helper()
	b := newBench(t, text)
	at, err := time.Parse(time.RFC3339, now)
	if err != nil {
		t.Fatal(err)
	}
	b.now = at
	f, err := measure.Load(b.path)
	if err != nil {
		t.Fatal(err)
	}
	a := &actor{most: 1, answer: func(ask.Question) ask.Answer { return ask.Answer{Kind: ask.Quit} }}
	s := &session{app: b.app, asker: a, file: f, base: b.base, start: at, putOff: map[string]bool{}, told: map[string]bool{}, stands: true}
	if err := s.refresh(); err != nil {
		t.Fatal(err)
	}
	return s, a
}

// The step of a meter test asks nothing when its dead check has run out since it was picked.
func TestMeterStepIsHeldByItself(t *testing.T) {
	for now, want := range map[string]int{"2026-12-01T09:53:00+01:00": 1, "2026-12-01T10:03:00+01:00": 0} {
		s, a := gated(t, arrived, now)
		test := s.base.Test("power-terminals-resistance")
		_, err := s.test(diagnose.Candidate{Test: test, Position: "low"}, ask.Question{Title: test.Title, Ask: test.Ask})
		if err != nil {
			t.Fatal(err)
		}
		if len(a.asked) != want {
			t.Errorf("at %s: %d questions asked, want %d", now, len(a.asked), want)
		}
	}
}

// The dead check of a store asks nothing, and shows no plan, while the board is not isolated.
func TestDeadCheckStepIsHeldByItself(t *testing.T) {
	for _, c := range []struct {
		name, text string
		asked      bool
	}{
		{"isolated", arrived, true},
		{"energy put in since", strings.Replace(arrived, "observations:", "  energised: [{what: source, at: 2026-12-01T09:52:30+01:00}]\nobservations:", 1), false},
	} {
		s, a := gated(t, c.text, "2026-12-01T09:53:00+01:00")
		if _, err := s.deadCheck(s.status().Points[0]); err != nil {
			t.Fatal(err)
		}
		if got := len(a.asked) > 0; got != c.asked {
			t.Errorf("%s: asked %v, want %v", c.name, got, c.asked)
		}
	}
}

// The suggestion for a case knows of the power that a test put into its board.
func TestNextKnowsOfPoweredTests(t *testing.T) {
	powered := arrived + "  - {test: scoped-overshoot, result: low, at: 2026-12-01T09:52:30+01:00}\n"
	for text, want := range map[string]bool{arrived: true, powered: false} {
		s, _ := gated(t, text, "2026-12-01T09:53:00+01:00")
		n, err := s.chain.next(s.clock())
		if err != nil {
			t.Fatal(err)
		}
		for _, c := range n.Tests {
			if diagnose.WorkOf(c.Test) == (safety.Work{Need: safety.NeedDead}) && c.Allowed != want {
				t.Fatalf("%s: allowed %v, want %v", c.Test.ID, c.Allowed, want)
			}
		}
	}
}
