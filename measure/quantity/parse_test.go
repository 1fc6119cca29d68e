package quantity

import (
	"math"
	"strings"
	"testing"
)

// The values are compared exactly: 2200 µF must be the float64 nearest to 2200e-6.
func TestParseValues(t *testing.T) {
	for _, c := range []struct {
		text string
		want Unit
		si   float64
	}{
		{"310 V", Volt, 310}, {"310V", Volt, 310}, {"1.2 kV", Volt, 1200}, {"1.2 mV", Volt, 1.2e-3}, {"-15 V", Volt, -15},
		{"\u221215 V", Volt, -15}, {"+15 V", Volt, 15}, {"310\u00a0V", Volt, 310}, {"310\u2009V", Volt, 310}, {"310\u202fV", Volt, 310},
		{" 310 V ", Volt, 310}, {"0.0 V", Volt, 0}, {"-0 V", Volt, 0}, {"3e2 V", Volt, 300}, {"3E-3 V", Volt, 3e-3},
		{"40 A", Ampere, 40}, {"1 mA", Ampere, 1e-3}, {"5 µA", Ampere, 5e-6}, {"10 nA", Ampere, 10e-9}, {"2 kA", Ampere, 2000},
		{"100 kΩ", Ohm, 100e3}, {"100 k\u2126", Ohm, 100e3}, {"100 kohm", Ohm, 100e3}, {"100 kOhm", Ohm, 100e3}, {"4.7 KΩ", Ohm, 4700},
		{"0.5 ohm", Ohm, 0.5}, {".5 Ohm", Ohm, 0.5}, {"40 mΩ", Ohm, 40e-3}, {"40 MΩ", Ohm, 40e6}, {"1 GΩ", Ohm, 1e9}, {"5 µΩ", Ohm, 5e-6},
		{"47 K", Ohm, 47e3}, {"4.7 k", Ohm, 4700}, {"4.7k", Ohm, 4700}, {"4.7 k ohm", Ohm, 4700}, {"20M", Ohm, 20e6},
		{"2200 µF", Farad, 2200e-6}, {"2200 \u03bcF", Farad, 2200e-6}, {"2200 uF", Farad, 2200e-6}, {"2200uF", Farad, 2200e-6},
		{"2\u2009200 µF", Farad, 2200e-6}, {"2 200 µF", Farad, 2200e-6}, {"1 000 000 pF", Farad, 1e-6}, {"2.2 mF", Farad, 2.2e-3},
		{"250 pF", Farad, 250e-12}, {"22 nF", Farad, 22e-9}, {"1 F", Farad, 1}, {"100n", Farad, 100e-9}, {"100 n", Farad, 100e-9},
		{"120 nH", Henry, 120e-9}, {"3 µH", Henry, 3e-6}, {"5 mH", Henry, 5e-3}, {"2 H", Henry, 2}, {"4u7", Henry, 4.7e-6}, {"100n", Henry, 100e-9},
		{"2m2", Henry, 2.2e-3},
		{"96 ns", Second, 96e-9}, {"100 ps", Second, 100e-12}, {"5 µs", Second, 5e-6}, {"5 us", Second, 5e-6}, {"2 ms", Second, 2e-3},
		{"3 s", Second, 3}, {"10 min", Second, 600}, {"5200 h", Second, 5200 * 3600}, {"30 d", Second, 30 * 86400}, {"2 days", Second, 2 * 86400},
		{"8 kHz", Hertz, 8000}, {"50 Hz", Hertz, 50}, {"12 MHz", Hertz, 12e6}, {"1 GHz", Hertz, 1e9},
		{"50 W", Watt, 50}, {"1.5 kW", Watt, 1500}, {"250 mW", Watt, 0.25}, {"30 mJ", Joule, 30e-3}, {"132 J", Joule, 132}, {"1 kJ", Joule, 1000},
		{"0.9 µC", Coulomb, 0.9e-6}, {"60 nC", Coulomb, 60e-9}, {"6.1 K", Kelvin, 6.1}, {"47K", Kelvin, 47}, {"300 mK", Kelvin, 0.3},
		{"6 \u212a", Kelvin, 6}, {"25 °C", Celsius, 25}, {"25℃", Celsius, 25}, {"-40 °C", Celsius, -40}, {"85 degC", Celsius, 85}, {"85 ºC", Celsius, 85},
		{"0.45 K/W", KelvinPerWatt, 0.45}, {"450 mK/W", KelvinPerWatt, 0.45}, {"0.45 °C/W", KelvinPerWatt, 0.45},
		{"15 V/ns", VoltPerSecond, 15e9}, {"500 V/µs", VoltPerSecond, 500e6}, {"5 kV/us", VoltPerSecond, 5e9}, {"2 V/ms", VoltPerSecond, 2000}, {"1 V/s", VoltPerSecond, 1},
		{"1000 A/µs", AmperePerSecond, 1e9}, {"2 A/ns", AmperePerSecond, 2e9}, {"3 kA/s", AmperePerSecond, 3000}, {"7 A/s", AmperePerSecond, 7},
		{"100 rad/s", RadianPerSecond, 100}, {"3000 rpm", RadianPerSecond, 3000 * 2 * math.Pi / 60}, {"3000 1/min", RadianPerSecond, 3000 * 2 * math.Pi / 60},
		{"0.02 kg·m²", KilogramSqMetre, 0.02}, {"0.02 kgm2", KilogramSqMetre, 0.02}, {"0.02 kg m²", KilogramSqMetre, 0.02}, {"5 kg cm^2", KilogramSqMetre, 5e-4},
		{"200 g·cm²", KilogramSqMetre, 200e-7}, {"0.004 1/K", PerKelvin, 0.004}, {"-0.1 %/K", PerKelvin, -0.1e-2}, {"50 ppm/K", PerKelvin, 50e-6},
		{"10 Ah", AmpereHour, 10}, {"2600 mAh", AmpereHour, 2.6},
		{"3", Count, 3}, {"3 pieces", Count, 3}, {"65536", Count, 65536}, {"0.8", Ratio, 0.8}, {"80 %", Ratio, 0.8}, {"80%", Ratio, 0.8}, {"1.05 ratio", Ratio, 1.05},
	} {
		for _, want := range []Unit{c.want, Any} {
			q, err := Parse(c.text, want)
			if want == Any && err != nil {
				continue // a bare number or code; TestParseAny names those that must pass
			}
			if err != nil {
				t.Errorf("Parse(%q, %s): %v", c.text, want, err)
			} else if want == c.want && (q.Value != c.si || q.Low != c.si || q.High != c.si || q.Unit != c.want || q.Text != c.text) {
				t.Errorf("Parse(%q, %s) = %+v, want %v", c.text, want, q, c.si)
			}
		}
	}
}

