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
//	expected.blocking    Ω between collector and emitter or drain and source of a switch that blocks. In circuit the
//	                     reading goes on through the freewheel diode, or the diode of the opposite switch, and what
//	                     lies across the rails: bleeder and balancing resistors (a meter whose voltage opens no diode
//	                     shows open all the same). Always told; what is not stated is taken as not there
func Expected(b measure.Board, name string, at Place) (quantity.Quantity, bool, error) {
	switch name {
	case "expected.gate_bleed":
		q, ok := gateBleed(b, at)
		return q, ok, nil
	case "expected.blocking":
		return blocking(b, at), true, nil
	}
	return quantity.Quantity{}, false, fmt.Errorf("no expected value is called %q; there are expected.gate_bleed and expected.blocking", name)
}

// openOhms is what a meter shows of a switch that blocks and has nothing beside it: the top of its range. Judgement.
const openOhms = 20e6

// blocking is the open meter beside what lies across the rails.
func blocking(b measure.Board, at Place) quantity.Quantity {
	siemens := 1 / openOhms
	if fitted, _ := b.Word("freewheel.fitted"); !at.Lifted && fitted != "no" {
		siemens += acrossRails(b)
	}
	return quantity.Of(1/siemens, quantity.Ohm)
}

// acrossRails is the conductance of the bleeder and of the two balancing resistors in series.
func acrossRails(b measure.Board) float64 {
	siemens := 0.0
	if r, ok := b.Quantity("bus.bleeder"); ok && r.Value > 0 {
		siemens += 1 / r.Value
	}
	if r, ok := b.Quantity("bus.balancing"); ok && r.Value > 0 {
		siemens += 1 / (2 * r.Value)
	}
	return siemens
}

func gateBleed(b measure.Board, at Place) (quantity.Quantity, bool) {
	one, ok := b.Quantity("gate.pull_down")
	if !ok || at.Lifted || at.Parallel < 2 {
		return one, ok
	}
	n := float64(at.Parallel)
	return quantity.Quantity{Value: one.Value / n, Low: one.Low / n, High: one.High / n, Unit: one.Unit}, true
}
