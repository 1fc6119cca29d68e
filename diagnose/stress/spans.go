package stress

import (
	"math"
	"slices"

	"drivemend/measure"
)

// Span is a computed figure with the interval that the unknowns leave it.
type Span struct {
	Low, High float64
	Assumed   []string // keys of the assumed values that move it
	Guessed   bool     // assumed values move it, and nothing that the case states of the edge does
}

// movesSpan is the least share of the rating by which a value has to move a figure to be named.
const movesSpan = 0.005

// idleShare is the share of the rating below which an unknown is not looked at again at the nominal bus.
const idleShare = 0.001

// unsolved is the need of a board whose edge the solver refused.
const unsolved = "values the edge can be solved with"

// The names of the computed figures.
const (
	peakOverRated    = "turn_off.peak_over_rated"
	closingOverRated = "turn_on.peak_over_rated"
	energyOverRated  = "turn_off.energy_over_rated"
	edgeSlope        = "edge.slope"
	clampOverRated   = "clamp.voltage_over_rated"
)

// Spans gives the computed figures that tests of the rule base may name, for the board as found. A figure that
// cannot be worked out is left out and its needs are listed, the solver's reason too; the error is always nil so far.
//
//	turn_off.peak_over_rated    peak of the opening edges over the rating at the coldest junction
//	turn_on.peak_over_rated     the same where the opposite switch of the leg closes; legs only
//	turn_off.energy_over_rated  avalanche energy of an opening on the one lowest device, at its rating, over the energy
//	                            it is rated for; 0 while the peak stays under the rating; MOSFETs of stated energy only
//	edge.slope                  steepest voltage slope of opening and closing edge, mean of 10 to 90 % of the bus, V/s
//	clamp.voltage_over_rated    voltage of a clamp's capacitor after an opening over the rating; with a clamp only
//
// Each goes from the running current at nominal bus to the worst current at the highest bus, every unknown in turn at
// either end of its interval (the slope: all that steepen it at one end together), and is that of the position where
// it is highest.
func Spans(b measure.Board) (map[string]Span, []Need, error) {
	problems, needs := prepareAll(b)
	out, refused := map[string]Span{}, map[string]bool{}
	for _, p := range problems {
		spans, missing := p.spans()
		needs = append(needs, missing...)
		for _, n := range missing {
			refused[n.For[0]] = true
		}
		for name, span := range spans {
			if have, ok := out[name]; !ok || span.High > have.High {
				out[name] = span
			}
		}
	}
	for name := range refused { // it might be higher where it could not be worked out
		delete(out, name)
	}
	return out, needs, nil
}

// spans are the figures of one place; a need for each that the solver refused.
func (p *problem) spans() (map[string]Span, []Need) {
	out := map[string]Span{}
	opening, err := p.sweep(turnOff, p.openingFigures)
	if err != nil {
		return out, []Need{{unsolved, []string{peakOverRated, p.refusal(err)}}}
	}
	out[peakOverRated] = opening.span(0)
	if p.base.net == "clamp" {
		out[clampOverRated] = opening.span(1)
	}
	var needs []Need
	add := func(name string, work func() (Span, bool, error)) {
		span, ok, err := work()
		if err != nil {
			needs = append(needs, Need{unsolved, []string{name, p.refusal(err)}})
		} else if ok {
			out[name] = span
		}
	}
	add(energyOverRated, func() (Span, bool, error) { return p.energySpan(opening) })
	add(closingOverRated, p.closingSpan)
	add(edgeSlope, p.slopeSpan)
	return out, needs
}

// figuresOf solves a scene and gives what is swept, as shares of the rating.
type figuresOf func(scene) ([]float64, error)

// openingFigures are the peak of the opening edges and the voltage of a clamp's capacitor after them.
func (p *problem) openingFigures(s scene) ([]float64, error) {
	out := make([]float64, 2)
	s, err := s.settled()
	if err != nil {
		return nil, err
	}
	for _, g := range p.edges {
		if g.name == turnOn {
			continue
		}
		e, err := g.in(s)
		if err != nil {
			return nil, err
		}
		out[0] = math.Max(out[0], e.Peak/p.rated)
		if s.net == "clamp" {
			out[1] = math.Max(out[1], (s.held+math.Max(e.charge, 0)/s.get("snubber.capacitance"))/p.rated)
		}
	}
	return out, nil
}

func (p *problem) closingFigures(s scene) ([]float64, error) {
	e, err := closes.in(s)
	if err != nil {
		return nil, err
	}
	return []float64{e.Peak / p.rated}, nil
}

func (p *problem) closingSpan() (Span, bool, error) {
	if !p.leg() {
		return Span{}, false, nil
	}
	w, err := p.sweep(turnOn, p.closingFigures)
	if err != nil {
		return Span{}, false, err
	}
	return w.span(0), true, nil
}

