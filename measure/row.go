package measure

import (
	"regexp"
	"strings"

	"drivemend/measure/quantity"
)

// The functions of this file make rows of the key table, so that a row reads as one line.

// amount is a number with a unit, within low and high in the SI unit.
func amount(path string, unit quantity.Unit, low, high float64, help string) Key {
	return Key{Path: path, Kind: KindQuantity, Unit: unit, Min: low, Max: high, Help: help}
}

// ratio is a pure number or a percentage.
func ratio(path string, low, high float64, help string) Key {
	return Key{Path: path, Kind: KindRatio, Unit: quantity.Ratio, Min: low, Max: high, Help: help}
}

// count is a whole number.
func count(path string, low, high float64, help string) Key {
	return Key{Path: path, Kind: KindCount, Unit: quantity.Count, Min: low, Max: high, Help: help}
}

// word is one of a closed list of words.
func word(path, help string, words ...string) Key {
	return Key{Path: path, Kind: KindWord, Words: words, Help: help}
}

// yesNo is yes, no or unknown.
func yesNo(path, help string) Key {
	return Key{Path: path, Kind: KindYesNo, Words: []string{"yes", "no", "unknown"}, Help: help}
}

// plain is a key of a kind without unit, range or words.
func plain(path string, kind Kind, help string) Key { return Key{Path: path, Kind: kind, Help: help} }

// used names what needs the key.
func (k Key) used(by ...string) Key {
	k.Users = append(k.Users, by...)
	return k
}

// typical adds a value taken where the case is silent.
func (k Key) typical(class, text, source string) Key {
	k.Typical = append(k.Typical, Typical{class, text, source})
	return k
}

// orNone lets the word none stand for a part that is not there.
func (k Key) orNone() Key {
	k.Words = append(k.Words, "none")
	return k
}

// required makes a missing key a fault.
func (k Key) required() Key {
	k.Required = true
	return k
}

// measuredAt gives a quantity's row followed by the rows of the conditions it was measured at: the key then
// takes a plain value or {value: ..., voltage: ...}.
func measuredAt(k Key, conditions ...string) []Key {
	value := k
	value.Path, value.Help, value.Required, value.Typical = k.Path+".value", k.Help, true, nil
	rows := []Key{k, value}
	for _, name := range conditions {
		rows = append(rows, condition(k.Path, name))
	}
	return rows
}

// isCondition tells whether a row is a measuring condition.
func (k Key) isCondition() bool { return strings.HasSuffix(k.Help, conditionHelp) }

// conditionHelp ends the help of every measuring condition.
const conditionHelp = " (condition of the figure)"

// condition is the row of one measuring condition.
func condition(of, name string) Key {
	path := of + "." + name
	switch name {
	case "voltage":
		return amount(path, quantity.Volt, 0, 20e3, "voltage it holds at"+conditionHelp)
	case "current":
		return amount(path, quantity.Ampere, 0, 20e3, "current it holds at"+conditionHelp)
	case "gate_resistance":
		return amount(path, quantity.Ohm, 0, 10e3, "gate resistance it was measured with"+conditionHelp)
	case "temperature":
		return amount(path, quantity.Celsius, -65, 250, "junction temperature it holds at"+conditionHelp)
	default:
		return amount(path, quantity.AmperePerSecond, 1, 1e12, "current slope it was measured with"+conditionHelp)
	}
}

// moved copies rows from one place of the file to another, keeping those that pass.
func moved(rows []Key, from, to string, keep func(path string) bool) []Key {
	var out []Key
	for _, k := range rows {
		if !strings.HasPrefix(k.Path, from+".") || !keep(k.Path) {
			continue
		}
		k.Path = to + strings.TrimPrefix(k.Path, from)
		out = append(out, k)
	}
	return out
}

// sum is the SHA-256 sum of a file.
func sum(path, help string) Key {
	return Key{Path: path, Kind: KindName, Help: help, Form: &sumForm}
}

// sumForm is how such a sum is written.
var sumForm = Form{regexp.MustCompile(`^[0-9a-fA-F]{64}$`), "64 hexadecimal digits"}
