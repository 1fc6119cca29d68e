package stress

import "drivemend/diagnose/circuit"

// Edge is one solved switching edge, seen from the switch position whose voltage is asked for, at its chip.
type Edge struct {
	Name      string  // turn-off, turn-on, all-off
	Shape     string  // gate-limited, cut; of a turn-on: ramp
	Position  string  // whose voltage it is; freewheel where the diode of a chopper recovers
	Bus       float64 // V
	Current   float64 // A, of the whole bank
	Peak      float64 // V, never below the bus, which blocks in the end
	PeakTime  float64 // s from the start of the edge
	Slope     float64 // V/s, mean between 10 and 90 % of the bus
	Ring      float64 // Hz; 0 when nothing rings
	Damping   float64 // ratio of the ring; 0 when nothing rings
	Energies  []Energy
	Waveform  []Sample
	Discharge float64 // A, what the network pushes into the switch when it closes; 0 without one
	Surge     float64 // A, highest current of the switch that closes; 0 at an opening
	Network   Worked  // what the network's capacitor goes through
	charge    float64 // C, that a clamp took up
	gained    float64 // V, that a reservoir gained
	terminals float64 // V, highest at the terminals, where they are watched
	struck    float64 // A, highest avalanche current
	steps     int     // of the solver
	run       *circuit.Run
	plus      int // nodes of the chip whose voltage it is
	minus     int
}

// Energy is what one element took up during the edge.
type Energy struct {
	Element string
	Joule   float64
}

// Sample is one point of a waveform.
type Sample struct{ T, V float64 }

// Worked is what the network's capacitor goes through in one edge; all zero without one.
type Worked struct {
	Square float64 // A²s, integral of its current squared
	Peak   float64 // A, highest current either way
	Slope  float64 // V/s, that current over its capacitance
}

// The edges.
const (
	turnOff = "turn-off"
	turnOn  = "turn-on"
	allOff  = "all-off"
)

// The shapes of an edge.
const (
	shapeGate = "gate-limited"
	shapeCut  = "cut"
	shapeRamp = "ramp"
)

// atFreewheel is the place of the figures of a chopper's closing: its diode's.
const atFreewheel = "freewheel"
