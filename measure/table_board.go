package measure

import (
	"slices"

	"drivemend/measure/quantity"
)

// Classes of board for typical values.
const (
	classSMD    = "low-voltage surface-mount"
	classLeaded = "TO-220"
	classBoard  = "TO-247 on a board"
	classBusbar = "module on busbar"
	classWired  = "wired module"
)

// judged is the source of the typical values that no measurement stands behind.
const judged = "judgement"

// boardKeys are the keys of the board. Each value may be unknown, but for the measuring conditions.
func boardKeys() []Key {
	keys := slices.Concat(boardHeadKeys(), busKeys(), positionKeys(), switchKeys("board.switch"), freewheelKeys(),
		loopKeys(), snubberKeys(), gateKeys(), loadKeys(), coolingKeys(), stageKeys())
	for i, k := range keys {
		switch k.Kind {
		case KindQuantity, KindRatio, KindCount, KindWord:
			keys[i].MayBeUnknown = !k.Required && !k.isCondition()
		}
	}
	return keys
}

// boardHeadKeys say what kind of board it is.
func boardHeadKeys() []Key {
	return []Key{
		plain("board.title", KindText, "what the board is called").used("report"),
		word("board.topology", "how the switches are arranged", "low-side-chopper", "high-side-chopper", "half-bridge",
			"h-bridge", "three-phase", "other").used("ranking", "edge", "hold points"),
		word("board.supply", "what feeds the bus", "battery", "bench-supply", "rectified-mains", "shared-bus").
			used("ranking", "hold points"),
		word("board.history", "was it repaired before", "first-failure", "failed-after-repair", "never-worked").used("ranking"),
		amount("board.service", quantity.Second, 0, 1e10, "hours it ran before it failed").used("ranking"),
		word("board.build", "how the power parts are mounted; picks the typical values", "surface-mount", "to-220", "to-247",
			"module-busbar", "module-wired").used("edge"),
		plain("board.assumed", KindList, "keys that were typed or taken over, but are not known to be true of this board").
			used("edge", "ranking", "report"),
	}
}

// busKeys describe the DC bus.
func busKeys() []Key {
	return []Key{
		plain("board.bus", KindMap, "the DC bus"),
		amount("board.bus.nominal", quantity.Volt, 1, 20e3, "working voltage").used("edge", "discharge", "hold points"),
		amount("board.bus.highest", quantity.Volt, 1, 20e3, "highest voltage it can reach").used("edge", "discharge"),
		plain("board.bus.highest_because", KindText, "what sets the highest voltage").used("report"),
		amount("board.bus.capacitance", quantity.Farad, 1e-9, 100, "bus capacitance, all capacitors together").orNone().
			used("edge", "discharge"),
		amount("board.bus.esr", quantity.Ohm, 1e-6, 100, "series resistance of the bus capacitors together").used("edge").
			typical(classSMD, "60 mΩ at 1 mF, as 1/C", judged).typical(classBoard, "120 mΩ at 1 mF, as 1/C", judged).
			typical(classBusbar, "15 mΩ", judged),
		amount("board.bus.esl", quantity.Henry, 1e-11, 1e-4, "series inductance of the bus capacitors").used("edge"),
		amount("board.bus.bleeder", quantity.Ohm, 1, 1e9, "resistor that empties the bus").orNone().used("discharge"),
		yesNo("board.bus.halves", "the bank is split into two halves in series").used("hold points"),
		amount("board.bus.balancing", quantity.Ohm, 1, 1e9, "resistor across each half").orNone().used("discharge"),
		amount("board.bus.fuse", quantity.Ampere, 1e-3, 20e3, "rating of the fuse between bank and switches").orNone().
			used("hold points"),
		amount("board.bus.supply_inductance", quantity.Henry, 1e-9, 1, "inductance from the supply to the bus").used("edge").
			typical(classSMD, "3 µH", judged).typical(classBoard, "10 µH", judged).typical(classBusbar, "5 µH", judged),
		amount("board.bus.reservoir", quantity.Farad, 1e-12, 100, "second bank that stays charged").orNone().
			used("discharge", "hold points"),
	}
}

// positionKeys name the parts of each position and the switch keys that differ there.
func positionKeys() []Key {
	own := moved(switchKeys("board.switch"), "board.switch", "board.positions.*", func(string) bool { return true })
	return append([]Key{
		plain("board.positions", KindNamed, "the switch places; silent: those of the topology, one part each"),
		plain("board.positions.*", KindMap, "one position: its parts and the switch keys that differ there"),
		plain("board.positions.*.parts", KindList, "the parts in parallel").used("ranking", "edge", "locate"),
	}, own...)
}

