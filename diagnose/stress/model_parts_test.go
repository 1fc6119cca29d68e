package stress

import "math"

// gateResistors: data sheets test with a resistance that falls with the part's size; boards take up to seven times
// that to keep slopes and interference down, and open as fast as they close, or faster.
func (b *modelBoard) gateResistors(r drawing, ohmAmps, most float64) {
	b.sheetOhm = e12(max(ohmAmps/b.device.amps, 1))
	b.onOhm = e12(b.sheetOhm * r.decade(1, most))
	b.offOhm = b.onOhm
	if r.chance(0.5) {
		b.offOhm = e12(b.onOhm * r.decade(0.3, 1))
	}
}

// igbt: 600 V parts on 230 V mains, 1200 V parts on 400 V mains; discrete ones up to 75 A, four at most in parallel,
// or modules up to 300 A. Capacitances per ampere as of trench and of planar chips. The gate takes three to four and
// a half volts over the threshold at the rated current. The part of the current that holes carry (25 to 50 %) lags
// the channel, 5 to 30 % are tail, hot.
func (b *modelBoard) igbt(r drawing) {
	d := modelSwitch{kind: "igbt", family: "igbt", rated: 1200}
	b.bus = r.flat(500, 750)
	if r.chance(0.5) {
		d.rated, b.bus = pick(r, 600.0, 650), r.flat(250, 400)
	}
	b.build = "to-247"
	if r.chance(0.35) {
		b.build = pick(r, "module-busbar", "module-busbar", "module-wired")
	}
	if b.build == "to-247" {
		d.amps, b.bank = pick(r, 15.0, 20, 25, 30, 40, 50, 60, 75), pick(r, 1, 1, 1, 2, 2, 3, 4)
		d.drain, d.source, d.kelvin = r.decade(3e-9, 6e-9), r.decade(5e-9, 8e-9), false
	} else {
		d.amps = pick(r, 50.0, 75, 100, 150, 200, 300)
		d.drain, d.source, d.kelvin = r.decade(8e-9, 16e-9), r.decade(6e-9, 12e-9), true
	}
	a := d.amps
	d.threshold, d.knee, d.early, d.ohm = r.flat(4.8, 6.3), r.flat(1, 3), r.flat(0, 4e-4), 0
	over := r.flat(3, 4.5)
	d.gain = a * (over + 2*d.knee) / (over * over)
	d.gateEmitter = a * r.decade(45e-12, 95e-12)
	d.gateCollector = r.layer(a*1e-12, between{15, 80}, between{0.7, 1.5}, between{0.5, 0.75}, between{0.05, 0.2})
	d.collectorEmitter = r.layer(a*1e-12, between{20, 45}, between{0.6, 1}, between{0.42, 0.6}, between{0.3, 0.8})
	d.gateOhm = r.flat(0, 3)
	if a >= 75 {
		d.gateOhm = r.flat(0, 8) * 75 / a
	}
	high := d.rated / 600
	d.plasma, d.plasmaTime = r.flat(0.25, 0.5), high*r.decade(12e-9, 30e-9)
	d.tail, d.tailTime, d.sweep = r.flat(0.05, 0.3), r.decade(50e-9, 500e-9), high*r.decade(15e-9, 60e-9)
	d.diode = r.bodyDiode(a, d.rated, between{0.8, 1.1}, 0.4, between{high * 45e-9, high * 130e-9}, between{0.25, 0.9})
	d.diode.recover(high*r.decade(4, 15), r.decade(4e-9, 12e-9))
	b.device, b.amps = d, min(200, max(10, a*float64(b.bank)*r.decade(0.35, 1.2)))
	b.loop = min(200e-9, max(16e-9, r.decade(25e-9, 95e-9)*high*math.Pow(50/b.amps, 0.5)))
	b.gateResistors(r, r.decade(300, 700), 4)
	b.on, b.off, b.sheetOff = 15, pick(r, 0.0, 0, -5, -8), pick(r, 0.0, 0, -15)
	if b.build != "to-247" {
		b.off, b.sheetOff = pick(r, -8.0, -10, -15), -15
	}
	b.sheetFixture, b.sheetShare = r.decade(30e-9, 60e-9), pick(r, 0.5, 0.65)
	b.recoverySlope = a / r.decade(30e-9, 100e-9)
}

