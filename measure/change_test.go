package measure

import (
	"strings"
	"testing"
	"time"

	"drivemend/measure/quantity"
)

// tenOClock is a fixed time for entries.
var tenOClock = time.Date(2026, 12, 1, 10, 0, 0, 0, time.FixedZone("", 3600))

// mustParse reads a case that has no fault.
func mustParse(t testing.TB, text string) *File {
	t.Helper()
	f, err := Parse("case.yaml", []byte(text))
	if err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return f
}

const head = "drivemend: 1\ncase: a\n"

// fan adds an observation.
func fan(f *File) error {
	return f.Observe(Observation{Test: "fan-turns", Result: "no", At: tenOClock})
}

// fanItem is that observation as it is written.
const fanItem = "{test: fan-turns, at: 2026-12-01T10:00:00+01:00, result: no}"

// set sets a key.
func set(path, text string) func(*File) error {
	return func(f *File) error { return f.Set(path, text) }
}

// take takes a key out.
func take(path string) func(*File) error { return func(f *File) error { return f.Clear(path) } }

// changeCases are files before and after one change.
var changeCases = []struct {
	name, before string
	change       func(*File) error
	after        string
}{
	{"first observation", head, fan, head + "observations:\n  - " + fanItem + "\n"},
	{"no line end at the end", "drivemend: 1\ncase: a", fan, "drivemend: 1\ncase: a\nobservations:\n  - " + fanItem + "\n"},
	{"empty list in brackets", head + "observations: []  # none yet\nstory: x\n", fan,
		head + "observations:  # none yet\n  - " + fanItem + "\nstory: x\n"},
	{"empty list in brackets over two lines", head + "observations: [\n  ]\nstory: x\n", fan,
		head + "observations: [" + fanItem + "\n  ]\nstory: x\n"},
	{"section with nothing below", head + "observations: # none yet\nstory: x\n", fan,
		head + "observations: # none yet\n  - " + fanItem + "\nstory: x\n"},
	{"section with nothing below at the end", head + "observations:", fan, head + "observations:\n  - " + fanItem + "\n"},
	{"section that says null", head + "observations: null\n", fan, head + "observations:\n  - " + fanItem + "\n"},
	{"after the last entry, its comments kept", head + "observations:\n    -   test: x\n        result: y # sure\n\n    # later\nstory: x\n", fan,
		head + "observations:\n    -   test: x\n        result: y # sure\n    -   " + fanItem + "\n\n    # later\nstory: x\n"},
	{"list at the key's own indentation", head + "observations:\n- {test: x, result: y}\nstory: x\n", fan,
		head + "observations:\n- {test: x, result: y}\n- " + fanItem + "\nstory: x\n"},
	{"list in brackets", head + "observations: [{test: x, result: y}]\n", fan,
		head + "observations: [{test: x, result: y}, " + fanItem + "]\n"},
	{"list in brackets over lines", head + "observations: [\n  {test: x, result: y}, # first\n]\n", fan,
		head + "observations: [\n  {test: x, result: y}, " + fanItem + ", # first\n]\n"},
	{"entry over two lines without indentation", head + "observations:\n  - {test: x,\nresult: y}\nstory: x\n", fan,
		head + "observations:\n  - {test: x,\nresult: y}\n  - " + fanItem + "\nstory: x\n"},
	{"note of several lines", head + "observations:\n  - test: x\n    result: y\n    note: |+\n      a\n      # not a comment\n\nstory: x\n", fan,
		head + "observations:\n  - test: x\n    result: y\n    note: |+\n      a\n      # not a comment\n\n  - " + fanItem + "\nstory: x\n"},
	{"windows line ends", "drivemend: 1\r\ncase: a\r\n", fan, "drivemend: 1\r\ncase: a\r\nobservations:\r\n  - " + fanItem + "\r\n"},
	{"byte order mark", "\uFEFFdrivemend: 1\ncase: a\nobservations: [] \n", fan,
		"\uFEFFdrivemend: 1\ncase: a\nobservations: \n  - " + fanItem + "\n"},
	{"end mark", head + "...\n", fan, head + "observations:\n  - " + fanItem + "\n...\n"},
	{"whole file in braces", "{drivemend: 1, case: a}\n", fan, "{drivemend: 1, case: a, observations: [" + fanItem + "]}\n"},
	{"indentation of the file", head + "board:\n    title: x\n", func(f *File) error { return f.FitLink(tenOClock) },
		head + "board:\n    title: x\nsafety:\n    link:\n        - {fitted: 2026-12-01T10:00:00+01:00}\n"},
	{"safety there, list missing", head + "safety:\n  isolation: []\nstory: x\n", func(f *File) error { return f.FitLink(tenOClock) },
		head + "safety:\n  isolation: []\n  link:\n    - {fitted: 2026-12-01T10:00:00+01:00}\nstory: x\n"},
	{"safety in braces", head + "safety: {isolation: []}\n", func(f *File) error { return f.FitLink(tenOClock) },
		head + "safety: {isolation: [], link: [{fitted: 2026-12-01T10:00:00+01:00}]}\n"},
	{"safety empty", head + "safety:\nstory: x\n", func(f *File) error { return f.FitLink(tenOClock) },
		head + "safety:\n  link:\n    - {fitted: 2026-12-01T10:00:00+01:00}\nstory: x\n"},
	{"link removed", head + "safety:\n  link:\n  - fitted: 2026-12-01T09:00:00+01:00\n", func(f *File) error { return f.RemoveLink(tenOClock) },
		head + "safety:\n  link:\n  - fitted: 2026-12-01T09:00:00+01:00\n    removed: 2026-12-01T10:00:00+01:00\n"},
	{"new value", head + "board: {bus: {nominal: 310 V, esr: 40 mΩ}} # x\n", set("board.bus.nominal", "325 V"),
		head + "board: {bus: {nominal: 325 V, esr: 40 mΩ}} # x\n"},
	{"new value in lines", head + "board:\n  bus:\n    nominal:   310 V   # x\n", set("board.bus.nominal", "325 V"),
		head + "board:\n  bus:\n    nominal:   325 V   # x\n"},
	{"new key in a group", head + "board:\n  bus: {nominal: 310 V}\n  loop: {}\n", set("board.bus.esr", "40 mΩ"),
		head + "board:\n  bus: {nominal: 310 V, esr: 40 mΩ}\n  loop: {}\n"},
	{"new group", head + "board:\n  title: x\nstory: y\n", set("board.switch.kind", "igbt"),
		head + "board:\n  title: x\n  switch: {kind: igbt}\nstory: y\n"},
	{"key in an empty group", head + "board:\n  loop: {}\n", set("board.loop.inductance", "80 nH"),
		head + "board:\n  loop: {inductance: 80 nH}\n"},
	{"first condition", head + "board: {switch: {fall_time: 96 ns}}\n", set("board.switch.fall_time.gate_resistance", "10 Ω"),
		head + "board: {switch: {fall_time: {value: 96 ns, gate_resistance: 10 Ω}}}\n"},
	{"value over conditions", head + "board:\n  switch:\n    fall_time:\n      value: 96 ns\n      voltage: 300 V\n    kind: igbt\n",
		set("board.switch.fall_time", "50 ns"), head + "board:\n  switch:\n    fall_time: 50 ns\n    kind: igbt\n"},
	{"parts", head + "board: {topology: low-side-chopper}\n", set("board.positions.low.parts", "Q1, Q2 Q3"),
		head + "board: {topology: low-side-chopper, positions: {low: {parts: [Q1, Q2, Q3]}}}\n"},
	{"story needs quotes", head, set("story", "It said: bang # twice"), head + "story: 'It said: bang # twice'\n"},
	{"story over a block text", head + "story: |\n  a\n  b\nowner: x\n", set("story", "c\n\"d\""),
		head + "story: \"c\\n\\\"d\\\"\"\nowner: x\n"},
	{"story over several plain lines", head + "story: it ran\n  at full\n  speed # really\nowner: x\n", set("story", "c"),
		head + "story: c # really\nowner: x\n"},
	{"rebuilt", head + "rebuild: {snubber: {kind: rc}}\n", func(f *File) error { return f.MarkRebuilt(tenOClock) },
		head + "rebuild: {snubber: {kind: rc}, done: 2026-12-01T10:00:00+01:00}\n"},
	{"rebuild begun", head, func(f *File) error { return f.SetRebuild("snubber.kind", "rcd") },
		head + "rebuild: {snubber: {kind: rcd}}\n"},
	{"assumed", head + "board: {loop: {inductance: 80 nH}}\n", func(f *File) error { return f.Assume("loop.inductance") },
		head + "board: {loop: {inductance: 80 nH}, assumed: [loop.inductance]}\n"},
	{"assumed of the rebuild", head + "rebuild: {loop: {inductance: 80 nH}}\n", func(f *File) error { return f.Assume("rebuild.loop.inductance") },
		head + "rebuild: {loop: {inductance: 80 nH}, assumed: [loop.inductance]}\n"},
	{"assumed already", head + "board: {loop: {inductance: 80 nH}, assumed: [loop]}\n", func(f *File) error { return f.Assume("loop.inductance") },
		head + "board: {loop: {inductance: 80 nH}, assumed: [loop]}\n"},
	{"settled", head + "board:\n  loop: {inductance: 80 nH, leg: 10 nH, resistance: 1 Ω}\n  assumed: [loop, board.loop]\n",
		func(f *File) error { return f.Settle("loop.leg") },
		head + "board:\n  loop: {inductance: 80 nH, leg: 10 nH, resistance: 1 Ω}\n  assumed: [loop.inductance, loop.resistance]\n"},
	{"settled, the last", head + "board:\n  loop: {inductance: 80 nH}\n  assumed:\n    - loop.inductance\n", func(f *File) error { return f.Settle("loop.inductance") },
		head + "board:\n  loop: {inductance: 80 nH}\n"},
	{"cleared, first of two", head + "board: {bus: {nominal: 310 V, esr: 40 mΩ}}\n", take("board.bus.nominal"),
		head + "board: {bus: {esr: 40 mΩ}}\n"},
	{"cleared, last of two", head + "board: {bus: {nominal: 310 V, esr: 40 mΩ}}\n", take("board.bus.esr"),
		head + "board: {bus: {nominal: 310 V}}\n"},
	{"cleared lines", head + "board:\n  bus:\n    esr: 40 mΩ\n    nominal: 310 V # x\nstory: y\n", take("board.bus"),
		head + "board:\nstory: y\n"},
	{"cleared what is not there", head, take("board.bus"), head},
	{"energised", head, func(f *File) error { return f.Energise(Energised{What: "shaft", At: tenOClock}) },
		head + "safety:\n  energised:\n    - {what: shaft, at: 2026-12-01T10:00:00+01:00}\n"},
	{"isolated", head, func(f *File) error {
		return f.Isolate(Isolation{Locked: true, Motor: "unplugged", OtherSources: "none", At: tenOClock})
	}, head + "safety:\n  isolation:\n    - {locked: yes, motor: unplugged, other_sources: none, at: 2026-12-01T10:00:00+01:00}\n"},
	{"checked dead", head, func(f *File) error {
		dc, err := quantity.Parse("0.4 V", quantity.Volt)
		if err != nil {
			return err
		}
		return f.Check(DeadCheck{Point: "bus", DC: dc, AC: quantity.Of(0, quantity.Volt), MeterProved: true, At: tenOClock})
	}, head + "safety:\n  dead_checks:\n    - {point: bus, dc: 0.4 V, ac: 0 V, meter_proved: yes, at: 2026-12-01T10:00:00+01:00}\n"},
}

