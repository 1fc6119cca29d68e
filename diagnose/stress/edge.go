package stress

import (
	"fmt"
	"math"

	"drivemend/diagnose/circuit"
)

// Edge is one solved opening of the switch, at the chip.
type Edge struct {
	Name      string // turn-off
	Shape     string // gate-limited, cut
	Position  string
	Bus       float64 // V
	Current   float64 // A, of the whole bank
	Peak      float64 // V, never below the bus, which the open switch blocks in the end
	PeakTime  float64 // s from the start of the edge
	Slope     float64 // V/s, mean between 10 and 90 % of the bus
	Ring      float64 // Hz; 0 when nothing rings
	Damping   float64 // ratio of the ring; 0 when nothing rings
	Energies  []Energy
	Waveform  []Sample
	Discharge float64 // A, what the network will push into the switch when it closes; 0 without one
}

// Energy is what one element took up during the edge.
type Energy struct {
	Element string
	Joule   float64
}

// Sample is one point of a waveform.
type Sample struct{ T, V float64 }

// The shapes of the opening edge.
const (
	shapeGate = "gate-limited"
	shapeCut  = "cut"
)

const (
	plainDrop    = 0.9     // V, forward voltage of a diode the case is silent about
	plainSlope   = 5e-3    // Ω, its slope resistance
	channelSlope = 1e-3    // Ω, of the element that holds the chip to the gate-limited ramp
	cosineSteps  = 64      // straight pieces of the raised cosine; its slope is met within 0.1 %
	igbtSteeper  = 1.6     // an IGBT without a stated fall shape is this much steeper than its mean
	straightRule = 0.8     // fall time 90 to 10 % over a straight fall (0.8·t(0–100))
	cosineRule   = 0.59    // the same for a raised cosine: (arccos(−0.8) − arccos(0.8))/π
	leastShare   = 1e-6    // of the load current; a channel that carries less at the bus has opened already
	tailSpan     = 4.0     // time constants of a tail that are followed
	mostSteps    = 500_000 // of the solver in one edge: a second or so
	mostVolts    = 1e9     // V, the solver's range is wider still
	leastHenry   = 1e-18   // H; a forward recovery of less is none
	leastAmps    = 0.1     // A, load current below which times and recovery no longer grow
	leastOhm     = 1e-6    // Ω, of a resistor that is stated as nothing
)

// scene is one set of numbers to solve the edge for.
type scene struct {
	in    *inputs
	x     []float64 // one value for each input
	bus   float64
	amps  float64
	kind  string // of the switch
	net   string // of the network that has all its parts
	free  bool   // there is a freewheel path
	load  float64
	fall  fallShape
	steep float64 // of the cut edge, over its mean slope; 0 counts as 1
	at    float64 // V, where the output capacitance was measured; 0 when it is constant
	rated float64 // V, up to which the falling output capacitance is averaged
	fast  bool    // only the peak is wanted
}

// fallShape is a stated IGBT fall: the fraction that falls fast, and the tail's time constant.
type fallShape struct{ fraction, tail float64 }

func (s scene) get(key string) float64 {
	if k, ok := s.in.at[key]; ok {
		return s.x[k]
	}
	return 0
}

// rig is the circuit of the edge with the handle that the run needs.
type rig struct {
	*circuit.Circuit
	chip int
}

// build lays out the circuit: supply and rails, load, freewheel path, loop, package, chip and network.
func (s scene) build() rig {
	c := circuit.New()
	r := rig{Circuit: c, chip: c.Node("chip")}
	rail, load := c.Node("rail"), c.Node("load")
	s.rails(c, rail)
	s.loadPath(c, rail, load)
	c.Resistor("loop-resistance", load, c.Node("loop"), math.Max(s.get("loop.resistance"), leastOhm))
	s.series(c, r)
	s.output(c, r.chip)
	c.Diode("reverse", 0, r.chip, plainDrop, plainSlope)
	if s.net != "" {
		s.network(c, c.Node("terminal"))
	}
	return r
}

