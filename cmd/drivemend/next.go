package main

import (
	"io"

	"github.com/spf13/cobra"

	"drivemend/reports"
)

func (a *app) nextCommand() *cobra.Command {
	return a.figures(a.timed(&cobra.Command{
		Use:   "next CASE",
		Short: "the test to do now",
		Long: "Gives the test that saves most minutes now, how it is done and what its results mean; then the ones after it, and the ones a hold point " +
			"locks with what unlocks them. Exit status 3: no allowed test is left while a locked one is worth its minutes.",
		Args: takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error { return a.next(args[0]) },
	}))
}

func (a *app) next(path string) error {
	at, err := a.moment()
	if err != nil {
		return err
	}
	k, err := a.chain(path)
	if err != nil {
		return err
	}
	a.remark(k.c, at)
	a.sayAsItStood(at)
	n, err := k.next(at)
	if err != nil {
		return err
	}
	r, err := k.rank("")
	if err != nil {
		return err
	}
	beside := k.beside(r, at)
	err = a.show(func(w io.Writer) error { return reports.NextJSON(w, n, beside) }, func(w io.Writer) error {
		// Without a plan the joules are missing beside the cautions; the test is shown all the same.
		plan, err := k.discharge(at)
		if err != nil {
			plan = nil
		}
		return reports.Next(w, k.base, n, plan, a.style(), beside)
	})
	if err == nil && n.Withheld() {
		return errWithheld
	}
	return err
}
