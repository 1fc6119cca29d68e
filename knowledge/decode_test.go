package knowledge

import (
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"drivemend/measure/quantity"
)

func TestSampleCauses(t *testing.T) {
	b := sample(t)
	c := b.Cause("clamp-missing")
	if c == nil {
		t.Fatal("clamp-missing is lost")
	}
	want := Cause{
		ID: "clamp-missing", Title: "No working snubber or clamp", Role: "latent",
		Applies: []Condition{{Path: "switch.kind", Words: []string{"igbt", "mosfet", "sic-mosfet"}}},
		Share: map[string]Band{
			"dc":     {4, 7.2, 11, "judgement", ""},
			"mains":  {3, 4.5, 7, "judgement", ""},
			"repeat": {6, 10.2, 16, "judgement", ""},
		},
		LeadsTo: []Link{{To: "turn-off-spike", P: Band{0.9, 0.97, 0.99, "judgement", ""}, Line: 6}},
		Answers: map[string]map[string]Band{
			"failure-moment": {"turn-off": {0.3, 0.5, 0.7, "judgement", ""}},
			"dead-parts":     {"one-of-bank": {0.25, 0.4, 0.6, "judgement", ""}},
		},
		Repair: "fit-clamp", File: "sample/causes.yaml", Line: 1,
	}
	if !reflect.DeepEqual(*c, want) {
		t.Errorf("got  %+v\nwant %+v", *c, want)
	}
	other := b.Cause("parts-mismatched")
	if got := other.Share["dc"]; got != (Band{2, 3, 5, "read", "field-notes"}) {
		t.Errorf("long form of a band: %+v", got)
	}
	if got := other.Share["mains"]; got != (Band{3, 3, 3, "memory", ""}) {
		t.Errorf("long form with one number: %+v", got)
	}
	if got := other.LeadsTo[0].P; got != (Band{1, 1, 1, "judgement", ""}) {
		t.Errorf("a certain link: %+v", got)
	}
	if got := other.Factors; got["early"] != 1.5 || got["aged"] != 0.5 {
		t.Errorf("factors: %v", got)
	}
	if got := b.Unlisted["repeat"]; got != (Band{4, 6, 9, "judgement", ""}) {
		t.Errorf("share of unlisted: %+v", got)
	}
	if b.Cause("unlisted") != nil {
		t.Error("unlisted is among the causes")
	}
}

func TestSampleConditions(t *testing.T) {
	want := []Condition{
		{Path: "positions.parallel", Op: ">=", Number: 2},
		{Path: "bus.nominal", Op: ">", Number: 24, Unit: quantity.Volt},
		{Path: "freewheel.fitted", Words: []string{"yes"}},
	}
	if got := sample(t).Cause("parts-mismatched").Applies; !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, want %+v", got, want)
	}
}

func TestSampleEvents(t *testing.T) {
	b := sample(t)
	// driver-dead stands first in faults.yaml but is a child of switch-shorted.
	want := []string{"turn-off-spike", "switch-shorted", "driver-dead", "gate-leaky", "no-control"}
	if got := b.IDs(KindEvent); !reflect.DeepEqual(got, want) {
		t.Errorf("order %v, want %v", got, want)
	}
	for id, layer := range map[string]Layer{"turn-off-spike": Stress, "switch-shorted": Fault, "no-control": Sign} {
		if got := b.Event(id).Layer; got != layer {
			t.Errorf("%s is a %s, want a %s", id, got, layer)
		}
	}
	if e := b.Event("gate-leaky"); e.Of != "switch" || e.Repair != "match-parts" || e.Title != "Gate oxide leaky" {
		t.Errorf("gate-leaky: %+v", e)
	}
	if title := b.Event("switch-shorted").Title; title != "switch shorted" {
		t.Errorf("derived title %q", title)
	}
}

