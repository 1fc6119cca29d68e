package circuit

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"
)

// picker draws the numbers of a random circuit, from rapid or from fuzz bytes.
type picker interface {
	upTo(n int) int                   // 0 .. n-1
	decade(low, high float64) float64 // logarithmic
	linear(low, high float64) float64
}

type rapidPicker struct{ t *rapid.T }

func (p rapidPicker) upTo(n int) int { return rapid.IntRange(0, n-1).Draw(p.t, "choice") }
func (p rapidPicker) decade(low, high float64) float64 {
	return math.Exp(rapid.Float64Range(math.Log(low), math.Log(high)).Draw(p.t, "decade"))
}
func (p rapidPicker) linear(low, high float64) float64 {
	return rapid.Float64Range(low, high).Draw(p.t, "value")
}

// randomCircuit is a connected circuit of the size and the values met in power stages. Every diode has resistance and
// every node a capacitor or resistor to node 0, so that it must be solvable.
func randomCircuit(p picker) *Circuit {
	c := New()
	count := 2 + p.upTo(5)
	for n := 1; n <= count; n++ {
		node := c.Node(fmt.Sprint("n", n))
		c.Capacitor(fmt.Sprint("Cg", n), node, 0, p.decade(10e-12, 100e-9), 0)
		to := p.upTo(node)
		if p.upTo(2) == 0 {
			c.Inductor(fmt.Sprint("Lt", n), to, node, p.decade(5e-9, 5e-6), 0)
		} else {
			c.Resistor(fmt.Sprint("Rt", n), to, node, p.decade(0.01, 1000))
		}
	}
	c.Voltage("V", c.Node("in"), 0, randomWave(p, 400))
	c.Resistor("Rin", c.Node("in"), 1, p.decade(0.01, 10))
	from := p.upTo(count + 1)
	c.Current("I", from, (from+1+p.upTo(count))%(count+1), randomWave(p, 30))
	for k := range 1 + p.upTo(6) {
		a := p.upTo(count + 1)
		b := (a + 1 + p.upTo(count)) % (count + 1)
		switch p.upTo(4) {
		case 0:
			c.Inductor(fmt.Sprint("L", k), a, b, p.decade(5e-9, 5e-6), 0)
		case 1:
			c.Resistor(fmt.Sprint("R", k), a, b, p.decade(0.1, 1000))
		default:
			c.Diode(fmt.Sprint("D", k), a, b, p.linear(0, 20), p.decade(0.005, 1))
		}
	}
	return c
}

func randomWave(p picker, size float64) Waveform {
	var w Waveform
	at := 0.0
	for range 1 + p.upTo(4) {
		w = append(w, Point{at, p.linear(-size, size)})
		at += p.decade(1e-9, 500e-9)
	}
	return w
}

// The energies of all elements add up to nothing, what a capacitor or inductor took is what it holds, no resistor or
// diode gives energy away, and every diode obeys its law at the end.
func TestEnergyBalance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := randomCircuit(rapidPicker{t})
		r, err := c.Start()
		if err != nil {
			t.Fatal(err)
		}
		if _, err := r.To(1e-6, -1, 0); err != nil {
			t.Fatal(err)
		}
		checkBalance(t, r)
		checkDiodes(t, r)
	})
}

func checkBalance(t *rapid.T, r *Run) {
	sum, scale := 0.0, 1e-15
	for _, b := range r.c.branches {
		e := r.Energy(b.name)
		sum += e
		scale = math.Max(scale, math.Abs(e))
	}
	if math.Abs(sum) > 1e-9*scale {
		t.Fatalf("energies add up to %g of %g J", sum, scale)
	}
	for _, b := range r.c.branches {
		e := r.Energy(b.name)
		switch b.kind {
		case capacitor, inductor:
			if stored := r.Stored(b.name) - 0.5*b.value*b.start*b.start; math.Abs(e-stored) > 1e-9*scale {
				t.Fatalf("%s took %g J and holds %g J (largest energy %g J)", b.name, e, stored, scale)
			}
		case resistor, diode:
			if e < -1e-9*scale {
				t.Fatalf("%s gave %g J away", b.name, -e)
			}
		}
	}
}

