package stress

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// ngspice runs a deck and gives its measures. Without ngspice a test is skipped, on a build server it fails.
func ngspice(t *testing.T, file string) map[string]float64 {
	t.Helper()
	path, err := exec.LookPath("ngspice")
	if err != nil {
		if os.Getenv("CI") != "" {
			t.Fatal("ngspice is not installed; on a build server the cross-check must run")
		}
		t.Skip("ngspice is not installed (apt install ngspice)")
	}
	file, err = filepath.Abs(file)
	if err != nil {
		t.Fatal(err)
	}
	run := exec.Command(path, "-b", file)
	run.Dir = t.TempDir()
	out, err := run.CombinedOutput()
	if err != nil {
		t.Fatalf("ngspice on %s: %v\n%.2000s", file, err, out)
	}
	found := map[string]float64{}
	for _, m := range regexp.MustCompile(`(?m)^(\w+)\s*=\s*(\S+)`).FindAllSubmatch(out, -1) {
		if v, err := strconv.ParseFloat(string(m[2]), 64); err == nil {
			found[string(m[1])] = v
		}
	}
	if _, ok := found["peak"]; !ok {
		if _, ok := found["tbus"]; !ok {
			t.Fatalf("ngspice on %s gave no figure:\n%.3000s", file, out)
		}
	}
	return found
}

// sample is one board drawn for the comparison, in SI units. It is written down twice, once as a scene for the
// solver and once as a deck: the two share nothing but these numbers.
type sample struct {
	bus, amps, loop, ohm, pack, farad, fall, slope float64
	bank                                           int
	drop, recoveryV, recoveryT                     float64
	store, esr, supply                             float64
	kind, net                                      string
	lead, resistance, capacitance, onTime          float64
	diodeDrop, diodeV, diodeT                      float64
	at, rated                                      float64 // V, where farad was measured and what the switch stands
}

// drawSample draws parasitics and parts over the ranges that boards from 24 to 800 V have.
func drawSample(n uint64, net string) sample {
	r := rand.New(rand.NewPCG(n, 7))
	decade := func(low, high float64) float64 { return low * math.Pow(high/low, r.Float64()) }
	b := sample{net: net, kind: []string{"igbt", "mosfet"}[r.IntN(2)], bank: 1 + r.IntN(4)}
	b.bus, b.amps = decade(24, 800), decade(5, 150)
	b.loop, b.ohm, b.pack = decade(10e-9, 200e-9), decade(2e-3, 50e-3), decade(3e-9, 25e-9)
	b.farad, b.fall, b.slope = decade(100e-12, 2e-9), decade(20e-9, 300e-9), decade(2e9, 50e9)
	b.drop, b.recoveryV, b.recoveryT = decade(0.4, 2), decade(1, 40), decade(20e-9, 200e-9)
	b.store, b.esr, b.supply = decade(50e-6, 5e-3), decade(5e-3, 200e-3), decade(1e-6, 30e-6)
	b.lead, b.resistance, b.capacitance = decade(3e-9, 50e-9), decade(2, 60), decade(1e-9, 47e-9)
	b.onTime = decade(1, 10) * b.resistance * b.capacitance
	b.diodeDrop, b.diodeV, b.diodeT = decade(0.5, 2), decade(1, 40), decade(20e-9, 200e-9)
	return b
}

// scene gives the board to the solver.
func (b sample) scene() scene {
	s := scene{in: &inputs{at: map[string]int{}, bank: b.bank}, bus: b.bus, amps: b.amps, free: true, kind: b.kind, fast: true, at: b.at, rated: b.rated}
	if b.net != "none" {
		s.net = b.net
	}
	for _, v := range []struct {
		key   string
		value float64
	}{
		{"loop.inductance", b.loop}, {"loop.resistance", b.ohm}, {"switch.package_inductance", b.pack},
		{"switch.output_capacitance", b.farad}, {"switch.fall_time", b.fall}, {"switch.rise_slope", b.slope},
		{"freewheel.forward_voltage", b.drop}, {"freewheel.forward_recovery.voltage", b.recoveryV},
		{"freewheel.forward_recovery.time", b.recoveryT}, {"bus.capacitance", b.store}, {"bus.esr", b.esr},
		{"bus.supply_inductance", b.supply}, {"snubber.lead_inductance", b.lead}, {"snubber.resistance", b.resistance},
		{"snubber.capacitance", b.capacitance}, {"pwm.shortest_on_time", b.onTime},
		{"snubber.diode.forward_voltage", b.diodeDrop}, {"snubber.diode.forward_recovery.voltage", b.diodeV},
		{"snubber.diode.forward_recovery.time", b.diodeT},
	} {
		s = s.put(v.key, v.value)
	}
	return s
}

// deck is a netlist being written for one board.
type deck struct {
	b    sample
	end  float64
	text strings.Builder
}

func (d *deck) line(format string, args ...any) { fmt.Fprintf(&d.text, format+"\n", args...) }