func TestChanges(t *testing.T) {
	for _, tt := range changeCases {
		t.Run(tt.name, func(t *testing.T) {
			f := mustParse(t, tt.before)
			if err := tt.change(f); err != nil {
				t.Fatal(err)
			}
			if got := string(f.Bytes()); got != tt.after {
				t.Errorf("got\n%s\nwant\n%s", got, tt.after)
			}
		})
	}
}

func TestObservationComesBack(t *testing.T) {
	f := mustParse(t, head+"board: {topology: h-bridge, positions: {a-low: {parts: [Q1, Q2]}}}\n")
	reading := quantity.Reading{Kind: quantity.Above, Low: 20e6, Value: 20e6, High: 20e6, Unit: quantity.Ohm, Text: "> 20 MΩ"}
	twin := quantity.Reading{Kind: quantity.Word, Word: "shorted", Unit: quantity.Any}
	want := Observation{Test: "power-terminals-resistance", Part: "Q2", Position: "a-low", At: tenOClock, Reading: &reading, Twin: &twin,
		Seen: "at-bench", Polarity: "reverse", State: "lifted", Motor: "off", Instrument: "meter, the old one", Accuracy: 0.015,
		Range: 20e6, Note: "brown: #2, [R14]"}
	if err := f.Observe(want); err != nil {
		t.Fatal(err)
	}
	got := f.Case.Observations[0]
	if got.Reading.Kind != quantity.Above || got.Reading.Text != "> 20 MΩ" || got.Twin.Word != "shorted" {
		t.Errorf("readings came back as %+v, %+v", got.Reading, got.Twin)
	}
	got.Reading, got.Twin, got.Line = want.Reading, want.Twin, 0
	if !got.At.Equal(want.At) {
		t.Errorf("time came back as %v", got.At)
	}
	got.At = want.At
	if got != want {
		t.Errorf("came back as\n%+v\nwant\n%+v\nin\n%s", got, want, f.Bytes())
	}
}

