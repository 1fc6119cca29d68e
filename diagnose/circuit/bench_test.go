package circuit

import (
	"math"
	"testing"
)

// snubbedEdge is the opening edge of a chopper with bus, loop, package, lead and an RCD network: eight states.
func snubbedEdge() *Circuit {
	c := New()
	supply, bus, esr := c.Node("supply"), c.Node("bus"), c.Node("esr")
	load, loop, term, chip := c.Node("load"), c.Node("loop"), c.Node("term"), c.Node("chip")
	lead, store := c.Node("lead"), c.Node("store")
	c.Voltage("V", supply, 0, Constant(310))
	c.Inductor("Lsupply", supply, bus, 5e-6, 2)
	c.Resistor("ESR", bus, esr, 40e-3)
	c.Capacitor("Cbus", esr, 0, 2200e-6, 310)
	c.Current("I", bus, load, Constant(20))
	c.Diode("Dfree", load, bus, 0.9, 5e-3)
	c.Inductor("Lloop", load, loop, 120e-9, 20)
	c.Resistor("Rloop", loop, term, 20e-3)
	c.Inductor("Lpackage", term, chip, 13e-9, 20)
	c.Capacitor("Coss", chip, 0, 750e-12, 0)
	c.Diode("Dreverse", 0, chip, 0.9, 5e-3)
	c.Current("channel", chip, 0, Waveform{{0, 20}, {120e-9, 0}})
	c.Inductor("Llead", term, lead, 20e-9, 0)
	c.Diode("Ds", lead, store, 0.9, 5e-3)
	c.Resistor("Rs", lead, store, 27)
	c.Capacitor("Cs", store, 0, 22e-9, 0)
	return c
}

func benchmarkEdge(b *testing.B, opts ...Option) {
	b.ReportAllocs()
	steps := 0
	for b.Loop() {
		c := snubbedEdge()
		r := begin(b, c, opts...)
		r.Probe(c.Node("chip"), 0)
		to(b, r, 2.5e-6)
		steps = r.steps
	}
	b.ReportMetric(float64(steps), "steps/op")
}

// BenchmarkEdgeChanged is an edge whose sources are changed where the chip reaches the bus: the ramp that held it jumps
// away and the channel's current falls on a curve of 64 pieces.
func BenchmarkEdgeChanged(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		c, _, chip := leg(0)
		c.Voltage("ramp", c.Node("ramp"), 0, Waveform{{0, 0}, {1e-6, 12e3}})
		c.Diode("hold", chip, c.Node("ramp"), 0, 1e-3)
		r := begin(b, c, WithoutEnergy(), WithoutTrace())
		if stop, err := r.To(1e-6, r.Probe(chip, 0), 310); err != nil || !stop {
			b.Fatal(stop, err)
		}
		at, amps := r.Time(), r.BranchCurrent("hold")
		r.Retarget("ramp", Constant(5000))
		var fall Waveform
		for k := range 65 {
			x := float64(k) / 64
			fall = append(fall, Point{at + 100e-9*x, amps * (1 + math.Cos(math.Pi*x)) / 2})
		}
		r.Retarget("channel", fall)
		to(b, r, 1e-6)
	}
}

func BenchmarkEdgePeakOnly(b *testing.B)   { benchmarkEdge(b, WithoutEnergy(), WithoutTrace()) }
func BenchmarkEdgeEverything(b *testing.B) { benchmarkEdge(b) }

// BenchmarkStart is the price of a circuit that is built, started and not followed.
func BenchmarkStart(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		begin(b, snubbedEdge())
	}
}