// lowVoltage: 60 to 150 V parts on batteries of 12 to 96 V, on the board's copper or in TO-220; a load well below the
// rated current, which the chip alone would stand. Body diodes of 12 to 35 ns.
func (b *modelBoard) lowVoltage(r drawing) {
	d := modelSwitch{kind: "mosfet", family: "low-voltage", rated: pick(r, 60.0, 80, 100, 100, 150)}
	b.bus = d.rated * r.flat(0.22, 0.56)
	b.bus = min(max(b.bus, 12), 96)
	d.amps, b.bank, b.build = r.decade(40, 200), pick(r, 1, 1, 1, 2, 2, 3, 4), pick(r, "surface-mount", "to-220")
	d.amps = roundTo(d.amps, 2)
	a := d.amps
	d.drain, d.source = r.decade(0.4e-9, 1.5e-9), r.decade(0.6e-9, 2e-9)
	if b.build == "to-220" {
		d.drain, d.source = r.decade(2e-9, 4e-9), r.decade(4e-9, 7.5e-9)
	}
	d.threshold, d.knee, d.early = r.flat(2.2, 3.6), r.flat(1, 3), r.flat(0, 2e-3)
	over := r.flat(1.6, 2.8)
	d.gain, d.ohm = a*(over+2*d.knee)/(over*over), r.decade(0.2, 0.5)*d.rated/100/a
	d.gateEmitter = a * r.decade(40e-12, 90e-12)
	volts := a * 100 / d.rated
	d.gateCollector = r.layer(volts*1e-12, between{3, 12}, between{0.8, 3}, between{0.55, 0.9}, between{0.1, 0.4})
	d.collectorEmitter = r.layer(volts*1e-12, between{30, 80}, between{0.7, 2}, between{0.4, 0.65}, between{0.5, 2})
	d.gateOhm = r.flat(0.6, 2.5)
	d.diode = r.bodyDiode(a, d.rated, between{0.65, 0.8}, 0.15, between{12e-9, 35e-9}, between{0.25, 0.9})
	d.diode.recover(r.decade(0.5, 2.5), r.decade(1.5e-9, 4e-9))
	b.device, b.amps = d, min(200, max(5, a*float64(b.bank)*r.decade(0.1, 0.5)))
	b.loop = min(45e-9, max(4e-9, r.decade(6e-9, 20e-9)*math.Pow(40/b.amps, 0.4)))
	if b.build == "to-220" {
		b.loop = min(60e-9, 1.6*b.loop)
	}
	b.gateResistors(r, r.decade(200, 500), 7)
	b.on, b.off, b.sheetOff = pick(r, 10.0, 12), 0, 0
	b.sheetFixture, b.sheetShare = r.decade(5e-9, 15e-9), 0.5
	b.recoverySlope = 100e6
}

