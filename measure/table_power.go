package measure

import (
	"slices"

	"drivemend/measure/quantity"
)

// freewheelKeys describe the freewheel path.
func freewheelKeys() []Key {
	return slices.Concat([]Key{
		plain("board.freewheel", KindMap, "the freewheel diode"),
		yesNo("board.freewheel.fitted", "there is a freewheel path").used("edge", "ranking"),
		amount("board.freewheel.forward_voltage", quantity.Volt, 0.05, 20, "forward voltage").used("edge", "heat").
			typical("", "0.9 V and 5 mΩ", "judgement"),
		amount("board.freewheel.recovery_time", quantity.Second, 0, 1e-3, "reverse recovery time").used("edge"),
	},
		measuredAt(amount("board.freewheel.recovery_charge", quantity.Coulomb, 0, 1, "reverse recovery charge").used("edge"),
			"current", "slope", "temperature"),
		[]Key{
			ratio("board.freewheel.softness", 0.01, 10, "falling part of the recovery over its rising part").used("edge").
				typical("", "0.3", "judgement"),
		}, forwardRecoveryKeys("board.freewheel"), []Key{
			amount("board.freewheel.capacitance", quantity.Farad, 1e-13, 1e-5, "junction capacitance").used("edge"),
		})
}

// forwardRecoveryKeys describe the overshoot of a diode that begins to conduct.
func forwardRecoveryKeys(at string) []Key {
	return []Key{
		plain(at+".forward_recovery", KindMap, "overshoot when the diode begins to conduct"),
		amount(at+".forward_recovery.voltage", quantity.Volt, 0, 1e3, "peak of the overshoot").used("edge").
			typical(classSMD, "3 V", judged).typical(classBoard, "15 V", judged).
			typical(classBoard+", 1200 V parts", "30 V", judged).typical(classBusbar, "40 V", judged).
			typical("schottky", "0 V", judged),
		amount(at+".forward_recovery.time", quantity.Second, 0, 1e-4, "length of the overshoot").used("edge").
			typical(classSMD, "20 ns", judged).typical(classBoard, "100 ns", judged).
			typical(classBoard+", 1200 V parts", "150 ns", judged).typical(classBusbar, "200 ns", judged),
	}
}

// loopKeys describe the loop from the bus capacitor to the device terminals.
func loopKeys() []Key {
	return []Key{
		plain("board.loop", KindMap, "the loop from the bus capacitor to the device terminals"),
		amount("board.loop.inductance", quantity.Henry, 1e-10, 1e-3, "its inductance").used("edge").
			typical(classSMD, "20 nH (10 to 40)", judged).typical(classBoard, "120 nH (60 to 200)", judged).
			typical(classBusbar, "60 nH (30 to 120)", judged),
		amount("board.loop.link", quantity.Henry, 0, 1e-3, "the share common to all legs; silent: all of it").used("edge"),
		amount("board.loop.leg", quantity.Henry, 0, 1e-3, "the share of one leg").used("edge"),
		amount("board.loop.resistance", quantity.Ohm, 0, 100, "its resistance").used("edge"),
		ratio("board.loop.damping_ratio", 0, 2, "damping ratio of its ring beyond that resistance").used("edge").
			typical("", "0.05 (0.02 to 0.1)", judged),
	}
}

// snubberKeys describe the network at the switch; which of them count depends on its kind.
func snubberKeys() []Key {
	q := func(name string, u quantity.Unit, low, high float64, help string) Key {
		return amount("board.snubber."+name, u, low, high, help).used("edge")
	}
	return slices.Concat([]Key{
		plain("board.snubber", KindMap, "the network that tames the switching edge"),
		word("board.snubber.kind", "what kind of network", "none", "capacitor", "rc", "rcd", "clamp", "suppressor",
			"decoupling", "recovery").used("edge", "ranking"),
		q("capacitance", quantity.Farad, 1e-13, 1e-2, "its capacitor"),
		q("resistance", quantity.Ohm, 1e-3, 1e7, "its resistor"),
		q("clamp_voltage", quantity.Volt, 1, 20e3, "voltage a clamp holds or a suppressor begins at (1 mA)"),
		word("board.snubber.return", "where a clamp's resistor leads", "bus", "rail").used("edge"),
		q("slope_resistance", quantity.Ohm, 0, 1e4, "rise of a suppressor's voltage per ampere"),
		q("reservoir", quantity.Farad, 1e-12, 1, "capacitor a recovery network charges").used("discharge", "hold points"),
		plain("board.snubber.link", KindMap, "tie from the reservoir back to the bus"),
		q("link.inductance", quantity.Henry, 0, 10, "its inductance"),
		q("link.resistance", quantity.Ohm, 0, 1e6, "its resistance"),
		yesNo("board.snubber.link.open", "the tie is broken").used("edge"),
		q("lead_inductance", quantity.Henry, 0, 1e-4, "inductance of the network's leads").
			typical(classSMD, "8 nH (3 to 12)", judged).typical(classBoard, "30 nH (10 to 50)", judged).
			typical(classBusbar, "20 nH", judged).typical(classWired, "80 nH", judged),
		word("board.snubber.across", "what it lies across; silent: the switch", "switch", "freewheel").used("edge"),
		plain("board.snubber.diode", KindMap, "the diode of the network"),
		q("diode.forward_voltage", quantity.Volt, 0.05, 20, "forward voltage").typical("", "0.9 V", "judgement"),
		q("diode.slope_resistance", quantity.Ohm, 0, 100, "slope resistance").typical("", "5 mΩ", "judgement"),
	}, forwardRecoveryKeys("board.snubber.diode"))
}

