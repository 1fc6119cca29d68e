package stress

import (
	"slices"

	"drivemend/measure"
)

// problem is one board ready to be solved: its inputs and the fixed conditions.
type problem struct {
	in            *inputs
	b             measure.Board
	position      string
	base          scene
	rated, stated float64 // V
}

// chopperPosition is the switch place of each topology that is worked out.
var chopperPosition = map[string]string{"low-side-chopper": "low", "high-side-chopper": "high"}

// prepare gathers a board; nil with the needs when the edge cannot be worked out at all.
func prepare(b measure.Board) (*problem, []Need) {
	topology, _ := b.Word("topology")
	position, ok := chopperPosition[topology]
	if !ok {
		return nil, []Need{{"board.topology", []string{notAChopper(topology), forMargin}}}
	}
	at := b.At(position)
	in := gather(at)
	p := &problem{in: in, b: at, position: position}
	p.stated = gatherer{at, in}.value("switch.rated_voltage")
	p.rated = coldRating(p.stated, in.mid("cooling.coldest_air"))
	p.setScene()
	for _, n := range in.needs {
		if slices.Contains(n.For, forMargin) {
			return nil, in.needs
		}
	}
	return p, in.needs
}

// notAChopper says why there is no figure, and what to do meanwhile at the bench.
func notAChopper(topology string) string {
	if topology == "" || topology == "other" {
		return "opening edge: state low-side-chopper or high-side-chopper if one switch feeds the load and a diode carries it on"
	}
	return "edges of " + article(topology) + " are not worked out yet, only those of a chopper; until then keep the captured peak under 80 % of the rating"
}

// setScene fixes what does not vary.
func (p *problem) setScene() {
	g := gatherer{p.b, p.in}
	s := scene{in: p.in, free: true, rated: p.stated}
	s.kind, _ = p.b.Word("switch.kind")
	if kind, _ := p.b.Word("snubber.kind"); networkParts[kind] != nil {
		s.net = kind
	}
	s.fall = p.fallShape(g)
	if at, ok := p.b.Quantity("switch.output_capacitance.voltage"); ok {
		s.at = at.Value
	}
	if fitted, _ := p.b.Word("freewheel.fitted"); fitted == "no" {
		if s.free, s.load = false, g.value("load.inductance"); s.load <= 0 {
			p.in.need("load.inductance", "opening edge without a freewheel path", forMargin)
		}
	}
	for _, in := range p.in.values {
		s.x = append(s.x, in.mid)
	}
	p.base = s
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
	g := gatherer{p.b, p.in}
	s := p.highest()
	s.amps = g.value("protection.short_circuit_current")
	return s, s.amps > 0 && !g.saysYes("protection.soft_turn_off")
}

// quick is a scene of which only the peak is wanted.
func (s scene) quick() scene {
	s.fast = true
	return s
}

// with puts one input at a value; bus and current follow their inputs.
func (s scene) with(key string, value float64) scene {
	s.x = slices.Clone(s.x)
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
	for _, key := range networkParts[n.Kind] {
		q, _ := p.b.Quantity(key)
		n.Parts = append(n.Parts, Part{key, q})
	}
	return n
}

// lifts names the answers without which a verdict is never better than thin: gate resistance and the fall time's
// reference resistance, and whether there is a network at all. A value that is only assumed does
// not count as an answer.
func (p *problem) lifts() []string {
	var out []string
	for _, key := range []string{"switch.fall_time", "switch.fall_time.gate_resistance", "gate.turn_off_resistance"} {
		if _, ok := p.b.Quantity(key); !ok || p.b.Assumed(key) {
			out = append(out, key)
		}
	}
	if _, ok := p.b.Word("snubber.kind"); !ok {
		out = append(out, "snubber.kind")
	}
	return out
}

// article puts a or an before a topology.
func article(topology string) string {
	if topology == "h-bridge" || topology == "other" {
		return "an " + topology
	}
	return "a " + topology
}
