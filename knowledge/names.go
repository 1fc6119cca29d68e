package knowledge

import (
	"sort"

	"drivemend/measure/quantity"
)

// Figure is a value that the program works out for a board and that a rule may name.
type Figure struct {
	Name  string
	Unit  quantity.Unit
	Means string
}

// Computed gives the closed list of figures that a test may name under `computed:`.
func Computed() []Figure {
	return []Figure{
		{"turn_off.peak_over_rated", quantity.Ratio, "highest voltage at the opening edge as a share of the switch's rating"},
		{"turn_on.peak_over_rated", quantity.Ratio, "highest voltage while the opposite switch of the leg closes, as a share of the rating"},
		{"turn_off.energy_over_rated", quantity.Ratio, "avalanche energy of an opening on the lowest device as a share of its rated energy"},
		{"edge.slope", quantity.VoltPerSecond, "steepest voltage slope of the opening and closing edge"},
		{"clamp.voltage_over_rated", quantity.Ratio, "voltage of a clamp's capacitor after an opening as a share of the switch's rating"},
	}
}

// Expected gives the closed list of values that a result may name as its median.
func Expected() []Figure {
	return []Figure{
		{"expected.gate_bleed", quantity.Ohm, "resistance that a sound gate shows through its bleed resistor"},
		{"expected.blocking", quantity.Ohm, "resistance that a switch that blocks shows in circuit, through the freewheel diode and what lies across the rails"},
	}
}

// unitNames are the words for units in tests.yaml.
var unitNames = map[string]quantity.Unit{
	"count":             quantity.Count,
	"ratio":             quantity.Ratio,
	"volt":              quantity.Volt,
	"ampere":            quantity.Ampere,
	"ohm":               quantity.Ohm,
	"farad":             quantity.Farad,
	"henry":             quantity.Henry,
	"second":            quantity.Second,
	"hertz":             quantity.Hertz,
	"watt":              quantity.Watt,
	"joule":             quantity.Joule,
	"coulomb":           quantity.Coulomb,
	"kelvin":            quantity.Kelvin,
	"celsius":           quantity.Celsius,
	"kelvin-per-watt":   quantity.KelvinPerWatt,
	"volt-per-second":   quantity.VoltPerSecond,
	"ampere-per-second": quantity.AmperePerSecond,
	"radian-per-second": quantity.RadianPerSecond,
	"ampere-hour":       quantity.AmpereHour,
}

// UnitNames gives the words that tests.yaml may use for units, in alphabetical order.
func UnitNames() []string {
	names := make([]string, 0, len(unitNames))
	for n := range unitNames {
		names = append(names, n)
	}
	sort.Strings(names)
	return names
}

// Grades gives what a band may say about where its numbers come from.
func Grades() []string { return []string{"judgement", "read", "second-hand", "memory", "computed"} }

// Settings gives the keys of a cause's share. A cause without a share for `new` takes its share for dc or mains,
// by the supply of the board, times its factor `early`; the loader leaves it out.
func Settings() []string { return []string{"dc", "mains", "repeat", "new"} }

// Services gives the keys of a cause's factors: early is for a board with few hours of
// service, aged for one with many; where they begin is the reasoning's.
func Services() []string { return []string{"early", "aged"} }

// Patterns gives the closed partition of the sets of dead parts.
func Patterns() []string {
	return []string{"one-of-bank", "some-of-bank", "whole-bank", "both-of-leg", "several-legs"}
}

// Needs gives the board states that a test may need, from none to full power.
func Needs() []string { return []string{"question", "dead", "control-power", "low-bus", "full"} }

// Roles gives the roles of a cause.
func Roles() []string { return []string{"latent", "trigger", "sufficient"} }

// Instruments gives what a test is done with. A supply is one that sends a current through the parts; the insulation
// tester puts hundreds of volts on them. Both have conditions of their own among the hold points.
func Instruments() []string {
	return []string{"meter", "scope", "double-pulse", "camera", "insulation-tester", "supply", "eye", "question", "none"}
}

func figureNames(list []Figure) []string {
	return idsOf(list, func(f *Figure) string { return f.Name })
}
