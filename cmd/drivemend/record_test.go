package main

import (
	"crypto/sha256"
	"encoding/hex"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"drivemend/knowledge"
	"drivemend/measure"
)

func TestFromCase(t *testing.T) {
	root := t.TempDir()
	at := func(name string) string { return filepath.Join(root, filepath.FromSlash(name)) }
	for _, c := range []struct{ casePath, file, want string }{
		{at("case.yaml"), at("pictures/a.jpg"), "pictures/a.jpg"},
		{at("cases/case.yaml"), at("pictures/a.jpg"), "../pictures/a.jpg"},
		{at("case.yaml"), at("./b/../a.jpg"), "a.jpg"},
	} {
		if got := fromCase(c.casePath, c.file); got != c.want {
			t.Errorf("%s as seen from %s is %q, want %q", c.file, c.casePath, got, c.want)
		}
	}
	t.Chdir(root)
	if got := fromCase("case.yaml", filepath.Join("pictures", "a.jpg")); got != "pictures/a.jpg" {
		t.Errorf("a path typed from here gives %q", got)
	}
}

// TestRecordedFilesKeepTheirSum proves that length and sum are those of the bytes, also of none and of many.
func TestRecordedFilesKeepTheirSum(t *testing.T) {
	for _, n := range []int{0, 1, 1 << 20} {
		bytes := []byte(strings.Repeat("x", n))
		path := written(t, bareCase)
		file := filepath.Join(filepath.Dir(path), "a.jpg")
		if err := os.WriteFile(file, bytes, 0o644); err != nil {
			t.Fatal(err)
		}
		if r := runs(t, "2026-12-01T10:00:00+01:00", "record", "photo", path, file, "--at", "2026-12-01T09:00:00+01:00"); r.status != exitDone {
			t.Fatalf("%d bytes: %s", n, r.err)
		}
		sum := sha256.Sum256(bytes)
		p := loaded(t, path).Photographs[0]
		if p.SHA256 != hex.EncodeToString(sum[:]) || p.Bytes != int64(n) || p.Path != "a.jpg" || p.At.IsZero() {
			t.Errorf("%d bytes are kept as %+v", n, p)
		}
	}
}

// TestStepsAreJudgedAsTheRecordStood proves that what a step lacked is judged from what was on record at its moment: what
// is stated later does not mend it, and the step does not speak for itself.
func TestStepsAreJudgedAsTheRecordStood(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	const held = `safety:
  isolation: [{locked: yes, motor: unplugged, other_sources: none, at: 2026-12-01T09:40:00+01:00}]
  dead_checks: [{point: bus, dc: 0.2 V, ac: 0.0 V, meter_proved: yes, at: 2026-12-01T09:52:00+01:00}]
  before: [{step: insulation, at: 2026-12-01T09:53:00+01:00, electronics_disconnected: yes}]
`
	const board = "drivemend: 1\ncase: one\nboard: {topology: low-side-chopper, supply: battery, bus: {nominal: 48 V, capacitance: 4700 µF, fuse: none}, stages: {auxiliary: {fitted: no}}}\n"
	for _, c := range []struct {
		name, text, at string
		within         bool
	}{
		{"nothing stated", board, "2026-12-01T09:55:00+01:00", false},
		{"all stated", board + held, "2026-12-01T09:55:00+01:00", true},
		{"stated later", board + held, "2026-12-01T09:52:30+01:00", false},
		{"power and a link later", board + held + "  link: [{fitted: 2026-12-01T11:00:00+01:00}]\n  energised: [{what: source, at: 2026-12-01T10:30:00+01:00}]\n", "2026-12-01T09:55:00+01:00", true},
		{"the check has run out", board + held, "2026-12-01T10:02:00+01:00", false},
	} {
		path := written(t, c.text)
		r := runs(t, "2026-12-02T10:00:00+01:00", "record", "step", path, measure.StepMotorTested, "done", "--at", c.at)
		if r.status != exitDone {
			t.Fatalf("%s: %s", c.name, r.err)
		}
		if got := !strings.Contains(r.out, "outside its hold point"); got != c.within {
			t.Errorf("%s: within its hold point %v, want %v\n%s", c.name, got, c.within, r.out)
		}
		if n := len(loaded(t, path).Steps); n != 1 {
			t.Errorf("%s: %d steps are kept", c.name, n)
		}
	}
	if m := statusOf(base, loaded(t, written(t, board)), mustTime(t, "2026-12-01T09:55:00+01:00"), measure.StepPhotographed).Missing; len(m) != 0 {
		t.Errorf("a picture waits for %v", m)
	}
}

// TestEveryStepAndResultIsTaken proves that each step can be entered, and each result, those that need a reason only with
// one.
func TestEveryStepAndResultIsTaken(t *testing.T) {
	type pair struct{ step, result string }
	pairs := []pair{}
	for _, step := range measure.StepWords() {
		pairs = append(pairs, pair{step, "failed"})
	}
	for _, result := range stepResults {
		pairs = append(pairs, pair{measure.StepFaultLogRead, result})
	}
	for _, p := range pairs {
		path := written(t, bareCase)
		needs := p.result == "failed" || p.result == "not-possible"
		if needs {
			if r := runs(t, "2026-12-01T10:00:00+01:00", "record", "step", path, p.step, p.result); r.status != exitCommand || len(loaded(t, path).Steps) > 0 {
				t.Errorf("%v without a note: status %d", p, r.status)
			}
		}
		if r := runs(t, "2026-12-01T10:00:00+01:00", "record", "step", path, p.step, p.result, "--note", "why"); r.status != exitDone {
			t.Errorf("%v: %s", p, r.err)
			continue
		}
		if s := loaded(t, path).Steps[0]; s.Step != p.step || s.Result != p.result || s.Note != "why" || s.At.IsZero() {
			t.Errorf("%v is kept as %+v", p, s)
		}
	}
}
