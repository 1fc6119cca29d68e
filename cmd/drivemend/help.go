package main

import (
	"fmt"
	"io"
	"runtime/debug"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"drivemend/cmd/drivemend/internal/ask"
)

// The groups of commands, in the order of the job.
const (
	benchGroup  = "at the bench"
	figureGroup = "figures"
	shopGroup   = "shop"
)

// help prints how a command is used. Functions instead of templates: a template keeps the linker from dropping code.
func (a *app) help(c *cobra.Command, _ []string) {
	if c.HasParent() {
		helpOne(a.out, c)
		return
	}
	w := a.out
	fmt.Fprintln(w, "drivemend: "+c.Short)
	fmt.Fprintln(w, "\n  drivemend            on a terminal: resume a case, start one, see the demo")
	for _, g := range c.Groups() {
		fmt.Fprintf(w, "\n%s\n", g.Title)
		for _, sub := range c.Commands() {
			if sub.GroupID == g.ID && sub.IsAvailableCommand() {
				fmt.Fprintf(w, "  %-10s %s\n", sub.Name(), sub.Short)
			}
		}
	}
	fmt.Fprint(w, `
CASE is a case file; - reads standard input. drivemend help COMMAND tells more.
--rules DIR lays a shop's own rule files over the built-in base, for every command.
--at TIME gives the time of an entry or of a hold point (default now); it is printed.

Exit status: 0 done; 1 the input is wrong; 2 wrong command line; 3 withheld by a
hold point, or the chosen rebuild is not within its rating.
No command opens a network connection.
`)
	fmt.Fprintln(w, version())
}

// helpOne prints one command: what it does, how it is written, what may be added.
func helpOne(w io.Writer, c *cobra.Command) {
	fmt.Fprintf(w, "drivemend %s\n\n", trail(c))
	text := c.Long
	if text == "" {
		text = c.Short
	}
	if note := heldNote(c); note != "" {
		text += "\n" + note
	}
	for _, par := range strings.Split(text, "\n") {
		for _, line := range ask.Wrapped(par, "", "", 80) {
			fmt.Fprintln(w, line)
		}
	}
	if c.HasAvailableSubCommands() {
		fmt.Fprintln(w)
		for _, sub := range c.Commands() {
			if sub.IsAvailableCommand() {
				fmt.Fprintf(w, "  %s\n      %s\n", trail(sub), sub.Short)
			}
		}
	}
	helpFlags(w, c)
	if c.Example != "" {
		fmt.Fprintf(w, "\n%s\n", c.Example)
	}
}

// helpFlags lists the flags of a command, its own and those of all.
func helpFlags(w io.Writer, c *cobra.Command) {
	fmt.Fprintln(w)
	c.Flags().VisitAll(func(f *pflag.Flag) {
		if f.Name == "help" || f.Hidden {
			return
		}
		name, usage := pflag.UnquoteUsage(f)
		head := "  --" + f.Name
		if name != "" {
			head += " " + name
		}
		for _, line := range ask.Wrapped(usage, fmt.Sprintf("%-24s ", head), strings.Repeat(" ", 25), 80) {
			fmt.Fprintln(w, line)
		}
	})
}

// helpCommand is the command that explains the others.
func (a *app) helpCommand() *cobra.Command {
	return &cobra.Command{
		Use:    "help [COMMAND]",
		Short:  "how a command is used",
		Hidden: true,
		RunE: func(c *cobra.Command, args []string) error {
			found, rest, err := c.Root().Find(args)
			if err != nil || found == nil || len(rest) > 0 && found == c.Root() {
				return a.knownCommand(c.Root(), args)
			}
			a.help(found, nil)
			return nil
		},
	}
}

// version says which build this is.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "version unknown"
	}
	v := info.Main.Version
	if v == "" {
		v = "(devel)"
	}
	for _, s := range info.Settings {
		if s.Key == "vcs.revision" && len(s.Value) >= 12 && !strings.Contains(v, s.Value[:12]) {
			v += " " + s.Value[:12]
		}
	}
	return "version " + v + ", " + info.GoVersion
}
