package stress

import (
	"math"
	"math/rand/v2"
)

// modelNetworks are the networks of the reference boards.
var modelNetworks = []string{"none", "rc", "rcd", "capacitor", "clamp"}

// modelNet is the network across each switch of a leg, or across the one of a chopper.
type modelNet struct {
	kind                             string
	farad, ohm, lead, held, residual float64 // F, Ω, H; V of a clamp; V left on a capacitor when the switch opens
	back                             string  // where a clamp's resistor leads: bus or rail
	diode                            modelDiode
	sized                            string // well, or badly
}

// modelBoard is one board of the reference, in SI units.
type modelBoard struct {
	seed                                 uint64
	build                                string
	leg, silent                          bool // silent: nobody measured loop, leads and packages
	bank                                 int
	device                               modelSwitch // one of the bank
	diode                                modelDiode  // of a chopper
	bus, amps                            float64
	on, off, onOhm, offOhm               float64 // V, V, Ω, Ω of one device
	driverOhm, driverTime, gateCoil      float64
	store, esr, esl, supply              float64
	loop, loopOhm                        float64
	stray, strayOhm                      float64    // F, Ω: midpoint to ground, by heat sink, cable and winding
	split                                [4]float64 // of the loop: bus to upper switch, midpoint, lower switch, back
	ringQ                                float64
	net                                  modelNet
	onTime, frequency                    float64
	sheetOhm, sheetFixture, sheetOff     float64 // Ω, H, V of the maker's test
	sheetShare, recoverySlope, sheetAmps float64 // test voltage over the rating; A/s; A
	loopError, leadError, packError      float64 // what the bench read of them over what is true
	wholeFall                            bool    // the current is followed down to a tenth, tail and all
	data                                 modelSheet
	captureBus, captureAmps              float64 // shares of bus and current at which a capture was made
}

// measuredLoop is the loop that a bench measurement finds: copper, the bus capacitors' own, and a chopper's diode.
func (b modelBoard) measuredLoop() float64 {
	if b.leg {
		return b.loop + b.esl
	}
	return b.loop + b.esl + b.diode.pack
}

type drawing struct{ *rand.Rand }

// decade draws evenly on a logarithmic scale, flat on a straight one.
func (r drawing) decade(low, high float64) float64 { return low * math.Pow(high/low, r.Float64()) }
func (r drawing) flat(low, high float64) float64   { return low + (high-low)*r.Float64() }

// between are the ends of a range.
type between [2]float64

// layer draws a depletion layer: its capacitance at no voltage over the base and that base, in units of farad; the
// knee and how steeply it falls.
func (r drawing) layer(farad float64, top, knee, steep, base between) modelCurve {
	c := modelCurve{top: farad * r.decade(top[0], top[1]), knee: r.flat(knee[0], knee[1]), steep: r.flat(steep[0], steep[1])}
	c.base = farad * r.decade(base[0], base[1])
	return c
}

// column draws the capacitance of a superjunction part.
func (r drawing) column(farad float64, top, knee, base between) modelCurve {
	c := modelCurve{top: farad * r.decade(top[0], top[1]), knee: r.flat(knee[0], knee[1]), column: true}
	c.base = farad * r.decade(base[0], base[1])
	return c
}

func (r drawing) chance(p float64) bool { return r.Float64() < p }
func pick[T any](r drawing, of ...T) T  { return of[r.IntN(len(of))] }

// e12 is the nearest value of the E12 series.
func e12(v float64) float64 {
	step := math.Pow(10, math.Floor(math.Log10(v)))
	best := 0.0
	for _, m := range []float64{1, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2, 10} {
		if best == 0 || math.Abs(math.Log(m*step/v)) < math.Abs(math.Log(best/v)) {
			best = m * step
		}
	}
	return best
}

// drawModel draws the board of a number: IGBT and MOSFET boards in turn, each with the five networks in turn, one of
// four a chopper. Ranges are judgement, after what data sheets and layouts of such drives have.
func drawModel(n uint64) modelBoard {
	family := "igbt"
	if n%2 == 1 {
		family = "mosfet"
	}
	return drawModelOf(n, family, modelNetworks[n/2%5])
}

