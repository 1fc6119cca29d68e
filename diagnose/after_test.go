package diagnose

import (
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// asked gives what may be done next, in order: "test position part".
func asked(s *Suggestion) []string {
	var out []string
	for _, c := range s.Allowed() {
		out = append(out, strings.Join(strings.Fields(c.Test.ID+" "+c.Position+" "+c.Part), " "))
	}
	return out
}

func nextAt(t testing.TB, base *knowledge.Base, c *measure.Case, now time.Time) *Suggestion {
	t.Helper()
	s, err := Next(base, c, nil, now)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// quiet answers every question, so that nothing but work at the board is left.
func quiet(base *knowledge.Base) []string {
	var answers []string
	for _, t := range base.Tests {
		if t.Needs == "question" && t.Computed == "" && t.PatternOf == "" {
			answers = append(answers, t.ID+", result: \""+t.Results[0].ID+"\", at: 2026-12-01T09:00:00+01:00")
		}
	}
	return append(answers, "dead-parts, result: one-of-bank, at: 2026-12-01T09:00:00+01:00")
}

// TestStaticsLeadAfterTheRebuild walks through the static tests of a half bridge: each is asked once, position by
// position, saves nothing, and is not asked again once it passed.
func TestStaticsLeadAfterTheRebuild(t *testing.T) {
	base := loadBase(t)
	answers := quiet(base)
	want := []string{"power-terminals-resistance high", "gate-resistance high", "reverse-diode-drop high", "gate-pull-down", "power-terminals-resistance low", "gate-resistance low", "reverse-diode-drop low"}
	for k := 0; ; k++ {
		s := nextAt(t, base, rebuiltCase(t, "topology: half-bridge", "", answers...), afterwards)
		var open []string
		for _, c := range s.Tests {
			if len(c.Test.Static) == 0 {
				continue
			}
			open = append(open, strings.TrimSpace(c.Test.ID+" "+c.Position))
			if c.Value != 0 || c.Bits != 0 || !c.Must || !c.Serves || !c.Static || !c.Allowed || c.Again != "" || c.Minutes != c.Test.Minutes {
				t.Errorf("%+v", c)
			}
		}
		if !slices.Equal(open, want[k:]) {
			t.Fatalf("after %d readings asked are %v, want %v", k, open, want[k:])
		}
		if k == len(want) {
			break
		}
		if got := asked(s); len(got) == 0 || got[0] != want[k] || s.Stop != "" || s.Withheld() {
			t.Fatalf("after %d readings: first of %v, want %s; stop %q", k, got, want[k], s.Stop)
		}
		test, position, _ := strings.Cut(want[k], " ")
		if position != "" {
			position = ", position: " + position
		}
		answers = append(answers, test+position+", result: "+base.Test(test).Static[0]+", at: 2026-12-01T15:12:00+01:00")
	}
}

// TestDeadTestsServeAfterTheRebuild: what cannot vote is not offered as if it saved minutes; a check that must be done
// and never was is.
func TestDeadTestsServeAfterTheRebuild(t *testing.T) {
	base := loadBase(t)
	c := rebuiltCase(t, chopper, "")
	before, after := nextAt(t, base, c, rebuildTime), nextAt(t, base, c, afterwards)
	if before.find("fan-turns", "", "") == nil || before.find(terminals, "Q2", "") == nil {
		t.Error("before the rebuild has come to be, dead tests are asked as ever")
	}
	for _, x := range after.Tests {
		if x.Test.Needs == "dead" && (!x.Must || !x.Serves || x.Value != 0 || x.Lifted) {
			t.Errorf("after the rebuild: %+v", x)
		}
		if x.Test.Needs != "dead" && x.Serves {
			t.Errorf("%s serves only", x.Test.ID)
		}
	}
	if clamp := after.find("snubber-look", "", ""); clamp == nil || !clamp.Must {
		t.Error("a must-do check that was never done is not asked after the rebuild")
	}
	whole := 0
	for _, x := range nextAt(t, base, rebuiltCase(t, "topology: low-side-chopper\nstages: {brake: {fitted: yes}}", ""), afterwards).Tests {
		if x.Test.ID == "freewheel-path-check" && x.Position == "" {
			whole++
		}
	}
	if whole != 1 {
		t.Errorf("a static test of the whole board is asked %d times of two positions, want once of the board", whole)
	}
}

// TestFailedStaticsAreAskedAgain with what to do about them.
func TestFailedStaticsAreAskedAgain(t *testing.T) {
	base := loadBase(t)
	for _, c := range []struct{ answer, again string }{
		{"reading: 0.4 Ω", "reads shorted: find the part and put it right, enter the new rebuild.done, then read every position again"},
		{"reading: 385 kΩ", "may read blocking, 49 % sure only: read it again"},
		{"reading: OL, at: 2026-12-01T15:19:00+01:00", "read outside its hold point: prove the board dead, then read it again"},
	} {
		s := nextAt(t, base, rebuiltCase(t, chopper, "", terminals+", position: low, "+c.answer), afterwards)
		if got := s.find(terminals, "", "low"); got == nil || got.Again != c.again || got.Deferred {
			t.Errorf("%s: %+v, want %q", c.answer, got, c.again)
		}
	}
	s := nextAt(t, base, rebuiltCase(t, chopper, "", terminals+", position: low, answer: later"), afterwards)
	if got := s.find(terminals, "", "low"); got == nil || !got.Deferred || got.Again != "" {
		t.Errorf("put off: %+v", got)
	}
}

// TestPowerStaysLockedByStatics: a powered test names the positions that stand in its way, and is shown with them when
// it is worth most.
func TestPowerStaysLockedByStatics(t *testing.T) {
	base := loadBase(t)
	answers := append(quiet(base), terminals+", position: high, reading: OL, at: 2026-12-01T15:11:00+01:00", terminals+", position: low, reading: 0.3 Ω, at: 2026-12-01T15:12:00+01:00")
	s := nextAt(t, base, rebuiltCase(t, "topology: half-bridge", "", answers...), afterwards)
	powered := 0
	for _, c := range s.Tests {
		if !safety.Need(c.Test.Needs).Powered() {
			continue
		}
		powered++
		blocked, unlock := strings.Join(c.BlockedBy, "\n"), strings.Join(c.UnlockedBy, "\n")
		for _, want := range []string{"reads shorted", "not read since the rebuild of 15:00"} {
			if c.Allowed || !strings.Contains(blocked, want) {
				t.Errorf("%s: allowed %v, blocked by %q, want %q", c.Test.ID, c.Allowed, blocked, want)
			}
		}
		if !strings.Contains(unlock, "gate-resistance") || !strings.Contains(unlock, "reverse-diode-drop") {
			t.Errorf("%s is unlocked by %q", c.Test.ID, unlock)
		}
	}
	if powered == 0 || s.Withheld() {
		t.Errorf("%d powered tests, withheld %v although static tests are left", powered, s.Withheld())
	}
	if s.Tests[0].Value > 0 && (s.Locked == nil || s.Locked.Test != s.Tests[0].Test) {
		t.Errorf("the test worth most is %s, locked: %+v", s.Tests[0].Test.ID, s.Locked)
	}
}

// TestScopeIsLockedByItsProbeAlone: with everything stated for control power, a scope step lacks what is said of its
// probe, and a meter step nothing.
func TestScopeIsLockedByItsProbeAlone(t *testing.T) {
	base := loadBase(t)
	c := withStatics(base, caseOf(t, "topology: half-bridge", ""))
	c.Safety.Before = []measure.Before{{Step: measure.BeforeControlPower, At: afterwards.Add(-time.Minute), Motor: "unplugged", Fuse: quantity.Of(1, quantity.Ampere), Bank: "in-use",
		Guard: true, RemoteOff: true, Glasses: true, SecondPerson: true, BusDisconnected: true}}
	s := nextAt(t, base, c, afterwards)
	meter, scope := s.find("driver-supply", "", ""), s.find("gate-on-voltage", "", "")
	if meter == nil || scope == nil {
		t.Fatal("the tests of control power are not asked")
	}
	if !meter.Allowed {
		t.Errorf("the meter step is withheld: %v", meter.BlockedBy)
	}
	if scope.Allowed || len(scope.BlockedBy) != 1 || len(scope.UnlockedBy) != 1 || !strings.Contains(scope.UnlockedBy[0], "probe") {
		t.Errorf("the scope step: allowed %v, blocked by %v, unlocked by %v", scope.Allowed, scope.BlockedBy, scope.UnlockedBy)
	}
}
