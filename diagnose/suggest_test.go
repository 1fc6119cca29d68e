package diagnose

import (
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

var benchTime = time.Date(2026, 12, 1, 9, 10, 0, 0, time.UTC) // 10:10 at the bench

// proved gives a case the safety record of a board that is isolated and was dead at every store three minutes before
// benchTime.
func proved(c *measure.Case) *measure.Case {
	c.Safety.Isolation = []measure.Isolation{{Locked: true, Motor: "unplugged", OtherSources: "none", At: benchTime.Add(-30 * time.Minute)}}
	for _, store := range safety.Stores(c.Board) {
		c.Safety.DeadChecks = append(c.Safety.DeadChecks, measure.DeadCheck{Point: store.Point, DC: quantity.Of(0.4, quantity.Volt),
			AC: quantity.Of(0, quantity.Volt), MeterProved: true, At: benchTime.Add(-3 * time.Minute)})
	}
	return c
}

func suggested(t testing.TB, base *knowledge.Base, c *measure.Case) *Suggestion {
	t.Helper()
	s, err := Next(base, c, nil, benchTime)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// find gives the candidate of a test at a place; nil when it is not asked.
func (s *Suggestion) find(test, part, position string) *Candidate {
	for i := range s.Tests {
		if c := &s.Tests[i]; c.Test.ID == test && c.Part == part && c.Position == position {
			return c
		}
	}
	return nil
}

func TestHoldPointsLock(t *testing.T) {
	base := loadBase(t)
	allowedNeeds := func(c *measure.Case) map[string]bool {
		allowed := map[string]bool{}
		s := suggested(t, base, c)
		for _, c := range s.Tests {
			if c.Allowed == (len(c.BlockedBy) > 0) || len(c.BlockedBy) != len(c.UnlockedBy) {
				t.Errorf("%s: allowed %v, blocked by %v, unlocked by %v", c.Test.ID, c.Allowed, c.BlockedBy, c.UnlockedBy)
			}
			if c.Allowed {
				allowed[c.Test.Needs] = true
			}
		}
		for _, c := range s.Allowed() {
			if !c.Allowed || c.Value <= 0 && !c.Must {
				t.Errorf("%s is offered: %+v", c.Test.ID, c)
			}
		}
		return allowed
	}
	if got := allowedNeeds(caseOf(t, chopper, "")); len(got) != 1 || !got["question"] {
		t.Errorf("without any safety record allowed are %v, want questions", got)
	}
	if got := allowedNeeds(proved(caseOf(t, chopper, ""))); !got["question"] || !got["dead"] || got["full"] || got["low-bus"] {
		t.Errorf("isolated and dead: allowed are %v, want questions and dead tests", got)
	}
}

// TestLockedBestIsShown: a hot board whose questions are all asked; the look at the fan is worth most and needs a dead
// board.
func TestLockedBestIsShown(t *testing.T) {
	base := loadBase(t)
	answers := []string{"failure-moment, result: hot-run", "trips-before, result: over-temperature", "hot-smell-before, result: smelt", "what-changed, result: nothing", "dead-parts, result: one-of-bank"}
	asked := strings.Join(answers, " ")
	for _, test := range base.Tests {
		if test.Needs == "question" && test.Computed == "" && !strings.Contains(asked, test.ID) {
			answers = append(answers, test.ID+", answer: skipped")
		}
	}
	s := suggested(t, base, caseOf(t, chopper, "", answers...))
	if s.Locked == nil || s.Locked.Test.ID != "fan-turns" || s.Locked.Value != s.Tests[0].Value || s.Locked.Allowed || len(s.Locked.UnlockedBy) == 0 || !s.Withheld() || s.Stop != "" {
		t.Errorf("locked is %+v, withheld %v, stop %q", s.Locked, s.Withheld(), s.Stop)
	}
	if open := suggested(t, base, proved(caseOf(t, chopper, "", answers...))); open.Locked != nil || open.Withheld() || open.Allowed()[0].Test.ID != "fan-turns" {
		t.Errorf("the dead board: locked %+v, first %s", open.Locked, open.Tests[0].Test.ID)
	}
}

func TestSkippedAndPutOff(t *testing.T) {
	base := loadBase(t)
	s := suggested(t, base, proved(caseOf(t, chopper, "", "weather, answer: skipped", "bang-or-flash, answer: later", "failure-moment, answer: skipped", "fan-turns, result: turns")))
	for _, id := range []string{"weather", "fan-turns"} {
		if s.find(id, "", "") != nil {
			t.Errorf("%s is asked again", id)
		}
	}
	for _, id := range []string{"bang-or-flash", "failure-moment"} {
		if c := s.find(id, "", ""); c == nil || !c.Deferred {
			t.Errorf("%s is not asked again after the rest: %+v", id, c)
		}
	}
	deferred := false
	for _, c := range s.Tests {
		if deferred && !c.Deferred {
			t.Fatalf("%s comes after what was put off", c.Test.ID)
		}
		deferred = c.Deferred
	}
}

func TestPlacesOfTests(t *testing.T) {
	base := loadBase(t)
	const ohms = "power-terminals-resistance"
	fresh := suggested(t, base, proved(caseOf(t, chopper, "")))
	if c := fresh.find(ohms, "", "low"); c == nil || !c.Must || c.Lifted {
		t.Errorf("the bank in circuit: %+v", c)
	}
	q1, q3 := fresh.find(ohms, "Q1", ""), fresh.find(ohms, "Q3", "")
	if q1 == nil || q1.Must || !q1.Lifted || q1.Value != q3.Value || q1.Bits != q3.Bits {
		t.Errorf("parts nothing tells apart: %+v and %+v", q1, q3)
	}
	shorted := suggested(t, base, proved(caseOf(t, chopper, "", ohms+", position: low, reading: 0.4 Ω")))
	if c := shorted.find(ohms, "Q2", ""); shorted.find(ohms, "", "low") != nil || c == nil || !c.Must {
		t.Errorf("of a shorted bank every part has to be told apart: %+v", c)
	}
	sound := suggested(t, base, proved(caseOf(t, chopper, "", ohms+", position: low, reading: OL")))
	if c := sound.find(ohms, "Q2", ""); c == nil || c.Must {
		t.Errorf("a bank that blocks clears its parts: %+v", c)
	}
	lifted := suggested(t, base, proved(caseOf(t, chopper, "", ohms+", part: Q1, reading: OL, state: lifted", ohms+", part: Q2, reading: OL, state: lifted", ohms+", part: Q3, reading: OL, state: lifted")))
	for _, c := range lifted.Tests {
		if c.Test.ID == ohms {
			t.Errorf("every part was read lifted, still asked: %s%s", c.Part, c.Position)
		}
	}
	looked := suggested(t, base, proved(caseOf(t, bridge, "", "driver-look, position: a-high, result: whole", "driver-look, position: a-low, result: whole",
		"driver-look, position: b-high, result: whole")))
	if looked.find("driver-look", "", "") == nil {
		t.Error("one driver has not been looked at")
	}
	all := suggested(t, base, proved(caseOf(t, bridge, "", "driver-look, position: a-high, result: whole", "driver-look, position: a-low, result: whole",
		"driver-look, position: b-high, result: whole", "driver-look, position: b-low, result: cratered")))
	if all.find("driver-look", "", "") != nil {
		t.Error("all drivers have been looked at")
	}
}

// TestAlikePartsTie: parts that nothing tells apart are worth exactly the same, and stand in the board's order.
func TestAlikePartsTie(t *testing.T) {
	const board = "topology: three-phase\npositions: {u-high: {parts: [A1, A2, A3, A4, A5, A6, A7]}, v-low: {parts: [B1, B2, B3]}}"
	s := suggested(t, loadBase(t), proved(caseOf(t, board, "", "dead-parts, result: one-of-bank", "power-terminals-resistance, part: A3, reading: 0.7 MΩ, state: lifted",
		"power-terminals-resistance, position: u-high, reading: 37 Ω", "power-terminals-resistance, part: A5, reading: 3 kΩ, state: lifted")))
	var order string
	values := map[float64]bool{}
	for _, c := range s.Tests {
		if c.Test.ID == "power-terminals-resistance" && strings.HasPrefix(c.Part, "A") {
			values[c.Value] = true
			order += c.Part + " "
		}
	}
	if order != "A1 A2 A4 A6 A7 " || len(values) != 1 {
		t.Errorf("order %swith %d values", order, len(values))
	}
}

// TestStopAndMustDoChecks answers everything on the board: then there is a reason to stop, unless a must-do check was
// left out or put off.
func TestStopAndMustDoChecks(t *testing.T) {
	base := loadBase(t)
	everything := func(except string) []string {
		var answers []string
		for _, test := range base.Tests {
			switch {
			case test.ID == except || test.Computed != "" || test.UsedIn == "prior" || test.PatternOf != "" || test.ID == "die-look":
			case test.Per == "part":
				for _, part := range []string{"Q1", "Q2", "Q3"} {
					answers = append(answers, test.ID+", part: "+part+", result: "+test.Results[len(test.Results)-1].ID+", state: lifted")
				}
			case test.Nominal == nil && test.Present[test.Results[0].ID].Mid > test.Absent[test.Results[0].ID].Mid:
				answers = append(answers, test.ID+", result: \""+test.Results[1].ID+"\"")
			default:
				answers = append(answers, test.ID+", result: \""+test.Results[0].ID+"\"")
			}
		}
		return append(answers, "dead-parts, result: whole-bank")
	}
	for _, c := range []struct {
		name, left string
		extra      []string
		stop       bool
	}{
		{name: "all but the chip", stop: true},
		{name: "the gate path less", left: "gate-pull-down"},
		{name: "the gate path skipped", left: "gate-pull-down", extra: []string{"gate-pull-down, answer: skipped"}},
		{name: "the parallel parts less", left: "power-terminals-resistance"},
	} {
		s := suggested(t, base, proved(caseOf(t, chopper, "", append(everything(c.left), c.extra...)...)))
		if (s.Stop != "") != c.stop {
			t.Errorf("%s: stop %q; first of %d: %+v", c.name, s.Stop, len(s.Tests), s.Tests[0])
		}
	}
}

func TestPoweredTimes(t *testing.T) {
	base := loadBase(t)
	c := caseOf(t, chopper, "", "fan-turns, result: turns, at: 2026-12-01T10:00:00+01:00", "driver-supply, result: low, at: 2026-12-01T11:00:00+01:00", "no-such-test, result: good, at: 2026-12-01T12:00:00+01:00")
	times := poweredTimes(base, c)
	if len(times) != 2 || times[0].UTC().Hour() != 10 || times[1].UTC().Hour() != 11 {
		t.Errorf("powered at %v, want 11:00, and 12:00 of the unknown test", times)
	}
}
