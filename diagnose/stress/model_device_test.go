package stress

import (
	"fmt"
	"math"
)

// This file and the others named model_* hold the reference that the margin is judged against: a leg or chopper whose
// switches are driven by their gates, solved by ngspice. It knows nothing of the edges, intervals and rules of the
// package: the margin sees of it only what a data sheet and a ruler would tell (model_keys_test.go).

// modelCurve is a capacitance that falls with its voltage: base + top/(1+v/knee)^steep as of a depletion layer, or
// base + top/(1+(v/knee)²) as of a column (superjunction) part, where the layer closes at once.
type modelCurve struct {
	top, knee, steep, base float64
	column                 bool
}

// at is the capacitance at v volts.
func (c modelCurve) at(v float64) float64 {
	v = max(v, 0)
	if c.column {
		return c.base + c.top/(1+v*v/c.knee/c.knee)
	}
	return c.base + c.top*math.Pow(1+v/c.knee, -c.steep)
}

// times is the curve of n parts.
func (c modelCurve) times(n float64) modelCurve {
	c.top, c.base = n*c.top, n*c.base
	return c
}

// charge is the charge at the voltage v, as an expression of ngspice.
func (c modelCurve) charge(v string) string {
	below := fmt.Sprintf("%.6g*min(%s,0)+%.6g*max(%s,0)", c.top+c.base, v, c.base, v)
	if c.column {
		return fmt.Sprintf("%s+%.6g*atan(max(%s,0)/%.6g)", below, c.top*c.knee, v, c.knee)
	}
	return fmt.Sprintf("%s+%.6g*(pow(1+max(%s,0)/%.6g,%.6g)-1)", below, c.top*c.knee/(1-c.steep), v, c.knee, 1-c.steep)
}

// put writes the capacitance between two nodes: a charge of 1 µC stands for 1 A in 1 µH, whose voltage then is the
// current in amperes. (ngspice's own capacitor with a charge does the same with 1 A for 1 C, far below its tolerances.)
func (c modelCurve) put(n *netlist, x, a, b string) {
	n.at(x, "Bq# 0 q# I=1e6*(%s)", c.charge(fmt.Sprintf("v(%s,%s)", a, b)))
	n.at(x, "Lq# q# 0 1u\nGq# %s %s q# 0 1", a, b)
}

// chargeTo is the charge from 0 to v in coulombs.
func (c modelCurve) chargeTo(v float64) float64 {
	if c.column {
		return c.base*v + c.top*c.knee*math.Atan(v/c.knee)
	}
	return c.base*v + c.top*c.knee/(1-c.steep)*(math.Pow(1+v/c.knee, 1-c.steep)-1)
}

// modelDiode is a diode by the charge-control model of Lauritzen and Ma, A simple diode model with reverse recovery,
// IEEE Trans. Power Electronics 6 (1991): i = (qE - qM)/TM, dqM/dt = i - qM/tau. The junction's charge qE is a
// rounded knee here and no exponential, so that it converges. Forward recovery after Ma and Lauritzen (1993): a series
// resistance that falls as the charge comes in, here with its own voltage for the length.
type modelDiode struct {
	drop, ohm, lifetime, transit float64 // V, Ω, s, s
	start, modulation            float64 // Ω before any charge is there; V
	junction                     modelCurve
	pack                         float64 // H, of a diode in a package of its own
	amps, rated                  float64
}

func (d modelDiode) times(n float64) modelDiode {
	d.ohm, d.start, d.amps, d.pack = d.ohm/n, d.start/n, d.amps*n, d.pack/n
	d.junction = d.junction.times(n)
	return d
}

// recover sets the forward recovery: a peak of v volts after t seconds, when the current rises by its rating in 100 ns;
// it is down to a fifth after ten times t. From v = sqrt(2·TM·VM·s·R0)/2 at t = sqrt(2·TM·VM/(s·R0)).
func (d *modelDiode) recover(v, t float64) {
	slope := d.amps / 100e-9
	d.start, d.modulation = 2*v/(slope*t), v*t/d.transit
}

// modelSwitch is one device, switched by its gate.
type modelSwitch struct {
	kind, family                       string
	rated, amps                        float64
	threshold, gain, knee, early, ohm  float64 // V, S, V, 1/V, Ω
	gateEmitter                        float64
	gateCollector, collectorEmitter    modelCurve
	gateOhm, drain, source             float64 // Ω, H, H
	kelvin                             bool
	plasma, plasmaTime, tail, tailTime float64 // shares of an IGBT's current that follow the channel late, and how late
	sweep                              float64 // s, charge per ampere that the rising voltage sweeps out of an IGBT
	diode                              modelDiode
}

