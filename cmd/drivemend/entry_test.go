package main

import (
	"strings"
	"testing"

	"drivemend/diagnose"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

var (
	ohms   = &knowledge.Test{ID: "terminals", Unit: quantity.Ohm, Per: "part", Results: []knowledge.Result{{ID: "shorted", Median: 0.5, Times: 3}, {ID: "leaky", Median: 5e3, Times: 6}, {ID: "blocking", Median: 20e6, Times: 5}}}
	ratios = &knowledge.Test{ID: "esr", Unit: quantity.Ratio, Results: []knowledge.Result{{ID: "good", Median: 1, Times: 1.35}, {ID: "high", Median: 3.5, Times: 1.6}, {ID: "none-fitted"}}}
	looks  = &knowledge.Test{ID: "fan", Results: []knowledge.Result{{ID: "turns"}, {ID: "stopped"}}}
)

func TestAnswerTo(t *testing.T) {
	for _, c := range []struct {
		test *knowledge.Test
		text string
		want string // result, answer, or the reading as it goes into the file
		says string // of the error
	}{
		{ohms, "0.4", "0.4 Ω", ""},
		{ohms, " 0.4 ohm ", "0.4 ohm", ""},
		{ohms, "4k7", "4.7 kΩ", ""},
		{ohms, "OL", "OL", ""},
		{ohms, "> 20", "> 20 Ω", ""},
		{ohms, "above 20 MΩ", "above 20 MΩ", ""},
		{ohms, "Shorted", "shorted", ""},
		{ohms, "skipped", "skipped", ""},
		{ohms, "later", "later", ""},
		{ohms, "3 V", "", "wanted is Ω"},
		{ohms, "short", "", `no result "short"`},
		{ohms, "", "", ""},
		{ohms, "0,4", "", ""},
		{ratios, "1.2", "120 %", ""},
		{ratios, "0.98", "98 %", ""},
		{ratios, "> 3", "> 300 %", ""},
		{ratios, "115 %", "115 %", ""},
		{ratios, "none-fitted", "none-fitted", ""},
		{ratios, "3 Ω", "", "wanted is"},
		{looks, "stopped", "stopped", ""},
		{looks, "3", "", `no result "3"`},
		{looks, "stoped", "", "has no result"},
	} {
		o, err := answerTo(c.test, c.text)
		got := o.Result + o.Answer
		if o.Reading != nil {
			got = o.Reading.Text
		}
		if c.want == "" {
			if err == nil || !strings.Contains(err.Error(), c.says) {
				t.Errorf("%s %q gives %q, error %v; want an error with %q", c.test.ID, c.text, got, err, c.says)
			}
			continue
		}
		if err != nil || strings.TrimSpace(got) != c.want {
			t.Errorf("%s %q gives %q, %v; want %q", c.test.ID, c.text, got, err, c.want)
		}
	}
}

// FuzzAnswerTo proves that whatever is typed is either refused or can stand in a case file and be read back.
func FuzzAnswerTo(f *testing.F) {
	for _, seed := range []string{"0.4", "4k7", "OL", "> 3", "1e99", "-0", "\x00", "shorted", "98 %", "1..2", "9" + strings.Repeat("0", 400)} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		for _, test := range []*knowledge.Test{ohms, ratios, looks} {
			o, err := answerTo(test, text)
			if err != nil || o.Reading == nil {
				continue
			}
			diagnose.ReadAs(test, measure.Board{}, o)
			back, err := quantity.ParseReading(o.Reading.Text, quantity.Any)
			if err != nil {
				t.Fatalf("%q is taken as %q, which cannot be read back: %v", text, o.Reading.Text, err)
			}
			if back.Kind != o.Reading.Kind {
				t.Fatalf("%q is taken as %q, another kind of reading", text, o.Reading.Text)
			}
		}
	})
}

