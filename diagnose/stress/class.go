package stress

import (
	"strings"

	"drivemend/measure"
)

// class is how a board is built; it decides the typical values. All of them are judgements.
type class struct {
	name        string
	loop, lead  interval // H
	pack        float64  // H, one device
	supply      float64  // H
	recoveryV   float64  // V, forward recovery
	recoveryT   float64  // s
	esrPerFarad float64  // Ω·F
	esrFixed    float64  // Ω, where the busbar decides
}

// interval is where a value that nobody stated lies.
type interval struct{ low, mid, high float64 }

// around is an interval of a factor to either side.
func around(mid, factor float64) interval { return interval{mid / factor, mid, mid * factor} }

// only is an interval of one value.
func only(mid float64) interval { return interval{mid, mid, mid} }

const nano = 1e-9

var (
	surfaceMount = class{name: "a low-voltage surface-mount board",
		loop: interval{10 * nano, 20 * nano, 40 * nano}, lead: interval{3 * nano, 8 * nano, 12 * nano},
		pack: 3 * nano, supply: 3e-6, recoveryV: 3, recoveryT: 20 * nano, esrPerFarad: 60e-6}
	leaded = class{name: "a low-voltage board with TO-220 parts",
		loop: interval{10 * nano, 20 * nano, 40 * nano}, lead: interval{3 * nano, 8 * nano, 12 * nano},
		pack: 8 * nano, supply: 3e-6, recoveryV: 3, recoveryT: 20 * nano, esrPerFarad: 60e-6}
	discrete = class{name: "TO-247 parts on a board",
		loop: interval{60 * nano, 120 * nano, 200 * nano}, lead: interval{10 * nano, 30 * nano, 50 * nano},
		pack: 13 * nano, supply: 10e-6, recoveryV: 15, recoveryT: 100 * nano, esrPerFarad: 120e-6}
	busbar = class{name: "a module on a busbar",
		loop: interval{30 * nano, 60 * nano, 120 * nano}, lead: interval{10 * nano, 20 * nano, 40 * nano},
		pack: 25 * nano, supply: 5e-6, recoveryV: 40, recoveryT: 200 * nano, esrFixed: 15e-3}
	wired = class{name: "a wired module",
		loop: interval{30 * nano, 60 * nano, 120 * nano}, lead: interval{40 * nano, 80 * nano, 160 * nano},
		pack: 25 * nano, supply: 5e-6, recoveryV: 40, recoveryT: 200 * nano, esrFixed: 15e-3}
)

// classOf picks the class from what the case says of the build, else from the switch's ratings.
func classOf(b measure.Board) class {
	switch build, _ := b.Word("build"); build {
	case "surface-mount":
		return surfaceMount
	case "to-220":
		return leaded
	case "to-247":
		return discrete
	case "module-busbar":
		return busbar
	case "module-wired":
		return wired
	}
	volts, _ := b.Quantity("switch.rated_voltage")
	amps, _ := b.Quantity("switch.rated_current")
	switch {
	case volts.Value <= lowVoltage:
		return leaded
	case amps.Value > 75:
		return busbar
	}
	return discrete
}

// judged is the reason of a value taken from the class.
func (c class) judged() string { return "typical of " + c.name + ", judgement" }

const (
	lowVoltage    = 150 // V, rating up to which a switch counts as a low-voltage part
	schottkyDrop  = 0.6 // V, forward voltage under which a diode counts as a Schottky diode
	recoveryDoubt = 1.5 // factor either way of a recovery charge carried over to another current and slope
)

// recovery gives the forward recovery of the class's diodes; TO-247 parts from 1200 V on have more, a Schottky
// diode (forward voltage under 0.6 V) none.
func (c class) recovery(rated, drop float64) (volts, time float64) {
	switch {
	case drop < schottkyDrop:
		return 0, c.recoveryT
	case rated >= 1200 && c.name == discrete.name:
		return 30, 150 * nano
	}
	return c.recoveryV, c.recoveryT
}

// typicalEdge gives fall time and voltage slope by kind of switch: judgement.
func typicalEdge(kind string, rated float64) (fall, slope float64) {
	switch {
	case kind == "sic-mosfet":
		return 15 * nano, 50e9
	case kind == "igbt":
		return 100 * nano, 15e9
	case kind == "bipolar":
		return 500 * nano, 2e9
	case rated <= lowVoltage:
		return 30 * nano, 10e9
	}
	return 40 * nano, 15e9
}

// typicalRise gives the time in which a device at closing takes its rated current: judgement.
func typicalRise(kind string) float64 {
	switch kind {
	case "sic-mosfet":
		return 12 * nano
	case "igbt":
		return 40 * nano
	case "bipolar":
		return 200 * nano
	}
	return 30 * nano
}

// typicalRecovery gives the reverse recovery time of the diode beside a switch: judgement.
func typicalRecovery(kind string, rated float64) float64 {
	switch {
	case kind == "sic-mosfet":
		return 25 * nano
	case rated <= lowVoltage:
		return 40 * nano
	case rated <= 700:
		return 100 * nano
	}
	return 200 * nano
}

// plainWords are the names of the inputs in a sentence.
var plainWords = map[string]string{
	"bus.highest":                            "the highest bus voltage",
	"bus.supply_inductance":                  "the inductance of the supply",
	"bus.esr":                                "the bus capacitor's series resistance",
	"load.stall_current":                     "the worst current",
	"switch.fall_time":                       "the fall time",
	"switch.rise_slope":                      "the voltage slope",
	"switch.output_capacitance":              "the output capacitance",
	"switch.package_inductance":              "the package inductance",
	"loop.inductance":                        "the loop inductance",
	"loop.resistance":                        "the loop resistance",
	"loop.damping_ratio":                     "the damping of the loop's ring",
	"freewheel.forward_voltage":              "the freewheel diode's drop",
	"freewheel.forward_recovery.voltage":     "the freewheel diode's forward recovery",
	"freewheel.forward_recovery.time":        "the time of its forward recovery",
	"snubber.lead_inductance":                "the network's lead",
	"snubber.capacitance":                    "the network's capacitor",
	"snubber.resistance":                     "the network's resistor",
	"snubber.diode.forward_voltage":          "the network diode's drop",
	"snubber.diode.forward_recovery.voltage": "the network diode's forward recovery",
	"snubber.diode.forward_recovery.time":    "the time of the network diode's forward recovery",
	"pwm.shortest_on_time":                   "the shortest on-time",
	"switch.turn_on_slope":                   "the current slope at closing",
	"switch.closing_slope":                   "the voltage slope at closing",
	"freewheel.recovery_charge":              "the diode's recovery charge",
	"freewheel.recovery_time":                "the diode's recovery time",
	"freewheel.softness":                     "the softness of its recovery",
	"snubber.clamp_voltage":                  "the clamp voltage",
	"snubber.slope_resistance":               "the suppressor's slope",
	"snubber.reservoir":                      "the reservoir",
	"snubber.link.inductance":                "the inductance of its tie",
	"snubber.link.resistance":                "the resistance of its tie",
}

// inWords names an input for a sentence, with its key.
func inWords(key string) string {
	if bare, far := strings.CutPrefix(key, oppositeSwitch); far {
		return "of the opposite switch " + inWords(bare)
	}
	if words, ok := plainWords[key]; ok {
		return words + " (" + key + ")"
	}
	return key
}
