package main

import (
	"errors"
	"fmt"
	"io"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/knowledge"
	"drivemend/reports"
)

// app is one run of the program: the world, and what the command line says for all commands.
type app struct {
	env
	rules  string // folder laid over the rule base, "" for none
	at     string // --at of the command that runs
	asJSON bool   // --json of the command that runs
	began  time.Time
}

// run reads the command line, does what it says and gives the exit status. It touches nothing but its environment and
// the files that are named.
func run(e env) int {
	if e.program == "" {
		e.program = "drivemend"
	}
	a := &app{env: e, began: e.now()}
	root := a.command()
	root.SetArgs(e.args)
	root.SetIn(e.in)
	root.SetOut(e.out)
	root.SetErr(e.err)
	return report(e.err, a.settle(root, root.Execute()))
}

// settle turns the errors of the command library into ours.
func (a *app) settle(root *cobra.Command, err error) error {
	var f *failure
	if err == nil || errors.As(err, &f) {
		return err
	}
	if strings.HasPrefix(err.Error(), "unknown command") {
		return wrongCommand(err.Error(), "see drivemend help")
	}
	return err
}

// command is the tree of commands. One is listed only when it works.
func (a *app) command() *cobra.Command {
	cobra.EnableCommandSorting = false // the order is that of the job
	root := &cobra.Command{
		Use:           "drivemend",
		Short:         "from a dead motor-drive board to a rebuilt one that will not blow again",
		SilenceUsage:  true,
		SilenceErrors: true,
		Args:          a.knownCommand,
		RunE:          func(*cobra.Command, []string) error { return a.start() },
	}
	root.SuggestionsMinimumDistance = 2
	root.CompletionOptions.DisableDefaultCmd = true
	root.PersistentFlags().StringVar(&a.rules, "rules", "", "a `DIR` with rule files to lay over the built-in base")
	root.SetFlagErrorFunc(func(c *cobra.Command, err error) error {
		return wrongFlag(err.Error(), "see "+c.CommandPath()+" --help")
	})
	root.SetHelpFunc(a.help)
	root.SetHelpCommand(a.helpCommand())
	groups := []struct {
		title    string
		commands []*cobra.Command
	}{
		{benchGroup, []*cobra.Command{a.benchCommand(), a.newCommand(), a.statusCommand(), a.enterCommand(), a.recordCommand(), a.safeCommand(),
			a.dischargeCommand(), a.nextCommand(), a.rankCommand()}},
		{figureGroup, []*cobra.Command{a.marginCommand(), a.reportCommand()}},
		{shopGroup, []*cobra.Command{a.rulesCommand(), a.keysCommand(), a.casesCommand(), a.demoCommand()}},
	}
	for _, g := range groups {
		root.AddGroup(&cobra.Group{ID: g.title, Title: g.title})
		for _, c := range g.commands {
			c.GroupID = g.title
			root.AddCommand(c)
		}
	}
	bare(root)
	return root
}

// bare keeps the library from adding its own word to the way a command is written.
func bare(c *cobra.Command) {
	c.DisableFlagsInUseLine = true
	for _, sub := range c.Commands() {
		bare(sub)
	}
}

// knownCommand refuses what is left on the command line when no command has that name.
func (a *app) knownCommand(c *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	hints := []string{"see drivemend help"}
	if near := c.SuggestionsFor(args[0]); len(near) > 0 {
		hints = append([]string{"did you mean " + strings.Join(near, " or ") + "?"}, hints...)
	}
	return wrongCommand(fmt.Sprintf("there is no command %q", args[0]), hints...)
}

// takes checks the number of arguments and says what belongs there.
func takes(least, most int) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		switch {
		case len(args) < least:
			return wrongCommand(c.CommandPath()+" needs more: drivemend "+trail(c), "see "+c.CommandPath()+" --help")
		case most >= 0 && len(args) > most:
			return wrongCommand(fmt.Sprintf("%s does not take %q: drivemend %s", c.CommandPath(), args[most], trail(c)),
				"put a value of several words in quotes; see "+c.CommandPath()+" --help")
		}
		return nil
	}
}

// trail is how a command is written, without the program's name.
func trail(c *cobra.Command) string { return strings.TrimPrefix(c.UseLine(), "drivemend ") }

// timed adds --at to a command that stamps an entry or checks a hold point.
func (a *app) timed(c *cobra.Command) *cobra.Command {
	c.Flags().StringVar(&a.at, "at", "", "the `TIME` of what is entered or asked, 2026-12-01T10:12:00+01:00 (default now)")
	return c
}

// figures adds --json to a command that prints figures.
func (a *app) figures(c *cobra.Command) *cobra.Command {
	c.Flags().BoolVar(&a.asJSON, "json", false, "print one JSON object instead of tables")
	return c
}

// base loads the rule base, with the shop's own rules over it.
func (a *app) base() (*knowledge.Base, error) {
	if a.rules == "" {
		return knowledge.Load()
	}
	return knowledge.LoadWith(a.rules)
}

// style is how the output is written to. Colour only on a terminal, and not where it is declined.
func (a *app) style() reports.Style {
	return reports.Style{Width: a.width, Color: a.screen && a.getenv("NO_COLOR") == "" && a.getenv("TERM") != "dumb"}
}

// show writes one result, as JSON if that was asked for.
func (a *app) show(asJSON, asTable func(io.Writer) error) error {
	if a.asJSON {
		return asJSON(a.out)
	}
	return asTable(a.out)
}
