package stress

import (
	"fmt"
	"math"
	"strings"
)

// deck is a netlist being written for one board, straight from its numbers. Two-terminal elements go through put: a
// leg that is written upside down is the same list with both rails exchanged and every element turned round.
type deck struct {
	b       sample
	text    strings.Builder
	turned  bool
	models  int
	heats   []heat
	upwards bool // an inductance lies between the bus and the leg
}

// heat is an energy to be integrated: its name and the power as an expression.
type heat struct{ name, power string }

func (d *deck) line(format string, args ...any) { fmt.Fprintf(&d.text, format+"\n", args...) }

// node gives a node of the leg that is being written.
func (d *deck) node(name string) string {
	switch {
	case !d.turned:
		return name
	case name == "rail":
		return "neg"
	case name == "neg":
		return "rail"
	case name == "0":
		return "local"
	case name == "local":
		return "0"
	}
	return name + "t"
}

// put writes an element between two nodes of the leg.
func (d *deck) put(name, a, b, format string, args ...any) {
	a, b = d.node(a), d.node(b)
	if d.turned {
		name, a, b = name+"t", b, a
	}
	d.line("%s %s %s %s", name, a, b, fmt.Sprintf(format, args...))
}

func (d *deck) volts(a, b string) string {
	if b == "0" {
		return "v(" + a + ")"
	}
	return "(v(" + a + ")-v(" + b + "))"
}

// diode is the diode of ngspice with a sharp knee and a source for its drop, less the few millivolts that the junction
// itself takes; the source is also the meter of its current, v + name.
func (d *deck) diode(name, anode, cathode string, drop, ohm float64) {
	const saturation, thermal = 1e-9, 0.01 * 0.025865
	d.models++
	d.put("d"+name, anode, name+"d", "m%d", d.models)
	d.put("v"+name, name+"d", cathode, "dc %.12g", drop-thermal*math.Log(d.b.amps/saturation))
	d.line(".model m%d d(is=%g n=0.01 rs=%.12g)", d.models, saturation, ohm)
}

// recovering is a diode followed by R = V/I beside L = R·t/3.
func (d *deck) recovering(name, anode, cathode string, drop, ohm, volts, time float64) {
	damp := volts / d.b.amps
	d.diode(name, anode, name+"x", drop, ohm)
	d.put("r"+name+"x", name+"x", cathode, "%.12g", damp)
	d.put("l"+name+"x", name+"x", cathode, "%.12g ic=0", damp*time/3)
}

// warm notes an energy, of the leg of the victim only.
func (d *deck) warm(name, power string) {
	if !d.turned {
		d.heats = append(d.heats, heat{name, power})
	}
}

// supply writes the bus up to the local rail of the leg, which draws a current in the beginning; the supply always
// brings the mean current, here that of the load.
func (d *deck) supply(drawn float64) {
	b := d.b
	d.upwards = b.net == "decoupling" || b.topology == "all-off"
	rail, neg := "local", "0"
	if d.upwards {
		rail = "rail"
	}
	if b.halved() {
		neg = "neg"
	}
	if b.store == 0 {
		d.line("vsup %s %s dc %.12g", rail, neg, b.bus)
	} else {
		d.line("vsup sup %s dc %.12g", neg, b.bus)
		d.line("lsup sup %s %.12g ic=%.12g", rail, b.supply, b.amps)
		d.line("lesl %s esl %.12g ic=%.12g", rail, b.esl, b.amps-drawn)
		d.line("resr esl bank %.12g", b.esr)
		d.line("cbank bank %s %.12g ic=%.12g", neg, b.store, b.bus)
	}
	d.stray("local", "0", b.bus)
	if !d.upwards {
		return
	}
	d.stray("rail", "0", b.bus)
	ohm, link := b.ohm, b.loop-b.leg
	if b.halved() {
		ohm, link = ohm/2, link/2
		d.line("rlinkn linkn neg %.12g", ohm)
		d.line("llinkn 0 linkn %.12g ic=%.12g", link, drawn)
		d.stray("neg", "0", 0)
	}
	d.line("rlink rail link %.12g", ohm)
	d.line("llink link local %.12g ic=%.12g", link, drawn)
	d.warm("loop-resistance", fmt.Sprintf("i(llink)^2*%.12g", b.ohm))
}

// strayFarad and strayOhm are what ngspice needs at every node between inductances, where it otherwise loses itself in
// vanishing steps: a tenth of the smallest capacitance on such a node, quietened by the resistor.
const (
	strayFarad = 0.2e-12
	strayOhm   = 300
)