// energySpan is the avalanche energy over the rated one; false where it means nothing: no MOSFET, no stated energy, or
// a bus that is over the rating by itself.
func (p *problem) energySpan(opening *swept) (Span, bool, error) {
	kind, _ := p.own.Word("switch.kind")
	rated, ok := p.own.Quantity("switch.avalanche.energy")
	if !ok || !(rated.Value > 0) || kind != "mosfet" && kind != "sic-mosfet" {
		return Span{}, false, nil
	}
	trials := slices.DeleteFunc(slices.Clone(opening.trials), func(t trial) bool { return !(t.s.bus < p.rated) })
	if len(trials) == 0 {
		return Span{}, false, nil
	}
	joules := make([]float64, len(trials))
	err := each(len(trials), func(k int) (err error) {
		if trials[k].values[0] > 1 {
			joules[k], err = p.joule(trials[k].s, rated.Value)
		}
		return err
	})
	if err != nil {
		return Span{}, false, err
	}
	span := opening.span(0)
	span.Low, span.High = slices.Min(joules)/rated.Value, slices.Max(joules)/rated.Value
	if p.own.Assumed("switch.avalanche.energy") {
		span.Assumed = append(span.Assumed, "switch.avalanche.energy")
	}
	return span, true, nil
}

// littleEnergy is the share of the rated energy under which an avalanche is not solved.
const littleEnergy = 0.01

// joule is what the one device that breaks down first takes up in an opening, at its rating. It is no more than
// ½·L·I²·BV/(BV−V) (see PulseOf), which is taken where that is next to nothing, and without a freewheel path, where
// the load's current outlasts what is followed. Else the edge is solved on until the loop's current is gone, L·I/(BV−V).
func (p *problem) joule(s scene, rated float64) (float64, error) {
	whole := s
	whole.both = p.bridge
	pulse, err := PulseOf(s.load+whole.henry(), s.amps, p.rated, s.bus)
	if err != nil || !s.free || pulse.Joule < littleEnergy*rated {
		return pulse.Joule, err
	}
	return p.solvedJoule(s, pulse.Time)
}

// solvedJoule solves the openings with a chip that breaks down, on for a time after each.
func (p *problem) solvedJoule(s scene, on float64) (float64, error) {
	s, err := s.settled()
	if err != nil {
		return 0, err
	}
	s.stand, s.fast = p.rated, false
	most := 0.0
	for _, g := range p.edges {
		if g.name == turnOn {
			continue
		}
		e, err := g.in(s)
		if err != nil {
			return 0, err
		}
		if _, err := e.run.To(e.run.Time()+on, -1, 0); err != nil {
			return 0, err
		}
		most = math.Max(most, e.run.Energy("avalanche"))
	}
	return most, nil
}

// slopeSpan is the steepest voltage slope of either edge: at nominal bus and running current with all that flattens
// it, at highest bus and worst current with all that steepens it. False when the bus is not reached.
func (p *problem) slopeSpan() (Span, bool, error) {
	low, err := p.steepest(p.nominal(), -1)
	if err != nil {
		return Span{}, false, err
	}
	high, err := p.steepest(p.highest(), +1)
	if err != nil {
		return Span{}, false, err
	}
	if !(low > 0 && high > 0) {
		return Span{}, false, nil
	}
	span := Span{Low: math.Min(low, high), High: math.Max(low, high), Guessed: true}
	for _, key := range p.slopeKeys() {
		in := p.in.values[p.in.at[key]]
		firm := !in.assumed || p.byStatedGate(in)
		span.Guessed = span.Guessed && (!firm || slices.Contains(flattening, key))
		if in.assumed && in.open() {
			span.Assumed = append(span.Assumed, key)
		}
	}
	span.Guessed = span.Guessed && len(span.Assumed) > 0
	return span, true, nil
}

// flattening are the inputs that make an edge flatter the larger they are; all others of slopeKeys make it steeper.
var flattening = []string{"switch.output_capacitance", "freewheel.softness"}

// slopeKeys are the inputs that make the voltage slopes of this place: the gate, or where the current cannot follow it
// the capacitance; in a leg what the opposite switch and the diode that recovers do.
func (p *problem) slopeKeys() []string {
	keys := []string{"switch.rise_slope"}
	if s := p.nominal(); p.leg() || s.amps < s.ringFarad()*s.get("switch.rise_slope") {
		keys = append(keys, "switch.output_capacitance")
	}
	if !p.leg() {
		return keys
	}
	for _, key := range []string{"switch.turn_on_slope", "switch.closing_slope"} {
		if _, differs := p.in.at[oppositeSwitch+key]; differs {
			key = oppositeSwitch + key
		}
		keys = append(keys, key)
	}
	for _, key := range []string{"freewheel.recovery_charge", "freewheel.recovery_time", "freewheel.softness"} {
		if _, ok := p.in.at[key]; ok {
			keys = append(keys, key)
		}
	}
	return keys
}

// steepest is the highest slope of the edges of a scene, with what makes them at the end that steepens (side +1) or
// flattens (−1) them.
func (p *problem) steepest(s scene, side int) (float64, error) {
	for _, key := range p.slopeKeys() {
		in := p.in.values[p.in.at[key]]
		if (side > 0) != slices.Contains(flattening, key) {
			s = s.with(key, in.high)
		} else {
			s = s.with(key, in.low)
		}
	}
	edges := []graded{opens}
	if p.leg() {
		edges = append(edges, closes)
	}
	slopes := make([]float64, len(edges))
	err := each(len(edges), func(k int) error {
		e, err := edges[k].in(s)
		if err == nil {
			slopes[k] = e.Slope
		}
		return err
	})
	return slices.Max(slopes), err
}
