package stress

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"drivemend/diagnose/circuit"
	"drivemend/measure/quantity"
)

// carriedBoard is a chopper on a stiff bus, opening once, laid out directly in the solver.
type carriedBoard struct {
	network                    string
	gate                       bool // gate-limited, else cut
	bus, amps                  float64
	loop, pack, lead           float64
	farad, fall, slope         float64
	resistance, capacitance    float64
	recovery, time, diodeSlope float64 // forward recovery as a resistance, and its time
}

// circuit gives the elements, everything but the channel.
func (b carriedBoard) circuit() *circuit.Circuit {
	c := circuit.New()
	rail, load, term, chip := c.Node("rail"), c.Node("load"), c.Node("terminal"), c.Node("chip")
	c.Voltage("bus", rail, 0, circuit.Constant(b.bus))
	c.Current("load", rail, load, circuit.Constant(b.amps))
	b.diode(c, "freewheel", load, rail)
	c.Resistor("loop-resistance", load, c.Node("loop"), 20e-3)
	c.Inductor("loop", c.Node("loop"), term, b.loop, b.amps)
	c.Inductor("package", term, chip, b.pack, b.amps)
	c.Capacitor("output", chip, 0, b.farad, 0)
	c.Diode("reverse", 0, chip, 0.9, 5e-3)
	if b.network != "none" {
		c.Inductor("lead", term, c.Node("lead"), b.lead, 0)
		b.snubber(c, c.Node("lead"))
	}
	return c
}

func (b carriedBoard) snubber(c *circuit.Circuit, at int) {
	end := at
	if b.network != "capacitor" {
		end = c.Node("snubber")
	}
	switch b.network {
	case "rcd":
		b.diode(c, "snubber-diode", at, end)
		c.Resistor("snubber-resistor", at, end, b.resistance)
	case "rc":
		c.Resistor("snubber-resistor", at, end, b.resistance)
	}
	c.Capacitor("snubber", end, 0, b.capacitance, 0)
}

func (b carriedBoard) diode(c *circuit.Circuit, name string, from, to int) {
	mid := c.Node(name + "-recovery")
	c.Diode(name, from, mid, 0.9, b.diodeSlope)
	c.Resistor(name+"-recovery", mid, to, b.recovery)
	c.Inductor(name+"-recovery-time", mid, to, b.recovery*b.time/3, 0)
}

// overshoot is the highest chip voltage less the bus.
func (b carriedBoard) overshoot(t testing.TB) float64 {
	t.Helper()
	c := b.circuit()
	chip := c.Node("chip")
	farad := b.farad + b.capacitance
	end := 2*math.Pi*math.Sqrt((b.loop+b.pack+b.lead)*farad) + 2*farad*b.bus/b.amps + b.bus/b.slope + 3*b.fall
	b.channel(c, chip)
	run, err := c.Start(circuit.WithoutEnergy(), circuit.WithoutTrace())
	if err != nil {
		t.Fatal(err)
	}
	probe := run.Probe(chip, 0)
	if b.gate {
		b.letGo(t, run, probe, end)
	}
	if _, err := run.To(2*end, -1, 0); err != nil {
		t.Fatal(err)
	}
	peak, _ := run.Peak(probe)
	return peak - b.bus
}

// channel is the straight fall of a cut, or the ramp that a gate driver holds the chip to.
func (b carriedBoard) channel(c *circuit.Circuit, chip int) {
	if !b.gate {
		c.Current("channel", chip, 0, circuit.Waveform{{T: 0, V: b.amps}, {T: b.fall / 0.8, V: 0}})
		return
	}
	c.Voltage("ramp", c.Node("ramp"), 0, circuit.Waveform{{T: 0, V: 0}, {T: 2 * b.bus / b.slope, V: 2 * b.bus}})
	c.Diode("hold", chip, c.Node("ramp"), 0, 1e-3)
	least, w := b.amps-b.farad*b.slope, circuit.Constant(0)
	if b.network != "none" && least > 0 {
		w = b.cosine(0, least)
	}
	c.Current("channel", chip, 0, w)
}

