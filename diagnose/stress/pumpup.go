package stress

import (
	"fmt"
	"math"

	"drivemend/measure/quantity"
)

// Reservoir is the capacitor of a clamp or recovery network that has lost its way back to the bus: at every opening the
// loop empties into it, and nothing takes that away. With u its voltage less the bus, one edge gives
// u² → u² + L·I²/C, so it climbs as the root of time until a bleeder or a breakdown stops it. Derived from the energy
// of the loop; it holds for an ideal diode, a hard cut, and a rail that keeps its voltage.
type Reservoir struct {
	Bus   float64 // V
	Farad float64 // F
	Henry float64 // H, of the loop that empties into it
	Amps  float64 // A, when the switch opens
	Hertz float64 // Hz, openings per second
	// Bleeder is the resistor across the reservoir in Ω, 0 without one, and Return where it leads: ClampToRail or ClampToBus.
	Bleeder float64
	Return  string
}

// What stops a reservoir's climb.
const (
	StopBleeder   = "bleeder"
	StopBreakdown = "breakdown"
)

// PumpEnd is where the climb ends.
type PumpEnd struct {
	By      string  // StopBleeder or StopBreakdown
	Volts   float64 // V of the reservoir
	Edges   float64 // openings until then (a whole number); with the bleeder until nearPump of the way over the bus
	Seconds float64 // s until then
}

// nearPump is the share of the way over the bus at which a balance counts as reached.
const nearPump = 0.99

// After gives the reservoir's voltage in V after a number of edges, with no bleeder: V + I·√(n·L/C), from the
// bus. A bleeder is left out, so with one this is too high.
func (r Reservoir) After(edges float64) (volts float64, err error) {
	if err := r.check(); err != nil {
		return 0, err
	}
	if err := notNegative("reservoir", argument{"number of edges", edges, quantity.Count}); err != nil {
		return 0, err
	}
	volts = r.Bus + r.Amps*math.Sqrt(edges*r.Henry/r.Farad)
	return volts, computable("reservoir", volts)
}

// Step gives the reservoir's voltage in V after one more edge, from the present one (V, at or above the bus):
// V + √((now−V)² + L·I²/C).
func (r Reservoir) Step(now float64) (volts float64, err error) {
	if err := r.check(); err != nil {
		return 0, err
	}
	if err := r.atOrAbove(now); err != nil {
		return 0, err
	}
	volts = r.Bus + math.Hypot(now-r.Bus, r.Amps*math.Sqrt(r.Henry/r.Farad))
	return volts, computable("reservoir", volts)
}

// Until gives the seconds and openings until the reservoir stands at a voltage (V, at or above the bus), from the bus.
// Without a bleeder n = C·u²/(L·I²). With one it is C·u·du/dt = ½·L·I²·f − u·(u+b)/R, b the bus for a bleeder to the
// rail and 0 to the bus, which integrates to R·C/(p+q)·(p·ln(p/(p−u)) − q·ln(1+u/q)) with p·q = R·½·L·I²·f and
// q − p = b (derived; the mean over many edges, off by about one edge at the start). A voltage that the
// bleeder never lets it reach gives false.
func (r Reservoir) Until(volts float64) (seconds, edges float64, reached bool, err error) {
	if err := r.check(); err != nil {
		return 0, 0, false, err
	}
	if err := r.atOrAbove(volts); err != nil {
		return 0, 0, false, err
	}
	u := volts - r.Bus
	if r.Bleeder == 0 {
		edges = r.Farad / r.Henry * (u / r.Amps) * (u / r.Amps)
		seconds = edges / r.Hertz
	} else {
		p, q := r.clamp().level(r.Bleeder)
		if u >= p {
			return 0, 0, false, nil
		}
		seconds = r.Bleeder * r.Farad / (p + q) * (-p*math.Log1p(-u/p) - q*math.Log1p(u/q))
		edges = seconds * r.Hertz
	}
	return seconds, wholeEdges(edges), true, computable("reservoir", seconds, edges)
}

// wholeEdges rounds up, except where the fraction is that of the arithmetic.
func wholeEdges(n float64) float64 {
	if near := math.Round(n); math.Abs(n-near) <= 1e-9*max(near, 1) {
		return near
	}
	return math.Ceil(n)
}