func TestSampleTests(t *testing.T) {
	b := sample(t)
	terminals := b.Test("power-terminals-resistance")
	wantResults := []Result{
		{ID: "shorted", Median: 0.5, Times: 3}, {ID: "leaky", Median: 5e3, Times: 6}, {ID: "blocking", Median: 20e6, Times: 5},
	}
	if !reflect.DeepEqual(terminals.Results, wantResults) {
		t.Errorf("results %+v", terminals.Results)
	}
	if terminals.Observes != "switch-shorted" || terminals.Per != "part" || terminals.Unit != quantity.Ohm {
		t.Errorf("%+v", terminals)
	}
	if p := terminals.Absent["blocking"].Mid; p != 0.979 {
		t.Errorf("absent row: blocking %g", p)
	}
	if r := b.Test("gate-resistance").Result("good"); r.Expected != "expected.gate_bleed" || r.Median != 0 || r.Times != 1.3 {
		t.Errorf("expected value as median: %+v", r)
	}
	moment := b.Test("failure-moment")
	if !reflect.DeepEqual(moment.Silent, []string{"nobody-there"}) || len(moment.Results) != 9 || moment.Results[3].ID != "deceleration" {
		t.Errorf("nominal test: %+v", moment)
	}
	if p := b.Test("dead-parts"); p.PatternOf != "power-terminals-resistance" || p.Nominal["both-of-leg"].Mid != 0.3 {
		t.Errorf("pattern test: %+v", p)
	}
	if p := b.Test("predicted-peak"); p.Computed != "turn_off.peak_over_rated" || p.ReplacedBy != "scoped-overshoot" || p.Minutes != 0 || p.Needs != "question" {
		t.Errorf("computed test: %+v", p)
	}
	repair := b.Test("after-repair")
	wantAnswer := &AnsweredBy{Path: "history", Results: map[string]string{"failed-after-repair": "yes", "first-failure": "no", "never-worked": "no"}}
	if !reflect.DeepEqual(repair.AnsweredBy, wantAnswer) || repair.UsedIn != "prior" {
		t.Errorf("answered test: %+v", repair)
	}
	if o := b.Test("scoped-overshoot"); !o.Must || o.Needs != "low-bus" || o.Group != "overshoot" || o.Results[2].Times != 0 || o.Result("low").Means != "close to the bus" {
		t.Errorf("full entry: %+v", o)
	}
}

// TestMissingNeeds shows that a test which does not say what it needs waits behind the hold points.
func TestMissingNeeds(t *testing.T) {
	if got := sample(t).Test("driver-look"); got.Needs != "dead" || got.Minutes != 5 {
		t.Errorf("needs %q, %g minutes; want dead, 5", got.Needs, got.Minutes)
	}
}

func TestAnswersTakeTheRest(t *testing.T) {
	tests := []struct{ name, row, want string }{
		{"part of the results", "{yes: 0.3}", ""},
		{"silent keeps its default", "{yes: 0.3, no: 0.7}", ""},
		{"too much", "{yes: 0.3, no: 0.8}", "sum to 1.1; expected at most 1"},
		{"the rest is silent or never happens", "{yes: 0.3, no: 0.6}", "sum to 0.9, and no other result can take up the rest; expected 1"},
	}
	const entry = `
- id: damp
  role: latent
  share: {dc: 1, mains: 1, repeat: 1}
  answers: {rained: %s}
  repair: fit-clamp
`
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			_, err := over(map[string]string{
				"causes.yaml": fmt.Sprintf(entry, test.row),
				"tests.yaml":  "- {id: rained, nominal: {yes: 0.2, no: 0.7, maybe: 0, forgotten: 0.1}, silent: [forgotten]}",
			})
			if test.want == "" && err != nil || test.want != "" && (err == nil || !strings.Contains(err.Error(), test.want)) {
				t.Errorf("got %v, want %q", err, test.want)
			}
		})
	}
}

func TestNumbers(t *testing.T) {
	tests := []struct {
		text string
		want float64
		ok   bool
	}{
		{"0.5", 0.5, true}, {".5", 0.5, true}, {"5.", 5, true}, {"1e-3", 1e-3, true}, {"-2", -2, true}, {"+2", 2, true},
		{"0x10", 0, false}, {"1_000", 0, false}, {"nan", 0, false}, {".inf", 0, false}, {"inf", 0, false},
		{"1e999", 0, false}, {"0,5", 0, false}, {"", 0, false}, {"1:30", 0, false}, {"½", 0, false},
	}
	for _, test := range tests {
		got, ok := parseNumber(test.text)
		if ok != test.ok || ok && math.Abs(got-test.want) > 0 {
			t.Errorf("parseNumber(%q) = %g, %v; want %g, %v", test.text, got, ok, test.want, test.ok)
		}
	}
}