// letGo lets the channel's current fall from the moment the chip reaches the bus.
func (b carriedBoard) letGo(t testing.TB, run *circuit.Run, probe int, end float64) {
	t.Helper()
	reached, err := run.To(end, probe, b.bus)
	if err != nil {
		t.Fatal(err)
	}
	if !reached {
		return
	}
	amps := math.Max(run.BranchCurrent("hold"), 0) + run.BranchCurrent("channel")
	run.Retarget("ramp", circuit.Constant(1e6))
	run.Retarget("channel", circuit.Constant(0))
	if amps > 1e-6*b.amps {
		run.Retarget("channel", b.cosine(run.Time(), amps))
	}
}

// cosine is a raised cosine from amps at time t, as steep as one of the whole current within fall/0.59.
func (b carriedBoard) cosine(t, amps float64) circuit.Waveform {
	length := b.fall / 0.59 * amps / b.amps
	var w circuit.Waveform
	for k := 0; k <= 48; k++ {
		x := float64(k) / 48
		w = append(w, circuit.Point{T: t + x*length, V: amps * (1 + math.Cos(math.Pi*x)) / 2})
	}
	return w
}

// pairOf draws a board at its full bus and current, and the same board at a lower bus and current.
func pairOf(n uint64, network string, gate bool) (low, full carriedBoard) {
	random := rand.New(rand.NewPCG(n, 11))
	between := func(a, b float64) float64 { return a * math.Pow(b/a, random.Float64()) }
	b := carriedBoard{network: network, gate: gate, bus: between(24, 800), amps: between(5, 300), loop: between(20e-9, 200e-9),
		pack: between(3e-9, 25e-9), lead: between(3e-9, 50e-9), fall: between(20e-9, 300e-9), slope: between(2e9, 5e10),
		time: between(20e-9, 200e-9), diodeSlope: 5e-3}
	b.farad = between(7e-12, 60e-12) * b.amps
	z := math.Sqrt(b.loop / b.farad)
	b.recovery = between(0.01, 0.1) * b.bus / b.amps
	switch network {
	case "rc":
		b.capacitance, b.resistance = between(1, 15)*b.farad, between(0.3, 3)*z
	case "rcd":
		b.capacitance, b.resistance = between(0.3, 15)*b.amps*b.fall/0.8/2/b.bus, between(5, 50)*b.bus/b.amps
	case "capacitor":
		b.capacitance = between(1, 15) * b.farad
	}
	low, full = b, b
	q, r := between(1, 10), between(1, 10)
	low.bus, low.amps = math.Max(b.bus/q, 12), b.amps/r
	low.fall = b.fall * math.Pow(r, -0.5*random.Float64())
	low.farad = b.farad * math.Pow(b.bus/low.bus, 0.5*random.Float64())
	return low, full
}

// At on random boards that the exploration behind it has not seen: bus 24 to 800 V, 5 to 300 A, bus and current raised by one to
// ten times, the fall time growing with up to the root of the current, the output capacitance falling with up to the root of
// the bus; cut and gate-limited.
func TestCarriedBoards(t *testing.T) {
	const boards = 160
	for _, network := range []string{"none", "capacitor", "rc", "rcd"} {
		above, below, beyond, centre := 0, 0, 0, []float64{}
		for n := range uint64(2 * boards) {
			low, full := pairOf(n+10_000, network, n%2 == 0)
			peak := low.bus + low.overshoot(t)
			m := Measured{Network: network, Bus: of(low.bus, "V"), Current: of(low.amps, "A"), Peak: of(peak, "V")}
			c, err := m.At(full.bus, full.amps)
			if err != nil {
				t.Fatal(err)
			}
			got := full.overshoot(t)
			centre = append(centre, got/(c.Mid-full.bus))
			if got > c.High-full.bus {
				above++
			}
			if got < c.Low-full.bus {
				below++
			}
			if full.bus+got > c.Bound {
				beyond++
				t.Errorf("%+v: peak %g V, bound %g V", full, full.bus+got, c.Bound)
			}
		}
		slices.Sort(centre)
		median := centre[boards]
		t.Logf("%s: above %d, below %d, beyond %d of %d; over mid: median %.2f, 5 %% %.2f, 95 %% %.2f",
			network, above, below, beyond, 2*boards, median, centre[boards/10], centre[2*boards-boards/10])
		if allowed := boards / 20; above > allowed || below > allowed {
			t.Errorf("%s: %d above High, %d below Low of %d; allowed %d each", network, above, below, 2*boards, allowed)
		}
		if network == "none" && above > 0 {
			t.Errorf("a bare edge passed High %d times", above)
		}
		if median < 0.7 || median > 1.2 {
			t.Errorf("%s: the median lies at %.2f of Mid", network, median)
		}
	}
}

