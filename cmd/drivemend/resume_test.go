package main

import (
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
)

// script answers the questions of a session by their titles, and everything else with a quit.
func script(answers map[string][]string) *actor {
	a := &actor{most: 60}
	a.answer = func(q ask.Question) ask.Answer {
		for title, texts := range answers {
			if strings.HasPrefix(q.Title, title) && len(texts) > 0 {
				answers[title] = texts[1:]
				return take(q, texts[0])
			}
		}
		if strings.HasPrefix(q.Title, "BEFORE TOUCHING: photographs") {
			return ask.Answer{Kind: ask.Later}
		}
		return ask.Answer{Kind: ask.Quit}
	}
	return a
}

// take answers as a word of the menu does: not now, more, or the answer itself.
func take(q ask.Question, text string) ask.Answer {
	switch text {
	case "later":
		return ask.Answer{Kind: ask.Later}
	case "more":
		for _, a := range q.Asides {
			if a.Word == "more" {
				if err := a.Do(); err != nil {
					return ask.Answer{Kind: ask.Quit}
				}
				return ask.Answer{Kind: ask.Moved}
			}
		}
	}
	return ask.Answer{Text: text}
}

func titles(asked []ask.Question) []string {
	var out []string
	for _, q := range asked {
		out = append(out, q.Title)
	}
	return out
}

func TestResumeAsksWhetherTheIsolationStands(t *testing.T) {
	b := newBench(t, arrived)
	b.now = b.now.Add(3 * time.Hour)
	a := script(map[string][]string{"MAKE SAFE: does": {"yes"}})
	b.run(a)
	q := a.asked[0]
	if !q.Danger || q.Enter != "" || len(q.Lines) == 0 || !strings.Contains(q.Lines[0], "Isolated since 2026-12-01 09:40 (stated 3 h 13 min ago): lock on, motor unplugged, other sources: none.") {
		t.Errorf("the first question is %+v", q)
	}
	if n := len(b.disk().Safety.Isolation); n != 2 {
		t.Errorf("%d isolations on record, want the confirmed one as well", n)
	}
}

func TestResumeWithoutIsolationStanding(t *testing.T) {
	b := newBench(t, arrived)
	a := script(map[string][]string{"MAKE SAFE: does": {"no"}})
	b.run(a)
	c := b.disk()
	if got := titles(a.asked); !slices.Contains(got, "MAKE SAFE 1 of 3: isolator") || len(c.Safety.Energised) != 1 {
		t.Errorf("asked %q, energised %v", got, c.Safety.Energised)
	}
	if st := (&session{}); st.stands {
		t.Error("a session begins with an isolation that stands")
	}
}

// TestNothingIsAskedAtTheBoardUntilTheIsolationStands puts the question off every time: no step at the board may follow.
func TestNothingIsAskedAtTheBoardUntilTheIsolationStands(t *testing.T) {
	b := newBench(t, arrived)
	a := &actor{most: 40}
	a.answer = func(q ask.Question) ask.Answer {
		switch test := b.testOf(q); {
		case strings.HasPrefix(q.Title, "DEAD CHECK"), test != nil && test.Needs != "question":
			t.Errorf("%q is asked", q.Title)
		case strings.HasPrefix(q.Title, "MAKE SAFE"):
			return ask.Answer{Kind: ask.Later}
		}
		return someAnswer(q, 0)
	}
	b.run(a)
	n := 0
	for _, title := range titles(a.asked) {
		if strings.HasPrefix(title, "MAKE SAFE") {
			n++
		}
	}
	if n != 2 {
		t.Errorf("it is asked %d times, want at the start and before the first meter step", n)
	}
}

const fresh = `drivemend: 1
case: bench
board: {topology: low-side-chopper, supply: rectified-mains, load: {kind: dc-motor}, bus: {nominal: 565 V, capacitance: 1000 µF}, positions: {low: {parts: [Q1, Q2]}}, switch: {kind: igbt}, history: first-failure}
`

func TestNotIsolatedIsOfferedAgain(t *testing.T) {
	b := newBench(t, fresh)
	a := &actor{most: 60}
	first, stated := true, 0
	a.answer = func(q ask.Question) ask.Answer {
		switch {
		case strings.HasPrefix(q.Title, "MAKE SAFE 1"):
			stated++
			return ask.Answer{Text: "yes"}
		case strings.HasPrefix(q.Title, "MAKE SAFE 2"):
			return ask.Answer{Text: "unplugged"}
		case strings.HasPrefix(q.Title, "MAKE SAFE 3") && first:
			first = false
			return ask.Answer{Text: "battery charger"}
		case strings.HasPrefix(q.Title, "MAKE SAFE 3"):
			return ask.Answer{Text: "battery charger off"}
		case strings.HasPrefix(q.Title, "DEAD CHECK"):
			return ask.Answer{Kind: ask.Quit}
		}
		b.now = b.now.Add(time.Second)
		return someAnswer(q, 0)
	}
	b.run(a)
	if stated != 2 || !strings.Contains(b.out.String(), "To state it again: b goes back to it now; more, then isolation") {
		t.Errorf("stated %d times:\n%s", stated, b.out.String())
	}
	if last := a.asked[len(a.asked)-1].Title; !strings.HasPrefix(last, "DEAD CHECK") {
		t.Errorf("it ends at %q", last)
	}
}

