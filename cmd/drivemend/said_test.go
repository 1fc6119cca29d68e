package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"drivemend/knowledge"
)

// TestWhatEnterSays enters one thing each and looks for what has to be said of it, in the output and in the error.
func TestWhatEnterSays(t *testing.T) {
	rebuilt := strings.Replace(proved, "  - {test: gate-pull-down, position: low, result: present, at: 2026-12-01T09:48:30+01:00}\n", "", 1)
	undone := strings.Replace(proved, "rebuild: {done: 2026-12-01T09:30:00+01:00}\n", "", 1)
	bare := strings.Replace(undone, "gate: {pull_down: 10 kΩ}, ", "", 1)
	over := proved + "steps: [{step: handed-over, result: done, at: 2026-12-01T09:50:00+01:00}]\n"
	link := strings.Replace(proved, "observations:", "  link: [{fitted: 2026-12-01T09:40:00+01:00}]\nobservations:", 1)
	for _, c := range []struct {
		name, text, now string
		args            []string
		status          int
		says            []string
		not             string
	}{
		{"a reading without its board value", bare, "", []string{"enter", "gate-resistance", "5"}, 0, []string{"compared with board.gate.pull_down, which is not stated", "drivemend enter CASE board.gate.pull_down 10k"}, "expected."},
		{"a reading with it", undone, "", []string{"enter", "gate-resistance", "9k"}, 0, nil, "compared with"},
		{"the rebuild before its readings", undone, "", []string{"enter", "rebuild.done", "2026-12-01T09:47:30+01:00"}, 0,
			[]string{"taken after the rebuild, from now on: 2 readings of the record: gate-resistance low of 09:48, gate-pull-down low of 09:48", "drivemend enter CASE rebuild.done TIME"}, "power-terminals"},
		{"the rebuild after them", undone, "", []string{"enter", "rebuild.done", "2026-12-01T09:52:00+01:00"}, 0, nil, "from now on"},
		{"the same once more", proved, "", []string{"enter", "rebuild.done", "2026-12-01T09:30:00+01:00"}, 0, nil, "from now on"},
		{"a number for named results", proved, "", []string{"enter", "reverse-diode-drop", "0.5 V"}, 1, []string{"it takes no number", "reverse-diode-drop open|normal --note '0.5 V'"}, ""},
		{"the number in its note", proved, "", []string{"enter", "reverse-diode-drop", "normal", "--note", "0.5 V"}, 0, nil, ""},
		{"a word that is none", proved, "", []string{"enter", "reverse-diode-drop", "nomal"}, 1, []string{"did you mean normal?"}, "it takes no number"},
		{"per cent without the sign", proved, "", []string{"enter", "bus-capacitor-esr", "115"}, 1, []string{`"115" can be read in two ways`, "'115 %'", "'11500 %' for 115 times"}, ""},
		{"per cent with it", proved, "", []string{"enter", "bus-capacitor-esr", "115 %"}, 0, []string{"115 %"}, ""},
		{"times", proved, "", []string{"enter", "bus-capacitor-esr", "1.15"}, 0, []string{"115 %"}, ""},
		{"a bound in per cent", proved, "", []string{"enter", "bus-capacitor-esr", "> 300"}, 1, []string{"'> 300 %'", "'> 30000 %'"}, ""},
		{"the last static", rebuilt, "", []string{"enter", "gate-pull-down", "present"}, 0, []string{`static test "Gate bleed and gate leads" passed at low`, "every static test of every position has passed"}, "not counted"},
		{"a static that fails", rebuilt, "", []string{"enter", "gate-pull-down", "open"}, 0, []string{`static test "Gate bleed and gate leads" still open at low: `}, "passed at low"},
		{"one static of several", rebuilt, "", []string{"enter", "gate-resistance", "good"}, 0, []string{"passed at low", "still to be read before power: Gate bleed and gate leads at low"}, "every static"},
		{"no static", proved, "", []string{"enter", "weather", "storm"}, 0, nil, "static test"},
		{"what no board lacks", proved, "", []string{"record", "step", "photographed", "not-fitted"}, 1, []string{"photographed cannot be not-fitted", "not-possible --note"}, ""},
		{"what a board may lack", proved, "", []string{"record", "step", "fault-log-read", "not-fitted"}, 0, []string{"recorded: fault-log-read not-fitted"}, ""},
		{"a step as it was typed", proved, "", []string{"record", "step", "Photos", "done"}, 1, []string{`no step "Photos"`}, ""},
		{"a result as it was typed", proved, "", []string{"record", "step", "photographed", "Dun"}, 1, []string{`does not end "Dun"`}, ""},
		{"followed up too early", over, "2026-12-20T10:00:00+01:00", []string{"record", "step", "followed-up", "done"}, 1,
			[]string{"followed up on 2026-12-20: the board was handed over on 2026-12-01, and counts as followed up from 2026-12-31 on"}, "steps["},
		{"followed up in time", over, "2026-12-31T10:00:00+01:00", []string{"record", "step", "followed-up", "done"}, 0, []string{"recorded: followed-up done"}, ""},
		{"followed up without a hand-over", proved, "", []string{"record", "step", "followed-up", "done"}, 1, []string{"not on record as handed over"}, "steps["},
		{"it failed before its days", over, "2026-12-20T10:00:00+01:00", []string{"record", "step", "followed-up", "failed", "--note", "again"}, 0, []string{"did not hold"}, ""},
		{"a second link", link, "", []string{"safe", "link", "fitted"}, 1, []string{"on record as fitted since 2026-12-01T09:40:00+01:00", "nothing was changed"}, ""},
		{"a link that comes off", link, "", []string{"safe", "link", "Removed"}, 0, []string{"entered at"}, ""},
		{"a link as it was typed", link, "", []string{"safe", "link", "On"}, 2, []string{`not "On"`}, ""},
		{"a flag that takes no word", proved, "", []string{"safe", "isolation", "--locked=no", "--motor", "unplugged", "--other-sources", "none"}, 2, []string{`--locked cannot be "no"`, "leave it out"}, "strconv"},
		{"conditions as they were typed", proved, "", []string{"safe", "before", "Fully"}, 2, []string{`before "Fully"`}, ""},
	} {
		now := c.now
		if now == "" {
			now = "2026-12-01T09:53:00+01:00"
		}
		path := written(t, c.text)
		n := 1
		if c.args[0] != "enter" {
			n = 2
		}
		r := runs(t, now, append(append(append([]string{}, c.args[:n]...), path), c.args[n:]...)...)
		text := strings.Join(strings.Fields(r.out+r.err), " ")
		if r.status != c.status {
			t.Errorf("%s: status %d, want %d:\n%s", c.name, r.status, c.status, text)
		}
		for _, want := range c.says {
			if !strings.Contains(text, want) {
				t.Errorf("%s: %q is not said:\n%s", c.name, want, text)
			}
		}
		if c.not != "" && strings.Contains(text, c.not) {
			t.Errorf("%s: it says %q:\n%s", c.name, c.not, text)
		}
		if raw, err := os.ReadFile(path); err != nil || (string(raw) == c.text) != (c.status != 0) && c.name != "the same once more" {
			t.Errorf("%s: status %d and the file changed %v, %v", c.name, c.status, string(raw) != c.text, err)
		}
	}
}

