package stress

import (
	"fmt"
	"math"
	"testing"
)

// modelEdge is what one edge of the reference showed. A scope reads at the terminals; the chip sees more.
type modelEdge struct {
	Bus, Amps                  float64
	Chip, Terminal             float64    // V, highest voltage of the victim
	At                         float64    // s, when the chip's was reached, after the gate's edge
	FallTime, Slope, SteepFall float64    // s, A/s: 90 to 10 % of the switch's current, its mean and its steepest slope
	VoltSlope                  float64    // V/s between 10 and 90 % of the bus
	Recovery, RiseSlope        float64    // A of reverse recovery; A/s from 10 to 90 % of the current at closing
	Diode                      modelSheet // of a maker's test: how the opposite diode blocked
	Points                     int
}

// modelResult is the reference for one board.
type modelResult struct {
	Opening, Closing modelEdge // of the switch that opens; of the opposite device when the switch closes
	Capture          modelEdge // an opening at a part of bus and current, as a bench would take it
}

// worst is the highest voltage at a chip.
func (r modelResult) worst() float64 { return max(r.Opening.Chip, r.Closing.Chip) }

// savedNodes are the nodes that an edge is read from: chips and terminals of both, and the current of the lower one.
var savedNodes = []string{"v(ld)", "v(ls)", "v(ud)", "v(us)", "v(tl)", "v(bl)", "v(tu)", "v(bu)", "i(llld)"}

// reference solves the board: opening and closing at its bus and current, and an opening at reduced ones.
func (b modelBoard) reference(t testing.TB) (modelResult, error) {
	t.Helper()
	var r modelResult
	var err error
	if r.Opening, err = b.edge(b.bus, b.amps, true); err != nil {
		return r, fmt.Errorf("opening: %w", err)
	}
	if r.Closing, err = b.edge(b.bus, b.amps, false); err != nil {
		return r, fmt.Errorf("closing: %w", err)
	}
	if r.Capture, err = b.edge(b.captureBus*b.bus, b.captureAmps*b.amps, true); err != nil {
		return r, fmt.Errorf("capture: %w", err)
	}
	return r, nil
}

// edge solves one edge; one that is not over by the end is solved again for longer.
func (b modelBoard) edge(bus, amps float64, opening bool) (modelEdge, error) {
	n, end := b.deck(bus, amps, opening)
	for range 5 {
		w, err := n.solve(end, min(end/400, b.step(bus)), savedNodes...)
		if err != nil {
			return modelEdge{}, err
		}
		e, over := b.read(w, bus, amps, opening)
		if over {
			return e, nil
		}
		end *= 2
	}
	return modelEdge{}, fmt.Errorf("the edge was not over after %.3g s", end/2)
}

// step is a fortieth of the fastest ring: that of the loop with what blocks.
func (b modelBoard) step(bus float64) float64 {
	c := float64(b.bank) * b.device.output(bus)
	if !b.leg {
		c = min(c, b.diode.junction.at(bus)+20e-12)
	}
	return 2 * math.Pi / 40 * math.Sqrt((b.measuredLoop()+b.device.drain+b.device.source)*c)
}

// read takes the figures from the waves, and tells whether the edge was over.
func (b modelBoard) read(w waves, bus, amps float64, opening bool) (modelEdge, bool) {
	e := modelEdge{Bus: bus, Amps: amps, Points: len(w.time)}
	chip, terminal := w.difference("v(ld)", "v(ls)"), w.difference("v(tl)", "v(bl)")
	last := len(w.time) - 1 // the edge is over when what blocks has come to rest at the bus
	if !opening {
		chip, terminal = w.difference("v(ud)", "v(us)"), w.difference("v(tu)", "v(bu)")
	}
	e.Chip, e.At = w.top(chip)
	e.Terminal, _ = w.top(terminal)
	early, _ := waves{time: w.time}.top(chip[:w.before(0.85*w.time[last])])
	over := early > 0.99*e.Chip && math.Abs(w.mean(chip, 0.8*w.time[last])-bus) < 0.1*bus+2.5
	rise := w.crossing(chip, 0.1*bus, gateEdge, true)
	e.VoltSlope = 0.8 * bus / (w.crossing(chip, 0.9*bus, rise, true) - rise)
	current := w.all["i(llld)"]
	if opening {
		from := w.crossing(current, 0.9*amps, gateEdge, false)
		to := w.crossing(current, 0.1*amps, from, false)
		if math.IsNaN(to) { // a tail over a tenth of the current: what is left to 35 %
			to = w.crossing(current, 0.35*amps, from, false)
		}
		e.FallTime = to - from
		e.Slope = 0.8 * amps / e.FallTime
		e.SteepFall = w.steepest(current, from, to, 2e-9)
		e.At -= gateEdge
		least := 0.35
		if b.wholeFall {
			least = 0.1
		}
		return e, over && current[last] < least*amps
	}
	from := w.crossing(current, 0.1*amps, gateEdge, true)
	e.RiseSlope = 0.8 * amps / (w.crossing(current, 0.9*amps, from, true) - from)
	top, _ := w.top(current)
	e.Recovery = top - amps
	e.At -= gateEdge
	if b.wholeFall {
		forward := make([]float64, len(current))
		for k, i := range current {
			forward[k] = amps - i
		}
		if err := e.Diode.recovery(w, forward); err != nil {
			return e, false
		}
	}
	return e, over
}