func TestStoreThatIsNotFitted(t *testing.T) {
	b := newBench(t, fresh)
	a := script(map[string][]string{"MAKE SAFE 1": {"yes"}, "MAKE SAFE 2": {"unplugged"}, "MAKE SAFE 3": {"none"},
		"DEAD CHECK at bus": {"0.3 0.0", "yes"}, "DEAD CHECK at upper-half": {"not-fitted"}, "DEAD CHECK at auxiliary": {"not-fitted"}})
	b.run(a)
	board := b.disk().Board
	if halves, _ := board.Word("bus.halves"); halves != "no" {
		t.Errorf("bus.halves is %q", halves)
	}
	if fitted, _ := board.Word("stages.auxiliary.fitted"); fitted != "no" {
		t.Errorf("stages.auxiliary.fitted is %q", fitted)
	}
	if slices.Contains(titles(a.asked), "DEAD CHECK at lower-half") {
		t.Error("the other half of a bank that is not split is asked for")
	}
}

func TestLiveReadingIsSaidAtOnce(t *testing.T) {
	for reading, says := range map[string]string{"212": "!! LIVE: 212 V at bus", "-60 V": "!! LIVE:", "12": "! NOT DEAD: 12 V at bus", "5": ""} {
		b := newBench(t, fresh)
		a := script(map[string][]string{"MAKE SAFE 1": {"yes"}, "MAKE SAFE 2": {"unplugged"}, "MAKE SAFE 3": {"none"}, "DEAD CHECK at bus": {reading}})
		b.run(a)
		if out := b.out.String(); says == "" && strings.Contains(out, "NOT DEAD:") || !strings.Contains(out, says) {
			t.Errorf("%s: %q is not said before AC is asked:\n%s", reading, says, out)
		}
	}
}

func TestProofOfTheMeterIsAlwaysAsked(t *testing.T) {
	b := newBench(t, fresh)
	a := script(map[string][]string{"MAKE SAFE 1": {"yes"}, "MAKE SAFE 2": {"unplugged"}, "MAKE SAFE 3": {"none"}, "DEAD CHECK at bus": {"0.2 0.1"}})
	b.run(a)
	q := a.asked[len(a.asked)-1]
	if !q.Danger || q.Free != "" || !strings.Contains(strings.Join(q.Lines, " "), "prove the meter again now, after the reading") {
		t.Errorf("the last question is %+v", q)
	}
	if d := b.disk().Safety.DeadChecks; len(d) != 1 || d[0].MeterProved {
		t.Errorf("on record is %+v", d)
	}
	example := a.asked[len(a.asked)-2].Free
	i := strings.LastIndex(example, "such as ")
	if read, err := checkReadings(example[i+len("such as "):]); err != nil || read[0].Value <= 50 {
		t.Errorf("the example %q would pass", example)
	}
}

func TestFolderThatCannotBeWritten(t *testing.T) {
	b := newBench(t, arrived)
	b.app.tryFolder = func(string) error { return os.ErrPermission }
	a := script(nil)
	err := b.app.bench(a, b.path)
	var f *failure
	if !errors.As(err, &f) || f.status != exitInput || len(f.hints) == 0 || len(a.asked) != 0 {
		t.Errorf("%d questions, error %v", len(a.asked), err)
	}
	if triedFolder(filepath.Join(t.TempDir(), "none")) == nil {
		t.Error("a folder that is not there can be written to")
	}
	folder := t.TempDir()
	if err := triedFolder(folder); err != nil {
		t.Error(err)
	}
	if left, _ := os.ReadDir(folder); len(left) != 0 {
		t.Errorf("%v is left behind", left)
	}
}

// TestUnsavedAtTheEndOfInput proves that an answer which could not be saved is an error also when nobody can be asked.
func TestUnsavedAtTheEndOfInput(t *testing.T) {
	b := newBench(t, arrived)
	a := &actor{most: 1}
	a.answer = func(q ask.Question) ask.Answer {
		if err := os.Remove(b.path); err != nil {
			t.Fatal(err)
		}
		b.now = b.now.Add(time.Minute)
		return someAnswer(q, 0)
	}
	var f *failure
	if err := b.app.bench(a, b.path); !errors.As(err, &f) || f.status != exitInput {
		t.Errorf("the error is %v", err)
	}
}