// diode is a current over a knee, its corner rounded so that ngspice converges: by a tenth of a millivolt, by a
// whole one beside an output capacitance that falls.
func (d *deck) diode(name, anode, cathode string, drop, ohm float64) {
	round := 1e-8
	if d.b.at > 0 {
		round = 1e-6
	}
	u := fmt.Sprintf("(v(%s)-v(%s)-%.12g)", anode, cathode, drop)
	d.line("B%s %s %s I=%.12g*(%s+sqrt(%s*%s+%g))", name, anode, cathode, 0.5/ohm, u, u, u, round)
}

// recovering is a diode followed by R = V/I beside L = R·t/3.
func (d *deck) recovering(name, anode, cathode string, drop, volts, time float64) {
	ohm := volts / d.b.amps
	d.diode(name, anode, name+"x", drop, 0.005)
	d.line("R%s %sx %s %.12g", name, name, cathode, ohm)
	d.line("L%s %sx %s %.12g ic=0", name, name, cathode, ohm*time/3)
}

// power writes everything but the channel.
func (b sample) power(title string) *deck {
	d := &deck{b: b}
	all := b.farad*float64(b.bank) + b.capacitance
	d.end = b.bus/b.slope + 2*all*b.bus/b.amps + 2*b.fall + 10*math.Sqrt((b.loop+b.pack+b.lead)*all)
	d.line("* %s", title)
	d.line("Vsup sup 0 DC %.12g", b.bus)
	d.line("Lsup sup rail %.12g ic=%.12g", b.supply, b.amps)
	d.line("Resr rail bank %.12g", b.esr)
	d.line("Cbank bank 0 %.12g ic=%.12g", b.store, b.bus)
	d.line("Iload rail load DC %.12g", b.amps)
	d.recovering("fw", "load", "rail", b.drop, b.recoveryV, b.recoveryT)
	d.line("Cload load 0 1e-12 ic=0") // ngspice needs some capacitance where the freewheel diode takes over
	d.line("Rloop load loop %.12g", b.ohm)
	d.line("Lloop loop term %.12g ic=%.12g", b.loop, b.amps)
	d.line("Lpack term chip %.12g ic=%.12g", b.pack/float64(b.bank), b.amps)
	if b.at > 0 {
		d.line("Cout chip 0 Q='%.12g*(sqrt(max(v(chip),-0.7)+0.8)-sqrt(0.8))'", 2*b.farad*float64(b.bank)*math.Sqrt(b.at+0.8))
	} else {
		d.line("Cout chip 0 %.12g ic=0", b.farad*float64(b.bank))
	}
	d.diode("rev", "0", "chip", 0.9, 0.005)
	held := b.bus * math.Exp(-b.onTime/(b.resistance*b.capacitance))
	if b.net != "none" {
		d.line("Llead term s1 %.12g ic=0", b.lead)
	}
	switch b.net {
	case "capacitor":
		d.line("Csn s1 0 %.12g ic=0", b.capacitance)
	case "rc":
		d.line("Rsn s1 s2 %.12g", b.resistance)
		d.line("Csn s2 0 %.12g ic=%.12g", b.capacitance, held)
	case "rcd":
		d.recovering("sd", "s1", "s2", b.diodeDrop, b.diodeV, b.diodeT)
		d.line("Rsn s1 s2 %.12g", b.resistance)
		d.line("Csn s2 0 %.12g ic=%.12g", b.capacitance, held)
	}
	return d
}

func (d *deck) run(t *testing.T, measures ...string) map[string]float64 {
	t.Helper()
	ring := 2 * math.Pi * math.Sqrt(d.b.loop*d.b.farad)
	step := math.Min(d.end/2000, ring/50)
	d.line(".options reltol=1e-4 abstol=1e-9 vntol=1e-6 chgtol=1e-16 trtol=1 method=trap itl4=200")
	d.line(".tran %.6g %.6g 0 %.6g uic", step, d.end, step)
	for _, m := range measures {
		d.line(".meas tran %s", m)
	}
	d.line(".end")
	file := filepath.Join(t.TempDir(), "deck.cir")
	if err := os.WriteFile(file, []byte(d.text.String()), 0o600); err != nil {
		t.Fatal(err)
	}
	return ngspice(t, file)
}

// cutPeak is the peak of the cut edge by ngspice.
func (b sample) cutPeak(t *testing.T) float64 {
	d := b.power("cut edge")
	d.line("Ich chip 0 PWL(0 %.12g %.12g 0)", b.amps, b.fall/0.8)
	return d.run(t, "peak MAX v(chip)")["peak"]
}

// clamp writes the ramp that holds the chip, with a meter for what the channel carries.
func (d *deck) clamp(ramp string) {
	d.line("Vramp ramp 0 PWL(%s)", ramp)
	d.diode("hold", "chip", "meter", 0, 0.001)
	d.line("Vmeter meter ramp 0")
}

