package stress

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// Where the resistor of a held clamp leads.
const (
	ClampToRail = "rail" // to the rail that the clamp's capacitor stands on
	ClampToBus  = "bus"  // back to the bus
)

// HeldClamp is a diode into a capacitor that a resistor keeps at a level above the bus, in balance: at every opening the
// loop empties into it through the diode while the bus stays in series, and the resistor carries that away until the next
// one. The formulas hold for a hard cut (the channel and the output capacitance take nothing), an ideal diode, a ripple
// that is small against clamp less bus, and a loop that empties before the next edge; they are derived from the charge of
// one event. The dissipation of a clamp with its resistor on the rail is also that of the flyback clamp in Fairchild
// AN-4147 (from memory).
type HeldClamp struct {
	Bus    float64 // V
	Henry  float64 // H, of the loop that empties into it
	Amps   float64 // A, when the switch opens
	Hertz  float64 // Hz, openings per second
	Return string  // ClampToRail or ClampToBus
}

// ClampFigures are one point of balance.
type ClampFigures struct {
	Clamp   float64 // V, what the capacitor holds
	Ohm     float64 // Ω, the resistor that holds it there
	Watts   float64 // W, in that resistor
	Coulomb float64 // C, charge of one event, L·I²/(2·(clamp−bus))
	Time    float64 // s, for which the diode conducts, L·I/(clamp−bus)
	Joule   float64 // J, energy of one event into the capacitor, charge times clamp
}

// At gives resistor, heat and charge for a clamp that is wanted at a voltage (V, above the bus):
// to the rail P = ½·L·I²·f·clamp/(clamp−bus), R = clamp²/P; to the bus P = ½·L·I²·f, R = (clamp−bus)²/P.
func (c HeldClamp) At(clamp float64) (ClampFigures, error) {
	if err := c.check(); err != nil {
		return ClampFigures{}, err
	}
	if !(clamp > c.Bus) || math.IsInf(clamp, 0) {
		return ClampFigures{}, fmt.Errorf("held clamp: %s is not above the bus of %s, so the loop cannot empty into it; state a "+
			"higher clamp voltage", quantity.Format(clamp, quantity.Volt), quantity.Format(c.Bus, quantity.Volt))
	}
	above := clamp - c.Bus
	f := ClampFigures{Clamp: clamp, Time: c.Henry * c.Amps / above}
	f.Coulomb = c.Amps * f.Time / 2
	f.Joule = f.Coulomb * clamp
	if c.Return == ClampToBus {
		f.Watts = f.Coulomb * above * c.Hertz
		f.Ohm = above * above / f.Watts
	} else {
		f.Watts = f.Joule * c.Hertz
		f.Ohm = clamp * clamp / f.Watts
	}
	return f, computable("held clamp", f.Time, f.Coulomb, f.Watts, f.Ohm)
}

// With gives the level (V) to which a fitted resistor (Ω) lets the clamp rise, and the figures there: to the rail
// (V + √(V² + 4·R·½·L·I²·f))/2, to the bus V + √(R·½·L·I²·f).
func (c HeldClamp) With(ohm float64) (ClampFigures, error) {
	if err := c.check(); err != nil {
		return ClampFigures{}, err
	}
	if err := positive("held clamp", argument{"resistor", ohm, quantity.Ohm}); err != nil {
		return ClampFigures{}, err
	}
	above, _ := c.level(ohm)
	return c.At(c.Bus + above)
}

// level gives how far over the bus the balance lies (V), and that plus what the resistor sees below it: the other root
// of the balance, which the way there needs too.
func (c HeldClamp) level(ohm float64) (above, root float64) {
	power := ohm * c.Henry * c.Amps * c.Amps * c.Hertz / 2
	if c.Return == ClampToBus {
		return math.Sqrt(power), math.Sqrt(power)
	}
	root = (c.Bus + math.Sqrt(c.Bus*c.Bus+4*power)) / 2
	return power / root, root // power/root is root − bus without losing digits
}

