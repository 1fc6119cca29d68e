package main

import (
	"errors"
	"fmt"
	"io"
	"regexp"
	"strings"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/measure"
)

// The exit statuses. They are part of the interface.
const (
	exitDone     = 0 // what was asked for was done
	exitInput    = 1 // the input is wrong: a case, a rule file, a reading, a name that is not there
	exitCommand  = 2 // the command line is wrong
	exitWithheld = 3 // a hold point withheld the instruction, or the chosen rebuild is not within
)

// failure is an error with its exit status and what to do about it.
type failure struct {
	status  int
	message string
	hints   []string
}

func (f *failure) Error() string { return f.message }

// wrongCommand is a command line that cannot be read.
func wrongCommand(message string, hints ...string) error {
	return &failure{exitCommand, message, hints}
}

// parserWords are what the library puts behind a flag that it could not read.
var parserWords = regexp.MustCompile(`^invalid argument ("(?:[^"\\]|\\.)*") for "(?:-\w, )?(--[\w-]+)" flag: strconv\.(\w+): .*$`)

// wrongFlag is a flag that cannot be read, without the words of the library's parser.
func wrongFlag(message, hint string) error {
	m := parserWords.FindStringSubmatch(message)
	switch {
	case m == nil:
		return wrongCommand(message, hint)
	case m[3] == "ParseBool":
		return wrongCommand(m[2]+" cannot be "+m[1], "give "+m[2]+" where it holds, and leave it out where it does not; it takes no word", hint)
	}
	return wrongCommand(m[2]+" cannot be "+m[1], "give a whole number", hint)
}

// wrongInput is something read or named that cannot be used.
func wrongInput(message string, hints ...string) error { return &failure{exitInput, message, hints} }

// errWithheld ends a command whose output has already said what was withheld and why.
var errWithheld = &failure{status: exitWithheld}

// noSuch tells that a name is not there, and which one is spelt most like it.
func noSuch(what, name, nearest, elsewhere string) error {
	var hints []string
	if nearest != "" {
		hints = append(hints, "the nearest is "+nearest)
	}
	if elsewhere != "" {
		hints = append(hints, elsewhere)
	}
	return wrongInput("there is no "+what+" "+name, hints...)
}

// report prints an error and gives the exit status. It is the only place that writes to standard error.
func report(w io.Writer, err error) int {
	var f *failure
	var p measure.Problems
	var save *measure.SaveError
	switch {
	case err == nil:
		return exitDone
	case errors.As(err, &f):
		if f.message != "" {
			printFault(w, f.message, f.hints...)
		}
		return f.status
	case errors.As(err, &p):
		for _, one := range p {
			hint := one.Hint
			one.Hint = ""
			printFault(w, one.String(), hint)
		}
	case errors.As(err, &save):
		printFault(w, save.Path+": not saved, "+save.Failed+": "+save.Reason+"; "+save.Stands, save.Todo)
	default:
		printFault(w, err.Error())
	}
	return exitInput
}

// printFault prints one fault and what to do about it.
func printFault(w io.Writer, message string, hints ...string) {
	fmt.Fprintf(w, "drivemend: %s\n", ask.Clean(strings.TrimRight(message, "\n")))
	for _, h := range hints {
		if h != "" {
			fmt.Fprintf(w, "hint: %s\n", ask.Clean(h))
		}
	}
}
