package main

import (
	"fmt"
	"os"
	"strings"

	"github.com/spf13/cobra"

	"drivemend/diagnose/safety"
	"drivemend/measure"
)

func (a *app) newCommand() *cobra.Command {
	var story string
	var set []string
	c := &cobra.Command{
		Use:   "new CASE",
		Short: "start a case file",
		Long: "Starts a case file: CASE is its name, .yaml is added when left out. The file is plain text; it can be edited " +
			"by hand at any time. Nothing has to be stated now; drivemend bench CASE asks for what is needed.",
		Example: "drivemend new pump --story 'full speed as soon as the isolator closed' --set board.bus.nominal='310 V'",
		Args:    takes(1, 1),
		RunE:    func(_ *cobra.Command, args []string) error { return a.newCase(args[0], story, set) },
	}
	c.Flags().StringVar(&story, "story", "", "what happened, in the owner's `WORDS`")
	c.Flags().StringArrayVar(&set, "set", nil, "a `KEY=VALUE` of the case, board.topology=half-bridge; can be repeated")
	return a.timed(c)
}

func (a *app) newCase(path, story string, set []string) error {
	f, err := a.startCase(path)
	if err != nil {
		return err
	}
	if story != "" {
		if err := f.SetStory(story); err != nil {
			return err
		}
	}
	for _, one := range set {
		key, value, ok := strings.Cut(one, "=")
		if !ok {
			return wrongCommand(fmt.Sprintf("--set %q lacks a value", one), "write --set KEY=VALUE")
		}
		value, err := keyText(f.Case.Board, key, strings.TrimSpace(value))
		if err != nil {
			return err
		}
		if err := f.Set(key, value); err != nil {
			return err
		}
	}
	if err := f.Save(); err != nil {
		return err
	}
	fmt.Fprintf(a.out, "started %s, opened %s\nnext: drivemend bench %s\n", f.Path, f.Case.Opened.Format("2006-01-02"), quoted(f.Path))
	a.wrapped("before anything is touched: "+strings.Join(beforeTouching(), ", ")+"; each is entered with drivemend record step", "", "  ")
	return nil
}

// beforeTouching names the steps of the record that come before any other, for they cannot be made up for.
func beforeTouching() []string {
	var out []string
	for _, s := range safety.RecordSteps() {
		if s.Phase == safety.BeforeTouching {
			out = append(out, s.Title)
		}
	}
	return out
}

// startCase makes a case that is not yet on disk; one that is there is refused.
func (a *app) startCase(path string) (*measure.File, error) {
	at, err := a.stamp()
	if err != nil {
		return nil, err
	}
	if path == "-" {
		return nil, wrongCommand("a case is started in a file", "name it: drivemend new pump")
	}
	if !isCaseName(path) {
		path += ".yaml"
	}
	if _, err := os.Lstat(path); err == nil {
		return nil, wrongInput(path+": this case is already there; nothing was changed", "go on with it: drivemend bench "+quoted(path))
	}
	if err := folderGone(path); err != nil {
		return nil, err
	}
	return measure.New(path, caseID(path), at.Format("2006-01-02"))
}
