package reports

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// TestLowerBounds: a camera reading of a surface that reads too cold is shown as the bound that it is, wherever it stands.
func TestLowerBounds(t *testing.T) {
	camera, meter := &knowledge.Test{Instrument: "camera"}, &knowledge.Test{Instrument: "meter"}
	read := func(text string) *quantity.Reading {
		r, err := quantity.ParseReading(text, quantity.Any)
		if err != nil {
			t.Fatal(err)
		}
		return &r
	}
	for _, c := range []struct {
		test                   *knowledge.Test
		reading, surface, want string
	}{
		{camera, "36 °C", "bare-metal", "> 36 °C (lower bound: bare metal)"},
		{camera, "36 °C", "", "> 36 °C (lower bound: surface not stated)"},
		{camera, "36 °C to 44 °C", "bare-metal", "> 36 °C (lower bound: bare metal)"},
		{camera, "> 36 °C", "bare-metal", "> 36 °C (lower bound: bare metal)"},
		{camera, "< 36 °C", "bare-metal", "< 36 °C (as it looked, no bound: bare metal)"},
		{camera, "36 °C", "matt-dot", "36 °C"},
		{camera, "hot", "", "hot"},
		{meter, "36 °C", "", "36 °C"},
		{nil, "36 °C", "", "36 °C"},
	} {
		if got := shownAs(c.test, measure.Observation{Reading: read(c.reading), Surface: c.surface}); got != c.want {
			t.Errorf("%s on %q: %q, want %q", c.reading, c.surface, got, c.want)
		}
	}
	r := job(t)
	r.Outside = []Outside{{3, nil}, {4, nil}, {5, nil}}
	for _, name := range []string{"report.md", "report.html", "report.json"} {
		if text := said(t, r, name); !strings.Contains(text, "> 36 °C (its twin > 35 °C) (lower bound: bare metal)") {
			t.Errorf("%s shows the reading of bare metal as it was read", name)
		}
	}
	if text := said(t, r, "report.md"); !strings.Contains(text, "> 41 °C (lower bound: surface not stated)") || strings.Contains(text, "> 52 °C") {
		t.Error("the report takes the bounds of the wrong readings")
	}
}

// TestEveryEntryOfTheRecordIsShown: nothing that was written down is lost on the way to a page.
func TestEveryEntryOfTheRecordIsShown(t *testing.T) {
	r := job(t)
	want := []string{"Q1 left in", "P. Earlier", "bridged", "found under varnish", "fan", "E07", "the last entry", "E02", "4810 h", "P-12", "the plate says 8 kHz", "P-31", "pictures/as-found.jpg", "e3b0c44298fc", "pictures/q2.jpg", "burst body",
		"opening.csv", "0f1e2d3c4b5a", "warm.csv", "trip at 95 A instead of 80 A", "shunt resoldered; trips at 80 A", "display dead", "to the crane driver", "runs every day", "alone in the shop"}
	for _, name := range []string{"report.md", "report.html", "report.json"} {
		text := strings.ReplaceAll(said(t, r, name), "\\", "")
		for _, w := range want {
			if !strings.Contains(text, w) {
				t.Errorf("%s lacks %q", name, w)
			}
		}
	}
	r.Record = nil
	if text := said(t, r, "report.md"); !strings.Contains(text, "trip at 95 A instead of 80 A") {
		t.Error("without the state of the record its entries are lost")
	}
}

// TestPoweredStepsStandOnTheirConditions: an allowed step under power is shown with the joules of this board and the
// statements that are in force, not with older ones.
func TestPoweredStepsStandOnTheirConditions(t *testing.T) {
	n, r := underPower(t)
	text := nextText(t, r, n)
	for _, want := range []string{"167.3 J", "15:24 for low, current-limited bus: motor uncoupled", "second person", "15:26 for scope: probe with earth clip on the live node, supply isolated, earth clips on the board: 1", "keeps it when power goes off"} {
		if !strings.Contains(text, want) {
			t.Errorf("lacks %q:\n%s", want, text)
		}
	}
	if strings.Contains(text, "alone in the shop") {
		t.Errorf("shows a statement that is not in force:\n%s", text)
	}
	if text := nextText(t, Report{Base: r.Base, Discharge: r.Discharge}, n); strings.Contains(text, "motor uncoupled") {
		t.Errorf("shows a statement of no case:\n%s", text)
	}
}

