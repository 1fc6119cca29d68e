package stress

import (
	"fmt"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// keyList are keys of a case file being written.
type keyList [][2]string

func (k *keyList) word(key, value string) { *k = append(*k, [2]string{key, value}) }

// amount writes a quantity in the digits of a data sheet.
func (k *keyList) amount(key string, value float64, unit quantity.Unit) {
	k.word(key, quantity.Format(roundTo(value, 3), unit))
}

// bench writes what a bench measurement found, with its tolerance.
func (k *keyList) bench(key string, value float64, unit quantity.Unit) {
	k.word(key, quantity.Format(roundTo(value, 3), unit)+" ±20 %")
}

// outputVolts is the voltage at which a data sheet states the output capacitance: 25 V, half of the rating of a low
// one, 100 V for superjunction (some), 800 V for silicon carbide.
func (b modelBoard) outputVolts() float64 {
	switch b.device.family {
	case "low-voltage":
		return b.device.rated / 2
	case "superjunction":
		return 100
	case "carbide":
		return 800
	}
	return 25
}

// keys are the case keys as a technician has them from the data sheets and the board; those of the gate and of the
// closing only where asked for. Values are those of one device. Package, leads and loop are stated as a bench measures
// them, or not at all on a silent board. Nothing states what a data sheet leaves out: tail, forward recovery, the
// driver's own resistance, the slope of the voltage.
func (b modelBoard) keys(gate bool) [][2]string {
	k := &keyList{}
	k.word("topology", map[bool]string{true: "half-bridge", false: "low-side-chopper"}[b.leg])
	k.word("build", b.build)
	k.amount("bus.nominal", b.bus, quantity.Volt)
	k.amount("bus.highest", b.bus, quantity.Volt)
	k.amount("bus.capacitance", b.store, quantity.Farad)
	k.amount("load.running_current", b.amps, quantity.Ampere)
	k.amount("load.stall_current", b.amps, quantity.Ampere)
	k.amount("pwm.frequency", b.frequency, quantity.Hertz)
	k.amount("cooling.coldest_air", 25, quantity.Celsius)
	b.switchKeys(k)
	b.freewheelKeys(k)
	b.networkKeys(k)
	if !b.silent {
		k.bench("loop.inductance", b.measuredLoop()*b.loopError, quantity.Henry)
		k.bench("switch.package_inductance", (b.device.drain+b.device.source)*b.packError, quantity.Henry)
	}
	if gate {
		b.gateKeys(k)
	}
	return *k
}

func (b modelBoard) switchKeys(k *keyList) {
	d := b.device
	k.word("switch.kind", d.kind)
	k.amount("switch.rated_voltage", d.rated, quantity.Volt)
	k.amount("switch.rated_current", d.amps, quantity.Ampere)
	k.amount("switch.output_capacitance", d.output(b.outputVolts()), quantity.Farad)
	k.amount("switch.output_capacitance.voltage", b.outputVolts(), quantity.Volt)
	k.amount("switch.fall_time", b.data.FallTime, quantity.Second)
	k.amount("switch.fall_time.voltage", b.data.Volts, quantity.Volt)
	k.amount("switch.fall_time.current", b.data.Amps, quantity.Ampere)
	k.amount("switch.fall_time.gate_resistance", b.data.Ohm, quantity.Ohm)
}

// gateKeys: the threshold is the least that the data sheet allows, a fifth below the part's own.
func (b modelBoard) gateKeys(k *keyList) {
	d := b.device
	k.amount("gate.on_voltage", b.on, quantity.Volt)
	k.amount("gate.off_voltage", b.off, quantity.Volt)
	k.amount("gate.turn_on_resistance", b.onOhm, quantity.Ohm)
	k.amount("gate.turn_off_resistance", b.offOhm, quantity.Ohm)
	k.amount("switch.gate_threshold", 0.8*d.threshold, quantity.Volt)
	k.amount("switch.gate_emitter_capacitance", d.gateEmitter, quantity.Farad)
	k.amount("switch.gate_collector_capacitance", d.gateCollector.at(b.bus), quantity.Farad)
	if d.gateOhm >= 0.01 {
		k.amount("switch.internal_gate_resistance", d.gateOhm, quantity.Ohm)
	}
	k.amount("switch.turn_on_slope", b.data.TurnOnSlope, quantity.AmperePerSecond)
	k.amount("switch.turn_on_slope.current", b.data.Amps, quantity.Ampere)
	k.amount("switch.turn_on_slope.gate_resistance", b.data.Ohm, quantity.Ohm)
}

// freewheelKeys are those of one diode: in a leg the one inside one device.
func (b modelBoard) freewheelKeys(k *keyList) {
	k.word("freewheel.fitted", "yes")
	k.amount("freewheel.forward_voltage", b.data.Forward, quantity.Volt)
	k.amount("freewheel.recovery_charge", b.data.Charge, quantity.Coulomb)
	k.amount("freewheel.recovery_charge.current", b.data.RecoveryAmps, quantity.Ampere)
	k.amount("freewheel.recovery_charge.slope", b.data.RecoverySlope, quantity.AmperePerSecond)
	k.amount("freewheel.softness", b.data.Softness, quantity.Ratio)
	if !b.leg {
		k.amount("freewheel.capacitance", b.diode.junction.at(b.bus), quantity.Farad)
	}
}

func (b modelBoard) networkKeys(k *keyList) {
	net := b.net
	k.word("snubber.kind", net.kind)
	if net.kind == "none" {
		return
	}
	k.amount("pwm.shortest_on_time", b.onTime, quantity.Second)
	k.amount("snubber.capacitance", net.farad, quantity.Farad)
	if net.ohm > 0 {
		k.amount("snubber.resistance", net.ohm, quantity.Ohm)
	}
	if net.kind == "clamp" {
		k.amount("snubber.clamp_voltage", net.held, quantity.Volt)
		k.word("snubber.return", net.back)
	}
	if net.kind == "clamp" || net.kind == "rcd" {
		k.amount("snubber.diode.forward_voltage", net.diode.forward(net.diode.amps), quantity.Volt)
	}
	if !b.silent {
		k.bench("snubber.lead_inductance", net.lead*b.leadError, quantity.Henry)
	}
}

// quiet is the board with loop, leads and packages unmeasured; spoken the board with them measured.
func (b modelBoard) quiet() modelBoard  { b.silent = true; return b }
func (b modelBoard) spoken() modelBoard { b.silent = false; return b }

// board is the case's board with its parts named.
func (b modelBoard) board(t testing.TB, gate bool) measure.Board {
	names := make([]string, b.bank)
	for k := range names {
		names[k] = fmt.Sprintf("Q%d", k+1)
	}
	board := boardOf(t, b.keys(gate)...).WithParts("low", names...)
	if !b.leg {
		return board
	}
	for k := range names {
		names[k] = fmt.Sprintf("Q%d", b.bank+k+1)
	}
	return board.WithParts("high", names...)
}