func (d *deck) stray(node, still string, volt float64) {
	d.put("rstr"+node, node, node+"y", "%d", strayOhm)
	d.put("cstr"+node, node+"y", still, "%.12g ic=%.12g", strayFarad, volt)
}

// part is one device as a deck has it.
type part struct{ pack, farad, volt, held float64 }

// leg writes the commutation cell without channel, opposite diode and load: the lower device carries current in the
// beginning, the upper one the rest of the load's.
func (d *deck) leg(lower, upper part, current float64) {
	b := d.b
	loop, from := b.loop, "load"
	if d.upwards {
		loop = b.leg
	} else {
		d.put("rloop", "load", "loop", "%.12g", b.ohm)
		d.warm("loop-resistance", fmt.Sprintf("i(lloop)^2*%.12g", b.ohm))
		from = "loop"
	}
	d.put("lloop", from, "term", "%.12g ic=%.12g", loop, current)
	d.put("lpack", "term", "chip", "%.12g ic=%.12g", lower.pack, current)
	midpoint := lower.volt // at an opening; at a closing the upper diode holds it to the bus
	if current == 0 {
		midpoint = b.bus - upper.volt
	}
	d.stray("load", "0", midpoint)
	d.stray("term", "0", lower.volt)
	if b.at > 0 {
		d.put("cout", "chip", "0", "Q='%.12g*(sqrt(max(v(chip),-0.7)+0.8)-sqrt(0.8))'", 2*lower.farad*math.Sqrt(b.at+0.8))
	} else {
		d.put("cout", "chip", "0", "%.12g ic=%.12g", lower.farad, lower.volt)
	}
	d.diode("rev", "0", "chip", 0.9, 0.005)
	if upper.pack > 0 {
		d.put("lfar", "local", "far", "%.12g ic=%.12g", upper.pack, current-b.amps)
	} else {
		d.put("rfar", "local", "far", "1e-6")
	}
	if b.topology != "unclamped" {
		d.put("cfar", "far", "load", "%.12g ic=%.12g", math.Max(upper.farad, strayFarad), upper.volt)
	}
	switch {
	case b.net == "none":
	case b.net == "decoupling":
		d.put("ldec", "local", "dec1", "%.12g ic=0", b.lead)
		d.put("rdec", "dec1", "dec2", "%.12g", b.resistance)
		d.put("cdec", "dec2", "0", "%.12g ic=%.12g", b.capacitance, b.bus)
		d.warm("snubber-resistor", fmt.Sprintf("i(ldec)^2*%.12g", b.resistance))
	default:
		if !b.moved {
			d.network("s", "", "term", "0", d.bar("local"), false, lower.held)
		}
		if b.moved || b.topology == "leg" || b.topology == "all-off" {
			d.network("f", "opposite-", "load", "local", d.bar("0"), true, upper.held)
		}
	}
}

// halved tells that a bridge has to be written with half of its link in either rail: a network with a way back to the
// bank makes the two rails differ, else it does not matter where the link lies.
func (b sample) halved() bool {
	return b.topology == "all-off" && (b.net == "recovery" && !b.open || b.net == "clamp" && b.back)
}

// bar is where at the bank a way back to the other rail ends.
func (d *deck) bar(rail string) string {
	switch {
	case !d.b.halved():
		return rail
	case rail == "local":
		return "rail"
	}
	return "neg"
}

