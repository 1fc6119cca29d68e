package stress

import "math"

// consequences fills what follows from the edges: avalanche, clamp, pump-up, and the part that opens last.
func (p *problem) consequences(f *Figures) error {
	opening, err := p.placed(opens, p.highest())
	if err != nil {
		return err
	}
	f.LastPart = p.lastPart(opening)
	if f.Avalanche, err = p.avalanche(); err != nil {
		return err
	}
	if f.Clamp, err = p.clamped(); err != nil {
		return err
	}
	f.PumpUp, err = p.pumpedUp()
	return err
}

// avalanche is what a MOSFET takes up at the highest bus and worst current, at the edge that goes highest; nil when the
// chip stays below its rating, or is not one that avalanches.
func (p *problem) avalanche() (*Avalanched, error) {
	if p.base.kind != "mosfet" && p.base.kind != "sic-mosfet" {
		return nil, nil
	}
	worst, free, err := p.highestOf(p.highest().quick())
	if err != nil || free.Peak <= p.rated {
		return nil, err
	}
	s := p.highest()
	s.stand = p.rated
	held, err := worst.in(s)
	if err != nil {
		return nil, err
	}
	a := &Avalanched{Prospective: free.Peak, Volt: p.rated, Energy: held.energy("avalanche"), Current: held.struck}
	if a.Current > 0 {
		a.Time = 2 * a.Energy / (a.Volt * a.Current)
	}
	_, nominal, err := p.highestOf(p.nominal().quick())
	a.EveryCycle = err == nil && nominal.Peak > p.rated
	p.holdAgainst(a)
	return a, err
}

// highestOf gives the graded edge that goes highest in a scene.
func (p *problem) highestOf(s scene) (graded, *Edge, error) {
	var which graded
	var top *Edge
	for _, g := range p.edges {
		e, err := g.in(s)
		if err != nil {
			return g, nil, err
		}
		if top == nil || e.Peak > top.Peak {
			which, top = g, e
		}
	}
	return which, top, nil
}

// holdAgainst holds an avalanche against what the case states of the switch.
func (p *problem) holdAgainst(a *Avalanched) {
	g := gatherer{p.own, p.in}
	pulse := Pulse{Breakdown: a.Volt, Amps: a.Current, Time: a.Time, Joule: a.Energy}
	ruling := pulse.Against(AvalancheRating{g.value("switch.avalanche.energy"), g.value("switch.avalanche.current")}, 0)
	a.Rated, a.OverEnergy, a.OverCurrent = !ruling.Uncredited, ruling.OverEnergy, ruling.OverCurrent
	if ladder := thermalLadder(p.own); len(ladder) > 0 && a.Time > 0 {
		if kelvin, _, err := pulse.Rise(ladder); err == nil {
			a.Rise = kelvin
		}
	}
}

// clamped is the balance of a clamp at the PWM frequency and worst current.
func (p *problem) clamped() (*Clamped, error) {
	if p.base.net != "clamp" {
		return nil, nil
	}
	s, err := p.highest().settled()
	if err != nil {
		return nil, err
	}
	e, err := s.gateLimited()
	if err != nil {
		return nil, err
	}
	over := s.held
	if s.back {
		over -= s.bus
	}
	c := &Clamped{Volt: s.held, Stated: s.get("snubber.clamp_voltage") > 0, Charge: e.charge, Ripple: e.charge / s.get("snubber.capacitance")}
	c.Watts = s.frequency * e.charge * over
	return c, nil
}

// pumpedUp is where a reservoir goes whose tie is broken, at the running current. What one edge brings is solved; from
// there the voltage over the bus climbs with the root of the number of edges, until the switch breaks down or a bleeder
// takes away as much. Nothing climbs to a rating that the bus alone is over.
func (p *problem) pumpedUp() (*PumpedUp, error) {
	if p.base.net != "recovery" || !p.base.open {
		return nil, nil
	}
	s := p.nominal()
	e, err := s.gateLimited()
	if err != nil || e.gained <= 0 || s.bus >= p.rated {
		return nil, err
	}
	farad := s.get("snubber.reservoir")
	r := Reservoir{Bus: s.bus, Farad: farad, Henry: farad * e.gained * e.gained / (s.amps * s.amps), Amps: s.amps, Hertz: s.frequency,
		Bleeder: s.get("snubber.resistance"), Return: ClampToRail}
	if s.back {
		r.Return = ClampToBus
	}
	out := &PumpedUp{FirstEdge: e.gained}
	if s.frequency <= 0 { // no time, and no bleeder's balance
		out.End, out.EndsBy = p.rated, StopBreakdown
		out.Edges = math.Ceil(math.Pow((p.rated-s.bus)/e.gained, 2))
		return out, nil
	}
	end, err := r.End(p.rated)
	if err != nil {
		return nil, err
	}
	out.End, out.EndsBy, out.Edges, out.Time = end.Volts, end.By, end.Edges, end.Seconds
	return out, nil
}

// duty is what the network goes through each cycle.
func (p *problem) duty(edges []*Edge) *Duty {
	if p.base.net == "" {
		return nil
	}
	d := &Duty{}
	hertz := gatherer{p.own, p.in}.value("pwm.frequency")
	square := 0.0
	for _, e := range edges {
		square += e.Network.Square
		d.CapacitorPeak = math.Max(d.CapacitorPeak, e.Network.Peak)
		d.Slope = math.Max(d.Slope, e.Network.Slope)
		d.ResistorWatts += hertz * e.energy("snubber-resistor")
		d.Discharge = math.Max(d.Discharge, e.Discharge)
	}
	d.CapacitorRMS = math.Sqrt(hertz * square)
	if p.base.net == "rc" || p.base.net == "rcd" {
		s := p.nominal()
		d.Emptied = 1 - s.left()/s.bus
	}
	return d
}

func (e *Edge) energy(element string) float64 {
	for _, x := range e.Energies {
		if x.Element == element {
			return x.Joule
		}
	}
	return 0
}

// lastPart is the part of a bank that opens last: while the others are off it takes over, within the fall time, what
// they carried, and with it that share of the edge's loss.
func (p *problem) lastPart(e *Edge) *LastPart {
	delay := gatherer{p.own, p.in}.value("switch.spread.delay")
	n := float64(p.in.bank)
	if delay <= 0 || n < 2 {
		return nil
	}
	taken := math.Min(1, delay/(p.in.mid("switch.fall_time")/straightRule))
	share := 1/n + (1-1/n)*taken
	return &LastPart{Current: e.Current * share, Energy: e.energy("switch") * share, Share: share}
}
