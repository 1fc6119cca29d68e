package knowledge

import (
	"reflect"
	"strings"
	"testing"
)

// observing is a test of the driver with room for more keys.
const observing = "- {id: driver-smell, observes: driver-dead, present: {burnt: 0.9, none: 0.1}, absent: {burnt: 0.1, none: 0.9}, "

func TestTestForms(t *testing.T) {
	tests := []struct{ name, entry, want string }{
		{"results as a list", observing + "results: [none, burnt]}", ""},
		{"a result twice", observing + "results: [none, burnt, none]}", "results[3]: the result none stands twice"},
		{"a result that is no id", observing + "results: [None, burnt]}", `"None" is no id`},
		{"a list that is none", observing + "cautions: probe-earth}", "expected a list; write it in square brackets"},
		{"words beside numbers", observing + "unit: volt, results: {burnt: {median: 5 V, times: 2}, none: named}}", ""},
		{"words only, with a unit", observing + "unit: volt, results: [burnt, none]}", "at least one result with median and times"},
		{"an interval as median", observing + "unit: volt, results: {burnt: {median: 5 V ±10 %, times: 2}, none: named}}", "is an interval; expected one value"},
		{"true as yes", observing + "must: true}", ""},
		{"an empty text", observing + "title: ' '}", "title: is an empty text"},
		{"a list as text", observing + "title: [a]}", "title: is a list; expected a text"},
		{"a key that is a list", observing + "? [a] : b}", "a key is a list; expected a word"},
		{"a result name that is no id", observing + "unit: volt, results: {Burnt: {median: 5 V, times: 2}, none: named}}", "is no id of a result"},
		{"an empty row", "- {id: driver-smell, nominal: {}}", "nominal: names no result"},
		{"a row with bad names", "- {id: driver-smell, nominal: {Burnt: 0.5, none: 0.5}}", "is no id of a result"},
		{"group as number", observing + "minutes: {a: 1}}", "is a group of keys; expected a number"},
		{"decimal comma in quotes", observing + "minutes: '2,5'}", "expected a number; write 2.5 without quotes"},
		{"a very long word", observing + "unit: " + strings.Repeat("v", 500) + "}", "…\" is no unit"},
		{"answered by a list", observing + "answered_by: [a]}", "answered_by: is a list; expected keys"},
		{"answered by yes or no", observing + "answered_by: {freewheel.fitted: {true: none, false: burnt}}}", ""},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			_, err := over(map[string]string{"tests.yaml": test.entry})
			if test.want == "" && err != nil || test.want != "" && (err == nil || !strings.Contains(err.Error(), test.want)) {
				t.Errorf("got %v, want %q", err, test.want)
			}
		})
	}
}

func TestAnsweredByYesNo(t *testing.T) {
	b, err := over(map[string]string{"tests.yaml": observing + "answered_by: {freewheel.fitted: {true: none, no: burnt}}}"})
	if err != nil {
		t.Fatal(err)
	}
	want := &AnsweredBy{Path: "freewheel.fitted", Results: map[string]string{"yes": "none", "no": "burnt"}}
	if got := b.Test("driver-smell").AnsweredBy; !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, want %+v", got, want)
	}
}

func TestSyntaxHints(t *testing.T) {
	tests := []struct{ name, file, want string }{
		{"tab", "- id: a\n\tleak: 1\n", "indent with spaces"},
		{"bare sign", "- {id: a, leak: > 2}\n", "in quotes"},
		{"colon", "- id: a\n  note: first: second\n", "put a text that holds a colon and a space in quotes"},
		{"unknown alias", "- {id: a, leak: *b}\n", "no valid YAML near this line"},
		{"no text at all", "\xff\xfe\xfd", "no valid YAML"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			_, err := over(map[string]string{"signs.yaml": test.file})
			if err == nil || !strings.Contains(err.Error(), test.want) || !strings.HasPrefix(err.Error(), "shop/signs.yaml") {
				t.Errorf("got %v, want %q", err, test.want)
			}
		})
	}
}

// TestOtherFilesStillReport shows that one unreadable file hides neither the faults of the others nor adds
// missing ids that are only missing because of it.
func TestOtherFilesStillReport(t *testing.T) {
	_, err := over(map[string]string{
		"faults.yaml": "- {id: a",
		"signs.yaml":  "- {id: b, leek: 1}",
		"causes.yaml": "- {id: c, role: trigger, share: {dc: 1, mains: 1, repeat: 1}, leads_to: {a: 1}, repair: fit-clamp}",
	})
	if err == nil {
		t.Fatal("loads")
	}
	if lines := strings.Split(err.Error(), "\n"); len(lines) != 2 || !strings.Contains(lines[0], "faults.yaml") || !strings.Contains(lines[1], "did you mean leak?") {
		t.Errorf("got\n%v", err)
	}
}

func TestLookups(t *testing.T) {
	b := sample(t)
	if b.Repair("fit-clamp") == nil || b.Caution("probe-earth") == nil || b.Source("field-notes") == nil {
		t.Error("an entry is not found by its id")
	}
	if b.Cause("x") != nil || b.Event("x") != nil || b.Test("x") != nil || b.Repair("x") != nil || b.Caution("x") != nil || b.Source("x") != nil {
		t.Error("an id without entry is found")
	}
}
