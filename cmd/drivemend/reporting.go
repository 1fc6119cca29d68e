package main

import (
	"bytes"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/reports"
)

// formats are the endings of a report and how each is written.
var formats = map[string]func(io.Writer, reports.Report) error{
	".html": reports.HTML, ".htm": reports.HTML, ".md": reports.Markdown, ".json": reports.ReportJSON,
}

func (a *app) reportCommand() *cobra.Command {
	var to []string
	var private bool
	c := &cobra.Command{
		Use:     "report CASE --to FILE",
		Short:   "the fault report for the people who designed the board",
		Long:    "Writes the fault report: one HTML file that loads nothing from outside and prints on A4, Markdown, or JSON, by the ending of FILE.",
		Example: "drivemend report pump.yaml --to pump.html --to pump.md",
		Args:    takes(1, 1),
		RunE:    func(_ *cobra.Command, args []string) error { return a.report(args[0], to, private) },
	}
	c.Flags().StringArrayVar(&to, "to", nil, "a `FILE` ending in .html, .md or .json; can be repeated")
	c.Flags().BoolVar(&private, "private", false, "leave out owner, technician, serial number and firmware")
	return a.timed(c)
}

func (a *app) report(path string, to []string, private bool) error {
	at, err := a.moment()
	if err != nil {
		return err
	}
	if len(to) == 0 {
		return wrongCommand("report needs a file to write to", "drivemend report "+quoted(path)+" --to report.html")
	}
	for _, file := range to {
		if formats[strings.ToLower(filepath.Ext(file))] == nil {
			return wrongCommand(fmt.Sprintf("--to %q: a report is written as .html, .md or .json", file), "end the name in one of them")
		}
	}
	k, err := a.chain(path)
	if err != nil {
		return err
	}
	a.remark(k.c, at)
	var r reports.Report
	err = a.slowly("the report", func() error {
		var err error
		r, err = k.report(at)
		return err
	})
	if err != nil {
		return err
	}
	r.Private = private
	for _, file := range to {
		if err := writeReport(file, r); err != nil {
			return err
		}
		fmt.Fprintf(a.out, "written: %s, as of %s\n", file, at.Format(time.RFC3339))
	}
	return nil
}

// writeReport writes one report beside its place and puts it there in one step: a report is whole or not there.
func writeReport(file string, r reports.Report) error {
	var page bytes.Buffer
	if err := formats[strings.ToLower(filepath.Ext(file))](&page, r); err != nil {
		return fmt.Errorf("%s: %w", file, err)
	}
	return putFile(file, page.Bytes())
}

// putFile writes a file beside its place and puts it there in one step: it is whole or not there.
func putFile(file string, content []byte) error {
	temp, err := os.CreateTemp(filepath.Dir(file), ".drivemend-file-*")
	if err != nil {
		return wrongInput(file + ": cannot be written: " + err.Error())
	}
	defer os.Remove(temp.Name()) // not there any more once it was renamed
	_, err = temp.Write(content)
	if e := temp.Close(); err == nil {
		err = e
	}
	if err == nil {
		err = os.Chmod(temp.Name(), 0o644)
	}
	if err == nil {
		err = os.Rename(temp.Name(), file)
	}
	if err != nil {
		return wrongInput(file + ": cannot be written: " + err.Error())
	}
	return nil
}
