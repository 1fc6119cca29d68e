package knowledge

import "testing"

func TestConditionHolds(t *testing.T) {
	board := func(path string) (string, float64, bool) {
		switch path {
		case "switch.kind":
			return "igbt", 0, true
		case "bus.nominal":
			return "", 310, true
		}
		return "", 0, false
	}
	tests := []struct {
		name string
		c    Condition
		want bool
	}{
		{"word among several", Condition{Path: "switch.kind", Words: []string{"mosfet", "igbt"}}, true},
		{"another word", Condition{Path: "switch.kind", Words: []string{"mosfet"}}, false},
		{"not stated", Condition{Path: "load.kind", Words: []string{"pump"}}, true},
		{"not stated, number", Condition{Path: "bus.highest", Op: ">", Number: 1e6}, true},
		{"at least, equal", Condition{Path: "bus.nominal", Op: ">=", Number: 310}, true},
		{"at most, equal", Condition{Path: "bus.nominal", Op: "<=", Number: 310}, true},
		{"above, equal", Condition{Path: "bus.nominal", Op: ">", Number: 310}, false},
		{"below, equal", Condition{Path: "bus.nominal", Op: "<", Number: 310}, false},
		{"above", Condition{Path: "bus.nominal", Op: ">", Number: 60}, true},
		{"below", Condition{Path: "bus.nominal", Op: "<", Number: 60}, false},
		{"equal", Condition{Path: "bus.nominal", Op: "=", Number: 310}, true},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := test.c.Holds(board); got != test.want {
				t.Errorf("%+v holds: %v", test.c, got)
			}
		})
	}
	if !Applies(nil, board) {
		t.Error("no condition at all does not apply")
	}
	if Applies([]Condition{tests[0].c, tests[1].c}, board) {
		t.Error("applies although one of two conditions fails")
	}
}

func TestNearest(t *testing.T) {
	b := sample(t)
	tests := []struct {
		kind     Kind
		id, want string
	}{
		{KindCause, "clamp-mising", "clamp-missing"},
		{KindEvent, "swich-shorted", "switch-shorted"},
		{KindEvent, "turn-off-psike", "turn-off-spike"},
		{KindTest, "failure-momment", "failure-moment"},
		{KindRepair, "fit-clamps", "fit-clamp"},
		{KindCaution, "probe-earth", "probe-earth"},
		{KindSource, "field-note", "field-notes"},
		{KindCause, "something-else-entirely", ""},
		{KindCause, "", ""},
		{Kind("drawing"), "fit-clamp", ""},
	}
	for _, test := range tests {
		if got := b.Nearest(test.kind, test.id); got != test.want {
			t.Errorf("nearest %s to %q is %q, want %q", test.kind, test.id, got, test.want)
		}
	}
}