func TestParseAny(t *testing.T) {
	for _, c := range []struct {
		text string
		unit Unit
		si   float64
	}{
		{"4k7 Ω", Ohm, 4700}, {"4k7Ω", Ohm, 4700}, {"2n2 F", Farad, 2.2e-9}, {"4u7 H", Henry, 4.7e-6}, {"100n F", Farad, 100e-9},
		{"47R ohm", Ohm, 47}, {"100 m Ω", Ohm, 0.1}, {"6.1 K", Kelvin, 6.1}, {"310 V", Volt, 310}, {"50 %", Ratio, 0.5}, {"3 pieces", Count, 3},
		{"5 F", Farad, 5}, {"5F", Farad, 5}, {"2 H", Henry, 2}, {"25 °C ±3 K", Celsius, 25}, {"5 MΩ", Ohm, 5e6}, {"5 mΩ", Ohm, 5e-3},
	} {
		q, err := Parse(c.text, Any)
		if err != nil || q.Value != c.si || q.Unit != c.unit {
			t.Errorf("Parse(%q, Any) = %+v, %v; want %v %s", c.text, q, err, c.si, c.unit)
		}
	}
}

func TestParseIntervals(t *testing.T) {
	for _, c := range []struct {
		text             string
		want             Unit
		low, value, high float64
	}{
		{"4 kΩ to 6 kΩ", Ohm, 4000, 5000, 6000}, {"4..6 kΩ", Ohm, 4000, 5000, 6000}, {"4...6 kΩ", Ohm, 4000, 5000, 6000}, {"4–6 kΩ", Ohm, 4000, 5000, 6000},
		{"4-6 kΩ", Ohm, 4000, 5000, 6000}, {"4 - 6 kΩ", Ohm, 4000, 5000, 6000}, {"4 kΩ–6 kΩ", Ohm, 4000, 5000, 6000}, {"4 to 6k", Ohm, 4000, 5000, 6000},
		{"4k to 6k", Ohm, 4000, 5000, 6000}, {"4k7..5k3", Ohm, 4700, 5000, 5300}, {"900 Ω to 1.1 kΩ", Ohm, 900, 1000, 1100}, {"-15 to -5 V", Volt, -15, -10, -5},
		{"-5..5 V", Volt, -5, 0, 5}, {"-40 °C to 125 °C", Celsius, -40, 42.5, 125}, {"2 to 4", Count, 2, 3, 4}, {"0.4 to 0.6", Ratio, 0.4, 0.5, 0.6},
		{"40 to 60 %", Ratio, 0.4, 0.5, 0.6}, {"60–200 nH", Henry, 60e-9, 130e-9, 200e-9}, {"1e-3..3e-3 V", Volt, 1e-3, 2e-3, 3e-3},
		{"120 nH ±20 %", Henry, 96e-9, 120e-9, 144e-9}, {"120nH±20%", Henry, 96e-9, 120e-9, 144e-9}, {"120 nH +-20%", Henry, 96e-9, 120e-9, 144e-9},
		{"120 nH +/-20 %", Henry, 96e-9, 120e-9, 144e-9}, {"120 nH ±5 nH", Henry, 115e-9, 120e-9, 125e-9}, {"120 ±5 nH", Henry, 115e-9, 120e-9, 125e-9},
		{"120 nH -10/+20 %", Henry, 108e-9, 120e-9, 144e-9}, {"120 nH +20/-10 %", Henry, 108e-9, 120e-9, 144e-9}, {"120 nH -10 % / +20 %", Henry, 108e-9, 120e-9, 144e-9},
		{"120 nH \u221210/+20 %", Henry, 108e-9, 120e-9, 144e-9}, {"120 nH -5/+10 nH", Henry, 115e-9, 120e-9, 130e-9}, {"4k7 ±5 %", Ohm, 4465, 4700, 4935},
		{"-15 V ±20 %", Volt, -18, -15, -12}, {"25 °C ±3 K", Celsius, 22, 25, 28}, {"25 °C ±3 °C", Celsius, 22, 25, 28}, {"0.8 ±0.05", Ratio, 0.75, 0.8, 0.85},
		{"3 ±1", Count, 2, 3, 4}, {"10 V/µs -1 V/µs/+2 V/µs", VoltPerSecond, 9e6, 10e6, 12e6},
	} {
		q, err := Parse(c.text, c.want)
		if err != nil {
			t.Errorf("Parse(%q): %v", c.text, err)
			continue
		}
		for _, pair := range [][2]float64{{q.Low, c.low}, {q.Value, c.value}, {q.High, c.high}} {
			if math.Abs(pair[0]-pair[1]) > 1e-12*math.Abs(c.high-c.low) {
				t.Errorf("Parse(%q) = %v %v %v, want %v %v %v", c.text, q.Low, q.Value, q.High, c.low, c.value, c.high)
				break
			}
		}
	}
}

