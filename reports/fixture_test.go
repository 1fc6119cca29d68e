package reports

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// moment of every report of the tests: six minutes after the last dead check of the pump.
var testTime = time.Date(2026, 12, 1, 9, 13, 0, 0, time.UTC)

// full is the pump case taken through the real chain, once.
var full = sync.OnceValues(func() (Report, error) {
	return chain("../testdata/cases/orchard-pump-3.yaml")
})

func chain(path string) (Report, error) {
	file, err := measure.Load(path)
	if err != nil {
		return Report{}, err
	}
	base, err := knowledge.Load()
	if err != nil {
		return Report{}, err
	}
	c := file.Case
	r := Report{Case: c, Base: base, At: testTime}
	spans, _, err := stress.Spans(c.Board)
	if err != nil {
		return r, err
	}
	if r.Ranking, err = diagnose.Rank(base, c, spans, ""); err != nil {
		return r, err
	}
	if r.Next, err = diagnose.Next(base, c, spans, testTime); err != nil {
		return r, err
	}
	if r.Margin, err = stress.Compute(c, 1); err != nil {
		return r, err
	}
	if r.Discharge, err = safety.Discharge(safety.InputOf(c.Board)); err != nil {
		return r, err
	}
	evidence := diagnose.EvidenceOf(base, c)
	r.Safety, r.Record = safety.StatusOf(c, testTime, evidence), safety.Record(c, testTime, evidence)
	for i, o := range c.Observations {
		if t := base.Test(o.Test); t != nil {
			if out, missing := safety.OutsideHoldPoint(c, o, diagnose.WorkOf(t), diagnose.EvidenceOf(base, safety.AsOf(c, o.At))); out {
				r.Outside = append(r.Outside, Outside{i, missing})
			}
		}
	}
	return r, nil
}

func pump(t *testing.T) Report {
	t.Helper()
	r, err := full()
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// golden compares an output with its file, or rewrites it.
func golden(t *testing.T, name, got string) {
	t.Helper()
	path := filepath.Join("testdata", "golden", name)
	if *update {
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatalf("%v; make it with go test ./reports -update", err)
	}
	if got != string(want) {
		t.Errorf("%s differs from its golden file at line %d; look at it, then go test ./reports -update", name, firstDifference(got, string(want)))
	}
}

func firstDifference(a, b string) int {
	x, y := strings.Split(a, "\n"), strings.Split(b, "\n")
	for i := range x {
		if i >= len(y) || x[i] != y[i] {
			return i + 1
		}
	}
	return len(x)
}
