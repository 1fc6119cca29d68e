package stress

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// seen is one measured opening: where it is written down, and what it showed.
type seen struct {
	name     string
	position string
	measured Measured
}

// openingsOf lists the measured openings of the board as found, and of the rebuild, in the order of the file. A capture
// counts for the board that stood there when it was taken, a stage of the bring-up for the rebuild.
func openingsOf(c *measure.Case) (found, rebuilt []seen) {
	var done time.Time
	if c.Rebuild != nil {
		done = c.Rebuild.Done
	}
	for _, x := range c.Captures {
		if x.Edge != "opening" {
			continue
		}
		s := seen{name: x.Name, position: x.Position, measured: measuredOf(x.Figures)}
		if !done.IsZero() && x.At.After(done) {
			rebuilt = append(rebuilt, s)
		} else {
			found = append(found, s)
		}
	}
	for _, x := range c.BringUp {
		rebuilt = append(rebuilt, seen{name: "stage " + x.Stage, measured: measuredOf(x.Figures)})
	}
	return found, rebuilt
}

// measuredOf takes the figures of an opening; a probe stands on the terminals.
func measuredOf(figures map[string]quantity.Quantity) Measured {
	return Measured{Bus: figures["bus"], Current: figures["current"], Peak: figures["peak"], FallTime: figures["fall_time"],
		Ring: figures["ring_frequency"], Damping: figures["damping_ratio"].Value}
}

// complete tells whether bus, current and a peak above the bus are there.
func (s seen) complete() bool {
	m := s.measured
	return m.Bus.Value > 0 && m.Current.Value > 0 && m.Peak.Value > m.Bus.Value
}

// leastColumns is the rating from which a MOSFET is taken as built of columns; some are not, which makes the bound wide.
const leastColumns = 500 // V

// fromCapture carries the measured opening that is nearest to the highest bus and worst current to them; nil without one.
func (p *problem) fromCapture(openings []seen) (*FromCapture, error) {
	var best *seen
	for k, s := range openings {
		here := s.position == "" || s.position == p.position
		if s.complete() && here && (best == nil || power(s) > power(*best)) {
			best = &openings[k]
		}
	}
	if best == nil {
		return nil, nil
	}
	s := p.highest()
	m := best.measured
	switch m.Network = p.base.net; m.Network {
	case "":
		m.Network = "none"
	case "capacitor", "rc", "rcd":
	default:
		m.Network = "" // the widest of the laws
	}
	m.Columns = s.kind == "mosfet" && p.stated >= leastColumns
	carried, err := m.At(s.bus, s.amps)
	if err != nil {
		return nil, fmt.Errorf("the opening measured as %s: %w", best.name, err)
	}
	inside, err := p.packageShare(m.Bus.Value, m.Current.Value)
	if err != nil {
		return nil, err
	}
	f := &FromCapture{Name: best.name, Why: inside.why}
	if f.Near = s.bus <= mostCarried*m.Bus.Value && s.amps <= mostCarried*m.Current.Value; !f.Near {
		f.Why += "; measured far below the highest bus and worst current, so that the upper end is a bound and takes nothing from the verdict"
	}
	f.Low, f.Mid = s.bus+(carried.Low-s.bus)*inside.low, s.bus+(carried.Mid-s.bus)*inside.mid
	f.High = s.bus + (f.Mid-s.bus)*(1+bothExcesses(carried, inside, s.bus))
	f.findLoop(m)
	return f, nil
}

// shareDoubt is how much more of the overshoot the chip may see than the solved edge says (judgement, after the gate-driven
// reference boards).
const shareDoubt = 1.15

// mostCarried is by how much bus and current may be raised for the upper end of a measured opening to say something of the
// board: carried further it is a bound and no estimate (judgement).
const mostCarried = 1.25

// bothExcesses is by how much the overshoot at the chip may exceed the one in the middle: what carrying it over and what the
// package may add, which have nothing to do with one another, added in squares.
func bothExcesses(carried Carried, inside known, bus float64) float64 {
	return math.Hypot((carried.High-bus)/(carried.Mid-bus)-1, shareDoubt*inside.high/inside.mid-1)
}

func power(s seen) float64 { return s.measured.Bus.Value * s.measured.Current.Value }

// packageShare is by how much the overshoot at the chip exceeds the one at the terminals, where a probe stands: as the
// solved edge at the measured bus and current has it, with the package inductance over its interval. A channel that lets go
// faster than its gate-limited edge, as the straight cut does, leaves more of the voltage to the package: the upper end.
func (p *problem) packageShare(bus, amps float64) (known, error) {
	s := p.base
	s.bus, s.amps, s.outside = bus, amps, true
	in := p.in.values[p.in.at["switch.package_inductance"]]
	share := func(shape edgeShape, henry float64) (float64, error) {
		e, err := shape(s.quick().with(in.key, henry))
		if err != nil {
			return 0, err
		}
		return max(1, (e.Peak-bus)/max(e.terminals-bus, 1e-3*bus)), nil
	}
	var shares [4]float64
	for k, henry := range []float64{in.low, in.mid, in.high, in.high} {
		shape := scene.gateLimited
		if k == 3 {
			shape = scene.cut
		}
		var err error
		if shares[k], err = share(shape, henry); err != nil {
			return known{}, err
		}
	}
	why := fmt.Sprintf("measured at the terminals; the package adds %.0f %% at the chip", 100*(shares[1]-1))
	return known{interval{shares[0], shares[1], max(shares[2], shares[3])}, why}, nil
}

// findLoop takes the loop inductance from the surest of what was measured; the mean slope of the fall time gives only an
// upper end and is left out.
func (f *FromCapture) findLoop(m Measured) {
	loops, err := m.Loops()
	if err != nil || len(loops) == 0 {
		return
	}
	loops = slices.DeleteFunc(loops, func(l LoopEstimate) bool { return l.Method == LoopFromFall }) // only an upper end
	if len(loops) == 0 {
		return
	}
	best := slices.MinFunc(loops, func(a, b LoopEstimate) int { return cmp.Compare(a.Sigma/a.Henry, b.Sigma/b.Henry) })
	f.Loop, f.LoopLow, f.LoopHigh = best.Henry, best.Low, best.High
}

// thermalLadder is the thermal ladder of the switch, as far as it is stated.
func thermalLadder(b measure.Board) []LadderStep {
	var out []LadderStep
	for k := 1; ; k++ {
		at := fmt.Sprintf("cooling.foster[%d].", k)
		ohm, okOhm := b.Quantity(at + "resistance")
		tau, okTau := b.Quantity(at + "time")
		if !okOhm || !okTau {
			return out
		}
		out = append(out, LadderStep{Resistance: ohm.Value, Time: tau.Value})
	}
}
