package main

import (
	"bytes"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/reports"
)

func (a *app) casesCommand() *cobra.Command {
	var rank bool
	c := &cobra.Command{
		Use:   "cases DIR",
		Short: "the cases of a folder",
		Long:  "Lists the case files of a folder; --rank ranks each. Exit status 1 when one of them cannot be read.",
		Args:  takes(1, 1),
		RunE:  func(_ *cobra.Command, args []string) error { return a.cases(args[0], rank) },
	}
	c.Flags().BoolVar(&rank, "rank", false, "rank each case and show what leads")
	return a.figures(c)
}

func (a *app) cases(folder string, rank bool) error {
	shelf, err := a.shelf(folder)
	if err != nil {
		return err
	}
	if rank {
		base, err := a.base()
		if err != nil {
			return err
		}
		for i := range shelf {
			rankShelved(base, &shelf[i])
		}
	}
	err = a.show(func(w io.Writer) error { return reports.ShelfJSON(w, shelf) },
		func(w io.Writer) error { return reports.Shelf(w, shelf, a.style()) })
	for _, s := range shelf {
		if s.Case == nil {
			continue
		}
		if other := otherName(s.File, s.Case); other != "" {
			a.note(other)
		}
	}
	for _, s := range shelf {
		if err == nil && s.Problem != "" {
			err = &failure{status: exitInput}
		}
	}
	return err
}

// shelf reads the case files of a folder, by name. A YAML file that does not begin as a case does is none.
func (a *app) shelf(folder string) ([]reports.ShelfCase, error) {
	entries, err := os.ReadDir(folder)
	if err != nil {
		var p *os.PathError
		if errors.As(err, &p) {
			err = p.Err
		}
		return nil, wrongInput(folder+": cannot be read: "+err.Error(), "name a folder with case files")
	}
	var out []reports.ShelfCase
	for _, e := range entries {
		path := filepath.Join(folder, e.Name())
		if e.IsDir() || !isCaseName(path) || !looksLikeCase(path) {
			continue
		}
		one := reports.ShelfCase{File: e.Name()}
		if f, err := measure.Load(path); err != nil {
			one.Problem, _, _ = strings.Cut(err.Error(), "\n")
		} else {
			one.Case = f.Case
		}
		out = append(out, one)
	}
	return out, nil
}

// looksLikeCase tells whether a line of the file states the version of a case.
func looksLikeCase(path string) bool {
	file, err := os.Open(path)
	if err != nil {
		return true // the loader says why it cannot be read
	}
	defer file.Close()
	head, err := io.ReadAll(io.LimitReader(file, 64<<10))
	return err != nil || bytes.HasPrefix(head, []byte("drivemend:")) || bytes.Contains(head, []byte("\ndrivemend:"))
}

func rankShelved(base *knowledge.Base, s *reports.ShelfCase) {
	if s.Case == nil {
		return
	}
	k, err := chainOf(base, s.Case)
	if err == nil {
		s.Ranking, err = k.rank("")
	}
	if err != nil {
		s.Problem = err.Error()
	}
}
