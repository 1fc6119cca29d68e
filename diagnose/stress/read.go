package stress

import (
	"errors"
	"math"
	"slices"

	"drivemend/diagnose/circuit"
)

// read takes the figures off a run, the last thing that is asked of it where only the peak is wanted.
func (c *cell) read(run *circuit.Run, probe int, e Edge) *Edge {
	s := c.s
	e.Bus, e.Current, e.charge, e.gained, e.steps = s.bus, s.amps, c.taken(run), c.gained(run), run.Steps()
	if c.outside >= 0 {
		e.terminals, _ = run.Peak(c.outside)
	}
	if c.struck >= 0 {
		e.struck, _ = run.Peak(c.struck)
	}
	e.Peak, e.PeakTime = run.Peak(probe)
	if !(e.Peak >= s.bus) { // too little current to bring it there within the time followed
		e.Peak, e.PeakTime = s.bus, run.Time()
	}
	if s.fast {
		run.Release()
		return &e
	}
	for _, p := range run.Trace(probe) {
		e.Waveform = append(e.Waveform, Sample{p.T, p.V})
	}
	e.Slope = slope(e.Waveform, s.bus)
	e.Ring, e.Damping = ring(e.Waveform, e.PeakTime)
	e.Energies, e.Network, e.run, e.plus, e.minus = energies(run), c.networkWork(run), run, c.plus, c.minus
	if s.net == "rc" || s.net == "rcd" {
		e.Discharge = s.bus / s.get("snubber.resistance")
	}
	return &e
}

// networkWork reads what the network's capacitor went through.
func (c *cell) networkWork(run *circuit.Run) Worked {
	if c.worked < 0 {
		return Worked{}
	}
	up, _ := run.Peak(c.worked)
	down, _ := run.Lowest(c.worked)
	w := Worked{Square: run.Square(c.s.capacitorName()), Peak: math.Max(up, -down)}
	farad := c.s.get("snubber.capacitance")
	if c.s.net == "recovery" {
		farad = c.s.get("snubber.reservoir")
	}
	if farad > 0 {
		w.Slope = w.Peak / farad
	}
	return w
}

// Netlist gives the circuit of this edge as a SPICE deck that runs unchanged (ngspice -b) and finds the same peak at
// the chip, within a hundredth; every source follows the waveform that it had here. An edge that was not solved in
// full, as the ones drawn are not, gives an error.
func (e *Edge) Netlist(title string) (string, error) {
	if e == nil || e.run == nil {
		return "", errors.New("no circuit was kept of this edge; work out the margin of the case first")
	}
	end := e.run.Time()
	step := math.Min(end/2000, e.quickest()/50)
	return e.run.Netlist(title, end, math.Max(step, end/200_000), circuit.Measure{Name: "peak", A: e.plus, B: e.minus})
}

// quickest is the shortest time that a deck has to follow: the ring, or a hundredth of the edge.
func (e *Edge) quickest() float64 {
	if e.Ring > 0 {
		return 1 / e.Ring
	}
	return e.run.Time() / 100
}

// shownElements are the elements whose energies are shown, in this order, each with the elements of the circuit it
// stands for. The switch is its channel: what it lost while it held the ramp, and while its current changed.
var shownElements = []struct {
	name  string
	parts []string
}{
	{"switch", []string{"hold", "ramp", "channel", "floor", "floor-level"}},
	{"avalanche", []string{"avalanche"}},
	{"output-capacitance", []string{"output", "depletion-0", "depletion-1", "depletion-2"}},
	{"snubber-capacitor", []string{"snubber"}},
	{"snubber-resistor", []string{"snubber-resistor"}},
	{"snubber-diode", []string{"snubber-diode", "snubber-diode-recovery", "snubber-diode-recovery-time"}},
	{"suppressor", []string{"suppressor"}},
	{"snubber-link", []string{"tie-resistance"}},
	{"opposite-snubber-capacitor", []string{"far-snubber"}},
	{"opposite-snubber-resistor", []string{"far-snubber-resistor"}},
	{"opposite-snubber-diode", []string{"far-snubber-diode", "far-snubber-diode-recovery", "far-snubber-diode-recovery-time"}},
	{"opposite-suppressor", []string{"far-suppressor"}},
	{"opposite-snubber-link", []string{"far-tie-resistance"}},
	{"freewheel", []string{"freewheel", "freewheel-recovery", "freewheel-recovery-time", "recovery"}},
	{"loop-resistance", []string{"loop-resistance", "link-resistance", "loop-damping"}},
	{"bus-esr", []string{"bus-esr"}},
}

