package circuit

import "testing"

// Loop, package and snubber lead meet in one node, a current source fixes the loop's current until the freewheel diode
// takes over, and a diode of 1 mΩ holds the chip to a voltage ramp: the gate-limited edge of a chopper. The chip must
// follow the ramp, and To must stop where it reaches the bus.
func TestSnubbedEdgeWithThreeInductorsAtANode(t *testing.T) {
	c := New()
	chip, rail, load, loop, term := c.Node("chip"), c.Node("rail"), c.Node("load"), c.Node("loop"), c.Node("terminal")
	const amps, bus = 120.0, 390.0
	c.Voltage("supply", c.Node("supply"), 0, Waveform{{0, bus}})
	c.Inductor("supply-inductance", c.Node("supply"), rail, 1.33e-5, amps)
	c.Resistor("bus-esr", rail, c.Node("bus"), 0.04)
	c.Capacitor("bus", c.Node("bus"), 0, 2200e-6, bus)
	c.Current("load", rail, load, Waveform{{0, amps}})
	c.Resistor("freewheel-recovery", c.Node("fr"), rail, 23.1/amps)
	c.Inductor("freewheel-recovery-time", c.Node("fr"), rail, 23.1/amps*53.5e-9/3, 0)
	c.Diode("freewheel", load, c.Node("fr"), 1.2, 5e-3)
	c.Resistor("loop-resistance", load, loop, 0.02)
	c.Inductor("loop", loop, term, 80e-9, amps)
	c.Inductor("package", term, chip, 20e-9/3, amps)
	c.Capacitor("output", chip, 0, 750e-12, 0)
	c.Diode("reverse", 0, chip, 0.9, 5e-3)
	c.Inductor("lead", term, c.Node("lead"), 43e-9, 0)
	c.Resistor("snubber-diode-recovery", c.Node("sr"), c.Node("snub"), 26.8/amps)
	c.Inductor("snubber-diode-recovery-time", c.Node("sr"), c.Node("snub"), 26.8/amps*71e-9/3, 0)
	c.Diode("snubber-diode", c.Node("lead"), c.Node("sr"), 1.04, 5e-3)
	c.Resistor("snubber-resistor", c.Node("lead"), c.Node("snub"), 27)
	c.Capacitor("snubber", c.Node("snub"), 0, 22e-9, 0.041)
	c.Voltage("ramp", c.Node("ramp"), 0, Waveform{{0, 0}, {2e-6, 2e-6 * 14.38e9}})
	c.Diode("hold", chip, c.Node("ramp"), 0, 1e-3)
	c.Current("channel", chip, 0, Waveform{{0, 0}})
	run, err := c.Start()
	if err != nil {
		t.Fatal(err)
	}
	p := run.Probe(chip, 0)
	stop, err := run.To(1e-6, p, bus)
	if err != nil || !stop {
		t.Fatal(stop, err)
	}
	if ramp := bus / 14.38e9; run.Time() < 0.99*ramp || run.Time() > 1.01*ramp {
		t.Errorf("bus reached at %g s, the ramp reaches it at %g s", run.Time(), ramp)
	}
}
