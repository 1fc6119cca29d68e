package quantity

import (
	"math"
	"strings"
	"testing"
)

func TestParseReading(t *testing.T) {
	for _, c := range []struct {
		text string
		want Unit
		r    Reading
		show string
	}{
		{"0.4 Ω", Ohm, Reading{Kind: Point, Value: 0.4, Low: 0.4, High: 0.4, Unit: Ohm}, "400 mΩ"},
		{"0.4 Ω", Any, Reading{Kind: Point, Value: 0.4, Low: 0.4, High: 0.4, Unit: Ohm}, "400 mΩ"},
		{"4k7", Ohm, Reading{Kind: Point, Value: 4700, Low: 4700, High: 4700, Unit: Ohm}, "4.7 kΩ"},
		{"4 kΩ to 7 kΩ", Any, Reading{Kind: Between, Value: 5500, Low: 4000, High: 7000, Unit: Ohm}, "4 kΩ to 7 kΩ"},
		{"3", Count, Reading{Kind: Point, Value: 3, Low: 3, High: 3, Unit: Count}, "3"},
		{"> 20 MΩ", Ohm, Reading{Kind: Above, Value: 20e6, Low: 20e6, High: 20e6, Unit: Ohm}, "> 20 MΩ"},
		{">20M", Ohm, Reading{Kind: Above, Value: 20e6, Low: 20e6, High: 20e6, Unit: Ohm}, "> 20 MΩ"},
		{"≥ 20 MΩ", Any, Reading{Kind: Above, Value: 20e6, Low: 20e6, High: 20e6, Unit: Ohm}, "> 20 MΩ"},
		{"above 20 MΩ", Any, Reading{Kind: Above, Value: 20e6, Low: 20e6, High: 20e6, Unit: Ohm}, "> 20 MΩ"},
		{"Over 20 MΩ", Any, Reading{Kind: Above, Value: 20e6, Low: 20e6, High: 20e6, Unit: Ohm}, "> 20 MΩ"},
		{"< 0.2 Ω", Ohm, Reading{Kind: Below, Value: 0.2, Low: 0.2, High: 0.2, Unit: Ohm}, "< 200 mΩ"},
		{"below 5 V", Volt, Reading{Kind: Below, Value: 5, Low: 5, High: 5, Unit: Volt}, "< 5 V"},
		{"above -5 V", Volt, Reading{Kind: Above, Value: -5, Low: -5, High: -5, Unit: Volt}, "> -5 V"},
		{"OL", Ohm, Reading{Kind: Over, Unit: Ohm}, "OL"}, {"OL", Any, Reading{Kind: Over, Unit: Any}, "OL"}, {"ol", Any, Reading{Kind: Over, Unit: Any}, "OL"},
		{"O.L", Volt, Reading{Kind: Over, Unit: Volt}, "OL"}, {"O.L.", Volt, Reading{Kind: Over, Unit: Volt}, "OL"}, {"0L", Ohm, Reading{Kind: Over, Unit: Ohm}, "OL"}, {"0.L", Ohm, Reading{Kind: Over, Unit: Ohm}, "OL"},
		{"over range", Ohm, Reading{Kind: Over, Unit: Ohm}, "OL"}, {"Over-range", Any, Reading{Kind: Over, Unit: Any}, "OL"}, {"overload", Any, Reading{Kind: Over, Unit: Any}, "OL"},
		{"OL MΩ", Any, Reading{Kind: Over, Unit: Ohm}, "OL"}, {"OL V", Volt, Reading{Kind: Over, Unit: Volt}, "OL"},
		{"shorted", Ohm, Reading{Kind: Word, Unit: Any, Word: "shorted"}, "shorted"}, {"Shorted", Any, Reading{Kind: Word, Unit: Any, Word: "shorted"}, "shorted"},
		{"hot", Kelvin, Reading{Kind: Word, Unit: Any, Word: "hot"}, "hot"}, {"open", Volt, Reading{Kind: Word, Unit: Any, Word: "open"}, "open"}, {" one-of-bank ", Any, Reading{Kind: Word, Unit: Any, Word: "one-of-bank"}, "one-of-bank"},
		{"überhitzt", Any, Reading{Kind: Word, Unit: Any, Word: "überhitzt"}, "überhitzt"}, {"oligarch", Any, Reading{Kind: Word, Unit: Any, Word: "oligarch"}, "oligarch"}, {"overheated", Any, Reading{Kind: Word, Unit: Any, Word: "overheated"}, "overheated"},
	} {
		c.r.Text = c.text
		got, err := ParseReading(c.text, c.want)
		if err != nil || got != c.r {
			t.Errorf("ParseReading(%q, %s) = %+v, %v; want %+v", c.text, c.want, got, err, c.r)
		} else if got.String() != c.show {
			t.Errorf("ParseReading(%q, %s) is shown as %q, want %q", c.text, c.want, got, c.show)
		}
	}
}

