package reports

import (
	"strings"
	"testing"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// pageOf is the status of a real case at a moment, with every kind of work asked of the hold points.
func pageOf(r Report, at time.Time) StatusPage {
	e := diagnose.EvidenceOf(r.Base, r.Case)
	p := StatusPage{Case: r.Case, At: at, Safety: safety.StatusOf(r.Case, at, e), Record: safety.Record(r.Case, at, e), Stated: 24, Assumed: 1}
	for _, w := range safety.Works() {
		p.Works = append(p.Works, WorkLine{w.Title, safety.Check(r.Case, w.Work, at, e)})
	}
	for _, c := range r.Next.Tests {
		if c.Must && len(p.Open) < 3 {
			p.Open = append(p.Open, OpenTest{c.Test.Title, c.Test.ID, "must be done"})
		}
	}
	return p
}

func TestStatusOfAnOrdinaryCaseFitsOneScreen(t *testing.T) {
	r := pump(t)
	c := *r.Case
	c.Board = c.Board.WithWord("stages.auxiliary.fitted", "no")
	for _, step := range measure.StepWords()[:4] {
		c.Steps = append(c.Steps, measure.StepEntry{Step: step, Result: "done", At: testTime.Add(-time.Hour)})
	}
	c.Rebuild, c.Outcome, r.Case = nil, nil, &c
	text := statusText(t, pageOf(r, testTime))
	if n := strings.Count(text, "\n"); n > 24 {
		t.Errorf("the status takes %d lines:\n%s", n, text)
	}
}

func statusText(t *testing.T, p StatusPage) string {
	t.Helper()
	var b strings.Builder
	if err := Status(&b, p, Style{}); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// TestStatusSaysWhatIsInTheWay: the board that is not dead comes first, then, once a rebuild is stated, power.
func TestStatusSaysWhatIsInTheWay(t *testing.T) {
	dead := workGroup{first: safety.Missing{Point: 1}}
	tool := workGroup{first: safety.Missing{Point: 4}}
	power := workGroup{first: safety.Missing{Point: 3}, powered: true}
	for _, c := range []struct {
		groups     []workGroup
		rebuilding bool
		want       int
	}{
		{[]workGroup{tool, dead, power}, false, 1},
		{[]workGroup{tool, power}, false, -1},
		{[]workGroup{tool, power}, true, 1},
		{nil, true, -1},
	} {
		if got := inTheWay(c.groups, c.rebuilding); got != c.want {
			t.Errorf("%v, rebuilding %v: %d, want %d", c.groups, c.rebuilding, got, c.want)
		}
	}
}

// TestStatusOfALiveBoard shows every hold point in words, and never calls a board dead that is not.
func TestStatusOfALiveBoard(t *testing.T) {
	r := pump(t)
	late := testTime.Add(11 * time.Minute)
	text := statusText(t, pageOf(r, late))
	for _, want := range []string{"NOT DEAD", " 2 fresh, no link OPEN", "NOT YET ohms", "do this", "drivemend safe dead-check"} {
		if !strings.Contains(text, want) {
			t.Errorf("the status lacks %q:\n%s", want, text)
		}
	}
	c := *r.Case
	c.Safety.Links = append(c.Safety.Links[:len(c.Safety.Links):len(c.Safety.Links)], measure.Link{Fitted: testTime.Add(-time.Minute)})
	r.Case = &c
	text = statusText(t, pageOf(r, testTime))
	for _, want := range []string{"NOT DEAD", "FITTED since 09:12", " 2 fresh, no link OPEN"} {
		if !strings.Contains(text, want) {
			t.Errorf("with a link the status lacks %q:\n%s", want, text)
		}
	}
}

// TestClause keeps what a text says, and leaves its details.
func TestClause(t *testing.T) {
	for text, want := range map[string]string{
		"no dead check at auxiliary: primary capacitor, up to 390 V": "no dead check at auxiliary",
		"at bus: the check of 09:01 is 12 min old: it lives 10 min":  "at bus: the check of 09:01 is 12 min old",
		"the motor is connected (and its shaft free)":                "the motor is connected (and its shaft free)",
		"nothing is stated that counts; it takes a fuse":             "nothing is stated that counts",
		"": "",
	} {
		if got := clause(text); got != want {
			t.Errorf("clause(%q) = %q, want %q", text, got, want)
		}
	}
}

// TestAgesNeverFlatter: an age is rounded up, what is left is rounded down.
func TestAgesNeverFlatter(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{minutesLeft(4*time.Minute + 59*time.Second), "4 min"}, {minutesLeft(59 * time.Second), "less than 1 min"},
		{ago(4*time.Minute + time.Second), "5 min ago"}, {ago(time.Hour), "1 h 0 min ago"}, {ago(59*time.Minute + time.Second), "1 h 0 min ago"},
		{ageWords(safety.PointStatus{Age: 9*time.Minute + time.Second}), "10 min"}, {ageWords(safety.PointStatus{Age: -time.Second}), "future"},
		{clockAt(testTime.Add(-time.Hour), testTime), "08:13"}, {clockAt(testTime.Add(-24*time.Hour), testTime), "2026-11-30 09:13"}, {clockAt(time.Time{}, testTime), "no time stated"},
	} {
		if c.got != c.want {
			t.Errorf("got %q, want %q", c.got, c.want)
		}
	}
}
