package stress

import (
	"fmt"
	"slices"

	"drivemend/measure"
)

// problem is one place of a board ready to be solved: its inputs and the fixed conditions.
type problem struct {
	place
	in            *inputs
	base          scene
	rated, stated float64 // V
	edges         []graded
	alike         []string // positions with the same figures, this one first
}

// graded is one edge that counts for the verdict.
type graded struct {
	name  string
	shape string
	both  bool
	solve edgeShape
	steep []float64 // over the mean slope, scanned for the absolute corner
}

// solved is an edge in a scene.
func (g graded) in(s scene) (*Edge, error) {
	s.both = g.both
	return g.solve(s)
}

// The edges that count: a leg sees the opposite switch close too, a bridge all gates off at once.
var (
	opens     = graded{name: turnOff, shape: shapeGate, solve: scene.gateLimited, steep: []float64{1}}
	closes    = graded{name: turnOn, shape: shapeRamp, solve: scene.turnOn, steep: steepness}
	opensAll  = graded{name: allOff, shape: shapeGate, both: true, solve: scene.gateLimited, steep: []float64{1}}
	isCut     = graded{name: turnOff, shape: shapeCut, solve: scene.cut, steep: steepness}
	isCutEach = graded{name: allOff, shape: shapeCut, both: true, solve: scene.cut, steep: steepness}
)

// prepareAll gathers the places of a board, one for each that differs from the others; none, with the needs, when the
// edges cannot be worked out at all.
func prepareAll(b measure.Board) ([]*problem, []Need) {
	places := placesOf(b)
	if len(places) == 0 {
		topology, _ := b.Word("topology")
		return nil, []Need{{"board.topology", []string{unknownTopology(topology), forMargin}}}
	}
	var out []*problem
	var needs []Need
	seen := map[string]*problem{}
	for _, at := range places {
		p, missing := prepareAt(at)
		needs = append(needs, missing...)
		if p == nil {
			return nil, needs
		}
		name := p.signature()
		if seen[name] == nil {
			seen[name] = p
			out = append(out, p)
		}
		seen[name].alike = append(seen[name].alike, at.position)
	}
	return out, needs
}

// signature tells places apart by what is solved.
func (p *problem) signature() string {
	s := p.base
	s.in = nil
	return fmt.Sprint(s, p.in.bank, p.in.farBank, p.in.values, p.rated)
}

// prepareAt gathers one place; nil with the needs when its edges cannot be worked out at all.
func prepareAt(at place) (*problem, []Need) {
	in := gather(at)
	p := &problem{place: at, in: in}
	p.stated = gatherer{at.own, in}.value("switch.rated_voltage")
	p.rated = coldRating(p.stated, in.mid("cooling.coldest_air"))
	p.setScene()
	for _, n := range in.needs {
		if slices.Contains(n.For, forMargin) {
			return nil, in.needs
		}
	}
	if !at.leg() && p.base.free && !p.closingKnown() {
		in.need(p.liftsClosing()[0], "what the freewheel diode sees when the switch closes")
	}
	p.edges = []graded{opens}
	if at.leg() && p.closingKnown() {
		p.edges = append(p.edges, closes)
	}
	if at.bridge {
		p.edges = append(p.edges, opensAll)
	}
	return p, in.needs
}

// unknownTopology says why there is no figure, and what to do meanwhile at the bench.
func unknownTopology(topology string) string {
	said := "edges: state the topology"
	if topology == "other" {
		said = "edges of a topology stated as other are not worked out: state the nearest one whose switch and diode lie alike"
	}
	return said + " (a chopper, half-bridge, h-bridge or three-phase); until then keep the captured peak under 80 % of the rating"
}

// setScene fixes what does not vary.
func (p *problem) setScene() {
	g := gatherer{p.own, p.in}
	s := scene{in: p.in, free: true, leg: p.leg(), rated: p.stated}
	s.kind, _ = p.own.Word("switch.kind")
	if kind, _ := p.own.Word("snubber.kind"); networkParts[kind] != nil {
		s.net = kind
	}
	s.fall = p.fallShape(g)
	if at, ok := p.own.Quantity("switch.output_capacitance.voltage"); ok {
		s.at = at.Value
	}
	s.frequency = g.value("pwm.frequency")
	p.setNetwork(&s)
	p.setPath(&s, g)
	s.tested = blocking{g.value("freewheel.recovery_charge.current"), g.value("freewheel.recovery_charge.slope")}
	for _, in := range p.in.values {
		s.x = append(s.x, in.mid)
	}
	p.base = s
}

