package quantity

import (
	"fmt"
	"math"
	"sort"
	"strings"
	"unicode/utf8"
)

// scale takes a written number to the SI unit: times ten to the exponent, times the factor. The exponent is
// kept apart so that 2200 µF becomes exactly the float64 nearest to 2200e-6.
type scale struct {
	exponent int
	factor   float64
}

// spelling is one way to write a unit.
type spelling struct {
	unit  Unit
	scale scale
	plain bool // the symbol without a prefix
}

// named is a spelling that takes no prefixes.
type named struct {
	text     string
	exponent int
	factor   float64
}

// kind describes one unit: how it is called, written and printed.
type kind struct {
	unit     Unit
	name     string
	usual    []string // what a technician would write; shown in messages
	symbols  []string // take the prefixes
	prefixes string
	others   []named
	steps    []step // for printing, ascending
}

var prefixExponent = map[rune]int{'p': -12, 'n': -9, 'u': -6, 'µ': -6, 'm': -3, 'k': 3, 'K': 3, 'M': 6, 'G': 9}

const (
	minute = 60.0
	hour   = 60 * minute
	day    = 24 * hour
	rpm    = 2 * math.Pi / minute // rad/s
)

// kinds lists every unit; the order is that of messages.
var kinds = []kind{
	{unit: Count, name: "a count", usual: []string{""},
		others: words("count", "counts", "pieces", "pcs"), steps: []step{{symbol: ""}}},
	{unit: Ratio, name: "a ratio", usual: []string{""},
		others: append(words("ratio"), named{"%", -2, 1}, named{"ppm", -6, 1}), steps: []step{{symbol: ""}}},
	{unit: Volt, name: "voltage", usual: []string{"V"}, symbols: []string{"V"}, prefixes: "nuµmkM",
		steps: []step{{-9, -9, "nV"}, {-6, -6, "µV"}, {-3, -3, "mV"}, {0, 0, "V"}, {3, 4, "kV"}}},
	{unit: Ampere, name: "current", usual: []string{"A"}, symbols: []string{"A"}, prefixes: "pnuµmk",
		steps: []step{{-12, -12, "pA"}, {-9, -9, "nA"}, {-6, -6, "µA"}, {-3, -3, "mA"}, {0, 0, "A"}, {3, 4, "kA"}}},
	{unit: Ohm, name: "resistance", usual: []string{"Ω", "kΩ"}, symbols: []string{"Ω", "ohm", "Ohm", "ohms", "Ohms"},
		prefixes: "nuµmkKMG",
		steps:    []step{{-6, -6, "µΩ"}, {-3, -3, "mΩ"}, {0, 0, "Ω"}, {3, 3, "kΩ"}, {6, 6, "MΩ"}, {9, 9, "GΩ"}}},
	{unit: Farad, name: "capacitance", usual: []string{"pF", "nF", "µF"}, symbols: []string{"F"}, prefixes: "pnuµm",
		steps: []step{{-12, -12, "pF"}, {-9, -9, "nF"}, {-6, -6, "µF"}, {0, 0, "F"}}},
	{unit: Henry, name: "inductance", usual: []string{"nH", "µH", "mH"}, symbols: []string{"H"}, prefixes: "pnuµm",
		steps: []step{{-12, -12, "pH"}, {-9, -9, "nH"}, {-6, -6, "µH"}, {-3, -3, "mH"}, {0, 0, "H"}}},
	{unit: Second, name: "time", usual: []string{"ns", "µs", "s", "h"}, symbols: []string{"s"}, prefixes: "pnuµm",
		others: []named{{"min", 0, minute}, {"h", 0, hour}, {"hour", 0, hour}, {"hours", 0, hour}, {"d", 0, day},
			{"day", 0, day}, {"days", 0, day}},
		steps: []step{{-12, -12, "ps"}, {-9, -9, "ns"}, {-6, -6, "µs"}, {-3, -3, "ms"}, {0, 0, "s"}}},
	{unit: Hertz, name: "frequency", usual: []string{"Hz", "kHz"}, symbols: []string{"Hz"}, prefixes: "mkMG",
		steps: []step{{-3, -3, "mHz"}, {0, 0, "Hz"}, {3, 3, "kHz"}, {6, 6, "MHz"}, {9, 9, "GHz"}}},
	{unit: Watt, name: "power", usual: []string{"W"}, symbols: []string{"W"}, prefixes: "nuµmkM",
		steps: []step{{-6, -6, "µW"}, {-3, -3, "mW"}, {0, 0, "W"}, {3, 3, "kW"}, {6, 6, "MW"}}},
	{unit: Joule, name: "energy", usual: []string{"J", "mJ"}, symbols: []string{"J"}, prefixes: "pnuµmkM",
		others: []named{{"Ws", 0, 1}},
		steps:  []step{{-9, -9, "nJ"}, {-6, -6, "µJ"}, {-3, -3, "mJ"}, {0, 0, "J"}, {3, 3, "kJ"}, {6, 6, "MJ"}}},
	{unit: Coulomb, name: "charge", usual: []string{"nC", "µC"}, symbols: []string{"C"}, prefixes: "pnuµm",
		others: []named{{"As", 0, 1}},
		steps:  []step{{-12, -12, "pC"}, {-9, -9, "nC"}, {-6, -6, "µC"}, {-3, -3, "mC"}, {0, 0, "C"}}},
	{unit: Kelvin, name: "a temperature difference", usual: []string{"K"}, symbols: []string{"K"}, prefixes: "uµm",
		steps: []step{{-3, -3, "mK"}, {0, -1, "K"}}},
	{unit: Celsius, name: "a temperature", usual: []string{"°C"}, others: words("°C", "° C", "degC", "deg C"),
		steps: []step{{0, -1, "°C"}}},
	{unit: KelvinPerWatt, name: "thermal resistance", usual: []string{"K/W"}, symbols: []string{"K/W", "°C/W"},
		prefixes: "m", others: []named{{"K/kW", -3, 1}},
		steps: []step{{-3, -3, "mK/W"}, {0, -2, "K/W"}}},
	{unit: VoltPerSecond, name: "voltage slope", usual: []string{"V/ns", "V/µs"}, symbols: []string{"V/s"}, prefixes: "mkM",
		others: slopes("V"),
		steps:  []step{{-3, -3, "mV/s"}, {0, 0, "V/s"}, {3, 3, "kV/s"}, {6, 6, "V/µs"}, {9, 9, "V/ns"}}},
	{unit: AmperePerSecond, name: "current slope", usual: []string{"A/µs", "A/ns"}, symbols: []string{"A/s"}, prefixes: "mkM",
		others: slopes("A"),
		steps:  []step{{-3, -3, "mA/s"}, {0, 0, "A/s"}, {3, 3, "kA/s"}, {6, 6, "A/µs"}, {9, 10, "A/ns"}}},
	{unit: RadianPerSecond, name: "speed", usual: []string{"rpm", "rad/s"}, symbols: []string{"rad/s"}, prefixes: "k",
		others: []named{{"rpm", 0, rpm}, {"1/min", 0, rpm}, {"/min", 0, rpm}, {"r/min", 0, rpm}, {"rev/min", 0, rpm}, {"min⁻¹", 0, rpm}},
		steps:  []step{{0, 0, "rpm"}}},
	{unit: KilogramSqMetre, name: "inertia", usual: []string{"kg·m²"}, others: inertias(),
		steps: []step{{0, 0, "kg·m²"}}},
	{unit: PerKelvin, name: "a temperature factor", usual: []string{"1/K", "%/K"},
		others: []named{{"1/K", 0, 1}, {"/K", 0, 1}, {"K⁻¹", 0, 1}, {"%/K", -2, 1}, {"%/°C", -2, 1}, {"ppm/K", -6, 1}, {"ppm/°C", -6, 1}},
		steps:  []step{{-2, -2, "%/K"}}},
	{unit: AmpereHour, name: "battery charge", usual: []string{"Ah"}, symbols: []string{"Ah"}, prefixes: "mk",
		steps: []step{{-3, -3, "mAh"}, {0, 0, "Ah"}, {3, 3, "kAh"}}},
}

