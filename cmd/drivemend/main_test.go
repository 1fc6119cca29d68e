package main

import (
	"flag"
	"os"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

var update = flag.Bool("update", false, "rewrite the expected output in the scripts")

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"drivemend": func() { os.Exit(run(scripted())) }})
}

// scriptClock names the variable that sets the clock of a script, so that its times lie in the past on any day.
const scriptClock = "SCRIPT_CLOCK"

// scripted is the world as it is, with the clock of a script where there is one.
func scripted() env {
	e := system()
	if now, err := time.Parse(time.RFC3339, os.Getenv(scriptClock)); err == nil {
		e.now = func() time.Time { return now }
	}
	return e
}

// TestScripts runs the stories of testdata/scripts against the program as it is built.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 "../../testdata/scripts",
		UpdateScripts:       *update,
		RequireExplicitExec: true,
		RequireUniqueNames:  true,
		Setup: func(e *testscript.Env) error {
			e.Setenv(scriptClock, "2026-12-31T12:00:00+01:00")
			return nil
		},
	})
}