// switchKeys describe one device.
func switchKeys(at string) []Key {
	q := func(name string, u quantity.Unit, low, high float64, help string) Key {
		return amount(at+"."+name, u, low, high, help)
	}
	var head []Key
	head = append(head,
		plain(at, KindMap, "one switching device"),
		word(at+".kind", "what the device is", "igbt", "mosfet", "sic-mosfet", "bipolar").used("ranking", "edge"),
		q("rated_voltage", quantity.Volt, 1, 20e3, "rated blocking voltage").used("edge", "ranking"),
		q("rated_current", quantity.Ampere, 1e-3, 20e3, "rated continuous current").used("edge"),
		q("pulse_current", quantity.Ampere, 1e-3, 100e3, "rated pulse current").used("edge"))
	return slices.Concat(head,
		measuredAt(q("output_capacitance", quantity.Farad, 1e-13, 1e-5, "output capacitance").used("edge"), "voltage"),
		measuredAt(q("fall_time", quantity.Second, 1e-9, 1e-3, "current fall time, 90 to 10 %").used("edge"),
			"voltage", "current", "gate_resistance"),
		[]Key{
			plain(at+".fall", KindMap, "shape of an IGBT's fall"),
			ratio(at+".fall.fraction", 0, 1, "share of the current that falls fast").used("edge"),
			q("fall.tail_time", quantity.Second, 1e-9, 1e-3, "time constant of the tail").used("edge"),
			q("rise_slope", quantity.VoltPerSecond, 1e6, 1e12, "voltage slope at opening").used("edge").
				typical("igbt", "15 V/ns", judged).typical("mosfet up to 150 V", "10 V/ns", judged).
				typical("sic-mosfet", "50 V/ns", judged),
		},
		measuredAt(q("turn_on_slope", quantity.AmperePerSecond, 1e3, 1e12, "current slope at closing").used("edge"),
			"current", "gate_resistance"),
		[]Key{
			q("closing_slope", quantity.VoltPerSecond, 1e6, 1e12, "voltage slope at closing").used("edge"),
			plain(at+".avalanche", KindMap, "rated avalanche"),
			q("avalanche.energy", quantity.Joule, 1e-9, 1e3, "rated avalanche energy, one pulse").used("edge"),
			q("avalanche.current", quantity.Ampere, 1e-3, 10e3, "rated avalanche current").used("edge"),
			q("gate_threshold", quantity.Volt, 0.1, 20, "lowest gate threshold, hot").used("gate"),
			q("gate_limit", quantity.Volt, 1, 100, "highest gate voltage allowed").used("gate"),
			q("gate_collector_capacitance", quantity.Farad, 1e-14, 1e-6, "capacitance from gate to collector or drain").
				used("gate", "edge"),
			q("gate_emitter_capacitance", quantity.Farad, 1e-13, 1e-5, "capacitance from gate to emitter or source").used("gate"),
			q("gate_charge", quantity.Coulomb, 1e-11, 1e-3, "total gate charge").used("gate"),
			q("internal_gate_resistance", quantity.Ohm, 1e-3, 1e3, "gate resistance inside the device").used("gate", "edge"),
		},
		measuredAt(q("on_voltage", quantity.Volt, 1e-3, 50, "voltage across the closed device").used("heat"),
			"current", "temperature"),
		measuredAt(q("on_resistance", quantity.Ohm, 1e-6, 1e3, "resistance of the closed device").used("heat", "sharing"),
			"current", "temperature"),
		[]Key{q("temperature_factor", quantity.PerKelvin, -0.1, 0.1, "relative change of on-voltage or on-resistance per kelvin").
			used("heat", "sharing")},
		measuredAt(q("turn_on_energy", quantity.Joule, 1e-9, 1e3, "loss of one closing").used("heat"), "voltage", "current"),
		measuredAt(q("turn_off_energy", quantity.Joule, 1e-9, 1e3, "loss of one opening").used("heat"), "voltage", "current"),
		[]Key{
			q("package_inductance", quantity.Henry, 1e-11, 1e-6, "inductance inside the package").used("edge").
				typical(classSMD, "3 nH", judged).typical(classLeaded, "8 nH", judged).typical(classBoard, "13 nH", judged).
				typical(classBusbar, "25 nH", judged),
			q("short_circuit_time", quantity.Second, 1e-7, 1e-3, "time it stands a short circuit").used("protection"),
			q("leakage", quantity.Ampere, 1e-12, 10, "blocking current").used("heat", "readings"),
			plain(at+".spread", KindMap, "how much parallel devices differ"),
			q("spread.on_voltage", quantity.Volt, 0, 10, "spread of the on-voltage").used("sharing"),
			q("spread.threshold", quantity.Volt, 0, 10, "spread of the gate threshold").used("sharing"),
			q("spread.delay", quantity.Second, 0, 1e-4, "spread of the delay").used("sharing", "edge"),
		})
}
