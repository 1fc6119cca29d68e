package circuit_test

import (
	"fmt"

	"drivemend/diagnose/circuit"
)

// A 100 nH loop carrying 30 A is cut off into 1 nF on a 300 V bus: the peak is V + I·√(L/C).
func Example() {
	c := circuit.New()
	bus, chip := c.Node("bus"), c.Node("chip")
	c.Voltage("bus", bus, 0, circuit.Constant(300))
	c.Inductor("loop", bus, chip, 100e-9, 30)
	c.Capacitor("output", chip, 0, 1e-9, 300)
	run, err := c.Start()
	if err != nil {
		fmt.Println(err)
		return
	}
	probe := run.Probe(chip, 0)
	if _, err := run.To(100e-9, -1, 0); err != nil {
		fmt.Println(err)
		return
	}
	peak, at := run.Peak(probe)
	fmt.Printf("%.1f V after %.1f ns\n", peak, 1e9*at)
	// Output: 600.0 V after 15.7 ns
}