// TestWrittenReadings proves that a reading without a text is written out so that it reads the same.
func TestWrittenReadings(t *testing.T) {
	for _, want := range []quantity.Reading{
		{Kind: quantity.Point, Value: 0.4, Low: 0.4, High: 0.4, Unit: quantity.Ohm},
		{Kind: quantity.Between, Value: 5e3, Low: 4e3, High: 6e3, Unit: quantity.Ohm},
		{Kind: quantity.Above, Value: 20e6, Low: 20e6, High: 20e6, Unit: quantity.Ohm},
		{Kind: quantity.Below, Value: 0.2, Low: 0.2, High: 0.2, Unit: quantity.Volt},
		{Kind: quantity.Over, Unit: quantity.Any},
		{Kind: quantity.Word, Word: "hot", Unit: quantity.Any},
	} {
		f := mustParse(t, head)
		if err := f.Observe(Observation{Test: "x", Reading: &want}); err != nil {
			t.Errorf("%+v: %v", want, err)
			continue
		}
		got := *f.Case.Observations[0].Reading
		if got.Kind != want.Kind || got.Word != want.Word || got.Unit != want.Unit ||
			want.Kind != quantity.Above && got.High != want.High && want.High != 0 || want.Kind != quantity.Below && got.Low != want.Low && want.Low != 0 {
			t.Errorf("%+v came back as %+v", want, got)
		}
	}
}

