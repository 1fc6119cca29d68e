// Package circuit solves the transients of small piecewise-linear circuits: resistors, capacitors, inductors
// (coupled or not), sources whose waveforms are straight pieces and curves, diodes and clamps. It knows nothing of drives.
//
// Between two switching events a circuit is linear, and its sources are straight lines or solve linear equations of their
// own (Curve), which are laid beside those of the circuit. The step over such a span
// is the exact solution of the state equations (matrix exponential, cached by diode pattern), so the step length
// decides only how often the solver looks, never how exact the result is. Events are found by halving the step
// with the same cached matrices and, in the last piece, on the Taylor polynomial of the solution.
//
// Use: New, Node and the elements describe a circuit; Start finds the diodes' states at t = 0; Probe, ProbeCurrent and
// ProbeSlope place probes; To runs to a time or to a level; Retarget gives a source another future; Peak, Lowest, Trace,
// Energy, Charge, Square, Stored, BranchCurrent, BranchVoltage, Voltage, Slope and Modes answer. Netlist of a circuit, or
// of a run with its sources as they were run, is an ngspice deck of the same. Faulty circuits, capacitor loops or
// inductor cut sets that contradict themselves, chatter and time constants too far apart end in errors that name the
// element.
//
// Energy, charge and squared current are integrals of each element's own voltage and current, not differences of what
// is stored. They are good to about 1e-9 of the largest of their kind; the heat of a resistance R that sees a voltage V
// only for a moment of a long time t carries an error of 1e-16·V²·t/R.
//
// All values are in SI units. Results are the same on every machine: no fused multiply-add, no map order.
package circuit

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// kind tells what a branch is.
type kind int

const (
	resistor kind = iota
	capacitor
	inductor
	voltageSource
	currentSource
	diode
)

var kindName = [...]string{"resistor", "capacitor", "inductor", "voltage source", "current source", "diode"}

// branch is one two-terminal element. Voltage is v(a)-v(b), current flows from a through the element to b.
type branch struct {
	name  string
	kind  kind
	a, b  int
	value float64  // ohm, farad or henry; a diode's slope resistance
	start float64  // initial voltage of a capacitor, current of an inductor
	volt  float64  // a diode's threshold
	wave  Waveform // a source's waveform
	bends []Curve  // in place of parts of it
	index int      // among the sources, or among the diodes
}

// source is what a source does.
func (b *branch) source() source { return source{b.wave, b.bends} }

// coupling is a mutual inductance between two inductors (branch numbers).
type coupling struct {
	first, second int
	mutual        float64
}

// Circuit is a list of elements between numbered nodes; node 0 is the reference. A faulty element is remembered
// and reported by Start, so that a circuit can be built without looking at every call.
type Circuit struct {
	nodes    []string
	branches []branch
	couples  []coupling
	sources  int
	diodes   int
	faults   []error
}

// The values an element may have, in SI units: far beyond any part, and far from the ends of the number range.
const (
	leastValue = 1e-21
	mostValue  = 1e15
	mostLevel  = 1e12 // volt, ampere
)

// maxDiodes is what the key of a diode pattern can hold.
const maxDiodes = 62

// New starts an empty circuit.
func New() *Circuit {
	return &Circuit{nodes: append(make([]string, 0, 16), "0"), branches: make([]branch, 0, 32)}
}

// Node gives the number of a named node, making it on first use; "0" is the reference.
func (c *Circuit) Node(name string) int {
	if n := slices.Index(c.nodes, name); n >= 0 {
		return n
	}
	c.nodes = append(c.nodes, name)
	return len(c.nodes) - 1
}

// Resistor adds a resistor from a to b, ohm >= 0; 0 is a wire.
func (c *Circuit) Resistor(name string, a, b int, ohm float64) {
	c.add(branch{name: name, kind: resistor, a: a, b: b, value: ohm})
}

// Capacitor adds a capacitor (farad >= 0; 0 is left open) with its initial voltage v(a)-v(b).
func (c *Circuit) Capacitor(name string, a, b int, farad, volt float64) {
	c.add(branch{name: name, kind: capacitor, a: a, b: b, value: farad, start: volt})
}

// Inductor adds an inductor (henry >= 0; 0 is a wire) with its initial current from a to b.
func (c *Circuit) Inductor(name string, a, b int, henry, ampere float64) {
	c.add(branch{name: name, kind: inductor, a: a, b: b, value: henry, start: ampere})
}