// drawModelOf draws a board of a family (igbt, mosfet, sic-mosfet) with a network.
func drawModelOf(n uint64, family, net string) modelBoard {
	r := drawing{rand.New(rand.NewPCG((n+1)*0x9e3779b97f4a7c15, (n+1)*0xd1b54a32d192ed03))}
	r.Uint64() // the first of neighbouring seeds are alike
	b := modelBoard{seed: n, leg: r.chance(0.75), bank: 1}
	switch {
	case family == "igbt":
		b.igbt(r)
	case family == "sic-mosfet":
		b.carbide(r)
	case r.chance(0.6):
		b.lowVoltage(r)
	default:
		b.highVoltage(r)
	}
	b.bus, b.amps = math.Round(b.bus), roundTo(b.amps, 3)
	b.surroundings(r)
	if !b.leg {
		b.freewheelDiode(r)
	}
	b.sizeNet(r, net)
	return b
}

// roundTo rounds to so many significant digits.
func roundTo(v float64, digits int) float64 {
	if v == 0 {
		return 0
	}
	step := math.Pow(10, float64(digits)-1-math.Floor(math.Log10(math.Abs(v))))
	return math.Round(v*step) / step
}

// bodyDiode draws a diode of a device: drop, slope times rated current, lifetime, transit over lifetime.
func (r drawing) bodyDiode(amps, rated float64, drop between, slope float64, lifetime, transit between) modelDiode {
	d := modelDiode{drop: r.flat(drop[0], drop[1]), ohm: slope / amps, amps: amps, rated: rated}
	d.lifetime = r.decade(lifetime[0], lifetime[1])
	d.transit = d.lifetime * r.decade(transit[0], transit[1])
	return d
}

// surroundings: driver, bus capacitors, loop and what the bench read of it. A driver's own resistance, some ohms, is in
// nobody's drawing. Film beside the electrolytics makes the bank's inductance small; the loop counts it apart.
func (b *modelBoard) surroundings(r drawing) {
	b.sheetAmps = b.device.amps
	if b.device.kind != "igbt" {
		b.sheetAmps = roundTo(0.5*b.device.amps, 2)
	}
	b.driverOhm, b.driverTime, b.gateCoil = r.decade(0.3, 3), r.decade(8e-9, 40e-9), r.decade(5e-9, 25e-9)
	if b.device.rated <= 150 {
		b.gateCoil = r.decade(3e-9, 12e-9)
	}
	b.store = e12(b.amps / b.bus * r.decade(1e-3, 5e-3))
	b.esr, b.esl = r.decade(5e-3, 25e-3)*r.decade(1, 3)*min(1, 1e-3/b.store), r.decade(0.05, 0.2)*b.loop
	b.supply = r.decade(1e-6, 20e-6)
	b.loopOhm = r.decade(1e-3, 10e-3)
	b.stray, b.strayOhm = r.decade(30e-12, 200e-12), r.decade(5, 40)
	share := r.flat(0.3, 0.8)
	b.split = [4]float64{share * r.flat(0.4, 0.6), (1 - share) * 0.5, (1 - share) * 0.5, 0}
	b.split[3] = 1 - b.split[0] - b.split[1] - b.split[2]
	b.ringQ = r.decade(8, 30)
	b.frequency = r.decade(4e3, 20e3)
	b.silent = r.chance(0.5)
	b.loopError, b.leadError, b.packError = r.flat(0.84, 1.24), r.flat(0.84, 1.24), r.flat(0.84, 1.24)
	b.captureBus, b.captureAmps = r.flat(0.4, 0.6), r.flat(0.4, 0.6)
}

// freewheelDiode is the diode of a chopper: sized for the current of the board, Schottky up to 100 V (some), silicon
// carbide from 600 V on (some), else fast recovery silicon.
func (b *modelBoard) freewheelDiode(r drawing) {
	d := modelDiode{amps: roundTo(b.amps*r.flat(1, 1.5), 2), rated: b.device.rated, pack: r.decade(5e-9, 12e-9)}
	volts := d.rated / 600
	schottky := d.rated <= 100 && r.chance(0.6) || d.rated >= 600 && r.chance(0.15)
	d.drop, d.ohm, d.lifetime = r.flat(0.75, 1), 0.4/d.amps, math.Sqrt(volts)*r.decade(30e-9, 120e-9)
	d.transit = d.lifetime * r.decade(0.3, 1)
	d.recover(max(1, volts*r.decade(4, 12)), r.decade(3e-9, 10e-9))
	d.junction = r.layer(d.amps*1e-12, between{8, 25}, between{0.6, 1}, between{0.4, 0.55}, between{0.1, 0.5})
	if schottky {
		d.drop, d.lifetime, d.transit = r.flat(0.4, 0.8), 2e-9, 2e-9
		d.recover(0.1, 5e-9)
		d.junction.top = d.amps * r.decade(40e-12, 100e-12)
	}
	b.diode, b.recoverySlope = d, pick(r, 100e6, 200e6, 500e6)
}