// series joins loop and package inductance; without a network they are one inductor.
func (s scene) series(c *circuit.Circuit, r rig) {
	loop, pack := s.get("loop.inductance"), s.get("switch.package_inductance")/float64(s.in.bank)
	if s.net == "" {
		c.Inductor("loop", c.Node("loop"), r.chip, loop+pack, s.amps)
		return
	}
	c.Inductor("loop", c.Node("loop"), c.Node("terminal"), loop, s.amps)
	c.Inductor("package", c.Node("terminal"), r.chip, pack, s.amps)
}

// output adds the bank's output capacitance. One that falls with the voltage is a constant and, for every step, a
// part that is only there below its level: that part lies in series with two diodes, of which one carries the charge
// of the first rise and is blocked by its source when the level is reached; the other one brings the part back when
// the chip falls below the level again.
func (s scene) output(c *circuit.Circuit, chip int) {
	steps := s.steps()
	last := len(steps) - 1
	c.Capacitor("output", chip, 0, steps[last].farad, 0)
	for k := range last {
		name := depletionName(k)
		foot, block := c.Node(name), c.Node(name+"-end")
		c.Capacitor(name, chip, foot, steps[k].farad-steps[k+1].farad, 0)
		c.Voltage(name+"-end", block, 0, circuit.Constant(0))
		c.Diode(name+"-charge", foot, block, 0, 0.5)
		c.Diode(name+"-return", 0, foot, 0, 0.5)
	}
}

func depletionName(k int) string { return fmt.Sprintf("depletion-%d", k) }

// steps are those of the bank's output capacitance; a single one when it is constant.
func (s scene) steps() []step {
	c := s.get("switch.output_capacitance") * float64(s.in.bank)
	if s.at == 0 {
		return []step{{c, math.Inf(1)}}
	}
	return depletion(c, s.at, s.bus, math.Max(s.rated, 1.25*s.bus))
}

// deplete takes away what the output capacitance loses at a step, and gives the current that part drew.
func (s scene) deplete(run *circuit.Run, k int) (amps float64) {
	amps = run.BranchCurrent(depletionName(k))
	run.Retarget(depletionName(k)+"-end", circuit.Constant(s.beyond()))
	return amps
}

// climbTo runs until the chip is at a level, past the steps of the output capacitance on the way; it gives the number
// of the next step, and false when the chip is not there by the end.
func (s scene) climbTo(run *circuit.Run, probe, k int, level, end float64) (next int, reached bool, err error) {
	for steps := s.steps(); steps[k].until < level; k++ {
		if reached, err = run.To(end, probe, steps[k].until); err != nil || !reached {
			return k, false, err
		}
		s.deplete(run, k)
	}
	reached, err = run.To(end, probe, level)
	return k, reached, err
}

// follow runs on to a time, past the steps of the output capacitance from the given one on.
func (s scene) follow(run *circuit.Run, probe, k int, end float64) error {
	for steps := s.steps(); k < len(steps)-1; k++ {
		reached, err := run.To(end, probe, steps[k].until)
		if err != nil || !reached {
			return err
		}
		s.deplete(run, k)
	}
	_, err := run.To(end, -1, 0)
	return err
}

// beyond is a voltage above any that the chip can reach: bus and the load current through the impedance of
// everything inductive, ten times.
func (s scene) beyond() float64 {
	steps := s.steps()
	return math.Min(10*(s.bus+s.amps*math.Sqrt((s.henry()+s.load)/steps[len(steps)-1].farad)), mostVolts)
}

// henry is all the stray inductance that the chip sees.
func (s scene) henry() float64 {
	return s.get("loop.inductance") + s.get("switch.package_inductance") + s.get("snubber.lead_inductance")
}

// rails is a stiff source, or the bus capacitor fed through the supply inductance, which carries the load current.
func (s scene) rails(c *circuit.Circuit, rail int) {
	farad := s.get("bus.capacitance")
	if farad == 0 {
		c.Voltage("bus", rail, 0, circuit.Constant(s.bus))
		return
	}
	c.Voltage("supply", c.Node("supply"), 0, circuit.Constant(s.bus))
	c.Inductor("supply-inductance", c.Node("supply"), rail, s.get("bus.supply_inductance"), s.amps)
	at := rail
	if esl := s.get("bus.esl"); esl > 0 {
		at = c.Node("bank")
		c.Inductor("bus-esl", rail, at, esl, 0)
	}
	c.Resistor("bus-esr", at, c.Node("bus"), math.Max(s.get("bus.esr"), leastOhm))
	c.Capacitor("bus", c.Node("bus"), 0, farad, s.bus)
}

