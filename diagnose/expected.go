package diagnose

import (
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/meter"
)

// expected gives the value that a reading is compared with at the place where it was taken, by its name in the rule
// base; false when the case does not state enough to tell.
func (v *view) expected(t *knowledge.Test, ob measure.Observation) func(name string) (float64, bool) {
	parallel := 1
	if where, b := v.placeOf(t, ob); where == onBank {
		parallel = len(v.parts.banks[b].parts)
	}
	return expectedOn(v.board, meter.Place{Parallel: parallel, Lifted: ob.State == "lifted"})
}

// expectedOn is expected on a board, at a place that is known.
func expectedOn(b measure.Board, at meter.Place) func(name string) (float64, bool) {
	return func(name string) (float64, bool) {
		q, ok, err := meter.Expected(b, name, at)
		return q.Value, ok && err == nil
	}
}
