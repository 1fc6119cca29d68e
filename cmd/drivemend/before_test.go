package main

import (
	"bytes"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// ran is what one run of the program did.
type ran struct {
	status   int
	out, err string
}

// runs runs the program at a moment, as from a command line.
func runs(t *testing.T, now string, args ...string) ran {
	t.Helper()
	at, err := time.Parse(time.RFC3339, now)
	if err != nil {
		t.Fatal(err)
	}
	var out, errs bytes.Buffer
	status := run(env{args: args, in: strings.NewReader(""), out: &out, err: &errs,
		getenv: func(string) string { return "" }, now: func() time.Time { return at }})
	return ran{status, out.String(), errs.String()}
}

// written puts a case file into a folder of its own.
func written(t *testing.T, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "case.yaml")
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// loaded reads a case file back.
func loaded(t *testing.T, path string) *measure.Case {
	t.Helper()
	f, err := measure.Load(path)
	if err != nil {
		t.Fatal(err)
	}
	return f.Case
}

const bareCase = "drivemend: 1\ncase: one\nboard: {topology: low-side-chopper}\n"

// sampleFlag gives a condition as it is typed, and as it stands in the file.
func sampleFlag(c condition) (flags []string, written string) {
	name := strings.ReplaceAll(c.flag, "-", "_")
	switch {
	case c.yes != nil:
		return []string{"--" + c.flag}, name + ": yes"
	case c.word != nil:
		word := c.key().Words[0]
		if c.flag == "probe" {
			word = "earth-clip" // with the others a clip goes along
		}
		return []string{"--" + c.flag, word}, name + ": " + word
	case c.flag == "fuse":
		return []string{"--fuse", "3 A"}, "fuse: 3 A"
	case c.flag == "earth-clips":
		return []string{"--earth-clips", "1"}, "earth_clips: 1"
	}
	return []string{"--note", "seen"}, "note: seen"
}

// TestBeforeTakesExactlyItsConditions states each condition before each step: it is kept, and nothing beside it, exactly
// where it belongs; elsewhere it is refused with the steps that take it, and the file stays as it was.
func TestBeforeTakesExactlyItsConditions(t *testing.T) {
	const now = "2026-12-01T10:00:00+01:00"
	for _, step := range measure.BeforeWords() {
		for _, c := range conditions {
			flags, line := sampleFlag(c)
			path := written(t, bareCase)
			r := runs(t, now, append([]string{"safe", "before", path, step}, flags...)...)
			raw, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if !slices.Contains(c.steps(), step) {
				if r.status != exitCommand || string(raw) != bareCase || !strings.Contains(r.err, orWords(c.steps())) {
					t.Errorf("%s before %s: status %d, %q", c.flag, step, r.status, r.err)
				}
				continue
			}
			if c.flag == "clip-on" || c.flag == "supply" || c.flag == "earth-clips" {
				// The loader may ask for the probe that these belong to.
				path = written(t, bareCase)
				r = runs(t, now, append([]string{"safe", "before", path, step, "--probe", "earth-clip"}, flags...)...)
				raw, err = os.ReadFile(path)
				line = "probe: earth-clip, " + line
			}
			want := bareCase + "safety:\n  before:\n    - {step: " + step + ", at: " + now + ", " + line + "}\n"
			if err != nil || r.status != exitDone || string(raw) != want {
				t.Errorf("%s before %s: status %d, %q, file:\n%s", c.flag, step, r.status, r.err, raw)
			}
		}
	}
}

// TestBeforeKnowsEveryKey proves that each condition of the key table has a flag, and the other way about.
func TestBeforeKnowsEveryKey(t *testing.T) {
	known := map[string]bool{"step": true, "at": true}
	for _, c := range conditions {
		if c.key().Path == "" {
			t.Errorf("--%s has no key", c.flag)
		}
		known[strings.ReplaceAll(c.flag, "-", "_")] = true
	}
	for _, k := range measure.Keys() {
		if name, ok := strings.CutPrefix(k.Path, "safety.before[]."); ok && !known[name] {
			t.Errorf("safety.before[].%s has no flag", name)
		}
	}
}

// TestBeforeAgreesWithTheLoader writes each condition under each step by hand: what the command refuses, the loader
// refuses too, and what it takes, the loader takes.
func TestBeforeAgreesWithTheLoader(t *testing.T) {
	for _, step := range measure.BeforeWords() {
		for _, c := range conditions {
			_, line := sampleFlag(c)
			if c.flag == "clip-on" || c.flag == "supply" || c.flag == "earth-clips" {
				line = "probe: earth-clip, " + line
			}
			text := bareCase + "safety: {before: [{step: " + step + ", at: 2026-12-01T10:00:00+01:00, " + line + "}]}\n"
			_, err := measure.Parse("case", []byte(text))
			if belongs := slices.Contains(c.steps(), step); belongs != (err == nil) {
				t.Errorf("%s before %s: the loader says %v", c.flag, step, err)
			}
		}
	}
}

// TestEveryWorkBehindAStatementIsTold proves that stating conditions tells of every work that stands behind them, by the
// name it has in the status.
func TestEveryWorkBehindAStatementIsTold(t *testing.T) {
	told := map[string]bool{}
	for _, step := range measure.BeforeWords() {
		r := runs(t, "2026-12-01T10:00:00+01:00", "safe", "before", written(t, bareCase), step)
		if r.status != exitDone || !strings.Contains(r.out, "nothing holds") {
			t.Fatalf("%s: status %d, %s%s", step, r.status, r.out, r.err)
		}
		for _, w := range safety.Works() {
			if strings.Contains(r.out, "\n"+w.Title+": still missing\n") {
				told[w.Title] = true
			}
		}
	}
	for _, w := range safety.Works() {
		behind := w.Work.Tool != safety.NoTool || w.Work.Need.Powered()
		if told[w.Title] != behind {
			t.Errorf("%s: told %v, want %v", w.Title, told[w.Title], behind)
		}
	}
}

func mustTime(t *testing.T, text string) time.Time {
	t.Helper()
	at, err := time.Parse(time.RFC3339, text)
	if err != nil {
		t.Fatal(err)
	}
	return at
}