func (c HeldClamp) check() error {
	if c.Return != ClampToRail && c.Return != ClampToBus {
		return fmt.Errorf("held clamp: the resistor leads to %q; allowed: %q or %q; state snubber.return",
			c.Return, ClampToRail, ClampToBus)
	}
	if err := notNegative("held clamp", argument{"bus", c.Bus, quantity.Volt}); err != nil {
		return err
	}
	return positive("held clamp", argument{"inductance", c.Henry, quantity.Henry}, argument{"current", c.Amps, quantity.Ampere},
		argument{"frequency", c.Hertz, quantity.Hertz})
}

// Ripple is how far one event lifts the capacitor (F, above zero), in V: charge over capacitance. 5 to 10 % of clamp
// less bus is usual (judgement).
func (f ClampFigures) Ripple(farad float64) float64 { return f.Coulomb / farad }

// Capacitance is the capacitor in F that keeps the ripple down to the given one (V, above zero).
func (f ClampFigures) Capacitance(ripple float64) float64 { return f.Coulomb / ripple }

// DecouplingFor is the capacitor in F straight across the leg that lets the rail there rise by no more than the given
// voltage (V) when the upstream inductance (H) empties its current (A) into it: C = L·I²/ΔV². Every value above zero.
// With the whole loop for L it is on the safe side. Source: Volke and Hornkamp, IGBT Modules, 2nd ed., p. 477, eq. 13.9.
func DecouplingFor(henry, amps, rise float64) (farad float64, err error) {
	err = positive("decoupling capacitor", argument{"inductance", henry, quantity.Henry},
		argument{"current", amps, quantity.Ampere}, argument{"rise allowed", rise, quantity.Volt})
	if err != nil {
		return 0, err
	}
	farad = henry * (amps / rise) * (amps / rise)
	return farad, computable("decoupling capacitor", farad)
}

// Decoupled is a capacitor across the leg with the inductances around it.
type Decoupled struct {
	Bus      float64 // V
	Amps     float64 // A, switched off
	Farad    float64 // F
	Upstream float64 // H, from the capacitor back to and through the bus capacitor
	Own      float64 // H, of the capacitor and its leads; 0 where it has next to none
	Leg      float64 // H, from the capacitor through the switch, package included
}

// DecouplingFigures are what such a capacitor leaves.
type DecouplingFigures struct {
	Swing float64 // V, amplitude of the rail at the leg, I·√(upstream/C) (eq. 13.11, as far as it was legible)
	Peak  float64 // V, of that rail: bus and swing
	Ring  float64 // Hz, against the bus, 1/(2π·√((upstream+own)·C)) (eq. 13.10)
	Step  float64 // V, first peak at the chip, which no capacitance lowers: bus + (own+leg)·slope
}

// Figures gives swing, ring and the step that remains for a current slope (A/s) at opening. Values above zero, own
// and leg from zero. The swing is exact for an own inductance of zero and a current cut at once; the other two follow
// from circuit laws. Source: Volke and Hornkamp, IGBT Modules, 2nd ed., p. 477.
func (d Decoupled) Figures(slope float64) (DecouplingFigures, error) {
	const where = "decoupling capacitor"
	err := positive(where, argument{"current", d.Amps, quantity.Ampere}, argument{"capacitance", d.Farad, quantity.Farad},
		argument{"upstream inductance", d.Upstream, quantity.Henry})
	if err == nil {
		err = notNegative(where, argument{"bus", d.Bus, quantity.Volt}, argument{"own inductance", d.Own, quantity.Henry},
			argument{"leg inductance", d.Leg, quantity.Henry}, argument{"current slope", slope, quantity.AmperePerSecond})
	}
	if err != nil {
		return DecouplingFigures{}, err
	}
	f := DecouplingFigures{Swing: d.Amps * math.Sqrt(d.Upstream/d.Farad), Step: d.Bus + (d.Own+d.Leg)*slope}
	f.Ring = 1 / (2 * math.Pi * math.Sqrt((d.Upstream+d.Own)*d.Farad))
	f.Peak = d.Bus + f.Swing
	return f, computable(where, f.Swing, f.Ring, f.Step)
}
