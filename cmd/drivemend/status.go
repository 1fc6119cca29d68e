package main

import (
	"fmt"
	"io"
	"slices"
	"time"

	"github.com/spf13/cobra"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/reports"
)

func (a *app) statusCommand() *cobra.Command {
	return a.figures(a.timed(&cobra.Command{
		Use:   "status CASE",
		Short: "where a case stands: hold points, what may be done, what is open",
		Long: "Shows where a case stands at one moment: whether the board counts as isolated and dead and how old each check is, which hold points stand open and why, " +
			"what may be done now, which steps of the record and which tests are open, and what is known of the board.",
		Args: takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error { return a.status(args[0]) },
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
	a.sayAsItStood(at)
	if other := otherName(f.Path, f.Case); path != "-" && other != "" {
		a.note(other)
	}
	base, err := a.base()
	if err != nil {
		return err
	}
	page := safetyPage(base, f.Case, at)
	// A board whose figures cannot be worked out still has its safety shown.
	if k, err := chainOf(base, f.Case); err != nil {
		a.note("the tests that are open are not shown: " + err.Error())
	} else if page.Needs, page.Open, err = k.open(at); err != nil {
		a.note("the tests that are open are not shown: " + err.Error())
	}
	return a.show(func(w io.Writer) error { return reports.StatusJSON(w, page) },
		func(w io.Writer) error { return reports.Status(w, page, a.style()) })
}

// otherName says that a file is not named as the case in it, "" when it is: a copy, or a case that was renamed.
func otherName(path string, c *measure.Case) string {
	if caseID(path) == c.ID {
		return ""
	}
	return path + " holds the case " + c.ID + "; if it is a copy that is to be a case of its own, change the line \"case\" in it"
}

// safetyPage gathers what needs no figures: the safety record, what may be done, the steps of the record.
func safetyPage(base *knowledge.Base, c *measure.Case, at time.Time) reports.StatusPage {
	e := diagnose.EvidenceOf(base, c)
	k := &chain{base: base, c: c}
	page := reports.StatusPage{Case: c, At: at, Safety: safety.StatusOf(c, at, e), Record: safety.Record(c, at, e), Outside: k.outside(), OutsideSteps: k.outsideSteps()}
	for _, w := range safety.Works() {
		page.Works = append(page.Works, reports.WorkLine{Title: w.Title, Decision: safety.Check(c, w.Work, at, e)})
	}
	for _, path := range c.Board.Paths() {
		page.Stated++
		if c.Board.Assumed(path) {
			page.Assumed++
		}
	}
	return page
}

// open gives the board values that figures wait for, and the tests that stand open: what must be done, what was put off,
// what was skipped.
func (k *chain) open(at time.Time) ([]stress.Need, []reports.OpenTest, error) {
	n, err := k.next(at)
	if err != nil {
		return k.needs, nil, err
	}
	var out []reports.OpenTest
	for _, c := range n.Tests {
		if c.Must {
			out = append(out, openTest(c.Test, c.Part, c.Position, "must be done"))
		}
	}
	for _, o := range k.c.Current() {
		t := k.base.Test(o.Test)
		if t == nil || o.Answer == "" {
			continue
		}
		one := openTest(t, o.Part, o.Position, o.Answer)
		if !slices.ContainsFunc(out, func(x reports.OpenTest) bool { return x.ID == one.ID && x.Title == one.Title }) {
			out = append(out, one)
		}
	}
	return k.needs, out, nil
}

// openTest names a test with its place.
func openTest(t *knowledge.Test, part, position, why string) reports.OpenTest {
	title := t.Title
	if place := part + position; place != "" {
		if part != "" {
			place = part
		}
		title += ", " + place
	}
	return reports.OpenTest{Title: title, ID: t.ID, Why: why}
}

// note says something beside the result, on standard error.
func (a *app) note(text string) { fmt.Fprintln(a.err, "drivemend: note: "+ask.Clean(text)) }
