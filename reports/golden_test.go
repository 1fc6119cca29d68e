package reports

import (
	"bytes"
	"io"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

type output struct {
	name  string
	write func(w io.Writer, r Report, s Style) error
}

// terminal are all writers for a terminal.
var terminal = []output{
	{"ranking", func(w io.Writer, r Report, s Style) error { return Ranking(w, r.Case, r.Ranking, s, r.beside()) }},
	{"why", func(w io.Writer, r Report, s Style) error { return Why(w, r.Case, r.Ranking, s, r.beside()) }},
	{"next", func(w io.Writer, r Report, s Style) error { return Next(w, r.Base, r.Next, r.Discharge, s, r.beside()) }},
	{"discharge", func(w io.Writer, r Report, s Style) error { return Discharge(w, r.Discharge, s) }},
	{"status", func(w io.Writer, r Report, s Style) error { return Status(w, statusOfReport(r), s) }},
	{"margin", func(w io.Writer, r Report, s Style) error { return MarginInFull(w, r.Case, r.Margin, s) }},
	{"withheld", func(w io.Writer, r Report, s Style) error {
		return Withheld(w, "the meter step", []safety.Missing{{Point: 0, Text: "no isolation is stated", Unlock: "isolate it and state it"}}, r.At, s)
	}},
	{"rules-list", func(w io.Writer, r Report, s Style) error { return RulesList(w, r.Base, "", s) }},
	{"rules-show-cause", func(w io.Writer, r Report, s Style) error { return RulesShow(w, r.Base, "clamp-missing", s) }},
	{"rules-show-fault", func(w io.Writer, r Report, s Style) error { return RulesShow(w, r.Base, "switch-shorted", s) }},
	{"rules-show-test", func(w io.Writer, r Report, s Style) error {
		return RulesShow(w, r.Base, "power-terminals-resistance", s)
	}},
	{"rules-show-repair", func(w io.Writer, r Report, s Style) error { return RulesShow(w, r.Base, "fit-clamp", s) }},
	{"rules-show-caution", func(w io.Writer, r Report, s Style) error { return RulesShow(w, r.Base, "ohms-only-dead", s) }},
	{"rules-show-source", func(w io.Writer, r Report, s Style) error { return RulesShow(w, r.Base, "common-practice", s) }},
	{"rules-checked", func(w io.Writer, r Report, s Style) error {
		return RulesChecked(w, r.Base, knowledge.Problems{{File: "tests.yaml", Line: 3, Column: 1, Key: "fan-turns", Message: "a result has no meaning"}}, s)
	}},
	{"keys", func(w io.Writer, r Report, s Style) error { return Keys(w, frozenKeys(), s) }},
	{"key", func(w io.Writer, r Report, s Style) error { return Keys(w, frozenKeys()[:1], s) }},
	{"shelf", func(w io.Writer, r Report, s Style) error { return Shelf(w, frozenShelf(r), s) }},
	{"demo", func(w io.Writer, r Report, s Style) error { return Demo(w, frozenDemo(r), s) }},
	{"margin-short", func(w io.Writer, r Report, s Style) error { return Margin(w, r.Margin, s) }},
}

// pages are all writers for files and for other programs.
var pages = []output{
	{"rank.json", func(w io.Writer, r Report, _ Style) error { return RankJSON(w, r.Ranking, r.Margin.Needs, r.beside()) }},
	{"next.json", func(w io.Writer, r Report, _ Style) error { return NextJSON(w, r.Next, r.beside()) }},
	{"margin.json", func(w io.Writer, r Report, _ Style) error { return MarginJSON(w, r.Case, r.Margin) }},
	{"discharge.json", func(w io.Writer, r Report, _ Style) error { return DischargeJSON(w, r.Discharge) }},
	{"status.json", func(w io.Writer, r Report, _ Style) error { return StatusJSON(w, statusOfReport(r)) }},
	{"rules.json", func(w io.Writer, r Report, _ Style) error { return RulesJSON(w, r.Base, "") }},
	{"keys.json", func(w io.Writer, r Report, _ Style) error { return KeysJSON(w, frozenKeys()) }},
	{"shelf.json", func(w io.Writer, r Report, _ Style) error { return ShelfJSON(w, frozenShelf(r)) }},
	{"report.json", func(w io.Writer, r Report, _ Style) error { return ReportJSON(w, r) }},
	{"report.md", func(w io.Writer, r Report, _ Style) error { return Markdown(w, r) }},
	{"report.html", func(w io.Writer, r Report, _ Style) error { return HTML(w, r) }},
	{"edge.svg", func(w io.Writer, r Report, _ Style) error { return FigureSVG(w, r.Margin) }},
}

func frozenKeys() []measure.Key {
	return []measure.Key{{Path: "board.bus.nominal", Kind: measure.KindQuantity, Unit: "V", Min: 1, Max: 2000, Help: "bus voltage in normal running", Users: []string{"discharge", "margin"}, Typical: []measure.Typical{{For: "mains", Text: "310 V", Source: "judgement"}}},
		{Path: "board.topology", Kind: measure.KindWord, Words: []string{"half-bridge", "other"}, Help: "how the switches are arranged", Required: true}}
}

func frozenShelf(r Report) []ShelfCase {
	open := *r.Case
	open.Outcome = nil
	return []ShelfCase{{File: "a.yaml", Case: r.Case, Ranking: r.Ranking}, {File: "b.yaml", Case: &open}, {File: "broken.yaml", Problem: "broken.yaml:3:1: unknown key"}}
}

func frozenDemo(r Report) DemoSummary {
	return DemoSummary{Folder: "drivemend-demo", Case: r.Case, Ranking: r.Ranking, Margin: r.Margin, Outside: r.Outside, Report: "drivemend-demo/report.html", Command: "drivemend next drivemend-demo/case.yaml"}
}

// statusOfReport is the status page of what a report holds.
func statusOfReport(r Report) StatusPage {
	return StatusPage{Case: r.Case, At: r.Safety.At, Safety: r.Safety, Record: r.Record, Outside: r.Outside, Stated: 24, Assumed: 1, Needs: r.Margin.Needs}
}

func rendered(t *testing.T, o output, r Report, s Style) string {
	t.Helper()
	var b bytes.Buffer
	if err := o.write(&b, r, s); err != nil {
		t.Fatalf("%s: %v", o.name, err)
	}
	return b.String()
}

func TestGolden(t *testing.T) {
	r := frozen(t)
	for _, o := range terminal {
		golden(t, o.name+".txt", rendered(t, o, r, Style{}))
	}
	for _, o := range pages {
		golden(t, o.name, rendered(t, o, r, Style{}))
	}
	for name, m := range map[string]*stress.Margin{"leg": frozenLeg(), "reservoir": frozenReservoir()} {
		bare := with(r, m)
		if name == "reservoir" {
			bare.Case = nil // no PWM frequency
		}
		golden(t, "margin-"+name+".txt", rendered(t, output{"margin", func(w io.Writer, r Report, s Style) error { return MarginInFull(w, r.Case, r.Margin, s) }}, bare, Style{}))
		golden(t, "margin-"+name+".json", rendered(t, output{"margin.json", func(w io.Writer, r Report, _ Style) error { return MarginJSON(w, r.Case, r.Margin) }}, bare, Style{}))
	}
	golden(t, "report-leg.md", rendered(t, pages[9], with(r, frozenLeg()), Style{}))
	golden(t, "ranking-color.txt", rendered(t, terminal[0], r, Style{Color: true}))
	golden(t, "status-color.txt", rendered(t, terminal[4], r, Style{Color: true}))
}

// TestScreensFit checks every terminal output of the frozen, the real and the hostile case at three widths.
func TestScreensFit(t *testing.T) {
	for name, r := range map[string]Report{"frozen": frozen(t), "real": pump(t), "hostile": hostile(t), "broken": broken(frozen(t)), "leg": with(frozen(t), frozenLeg()), "reservoir": with(frozen(t), frozenReservoir())} {
		for _, o := range terminal {
			if name == "real" && strings.HasPrefix(o.name, "rules-show") {
				continue // the ids are those of the frozen base
			}
			for _, width := range []int{40, 80, 132} {
				text := rendered(t, o, r, Style{Width: width})
				for i, line := range strings.Split(text, "\n") {
					if n := columns(line); n > width {
						t.Errorf("%s, %s, line %d takes %d of %d columns: %s", name, o.name, i+1, n, width, line)
					}
				}
			}
		}
	}
}

// TestScreenHeights keeps the ranking on one screen of 24 lines and the demonstration's ranking in 20.
func TestScreenHeights(t *testing.T) {
	r := pump(t)
	if n := strings.Count(rendered(t, terminal[0], r, Style{}), "\n"); n > 24 {
		t.Errorf("the ranking takes %d lines", n)
	}
	demo, _, _ := strings.Cut(rendered(t, output{write: func(w io.Writer, r Report, s Style) error { return Demo(w, frozenDemo(r), s) }}, r, Style{}), "MARGIN")
	if n := strings.Count(demo, "\n"); n > 20 {
		t.Errorf("the demonstration's ranking takes %d lines, more than 20:\n%s", n, demo)
	}
}

// TestColorSaysNothingNew proves that color carries no meaning of its own: taking it out gives the plain output.
func TestColorSaysNothingNew(t *testing.T) {
	r := frozen(t)
	for _, o := range terminal {
		plainText, colored := rendered(t, o, r, Style{}), rendered(t, o, r, Style{Color: true})
		if strings.Contains(plainText, "\x1b") {
			t.Errorf("%s writes escapes without Color", o.name)
		}
		if stripped(colored) != plainText {
			t.Errorf("%s says something else in color", o.name)
		}
	}
}

func TestSameBytesTwice(t *testing.T) {
	r := pump(t)
	again, err := chain("../testdata/cases/orchard-pump-3.yaml")
	if err != nil {
		t.Fatal(err)
	}
	for _, o := range append(append([]output(nil), terminal...), pages...) {
		if strings.HasPrefix(o.name, "rules-show") {
			continue
		}
		if rendered(t, o, r, Style{}) != rendered(t, o, again, Style{}) {
			t.Errorf("%s differs between two equal cases", o.name)
		}
	}
}

// TestRealCases writes the screens and the page of every real case.
func TestRealCases(t *testing.T) {
	if testing.Short() {
		t.Skip("takes some seconds")
	}
	files, err := filepath.Glob("../testdata/cases/case-*.yaml")
	if err != nil || len(files) == 0 {
		t.Fatalf("%d real cases, %v", len(files), err)
	}
	for _, file := range files {
		r, err := chain(file)
		if err != nil {
			t.Error(err)
			continue
		}
		for _, o := range append(append([]output(nil), terminal[:6]...), pages[8:11]...) {
			text := rendered(t, o, r, Style{})
			for i, line := range strings.Split(text, "\n") {
				if !strings.Contains(o.name, ".") && columns(line) > 80 {
					t.Errorf("%s, %s, line %d takes %d columns", file, o.name, i+1, columns(line))
				}
			}
			if n := strings.Count(text, "\n"); o.name == "ranking" && n > 24 {
				t.Errorf("%s: the ranking takes %d lines", file, n)
			}
		}
	}
}

type failing struct{}

func (failing) Write([]byte) (int, error) { return 0, io.ErrClosedPipe }

func TestWriteErrorsAreReported(t *testing.T) {
	r := frozen(t)
	for _, o := range append(append([]output(nil), terminal...), pages...) {
		if err := o.write(failing{}, r, Style{}); err == nil {
			t.Errorf("%s swallows the error of its writer", o.name)
		}
	}
}

func TestRulesShowNamesTheNearest(t *testing.T) {
	err := RulesShow(io.Discard, frozenBase(), "clamp-mising", Style{})
	if err == nil || !strings.Contains(err.Error(), "clamp-missing") {
		t.Errorf("got %v, want an error that names clamp-missing", err)
	}
}

// TestEmpty writes every page of a case that states nothing.
func TestEmpty(t *testing.T) {
	r := Report{Case: &measure.Case{ID: "x"}, At: time.Time{}}
	for _, o := range []output{{"md", func(w io.Writer, r Report, _ Style) error { return Markdown(w, r) }}, {"html", func(w io.Writer, r Report, _ Style) error { return HTML(w, r) }}, {"json", func(w io.Writer, r Report, _ Style) error { return ReportJSON(w, r) }}} {
		golden(t, "empty."+o.name, rendered(t, o, r, Style{}))
		if o.write(io.Discard, Report{}, Style{}) == nil {
			t.Errorf("%s writes a report without a case", o.name)
		}
	}
}
