package stress

import (
	"fmt"
	"math"
)

// gateEdge is where in a deck the gate's source moves.
const gateEdge = 30e-9

// deck writes the board at a bus and a current, its lower gate going one way, and gives the time that the edge takes.
// The lower switch is l (terminals tl and bl), the opposite device u (tu and bu); inside ld, ls, ud, us are the chip.
func (b modelBoard) deck(bus, amps float64, opening bool) (*netlist, float64) {
	output := b.output(bus)
	n := &netlist{loss: b.ringQ / math.Sqrt((b.measuredLoop()+b.device.drain+b.device.source)*2*output)}
	b.supplyAndLoop(n, bus, amps)
	from, to, ohm := b.on, b.off, b.offOhm
	if !opening {
		from, to, ohm = b.off, b.on, b.onOhm
	}
	bank := b.device.times(b.bank)
	bank.put(n, "l", "tl", "gl", "bl")
	b.drive(n, "l", ohm, fmt.Sprintf("PWL(0 %.6g %.6g %.6g %.6g %.6g)", from, gateEdge, from, gateEdge+b.driverTime, to))
	if b.leg {
		bank.put(n, "u", "tu", "gu", "bu")
		b.drive(n, "u", b.offOhm, fmt.Sprintf("DC %.6g", b.off))
	} else {
		n.coil("uld", "tu", "ud", b.diode.pack)
		n.line("Rus bu us 1u")
		b.diode.put(n, "uw", "us", "ud")
	}
	b.network(n, bus, opening)
	return n, b.lasts(bus, amps, ohm)
}

// lasts is about how long an edge takes: driver, gate, Miller charge, what the load has to charge, some rings.
func (b modelBoard) lasts(bus, amps, ohm float64) float64 {
	each := ohm + b.driverOhm*float64(b.bank) + b.device.gateOhm
	gate := each * (b.device.gateEmitter + b.device.gateCollector.at(0)/2)
	miller := each * b.device.gateCollector.chargeTo(bus) / 3
	charge := 2 * b.output(bus) * bus / amps
	if b.net.kind != "clamp" {
		charge += 2 * b.net.farad * bus / amps
	}
	ring := 2 * math.Pi * math.Sqrt((b.measuredLoop()+b.device.drain+b.device.source)*(2*b.output(bus)+b.net.farad))
	if b.net.kind == "clamp" {
		ring = 2 * math.Pi * math.Sqrt(b.measuredLoop()*2*b.output(bus))
	}
	return gateEdge + b.driverTime + 3*gate + 2*miller + charge + 1.5*ring + 150e-9
}

// output is the bank's output capacitance of equal charge up to the bus.
func (b modelBoard) output(bus float64) float64 {
	return float64(b.bank) * (b.device.gateCollector.chargeTo(bus) + b.device.collectorEmitter.chargeTo(bus)) / bus
}

// supplyAndLoop writes supply, bus capacitors, the loop in four pieces and the load, a constant current.
func (b modelBoard) supplyAndLoop(n *netlist, bus, amps float64) {
	n.line("Vsup sup 0 DC %.6g\nLsup sup rail %.6g\nRsup sup rail 100", bus, b.supply)
	n.coil("esl", "rail", "b1", b.esl)
	n.line("Resr b1 b2 %.6g\nCbus b2 0 %.6g", b.esr, b.store)
	n.line("Rloop rail r1 %.6g", b.loopOhm)
	for k, ends := range [][2]string{{"r1", "tu"}, {"bu", "mid"}, {"mid", "tl"}, {"bl", "0"}} {
		n.coil(fmt.Sprintf("p%d", k), ends[0], ends[1], b.split[k]*b.loop)
	}
	for _, node := range []string{"tu", "bu", "mid", "tl"} {
		n.line("C%sx %s 0 2p", node, node)
	}
	n.line("Cstray mid st %.6g\nRstray st 0 %.6g", b.stray, b.strayOhm)
	n.line("Iload rail mid DC %.6g", amps)
}

// drive writes the driver of a bank: each gate has its own resistor, and all share the driver. Its return goes to the
// source terminal, so that the source lead is in the gate's circuit, or to an own terminal of the chip.
func (b modelBoard) drive(n *netlist, x string, ohm float64, wave string) {
	back := "b" + x
	if b.device.kelvin {
		back = x + "s"
	}
	n.line("V%sg %sg0 %s %s", x, x, back, wave)
	n.line("R%sg0 %sg0 %sg1 %.6g", x, x, x, b.driverOhm+ohm/float64(b.bank))
	n.line("L%sg %sg1 g%s %.6g", x, x, x, b.gateCoil)
}

// network writes the networks; the lead is at the moving end, the capacitor at the rail.
func (b modelBoard) network(n *netlist, bus float64, opening bool) {
	if b.net.kind == "none" {
		return
	}
	b.oneNetwork(n, "ln", "tl", "bl", "rail", false)
	if b.leg {
		b.oneNetwork(n, "un", "bu", "tu", "0", true)
	}
	if b.net.kind == "clamp" {
		n.line(".ic v(ln2)=%.6g", b.net.held)
		if b.leg {
			n.line(".ic v(un2)=%.6g", bus-b.net.held)
		}
	} else if opening && b.net.residual > 0 {
		n.line(".ic v(ln2)=%.6g", b.net.residual*bus/b.bus)
	}
}

// oneNetwork writes one; a mirrored one has its diode the other way round.
func (b modelBoard) oneNetwork(n *netlist, x, moving, own, other string, mirrored bool) {
	n.coil(x, moving, x+"1", b.net.lead)
	anode, cathode := x+"1", x+"2"
	if mirrored {
		anode, cathode = cathode, anode
	}
	inner := x + "2"
	switch b.net.kind {
	case "capacitor":
		inner = x + "1"
	case "rc":
		n.line("R%sr %s1 %s2 %.6g", x, x, x, b.net.ohm)
	case "rcd":
		b.net.diode.put(n, x+"w", anode, cathode)
		n.line("R%sr %s1 %s2 %.6g", x, x, x, b.net.ohm)
	case "clamp":
		b.net.diode.put(n, x+"w", anode, cathode)
		if b.net.back == "rail" {
			other = own
		}
		n.line("R%sr %s2 %s %.6g", x, x, other, b.net.ohm)
	}
	n.line("C%sc %s %s %.6g", x, inner, own, b.net.farad)
}
