package stress

import (
	"fmt"
	"math"
	"testing"
)

// modelSheet is what a data sheet says of the board's parts, found by the maker's tests and not from the model's own
// numbers.
type modelSheet struct {
	FallTime, TurnOnSlope, RiseSlope float64 // s, A/s, V/s, at the voltage, current and resistance below
	Volts, Amps, Ohm                 float64
	Charge, Softness                 float64 // C, -: recovery of one diode
	RecoveryAmps, RecoverySlope      float64
	Forward                          float64 // V
	peak                             float64 // A
}

// fixture is the maker's test: a leg of two such devices, a small loop, a stiff driver with the stated resistor.
func (b modelBoard) fixture() modelBoard {
	b.leg, b.bank, b.net = true, 1, modelNet{kind: "none"}
	b.bus, b.amps = math.Round(b.sheetShare*b.device.rated), b.sheetAmps
	b.onOhm, b.offOhm, b.off = b.sheetOhm, b.sheetOhm, b.sheetOff
	b.wholeFall, b.stray, b.strayOhm = true, 20e-12, 10
	b.driverOhm, b.driverTime, b.gateCoil = 0.1, 5e-9, 5e-9
	b.esr, b.esl, b.loop, b.loopOhm, b.store = 2e-3, 1e-9, b.sheetFixture, 2e-3, 100e-6
	b.split = [4]float64{0.3, 0.2, 0.2, 0.3}
	return b
}

// measured is the board with its parts' data sheets.
func (b modelBoard) measured(t testing.TB) (modelBoard, error) {
	t.Helper()
	var err error
	b.data, err = b.sheet()
	return b, err
}

// sheet runs the maker's tests.
func (b modelBoard) sheet() (modelSheet, error) {
	f := b.fixture()
	s := modelSheet{Volts: f.bus, Amps: f.amps, Ohm: f.sheetOhm}
	opening, err := f.edge(f.bus, f.amps, true)
	if err != nil {
		return s, fmt.Errorf("data-sheet test, opening: %w", err)
	}
	closing, err := f.edge(f.bus, f.amps, false)
	if err != nil {
		return s, fmt.Errorf("data-sheet test, closing: %w", err)
	}
	s.FallTime, s.RiseSlope, s.TurnOnSlope = opening.FallTime, opening.VoltSlope, closing.RiseSlope
	if b.testedInLeg() {
		d := closing.Diode
		s.RecoveryAmps, s.RecoverySlope, s.Forward = f.amps, closing.RiseSlope, b.device.diode.forward(f.amps)
		s.Charge, s.Softness, s.peak = d.Charge, d.Softness, d.peak
		return s, nil
	}
	if err := b.recoveryTest(&s); err != nil {
		return s, fmt.Errorf("data-sheet test, recovery: %w", err)
	}
	return s, nil
}

// testedInLeg tells whether the maker measures the diode in the same leg as the switch, at its closing, as makers of IGBTs
// and of silicon-carbide MOSFETs do; body diodes of silicon MOSFETs and diodes of their own are blocked through an inductance.
func (b modelBoard) testedInLeg() bool {
	return b.leg && (b.device.kind == "igbt" || b.device.family == "carbide")
}

// recoveryTest drives a diode's current down through nothing by an inductance at half of its rated voltage. Charge:
// from the zero to where a fiftieth of the peak is left; softness: the fall to the zero of the line through 90 and
// 25 % of the peak, over the time from the zero to the peak (after IEC 60747-2, from memory).
func (b modelBoard) recoveryTest(s *modelSheet) error {
	n, end, found := b.recoveryDeck()
	w, err := n.solve(end, end/3000, "i(Vk)")
	if err != nil {
		return err
	}
	if err := found.recovery(w, w.all["i(vk)"]); err != nil {
		return err
	}
	s.Charge, s.Softness, s.Forward = found.Charge, found.Softness, found.Forward
	s.RecoveryAmps, s.RecoverySlope, s.peak = found.RecoveryAmps, found.RecoverySlope, found.peak
	return nil
}

// recoveryDeck writes that test, and gives its length and conditions.
func (b modelBoard) recoveryDeck() (*netlist, float64, *modelSheet) {
	s := &modelSheet{RecoveryAmps: b.sheetAmps, RecoverySlope: b.recoverySlope}
	d := b.device.diode
	if !b.leg {
		d, s.RecoveryAmps = b.diode, b.diode.amps
	}
	s.Forward = d.forward(s.RecoveryAmps)
	volts, begin := d.rated/2, 20e-9
	n := &netlist{}
	before := s.Forward + 0.01*volts
	n.line("Vk k 0 PWL(0 %.6g %.6g %.6g %.6g %.6g)", -before, begin, -before, begin+1e-9, volts)
	ohm := volts / s.RecoveryAmps
	n.line("Rl 0 l1 %.6g\nLl l1 a %.6g\nRx l1 a %.6g", 0.01*ohm, volts/s.RecoverySlope, 400*ohm)
	d.put(n, "uw", "a", "k")
	if b.leg { // the gate is tied to the emitter: the channel stays shut, its capacitances are there
		b.device.gateCollector.put(n, "gc", "k", "a")
		b.device.collectorEmitter.put(n, "ds", "k", "a")
	}
	return n, begin + 1.3*s.RecoveryAmps/s.RecoverySlope + 8*d.lifetime + 150e-9, s
}

// recovery reads charge and softness from the forward current of a diode that is blocked.
func (s *modelSheet) recovery(w waves, current []float64) error {
	back := make([]float64, len(current))
	for k, i := range current {
		back[k] = -i
	}
	zero := w.crossing(current, 0, 0, false)
	peak, at := w.top(back)
	high, low := w.crossing(back, 0.9*peak, at, false), w.crossing(back, 0.25*peak, at, false)
	end := w.crossing(back, 0.02*peak, at, false)
	if math.IsNaN(zero + high + low + end) {
		return fmt.Errorf("no recovery in %.3g s: zero %.3g, peak %.3g A at %.3g", w.time[len(w.time)-1], zero, peak, at)
	}
	s.peak, s.Charge = peak, w.integral(back, zero, end)
	s.Softness = (high + (low-high)*0.9/0.65 - at) / (at - zero)
	return nil
}