func checkDiodes(t *rapid.T, r *Run) {
	for _, b := range r.c.branches {
		if b.kind != diode {
			continue
		}
		v, i := r.BranchVoltage(b.name), r.BranchCurrent(b.name)
		want := math.Max(0, (v-b.volt)/b.value)
		if math.Abs(i-want) > 1e-7*(r.amps+r.volts/b.value)+1e-12 {
			t.Fatalf("%s: %g V and %g A, its law gives %g A", b.name, v, i, want)
		}
	}
}

// Volt and ampere scale together, and a circuit with all L and C doubled is twice as slow.
func TestScaling(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := randomCircuit(rapidPicker{t})
		k := rapid.Float64Range(0.1, 10).Draw(t, "factor")
		louder, slower := c.snapshot(), c.snapshot()
		for n := range c.branches {
			loud, slow := &louder.branches[n], &slower.branches[n]
			loud.volt *= k
			loud.wave, slow.wave = nil, nil
			for _, p := range c.branches[n].wave {
				loud.wave = append(loud.wave, Point{p.T, k * p.V})
				slow.wave = append(slow.wave, Point{k * p.T, p.V})
			}
			if loud.kind == capacitor || loud.kind == inductor {
				slow.value *= k
			}
		}
		v, vLoud, vSlow := endVoltage(t, c, 5e-7), endVoltage(t, louder, 5e-7), endVoltage(t, slower, k*5e-7)
		if math.Abs(vLoud-k*v) > 1e-6*(k*math.Abs(v)+1e-3) || math.Abs(vSlow-v) > 1e-6*(math.Abs(v)+1e-3) {
			t.Fatalf("end voltage %g V, times %g: %g V, slowed: %g V", v, k, vLoud, vSlow)
		}
	})
}

func endVoltage(t *rapid.T, c *Circuit, end float64) float64 {
	r, err := c.Start(WithoutEnergy(), WithoutTrace())
	if err != nil {
		t.Fatal(err)
	}
	if _, err := r.To(end, -1, 0); err != nil {
		t.Fatal(err)
	}
	return r.Voltage(1, 0)
}

// The result must not hang on how often the solver looks: short steps move nothing but the samples.
func TestStepDoesNotMatter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := randomCircuit(rapidPicker{t})
		peaks, scale := [2]float64{}, 0.0
		for k, step := range []float64{math.Inf(1), 3e-10} {
			r, err := c.Start(WithStep(step), WithoutTrace(), WithoutEnergy())
			if err != nil {
				t.Fatal(err)
			}
			p := r.Probe(1, 0)
			if _, err := r.To(5e-7, -1, 0); err != nil {
				t.Fatal(err)
			}
			peaks[k], _ = r.Peak(p)
			scale = r.volts
		}
		if math.Abs(peaks[0]-peaks[1]) > 1e-5*(math.Abs(peaks[1])+scale)+1e-9 {
			t.Fatalf("peak %.9g V with the solver's own step, %.9g V with short steps", peaks[0], peaks[1])
		}
	})
}

// bytePicker draws from fuzz input; when it runs out it draws zeros.
type bytePicker struct{ data []byte }

func (p *bytePicker) byte() byte {
	if len(p.data) == 0 {
		return 0
	}
	b := p.data[0]
	p.data = p.data[1:]
	return b
}
func (p *bytePicker) upTo(n int) int { return int(p.byte()) % n }
func (p *bytePicker) decade(low, high float64) float64 {
	return low * math.Pow(high/low, float64(p.byte())/255)
}
func (p *bytePicker) linear(low, high float64) float64 {
	return low + (high-low)*float64(p.byte())/255
}

