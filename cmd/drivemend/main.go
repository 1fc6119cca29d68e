// Command drivemend sits at the bench beside a technician who has a blown motor-drive board. Its commands hand a case
// file from stage to stage; what they show is made by package reports.
package main

import (
	"io"
	"os"
	"strings"
	"time"

	"golang.org/x/term"
)

func main() { os.Exit(run(system())) }

// env is everything the program has of the world around it.
type env struct {
	program  string // how it was started, to be shown in commands to copy
	args     []string
	in       io.Reader
	out, err io.Writer
	terminal bool // a person sits at both in and out
	screen   bool // out is a terminal
	width    int  // of the terminal in columns, 0 when not known
	getenv   func(string) string
	now      func() time.Time
	// tryFolder tells why files cannot be written into a folder; nil: they are tried for.
	tryFolder func(folder string) error
}

// system is the world as the operating system gives it.
func system() env {
	in, out := int(os.Stdin.Fd()), int(os.Stdout.Fd())
	e := env{args: os.Args[1:], in: os.Stdin, out: os.Stdout, err: os.Stderr, screen: term.IsTerminal(out),
		getenv: os.Getenv, now: time.Now}
	e.program = "drivemend"
	if strings.Contains(os.Args[0], "go-build") { // started by go run, from a clone
		e.program = "go run ./cmd/drivemend"
	}
	e.terminal = e.screen && term.IsTerminal(in)
	if e.screen {
		e.width, _, _ = term.GetSize(out)
	}
	return e
}
