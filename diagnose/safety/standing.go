package safety

import (
	"math"

	"drivemend/measure"
)

// boardsOf gives the boards that a case speaks of at the bench: the one that was found, and once the rebuild is stated as
// done the rebuilt one as well. A store counts when either has it: what the rebuild added is there, and what it took out
// may have stayed.
func boardsOf(c *measure.Case) []measure.Board {
	boards := []measure.Board{c.Board}
	if c.Rebuild != nil && !c.Rebuild.Done.IsZero() {
		boards = append(boards, c.Rebuild.Board)
	}
	return boards
}

// board is the board as it now stands: rebuilt, or as found.
func (h history) board() measure.Board {
	if len(h.boards) == 0 {
		return measure.Board{}
	}
	return h.boards[len(h.boards)-1]
}

// stores lists the stores of every board of the history, each once, at the higher of its voltages and energies.
func (h history) stores() []Store {
	if len(h.boards) == 0 {
		return storesOf(measure.Board{}, h)
	}
	stores := storesOf(h.boards[0], h)
	for _, b := range h.boards[1:] {
		stores = united(stores, storesOf(b, h))
	}
	return stores
}

// united lists the stores of two boards in the order of the second, what only the first has at the end.
func united(found, rebuilt []Store) []Store {
	var out []Store
	for _, s := range rebuilt {
		if f, ok := storeAt(found, s.Point); ok {
			s = higher(f, s)
		}
		out = append(out, s)
	}
	for _, s := range found {
		if _, ok := storeAt(rebuilt, s.Point); !ok {
			s.Because += "; it belongs to the board as found: where the rebuild took it out, measure where it stood"
			out = append(out, s)
		}
	}
	return out
}

func storeAt(stores []Store, point string) (Store, bool) {
	for _, s := range stores {
		if s.Point == point {
			return s, true
		}
	}
	return Store{}, false
}

// higher gives the worse of a store found and rebuilt; in doubt only where both are.
func higher(found, rebuilt Store) Store {
	s, other := rebuilt, found
	if found.WorstJ > rebuilt.WorstJ || (found.WorstJ == rebuilt.WorstJ && found.Voltage.Value > rebuilt.Voltage.Value) {
		s, other = found, rebuilt
	}
	s.ToCheck = found.ToCheck && rebuilt.ToCheck
	if other.Voltage.Value > s.Voltage.Value {
		s.Voltage = other.Voltage
		spread := s.WorstJ / s.EnergyJ
		s = s.filled()
		if s.EnergyJ > 0 && !math.IsNaN(spread) && !math.IsInf(spread, 0) {
			s.WorstJ = s.EnergyJ * spread
		}
	}
	return s
}

// presentAny answers for something that several keys speak of: one that says it is there settles it, then one that says
// it is not, then one that says nobody knows.
func presentAny(b measure.Board, paths ...string) presence {
	said := map[presence]bool{}
	for _, path := range paths {
		said[present(b, path)] = true
	}
	for _, p := range []presence{fitted, absent, doubtful} {
		if said[p] {
			return p
		}
	}
	return silent
}