func words(texts ...string) []named {
	var list []named
	for _, text := range texts {
		list = append(list, named{text, 0, 1})
	}
	return list
}

// slopes spells a volt or an ampere over a short time.
func slopes(symbol string) []named {
	var list []named
	for _, top := range []struct {
		prefix   string
		exponent int
	}{{"m", -3}, {"", 0}, {"k", 3}} {
		for _, under := range []struct {
			text     string
			exponent int
		}{{"ms", 3}, {"us", 6}, {"µs", 6}, {"ns", 9}} {
			list = append(list, named{top.prefix + symbol + "/" + under.text, top.exponent + under.exponent, 1})
		}
	}
	return list
}

func inertias() []named {
	var list []named
	for _, mass := range []named{{"kg", 0, 1}, {"g", -3, 1}} {
		for _, area := range []named{{"m", 0, 1}, {"cm", -4, 1}} {
			for _, join := range []string{"·", "", " ", "*"} {
				for _, square := range []string{"²", "2", "^2"} {
					list = append(list, named{mass.text + join + area.text + square, mass.exponent + area.exponent, 1})
				}
			}
		}
	}
	return list
}

// spellings maps every way to write a unit to its meaning; spellingOrder lists them for hints, spellingLength
// is the longest in runes.
var spellings, spellingOrder, spellingLength = spell(kinds)