func nextText(t *testing.T, r Report, n *diagnose.Suggestion) string {
	t.Helper()
	var b bytes.Buffer
	if err := Next(&b, r.Base, n, r.Discharge, Style{}, r.beside()); err != nil {
		t.Fatal(err)
	}
	return strings.Join(strings.Fields(b.String()), " ")
}

// TestInjectionCarriesItsLimits: set before connecting, attended, stop at 40 K.
func TestInjectionCarriesItsLimits(t *testing.T) {
	s := newScreen(Style{})
	r := job(t)
	writeConditions(s, r.beside(), safety.Work{Need: safety.NeedDead, Tool: safety.ToolInjection}, benchTime, r.Discharge)
	text := strings.Join(strings.Fields(s.String()), " ")
	for _, want := range []string{"before connecting", "stay with it", "40 K", "09:20 for injection: other sources off; gates held; limit set before connecting; attended", "a dead check lives 10 minutes"} {
		if !strings.Contains(text, want) {
			t.Errorf("lacks %q: %s", want, text)
		}
	}
}

// TestOutsideIsShortOnTheFirstPage: the first page names two of many missing things, a later one all.
func TestOutsideIsShortOnTheFirstPage(t *testing.T) {
	r := job(t)
	var missing []safety.Missing
	for i := range 7 {
		missing = append(missing, safety.Missing{Point: 3, Text: fmt.Sprintf("thing %d", i)})
	}
	r.Outside = []Outside{{3, missing}}
	first, rest, _ := strings.Cut(said(t, r, "report.md"), "## To the design team")
	if !strings.Contains(first, "hold point 3: thing 0; hold point 3: thing 1; and 5 more") || strings.Contains(first, "thing 2") {
		t.Error("the first page does not stop at two")
	}
	if !strings.Contains(rest, "thing 6") {
		t.Error("the later page does not list all")
	}
}

// TestStatusAsJSONHoldsEverythingMissing: the screen names the first thing, the object all of them.
func TestStatusAsJSONHoldsEverythingMissing(t *testing.T) {
	var b bytes.Buffer
	if err := StatusJSON(&b, halfway(t)); err != nil {
		t.Fatal(err)
	}
	var got struct {
		Works []struct {
			Need    string
			Tool    *string
			Allowed bool
			Missing []struct {
				Point int `json:"hold_point"`
			}
		}
		Record []struct{ Step, Result string }
	}
	if err := json.Unmarshal(b.Bytes(), &got); err != nil {
		t.Fatal(err)
	}
	if w := got.Works[3]; w.Allowed || len(w.Missing) != 3 || w.Missing[2].Point != 4 || *w.Tool != "injection" {
		t.Errorf("the injection reads %+v", w)
	}
	if w := got.Works[4]; !w.Allowed || len(w.Missing) != 0 || w.Tool != nil {
		t.Errorf("the low bus reads %+v", w)
	}
	if r := got.Record[5]; r.Step != "protections-proved" || r.Result != "failed" {
		t.Errorf("the failed step reads %+v", r)
	}
}

// TestFollowUpWords: due, overdue, held and failed, each in words.
func TestFollowUpWords(t *testing.T) {
	due := time.Date(2027, 1, 1, 0, 0, 0, 0, time.UTC)
	up := func(result string, settled bool) []safety.RecordStatus {
		s := safety.RecordStatus{Step: safety.RecordStep{ID: measure.StepFollowedUp}, Due: due, Settled: settled}
		if result != "" {
			s.Last = &measure.StepEntry{Result: result, At: due.AddDate(0, 0, 3)}
		}
		return []safety.RecordStatus{s}
	}
	for _, c := range []struct {
		record []safety.RecordStatus
		at     time.Time
		want   string
	}{
		{up("", false), due.AddDate(0, 0, -1), "due 2027-01-01"},
		{up("", false), due, "DUE since 2027-01-01: ask whether the repair holds"},
		{up("done", true), due.AddDate(0, 1, 0), "done 2027-01-04: the repair held"},
		{up("failed", false), due.AddDate(0, 1, 0), "FAILED 2027-01-04: the repair did not hold"},
		{up("not-possible", true), due.AddDate(0, 1, 0), "not possible 2027-01-04"},
		{up("done", false), due.AddDate(0, 0, -1), "due 2027-01-01"},
		{nil, due, ""},
	} {
		if _, got := followUpWords(c.record, c.at); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}