// At the bus and current of the measurement itself nothing is carried; more of either never lowers High or Bound.
func TestCarriedIsSteady(t *testing.T) {
	for network := range reaches {
		m := Measured{Network: network, Bus: of(60, "V"), Current: of(10, "A"), Peak: of(75, "V")}
		same, err := m.At(60, 10)
		if err != nil {
			t.Fatal(err)
		}
		if same.Low != 75 || same.Mid != 75 || same.High != 75 || same.Bound < 75 {
			t.Errorf("%q: carried to itself %+v", network, same)
		}
		last := same
		for k := 1.0; k < 40; k++ {
			next, err := m.At(60+9*k, 10+2*k)
			if err != nil {
				t.Fatal(err)
			}
			ordered := next.Low <= next.Mid && next.Mid <= next.High && next.High <= next.Bound
			if !ordered || next.High < last.High || next.Bound < last.Bound {
				t.Errorf("%q: %+v after %+v", network, next, last)
			}
			last = next
		}
		wide := m
		wide.Peak = uncertain(wide.Peak, 0.02)
		less, err := wide.At(300, 60)
		more, _ := m.At(300, 60)
		if err != nil || less.Low >= more.Low || less.High <= more.High || less.Mid != more.Mid {
			t.Errorf("%q: an uncertain peak gives %+v, a certain one %+v (%v)", network, less, more, err)
		}
	}
}

// The two laws of a bare edge, as they are named at At: proportional where the channel sets the slope, and the cut formula.
func TestCarriedHoldsBothLaws(t *testing.T) {
	const volts, amps, henry, fall = 60.0, 10.0, 100e-9, 50e-9
	cut := func(volts, amps float64) float64 {
		a := 0.8 * henry * amps / fall
		return volts + a + math.Sqrt(a*a+2*a*volts)
	}
	m := Measured{Network: "none", Bus: of(volts, "V"), Current: of(amps, "A"), Peak: of(cut(volts, amps), "V")}
	for _, to := range [][2]float64{{60, 80}, {400, 10}, {400, 80}, {120, 15}} {
		c, err := m.At(to[0], to[1])
		if err != nil {
			t.Fatal(err)
		}
		if peak := cut(to[0], to[1]); peak > c.High || peak < c.Mid*(1-1e-12) {
			t.Errorf("%v: cut peak %g V outside %+v", to, peak, c)
		}
		if straight := to[0] + (cut(volts, amps)-volts)*to[1]/amps; straight > c.High*(1+1e-12) {
			t.Errorf("%v: slope law %g V above %+v", to, straight, c)
		}
	}
}

// How rough the two ways by the fall time are, as Loops says: on random bare boards.
func TestLoopFromFallIsRough(t *testing.T) {
	const boards = 150
	for _, gate := range []bool{false, true} {
		low, near := 0, 0
		for n := range uint64(boards) {
			_, b := pairOf(n+20_000, "none", gate)
			m := Measured{AtChip: true, Bus: of(b.bus, "V"), Current: of(b.amps, "A"), FallTime: of(b.fall, "s"),
				Peak: of(b.bus+b.overshoot(t), "V")}
			if loopBy(t, LoopFromFall, m) < b.loop+b.pack {
				low++
			}
			if share := loopBy(t, LoopFromCut, m) / (b.loop + b.pack); share > 0.55 && share < 1.15 {
				near++
			}
		}
		t.Logf("gate-limited %v: LoopFromFall below the loop %d times, LoopFromCut near it %d times of %d", gate, low, near, boards)
		if low > boards/20 {
			t.Errorf("gate-limited %v: LoopFromFall is no upper end, %d of %d", gate, low, boards)
		}
		if !gate && near < boards*17/20 {
			t.Errorf("LoopFromCut near the loop only %d times of %d", near, boards)
		}
	}
}