func spell(kinds []kind) (map[string]spelling, []string, int) {
	all := map[string]spelling{}
	var order []string
	longest := 0
	add := func(text string, s spelling) {
		all[text] = s
		order = append(order, text)
		longest = max(longest, utf8.RuneCountInString(text))
	}
	for _, k := range kinds {
		for _, symbol := range k.symbols {
			add(symbol, spelling{k.unit, scale{0, 1}, true})
			for _, prefix := range k.prefixes {
				add(string(prefix)+symbol, spelling{k.unit, scale{prefixExponent[prefix], 1}, false})
			}
		}
		for _, o := range k.others {
			add(o.text, spelling{k.unit, scale{o.exponent, o.factor}, o.exponent == 0 && o.factor == 1})
		}
	}
	return all, order, longest
}

func kindOf(unit Unit) (kind, bool) {
	for _, k := range kinds {
		if k.unit == unit {
			return k, true
		}
	}
	return kind{}, false
}

// describe names a unit for a message: "V (voltage)".
func describe(unit Unit) string {
	k, known := kindOf(unit)
	if !known || unit == Count || unit == Ratio {
		return k.name
	}
	return fmt.Sprintf("%s (%s)", unit, k.name)
}

// Units lists every unit but Any, in a fixed order.
func Units() []Unit {
	var list []Unit
	for _, k := range kinds {
		list = append(list, k.unit)
	}
	return list
}

// ParseUnit reads the unit of a rule or a key: an SI unit without prefix in any of its spellings ("ohm", "Ω", "V",
// "ratio", "K/W"). A prefixed unit is an error, since a unit names a kind here and not a size.
func ParseUnit(text string) (Unit, error) {
	s, found := spellings[strings.TrimSpace(plainText(text))]
	if found && s.plain {
		return s.unit, nil
	}
	if found {
		return "", fmt.Errorf("%q is a part or a multiple of a unit; write %s", shorten(text), s.unit)
	}
	if near := resembling(text, Any); len(near) > 0 {
		return "", fmt.Errorf("unknown unit %q; capitals matter, write %s", shorten(text), strings.Join(near, " or "))
	}
	return "", fmt.Errorf("unknown unit %q; write one of %s", shorten(text), joinUnits())
}

func joinUnits() string {
	var list []string
	for _, u := range Units() {
		list = append(list, string(u))
	}
	return strings.Join(list, ", ")
}

// resembling lists the spellings of a unit (Any: of all) that differ from a text in capitals only, one for each
// meaning.
func resembling(text string, unit Unit) []string {
	var near []string
	named := map[spelling]bool{}
	for _, s := range spellingOrder {
		meaning := spellings[s]
		wanted := unit == Any || meaning.unit == unit
		if wanted && strings.EqualFold(s, text) && !named[meaning] {
			named[meaning] = true
			near = append(near, s)
		}
	}
	sort.Strings(near)
	return near
}
