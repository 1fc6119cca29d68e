// Package quantity holds numbers with units as a technician writes them: 4k7, 2200 µF, 120 nH ±20 %,
// > 20 MΩ, OL. Every value is kept in the SI unit of its kind.
package quantity

// Unit names one kind of quantity by the symbol of its SI unit.
type Unit string

// The units a case file or a rule base may use.
const (
	Any             Unit = "?" // parse only: take the unit from the text
	Count           Unit = "count"
	Ratio           Unit = "ratio" // also written as per cent
	Volt            Unit = "V"
	Ampere          Unit = "A"
	Ohm             Unit = "Ω"
	Farad           Unit = "F"
	Henry           Unit = "H"
	Second          Unit = "s"
	Hertz           Unit = "Hz"
	Watt            Unit = "W"
	Joule           Unit = "J"
	Coulomb         Unit = "C"
	Kelvin          Unit = "K"  // a temperature difference
	Celsius         Unit = "°C" // a temperature
	KelvinPerWatt   Unit = "K/W"
	VoltPerSecond   Unit = "V/s"
	AmperePerSecond Unit = "A/s"
	RadianPerSecond Unit = "rad/s" // also rpm
	KilogramSqMetre Unit = "kg·m²"
	PerKelvin       Unit = "1/K" // also written as per cent per kelvin
	AmpereHour      Unit = "Ah"
)

// Quantity is a value in the SI unit of its kind, with the interval it may lie in
// (Low = High = Value when the text gave none). A parsed quantity has Low <= Value <= High, all finite.
type Quantity struct {
	Value, Low, High float64
	Unit             Unit
	Text             string // as written, "" when computed
}

// ReadingKind tells what an instrument showed.
type ReadingKind int

// The kinds of reading.
const (
	Point   ReadingKind = iota // a number
	Between                    // Low..High
	Above                      // > Low
	Below                      // < High
	Over                       // OL: above the instrument's range
	Word                       // shorted, hot, ...
)

// Reading is what an instrument showed. Value, Low and High are finite: for Point all three are the number, for
// Between they are as in a Quantity, for Above and Below all three are the limit, for Over and Word they are zero.
type Reading struct {
	Kind             ReadingKind
	Value, Low, High float64
	Unit             Unit   // Any for a word, and for OL when neither the text nor the caller names one
	Word             string // for Word: lower case
	Text             string // as written
}

// Of makes an exact computed quantity.
func Of(value float64, unit Unit) Quantity {
	return Quantity{Value: value, Low: value, High: value, Unit: unit}
}

// Exact tells whether the quantity is a single value without an interval.
func (q Quantity) Exact() bool { return q.Low == q.High }
