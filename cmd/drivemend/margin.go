package main

import (
	"io"

	"github.com/spf13/cobra"

	"drivemend/diagnose/stress"
	"drivemend/reports"
)

func (a *app) marginCommand() *cobra.Command {
	return a.figures(&cobra.Command{
		Use:   "margin CASE",
		Short: "what the switch saw, what the chosen rebuild will see",
		Long: "Works out the opening edge of the board as found and of the chosen rebuild, with everything that was assumed. " +
			"Exit status 3: the chosen rebuild is not within 80 % of the rating.",
		Args: takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error { return a.margin(args[0]) },
	})
}

func (a *app) margin(path string) error {
	k, err := a.chain(path)
	if err != nil {
		return err
	}
	var m *stress.Margin
	err = a.slowly("the margin", func() error {
		var err error
		m, err = k.margin()
		return err
	})
	if err != nil {
		return err
	}
	err = a.show(func(w io.Writer) error { return reports.MarginJSON(w, m) },
		func(w io.Writer) error { return reports.Margin(w, m, a.style()) })
	if err == nil && k.c.Rebuild != nil && len(k.c.Rebuild.Keys) > 0 && (m.Rebuild == nil || m.Rebuild.Verdict != stress.Within) {
		return errWithheld
	}
	return err
}
