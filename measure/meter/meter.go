// Package meter says what a meter should read on this very board: expected values only. How far readings spread
// belongs to the rule base, what a reading means to the diagnosis.
package meter

import (
	"fmt"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Place is where a reading is taken.
type Place struct {
	Parallel int  // parts in the bank, 1 or more
	Lifted   bool // the part's own lead is lifted: the rest of the bank is out of the reading
}

// Expected gives the value that a good board shows for a named figure of the rule base, and whether the case states
// enough to tell. An unknown name is an error.
//
//	expected.gate_bleed  Ω between gate and emitter or source, either polarity: the bleed resistors of the bank in
//	                     parallel, one to each part (the bleed divided by the number in parallel)
func Expected(b measure.Board, name string, at Place) (quantity.Quantity, bool, error) {
	switch name {
	case "expected.gate_bleed":
		q, ok := gateBleed(b, at)
		return q, ok, nil
	}
	return quantity.Quantity{}, false, fmt.Errorf("no expected value is called %q; there is expected.gate_bleed", name)
}

func gateBleed(b measure.Board, at Place) (quantity.Quantity, bool) {
	one, ok := b.Quantity("gate.pull_down")
	if !ok || at.Lifted || at.Parallel < 2 {
		return one, ok
	}
	n := float64(at.Parallel)
	return quantity.Quantity{Value: one.Value / n, Low: one.Low / n, High: one.High / n, Unit: one.Unit}, true
}
