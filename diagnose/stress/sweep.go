package stress

import (
	"math"
	"slices"
	"strings"

	"drivemend/measure/quantity"
)

// trial is a scene with its figures.
type trial struct {
	s      scene
	values []float64
}

// moved is an unknown with how far it moves each figure.
type moved struct {
	input input
	by    []float64
}

// swept is what a sweep over the unknowns of an edge found.
type swept struct {
	p       *problem
	edge    string
	solve   figuresOf
	trials  []trial
	unknown []moved
}

// sweep solves the highest bus and worst current with every unknown at either end, and the nominal bus and running
// current with those that moved something there, and with the running current at either end. (Highest bus and worst
// current at the other's middle too: with a network the lower bus can give the higher peak.)
func (p *problem) sweep(edge string, solve figuresOf) (*swept, error) {
	w := &swept{p: p, edge: edge, solve: solve}
	all := p.unknowns(edge)
	top, low := p.highest().quick(), p.nominal().quick()
	at, err := w.try(top, all)
	if err != nil {
		return nil, err
	}
	var again []input
	for k, in := range all {
		m := moved{in, at.reach(k)}
		w.unknown = append(w.unknown, m)
		if slices.Max(m.by) > idleShare {
			again = append(again, in)
		}
	}
	if k, ok := p.in.at["load.running_current"]; ok && p.in.values[k].open() {
		again = append(again, p.in.values[k])
	}
	if at, err = w.try(low, again); err != nil {
		return nil, err
	}
	w.merge(again, at)
	return w, nil
}

// ends are the trials of one try: the middle, then two for each unknown.
type ends []trial

// reach is how far unknown k moves each figure.
func (e ends) reach(k int) []float64 {
	mid, a, b := e[0].values, e[1+2*k].values, e[2+2*k].values
	out := make([]float64, len(mid))
	for n := range out {
		out[n] = max(mid[n], a[n], b[n]) - min(mid[n], a[n], b[n])
	}
	return out
}

// try solves a scene, and with each of some unknowns at either end.
func (w *swept) try(s scene, unknowns []input) (ends, error) {
	out := ends{{s: s}}
	for _, in := range unknowns {
		for _, v := range []float64{in.low, in.high} {
			t := s.with(in.key, v)
			if in.key == "load.running_current" {
				t.amps = v
			}
			out = append(out, trial{s: t})
		}
	}
	err := each(len(out), func(k int) (err error) {
		out[k].values, err = w.solve(out[k].s)
		return err
	})
	w.trials = append(w.trials, out...)
	return out, err
}

// merge enters how far the unknowns moved the figures at the nominal bus; the highest bus and the worst current put
// there something else in place of the nominal, which is no doubt about them.
func (w *swept) merge(again []input, at ends) {
	for k, in := range again {
		if in.key == "bus.highest" || in.key == "load.stall_current" {
			continue
		}
		by := at.reach(k)
		n := slices.IndexFunc(w.unknown, func(m moved) bool { return m.input.key == in.key })
		if n < 0 {
			w.unknown = append(w.unknown, moved{in, by})
			continue
		}
		for f := range by {
			w.unknown[n].by[f] = math.Max(w.unknown[n].by[f], by[f])
		}
	}
}

// span is the interval of one figure.
func (w *swept) span(figure int) Span {
	out := Span{Low: math.Inf(1), High: math.Inf(-1)}
	for _, t := range w.trials {
		out.Low, out.High = math.Min(out.Low, t.values[figure]), math.Max(out.High, t.values[figure])
	}
	for _, m := range w.unknown {
		if m.input.assumed && m.by[figure] > movesSpan {
			out.Assumed = append(out.Assumed, m.input.key)
		}
	}
	out.Guessed = len(out.Assumed) > 0 && !w.p.busDecides() && !w.stated(figure)
	return out
}

// busDecides tells whether the nominal bus alone, as stated, is over the rating: then no edge has to be known.
func (p *problem) busDecides() bool {
	return p.in.mid("bus.nominal") >= p.rated && !p.own.Assumed("bus.nominal") && !p.own.Assumed("bus.highest") && !p.own.Assumed("switch.rated_voltage")
}

// stated tells whether something that the case states of the edge moves a figure, when halved or doubled. Bus and
// currents do not count: they say how much there is to switch, not how it is switched. A value that the solver refuses
// to halve or double does not move anything.
func (w *swept) stated(figure int) bool {
	if !w.p.base.free && !w.p.own.Assumed("load.inductance") {
		return true
	}
	top := w.p.highest().quick()
	middle := w.trials[0].values[figure]
	for _, in := range w.p.firmest(w.edge) {
		for _, by := range []float64{2, 0.5} {
			values, err := w.solve(top.with(in.key, in.mid*by))
			if err == nil && math.Abs(values[figure]-middle) > movesSpan {
				return true
			}
		}
	}
	return false
}

// decisive are the inputs that say most of an edge; they are looked at first.
var decisive = []string{"loop.inductance", "switch.fall_time", "switch.rise_slope", "snubber.capacitance", "snubber.clamp_voltage",
	"freewheel.recovery_charge", "switch.turn_on_slope"}

// firmest are the inputs of an edge that rest on what the case states, the decisive ones first.
func (p *problem) firmest(edge string) []input {
	var first, rest []input
	for _, in := range p.in.values {
		firm := !in.assumed || p.byStatedGate(in)
		setting := strings.HasPrefix(in.key, "bus.") || strings.HasPrefix(in.key, "load.") || in.unit == quantity.Celsius || in.mid <= 0
		switch {
		case !firm || setting || in.edge != "" && in.edge != edge:
		case slices.Contains(decisive, in.key):
			first = append(first, in)
		default:
			rest = append(rest, in)
		}
	}
	return append(first, rest...)
}

// byStatedGate tells whether an input was worked out from a gate circuit that the case states.
func (p *problem) byStatedGate(in input) bool {
	return strings.HasPrefix(in.why, fromGate) && !p.own.Assumed("gate.turn_off_resistance") &&
		!p.own.Assumed("gate.turn_on_resistance") && !p.own.Assumed("switch.gate_collector_capacitance")
}
