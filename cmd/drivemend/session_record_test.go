package main

import (
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// walked runs a session that takes everything later but what the test answers, and gives the titles in order.
func walked(t *testing.T, text string, most int, answer func(q ask.Question) *ask.Answer) (*actor, *bench) {
	t.Helper()
	b := newBench(t, text)
	a := &actor{most: most}
	a.answer = func(q ask.Question) ask.Answer {
		b.now = b.now.Add(time.Second)
		if given := answer(q); given != nil {
			return *given
		}
		if q.Ask == "What now?" {
			return ask.Answer{Text: "stop"}
		}
		return ask.Answer{Kind: ask.Later}
	}
	b.run(a)
	return a, b
}

// place gives where a title stands first, -1 for nowhere.
func placeIn(list []string, prefix string) int {
	return slices.IndexFunc(list, func(s string) bool { return strings.HasPrefix(s, prefix) })
}

var chapter = []string{"BEFORE TOUCHING: photographs as found", "BEFORE TOUCHING: fault memory read", "BEFORE TOUCHING: settings saved", "BEFORE TOUCHING: parts and plugs marked"}

// TestChapterBeforeTouching: the picture comes once, right after the isolation and before the first dead check; the other
// steps come once, after the first five minutes and before a meter step; also where the isolation is put off.
func TestChapterBeforeTouching(t *testing.T) {
	for _, isolated := range []bool{true, false} {
		a, _ := walked(t, fresh, 80, func(q ask.Question) *ask.Answer {
			switch {
			case !isolated:
			case strings.HasPrefix(q.Title, "MAKE SAFE 1"):
				return &ask.Answer{Text: "yes"}
			case strings.HasPrefix(q.Title, "MAKE SAFE 2"):
				return &ask.Answer{Text: "unplugged"}
			case strings.HasPrefix(q.Title, "MAKE SAFE 3"):
				return &ask.Answer{Text: "none"}
			case strings.HasPrefix(q.Title, "DEAD CHECK"):
				given := someAnswer(q, 0)
				return &given
			}
			return nil
		})
		asked := titles(a.asked)
		picture, first := placeIn(asked, chapter[0]), placeIn(asked, chapter[1])
		if picture < 1 || first < 0 || !slices.Equal(asked[first:first+3], chapter[1:]) {
			t.Fatalf("isolated %v: asked %q", isolated, asked)
		}
		if !strings.HasPrefix(asked[picture-1], "MAKE SAFE") || placeIn(asked[:picture], "DEAD CHECK") >= 0 {
			t.Errorf("isolated %v: the picture does not come between isolation and dead check: %q", isolated, asked)
		}
		for _, title := range chapter {
			if n := strings.Count(strings.Join(asked, "\n"), title); n != 1 {
				t.Errorf("isolated %v: %q is asked %d times", isolated, title, n)
			}
		}
		for _, before := range []string{"MAKE SAFE", "The exact moment", "Which parts died"} {
			if at := placeIn(asked, before); before != "Which parts died" && (at < 0 || at > first) {
				t.Errorf("isolated %v: %q does not come before the chapter: %q", isolated, before, asked)
			}
		}
		if check := placeIn(asked, "DEAD CHECK"); isolated && (check < picture || check > first) {
			t.Errorf("the first dead check does not come between picture and chapter: %q", asked)
		}
		if at := placeIn(asked, "Power terminals"); isolated && at < first {
			t.Errorf("a meter step comes before the chapter, or none does: %q", asked)
		}
		for _, q := range append([]ask.Question{a.asked[picture]}, a.asked[first:first+3]...) {
			if q.Danger || q.Enter != "later" || len(q.Lines) == 0 {
				t.Errorf("%q is not skipped by one key, or says nothing: %+v", q.Title, q)
			}
		}
	}
}

// TestChapterIsKept answers it, with what it leaves beside it.
func TestChapterIsKept(t *testing.T) {
	b := newBench(t, arrived)
	picture := filepath.Join(filepath.Dir(b.path), "low bank.jpg")
	if err := os.WriteFile(picture, []byte("picture"), 0o644); err != nil {
		t.Fatal(err)
	}
	a := script(map[string][]string{"MAKE SAFE: does": {"yes"}, chapter[0]: {"done"}, chapter[1]: {"done"}, chapter[2]: {"done"}, chapter[3]: {"not-possible"},
		"photographs": {picture + ", not there yet.jpg"}, "fault memory": {"F07, F12"}, "settings": {"P012 = 8 kHz"}, "parts and plugs": {"labels burnt off"}})
	b.run(a)
	c := b.disk()
	if len(c.Steps) != 4 || c.Steps[3].Result != "not-possible" || c.Steps[3].Note != "labels burnt off" || c.Steps[0].At.IsZero() {
		t.Errorf("steps: %+v", c.Steps)
	}
	if len(c.Photographs) != 2 || c.Photographs[0].Path != "low bank.jpg" || c.Photographs[0].Bytes != 7 || c.Photographs[1].SHA256 != "" {
		t.Errorf("pictures: %+v", c.Photographs)
	}
	if len(c.FaultLog) != 2 || c.FaultLog[1].Code != "F12" || len(c.Settings) != 1 || c.Settings[0].Value != "8 kHz" {
		t.Errorf("fault memory %+v, settings %+v", c.FaultLog, c.Settings)
	}
}

// TestStepIsKeptWhenItsReasonIsNot: the end of the input after the word itself loses nothing.
func TestStepIsKeptWhenItsReasonIsNot(t *testing.T) {
	for _, word := range []string{"done", "not-possible"} {
		b := newBench(t, arrived)
		a := script(map[string][]string{"MAKE SAFE: does": {"yes"}, chapter[0]: {word}})
		a.most = 2
		b.run(a)
		if c := b.disk(); len(a.asked) != 3 || len(c.Steps) != 1 || c.Steps[0].Result != word {
			t.Errorf("%s: asked %q, on record %+v", word, titles(a.asked), c.Steps)
		}
	}
}

func TestRebuiltIsStated(t *testing.T) {
	said := false
	a, b := walked(t, arrived, 80, func(q ask.Question) *ask.Answer {
		switch {
		case strings.HasPrefix(q.Title, "MAKE SAFE: does"), q.Title == "REBUILT":
			return &ask.Answer{Text: "yes"}
		case q.Ask == "What now?" && !said:
			said = true
			return &ask.Answer{Text: "rebuilt"}
		case strings.HasPrefix(q.Title, "WHILE REPAIRING"):
			return &ask.Answer{Text: "done"}
		}
		return nil
	})
	c, asked := b.disk(), titles(a.asked)
	if c.Rebuild == nil || c.Rebuild.Done.IsZero() {
		t.Fatalf("no rebuild is on record; asked %q", asked)
	}
	at := placeIn(asked, "REBUILT")
	if q := a.asked[at]; !q.Danger || q.Enter != "" || asked[at+1] != "WHILE REPAIRING: dead parts bagged" {
		t.Errorf("asked %q", asked[at:])
	}
	if i := placeIn(asked[at:], "Power terminals"); i < 0 {
		t.Errorf("no position is read anew: %q", asked[at:])
	}
	if len(c.Steps) != 1 || c.Steps[0].Step != "dead-parts-bagged" {
		t.Errorf("steps: %+v", c.Steps)
	}
}

// TestRecordAfterTheRepair goes through the steps in order; each is put only when its hold points allow it.
func TestRecordAfterTheRepair(t *testing.T) {
	b := newBench(t, proved)
	a := &actor{most: 150}
	power, ends := []string{"low-bus", "full"}, 0
	a.answer = func(q ask.Question) ask.Answer {
		b.now = b.now.Add(time.Second)
		c := b.disk()
		if id, ok := afterRepair(q); ok {
			for _, r := range safety.Record(c, b.now, (&chain{base: b.base, c: c}).evidence()) {
				if r.Step.ID == id && len(r.Missing) > 0 {
					t.Errorf("%q is asked while %v", q.Title, r.Missing)
				}
			}
			return ask.Answer{Text: "done"}
		}
		switch {
		case strings.HasPrefix(q.Title, "BEFORE"):
			return sayConditions(q, lowBus)
		case strings.HasPrefix(q.Title, "MAKE SAFE 2"):
			return ask.Answer{Text: "unplugged"}
		case strings.HasPrefix(q.Title, "MAKE SAFE 3"):
			return ask.Answer{Text: "none"}
		case strings.HasPrefix(q.Title, "MAKE SAFE"):
			return ask.Answer{Text: "yes"}
		case strings.HasPrefix(q.Title, "DEAD CHECK"):
			return someAnswer(q, 0)
		case q.Title == "POWER":
			power = power[1:]
			return ask.Answer{Text: []string{"low-bus", "full"}[1-len(power)]}
		case q.Ask == "What now?":
			if ends++; len(power) > 0 && ends < 6 {
				return ask.Answer{Text: "power"}
			}
			return ask.Answer{Text: "stop"}
		}
		return ask.Answer{Kind: ask.Skipped}
	}
	b.run(a)
	var done []string
	for _, s := range b.disk().Steps {
		done = append(done, s.Step)
	}
	for _, step := range []string{"protections-proved", "settings-restored", "motor-tested", "cable-tested", "load-tested", "handed-over"} {
		if !slices.Contains(done, step) {
			t.Errorf("%s is not done: %q\n%q", step, done, titles(a.asked))
		}
	}
	if i, k := slices.Index(done, "protections-proved"), slices.Index(done, "settings-restored"); i > k {
		t.Errorf("the settings come back before the protections are proved: %q", done)
	}
	if done[len(done)-1] != "handed-over" {
		t.Errorf("the hand-over is not the last: %q", done)
	}
}

// afterRepair gives the step of the record that a question asks after the repair.
func afterRepair(q ask.Question) (string, bool) {
	title, ok := strings.CutPrefix(q.Title, "AFTER THE REPAIR: ")
	for _, r := range safety.RecordSteps() {
		if ok && r.Title == title {
			return r.ID, true
		}
	}
	return "", false
}

// TestHowIsWithheldWhenItsTimeIsOver opens the instruction of a step after its dead check ran out.
func TestHowIsWithheldWhenItsTimeIsOver(t *testing.T) {
	s, _, b := readied(t, proved, 5, nil)
	w := safety.Work{Need: safety.NeedDead}
	how := s.heldText(w, "Gate", "Ohm range, red on the gate pin.")
	if got := how.Show(); !strings.Contains(got, "red on the gate") {
		t.Errorf("it shows %q", got)
	}
	b.now = b.now.Add(time.Hour)
	if got := how.Show(); strings.Contains(got, "red on the gate") || !strings.Contains(got, "WITHHELD") {
		t.Errorf("after an hour it shows %q", got)
	}
}

// TestStepsAreTakenUp goes from the closing menu to a step of the record and its lock.
func TestStepsAreTakenUp(t *testing.T) {
	n := 0
	a, b := walked(t, arrived, 120, func(q ask.Question) *ask.Answer {
		switch {
		case strings.HasPrefix(q.Title, "MAKE SAFE: does"):
			return &ask.Answer{Text: "yes"}
		case q.Ask == "What now?" && n == 0:
			n++
			return &ask.Answer{Text: "steps"}
		case q.Title == "STEPS OF THE RECORD":
			return &ask.Answer{Text: measure.StepPositionsMarked}
		case strings.HasPrefix(q.Title, "BEFORE TOUCHING: parts") && n > 0:
			return &ask.Answer{Text: "done"}
		}
		return nil
	})
	if c := b.disk(); len(c.Steps) != 1 || c.Steps[0].Step != measure.StepPositionsMarked {
		t.Errorf("steps %+v; asked %q", b.disk().Steps, titles(a.asked))
	}
}

// TestStatedPowerBringsItsSteps: whatever was put off before, the steps that wait for the power which is stated are asked
// under it, and the end does not say that nothing is left while one of them stands open.
func TestStatedPowerBringsItsSteps(t *testing.T) {
	for word, step := range map[string]string{"low-bus": measure.StepProtectionsProved, "full": measure.StepLoadTested} {
		asked, ends := 0, 0
		a, _ := walked(t, proved, 200, func(q ask.Question) *ask.Answer {
			text := ""
			id, _ := afterRepair(q)
			switch {
			case strings.HasPrefix(q.Title, "BEFORE "+strings.ToUpper(word)):
				given := sayConditions(q, lowBus)
				return &given
			case id == step:
				asked++
			case q.Title == "POWER":
				text = word
			case q.Ask == "What now?":
				if q.Title != "WHERE IT STANDS" {
					t.Errorf("%s: steps stand open, and the end says %q", word, q.Title)
				}
				if ends++; ends <= 3 {
					text = "power"
				}
			case strings.HasPrefix(q.Title, "MAKE SAFE: does"):
				text = "yes"
			}
			if text == "" {
				return nil
			}
			return &ask.Answer{Text: text}
		})
		if asked < 2 {
			t.Errorf("%s: the step is asked %d times under power stated three times: %q", word, asked, titles(a.asked))
		}
	}
}

// TestOpenStepsAreLeft: with every test put off or answered, an open step of the record is still something to do.
func TestOpenStepsAreLeft(t *testing.T) {
	s, _, _ := readied(t, proved, 1, nil)
	s.left = 0
	s.sayRecord()
	if open := len(s.openRecords("")); open == 0 || s.left == 0 || s.closing().Title == "NOTHING LEFT TO ASK NOW" {
		t.Errorf("%d steps are open, %d left", open, s.left)
	}
}