// Voltage adds a voltage source: v(a) - v(b) = w(t); curves, sorted by time, take the place of the waveform in theirs.
func (c *Circuit) Voltage(name string, a, b int, w Waveform, curves ...Curve) {
	c.add(branch{name: name, kind: voltageSource, a: a, b: b, wave: w, bends: curves, index: c.sources})
	c.sources++
}

// Current adds a current source: w(t) flows from a through the source to b; curves as for Voltage.
func (c *Circuit) Current(name string, a, b int, w Waveform, curves ...Curve) {
	c.add(branch{name: name, kind: currentSource, a: a, b: b, wave: w, bends: curves, index: c.sources})
	c.sources++
}

// Diode adds a diode from anode a to cathode b: it blocks below volt, above it drops volt + ohm·i (ohm >= 0;
// below 1 µΩ it counts as zero).
// A clamp is a diode with a high threshold. Blocking is a true open circuit; see leakage for the one exception.
func (c *Circuit) Diode(name string, a, b int, volt, ohm float64) {
	c.add(branch{name: name, kind: diode, a: a, b: b, volt: volt, value: ohm, index: c.diodes})
	c.diodes++
}

// Couple couples two inductors already added, with factor -1 < k < 1; both count from their first node.
func (c *Circuit) Couple(first, second string, k float64) {
	i, okFirst := c.find(first)
	j, okSecond := c.find(second)
	switch {
	case !okFirst || !okSecond || c.branches[i].kind != inductor || c.branches[j].kind != inductor || i == j:
		c.fault("coupling of %q and %q: both must be different inductors added before", first, second)
	case !(math.Abs(k) < 1):
		c.fault("coupling of %q and %q: factor %g must lie between -1 and 1; for tight coupling use 0.9999", first, second, k)
	default:
		m := k * math.Sqrt(c.branches[i].value*c.branches[j].value)
		c.couples = append(c.couples, coupling{i, j, m})
	}
}

// add checks an element and stores it; a faulty one is remembered and stored too, so that later names still resolve.
func (c *Circuit) add(b branch) {
	what := kindName[b.kind]
	if _, taken := c.find(b.name); taken || b.name == "" {
		c.fault("%s %q: the name is empty or already taken; give every element its own name", what, b.name)
	}
	if b.a < 0 || b.a >= len(c.nodes) || b.b < 0 || b.b >= len(c.nodes) {
		c.fault("%s %q: node %d or %d does not exist; make nodes with Node", what, b.name, b.a, b.b)
		b.a, b.b = 0, 0
	} else if b.a == b.b {
		c.fault("%s %q: both ends are on node %q", what, b.name, c.nodes[b.a])
	}
	if b.value != 0 && !(b.value >= leastValue && b.value <= mostValue) {
		c.fault("%s %q: value %g must be zero or from %g to %g", what, b.name, b.value, leastValue, mostValue)
	}
	if !(math.Abs(b.start) <= mostLevel) || !(math.Abs(b.volt) <= mostLevel) {
		c.fault("%s %q: initial value or threshold beyond ±%g", what, b.name, mostLevel)
	}
	if b.kind == voltageSource || b.kind == currentSource {
		if err := b.source().check(); err != nil {
			c.fault("%s %q: %w", what, b.name, err)
		}
	}
	c.branches = append(c.branches, b)
}

// find gives the branch of a name; a list as short as this is read faster than hashed.
func (c *Circuit) find(name string) (number int, ok bool) {
	for k := range c.branches {
		if c.branches[k].name == name {
			return k, true
		}
	}
	return 0, false
}

func (c *Circuit) fault(format string, args ...any) {
	c.faults = append(c.faults, fmt.Errorf("circuit: "+format, args...))
}

// check gives what was wrong while the circuit was built, all at once.
func (c *Circuit) check() error {
	if c.diodes > maxDiodes {
		return fmt.Errorf("circuit: %d diodes, at most %d can be solved", c.diodes, maxDiodes)
	}
	if len(c.branches) == 0 {
		return errors.New("circuit: no elements; add some before Start")
	}
	return errors.Join(c.faults...)
}

func bad(x float64) bool { return math.IsNaN(x) || math.IsInf(x, 0) }
