package quantity

import (
	"math"
	"strconv"
	"strings"
)

// step is one printed unit: the power of ten it stands for and the decimal exponent from which it is used.
type step struct {
	exponent, from int
	symbol         string
}

const (
	digitsShown   = 4
	zerosBefore   = -4 // 0.00012 still in full
	zerosAfter    = 6  // 999900 still in full
	notComputable = "not computable"
)

// Format prints one SI value of a unit with an engineering prefix and at most four significant digits, counts in
// full. Capacitance is printed in pF, nF and µF below 1 F, time in min and h above two of them, voltage and
// current without k up to 9999, speed in rpm, a temperature factor in %/K. NaN and infinities give "not computable".
func Format(value float64, unit Unit) string {
	switch {
	case math.IsNaN(value) || math.IsInf(value, 0):
		return notComputable
	case unit == Count && value == math.Trunc(value) && math.Abs(value) < 1e15:
		return strconv.FormatInt(int64(value), 10)
	}
	if factor, symbol := ownFactor(value, unit); symbol != "" && !math.IsInf(value/factor, 0) {
		return engineering(value/factor, []step{{symbol: symbol}}, symbol)
	}
	k, known := kindOf(unit)
	if !known {
		return engineering(value, []step{{symbol: ""}}, "")
	}
	base := string(unit)
	if unit == Count || unit == Ratio {
		base = ""
	}
	return engineering(value, k.steps, base)
}

// ownFactor gives the printed unit that is no power of ten of the SI unit, and its size; "" if there is none.
func ownFactor(value float64, unit Unit) (factor float64, symbol string) {
	switch {
	case unit == Second && math.Abs(value) >= 2*hour:
		return hour, "h"
	case unit == Second && math.Abs(value) >= 2*minute:
		return minute, "min"
	case unit == RadianPerSecond:
		return rpm, "rpm"
	}
	return 1, ""
}

// engineering prints with the last step that the size reaches; sizes far outside all steps get a power of ten and
// the base symbol. It works on decimal digits, so nothing is rounded twice.
func engineering(value float64, steps []step, base string) string {
	if value == 0 {
		return withSymbol("0", base)
	}
	sign, digits, exponent := significant(value)
	chosen := step{exponent: math.MinInt32}
	for i, s := range steps {
		if i == 0 || s.from <= exponent {
			chosen = s
		}
	}
	places := exponent - chosen.exponent
	if places < zerosBefore || places > zerosAfter {
		return withSymbol(sign+placePoint(digits, 0)+"e"+strconv.Itoa(exponent), base)
	}
	return withSymbol(sign+placePoint(digits, places), chosen.symbol)
}

func withSymbol(number, symbol string) string {
	if symbol == "" {
		return number
	}
	return number + " " + symbol
}

// significant gives the sign, the significant digits without trailing zeros, and the decimal exponent of the first.
func significant(value float64) (sign, digits string, exponent int) {
	text := strconv.FormatFloat(value, 'e', digitsShown-1, 64)
	if text[0] == '-' {
		sign, text = "-", text[1:]
	}
	mantissa, power, _ := strings.Cut(text, "e")
	exponent, _ = strconv.Atoi(power)
	digits = strings.TrimRight(strings.Replace(mantissa, ".", "", 1), "0")
	return sign, digits, exponent
}

// placePoint writes digits as a decimal number whose first digit stands for ten to the places.
func placePoint(digits string, places int) string {
	whole := places + 1
	switch {
	case whole <= 0:
		return "0." + strings.Repeat("0", -whole) + digits
	case whole >= len(digits):
		return digits + strings.Repeat("0", whole-len(digits))
	default:
		return digits[:whole] + "." + digits[whole:]
	}
}

// String prints with an engineering prefix and at most four significant digits: "2200 µF". An interval around
// the value is printed as "120 nH ±20 %" where the percentage is round, else "97 nH to 142 nH", and as
// "120 nH -10/+20 %" where the value is not its middle. Parse reads every form back.
func (q Quantity) String() string {
	value := Format(q.Value, q.Unit)
	if q.Exact() || value == notComputable {
		return value
	}
	if q.middle() {
		if percent, round := q.roundPercent(); round {
			return value + " ±" + percent + " %"
		}
	}
	if inside := q.Low <= q.Value && q.Value <= q.High; !inside || q.intervalKeepsValue() {
		return Format(q.Low, q.Unit) + " to " + Format(q.High, q.Unit)
	}
	return value + " " + q.offsets()
}

// relative tells whether a percentage of the value means something: 20 % of 25 °C does not, and 5 % beside a
// ratio could be meant either way.
func (u Unit) relative() bool { return u != Celsius && u != Ratio && u != Count }

// middle tells whether the value is the middle of its interval.
func (q Quantity) middle() bool {
	return math.Abs(q.Value-(q.Low/2+q.High/2)) <= 1e-9*(q.High/2-q.Low/2)
}

// roundPercent gives the half width in per cent when three digits say it fully.
func (q Quantity) roundPercent() (string, bool) {
	percent := 100 * (q.High/2 - q.Low/2) / math.Abs(q.Value)
	if !q.Unit.relative() || !(percent > 0 && percent <= 50) {
		return "", false
	}
	text := strconv.FormatFloat(percent, 'g', 3, 64)
	shown, _ := strconv.ParseFloat(text, 64)
	return text, math.Abs(shown-percent) <= 1e-6*percent
}

// intervalKeepsValue tells whether the two printed ends give the value back to the digits shown.
func (q Quantity) intervalKeepsValue() bool {
	middle := asShown(q.Low, q.Unit)/2 + asShown(q.High, q.Unit)/2
	return math.Abs(middle-q.Value) <= 0.5*math.Pow10(1-digitsShown)*math.Abs(q.Value)
}

// asShown gives the value that its printed form means.
func asShown(value float64, unit Unit) float64 {
	factor, _ := ownFactor(value, unit)
	shown, _ := strconv.ParseFloat(strconv.FormatFloat(value/factor, 'e', digitsShown-1, 64), 64)
	return shown * factor
}

// offsets prints how far the interval reaches below and above the value.
func (q Quantity) offsets() string {
	below, above := q.Value-q.Low, q.High-q.Value
	size := math.Abs(q.Value) / 100
	if q.Unit.relative() && math.Max(below, above) < 100*size {
		percent := func(v float64) string { return engineering(v/size, []step{{symbol: ""}}, "") }
		return "-" + percent(below) + "/+" + percent(above) + " %"
	}
	return "-" + Format(below, q.Unit) + "/+" + Format(above, q.Unit)
}