// setNetwork fixes where the network lies and leads.
func (p *problem) setNetwork(s *scene) {
	across, _ := p.own.Word("snubber.across")
	s.moved = across == "freewheel" && !p.leg() && s.net != "decoupling"
	s.open = p.saysYes("snubber.link.open")
	back, _ := p.own.Word("snubber.return")
	s.back = back != "rail"
}

func (p *problem) saysYes(key string) bool {
	word, _ := p.own.Word(key)
	return word == "yes"
}

// setPath fixes what takes the current over.
func (p *problem) setPath(s *scene, g gatherer) {
	fitted, _ := p.own.Word("freewheel.fitted")
	if p.leg() || fitted != "no" {
		return
	}
	if s.free, s.load = false, g.value("load.inductance"); s.load <= 0 {
		p.in.need("load.inductance", "opening edge without a freewheel path", forMargin)
	}
	if s.moved {
		p.in.need("snubber.across", "a network across the freewheel diode needs a freewheel path: freewheel.fitted says no", forMargin)
	}
}

// fallShape is an IGBT's stated fall; it needs both the fraction and the time of the tail.
func (p *problem) fallShape(g gatherer) fallShape {
	f := fallShape{g.value("switch.fall.fraction"), g.value("switch.fall.tail_time")}
	switch {
	case f.fraction == 0 && f.tail == 0:
	case f.fraction == 0:
		p.in.need("switch.fall.fraction", "shape of the fall (taken as steeper by 1.6, without tail)")
	case f.tail == 0 && f.fraction < 1:
		p.in.need("switch.fall.tail_time", "shape of the fall (taken as steeper by 1.6, without tail)")
	default:
		return f
	}
	return fallShape{}
}

// nominal is the nominal bus and the running current.
func (p *problem) nominal() scene {
	s := p.base
	s.bus, s.amps = p.in.mid("bus.nominal"), p.in.mid("load.running_current")
	return s
}

// highest is the highest bus and the worst current.
func (p *problem) highest() scene {
	s := p.base
	s.bus, s.amps = p.in.mid("bus.highest"), p.in.mid("load.stall_current")
	return s
}

// shortCircuit is the highest bus and the stated short-circuit current; false when that is not stated, or when it
// is opened slowly in a way the case does not state.
func (p *problem) shortCircuit() (scene, bool) {
	g := gatherer{p.own, p.in}
	s := p.highest()
	s.amps = g.value("protection.short_circuit_current")
	return s, s.amps > 0 && !p.saysYes("protection.soft_turn_off")
}

// quick is a scene of which only the peak is wanted.
func (s scene) quick() scene {
	s.fast = true
	return s
}

// with puts one input at a value; bus and current follow their inputs.
func (s scene) with(key string, value float64) scene {
	s.x = slices.Clone(s.x)
	return s.set(key, value)
}

// set does the same in place of the scene's own values.
func (s scene) set(key string, value float64) scene {
	s.x[s.in.at[key]] = value
	switch key {
	case "bus.highest":
		s.bus = value
	case "load.stall_current":
		s.amps = value
	}
	return s
}

// network is the network that was worked out, with its parts as stated.
func (p *problem) network() Network {
	if p.base.net == "" {
		return Network{Kind: "none"}
	}
	n := Network{Kind: p.base.net}
	for _, key := range shownParts {
		if q, ok := p.own.Quantity(key); ok && p.in.has(key) {
			n.Parts = append(n.Parts, Part{key, q})
		}
	}
	return n
}

// lifts names the answers without which a verdict is never better than thin: gate resistance and the fall time's
// reference resistance, unless an opening was measured, and whether there is a network at all. A value that is only assumed
// does not count as an answer.
func (p *problem) lifts(measured bool) []string {
	var out []string
	for _, key := range []string{"switch.fall_time", "switch.fall_time.gate_resistance", "gate.turn_off_resistance"} {
		if _, ok := p.own.Quantity(key); !measured && (!ok || p.own.Assumed(key)) {
			out = append(out, key)
		}
	}
	if p.leg() {
		out = append(out, p.liftsClosing()...)
	}
	if _, ok := p.own.Word("snubber.kind"); !ok {
		out = append(out, "snubber.kind")
	}
	return out
}

// liftsClosing names what the closing edge lacks.
func (p *problem) liftsClosing() []string {
	var out []string
	if _, ok := p.own.Quantity("freewheel.recovery_charge"); p.in.mid("freewheel.forward_voltage") >= schottkyDrop && (!ok || p.own.Assumed("freewheel.recovery_charge")) {
		out = append(out, "freewheel.recovery_charge")
	}
	closer := p.own
	if p.leg() {
		closer = p.far
	}
	if _, ok := closer.Quantity("switch.turn_on_slope"); !ok || closer.Assumed("switch.turn_on_slope") {
		out = append(out, "switch.turn_on_slope")
	}
	return out
}