// loadPath is a constant current with its freewheel diode; without a freewheel path the load's inductance itself.
func (s scene) loadPath(c *circuit.Circuit, rail, load int) {
	if !s.free {
		c.Inductor("load", rail, load, s.load, s.amps)
		return
	}
	c.Current("load", rail, load, circuit.Constant(s.amps))
	s.diode(c, "freewheel", load, rail, "freewheel")
	if farad := s.get("freewheel.capacitance"); farad > 0 {
		c.Capacitor("freewheel-capacitance", load, rail, farad, -s.bus)
	}
}

// diode adds a diode with its forward recovery, a resistor beside an inductor: R = V/I, L = R·t/3.
func (s scene) diode(c *circuit.Circuit, name string, from, to int, key string) {
	volts, time := s.get(key+".forward_recovery.voltage"), s.get(key+".forward_recovery.time")
	end := to
	if ohm := volts / math.Max(s.amps, leastAmps); ohm*time/3 > leastHenry {
		end = c.Node(name + "-recovery")
		c.Resistor(name+"-recovery", end, to, ohm)
		c.Inductor(name+"-recovery-time", end, to, ohm*time/3, 0)
	}
	ohm := plainSlope
	if k, ok := s.in.at[key+".slope_resistance"]; ok {
		ohm = s.x[k]
	}
	c.Diode(name, from, end, s.get(key+".forward_voltage"), ohm)
}

// network adds the snubber at the terminals, behind its lead inductance.
func (s scene) network(c *circuit.Circuit, terminal int) {
	at := terminal
	if lead := s.get("snubber.lead_inductance"); lead > 0 {
		at = c.Node("lead")
		c.Inductor("lead", terminal, at, lead, 0)
	}
	farad, ohm := s.get("snubber.capacitance"), s.get("snubber.resistance")
	switch s.net {
	case "capacitor":
		c.Capacitor("snubber", at, 0, farad, 0)
	case "rc":
		c.Resistor("snubber-resistor", at, c.Node("snubber"), ohm)
		c.Capacitor("snubber", c.Node("snubber"), 0, farad, s.left())
	case "rcd":
		s.diode(c, "snubber-diode", at, c.Node("snubber"), "snubber.diode")
		c.Resistor("snubber-resistor", at, c.Node("snubber"), ohm)
		c.Capacitor("snubber", c.Node("snubber"), 0, farad, s.left())
	}
}

// left is what the network still holds when the switch opens: V·exp(−shortest on-time/RC).
func (s scene) left() float64 {
	rc := s.get("snubber.resistance") * s.get("snubber.capacitance")
	return s.bus * math.Exp(-s.get("pwm.shortest_on_time")/rc)
}

// span is how long the edge is followed: the rise, the fall and three turns of the slowest ring of the loop.
func (s scene) span() float64 {
	farad := s.steps()[0].farad + s.get("snubber.capacitance") + s.get("freewheel.capacitance")
	rise := math.Max(s.bus/s.get("switch.rise_slope"), 1.5*farad*s.bus/math.Max(s.amps, leastAmps))
	if !s.free {
		rise += 2 * math.Pi * math.Sqrt(s.load*farad)
	}
	return rise + 3*s.get("switch.fall_time") + tailSpan*s.fall.tail + 3*2*math.Pi*math.Sqrt(s.henry()*farad)
}

// cut solves the absolute edge: the channel current falls in a straight line from the load current to nothing
// within fall_time/0.8, while the voltage rises.
func (s scene) cut() (*Edge, error) {
	r := s.build()
	fall := s.get("switch.fall_time") / straightRule / math.Max(s.steep, 1)
	r.Current("channel", r.chip, 0, circuit.Waveform{{T: 0, V: s.amps}, {T: fall, V: 0}})
	run, probe, err := s.start(r)
	if err != nil {
		return nil, err
	}
	err = s.follow(run, probe, 0, s.span())
	return s.read(run, probe, shapeCut), err
}

