package measure

import (
	"slices"
	"strings"
)

// brake is the name of the brake's position and of its leg.
const brake = "brake"

// Position is one switch place of the topology.
type Position struct {
	Name  string // low, high, a-high, u-low, brake
	Leg   string // a, u, ... ; "" for a single leg; "brake"
	Upper bool
	Parts []string // in parallel, in the order stated, at least one
}

// topologyPositions are the switch places of each topology, in order.
var topologyPositions = map[string][]string{
	"low-side-chopper":  {"low"},
	"high-side-chopper": {"high"},
	"half-bridge":       {"high", "low"},
	"h-bridge":          {"a-high", "a-low", "b-high", "b-low"},
	"three-phase":       {"u-high", "u-low", "v-high", "v-low", "w-high", "w-low"},
}

// Positions gives the switch places of the topology in order, brake last if fitted. A position without stated
// parts has one part named after it (low: Q-LOW). A topology that is not stated, or other, has the positions the
// case states, in that order; without any, one position named switch.
func (b Board) Positions() []Position {
	var out []Position
	for _, name := range b.positionNames() {
		p := Position{Name: name, Upper: name == "high" || strings.HasSuffix(name, "-high")}
		if leg, _, ok := strings.Cut(name, "-"); ok {
			p.Leg = leg
		}
		if name == brake {
			p.Leg = brake
		}
		p.Parts = slices.Clone(b.fields[partsKey(name)].Names)
		if len(p.Parts) == 0 {
			p.Parts = []string{"Q-" + strings.ToUpper(name)}
		}
		out = append(out, p)
	}
	return out
}

// positionNames gives the names of the switch places in order.
func (b Board) positionNames() []string {
	topology, _ := b.Word("topology")
	names := slices.Clone(topologyPositions[topology])
	if names == nil {
		for _, name := range b.fields[positionsKey].Names {
			if name != brake {
				names = append(names, name)
			}
		}
		if names == nil {
			names = []string{"switch"}
		}
	}
	if b.brakeFitted() {
		names = append(names, brake)
	}
	return names
}

// brakeFitted tells whether the board has a brake chopper: said so, or a figure of it stated.
func (b Board) brakeFitted() bool {
	if word, ok := b.Word("stages.brake.fitted"); ok && word != unknown {
		return word == "yes"
	}
	return b.fields["stages.brake.resistor"].numeric || b.fields["stages.brake.on_voltage"].numeric || slices.Contains(b.fields[positionsKey].Names, brake)
}

// PositionOf gives the position that holds a part, "" when none does.
func (b Board) PositionOf(part string) string {
	for _, p := range b.Positions() {
		if slices.Contains(p.Parts, part) {
			return p.Name
		}
	}
	return ""
}