func FuzzCheckReadings(f *testing.F) {
	for _, seed := range []string{"0.4 0 yes", "0,4", "1e400", "..", "-", "5V5V5V"} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		read, err := checkReadings(text)
		if err == nil && (len(read) < 1 || len(read) > 2 || read[0].Unit != quantity.Volt) {
			t.Fatalf("%q gives %v", text, read)
		}
	})
}

func TestReadAs(t *testing.T) {
	point := func(v float64) quantity.Reading {
		return quantity.Reading{Value: v, Low: v, High: v, Unit: quantity.Ohm}
	}
	for _, c := range []struct {
		r    quantity.Reading
		want string
	}{
		{point(0.4), "shorted >99 %"},
		{point(50), "leaky 45 %, misread 31 %, shorted 25 %"},
		{point(0), "shorted >99 %"}, // a display of nothing is below the least it can show
		{quantity.Reading{Kind: quantity.Over, Unit: quantity.Ohm}, "blocking >99 %"},
		{quantity.Reading{Kind: quantity.Above, Low: 1e6, High: 1e6, Value: 1e6, Unit: quantity.Ohm}, "blocking"},
		{quantity.Reading{Kind: quantity.Below, Low: 0.2, High: 0.2, Value: 0.2, Unit: quantity.Ohm}, "shorted >99 %"},
		{quantity.Reading{Kind: quantity.Word, Word: "shorted"}, ""},
	} {
		got := sharesText(diagnose.ReadAs(ohms, measure.Board{}, measure.Observation{Reading: &c.r}))
		if first, _, _ := strings.Cut(c.want, " "); !strings.HasPrefix(got, first) || (c.want == "") != (got == "") {
			t.Errorf("%v reads as %q, want %q", c.r.Value, got, c.want)
		}
	}
	bleed := &knowledge.Test{Unit: quantity.Ohm, Results: []knowledge.Result{{ID: "good", Expected: "expected.gate_bleed", Times: 1.3}}}
	five := point(5)
	if got := diagnose.ReadAs(bleed, measure.Board{}, measure.Observation{Reading: &five}); got != nil {
		t.Errorf("a reading that is compared with a board value is judged without it: %v", got)
	}
}

func TestPlace(t *testing.T) {
	board := measure.Board{}.WithWord("topology", "half-bridge").WithParts("high", "Q1").WithParts("low", "Q2", "Q3")
	single := measure.Board{}.WithWord("topology", "low-side-chopper")
	for _, c := range []struct {
		board          measure.Board
		part, position string
		want           string // part/position
	}{
		{board, "Q2", "", "Q2/"}, {board, "", "low", "/low"}, {board, "Q3", "low", "Q3/low"}, {board, "Q1", "low", ""},
		{board, "Q4", "", ""}, {board, "", "middle", ""}, {board, "", "", ""}, {single, "", "", "/low"},
	} {
		var o measure.Observation
		err := place([]measure.Board{c.board}, ohms, &o, c.part, c.position)
		if got := o.Part + "/" + o.Position; (err != nil) != (c.want == "") || err == nil && got != c.want {
			t.Errorf("%q %q gives %q, %v; want %q", c.part, c.position, got, err, c.want)
		}
	}
}

func TestShows(t *testing.T) {
	chopper := measure.Board{}.WithWord("topology", "low-side-chopper")
	bridge := measure.Board{}.WithWord("topology", "h-bridge")
	half := measure.Board{}.WithWord("topology", "half-bridge")
	three := chopper.WithParts("low", "Q1", "Q2", "Q3")
	for _, c := range []struct {
		board measure.Board
		want  string
	}{
		{chopper, "whole-bank"},
		{three, "one-of-bank some-of-bank whole-bank"},
		{three.WithParts("low", "Q1", "Q2"), "one-of-bank whole-bank"},
		{half, "whole-bank both-of-leg"},
		{bridge, "whole-bank both-of-leg several-legs"},
	} {
		var got []string
		got = append(got, diagnose.Shows(c.board)...)
		if strings.Join(got, " ") != c.want {
			t.Errorf("%s shows %v, want %s", namesOf(c.board.Positions()), got, c.want)
		}
	}
}