// Every error is one line in lower case that quotes the text and says what to write.
func TestParseErrors(t *testing.T) {
	for _, c := range []struct {
		text string
		want Unit
		says string
	}{
		{"310", Volt, `"310" has no unit, wanted is V (voltage); write 310 V`},
		{"2200", Farad, `"2200" has no unit, wanted is F (capacitance); write 2200 pF, 2200 nF or 2200 µF`},
		{"310", Any, `"310" has no unit; write it with its unit, like 310 V; a count as 310 pieces, a ratio in per cent`},
		{"4 to 6", Volt, `"4 to 6" has no unit, wanted is V (voltage); write 4 to 6 V`},
		{"310 ±5 %", Volt, `"310 ±5 %" has no unit, wanted is V (voltage); write 310 V ±5 %`},
		{"4 A to 6 A", Volt, `"4 A to 6 A" is in A (current), wanted is V (voltage); write it like 4.7 V`},
		{"0,47 Ω", Ohm, `"0,47 Ω" has a decimal comma; write 0.47 Ω`},
		{",47 Ω", Ohm, `",47 Ω" has a decimal comma; write 0.47 Ω`},
		{"1,000 V", Volt, `"1,000 V" has a decimal comma; write 1.000 V, or 1000 V if the comma parts thousands`},
		{"310 A", Volt, `"310 A" is in A (current), wanted is V (voltage); write 310 V`},
		{"85 C", Celsius, `"85 C" is in C (charge), wanted is °C (a temperature); write 85 °C`},
		{"6 °C", Kelvin, `"6 °C" is in °C (a temperature), wanted is K (a temperature difference); write 6 K`},
		{"5 mv", Volt, `"5 mv" has an unknown unit "mv"; capitals matter, write 5 MV or 5 mV`},
		{"20 MOHM", Ohm, `"20 MOHM" has an unknown unit "MOHM"; capitals matter, write 20 Mohm or 20 mohm`},
		{"3V3", Volt, `"3V3" has an unknown unit "V3"; write it like 4.7 V`},
		{"5 Vdc", Volt, `"5 Vdc" has an unknown unit "Vdc"; write 5 V`},
		{"5 Vdc", Any, `"5 Vdc" has an unknown unit "Vdc"; write a number with its unit, like 310 V`},
		{"5 %", Volt, `"5 %" is a ratio, wanted is V (voltage); write 5 V`},
		{"> 20 MΩ", Ohm, `"> 20 MΩ" is a limit where a value belongs; write the value, or an interval like 4 Ω to 6 Ω`},
		{"OL", Ohm, `"OL" has "OL" where a number belongs; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 kΩ / 6", Ohm, `"5 kΩ / 6" has "/ 6" left over after 5 kΩ; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 Ω ±1 % 3", Ohm, `"5 Ω ±1 % 3" has "3" left over after 1 %; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 Ω ±", Ohm, `"5 Ω ±" ends where a number belongs; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 Ω ±1e400 Ω", Ohm, `"5 Ω ±1e400 Ω" is too large to compute with; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 Ω to 6 V", Ohm, `"5 Ω to 6 V" is in V (voltage), wanted is Ω (resistance); write 5 Ω to 6 Ω or 5 Ω to 6 kΩ`},
		{"3 ±50 %", Count, `"3 ±50 %" has a tolerance in per cent of a count, which can be meant in two ways; write an interval, like 2 to 4`},
		{"5 foo", Volt, `"5 foo" has an unknown unit "foo"; write 5 V`},
		{"20m", Ohm, `"20m" has the letter m, which is no code for Ω (resistance); write 20 mΩ, 20 kΩ or 20 MΩ`},
		{"4m7", Ohm, `"4m7" has the letter m, which is no code for Ω (resistance); write 4.7 mΩ, 4.7 kΩ or 4.7 MΩ`},
		{"4k7", Any, `"4k7" is a code without a unit; write 4.7 kΩ`},
		{"2n2", Any, `"2n2" is a code without a unit; write 2.2 nF or 2.2 nH`},
		{"47K", Any, `"47K" is a code without a unit; write 47 kΩ or 47 K`},
		{"4k7", Volt, `"4k7" is a code, and codes are for Ω, F and H; wanted is V (voltage); write it like 4.7 V`},
		{"4R7", Henry, `"4R7" has the letter R, which is no code for H (inductance); write p, n, u or m before H`},
		{"4k7 Ω", Volt, `"4k7 Ω" is in Ω (resistance), wanted is V (voltage); write 4.7 V`},
		{"120 nH", Kelvin, `"120 nH" is in H (inductance), wanted is K (a temperature difference); write 120 K`},
		{"5 /foo", Volt, `"5 /foo" has an unknown unit "/foo"; write 5 V`},
		{"4k7 kΩ", Ohm, `"4k7 kΩ" has a code letter and a unit that do not go together; write 4k7, 4k7 Ω or 4.7 kΩ`},
		{"4k7 V", Ohm, `"4k7 V" has a code letter and a unit that do not go together; write 4k7, 4k7 Ω or 4.7 kΩ`},
		{"6 kΩ to 4 kΩ", Ohm, `"6 kΩ to 4 kΩ" has its larger end first; write 4 kΩ to 6 kΩ`},
		{"4 kΩ to 6", Ohm, `"4 kΩ to 6" has no unit at its upper end; write both ends with their unit, like 4 Ω to 6 Ω`},
		{"4 kΩ to 6 V", Any, `"4 kΩ to 6 V" goes from Ω (resistance) to V (voltage); write both ends in one unit`},
		{"120 nH ±5", Henry, `"120 nH ±5" has a tolerance without a unit; write ±5 % or the unit of the value`},
		{"120 nH -10/+20", Henry, `"120 nH -10/+20" has a tolerance without a unit; write ±20 % or the unit of the value`},
		{"120 nH ±5 V", Henry, `"120 nH ±5 V" has a tolerance in V (voltage) beside H (inductance); write ±5 % or the unit of the value`},
		{"120 nH ±-5 %", Henry, `"120 nH ±-5 %" has a second sign behind its tolerance; write ±5 % or -10/+20 %`},
		{"25 °C ±10 %", Celsius, `"25 °C ±10 %" has a tolerance in per cent of °C (a temperature), which can be meant in two ways; write an interval, like 20 °C to 30 °C`},
		{"50 % ±5 %", Ratio, `"50 % ±5 %" has a tolerance in per cent of a ratio, which can be meant in two ways; write an interval, like 0.45 to 0.55`},
		{"50 % ±5", Ratio, `"50 % ±5" has a tolerance without a unit; write ±5 % or the unit of the value`},
		{"about 5 kΩ", Ohm, `"about 5 kΩ" does not say how wide the doubt is; write a tolerance or an interval, like 5 kΩ ±20 % or 4 kΩ to 6 kΩ`},
		{"~5 kΩ", Ohm, `"~5 kΩ" does not say how wide the doubt is; write a tolerance or an interval, like 5 kΩ ±20 % or 4 kΩ to 6 kΩ`},
		{"capacitor", Farad, `"capacitor" has "capacitor" where a number belongs; write it like 4.7 pF, 4.7 nF or 4.7 µF`},
		{"...", Volt, `"..." has "..." where a number belongs; write it like 4.7 V`},
		{"", Volt, `empty where a value belongs; write it like 4.7 V`},
		{" \t ", Count, `empty where a value belongs; write a whole number, like 3`},
		{"V", Volt, `"V" has "V" where a number belongs; write it like 4.7 V`},
		{"5 kΩ to ", Ohm, `"5 kΩ to " has "to" left over after 5 kΩ; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 kΩ..", Ohm, `"5 kΩ.." ends where a number belongs; write it like 4.7 Ω or 4.7 kΩ`},
		{"5 kΩ 6 kΩ", Ohm, `"5 kΩ 6 kΩ" has "6 kΩ" left over after 5 kΩ; write it like 4.7 Ω or 4.7 kΩ`},
		{"1e400 V", Volt, `"1e400 V" is too large to compute with; write it like 4.7 V`},
		{"1e99999999999999999999 V", Volt, `"1e99999999999999999999 V" is too large to compute with; write it like 4.7 V`},
		{"1e-400 V", Volt, `"1e-400 V" is too small to compute with; write it like 4.7 V`},
		{"1.7e308 V ±20 %", Volt, `"1.7e308 V ±20 %" has an interval too large to compute with; write it like 4.7 V`},
		{"NaN V", Volt, `"NaN V" has "NaN" where a number belongs; write it like 4.7 V`},
		{"Inf", Ratio, `"Inf" has "Inf" where a number belongs; write a number or per cent, like 0.8 or 80 %`},
		{"2.5", Count, `"2.5" is no count; write a whole number from 0 up, like 3`},
		{"-3", Count, `"-3" is no count; write a whole number from 0 up, like 3`},
		{"5\xff V", Volt, `"5\xff V" is not UTF-8 text; write it anew in a UTF-8 editor`},
		{"5 V", Unit("furlong"), `unknown unit "furlong"; wanted is one of count, ratio, V, A, Ω, F, H, s, Hz, W, J, C, K, °C, K/W, V/s, A/s, rad/s, kg·m², 1/K, Ah`},
	} {
		q, err := Parse(c.text, c.want)
		if err == nil {
			t.Errorf("Parse(%q, %s) = %+v, want an error", c.text, c.want, q)
		} else if err.Error() != c.says {
			t.Errorf("Parse(%q, %s):\n got %s\nwant %s", c.text, c.want, err, c.says)
		}
	}
}

func TestZeroUnitTakesAny(t *testing.T) {
	if q, err := Parse("5 V", ""); err != nil || q.Unit != Volt {
		t.Errorf("got %+v, %v", q, err)
	}
	if r, err := ParseReading("OL", ""); err != nil || r.Unit != Any {
		t.Errorf("got %+v, %v", r, err)
	}
}

func TestParseRefusesLongText(t *testing.T) {
	_, err := Parse(strings.Repeat("9", 5000)+" V", Volt)
	if err == nil || !strings.Contains(err.Error(), "longer than 120 characters") || len(err.Error()) > 200 {
		t.Errorf("got %v", err)
	}
}

func TestSpellingsAreUnambiguous(t *testing.T) {
	seen := map[string]bool{}
	for _, text := range spellingOrder {
		if seen[text] {
			t.Errorf("%q is spelled twice", text)
		}
		seen[text] = true
		q, err := Parse("5 "+text, spellings[text].unit)
		if err != nil || q.Value <= 0 {
			t.Errorf("5 %s: %v %v", text, q.Value, err)
		}
	}
}

func TestParseUnit(t *testing.T) {
	for text, want := range map[string]Unit{"ohm": Ohm, "Ω": Ohm, "\u2126": Ohm, "V": Volt, "ratio": Ratio, "count": Count, "K": Kelvin,
		"℃": Celsius, "K/W": KelvinPerWatt, "rad/s": RadianPerSecond, "kgm2": KilogramSqMetre, "1/K": PerKelvin, "Ah": AmpereHour} {
		if got, err := ParseUnit(text); got != want || err != nil {
			t.Errorf("ParseUnit(%q) = %q, %v", text, got, err)
		}
	}
	for text, says := range map[string]string{"kV": "multiple of a unit; write V", "%": "write ratio", "hz": "capitals matter, write Hz", "": "unknown unit"} {
		if _, err := ParseUnit(text); err == nil || !strings.Contains(err.Error(), says) {
			t.Errorf("ParseUnit(%q): %v", text, err)
		}
	}
	for _, u := range Units() {
		if got, err := ParseUnit(string(u)); got != u || err != nil {
			t.Errorf("ParseUnit(%q) = %q, %v", u, got, err)
		}
	}
}
