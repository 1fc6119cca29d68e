package stress

import "drivemend/measure"

// place is one switch position whose voltage is asked for, with the opposite switch of its leg.
type place struct {
	position string
	opposite string // "" where a freewheel diode takes the current
	bridge   bool   // there are other legs: a trip opens two of them at once
	own, far measure.Board
}

func (p place) leg() bool { return p.opposite != "" }

// placesOf gives the switch places of a topology whose edges are worked out, the brake's left out; none of a topology
// that is not known.
func placesOf(b measure.Board) []place {
	var out []place
	topology, _ := b.Word("topology")
	switch topology {
	case "low-side-chopper", "high-side-chopper", "half-bridge", "h-bridge", "three-phase":
	default:
		return nil
	}
	positions := b.Positions()
	for _, one := range positions {
		if one.Leg == "brake" {
			continue
		}
		p := place{position: one.Name, bridge: one.Leg != "", own: b.At(one.Name)}
		for _, other := range positions {
			if other.Leg == one.Leg && other.Upper != one.Upper {
				p.opposite, p.far = other.Name, b.At(other.Name)
			}
		}
		out = append(out, p)
	}
	return out
}