// End tells what stops the climb: the bleeder's balance ((V + √(V²+4·R·½·L·I²·f))/2 to the rail, V + √(R·½·L·I²·f) to
// the bus) or, where that lies higher or there is no bleeder, the breakdown (V, above the bus) of the switch or of the
// capacitor itself. Of a switch it is the avalanche, at every opening from then on.
func (r Reservoir) End(breakdown float64) (PumpEnd, error) {
	if err := r.check(); err != nil {
		return PumpEnd{}, err
	}
	if err := r.atOrAbove(breakdown); err != nil {
		return PumpEnd{}, err
	}
	end := PumpEnd{By: StopBreakdown, Volts: breakdown}
	target := breakdown
	if r.Bleeder > 0 {
		if p, _ := r.clamp().level(r.Bleeder); r.Bus+p <= breakdown {
			end.By, end.Volts, target = StopBleeder, r.Bus+p, r.Bus+nearPump*p
		}
	}
	var err error
	end.Seconds, end.Edges, _, err = r.Until(target)
	return end, err
}

// clamp is the same network seen as a held clamp, whose balance the bleeder makes.
func (r Reservoir) clamp() HeldClamp {
	return HeldClamp{Bus: r.Bus, Henry: r.Henry, Amps: r.Amps, Hertz: r.Hertz, Return: r.Return}
}

func (r Reservoir) atOrAbove(volts float64) error {
	if !(volts >= r.Bus) || math.IsInf(volts, 0) {
		return fmt.Errorf("reservoir: %s lies below the bus of %s, to which it is filled before it climbs; state a voltage "+
			"above it", quantity.Format(volts, quantity.Volt), quantity.Format(r.Bus, quantity.Volt))
	}
	return nil
}

func (r Reservoir) check() error {
	err := notNegative("reservoir", argument{"bus", r.Bus, quantity.Volt}, argument{"bleeder", r.Bleeder, quantity.Ohm})
	if err != nil {
		return err
	}
	if r.Bleeder > 0 && r.Return != ClampToRail && r.Return != ClampToBus {
		return fmt.Errorf("reservoir: the bleeder leads to %q; allowed: %q or %q; state snubber.return",
			r.Return, ClampToRail, ClampToBus)
	}
	return positive("reservoir", argument{"capacitance", r.Farad, quantity.Farad},
		argument{"inductance", r.Henry, quantity.Henry}, argument{"current", r.Amps, quantity.Ampere},
		argument{"frequency", r.Hertz, quantity.Hertz})
}

// FallBack is how a pumped reservoir returns to the bus through its link of resistance and inductance in series.
type FallBack struct {
	TimeConstant float64 // s, of the slowest part: R·C without inductance; 2·L/R where it rings
	Damping      float64 // ratio, R/2·√(C/L); 0 stands for a link without inductance, which never rings
	Ring         float64 // Hz, 0 where it does not ring; then it swings below the bus as well
}

// CloseLink gives the fall after the link of the reservoir (F) closes again, its resistance (Ω, above zero) and
// inductance (H, from zero). The bus is taken as large against the reservoir. Derived from circuit laws.
func CloseLink(farad, ohm, henry float64) (FallBack, error) {
	err := positive("link", argument{"capacitance", farad, quantity.Farad}, argument{"resistance", ohm, quantity.Ohm})
	if err == nil {
		err = notNegative("link", argument{"inductance", henry, quantity.Henry})
	}
	if err != nil {
		return FallBack{}, err
	}
	f := FallBack{TimeConstant: ohm * farad}
	if henry > 0 {
		f.Damping = ohm / 2 * math.Sqrt(farad/henry)
		if inside := 1 - f.Damping*f.Damping; inside > 0 {
			f.TimeConstant, f.Ring = 2*henry/ohm, math.Sqrt(inside/(henry*farad))/(2*math.Pi)
		} else {
			f.TimeConstant = ohm * farad / 2 * (1 + math.Sqrt(-inside)/f.Damping)
		}
	}
	return f, computable("link", f.TimeConstant, f.Damping, f.Ring)
}
