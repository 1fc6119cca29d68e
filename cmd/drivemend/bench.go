package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"strings"

	"github.com/spf13/cobra"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/measure"
)

func (a *app) benchCommand() *cobra.Command {
	var plain bool
	c := &cobra.Command{
		Use:   "bench [CASE]",
		Short: "the guided session; resumes where it stopped",
		Long: "Asks one thing at a time: make safe, describe the board, what happened, then the test that saves most minutes now. " +
			"Every question can be skipped; back, how, why and quit can be typed at any of them. Every answer is on disk before the next question stands on the screen.",
		Args: takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			asker := a.asker(plain)
			if len(args) == 0 {
				return a.chooseCase(asker)
			}
			return a.bench(asker, args[0])
		},
	}
	c.Flags().BoolVar(&plain, "plain", false, "ask in plain lines, without menus")
	return a.timed(c)
}

// asker is how questions are put: with menus on a terminal, in plain lines for a pipe, a plain terminal, or on demand.
func (a *app) asker(plain bool) ask.Asker {
	if a.terminal && !plain && a.getenv("TERM") != "dumb" {
		return ask.NewForms(a.in, a.out, a.width)
	}
	return ask.NewLines(a.in, a.out, a.width, !a.terminal)
}

// bench runs a session on one case, which is started if it is not there.
func (a *app) bench(asker ask.Asker, path string) error {
	if path == "-" {
		return wrongCommand("a session needs a case file to save to", "drivemend bench pump")
	}
	f, err := measure.Load(onDisk(path))
	if errors.Is(err, fs.ErrNotExist) {
		if err := folderGone(onDisk(path)); err != nil {
			return err
		}
		f, err = a.startAsked(asker, path)
	}
	if err != nil || f == nil {
		return a.ended(err)
	}
	return a.session(asker, f)
}

// startAsked starts a case that is not there, if that is what was meant; nil when it was not.
func (a *app) startAsked(asker ask.Asker, path string) (*measure.File, error) {
	answer, err := asker.Ask(ask.Question{
		Title: "No such case", Lines: []string{onDisk(path) + " is not there."}, Ask: "Start it?",
		Choices: []ask.Choice{{Word: "yes", Means: "start it; it is written with the first answer"}, {Word: "no", Means: "stop"}},
		Enter:   "yes", NoBack: true, NoSkip: true,
	})
	if err != nil || answer.Kind != ask.Given || answer.Text != "yes" {
		return nil, err
	}
	return a.startCase(path)
}

// ended turns the end of the input into a plain end: everything answered is on disk.
func (a *app) ended(err error) error {
	if errors.Is(err, ask.ErrEnd) {
		fmt.Fprintln(a.out, "the input ended; nothing was left unsaved")
		return nil
	}
	return err
}

// start is drivemend alone: on a terminal it offers what to do, and writes nothing.
func (a *app) start() error {
	if !a.terminal {
		a.help(a.command(), nil)
		return &failure{status: exitCommand}
	}
	asker := a.asker(false)
	answer, err := asker.Ask(ask.Question{
		Title: "drivemend", Ask: "What shall it be?",
		Choices: []ask.Choice{{Word: "resume", Means: "go on with a case of this folder"}, {Word: "new", Means: "start a case"},
			{Word: "demo", Means: "see an invented case go through the whole job"}},
		NoBack: true, NoSkip: true,
	})
	switch {
	case err != nil:
		return a.ended(err)
	case answer.Kind != ask.Given:
		return nil
	case answer.Text == "demo":
		return a.demo("")
	case answer.Text == "new":
		return a.nameCase(asker)
	}
	return a.chooseCase(asker)
}

// nameCase asks for the name of a new case and runs its session.
func (a *app) nameCase(asker ask.Asker) error {
	answer, err := asker.Ask(ask.Question{
		Title: "New case", Ask: "What shall the case be called?", Free: "one word, pump-3",
		Check: func(name string) error {
			if strings.ContainsAny(name, " \t") {
				return fmt.Errorf("a case is named in one word; write %s", strings.Join(strings.Fields(name), "-"))
			}
			_, err := a.startCase(name)
			return err
		},
		NoBack: true, NoSkip: true,
	})
	if err != nil || answer.Kind != ask.Given {
		return a.ended(err)
	}
	f, err := a.startCase(answer.Text)
	if err != nil {
		return err
	}
	return a.session(asker, f)
}

// chooseCase asks which case of this folder to go on with.
func (a *app) chooseCase(asker ask.Asker) error {
	shelf, err := a.shelf(".")
	if err != nil {
		return err
	}
	var choices []ask.Choice
	for _, s := range shelf {
		means := s.Problem
		if s.Case != nil {
			title, _ := s.Case.Board.Word("title")
			means = strings.TrimPrefix(title+", "+counted(len(s.Case.Current()), "answer"), ", ")
		}
		choices = append(choices, ask.Choice{Word: s.File, Means: means})
	}
	if len(choices) == 0 {
		folder, _ := os.Getwd()
		fmt.Fprintf(a.out, "there is no case in %s yet\n", folder)
		return a.nameCase(asker)
	}
	answer, err := asker.Ask(ask.Question{Title: "Resume", Ask: "Which case?",
		Choices: append(choices, ask.Choice{Word: "new", Means: "start another"}), NoBack: true, NoSkip: true})
	switch {
	case err != nil:
		return a.ended(err)
	case answer.Kind != ask.Given:
		return nil
	case answer.Text == "new":
		return a.nameCase(asker)
	}
	return a.bench(asker, answer.Text)
}