// gateLimited solves the edge a gate driver makes: the channel holds the chip to a ramp of rise_slope as long as it
// has current left to do so; from the moment the chip reaches the bus, what the channel then carries falls on a
// raised cosine whose steepness is that of the whole current falling in fall_time/0.59. A network
// that takes the current over at once cannot take it faster than the channel lets go: from the start the channel
// carries at least what that same fall leaves of max(0, I − C·slope), C the output capacitance.
func (s scene) gateLimited() (*Edge, error) {
	r := s.build()
	slope, end := s.get("switch.rise_slope"), s.span()
	r.Voltage("ramp", r.Node("ramp"), 0, circuit.Waveform{{T: 0, V: 0}, {T: 2 * s.bus / slope, V: 2 * s.bus}})
	r.Diode("hold", r.chip, r.Node("ramp"), 0, channelSlope)
	r.Current("channel", r.chip, 0, s.lettingGo(slope))
	run, probe, err := s.start(r)
	if err != nil {
		return nil, err
	}
	next, reached, err := s.climbTo(run, probe, 0, s.bus, end)
	if err == nil && reached {
		t, amps := run.Time(), math.Max(run.BranchCurrent("hold"), 0)+run.BranchCurrent("channel")
		if next < len(s.steps())-1 { // from here on the channel carries what the part now gone drew
			if drew := s.deplete(run, next); amps > 0 {
				amps += drew
			}
			next++
		}
		run.Retarget("ramp", circuit.Waveform{{T: t, V: s.beyond()}})
		if amps > leastShare*s.amps {
			run.Retarget("channel", s.cosine(t, amps))
		} else {
			run.Retarget("channel", circuit.Constant(0))
		}
		err = s.follow(run, probe, next, t+end)
	}
	return s.read(run, probe, shapeGate), err
}

// lettingGo is the least the channel carries on the way up to the bus; without a network the ramp alone decides.
func (s scene) lettingGo(slope float64) circuit.Waveform {
	amps := s.amps - s.steps()[0].farad*slope
	if s.net == "" || amps <= leastShare*s.amps {
		return circuit.Constant(0)
	}
	return s.cosine(0, amps)
}

func (s scene) start(r rig) (*circuit.Run, int, error) {
	options := []circuit.Option{circuit.WithLimit(mostSteps)}
	if s.fast {
		options = append(options, circuit.WithoutEnergy(), circuit.WithoutTrace())
	}
	run, err := r.Start(options...)
	if err != nil {
		return nil, 0, fmt.Errorf("the edge circuit cannot be solved: %w", err)
	}
	return run, run.Probe(r.chip, 0), nil
}

// cosine is the channel's fall from amps at time t, with a stated tail laid on if there is one.
func (s scene) cosine(t, amps float64) circuit.Waveform {
	whole := s.get("switch.fall_time") / cosineRule
	fast := s.fall.fraction
	if fast == 0 {
		fast = 1
		if s.kind == "igbt" {
			whole /= igbtSteeper
		}
	}
	length := whole * amps / s.amps
	var w circuit.Waveform
	for k := 0; k <= cosineSteps; k++ {
		x := float64(k) / cosineSteps
		w = append(w, circuit.Point{T: t + x*length, V: amps * (1 - fast*(1-math.Cos(math.Pi*x))/2)})
	}
	return append(w, s.tail(t+length, amps*(1-fast))...)
}

// tail falls from amps with its time constant, to nothing after four of them.
func (s scene) tail(t, amps float64) circuit.Waveform {
	if amps <= 0 {
		return nil
	}
	var w circuit.Waveform
	for k := 1; k <= cosineSteps; k++ {
		x := tailSpan * float64(k) / cosineSteps
		w = append(w, circuit.Point{T: t + x*s.fall.tail, V: amps * math.Exp(-x)})
	}
	w[len(w)-1].V = 0
	return w
}