// network writes the network of one device from its moving terminal to its rail end; up: the rail end is the positive
// one.
func (d *deck) network(n, word, moving, still, over string, up bool, held float64) {
	b := d.b
	way := func(name, a, z, format string, args ...any) {
		if up {
			a, z = z, a
		}
		d.put(name, a, z, format, args...)
	}
	s1, s2 := n+"1", n+"2"
	d.put("l"+n, moving, s1, "%.12g ic=0", b.lead)
	diode := func() {
		ends := [2]string{s1, s2}
		if up {
			ends = [2]string{s2, s1}
		}
		d.stray(s1, still, 0)
		d.recovering(n+"d", ends[0], ends[1], b.diodeDrop, b.diodeOhm, b.diodeV, b.diodeT)
		d.warm(word+"snubber-diode", d.volts(ends[0], ends[1])+"*i(v"+n+"d)")
	}
	resistor := func(a, z string) {
		d.put("r"+n, a, z, "%.12g", b.resistance)
		d.warm(word+"snubber-resistor", fmt.Sprintf("%s^2/%.12g", d.volts(a, z), b.resistance))
	}
	switch b.net {
	case "capacitor":
		way("c"+n, s1, still, "%.12g ic=%.12g", b.capacitance, held)
	case "rc":
		resistor(s1, s2)
		way("c"+n, s2, still, "%.12g ic=%.12g", b.capacitance, held)
	case "rcd":
		diode()
		resistor(s1, s2)
		way("c"+n, s2, still, "%.12g ic=%.12g", b.capacitance, held)
	case "clamp":
		diode()
		way("c"+n, s2, still, "%.12g ic=%.12g", b.capacitance, b.clamp)
		if b.back {
			resistor(s2, over)
		} else {
			resistor(s2, still)
		}
	case "suppressor":
		ends := [2]string{s1, still}
		if up {
			ends = [2]string{still, s1}
		}
		d.diode(n+"z", ends[0], ends[1], b.clamp-1e-3*b.kneeOhm, b.kneeOhm)
		way("c"+n, s1, still, "%.12g ic=%.12g", b.capacitance, held)
		d.warm(word+"suppressor", d.volts(ends[0], ends[1])+"*i(v"+n+"z)")
	case "recovery":
		diode()
		way("c"+n, s2, still, "%.12g ic=%.12g", b.reservoir, b.bus)
		if !b.open {
			d.put("rt"+n, s2, n+"3", "%.12g", b.tieOhm)
			d.put("lt"+n, n+"3", over, "%.12g ic=0", b.tieHenry)
			d.warm(word+"snubber-link", fmt.Sprintf("i(lt%s)^2*%.12g", n, b.tieOhm))
		}
	}
}

// remains is what a network that empties through its resistor still holds when the switch opens.
func (b sample) remains() float64 {
	if b.net != "rc" && b.net != "rcd" {
		return 0
	}
	return b.bus * math.Exp(-b.onTime/(b.resistance*b.capacitance))
}

// opening writes everything of an opening but the channels. With all gates off it is the whole bridge: the load current
// comes from the other leg, which stands upside down, and both draw on one bus through one link.
func (b sample) opening() *deck {
	d := &deck{b: b}
	d.line("* opening: %s, %s", b.topology, b.net)
	d.supply(b.amps)
	lower := part{pack: b.pack / float64(b.bank), farad: b.farad * float64(b.bank), held: b.remains()}
	upper := part{farad: b.junction, volt: b.bus, held: b.bus}
	if b.topology == "leg" || b.topology == "all-off" {
		upper.pack, upper.farad = b.farPack/float64(b.farBank), b.farFarad*float64(b.farBank)
	}
	for _, turned := range []bool{false, true} {
		d.turned = turned
		if turned && b.topology != "all-off" {
			continue
		}
		d.leg(lower, upper, b.amps)
		if b.topology != "unclamped" {
			d.recovering("fw", "load", "far", b.drop, b.ownOhm, b.recoveryV, b.recoveryT)
			d.warm("freewheel", "(v(load)-v(far))*i(vfw)")
		}
	}
	d.turned = false
	switch b.topology {
	case "all-off":
		d.line("iload loadt load dc %.12g", b.amps)
	case "unclamped":
		d.line("lload local load %.12g ic=%.12g", b.henry, b.amps)
	default:
		d.line("iload local load dc %.12g", b.amps)
	}
	d.warm("switch", "v(chip)*i(vch)")
	return d
}

// channels writes what lies between chip and rail of every leg.
func (d *deck) channels(write func()) {
	for _, turned := range []bool{false, true} {
		if d.turned = turned; !turned || d.b.topology == "all-off" {
			d.put("vch", "chip", "ch", "dc 0")
			write()
		}
	}
	d.turned = false
}

// ramp holds the channel below a ramp of the chip's voltage, with which it lets go at a time.
func (d *deck) ramp(letGo float64) {
	b := d.b
	d.put("vramp", "ramp", "0", "pwl(0 0 %.12g %.12g %.12g 1e5)", letGo, letGo*b.slope, letGo+1e-8)
	d.diode("hold", "ch", "ramp", 0, 0.001)
}

// leastCarried is what the channel cannot let go of at once: what the output capacitance takes on the gate's ramp, or what
// it leaves when a network across the switch takes the current over.
func (b sample) leastCarried() float64 {
	taken := math.Min(b.amps, b.farad*float64(b.bank)*b.slope)
	if b.net == "none" || b.net == "decoupling" || b.moved {
		return taken
	}
	return b.amps - taken
}

