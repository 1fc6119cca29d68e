package quantity

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

func TestFormat(t *testing.T) {
	for _, c := range []struct {
		si   float64
		unit Unit
		want string
	}{
		{310, Volt, "310 V"}, {1200, Volt, "1200 V"}, {12000, Volt, "12 kV"}, {0.25, Volt, "250 mV"}, {1.2e-3, Volt, "1.2 mV"}, {-15, Volt, "-15 V"}, {0, Volt, "0 V"},
		{math.Copysign(0, -1), Volt, "0 V"}, {999.96, Volt, "1000 V"}, {612.34, Volt, "612.3 V"}, {612.36, Volt, "612.4 V"}, {40, Ampere, "40 A"}, {1500, Ampere, "1500 A"}, {5e-9, Ampere, "5 nA"},
		{4700, Ohm, "4.7 kΩ"}, {0.47, Ohm, "470 mΩ"}, {20e6, Ohm, "20 MΩ"}, {100e3, Ohm, "100 kΩ"}, {1e12, Ohm, "1000 GΩ"}, {999.96, Ohm, "1 kΩ"}, {1e-7, Ohm, "0.1 µΩ"},
		{2200e-6, Farad, "2200 µF"}, {0.47, Farad, "470000 µF"}, {0.999999, Farad, "1 F"}, {1, Farad, "1 F"}, {2.2e-9, Farad, "2.2 nF"}, {250e-12, Farad, "250 pF"},
		{0.47e-12, Farad, "0.47 pF"}, {999.96e-9, Farad, "1 µF"}, {1e-20, Farad, "1e-20 F"},
		{120e-9, Henry, "120 nH"}, {0.005, Henry, "5 mH"}, {96e-9, Second, "96 ns"}, {5e-6, Second, "5 µs"}, {2e-3, Second, "2 ms"}, {90, Second, "90 s"},
		{600, Second, "10 min"}, {7200, Second, "2 h"}, {5200 * 3600, Second, "5200 h"}, {30 * 86400, Second, "720 h"}, {8000, Hertz, "8 kHz"}, {12.3456e6, Hertz, "12.35 MHz"},
		{1500, Watt, "1.5 kW"}, {132.04, Joule, "132 J"}, {30e-3, Joule, "30 mJ"}, {0.9e-6, Coulomb, "900 nC"}, {6.1, Kelvin, "6.1 K"}, {0.3, Kelvin, "0.3 K"}, {0.03, Kelvin, "30 mK"},
		{-40, Celsius, "-40 °C"}, {25.5, Celsius, "25.5 °C"}, {0.45, KelvinPerWatt, "0.45 K/W"}, {0.005, KelvinPerWatt, "5 mK/W"}, {15e9, VoltPerSecond, "15 V/ns"}, {500e6, VoltPerSecond, "500 V/µs"},
		{1e9, AmperePerSecond, "1000 A/µs"}, {3000 * 2 * math.Pi / 60, RadianPerSecond, "3000 rpm"}, {0.02, KilogramSqMetre, "0.02 kg·m²"}, {5e-7, KilogramSqMetre, "5e-7 kg·m²"},
		{-0.001, PerKelvin, "-0.1 %/K"}, {2.6, AmpereHour, "2.6 Ah"}, {0.8, Ratio, "0.8"}, {1.05, Ratio, "1.05"}, {0.00012, Ratio, "0.00012"}, {1e-7, Ratio, "1e-7"},
		{3, Count, "3"}, {65536, Count, "65536"}, {123456789, Count, "123456789"}, {2.5, Count, "2.5"}, {5, Any, "5"}, {1e300, Volt, "1e300 V"}, {math.MaxFloat64, RadianPerSecond, "1.798e308 rad/s"},
		{math.NaN(), Volt, "not computable"}, {math.Inf(1), Volt, "not computable"}, {math.Inf(-1), Second, "not computable"},
	} {
		if got := Format(c.si, c.unit); got != c.want {
			t.Errorf("Format(%v, %s) = %q, want %q", c.si, c.unit, got, c.want)
		}
	}
}

