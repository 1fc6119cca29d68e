package main

import (
	"html"
	"os"
	"path/filepath"
	"strings"

	"drivemend/diagnose/safety"
)

// proveReport: no form of the report holds a step of the discharge, or how a test is done, that its hold points withhold
// at that moment.
func proveReport(j judged) {
	folder := j.t.TempDir()
	args := []string{"report", j.path}
	for _, ending := range []string{".html", ".md", ".json"} {
		args = append(args, "--to", filepath.Join(folder, "r"+ending))
	}
	if r := j.run(args...); r.status != exitDone {
		j.t.Fatalf("report, %s: status %d\n%s", j.name, r.status, r.err)
	}
	plan, err := (&chain{base: j.base, c: j.c}).discharge(j.at)
	if err != nil {
		j.t.Fatal(err)
	}
	free := j.allowed(safety.Work{Need: safety.NeedDischarge})
	for _, file := range args[3:] {
		if file == "--to" {
			continue
		}
		raw, err := os.ReadFile(file)
		if err != nil {
			j.t.Fatal(err)
		}
		text := html.UnescapeString(strings.ReplaceAll(string(raw), "\\n", " "))
		j.instructed(text)
		given := stepsIn(text, plan)
		if len(given) > 0 && !free {
			j.t.Errorf("report, %s: %s holds the discharge, which is withheld: %q", j.name, filepath.Ext(file), given[0])
		}
		if len(given) > 0 {
			j.asked["discharge in a report"]++
		}
	}
}

// stepsIn lists the steps of a discharge at the board that stand in a text, the isolation left aside.
func stepsIn(text string, plan *safety.Plan) []string {
	flat := strings.Join(strings.Fields(text), " ")
	var given []string
	for _, s := range plan.Steps[1:] {
		if step := strings.Join(strings.Fields(s.Text), " "); len(step) > 20 && strings.Contains(flat, step) {
			given = append(given, step)
		}
	}
	return given
}