func (s modelSwitch) times(n int) modelSwitch {
	k := float64(n)
	s.amps, s.gain, s.ohm, s.gateEmitter = s.amps*k, s.gain*k, s.ohm/k, s.gateEmitter*k
	s.gateCollector, s.collectorEmitter = s.gateCollector.times(k), s.collectorEmitter.times(k)
	s.gateOhm, s.drain, s.source, s.diode = s.gateOhm/k, s.drain/k, s.source/k, s.diode.times(k)
	return s
}

// output is the output capacitance at v.
func (s modelSwitch) output(v float64) float64 {
	return s.gateCollector.at(v) + s.collectorEmitter.at(v)
}

// plateau is the gate voltage at which the channel saturates at that current: the inverse of
// gain·u²/(u+2·knee), square law below the knee and straight beyond.
func (s modelSwitch) plateau(amps float64) float64 {
	a := amps / s.gain
	return s.threshold + (a+math.Sqrt(a*a+8*a*s.knee))/2
}

// put writes the device between the terminals d, g and src; names begin with x.
func (s modelSwitch) put(n *netlist, x, d, g, src string) {
	n.coil(x+"ld", d, x+"d", s.drain)
	n.coil(x+"ls", x+"s", src, s.source)
	n.at(x, "R#g %s #i %.6g\nC#ge #i #s %.6g", g, max(s.gateOhm, 0.01), s.gateEmitter)
	s.gateCollector.put(n, x+"gc", x+"d", x+"i")
	s.collectorEmitter.put(n, x+"ds", x+"d", x+"s")
	s.channel(n, x)
	s.diode.put(n, x+"w", x+"s", x+"d")
}

// channel writes the current through the channel. An IGBT's passes in three shares: at once, after the time the
// plasma needs, and as the tail; and while its voltage rises, the layer that widens sweeps stored charge out
// (Q·sqrt(v/rated), the layer's width going with the root of the voltage).
func (s modelSwitch) channel(n *netlist, x string) {
	n.at(x, "B#u #u 0 V=v(#i,#s)-%.6g\nB#v #v 0 V=0.5*(v(#u)+sqrt(v(#u)*v(#u)+0.01))", s.threshold)
	n.at(x, "B#k #k 0 V=%.6g*v(#v)*v(#v)/(v(#v)+%.6g)*(1+%.6g*max(v(#d,#s),0))", s.gain, 2*s.knee, s.early)
	if s.kind != "igbt" {
		n.at(x, "B#c #d #s I=v(#k)*tanh(v(#d,#s)/(%.6g*v(#k)+0.001))", s.ohm)
		return
	}
	n.at(x, "B#p #p 0 V=0.5*(v(#d,#s)+sqrt(v(#d,#s)*v(#d,#s)+0.01))\nB#m #m 0 V=v(#k)*tanh(v(#p)/1.5)")
	n.at(x, "R#m1 #m #m1 1k\nC#m1 #m1 0 %.6g\nR#m2 #m #m2 1k\nC#m2 #m2 0 %.6g", s.plasmaTime/1e3, s.tailTime/1e3)
	n.at(x, "B#c #d #s I=%.6g*v(#m)+(%.6g*v(#m1)+%.6g*v(#m2))*tanh(v(#p)/2)", 1-s.plasma-s.tail, s.plasma, s.tail)
	n.at(x, "B#x #x 0 V=sqrt((max(v(#p),0)+1)/%.6g)\nC#x #x #y 1n\nV#y #y 0 0", s.rated)
	n.at(x, "B#q #d #s I=%.6g*v(#m2)*(i(V#y)*1e9+sqrt((i(V#y)*1e9)^2+1e8))", 0.5*s.sweep)
}

// forward is the forward voltage at a steady current.
func (d modelDiode) forward(amps float64) float64 {
	share := d.lifetime / d.transit
	return d.drop + 0.08*(1+1/share)*amps/d.amps + d.ohm*amps + amps/(1/d.start+amps*share/d.modulation)
}

// put writes the diode from anode to cathode; its knee rises by 80 mV up to the rated current.
func (d modelDiode) put(n *netlist, x, anode, cathode string) {
	share := d.lifetime / d.transit
	n.at(x, "B#f %s #a I=v(%s,#a)*(%.6g+max(v(#q),0)/%.6g)", anode, anode, 1/d.start, d.modulation)
	n.at(x, "R# #a #j %.6g\nB#o #o 0 V=v(#j,%s)-%.6g", d.ohm, cathode, d.drop)
	n.at(x, "B#e #e 0 V=%.6g*(v(#o)+sqrt(v(#o)*v(#o)+4e-4))\nB#j #j %s I=v(#e)-v(#q)", 0.5*share*d.amps/0.08, cathode)
	n.at(x, "B#q 0 #q I=v(#e)-v(#q)\nC#q #q 0 %.6g\nR#q #q 0 %.6g", d.transit, share)
	if d.junction.top > 0 {
		d.junction.put(n, x+"c", cathode, anode)
	}
}
