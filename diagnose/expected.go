package diagnose

import (
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/meter"
)

// expected gives the value that a reading is compared with at the place where it was taken, by its name in the rule
// base; false when the case does not state enough to tell.
func (v *view) expected(t *knowledge.Test, ob measure.Observation) func(name string) (float64, bool) {
	at := meter.Place{Parallel: 1, Lifted: ob.State == "lifted"}
	if where, b := v.placeOf(t, ob); where == onBank {
		at.Parallel = len(v.parts.banks[b].parts)
	}
	return func(name string) (float64, bool) {
		q, ok, err := meter.Expected(v.board, name, at)
		return q.Value, ok && err == nil
	}
}