// anyCircuit has any element between any nodes with any value, wild ones included.
func anyCircuit(p *bytePicker) *Circuit {
	c := New()
	tied := p.upTo(4)
	for n := range 1 + p.upTo(5) {
		node := c.Node(fmt.Sprint("n", n))
		if tied > 0 {
			c.Resistor(fmt.Sprint("tie", n), node, 0, p.decade(0.1, 1e6))
		}
		if tied > 1 {
			c.Capacitor(fmt.Sprint("stray", n), node, 0, p.decade(1e-12, 1e-8), 0)
		}
	}
	for k := range 1 + p.upTo(12) {
		a := p.upTo(len(c.nodes))
		b := (a + 1 + p.upTo(len(c.nodes)-1)) % len(c.nodes)
		if p.upTo(60) == 0 {
			b = a
		}
		value, start := anyValue(p), p.linear(-2, 2)*float64(p.upTo(2))
		name := fmt.Sprint("E", k)
		switch p.upTo(7) {
		case 0:
			c.Resistor(name, a, b, value)
		case 1:
			c.Capacitor(name, a, b, value*1e-9, start)
		case 2:
			c.Inductor(name, a, b, value*1e-9, start)
		case 3:
			c.Voltage(name, a, b, randomWave(rapidless{p}, 100))
		case 4:
			c.Current(name, a, b, randomWave(rapidless{p}, 10))
		default:
			c.Diode(name, a, b, start, value*1e-3)
		}
	}
	return c
}

type rapidless struct{ *bytePicker }

func anyValue(p *bytePicker) float64 {
	switch p.upTo(60) {
	case 0, 1, 2, 3:
		return 0
	case 4, 5, 6, 7:
		return p.decade(1e-9, 1e12)
	case 8:
		return []float64{math.NaN(), math.Inf(1), -1, 1e300, 1e-300, 5e-324}[p.upTo(6)]
	}
	return p.decade(0.1, 100)
}

// solveAnything must end: in a finite result or in an error. It tells the error, if there was one.
func solveAnything(t *testing.T, data []byte) error {
	c := anyCircuit(&bytePicker{data})
	r, err := c.Start(WithLimit(3000))
	if err != nil {
		return err
	}
	p := r.Probe(len(c.nodes)-1, 0)
	for _, at := range []float64{1e-9, 1e-6} {
		if _, err := r.To(at, p, 50); err != nil {
			return err
		}
	}
	if v, _ := r.Peak(p); bad(v) {
		t.Errorf("peak %g after a run without error", v)
	}
	for _, b := range r.c.branches {
		if e, i := r.Energy(b.name), r.BranchCurrent(b.name); bad(e) || bad(i) {
			t.Errorf("%s: energy %g, current %g after a run without error", b.name, e, i)
		}
	}
	if _, err := r.Modes(); err != nil {
		return err
	}
	if _, err := c.Netlist("fuzz", 1e-6, 1e-9); err != nil {
		t.Errorf("no netlist: %v", err)
	}
	return nil
}

func FuzzAnything(f *testing.F) {
	f.Add([]byte("a circuit of letters"))
	f.Add([]byte{4, 9, 1, 0, 3, 80, 200, 1, 3, 2, 90, 0, 1, 2, 3, 120, 1, 5, 2, 0, 3, 4, 1, 1, 6})
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, data []byte) { _ = solveAnything(t, data) })
}

// A few thousand random circuits on every run, the same ones each time. A good part of them must be solvable, or the
// test would show nothing.
func TestAnythingEnds(t *testing.T) {
	count := 6000
	if testing.Short() {
		count = 600
	}
	solved := 0
	state := uint64(1)
	data := make([]byte, 160)
	for range count {
		for k := range data {
			state = state*6364136223846793005 + 1442695040888963407
			data[k] = byte(state >> 56)
		}
		if solveAnything(t, data) == nil {
			solved++
		}
	}
	t.Logf("%d of %d solved", solved, count)
	if solved < count/20 {
		t.Errorf("only %d of %d circuits could be solved", solved, count)
	}
}