// gateKeys describe the gate circuit and its driver.
func gateKeys() []Key {
	return []Key{
		plain("board.gate", KindMap, "the gate circuit of one device"),
		amount("board.gate.on_voltage", quantity.Volt, 1, 100, "gate voltage when on").used("gate", "edge"),
		amount("board.gate.off_voltage", quantity.Volt, -50, 10, "gate voltage when off").used("gate", "edge"),
		amount("board.gate.turn_on_resistance", quantity.Ohm, 0, 1e5, "gate resistor at closing").used("gate", "edge"),
		amount("board.gate.turn_off_resistance", quantity.Ohm, 0, 1e5, "gate resistor at opening").used("gate", "edge"),
		amount("board.gate.pull_down", quantity.Ohm, 1, 1e8, "resistor from gate to emitter or source").orNone().
			used("gate", "readings"),
		amount("board.gate.clamp", quantity.Volt, 1, 100, "voltage of the gate's clamp diode").orNone().used("gate"),
		plain("board.driver", KindMap, "the gate driver"),
		word("board.driver.type", "how it drives", "bootstrap", "isolated", "transformer", "optocoupler", "direct-logic",
			"discrete", "integrated", "other").used("ranking", "gate"),
		plain("board.driver.bootstrap", KindMap, "floating supply of a high side"),
		amount("board.driver.bootstrap.capacitance", quantity.Farad, 1e-10, 1e-2, "bootstrap capacitor").orNone().used("gate"),
		plain("board.driver.bootstrap.diode", KindText, "bootstrap diode").used("report"),
		amount("board.driver.uvlo", quantity.Volt, 1, 50, "supply voltage below which it holds the gate off").orNone().used("gate"),
		yesNo("board.driver.desaturation", "it opens a switch that does not saturate").used("protection", "ranking"),
		amount("board.driver.dead_time", quantity.Second, 0, 1e-2, "time both switches of a leg are held off").used("gate"),
		amount("board.driver.supply", quantity.Volt, 1, 100, "its supply voltage").used("gate"),
	}
}

// loadKeys describe the load, the pulse-width modulation and the protection.
func loadKeys() []Key {
	return []Key{
		plain("board.load", KindMap, "what the board drives"),
		word("board.load.kind", "kind of load", "dc-motor", "induction-motor", "permanent-magnet-motor", "universal-motor",
			"stepper-motor", "winding", "resistive", "other").used("ranking", "hold points"),
		amount("board.load.inductance", quantity.Henry, 1e-8, 1e3, "its inductance").used("edge"),
		amount("board.load.resistance", quantity.Ohm, 1e-4, 1e6, "its resistance").used("edge"),
		amount("board.load.running_current", quantity.Ampere, 0, 20e3, "its running current").used("edge", "heat"),
		amount("board.load.stall_current", quantity.Ampere, 0, 50e3, "its stall current").used("edge"),
		amount("board.load.back_emf", quantity.Volt, 0, 20e3, "its back voltage at working speed").used("edge", "hold points"),
		amount("board.load.inertia", quantity.KilogramSqMetre, 0, 1e6, "moment of inertia with what it drives").used("bus"),
		amount("board.load.speed", quantity.RadianPerSecond, 0, 1e5, "working speed").used("bus"),
		yesNo("board.load.source_absorbs", "the source takes energy back: a battery does, a rectifier does not").used("bus"),
		plain("board.pwm", KindMap, "the pulse-width modulation"),
		amount("board.pwm.frequency", quantity.Hertz, 1, 10e6, "switching frequency").used("edge", "heat"),
		amount("board.pwm.shortest_on_time", quantity.Second, 0, 1, "shortest time a switch is closed").used("edge"),
		amount("board.pwm.shortest_off_time", quantity.Second, 0, 1, "shortest time a switch is open").used("edge"),
		plain("board.protection", KindMap, "what stops an over-current"),
		amount("board.protection.trip_current", quantity.Ampere, 1e-3, 50e3, "current at which it trips").orNone().used("edge"),
		amount("board.protection.trip_delay", quantity.Second, 0, 1, "time from there to the gate going off").used("edge"),
		yesNo("board.protection.soft_turn_off", "a short circuit is opened slowly").used("edge"),
		amount("board.protection.short_circuit_current", quantity.Ampere, 1e-3, 100e3, "current it opens in a short circuit").
			used("edge"),
	}
}