// sizeNet sizes the network by the usual rules, one of five badly: an RC at the ring's impedance with two to five times
// the capacitance that rings; an RCD that takes the current over during the fall; a bare capacitor of one to four
// times what rings; a clamp that holds some per cent over the bus.
func (b *modelBoard) sizeNet(r drawing, kind string) {
	b.net = modelNet{kind: kind, sized: "well", back: "bus"}
	if kind == "none" {
		return
	}
	net := &b.net
	low := b.device.rated <= 150
	net.lead = r.decade(8e-9, 40e-9)
	if low {
		net.lead = r.decade(2e-9, 10e-9)
	}
	bank := float64(b.bank)
	rings := 2 * bank * b.device.output(b.bus)
	if !b.leg {
		rings = bank*b.device.output(b.bus) + b.diode.junction.at(b.bus)
	}
	impedance := math.Sqrt((b.loop + b.device.drain + b.device.source) / rings)
	fall := 1.5 * (b.offOhm + b.device.gateOhm) * (b.device.gateEmitter + b.device.gateCollector.at(b.bus))
	fall = max(fall, 25e-9)
	switch kind {
	case "rc":
		net.farad, net.ohm = rings*r.decade(2, 5), impedance*r.flat(0.6, 1.4)
	case "rcd":
		net.farad = b.amps * fall / (2 * b.bus) * r.decade(0.3, 2)
		net.ohm = b.bus / b.amps * r.decade(2, 10)
	case "capacitor":
		net.farad = rings * r.decade(1, 4)
	case "clamp":
		net.held = roundTo(b.bus*r.flat(1.05, 1.25), 3)
		net.farad = (b.loop + b.device.drain) * b.amps * b.amps / (net.held - b.bus) / (net.held - b.bus) * r.decade(5, 15)
		heat := (b.loop + b.device.drain) * b.amps * b.amps * b.frequency / 2
		net.ohm = (net.held - b.bus) * (net.held - b.bus) / heat
		if r.chance(0.3) {
			net.back, net.ohm = "rail", net.held*(net.held-b.bus)/heat
		}
	}
	if r.chance(0.2) {
		net.sized = "badly"
		net.ohm *= r.decade(0.25, 4)
		net.farad *= pick(r, 0.3, 3)
		net.lead *= r.decade(1, 2.5)
	}
	net.farad = e12(max(net.farad, 100e-12))
	if net.ohm > 0 {
		net.ohm = e12(max(net.ohm, 0.47))
	}
	b.onTime = max(2e-6, net.ohm*net.farad*r.decade(2, 6))
	if kind == "rc" || kind == "rcd" {
		net.residual = b.bus * math.Exp(-b.onTime/(net.ohm*net.farad))
	}
	net.diode = b.netDiode(r)
}

// netDiode is an ultrafast diode, for low voltages mostly a Schottky.
func (b *modelBoard) netDiode(r drawing) modelDiode {
	d := modelDiode{amps: max(1, 0.3*b.amps), rated: b.device.rated, drop: r.flat(0.7, 1), lifetime: r.decade(20e-9, 50e-9)}
	d.ohm, d.transit = 0.5/d.amps, d.lifetime*r.decade(0.15, 0.5)
	d.recover(max(1, d.rated/600*r.decade(4, 12)), r.decade(2e-9, 6e-9))
	d.junction = modelCurve{top: d.amps * r.decade(10e-12, 25e-12), knee: 0.8, steep: 0.45}
	if d.rated <= 100 && r.chance(0.6) {
		d.drop, d.lifetime, d.transit = r.flat(0.35, 0.6), 2e-9, 2e-9
		d.recover(0.1, 5e-9)
	}
	return d
}
