package safety

import (
	"fmt"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// class is what is taken for a board of one supply where the case is silent. All values are judgements, except where
// a source is named; they are chosen high, for what is shown as the worst case must not be exceeded by the board.
type class struct {
	supply  string
	highest float64 // volts, where no bus voltage is stated at all
	rise    float64 // highest over nominal, where only the nominal voltage is stated
	because string
}

// The first class stands for a supply that is not stated.
var classes = []class{
	{"rectified-mains", 825, 1.3, "400/480 V mains pumped up by braking: a drive is labelled from 825 V (Schneider Electric FAQ FA364579, read); a 690 V board lies higher"},
	{"shared-bus", 825, 1.3, "400/480 V shared bus pumped up by braking: a drive is labelled from 825 V (Schneider Electric FAQ FA364579, read); a 690 V board lies higher"},
	{"battery", 120, 1.25, "traction battery of 96 V while it is charged (judgement)"},
	{"bench-supply", 120, 1.0, "as for a traction battery, since the board was not built for the bench (judgement)"},
}

// The capacitances taken where none is stated (judgement; 4700 µF is the largest bank in the worked examples of the
// notes, low-voltage choppers carry larger ones).
const (
	worstBank     = 4700e-6
	worstLowBank  = 22e-3 // up to lowBankVolts
	lowBankVolts  = 150.0
	worstClamp    = 10e-6
	worstPrimary  = 100e-6
	worstSnubber  = 100e-9
	oneCanVolts   = 450.0 // above it a bank is taken to be a split one: cans are made to about 450-500 V (from memory)
	smallCoulombs = 50e-6 // the charge below which a drive's residual charge is exempt, IEC 61800-5-1 (from memory)
)

func classOf(b measure.Board) class {
	supply, _ := b.Word("supply")
	for _, c := range classes {
		if c.supply == supply {
			return c
		}
	}
	return unstatedClass()
}

// unstatedClass is taken for a board whose supply nobody knows: the highest of all classes.
func unstatedClass() class {
	c := classes[0]
	c.because = "supply not stated: " + c.because
	return c
}

// worstBus is the bus of a board of which neither bus nor supply is known.
func worstBus() Figure {
	c := unstatedClass()
	return Figure{Value: c.highest, Unit: quantity.Volt, Basis: Assumed, Because: "bus voltage not stated: " + c.because}
}

// busVoltage is the highest voltage the bus may have stood at.
func busVoltage(b measure.Board) Figure {
	if q, ok := positive(b, "bus.highest"); ok {
		q.Value = q.High // the plan is made for the top of what was stated
		return stated(b, "bus.highest", q)
	}
	c := classOf(b)
	if q, ok := positive(b, "bus.nominal"); ok {
		return Figure{Value: q.High * c.rise, Unit: quantity.Volt, Basis: Assumed,
			Because: fmt.Sprintf("bus.highest not stated: %g times the nominal voltage (judgement)", c.rise)}
	}
	return Figure{Value: c.highest, Unit: quantity.Volt, Basis: Assumed, Because: "bus voltage not stated: " + c.because}
}

// bankCapacitance is the capacitance between the rails.
func bankCapacitance(b measure.Board, volt float64) Figure {
	if q, ok := positive(b, "bus.capacitance"); ok {
		return stated(b, "bus.capacitance", q)
	}
	f := Figure{Value: worstBank, Unit: quantity.Farad, Basis: Assumed, Because: "bus.capacitance not stated: a large bank (judgement)"}
	if volt <= lowBankVolts {
		f.Value = worstLowBank
	}
	return f
}

// stated takes the value as written; an assumed key stays assumed however it was written.
func stated(b measure.Board, path string, q quantity.Quantity) Figure {
	f := Figure{Value: q.Value, Unit: q.Unit, Basis: Stated}
	if b.Assumed(path) {
		f.Basis, f.Because = Assumed, path+" is listed as assumed"
	}
	return f
}

// positive gives a stated quantity above zero.
func positive(b measure.Board, path string) (quantity.Quantity, bool) {
	q, ok := b.Quantity(path)
	return q, ok && q.Value > 0
}

// presence answers whether a board has something, from a yes/no key or from a quantity that only such a board has.
type presence int

const (
	silent presence = iota
	absent
	fitted
	doubtful
)

func present(b measure.Board, path string) presence {
	if w, ok := b.Word(path); ok && w != "" {
		switch w {
		case "no", "none":
			return absent
		case "unknown":
			return doubtful
		}
		return fitted
	}
	if q, ok := b.Quantity(path); ok {
		if q.Value > 0 {
			return fitted
		}
		return absent
	}
	return silent
}