// First order against the derivatives written out, and the ends against values drawn inside the intervals.
func TestLoopUncertainty(t *testing.T) {
	const u0, u1, ua = 0.004, 0.006, 0.02
	m := Measured{Ring: uncertain(of(20e6, "Hz"), u0), RingAdded: uncertain(of(12e6, "Hz"), u1), Added: uncertain(of(2e-9, "F"), ua),
		Bus: uncertain(of(300, "V"), 0.01), Peak: uncertain(of(420, "V"), 0.02), Slope: uncertain(of(1e9, "A/s"), 0.1),
		Current: uncertain(of(50, "A"), 0.03), FallTime: uncertain(of(60e-9, "s"), 0.1)}
	k := math.Pow(20.0/12, 2) - 1
	sigma := map[string]float64{
		LoopFromAdded: math.Hypot(2/k*math.Hypot((k+1)*u1, u0), ua),
		LoopFromSlope: math.Hypot(math.Hypot(3, 8.4)/120, 0.1),
		LoopFromFall:  math.Hypot(math.Hypot(3, 8.4)/120, math.Hypot(0.1, 0.03)),
	}
	all, err := m.Loops()
	if err != nil || len(all) != 4 {
		t.Fatal(all, err)
	}
	random := rand.New(rand.NewPCG(3, 3))
	inside := func(q quantity.Quantity) quantity.Quantity {
		return of(q.Low+(q.High-q.Low)*random.Float64(), q.Unit)
	}
	for _, e := range all {
		if want, ok := sigma[e.Method]; ok {
			within(t, e.Method, e.Sigma/e.Henry, want, 0.015)
		}
		least, most := math.Inf(1), 0.0
		for range 400 {
			one := Measured{Ring: inside(m.Ring), RingAdded: inside(m.RingAdded), Added: inside(m.Added),
				Bus: inside(m.Bus), Peak: inside(m.Peak), Slope: inside(m.Slope), Current: inside(m.Current), FallTime: inside(m.FallTime)}
			x := loopBy(t, e.Method, one)
			least, most = math.Min(least, x), math.Max(most, x)
		}
		if least < e.Low || most > e.High || most-least < 0.5*(e.High-e.Low) {
			t.Errorf("%s: drawn %g to %g H, ends %g to %g H", e.Method, least, most, e.Low, e.High)
		}
	}
}

func TestMeasuredRefuses(t *testing.T) {
	good := Measured{Bus: of(300, "V"), Peak: of(400, "V"), Slope: of(1e9, "A/s"), Current: of(10, "A")}
	for name, change := range map[string]func(*Measured){
		"nothing measured":   func(m *Measured) { *m = Measured{} },
		"peak below bus":     func(m *Measured) { m.Peak = of(290, "V") },
		"within the error":   func(m *Measured) { m.Peak = uncertain(of(310, "V"), 0.05) },
		"wrong unit":         func(m *Measured) { m.Bus = of(300, "A") },
		"no number":          func(m *Measured) { m.Slope = of(math.NaN(), "A/s") },
		"endless":            func(m *Measured) { m.Slope = of(math.Inf(1), "A/s") },
		"below zero":         func(m *Measured) { m.Slope = of(-1, "A/s") },
		"damping of one":     func(m *Measured) { m.Damping = 1 },
		"damping no number":  func(m *Measured) { m.Damping = math.NaN() },
		"ring gets no lower": func(m *Measured) { m.Ring, m.RingAdded, m.Added = of(1e7, "Hz"), of(1e7, "Hz"), of(1e-9, "F") },
		"too far apart":      func(m *Measured) { m.Peak, m.Slope = of(1e300, "V"), of(1e-300, "A/s") },
	} {
		m := good
		change(&m)
		all, err := m.Loops()
		if err == nil || strings.Contains(err.Error(), "%!") {
			t.Errorf("%s: %+v, %v", name, all, err)
		}
	}
	for name, change := range map[string]func(*Measured){
		"no peak": func(m *Measured) { m.Peak = quantity.Quantity{} }, "no overshoot": func(m *Measured) { m.Peak = of(300, "V") },
		"network": func(m *Measured) { m.Network = "clamp" }, "bus": func(m *Measured) { m.Bus = of(0, "V") },
	} {
		m := good
		change(&m)
		if c, err := m.At(600, 20); err == nil {
			t.Errorf("%s: %+v", name, c)
		}
	}
	for _, to := range [][2]float64{{0, 1}, {1, -1}, {math.NaN(), 1}, {1, math.Inf(1)}, {1e308, 1e308}} {
		if c, err := good.At(to[0], to[1]); err == nil {
			t.Errorf("to %v: %+v", to, c)
		}
	}
	if _, err := good.RingOf(); err == nil {
		t.Error("no ring, and yet one found")
	}
}