// energies gives what the elements took up, those that are there and took something.
func energies(run *circuit.Run) []Energy {
	var out []Energy
	for _, shown := range shownElements {
		sum := 0.0
		for _, name := range shown.parts {
			if j := run.Energy(name); !math.IsNaN(j) {
				sum += j
			}
		}
		if sum != 0 {
			out = append(out, Energy{shown.name, sum})
		}
	}
	return out
}

// slope is the mean slope between 10 and 90 % of the bus on the way up; 0 when the bus was not reached.
func slope(w []Sample, bus float64) float64 {
	low, high := crossing(w, 0.1*bus), crossing(w, 0.9*bus)
	if math.IsNaN(low) || math.IsNaN(high) || high <= low {
		return 0
	}
	return 0.8 * bus / (high - low)
}

// crossing is when a waveform first rises through a level, between samples in a straight line.
func crossing(w []Sample, level float64) float64 {
	for i := 1; i < len(w); i++ {
		if a, b := w[i-1], w[i]; a.V < level && b.V >= level {
			return a.T + (b.T-a.T)*(level-a.V)/(b.V-a.V)
		}
	}
	return math.NaN()
}

// ripple is the share of the first swing that a turn has to swing back by, to count as one: less is another mode riding on
// the ring.
const ripple = 0.2

// ring reads frequency and damping ratio off the swings after the peak: the peak, the trough after it, the next crest. A
// clamp makes tops broad, so that their moment says little: the frequency is that of falling through half the height of
// the second crest, once after either top. The swings shrink by exp(−π·ζ/√(1−ζ²)) each half turn.
func ring(w []Sample, peakTime float64) (hertz, damping float64) {
	turns := turningPoints(w, peakTime)
	if len(turns) < 3 {
		return 0, 0
	}
	peak, trough, crest := height(w, turns[0]), height(w, turns[1]), height(w, turns[2])
	first, second := peak-trough, crest-trough
	if first <= 0 || second <= 0 || second >= first {
		return 0, 0
	}
	half := (trough + crest) / 2
	period := falling(w[turns[2]:], half) - falling(w[turns[0]:], half)
	if !(period > 0) {
		return 0, 0
	}
	l := math.Log(first / second)
	return 1 / period, l / math.Hypot(math.Pi, l)
}

// height is that of a turn between samples.
func height(w []Sample, at int) float64 {
	if at == 0 || at == len(w)-1 {
		return w[at].V
	}
	return vertex(w[at-1], w[at], w[at+1]).V
}

// falling is when a waveform first falls through a level; not a number when it does not.
func falling(w []Sample, level float64) float64 {
	for i := 1; i < len(w); i++ {
		if a, b := w[i-1], w[i]; a.V > level && b.V <= level {
			return a.T + (b.T-a.T)*(a.V-level)/(a.V-b.V)
		}
	}
	return math.NaN()
}

// turningPoints gives the places of the peak and of the trough and crest after it, over ripples on the way.
func turningPoints(w []Sample, from float64) []int {
	top := slices.IndexFunc(w, func(s Sample) bool { return s.T >= from })
	if top < 0 {
		return nil
	}
	if top > 0 && w[top-1].V > w[top].V {
		top--
	}
	out, turn, sign := []int{top}, top, -1.0 // what is looked for next: a trough
	for i := top + 1; i < len(w) && len(out) < 3; i++ {
		back := sign * (w[turn].V - w[i].V)
		switch height := math.Abs(w[top].V - w[turn].V); {
		case back < 0:
			turn = i
		case back > ripple*height && height > 0:
			out, sign = append(out, turn), -sign
			turn = i
		}
	}
	return out
}

// vertex of the parabola through three samples.
func vertex(a, b, c Sample) Sample {
	p, q := (b.V-a.V)/(b.T-a.T), (c.V-b.V)/(c.T-b.T)
	bend := (q - p) / (c.T - a.T)
	if bend == 0 || math.IsNaN(bend) || math.IsInf(bend, 0) {
		return b
	}
	t := (a.T+b.T)/2 - p/(2*bend)
	if t < a.T || t > c.T {
		return b
	}
	return Sample{t, a.V + p*(t-a.T) + bend*(t-a.T)*(t-b.T)}
}
