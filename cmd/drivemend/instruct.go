package main

import (
	"strings"

	"github.com/spf13/cobra"

	"drivemend/diagnose/safety"
)

// instruction is the work at the board that a command instructs; nil for a command that asks, enters, works out or
// shows, and lays no hand on the board.
type instruction func() []safety.Work

// everyWork is any work that has conditions: the tests of a rule base need one of them each.
func everyWork() []safety.Work {
	var out []safety.Work
	for _, w := range safety.Works() {
		out = append(out, w.Work)
	}
	return out
}

// only is a closed list of work.
func only(needs ...safety.Need) instruction {
	return func() []safety.Work {
		var out []safety.Work
		for _, n := range needs {
			out = append(out, safety.Work{Need: n})
		}
		return out
	}
}

// instructs tells of every command, by its path below the program's name, which work it instructs. An instruction is
// given exactly when safety.Check allows its work; a command without a row here does not pass the tests.
var instructs = map[string]instruction{
	"bench": everyWork,
	"next":  everyWork,
	// The bare form, without a case, has no hold point to check; its first step is the isolation.
	"discharge": only(safety.NeedDischarge, safety.NeedDeadCheck),
	// The plan of the discharge, and how the next test is done.
	"report": everyWork,

	"": nil, "help": nil,
	"new": nil, "status": nil, "enter": nil, "rank": nil,
	"record": nil, "record step": nil, "record photo": nil, "record capture": nil, "record fault-code": nil, "record setting": nil,
	"record repair": nil,
	"safe":          nil, "safe isolation": nil, "safe dead-check": nil, "safe link": nil, "safe energised": nil, "safe before": nil,
	"margin": nil,
	"rules":  nil, "rules check": nil, "rules list": nil, "rules show": nil,
	"keys": nil, "cases": nil, "demo": nil,
}

// pathOf is the path of a command below the program's name, "" for the program itself.
func pathOf(c *cobra.Command) string {
	return strings.TrimSpace(strings.TrimPrefix(c.CommandPath(), c.Root().Name()))
}

// heldNote says of a command that instructs where its hold points are.
func heldNote(c *cobra.Command) string {
	if instructs[pathOf(c)] == nil {
		return ""
	}
	return "Every instruction stands behind its hold points. One that is withheld is named with what is missing and what to do about it; drivemend status CASE shows all of them."
}