func TestParseReadingErrors(t *testing.T) {
	for _, c := range []struct {
		text string
		want Unit
		says string
	}{
		{"0.4", Ohm, `"0.4" has no unit, wanted is Ω (resistance); write 0.4 Ω or 0.4 kΩ`},
		{"> 20", Ohm, `"> 20" has no unit, wanted is Ω (resistance); write > 20 Ω or > 20 kΩ`},
		{"> 20 V", Ohm, `"> 20 V" is in V (voltage), wanted is Ω (resistance); write > 20 Ω or > 20 kΩ`},
		{"> 4k7", Any, `"> 4k7" is a code without a unit; write > 4.7 kΩ`},
		{"> 4 kΩ to 6 kΩ", Ohm, `"> 4 kΩ to 6 kΩ" has a limit that is itself an interval; write one limit, like > 20 MΩ, or the interval alone`},
		{">", Ohm, `">" ends where a number belongs; write it like 4.7 Ω or 4.7 kΩ`},
		{"OL V", Ohm, `"OL V" is in V (voltage), wanted is Ω (resistance); write OL`},
		{"kΩ", Ohm, `"kΩ" is a unit without a number; write it like 4.7 Ω or 4.7 kΩ`},
		{"nan", Volt, `"nan" is no reading; write OL if the meter showed over range, else leave it out`},
		{"very hot", Kelvin, `"very hot" has "very" where a number belongs; write it like 4.7 K, OL, or one word with hyphens`},
		{"-", Any, `"-" ends where a number belongs; write a number with its unit, like 310 V`},
		{"", Any, `empty where a value belongs; write a number with its unit, like 310 V`},
		{"> 0,2 Ω", Ohm, `"> 0,2 Ω" has a decimal comma; write > 0.2 Ω`},
	} {
		r, err := ParseReading(c.text, c.want)
		if err == nil {
			t.Errorf("ParseReading(%q, %s) = %+v, want an error", c.text, c.want, r)
		} else if err.Error() != c.says {
			t.Errorf("ParseReading(%q, %s):\n got %s\nwant %s", c.text, c.want, err, c.says)
		}
	}
}

var fuzzSeeds = []string{"310 V", "4k7", "R47", "p47", "2200 µF", "120 nH ±20 %", "120 nH -10/+20 %", "4..6 kΩ", "4–6 kΩ", "-40 to 125 °C", "> 20 MΩ",
	"above 20 MΩ", "< 0.2 Ω", "OL", "O.L", "over range", "shorted", "0,47 Ω", "1e400 V", "1e-400 V", "5 kg m²", "3000 1/min", "±", "..", "4e", "4e-", "-", "+-", "5\xff",
	"\u00a0", "4k", "4k7 Ω to 6k8 Ω", "1 000 000 pF", "℃", "5 %/K", "1 V ±1e308 V", "0L", "İ5", "İ", "S", "Μ", "ſ", "1e9999 h ±1 %", "0 V ±0 %", "4kkk7", "R", "4 to", "to 4 V", "/", "5 /", "5 ·"}

func finite(values ...float64) bool {
	for _, v := range values {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return false
		}
	}
	return true
}

func checkError(t *testing.T, err error) {
	if s := err.Error(); strings.ContainsAny(s, "\n\r") || len(s) > 700 || s != strings.TrimSpace(s) {
		t.Errorf("error is not one short line: %q", s)
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range fuzzSeeds {
		for i := range len(kinds) + 1 {
			f.Add(s, uint8(i))
		}
	}
	f.Fuzz(func(t *testing.T, text string, which uint8) {
		want := append(Units(), Any)[int(which)%(len(kinds)+1)]
		q, err := Parse(text, want)
		if err != nil {
			checkError(t, err)
			return
		}
		if !finite(q.Value, q.Low, q.High) || q.Low > q.Value || q.Value > q.High || q.Text != text || want != Any && q.Unit != want {
			t.Fatalf("Parse(%q, %s) = %+v", text, want, q)
		}
		again, err := Parse(q.String(), q.Unit)
		if err != nil && q.Unit != Count && finite(10*q.Low, 10*q.High) {
			t.Fatalf("Parse(%q) is shown as %q: %v", text, q, err)
		}
		if err == nil && !near(again.Value, q.Value, 0) {
			t.Fatalf("Parse(%q) = %+v is shown as %q, read as %+v", text, q, q, again)
		}
	})
}

func FuzzReading(f *testing.F) {
	for _, s := range fuzzSeeds {
		for i := range len(kinds) + 1 {
			f.Add(s, uint8(i))
		}
	}
	f.Fuzz(func(t *testing.T, text string, which uint8) {
		want := append(Units(), Any)[int(which)%(len(kinds)+1)]
		r, err := ParseReading(text, want)
		if err != nil {
			checkError(t, err)
			return
		}
		if !finite(r.Value, r.Low, r.High) || r.Low > r.High || r.Text != text || r.Kind == Word != (r.Word != "") {
			t.Fatalf("ParseReading(%q, %s) = %+v", text, want, r)
		}
		if again, err := ParseReading(r.String(), want); (r.Kind == Word || r.Kind == Over) && (err != nil || again.Kind != r.Kind || again.Word != r.Word) {
			t.Fatalf("ParseReading(%q) is shown as %q, read as %+v, %v", text, r, again, err)
		}
	})
}