// highVoltage: 600 and 650 V parts on rectified mains, planar chips or superjunction ones with a fast body diode, whose
// capacitances fall at once at some ten volts.
func (b *modelBoard) highVoltage(r drawing) {
	d := modelSwitch{kind: "mosfet", family: "planar", rated: pick(r, 600.0, 650)}
	b.bus, b.build = r.flat(200, 420), pick(r, "to-247", "to-247", "to-220")
	d.amps, b.bank = pick(r, 8.0, 11, 15, 20, 30, 47), pick(r, 1, 1, 1, 2)
	a := d.amps
	d.drain, d.source = r.decade(2.5e-9, 5e-9), r.decade(4e-9, 8e-9)
	d.threshold, d.knee, d.early = r.flat(2.8, 4.2), r.flat(0.8, 2.5), r.flat(0, 3e-4)
	over := r.flat(2, 3.5)
	d.gain, d.ohm = a*(over+2*d.knee)/(over*over), r.decade(2, 4)/a
	d.gateEmitter = a * r.decade(70e-12, 160e-12)
	d.gateCollector = r.layer(a*1e-12, between{40, 100}, between{0.8, 1.5}, between{0.6, 0.85}, between{0.2, 0.6})
	d.collectorEmitter = r.layer(a*1e-12, between{60, 130}, between{0.7, 1}, between{0.42, 0.6}, between{0.5, 1})
	if r.chance(0.55) {
		d.family = "superjunction"
		d.gateCollector = r.column(a*1e-12, between{20, 80}, between{4, 12}, between{0.08, 0.3})
		d.collectorEmitter = r.column(a*1e-12, between{150, 400}, between{7, 15}, between{1.2, 2.5})
	}
	d.gateOhm = r.flat(0.8, 5)
	d.diode = r.bodyDiode(a, d.rated, between{0.7, 0.9}, 0.3, between{40e-9, 120e-9}, between{0.2, 0.8})
	d.diode.recover(r.decade(2, 8), r.decade(3e-9, 10e-9))
	b.device, b.amps = d, max(5, a*float64(b.bank)*r.decade(0.25, 0.9))
	b.loop = min(150e-9, max(15e-9, r.decade(18e-9, 65e-9)*math.Pow(20/b.amps, 0.4)))
	b.gateResistors(r, r.decade(100, 250), 6)
	b.on, b.off, b.sheetOff = pick(r, 10.0, 12, 15), 0, 0
	b.sheetFixture, b.sheetShare = r.decade(25e-9, 60e-9), pick(r, 0.5, 0.62)
	b.recoverySlope = 100e6
}

// carbide: 1200 V silicon carbide on 500 to 800 V.
func (b *modelBoard) carbide(r drawing) {
	d := modelSwitch{kind: "sic-mosfet", family: "carbide", rated: 1200}
	b.bus, b.build = r.flat(500, 800), "to-247"
	d.amps, b.bank = pick(r, 20.0, 30, 40, 60, 100), pick(r, 1, 1, 2)
	a := d.amps
	d.drain, d.source, d.kelvin = r.decade(3e-9, 6e-9), r.decade(4e-9, 8e-9), r.chance(0.5)
	d.threshold, d.knee, d.early = r.flat(2.2, 3.5), r.flat(2, 5), r.flat(0, 4e-4)
	over := r.flat(4, 7)
	d.gain, d.ohm = a*(over+2*d.knee)/(over*over), r.decade(1.2, 2.4)/a
	d.gateEmitter = a * r.decade(25e-12, 45e-12)
	d.gateCollector = r.layer(a*1e-12, between{8, 20}, between{1.5, 4}, between{0.7, 0.95}, between{0.06, 0.2})
	d.collectorEmitter = r.layer(a*1e-12, between{25, 60}, between{1.5, 3}, between{0.45, 0.55}, between{0.3, 0.8})
	d.gateOhm = r.flat(0.8, 5)
	d.diode = r.bodyDiode(a, d.rated, between{2.2, 3}, 1.2, between{8e-9, 25e-9}, between{0.25, 0.6})
	d.diode.recover(r.decade(1, 3), r.decade(1.5e-9, 4e-9))
	b.device, b.amps = d, max(10, a*float64(b.bank)*r.decade(0.3, 0.9))
	b.loop = min(100e-9, max(12e-9, r.decade(18e-9, 60e-9)*math.Pow(40/b.amps, 0.4)))
	b.gateResistors(r, r.decade(100, 250), 6)
	b.on, b.off, b.sheetOff = pick(r, 15.0, 18), pick(r, 0.0, -4), -4
	b.sheetFixture, b.sheetShare = r.decade(15e-9, 40e-9), 0.66
	b.recoverySlope = a / r.decade(15e-9, 40e-9)
}