// cosineFall is a raised cosine from amps as an expression, from a time on.
func cosineFall(from, length, amps float64) string {
	return fmt.Sprintf("((time < %.12g) ? %.12g*(1+cos(3.14159265358979*(time-%.12g)/%.12g)) : 0)", from+length, amps/2, from, length)
}

// wholeFall is how long the whole current takes on its raised cosine.
func (b sample) wholeFall() float64 {
	if b.kind == "igbt" {
		return b.fall / 0.59 / 1.6
	}
	return b.fall / 0.59
}

// inductance is all that the current of a closing meets.
func (b sample) inductance() float64 {
	loop := b.loop + b.pack/float64(b.bank)
	if b.topology == "leg" {
		loop += b.farPack / float64(b.farBank)
	}
	if b.net == "decoupling" { // the link lies behind it
		loop -= b.loop - b.leg
	}
	return loop
}

// blocks is how the victim's diode recovers.
type blocks struct{ amps, time, slope float64 }

// recover works it out, as measured at this current and slope: Q_a = Q_rr/(1+S), I_rr = √(2·Q_a·di/dt), τ = S·Q_a/I_rr, di/dt what the switch wants and the
// loop allows.
func (b sample) recover() blocks {
	bank := b.bank
	if b.topology == "leg" {
		bank = b.farBank
	}
	slope := math.Min(b.onSlope*float64(bank), (b.bus+b.drop)/b.inductance())
	diodes := 1 // a diode beside every switch of a leg; a chopper's is a single one
	if b.topology == "leg" {
		diodes = b.bank
	}
	charge := b.charge
	if b.topology == "leg" { // what its measurement had of the output capacitance
		charge = math.Max(charge-b.bus*b.farad, charge/2)
	}
	rising := charge * float64(diodes) / (1 + b.soft)
	amps := math.Sqrt(2 * rising * slope)
	return blocks{amps, b.soft * rising / amps, b.onSlope * float64(bank)}
}

// closed writes a closing: the lower device closes, the upper one is the victim, whose diode carried the load current.
// Until the diode blocks its recovery current is constant and the floor at nothing; at is that moment, level the
// voltage of the closing chip then.
func (b sample) closed(at, level float64) *deck {
	d := &deck{b: b}
	d.line("* closing: %s, %s", b.topology, b.net)
	d.supply(0)
	drop := b.drop + b.amps*b.ownOhm
	upper := part{pack: b.pack / float64(b.bank), farad: b.farad * float64(b.bank), volt: -drop}
	lower := part{pack: b.farPack / float64(b.farBank), farad: b.farFarad * float64(b.farBank), volt: b.bus + drop, held: b.bus}
	if b.topology == "chopper" {
		lower.pack, lower.farad = upper.pack, upper.farad
		upper.pack, upper.farad = 0, b.junction
	}
	// the current already rises evenly: what the loop takes of the bus is missing at the chip
	lower.volt = math.Max(lower.volt-b.recover().slope*b.inductance(), 0)
	d.leg(lower, upper, 0)
	d.line("iload local load dc %.12g", b.amps)
	d.diode("fw", "load", "far", b.drop, b.ownOhm)
	r := b.recover()
	if at > 0 {
		d.line("vrec far rec dc 0")
		d.line("brec rec load i=(time < %.12g) ? %.12g : %.12g*exp(-(time-%.12g)/%.12g)", at, r.amps, r.amps, at, r.time)
		d.line("vrecp recp 0 pwl(0 0 %.12g 0 %.12g 1)", at, at+1e-12) // a corner for the step control
	} else {
		d.line("irec far load dc %.12g", r.amps)
	}
	d.line("vch chip ch dc 0")
	most := 10 * (b.amps + r.amps)
	d.line("ich ch 0 pwl(0 0 %.12g %.12g)", most/r.slope, most)
	if level > 0 {
		// the gate lets the voltage fall at its slope at the bus, with the root of what is left of it
		whole := 2 * level / b.closing * math.Sqrt(b.bus/math.Max(level, b.bus/100))
		d.line("blevel floor 0 v=(time < %.12g) ? 0 : ((time < %.12g) ? %.12g*(1-(time-%.12g)/%.12g)^2 : 0)", at, at+whole, level, at, whole)
	} else {
		d.line("vlevel floor 0 dc 0")
	}
	d.diode("floor", "floor", "ch", 0, 1e-4)
	d.warm("switch", "v(chip)*i(vch)")
	if at > 0 {
		d.warm("freewheel", "(v(load)-v(far))*(i(vfw)-i(vrec))")
	}
	return d
}