// leastCarried is what the channel cannot let go of at once when a network takes the current over.
func (b sample) leastCarried() float64 {
	if b.net == "none" {
		return 0
	}
	return math.Max(0, b.amps-b.farad*float64(b.bank)*b.slope)
}

// gatePeak is the peak of the gate-limited edge by ngspice: a first run finds when the chip is at the bus and what
// the channel then carries, a second one lets that fall on the raised cosine.
func (b sample) gatePeak(t *testing.T) (peak, held float64) {
	whole := b.fall / 0.59
	if b.kind == "igbt" {
		whole /= 1.6
	}
	least, early := b.leastCarried(), 1e-12
	if least > 0 {
		early = whole * least / b.amps
	}
	letGo := fmt.Sprintf("((time < %.12g) ? %.12g*(1+cos(3.14159265358979*time/%.12g)) : 0)", early, least/2, early)
	first := b.power("gate-limited edge, until the bus")
	first.line("Bch chip 0 I=%s", letGo)
	first.clamp(fmt.Sprintf("0 0 %.12g %.12g", 3*b.bus/b.slope, 3*b.bus))
	met := first.run(t, fmt.Sprintf("tbus WHEN v(chip)=%.12g RISE=1", b.bus), fmt.Sprintf("held FIND i(Vmeter) WHEN v(chip)=%.12g RISE=1", b.bus))
	at, amps := met["tbus"], math.Max(met["held"], 0)
	if at < early {
		amps += least / 2 * (1 + math.Cos(math.Pi*at/early))
	}
	second := b.power("gate-limited edge")
	second.end += at
	second.clamp(fmt.Sprintf("0 0 %.12g %.12g %.12g 1e5", at, at*b.slope, at+1e-8))
	length := math.Max(whole*amps/b.amps, 1e-12)
	second.line("Bch chip 0 I=(time < %.12g) ? %s : ((time < %.12g) ? %.12g*(1+cos(3.14159265358979*(time-%.12g)/%.12g)) : 0)",
		at, letGo, at+length, amps/2, at, length)
	return second.run(t, "peak MAX v(chip)")["peak"], amps
}

var networkKinds = []string{"none", "capacitor", "rc", "rcd"}

// Random boards of the four networks, cut and gate-limited, live: peaks within 1 % of ngspice.
// DRIVEMEND_CIRCUITS sets how many.
func TestLiveRandomEdges(t *testing.T) {
	count := 32
	if n, err := strconv.Atoi(os.Getenv("DRIVEMEND_CIRCUITS")); err == nil && n > 0 {
		count = n
	} else if testing.Short() {
		count = 8
	}
	worst, which, hard := 0.0, "", 0
	for n := range count {
		b := drawSample(uint64(n), networkKinds[n%4])
		name := fmt.Sprintf("%d %s %s", n, b.net, []string{shapeCut, shapeGate}[n/4%2])
		var got *Edge
		var err error
		var want, held float64
		if n/4%2 == 0 {
			got, err = b.scene().cut()
			want = b.cutPeak(t)
		} else {
			got, err = b.scene().gateLimited()
			want, held = b.gatePeak(t)
		}
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if held > 0.1*b.amps {
			hard++
		}
		d := relative(got.Peak, want)
		if d > 0.01 {
			t.Errorf("%s: peak %.3f V, ngspice %.3f V (bus %.0f V, channel %.3g of %.3g A at the bus)", name, got.Peak, want, b.bus, held, b.amps)
		}
		if d > worst {
			worst, which = d, name
		}
	}
	t.Logf("%d boards, %d of them with current left in the channel at the bus; largest difference %.3f %% (%s)", count, hard, 100*worst, which)
}

// An output capacitance that falls with the voltage: ngspice has the curve, the solver its steps. Boards without a
// network, cut and gate-limited, within 8 % of the peak (see depletion for where), half of them within 1.5 %.
func TestLiveFallingCapacitance(t *testing.T) {
	var off []float64
	for n := range 10 {
		b := drawSample(100+uint64(n), "none")
		b.at, b.rated = 25, 1.8*b.bus
		var got *Edge
		var err error
		want := 0.0
		if n%2 == 0 {
			got, err = b.scene().cut()
			want = b.cutPeak(t)
		} else {
			got, err = b.scene().gateLimited()
			want, _ = b.gatePeak(t)
		}
		if err != nil {
			t.Fatal(err)
		}
		d := relative(got.Peak, want)
		t.Logf("board %d, %s: bus %.0f V, peak %.1f V, ngspice %.1f V (%+.2f %%)", n, []string{shapeCut, shapeGate}[n%2], b.bus, got.Peak, want, 100*(got.Peak/want-1))
		if off = append(off, d); d > 0.08 {
			t.Errorf("board %d: peak %.3f V, ngspice %.3f V", n, got.Peak, want)
		}
	}
	slices.Sort(off)
	if middle := off[len(off)/2]; middle > 0.015 {
		t.Errorf("half of the boards differ by more than %.2f %%", 100*middle)
	}
}
