package main

import (
	"io"

	"github.com/spf13/cobra"

	"drivemend/knowledge"
	"drivemend/reports"
)

func (a *app) rankCommand() *cobra.Command {
	var why string
	c := &cobra.Command{
		Use:   "rank CASE",
		Short: "what is broken, what killed it, what let that happen",
		Long: "Ranks faults, stresses and causes by their probability on everything answered so far. --why ID shows what speaks for and against one of them, " +
			"in decibans (10 dB are odds of ten).",
		Args: takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error { return a.rank(args[0], why) },
	}
	c.Flags().StringVar(&why, "why", "", "the `ID` of a cause, stress or fault whose evidence is shown")
	return a.figures(c)
}

func (a *app) rank(path, why string) error {
	k, err := a.chain(path)
	if err != nil {
		return err
	}
	if err := rankable(k.base, why); err != nil {
		return err
	}
	r, err := k.rank(why)
	if err != nil {
		return wrongInput(err.Error())
	}
	beside := reports.Beside{Outside: k.outside()}
	return a.show(func(w io.Writer) error { return reports.RankJSON(w, r, k.needs, beside) }, func(w io.Writer) error {
		if why != "" {
			return reports.Why(w, k.c, r, a.style(), beside)
		}
		return reports.Ranking(w, k.c, r, a.style(), beside)
	})
}

// rankable tells whether an id is a line of the ranking.
func rankable(base *knowledge.Base, id string) error {
	if id == "" || id == "unlisted" || base.Cause(id) != nil || base.Event(id) != nil {
		return nil
	}
	near := base.Nearest(knowledge.KindCause, id)
	if near == "" {
		near = base.Nearest(knowledge.KindEvent, id)
	}
	return noSuch("cause, stress or fault", id, near, "see drivemend rules list")
}