func TestQuantityString(t *testing.T) {
	for _, c := range []struct {
		text string
		unit Unit
		want string
	}{
		{"2.2 mF", Farad, "2200 µF"}, {"4k7", Ohm, "4.7 kΩ"}, {"120nH+-20%", Henry, "120 nH ±20 %"}, {"120 nH ±6 nH", Henry, "120 nH ±5 %"}, {"4 kΩ to 6 kΩ", Ohm, "5 kΩ ±20 %"},
		{"4 kΩ to 7 kΩ", Ohm, "4 kΩ to 7 kΩ"}, {"1 kΩ to 20 MΩ", Ohm, "1 kΩ to 20 MΩ"}, {"120 nH -10/+20 %", Henry, "120 nH -10/+20 %"}, {"120 nH -0/+20 %", Henry, "120 nH -0/+20 %"},
		{"-5 V to 5 V", Volt, "-5 V to 5 V"}, {"25 °C ±3 K", Celsius, "22 °C to 28 °C"}, {"25 °C -3/+5 K", Celsius, "25 °C -3 °C/+5 °C"}, {"0.8 ±0.05", Ratio, "0.75 to 0.85"}, {"3 ±1", Count, "2 to 4"},
		{"5200 h", Second, "5200 h"}, {"1 V -5/+200 V", Volt, "1 V -5 V/+200 V"}, {"-15 V ±20 %", Volt, "-15 V ±20 %"}, {"47 Ω ±0.5 %", Ohm, "47 Ω ±0.5 %"},
	} {
		q, err := Parse(c.text, c.unit)
		if err != nil || q.String() != c.want {
			t.Errorf("Parse(%q).String() = %q, %v; want %q", c.text, q, err, c.want)
		}
	}
}

// near tells whether two figures agree to the four digits shown; size is what an offset was rounded against.
func near(a, b, size float64) bool { return math.Abs(a-b) <= 5.001e-4*math.Max(math.Abs(b), size) }

func TestFormatRoundTrip(t *testing.T) {
	units := Units()
	rapid.Check(t, func(t *rapid.T) {
		unit := rapid.SampledFrom(units).Draw(t, "unit")
		v := math.Pow(10, rapid.Float64Range(-30, 30).Draw(t, "log"))
		if unit == Count {
			v = float64(rapid.IntRange(0, 1e9).Draw(t, "count"))
		} else if rapid.Bool().Draw(t, "negative") {
			v = -v
		}
		for _, want := range []Unit{unit, Any} {
			q, err := Parse(Of(v, unit).String(), want)
			if want == Any && (unit == Count || unit == Ratio) {
				if err == nil {
					t.Fatalf("%q needs no unit", Of(v, unit))
				}
				continue
			}
			if err != nil || !near(q.Value, v, 0) || q.Unit != unit || !q.Exact() {
				t.Fatalf("%v %s printed as %q, read as %+v, %v", v, unit, Of(v, unit), q, err)
			}
			if q.String() != Of(v, unit).String() {
				t.Fatalf("%q is printed anew as %q", Of(v, unit), q)
			}
		}
	})
}

func TestIntervalRoundTrip(t *testing.T) {
	units := Units()
	rapid.Check(t, func(t *rapid.T) {
		unit := rapid.SampledFrom(units).Draw(t, "unit")
		v := math.Pow(10, rapid.Float64Range(-12, 9).Draw(t, "log"))
		below := v * rapid.Float64Range(0, 3).Draw(t, "below")
		above := v * rapid.Float64Range(0, 3).Draw(t, "above")
		if unit == Count {
			v = float64(rapid.IntRange(100, 200).Draw(t, "count"))
			below, above = float64(rapid.IntRange(0, 99).Draw(t, "down")), float64(rapid.IntRange(0, 99).Draw(t, "up"))
		}
		if rapid.Bool().Draw(t, "symmetric") {
			above = below
		}
		want := Quantity{Value: v, Low: v - below, High: v + above, Unit: unit}
		q, err := Parse(want.String(), unit)
		size := math.Max(v, math.Max(below, above))
		if err != nil || !near(q.Value, v, 0) || !near(q.Low, want.Low, 2*size) || !near(q.High, want.High, 2*size) {
			t.Fatalf("%+v printed as %q, read as %+v, %v", want, want, q, err)
		}
	})
}
