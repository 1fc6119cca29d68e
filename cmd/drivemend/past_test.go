package main

import (
	"bytes"
	"encoding/json"
	"strings"
	"testing"
	"time"
)

// TestAsItStood asks for a moment in the past with every command that tells what may be done: the first line says that
// it is no leave, and only there.
func TestAsItStood(t *testing.T) {
	now := mustTime(t, gridNow)
	for _, c := range []struct {
		before time.Duration
		says   string
	}{
		{0, ""}, {time.Minute, ""}, {-time.Minute, ""},
		{61 * time.Second, "1 min before"}, {8 * time.Minute, "AS IT STOOD at 2026-12-01 09:52, 8 min before this computer's clock: no leave to do anything now."},
		{200 * time.Minute, "3 h 20 min before"}, {29*24*time.Hour + time.Hour, "29 days before"},
	} {
		at := now.Add(-c.before).Format(time.RFC3339)
		for _, args := range [][]string{{"next"}, {"status"}, {"discharge"}} {
			path := written(t, sound().text())
			r := runs(t, gridNow, append(args, path, "--at", at)...)
			provesPast(t, args[0], r.out, c.says)
			raw := runs(t, gridNow, append(args, path, "--json", "--at", at)...)
			provesPast(t, args[0]+" --json", strings.TrimPrefix(raw.err, "drivemend: "), c.says)
			if raw.out != "" && !json.Valid([]byte(raw.out)) {
				t.Errorf("%s at %s: its JSON is none:\n%s", args[0], at, raw.out)
			}
		}
		if c.before >= 0 {
			path := written(t, strings.Replace(sound().text(), "case: grid\n", "case: grid\nopened: 2026-10-01\n", 1))
			provesPast(t, "safe before", runs(t, gridNow, "safe", "before", path, "low-bus", "--guard", "--at", at).out, c.says)
			provesPast(t, "bench", runs(t, gridNow, "bench", path, "--plain", "--at", at).out, c.says)
		}
	}
	if r := runs(t, gridNow, "next", written(t, sound().text())); strings.Contains(r.out+r.err, "AS IT STOOD") {
		t.Errorf("without --at it says\n%s", r.out)
	}
}

// provesPast tells whether the line stands first, and nowhere where it does not belong.
func provesPast(t *testing.T, command, out, says string) {
	t.Helper()
	flat := strings.Join(strings.Fields(out), " ")
	switch {
	case says == "" && strings.Contains(flat, "AS IT STOOD"):
		t.Errorf("%s: a moment that is now is told as past:\n%s", command, out)
	case says != "" && (!strings.HasPrefix(flat, "AS IT STOOD at ") || !strings.Contains(flat[:min(len(flat), 110)], says)):
		t.Errorf("%s: the first line does not say %q:\n%s", command, says, out)
	}
}

// TestPastStandsBeforeEveryStep: in a session whose clock --at has set back, the line stands again above each step at
// the board, and above no question.
func TestPastStandsBeforeEveryStep(t *testing.T) {
	for _, back := range []bool{true, false} {
		var out bytes.Buffer
		at := "2026-12-01T09:53:00+01:00"
		now := mustTime(t, at)
		args := []string{"bench", written(t, arrived), "--plain"}
		if back {
			now, args = now.Add(20*time.Minute), append(args, "--at", at)
		}
		run(env{args: args, in: strings.NewReader("yes\n" + strings.Repeat("n\n", 8)), out: &out, err: &out,
			getenv: func(string) string { return "" }, now: func() time.Time { return now }})
		text, said := strings.Join(strings.Fields(out.String()), " "), strings.Count(out.String(), "AS IT STOOD")
		steps := strings.Count(text, "Ohm, diode, capacitance and ESR ranges only")
		if steps == 0 {
			t.Fatalf("no meter step is asked:\n%s", out.String())
		}
		if back && said < 2 || !back && said > 0 {
			t.Errorf("set back %v: said %d times:\n%s", back, said, out.String())
		}
		if back && !strings.Contains(text, "> n ! AS IT STOOD at 2026-12-01 09:53, 20 min before") {
			t.Errorf("it does not stand above a step:\n%s", out.String())
		}
	}
}
