package main

import (
	"io"

	"github.com/spf13/cobra"

	"drivemend/knowledge"
	"drivemend/reports"
)

// ruleKinds are the lists of a base by the words of the command line.
var ruleKinds = []struct {
	word string
	kind knowledge.Kind
}{
	{"causes", knowledge.KindCause}, {"events", knowledge.KindEvent}, {"tests", knowledge.KindTest},
	{"repairs", knowledge.KindRepair}, {"cautions", knowledge.KindCaution}, {"sources", knowledge.KindSource},
}

func (a *app) rulesCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "rules",
		Short: "check, list and show the rule base",
		Long:  "The rule base: what can break, what kills it, what lets that happen, and how each shows. --rules DIR lays a shop's own files over it.",
		Args:  takes(0, 0),
		RunE: func(*cobra.Command, []string) error {
			return wrongCommand("rules needs a word", "drivemend rules check, rules list, or rules show ID")
		},
	}
	c.AddCommand(
		&cobra.Command{Use: "check [DIR]", Short: "is the base sound; DIR is laid over it", Args: takes(0, 1),
			Long: "Loads the base, with the rule files of DIR laid over it, and says what it holds and what it lacks. Every fault is named with file and line.",
			RunE: func(_ *cobra.Command, args []string) error { return a.rulesCheck(args) }},
		a.figures(&cobra.Command{Use: "list [causes|events|tests|...]", Short: "ids and titles", Args: takes(0, 1),
			Long: "Lists the entries of the base: causes, events, tests, repairs, cautions, sources, or all.",
			RunE: func(_ *cobra.Command, args []string) error { return a.rulesList(args) }}),
		&cobra.Command{Use: "show ID", Short: "one entry in full, with its numbers and sources", Args: takes(1, 1),
			Long: "Shows one entry of the base in full.",
			RunE: func(_ *cobra.Command, args []string) error { return a.rulesShow(args[0]) }},
	)
	return c
}

func (a *app) rulesCheck(args []string) error {
	if len(args) == 1 {
		if a.rules != "" {
			return wrongCommand("a folder is named twice", "drivemend rules check DIR, or --rules DIR")
		}
		a.rules = args[0]
	}
	base, err := a.base()
	if err != nil {
		return err
	}
	return reports.RulesChecked(a.out, base, base.Check(), a.style())
}

func (a *app) rulesList(args []string) error {
	var kind knowledge.Kind
	if len(args) == 1 {
		for _, k := range ruleKinds {
			if args[0] == k.word || args[0] == string(k.kind) {
				kind = k.kind
			}
		}
		if kind == "" {
			return noSuch("list", args[0], "", "the lists are causes, events, tests, repairs, cautions, sources")
		}
	}
	base, err := a.base()
	if err != nil {
		return err
	}
	return a.show(func(w io.Writer) error { return reports.RulesJSON(w, base, kind) },
		func(w io.Writer) error { return reports.RulesList(w, base, kind, a.style()) })
}

func (a *app) rulesShow(id string) error {
	base, err := a.base()
	if err != nil {
		return err
	}
	near := ""
	for _, k := range ruleKinds {
		for _, known := range base.IDs(k.kind) {
			if known == id {
				return reports.RulesShow(a.out, base, id, a.style())
			}
		}
		if near == "" {
			near = base.Nearest(k.kind, id)
		}
	}
	return noSuch("entry", id, near, "see drivemend rules list")
}