// TestWorkedOutNameIsNoKey asks keys for a name that only the rule base has.
func TestWorkedOutNameIsNoKey(t *testing.T) {
	r := runs(t, gridNow, "keys", "expected.gate_bleed")
	if r.status != exitInput || !strings.Contains(r.err, "worked out from board.gate.pull_down") || !strings.Contains(r.err, "drivemend enter CASE board.gate.pull_down") {
		t.Errorf("status %d\n%s", r.status, r.err)
	}
}

// TestPartOfAPicture: a part that is no switch of the case is kept, and said.
func TestPartOfAPicture(t *testing.T) {
	for part, said := range map[string]bool{"Q1": false, "Q99": true} {
		path := written(t, proved)
		r := runs(t, gridNow, "record", "photo", path, path, "--part", part)
		if r.status != 0 || strings.Contains(r.out, "is no switch of this case") != said || loaded(t, path).Photographs[0].Part != part {
			t.Errorf("%s: status %d\n%s%s", part, r.status, r.out, r.err)
		}
	}
}

// TestFileOfAnotherName: a file that is not named as its case is noted, beside the result.
func TestFileOfAnotherName(t *testing.T) {
	folder := t.TempDir()
	for name, noted := range map[string]bool{"bench": false, "copy": true} {
		path := filepath.Join(folder, name+".yaml")
		if err := os.WriteFile(path, []byte(proved), 0o644); err != nil {
			t.Fatal(err)
		}
		if r := runs(t, gridNow, "status", path); strings.Contains(r.err, name+".yaml holds the case bench") != noted {
			t.Errorf("status %s says\n%s", name, r.err)
		}
	}
	if r := runs(t, gridNow, "cases", folder); strings.Count(r.err, "holds the case") != 1 || !strings.Contains(r.err, "copy.yaml holds the case bench") {
		t.Errorf("cases says\n%s", r.err)
	}
}

