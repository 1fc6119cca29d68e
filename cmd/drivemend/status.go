package main

import (
	"io"

	"github.com/spf13/cobra"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/reports"
)

func (a *app) statusCommand() *cobra.Command {
	return a.figures(a.timed(&cobra.Command{
		Use:   "status CASE",
		Short: "where a case stands: answers, isolation, dead checks",
		Long:  "Shows where a case stands at one moment: what was answered, whether the board counts as isolated and dead, and what is missing.",
		Args:  takes(1, 1),
		RunE:  func(_ *cobra.Command, args []string) error { return a.status(args[0]) },
	}))
}

func (a *app) status(path string) error {
	at, err := a.moment()
	if err != nil {
		return err
	}
	f, err := a.load(path)
	if err != nil {
		return err
	}
	a.remark(f.Case, at)
	base, err := a.base()
	if err != nil {
		return err
	}
	st := safety.StatusOf(f.Case, at, diagnose.EvidenceOf(base, f.Case))
	return a.show(func(w io.Writer) error { return reports.StatusJSON(w, f.Case, st) },
		func(w io.Writer) error { return reports.Status(w, f.Case, st, a.style()) })
}
