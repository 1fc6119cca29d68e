package main

import (
	"bytes"
	"errors"
	"math/rand"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// actor answers the questions of a session as a test tells it, and gives up after a number of them.
type actor struct {
	most   int
	answer func(q ask.Question) ask.Answer
	asked  []ask.Question
}

func (a *actor) Ask(q ask.Question) (ask.Answer, error) {
	a.asked = append(a.asked, q)
	if len(a.asked) > a.most {
		return ask.Answer{}, ask.ErrEnd
	}
	return a.answer(q), nil
}

// bench is a session in a folder of its own, at a time that the test moves.
type bench struct {
	t    *testing.T
	app  *app
	path string
	now  time.Time
	out  bytes.Buffer
	base *knowledge.Base
}

const arrived = `drivemend: 1
case: bench
board: {topology: low-side-chopper, supply: battery, bus: {nominal: 48 V, capacitance: 4700 µF}, positions: {low: {parts: [Q1, Q2]}}, switch: {kind: mosfet}, history: first-failure}
safety:
  isolation: [{locked: yes, motor: unplugged, other_sources: none, at: 2026-12-01T09:40:00+01:00}]
  dead_checks: [{point: bus, dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:52:00+01:00}]
observations:
  - {test: failure-moment, result: turn-off}
  - {test: what-changed, result: nothing}
  - {test: dead-parts, result: one-of-bank}
`

func newBench(t *testing.T, text string) *bench {
	t.Helper()
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	now, err := time.Parse(time.RFC3339, "2026-12-01T09:53:00+01:00")
	if err != nil {
		t.Fatal(err)
	}
	b := &bench{t: t, path: filepath.Join(t.TempDir(), "case.yaml"), now: now, base: base}
	b.app = &app{env: env{program: "drivemend", out: &b.out, err: &b.out, getenv: func(string) string { return "" }, now: func() time.Time { return b.now }}, began: now}
	if text != "" {
		if err := os.WriteFile(b.path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return b
}

// run runs a session with an actor.
func (b *bench) run(a *actor) {
	b.t.Helper()
	if err := b.app.bench(a, b.path); err != nil {
		b.t.Fatalf("%v\n%s", err, b.out.String())
	}
}

// disk is the case as it stands on disk.
func (b *bench) disk() *measure.Case {
	b.t.Helper()
	f, err := measure.Load(b.path)
	if err != nil {
		b.t.Fatal(err)
	}
	return f.Case
}

// testOf finds the test a question asks, nil for a question of another kind.
func (b *bench) testOf(q ask.Question) *knowledge.Test {
	for i := range b.base.Tests {
		if b.base.Tests[i].Title == q.Title {
			return &b.base.Tests[i]
		}
	}
	return nil
}

// someAnswer gives an answer that a question allows.
func someAnswer(q ask.Question, n int) ask.Answer {
	switch {
	case strings.HasPrefix(q.Title, "DEAD CHECK"):
		if q.Free == "" {
			return ask.Answer{Text: "yes"}
		}
		return ask.Answer{Text: "0.3 0.0"}
	case q.Ask == "What now?":
		return ask.Answer{Text: "stop"}
	case len(q.Choices) > 0:
		return ask.Answer{Text: q.Choices[n%len(q.Choices)].Word}
	}
	return ask.Answer{Kind: ask.Skipped}
}

func TestExpiredCheckIsAskedAgain(t *testing.T) {
	b := newBench(t, arrived)
	late := 0 // the question at which the check ran out
	a := &actor{most: 12}
	a.answer = func(q ask.Question) ask.Answer {
		if test := b.testOf(q); test != nil && test.Needs == "dead" && late == 0 {
			late = len(a.asked)
			b.now = b.now.Add(11 * time.Minute) // the check runs out under the hands of the technician
		}
		return someAnswer(q, 0)
	}
	b.run(a)
	if !strings.Contains(b.out.String(), "marked as taken outside its hold point") {
		t.Errorf("the late reading is not marked:\n%s", b.out.String())
	}
	k := slices.IndexFunc(a.asked, func(q ask.Question) bool { return strings.HasPrefix(q.Title, "DEAD CHECK at bus") })
	if k < late {
		t.Fatalf("no new dead check is asked:\n%s", b.out.String())
	}
	for _, q := range a.asked[late:k] {
		if test := b.testOf(q); test != nil && test.Needs == "dead" {
			t.Errorf("%s is asked before the new dead check", test.ID)
		}
	}
	if n := len(b.disk().Safety.DeadChecks); n != 2 {
		t.Errorf("%d dead checks on record, want 2", n)
	}
}

// TestAcknowledgedIsOnDisk proves that whatever was answered stands in the file before the next question is asked.
func TestAcknowledgedIsOnDisk(t *testing.T) {
	b := newBench(t, "")
	given, last := 0, ""
	a := &actor{most: 30}
	a.answer = func(q ask.Question) ask.Answer {
		if given > 0 {
			c := b.disk()
			if got := len(c.Observations); got != given-1 {
				t.Fatalf("before %q: %d observations on disk, want %d (last %s)", q.Title, got, given-1, last)
			}
			if got := c.Observations; len(got) > 0 && got[len(got)-1].Test != last {
				t.Fatalf("before %q: the last on disk is %s, want %s", q.Title, got[len(got)-1].Test, last)
			}
		}
		if test := b.testOf(q); test != nil {
			given = max(given, 1) + 1
			last = test.ID
		} else if given == 0 && q.Title == "Supply" {
			given = 1 // from the isolation on the file is there
		}
		return walkAnswer(q, 0)
	}
	b.run(a)
	if given < 8 {
		t.Fatalf("only %d tests were asked:\n%s", given-1, b.out.String())
	}
}

// walkAnswer is someAnswer with what the first five minutes need.
func walkAnswer(q ask.Question, n int) ask.Answer {
	switch {
	case q.Title == "No such case", strings.HasPrefix(q.Title, "MAKE SAFE 1"):
		return ask.Answer{Text: "yes"}
	case q.Title == "Bus voltage":
		return ask.Answer{Text: "310 V"}
	case q.Title == "Bus capacitance":
		return ask.Answer{Text: "2200 µF"}
	case q.Title == "Parallel parts":
		return ask.Answer{Text: "2"}
	}
	return someAnswer(q, n)
}

func TestFileChangedMeanwhile(t *testing.T) {
	b := newBench(t, arrived)
	a := &actor{most: 2}
	a.answer = func(q ask.Question) ask.Answer {
		if len(a.asked) == 1 {
			raw, err := os.ReadFile(b.path)
			if err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(b.path, append(raw, []byte("  - {test: weather, result: storm}  # by hand\n")...), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		return someAnswer(q, 0)
	}
	b.run(a)
	if !strings.Contains(b.out.String(), "changed by another program meanwhile") {
		t.Errorf("nothing is said of the change:\n%s", b.out.String())
	}
	raw, err := os.ReadFile(b.path)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(string(raw), "# by hand") || len(b.disk().Observations) != 4 || len(b.disk().Steps) != 1 {
		t.Errorf("an entry is lost:\n%s", raw)
	}
}

func TestUnsavedIsSaid(t *testing.T) {
	b := newBench(t, arrived)
	a := &actor{most: 5}
	a.answer = func(q ask.Question) ask.Answer {
		if q.Title == "NOT SAVED" {
			return ask.Answer{Kind: ask.Quit}
		}
		if err := os.Remove(b.path); err != nil {
			t.Fatal(err)
		}
		return someAnswer(q, 0)
	}
	err := b.app.bench(a, b.path)
	var f *failure
	if !errors.As(err, &f) || f.status != exitInput || !strings.Contains(f.message, "could not be saved") {
		t.Errorf("the error is %v", err)
	}
}

// TestNoLockedTestIsAsked walks at random through sessions, with skips, steps back and jumps of the clock: no test is
// ever put whose hold point stands against it at that moment, none that is answered, and every answer is on disk.
func TestNoLockedTestIsAsked(t *testing.T) {
	for seed := range int64(3) {
		r := rand.New(rand.NewSource(seed))
		b := newBench(t, "")
		a := &actor{most: 35}
		a.answer = func(q ask.Question) ask.Answer {
			if test := b.testOf(q); test != nil {
				c := b.disk()
				if d := safety.Check(c, diagnose.WorkOf(test), b.now, diagnose.EvidenceOf(b.base, c)); !d.Allowed {
					t.Errorf("seed %d: %s is asked while %v", seed, test.ID, d.Missing)
				}
			}
			switch n := r.Intn(20); {
			case q.NoSkip:
			case n == 0:
				return ask.Answer{Kind: ask.Back}
			case n == 1:
				return ask.Answer{Kind: ask.Later}
			case n == 2:
				return ask.Answer{Kind: ask.Skipped}
			case n < 8:
				b.now = b.now.Add(time.Duration(r.Intn(6)) * time.Minute)
			}
			return walkAnswer(q, r.Intn(8))
		}
		if err := b.app.bench(a, b.path); err != nil {
			t.Fatalf("seed %d: %v", seed, err)
		}
		if len(a.asked) < 10 {
			t.Errorf("seed %d: only %d questions", seed, len(a.asked))
		}
	}
}

func TestCheckReadings(t *testing.T) {
	for _, c := range []struct {
		text string
		want []float64
		says string
	}{
		{"0.4", []float64{0.4}, ""},
		{"0.4 V", []float64{0.4}, ""},
		{"0.4 0", []float64{0.4, 0}, ""},
		{"DC 3.2 V, AC 0.1 V", []float64{3.2, 0.1}, ""},
		{"400 mV 20mV", []float64{0.4, 0.02}, ""},
		{"-0.4v .1", []float64{-0.4, 0.1}, ""},
		{"0.4 0 yes", nil, "asked by itself"},
		{"0.4 0 proved", nil, "asked by itself"},
		{"", nil, "type one or two voltages"},
		{"yes", nil, "asked by itself"},
		{"0.4 0.1 0.2", nil, "type one or two voltages"},
		{"0,4", nil, "with a point"},
		{"0.4 A", nil, `"A" is not understood`},
		{"0.4 0 y", nil, `"y" is not understood`},
		{"4 Ω", nil, "is not understood"},
	} {
		read, err := checkReadings(c.text)
		if c.says != "" {
			if err == nil || !strings.Contains(err.Error(), c.says) {
				t.Errorf("%q: error %v, want %q", c.text, err, c.says)
			}
			continue
		}
		if err != nil || len(read) != len(c.want) {
			t.Errorf("%q gives %v, %v", c.text, read, err)
			continue
		}
		for i := range read {
			if d := read[i].Value - c.want[i]; d > 1e-12 || d < -1e-12 {
				t.Errorf("%q: reading %d is %v, want %v", c.text, i, read[i].Value, c.want[i])
			}
		}
	}
}

func TestPartNames(t *testing.T) {
	one, two := []measure.Position{{Name: "low"}}, []measure.Position{{Name: "high"}, {Name: "low"}}
	for _, c := range []struct {
		positions []measure.Position
		text      string
		want      string
	}{
		{one, "3", "Q1 Q2 Q3"}, {one, "T1, T2", "T1 T2"}, {one, "Q7", "Q7"}, {two, "2", "Q1 Q2|Q3 Q4"},
		{two, "Q1 Q2", ""}, {one, "0", ""}, {one, "33", ""}, {one, "-1", ""},
	} {
		parts, err := partNames(c.positions, c.text)
		var got []string
		for _, p := range parts {
			got = append(got, strings.Join(p, " "))
		}
		if strings.Join(got, "|") != c.want || (err != nil) != (c.want == "") {
			t.Errorf("%q gives %q, %v; want %q", c.text, got, err, c.want)
		}
	}
}