// coolingKeys describe the way of the heat.
func coolingKeys() []Key {
	return []Key{
		plain("board.cooling", KindMap, "the way of the heat"),
		amount("board.cooling.junction_to_case", quantity.KelvinPerWatt, 1e-4, 1e3, "each device").used("heat"),
		amount("board.cooling.case_to_sink", quantity.KelvinPerWatt, 1e-4, 1e3, "each device, with its insulator").used("heat"),
		amount("board.cooling.sink_to_air", quantity.KelvinPerWatt, 1e-4, 1e3, "the heat sink, shared").used("heat"),
		amount("board.cooling.air", quantity.Celsius, -60, 150, "air at the heat sink when working").used("heat"),
		amount("board.cooling.coldest_air", quantity.Celsius, -60, 100, "coldest air it starts in").used("edge").
			typical("", "0 °C", "judgement"),
		plain("board.cooling.foster", KindList, "thermal ladder of the device, junction to case"),
		amount("board.cooling.foster[].resistance", quantity.KelvinPerWatt, 1e-6, 1e3, "one step's resistance").
			used("heat").required(),
		amount("board.cooling.foster[].time", quantity.Second, 1e-9, 1e5, "its time constant").used("heat").required(),
		amount("board.cooling.junction_limit", quantity.Celsius, 50, 300, "highest junction temperature").used("heat"),
		yesNo("board.cooling.fan", "there is a fan").used("ranking", "heat"),
	}
}

// stageKeys describe what else the board carries.
func stageKeys() []Key {
	return []Key{
		plain("board.stages", KindMap, "what else the board carries"),
		plain("board.stages.brake", KindMap, "the brake chopper"),
		yesNo("board.stages.brake.fitted", "there is one; silent: yes when any of its keys is stated").
			used("ranking", "hold points"),
		amount("board.stages.brake.resistor", quantity.Ohm, 1e-3, 1e5, "brake resistor").used("bus", "hold points"),
		amount("board.stages.brake.on_voltage", quantity.Volt, 1, 20e3, "bus voltage at which it closes").used("bus"),
		plain("board.stages.precharge", KindMap, "what charges the bus slowly"),
		amount("board.stages.precharge.resistor", quantity.Ohm, 1e-3, 1e6, "charging resistor").orNone().used("ranking", "bus"),
		yesNo("board.stages.precharge.relay", "a relay or thyristor bridges it afterwards").used("ranking"),
		word("board.stages.rectifier", "the input rectifier", "none", "half-wave", "single-phase", "three-phase",
			"controlled").used("ranking"),
		word("board.stages.current_sensor", "how the current is sensed", "none", "shunt", "hall", "transformer").
			used("ranking"),
		plain("board.stages.auxiliary", KindMap, "the auxiliary supply"),
		yesNo("board.stages.auxiliary.fitted", "there is one with a bulk capacitor of its own").used("discharge", "hold points"),
		amount("board.stages.auxiliary.primary_capacitance", quantity.Farad, 1e-12, 1, "its own bulk capacitor").orNone().
			used("discharge", "hold points"),
		plain("board.stages.command", KindMap, "the way of the speed command"),
		word("board.stages.command.kind", "what carries it", "potentiometer", "voltage", "current-loop", "pulse-width",
			"serial", "switch", "firmware").used("command path", "ranking"),
		amount("board.stages.command.span", quantity.Volt, 1e-3, 100, "voltage at full command").used("command path"),
		count("board.stages.command.converter_bits", 1, 32, "bits of the converter that reads it").used("command path"),
		count("board.stages.command.divisor", 1, 1e9, "what the reading is divided by").used("command path"),
		count("board.stages.command.timer_bits", 1, 64, "bits of the timer that makes the pulses").used("command path"),
	}
}
