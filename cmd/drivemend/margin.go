package main

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"drivemend/diagnose/stress"
	"drivemend/measure"
	"drivemend/reports"
)

// netlistFlags is what the command line says of a netlist.
type netlistFlags struct{ file, edge string }

func (a *app) marginCommand() *cobra.Command {
	var n netlistFlags
	c := &cobra.Command{
		Use:   "margin CASE",
		Short: "what the switch saw, what the chosen rebuild will see",
		Long: "Works out the switching edges of the board as found and of the chosen rebuild, with what follows from them and everything that was assumed. " +
			"Exit status 3: the chosen rebuild is not within 80 % of the rating.",
		Example: "drivemend margin pump.yaml --netlist pump.cir",
		Args:    takes(1, 1),
		RunE: func(c *cobra.Command, args []string) error {
			if c.Flags().Changed("edge") && !c.Flags().Changed("netlist") {
				return wrongCommand("--edge chooses the edge of a netlist", "drivemend margin "+quoted(args[0])+" --edge "+quoted(n.edge)+" --netlist edge.cir")
			}
			if c.Flags().Changed("netlist") {
				return a.marginAndNetlist(args[0], n)
			}
			return a.margin(args[0])
		},
	}
	c.Flags().StringVar(&n.file, "netlist", "", "write the circuit of the edge that decides, of the rebuild if there is one, to a `FILE` that ngspice -b runs")
	c.Flags().StringVar(&n.edge, "edge", "", "another `EDGE` for the netlist: "+strings.Join(reports.NetlistEdges, ", "))
	return a.figures(c)
}

func (a *app) margin(path string) error {
	k, m, err := a.marginOf(path)
	if err != nil {
		return err
	}
	return a.showMargin(k, m)
}

func (a *app) marginOf(path string) (*chain, *stress.Margin, error) {
	k, err := a.chain(path)
	if err != nil {
		return nil, nil, err
	}
	var m *stress.Margin
	err = a.slowly("the margin", func() error {
		var err error
		m, err = k.margin()
		return err
	})
	return k, m, err
}

// showMargin prints the margin; the chosen rebuild decides the exit status.
func (a *app) showMargin(k *chain, m *stress.Margin) error {
	err := a.show(func(w io.Writer) error { return reports.MarginJSON(w, k.c, m) },
		func(w io.Writer) error { return reports.MarginInFull(w, k.c, m, a.style()) })
	if err == nil && k.c.Rebuild != nil && len(k.c.Rebuild.Keys) > 0 && (m.Rebuild == nil || m.Rebuild.Verdict != stress.Within) {
		return errWithheld
	}
	return err
}

// marginAndNetlist writes the netlist, then prints the margin, then says what was written. Nothing is printed before
// the file is there; with --json the object stands alone.
func (a *app) marginAndNetlist(path string, n netlistFlags) error {
	if err := n.check(path); err != nil {
		return err
	}
	k, m, err := a.marginOf(path)
	if err != nil {
		return err
	}
	chosen, err := reports.ChooseEdge(m, n.edge)
	if err != nil {
		return noEdge(path, m, err)
	}
	if err := n.write(k.c, m, chosen); err != nil {
		return err
	}
	err = a.showMargin(k, m)
	if !a.asJSON {
		fmt.Fprintf(a.out, "written: %s: %s\n", n.file, chosen.Words())
	}
	return err
}

// check refuses what cannot be written before the long work.
func (n netlistFlags) check(path string) error {
	switch {
	case n.file == "" || n.file == "-":
		return wrongCommand(fmt.Sprintf("--netlist %q: a netlist goes into a file", n.file), "drivemend margin "+quoted(path)+" --netlist edge.cir")
	case n.edge != "" && !slices.Contains(reports.NetlistEdges, n.edge):
		return wrongCommand(fmt.Sprintf("--edge %q: there is no such edge", n.edge), "it is one of: "+strings.Join(reports.NetlistEdges, ", "), "leave it out for the edge that decides")
	}
	if gone := folderGone(n.file); gone != nil {
		return gone
	}
	return n.free()
}

// free tells whether the file may be written: it is not there, or it is a netlist written here before.
func (n netlistFlags) free() error {
	f, err := os.Open(n.file)
	if errors.Is(err, fs.ErrNotExist) {
		return nil
	}
	if err != nil {
		return wrongInput(n.file + ": cannot be read: " + err.Error())
	}
	defer f.Close()
	if info, err := f.Stat(); err == nil && !info.Mode().IsRegular() {
		return wrongInput(n.file+": is there and no file that can be replaced", "name another file")
	}
	head := make([]byte, len(reports.NetlistMark))
	if _, err := io.ReadFull(f, head); err != nil || string(head) != reports.NetlistMark {
		return wrongInput(n.file+": is there and was not written as a netlist; it was left as it is", "name another file, or move this one away")
	}
	return nil
}

// write puts the netlist in its place in one step: it is whole or not there.
func (n netlistFlags) write(c *measure.Case, m *stress.Margin, chosen reports.NetlistChoice) error {
	var text bytes.Buffer
	if err := reports.Netlist(&text, c, m, chosen); err != nil {
		return fmt.Errorf("%s: %w", n.file, err)
	}
	if err := n.free(); err != nil {
		return err
	}
	return putFile(n.file, text.Bytes())
}

// noEdge tells why there is no edge to write, and what to do about it.
func noEdge(path string, m *stress.Margin, err error) error {
	if !errors.Is(err, reports.ErrNoFigures) {
		return wrongInput(path+": "+err.Error(), "leave --edge out for the one that decides")
	}
	var keys []string
	for _, need := range m.Needs {
		keys = append(keys, need.Key)
	}
	return wrongInput(path+": "+err.Error()+"; it needs "+strings.Join(keys, ", "), "what each is for: drivemend margin "+quoted(path), "enter it: drivemend enter "+quoted(path)+" KEY VALUE")
}