func TestMore(t *testing.T) {
	b := newBench(t, arrived)
	a := script(map[string][]string{"MAKE SAFE: does": {"more", "more", "more", "more", "more"},
		"More":  {"story", "rebuild", "link", "value", "outcome"},
		"Story": {"It went bang at noon."}, "Rebuild": {"SNUBBER.KIND RCD"}, "Shorting link": {"fitted"}, "Board": {"gate.pull_down 10k"},
		"Outcome": {"causes clamp-missing"}})
	b.run(a)
	c := b.disk()
	kind, _ := c.Rebuild.Board.Word("snubber.kind")
	bleed, _ := c.Board.Quantity("gate.pull_down")
	if c.Story != "It went bang at noon." || kind != "rcd" || len(c.Safety.Links) != 1 || bleed.Value != 10e3 || len(c.Outcome.Causes) != 1 {
		t.Errorf("story %q, rebuild %q, link %v, bleed %v, outcome %v\n%s", c.Story, kind, c.Safety.Links, bleed.Value, c.Outcome, b.out.String())
	}
}

func TestSnubberSaidMissingIsOfferedAsAValue(t *testing.T) {
	for answer, want := range map[string]string{"missing": "none", "fitted": "rc"} {
		b := newBench(t, strings.Replace(arrived, "history:", "gate: {pull_down: 10 kΩ}, history:", 1))
		a := &actor{most: 60}
		done := false
		a.answer = func(q ask.Question) ask.Answer {
			test := b.testOf(q)
			switch {
			case done && q.Title == "Board value":
				return ask.Answer{Text: "yes"}
			case done && q.Title == "Snubber":
				return ask.Answer{Text: "rc"}
			case done:
				return ask.Answer{Kind: ask.Quit}
			case test != nil && test.ID == "snubber-look":
				done = true
				return ask.Answer{Text: answer}
			}
			return someAnswer(q, 0)
		}
		b.run(a)
		if kind, _ := b.disk().Board.Word("snubber.kind"); kind != want {
			t.Errorf("%s gives board.snubber.kind %q, want %q\n%q", answer, kind, want, titles(a.asked))
		}
	}
}

// TestReadingThatCannotBeComparedIsKept answers the gate test in ohms on a board whose bleed is not known.
func TestReadingThatCannotBeComparedIsKept(t *testing.T) {
	b := newBench(t, arrived)
	a := &actor{most: 60}
	kept := false
	a.answer = func(q ask.Question) ask.Answer {
		test := b.testOf(q)
		switch {
		case kept:
			return ask.Answer{Kind: ask.Quit}
		case q.Title == "Gate bleed":
			return ask.Answer{Kind: ask.Skipped}
		case test != nil && test.ID == "gate-resistance":
			kept = true
			if q.Check == nil || q.Check("4k7") != nil {
				t.Errorf("a reading is refused: %+v", q)
			}
			return ask.Answer{Text: "4k7"}
		}
		return someAnswer(q, 0)
	}
	b.run(a)
	o := b.disk().Observations
	if last := o[len(o)-1]; !kept || last.Test != "gate-resistance" || last.Reading == nil {
		t.Fatalf("the last observation is %+v\n%q", last, titles(a.asked))
	}
	for _, want := range []string{"not counted in the ranking", "to make it count", "gate.pull_down"} {
		if !strings.Contains(b.out.String(), want) {
			t.Errorf("%q is not said:\n%s", want, b.out.String())
		}
	}
}

// TestEndIsShort bounds what is printed when nothing is left to ask at this moment.
func TestEndIsShort(t *testing.T) {
	b := newBench(t, fresh)
	a := &actor{most: 60}
	before := 0
	a.answer = func(q ask.Question) ask.Answer {
		if q.Ask == "What now?" {
			if n := strings.Count(b.out.String()[before:], "\n"); n > 20 {
				t.Errorf("the end has %d lines:\n%s", n, b.out.String()[before:])
			}
			if q.Title != "WHERE IT STANDS" || !strings.Contains(b.out.String()[before:], "LOCKED") {
				t.Errorf("locked tests stand, and the end says %q:\n%s", q.Title, b.out.String()[before:])
			}
			return ask.Answer{Text: "stop"}
		}
		before = b.out.Len()
		if strings.HasPrefix(q.Title, "MAKE SAFE") {
			return ask.Answer{Kind: ask.Later}
		}
		return someAnswer(q, 0)
	}
	b.run(a)
}