// TestFolderIsGone: nothing is offered to be started in a folder that was deleted.
func TestFolderIsGone(t *testing.T) {
	folder := filepath.Join(t.TempDir(), "gone")
	if err := os.Mkdir(folder, 0o755); err != nil {
		t.Fatal(err)
	}
	t.Chdir(folder)
	if err := os.Remove(folder); err != nil {
		t.Skip("a folder in use cannot be removed here:", err)
	}
	for _, args := range [][]string{{"enter", "pump", "weather", "storm"}, {"status", "pump"}, {"bench", "pump", "--plain"}, {"new", "pump"}} {
		r := runs(t, gridNow, args...)
		if r.status != exitInput || !strings.Contains(r.err, "the folder you are in is gone") || strings.Contains(r.out+r.err, "start it") {
			t.Errorf("%q: status %d\n%s%s", args, r.status, r.out, r.err)
		}
	}
	if r := runs(t, gridNow, "status", filepath.Join(folder, "pump")); !strings.Contains(r.err, "there is no folder") {
		t.Errorf("by its whole path: %s", r.err)
	}
}

// TestStepsOutsideTheirHoldPoints: what was done at the board without its conditions goes to report and status, what was
// only asked does not, and what was stated later mends nothing.
func TestStepsOutsideTheirHoldPoints(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name, stated, entry string
		want                int
	}{
		{"nothing stated", "", "{step: protections-proved, result: done, at: 2026-12-01T09:52:00+01:00}", 1},
		{"stated before", "09:51", "{step: protections-proved, result: done, at: 2026-12-01T09:52:00+01:00}", 0},
		{"stated after", "09:52:30", "{step: protections-proved, result: done, at: 2026-12-01T09:52:00+01:00}", 1},
		{"not done", "", "{step: protections-proved, result: not-possible, note: no supply, at: 2026-12-01T09:52:00+01:00}", 0},
		{"a question", "", "{step: photographed, result: done, at: 2026-12-01T09:52:00+01:00}", 0},
	} {
		text := proved
		if c.stated != "" {
			at := "2026-12-01T" + (c.stated + ":00")[:8] + "+01:00"
			text = strings.Replace(text, "observations:", "  before: [{step: low-bus, at: "+at+", "+poweredStatement+"}]\nobservations:", 1)
		}
		k, err := chainOf(base, loaded(t, written(t, text+"steps:\n  - {step: positions-marked, result: done, at: 2026-12-01T09:10:00+01:00}\n  - "+c.entry+"\n")))
		if err != nil {
			t.Fatal(err)
		}
		at := mustTime(t, "2026-12-01T09:53:00+01:00")
		r, err := k.report(at)
		if err != nil {
			t.Fatal(err)
		}
		if got := r.OutsideSteps; len(got) != c.want || c.want > 0 && (got[0].Entry != 1 || len(got[0].Missing) == 0) {
			t.Errorf("%s: the report has %+v", c.name, got)
		}
		if got := safetyPage(base, k.c, at).OutsideSteps; len(got) != c.want {
			t.Errorf("%s: the status has %+v", c.name, got)
		}
		if len(k.beside(r.Ranking, at).Record) == 0 {
			t.Errorf("%s: no record stands beside the next test", c.name)
		}
	}
}

// TestCommandIsNoNameOfACase: a command line that is typed where a name is asked starts no case of that name.
func TestCommandIsNoNameOfACase(t *testing.T) {
	t.Chdir(t.TempDir())
	var out bytes.Buffer
	run(env{args: []string{"bench", "--plain"}, in: strings.NewReader("drivemend bench\n"), out: &out, err: &out,
		getenv: func(string) string { return "" }, now: func() time.Time { return mustTime(t, gridNow) }})
	if !strings.Contains(out.String(), "named in one word; write drivemend-bench") || strings.Contains(out.String(), "MAKE SAFE") {
		t.Errorf("it says\n%s", out.String())
	}
}