func TestRefusedChangesChangeNothing(t *testing.T) {
	before := head + "board: {topology: low-side-chopper, bus: {nominal: 310 V}}\nobservations:\n  - {test: x, result: y}\n"
	tests := []struct {
		name   string
		change func(*File) error
		want   string
	}{
		{"unknown key", func(f *File) error { return f.SetBoard("swich.kind", "igbt") }, "swich.kind: unknown key; nearest is board.switch.kind"},
		{"entry of a list", set("locate.low.rises.part", "Q1"), "locate.low.rises.part: unknown key"},
		{"entry of the record", set("steps.result", "done"), "steps.result: unknown key"},
		{"group", func(f *File) error { return f.SetBoard("bus", "310 V") }, "holds other keys"},
		{"wrong unit", func(f *File) error { return f.SetBoard("bus.esr", "40 V") }, "board.bus.esr"},
		{"contradiction", func(f *File) error { return f.SetBoard("bus.highest", "200 V") }, "contradicts board.bus.nominal 310 V"},
		{"no answer", func(f *File) error { return f.Observe(Observation{Test: "x"}) }, "exactly one of"},
		{"no such part", func(f *File) error { return f.Observe(Observation{Test: "x", Result: "y", Part: "Q9"}) }, "no part Q9"},
		{"no link", func(f *File) error { return f.RemoveLink(tenOClock) }, "no link is fitted"},
		{"not text", func(f *File) error { return f.SetStory("a\xffb") }, "not UTF-8"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			f := mustParse(t, before)
			was := f.Case
			err := tt.change(f)
			if _, ok := err.(Problems); !ok || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if string(f.Bytes()) != before || f.Case != was {
				t.Error("the refused change left a trace")
			}
		})
	}
}
