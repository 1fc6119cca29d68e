package main

import (
	_ "embed"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/diagnose"
	"drivemend/measure"
	"drivemend/measure/quantity"
	"drivemend/reports"
)

// The invented case: how it arrived, and what was done on it.
var (
	//go:embed demo/start.yaml
	demoStart []byte
	//go:embed demo/job.yaml
	demoJob []byte
)

// demoFolder is where the demonstration writes; a number follows when it is there.
const demoFolder = "drivemend-demo"

// mostDemos bounds the numbered folders that are tried.
const mostDemos = 1000

func (a *app) demoCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "demo [DIR]",
		Short: "an invented case through the whole job",
		Long:  "Takes an invented case through the whole job: isolation, discharge, readings, ranking, next test, margin, report. It writes into DIR, or into ./drivemend-demo (./drivemend-demo-2 if that is there), and never over anything.",
		Args:  takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			if len(args) == 1 {
				return a.demo(args[0])
			}
			return a.demo("")
		},
	}
}

// demo replays the invented job, each entry through the same changes and saves as at the bench.
func (a *app) demo(folder string) error {
	folder, err := demoPlace(folder)
	if err != nil {
		return err
	}
	path := filepath.Join(folder, "quarry-belt.yaml")
	fmt.Fprintf(a.out, "An invented case, nothing in it was measured. It is written to %s.\n", path)
	if err := os.WriteFile(path, demoStart, 0o644); err != nil {
		return wrongInput(path + ": cannot be written: " + err.Error())
	}
	f, err := measure.Load(path)
	if err != nil {
		return err
	}
	job, err := measure.Parse("demo/job.yaml", demoJob)
	if err != nil {
		return err
	}
	at, err := a.replay(f, job.Case)
	if err != nil {
		return err
	}
	return a.demoEnd(f, at)
}

// demoPlace makes the folder of the demonstration. A folder that is named may be there, but not with a case in it.
func demoPlace(folder string) (string, error) {
	if folder != "" {
		if _, err := os.Stat(filepath.Join(folder, "quarry-belt.yaml")); err == nil {
			return "", wrongInput(folder+": the demonstration is already there; nothing was changed", "name another folder")
		}
		if err := os.MkdirAll(folder, 0o755); err != nil {
			return "", wrongInput(folder+": cannot be made: "+err.Error(), "name a folder that can be written to")
		}
		return folder, nil
	}
	for n := 1; n <= mostDemos; n++ {
		name := demoFolder
		if n > 1 {
			name = fmt.Sprintf("%s-%d", demoFolder, n)
		}
		err := os.Mkdir(name, 0o755)
		if err == nil {
			return name, nil
		}
		if !errors.Is(err, fs.ErrExist) {
			return "", wrongInput(name+": cannot be made: "+err.Error(), "name a folder: drivemend demo DIR")
		}
	}
	return "", wrongInput("there are too many demonstrations here", "name a folder: drivemend demo DIR")
}

// entered is one entry of the job with its time.
type entered struct {
	at    time.Time
	words string
	enter func(f *measure.File) error
}

// entries lists the job in the order of time.
func entries(c *measure.Case) []entered {
	var out []entered
	for _, i := range c.Safety.Isolation {
		out = append(out, entered{i.At, "isolated, motor " + i.Motor, func(f *measure.File) error { return f.Isolate(i) }})
	}
	for _, d := range c.Safety.DeadChecks {
		words := "dead check at " + d.Point + ": " + d.DC.Text + " DC, " + d.AC.Text + " AC"
		out = append(out, entered{d.At, words, func(f *measure.File) error { return f.Check(d) }})
	}
	for _, o := range c.Observations {
		words := o.Test + ": " + o.Result
		if o.Reading != nil {
			words = strings.TrimSpace(o.Test+" "+o.Part+o.Position) + ": " + o.Reading.Text
		}
		out = append(out, entered{o.At, words, func(f *measure.File) error { return f.Observe(o) }})
	}
	sort.SliceStable(out, func(i, j int) bool { return out[i].at.Before(out[j].at) })
	return out
}

// replay enters the job, saving after each entry, and gives the time of the last one.
func (a *app) replay(f *measure.File, job *measure.Case) (time.Time, error) {
	var at time.Time
	for _, e := range entries(job) {
		if err := e.enter(f); err != nil {
			return at, err
		}
		if err := f.Save(); err != nil {
			return at, err
		}
		at = e.at
		fmt.Fprintf(a.out, "%s  %s\n", at.Format("15:04"), e.words)
	}
	for _, key := range job.Rebuild.Keys {
		text := valueText(job.Rebuild.Board, key)
		if err := f.SetRebuild(key, text); err != nil {
			return at, err
		}
		fmt.Fprintf(a.out, "rebuild  %s: %s\n", key, text)
	}
	return at, f.Save()
}

// valueText is a board value as it was written.
func valueText(b measure.Board, key string) string {
	if q, ok := b.Quantity(key); ok {
		return q.Text
	}
	word, _ := b.Word(key)
	return word
}

// demoEnd writes the reports and shows what the job came to.
func (a *app) demoEnd(f *measure.File, at time.Time) error {
	base, err := a.base()
	if err != nil {
		return err
	}
	k, err := chainOf(base, f.Case)
	if err != nil {
		return err
	}
	r, err := k.report(at)
	if err != nil {
		return err
	}
	folder := filepath.Dir(f.Path)
	for _, ending := range []string{".html", ".md", ".json"} {
		if err := writeReport(filepath.Join(folder, "report"+ending), r); err != nil {
			return err
		}
	}
	if len(r.Next.Tests) > 0 {
		fmt.Fprintf(a.out, "%s  next: %s\n", at.Format("15:04"), oneLine(r.Next.Tests[0]))
	}
	fmt.Fprintf(a.out, "%s stored %s, discharged through %s; reports written as .html, .md and .json\n\n", f.Case.ID,
		quantity.Format(r.Discharge.TotalEnergyJ, quantity.Joule), quantity.Format(r.Discharge.Resistor.Ohm, quantity.Ohm))
	return reports.Demo(a.out, reports.DemoSummary{Folder: folder, Case: f.Case, Outside: r.Outside, Ranking: r.Ranking, Margin: r.Margin,
		Report: filepath.Join(folder, "report.html"), Command: a.program + " rank " + quoted(f.Path) + " --why " + r.Ranking.About}, a.style())
}

// oneLine is a test in a few words, and what it waits for.
func oneLine(c diagnose.Candidate) string {
	text := c.Test.Title
	if !c.Allowed && len(c.BlockedBy) > 0 {
		text += ", locked: " + c.BlockedBy[0]
	}
	return text
}

// quoted puts a path with blanks in quotes, so that a command line with it can be copied.
func quoted(path string) string {
	if strings.ContainsAny(path, " \t") {
		return strconv.Quote(path)
	}
	return path
}
