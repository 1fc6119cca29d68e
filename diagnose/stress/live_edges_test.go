package stress

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"
	"testing"
)

// spiced are the figures that ngspice gives of one edge.
type spiced struct {
	peak, ring float64
	swing      float64 // V, from the peak to the trough after it
	energies   map[string]float64
	held       float64 // A, what the channel carried when the chip was at the bus
	file       string
}

// victim is the voltage that is asked for.
func (b sample) victim() string {
	if b.edge == shapeRamp {
		return "v(far)-v(load)"
	}
	return "v(chip)"
}

// step is the longest that ngspice may take: a fortieth of the fastest ring of the chip, which a network's lead beside the
// loop makes faster. (The decks of whole bridges do not come through with so short a step; their rings agree without.)
func (b sample) step(window float64) float64 {
	farad := b.farad * float64(b.bank)
	for _, other := range []float64{b.farFarad * float64(b.farBank), b.junction} {
		if other > 0 {
			farad = math.Min(farad, other)
		}
	}
	henry := b.loop
	if b.net != "none" && b.net != "decoupling" && b.topology != "all-off" {
		henry = b.loop * b.lead / (b.loop + b.lead)
	}
	ring := 2 * math.Pi * math.Sqrt((henry+b.pack/float64(b.bank))*farad)
	if b.edge == shapeRamp { // with a fortieth ngspice itself was 4 % off on one board (with an eightieth 0.01 %)
		ring /= 2
	}
	return math.Min(window/1000, ring/40)
}

// spiceOptions are tried in turn until ngspice comes through: it gives up, or loses itself in vanishing steps, where a
// diode meets a current that is cut.
const spiceAlways = ".options abstol=1e-9 vntol=1e-6 trtol=1 itl4=200"

var spiceOptions = []string{"reltol=1e-5 chgtol=1e-16 method=trap", "reltol=1e-5 chgtol=1e-14 method=trap",
	"reltol=3e-5 chgtol=1e-15 method=trap", "reltol=3e-5 chgtol=1e-15 method=gear",
	"reltol=1e-4 chgtol=1e-16 method=trap", "reltol=1e-4 chgtol=1e-16 method=gear"}

// moment runs a deck until an expression rises through a level, and gives that time and the values asked for then.
func (d *deck) moment(dir, of string, level, window float64, also ...string) (at float64, values []float64, err error) {
	step := d.b.step(window)
	d.line("bmoment moment 0 v=%s", of)
	d.line("%%options")
	d.line(".control")
	d.line("stop when v(moment) > %.12g", level)
	d.line("tran %.6g %.6g 0 %.6g uic", step, window, step)
	d.line("let w = v(moment)")
	d.line("meas tran moment when w=%.12g rise=1", level)
	for k, what := range also {
		d.line("let w%d = %s", k, what)
		d.line("meas tran also%d find w%d when w=%.12g rise=1", k, k, level)
	}
	d.line("quit\n.endc\n.end")
	found, err := d.run(dir, "first")
	if err != nil {
		return 0, nil, err
	}
	at, ok := found["moment"]
	if !ok {
		return 0, nil, errNever
	}
	for k := range also {
		values = append(values, found[fmt.Sprint("also", k)])
	}
	return at, values, nil
}

var errNever = errors.New("the level is not reached within the time followed")

// figures runs a deck over the window and reads it.
func (d *deck) figures(dir string, window float64) (spiced, error) {
	step := d.b.step(window)
	d.line("%%options")
	d.line(".control")
	d.line("tran %.6g %.6g 0 %.6g uic", step, window, step)
	for k, h := range d.heats {
		d.line("let p%d = %s", k, h.power)
		d.line("meas tran e%d integ p%d from=0 to=%.12g", k, k, window)
	}
	d.line("let w = %s", d.b.victim())
	d.line("meas tran peak max w")
	d.line("set wr_singlescale\nwrdata curve w")
	d.line("quit\n.endc\n.end")
	found, err := d.run(dir, "deck")
	if err != nil {
		return spiced{}, err
	}
	out := spiced{peak: found["peak"], energies: map[string]float64{}, file: filepath.Join(dir, "deck.cir")}
	for k, h := range d.heats {
		out.energies[h.name] += found[fmt.Sprint("e", k)]
	}
	w, err := curve(filepath.Join(dir, "curve"))
	if err != nil {
		return spiced{}, err
	}
	out.swings(w)
	return out, nil
}

// run writes the deck into a folder and runs it there.
func (d *deck) run(dir, name string) (map[string]float64, error) {
	file := filepath.Join(dir, name+".cir")
	var failure error
	for _, options := range spiceOptions {
		if d.b.edge == shapeRamp && strings.Contains(options, "gear") {
			continue // it quietens the fast ring of a diode that blocks
		}
		text := strings.Replace(d.text.String(), "%options", spiceAlways+" "+options, 1)
		if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
			return nil, err
		}
		found, err := spiceFile(file, spiceLimit)
		if err == nil {
			return found, nil
		}
		failure = err
	}
	return nil, failure
}

// swings reads the ring off a curve: its highest point, the lowest one before the curve has come back by a fifth of the
// swing, the highest one before it has gone down by as much again; the turn is timed where the curve falls through the
// middle between that trough and that crest, after either top.
func (s *spiced) swings(w []Sample) {
	top := 0
	for k := range w {
		if w[k].V > w[top].V {
			top = k
		}
	}
	trough, k := top, top
	for ; k < len(w) && w[k].V-w[trough].V <= 0.2*(w[top].V-w[trough].V); k++ {
		if w[k].V < w[trough].V {
			trough = k
		}
	}
	if k == len(w) || trough == top {
		return
	}
	s.swing = w[top].V - w[trough].V
	crest := trough
	for ; k < len(w) && w[crest].V-w[k].V <= 0.2*s.swing; k++ {
		if w[k].V > w[crest].V {
			crest = k
		}
	}
	if k == len(w) {
		return
	}
	middle := (w[trough].V + w[crest].V) / 2
	through := func(from int) float64 {
		for n := from; n+1 < len(w); n++ {
			if w[n+1].V <= middle {
				return w[n].T + (w[n+1].T-w[n].T)*(w[n].V-middle)/(w[n].V-w[n+1].V)
			}
		}
		return math.NaN()
	}
	if turn := through(crest) - through(top); turn > 0 {
		s.ring = 1 / turn
	}
}

// spice is the board's edge by ngspice, in a folder of its own, followed for as long as the solver followed it.
func (b sample) spice(dir string, window float64) (spiced, error) {
	switch b.edge {
	case shapeCut:
		d := b.opening()
		d.channels(func() { d.put("ich", "ch", "0", "pwl(0 %.12g %.12g 0)", b.amps, b.fall/0.8) })
		return d.figures(dir, window)
	case shapeGate:
		return b.spiceGate(dir, window)
	}
	r := b.recover()
	at, level, err := b.closed(0, 0).moment(dir, "i(lloop)", b.amps+r.amps, window, "v(chip)")
	if err != nil {
		return spiced{}, err
	}
	if soonest := 0.5 * (b.amps + r.amps) / r.slope; at < soonest { // its first step can make inductor currents jump
		return spiced{}, fmt.Errorf("the loop current jumps: blocked after %.3g s, no current rises to it within %.3g s", at, soonest)
	}
	return b.closed(at, level[0]).figures(dir, window)
}

// spiceGate takes two runs: the first finds when the chip is at the bus and what the channel then carries, the second
// lets that fall on the raised cosine.
func (b sample) spiceGate(dir string, window float64) (spiced, error) {
	whole, least := b.wholeFall(), b.leastCarried()
	letGo := "0"
	if least > 0 {
		letGo = cosineFall(0, whole*least/b.amps, least)
	}
	first := b.opening()
	first.channels(func() {
		first.put("bch", "ch", "0", "i=%s", letGo)
		first.ramp(window)
	})
	at, held, err := first.moment(dir, "v(chip)", b.bus, window, "i(vch)")
	if errors.Is(err, errNever) {
		at, held, err = window, []float64{0}, nil
	}
	if err != nil {
		return spiced{}, err
	}
	amps := math.Max(held[0], 0)
	second := b.opening()
	second.channels(func() {
		second.put("bch", "ch", "0", "i=(time < %.12g) ? %s : %s", at, letGo, cosineFall(at, math.Max(whole*amps/b.amps, 1e-12), amps))
		second.ramp(at)
	})
	out, err := second.figures(dir, window)
	out.held = amps
	return out, err
}

// drawnBoards is how many boards to draw, and from which on; DRIVEMEND_CIRCUITS sets how many, DRIVEMEND_CIRCUIT picks a
// single one.
func drawnBoards(t *testing.T, usual int) (from, to int) {
	t.Helper()
	if n, err := strconv.Atoi(os.Getenv("DRIVEMEND_CIRCUIT")); err == nil {
		return n, n + 1
	}
	if n, err := strconv.Atoi(os.Getenv("DRIVEMEND_CIRCUITS")); err == nil && n > 0 {
		return 0, n
	}
	if testing.Short() {
		return 0, 8
	}
	return 0, usual
}

// worst keeps the largest difference of each kind.
type worst struct {
	by    map[string]float64
	which map[string]string
}

func (w *worst) note(kind, which string, d float64) {
	if w.by == nil {
		w.by, w.which = map[string]float64{}, map[string]string{}
	}
	if d >= w.by[kind] {
		w.by[kind], w.which[kind] = d, which
	}
}

func (w *worst) log(t *testing.T, what string) {
	t.Helper()
	for _, kind := range slices.Sorted(mapKeys(w.by)) {
		t.Logf("%s, %s: %.3f %% (%s)", what, kind, 100*w.by[kind], w.which[kind])
	}
}

func mapKeys(m map[string]float64) func(func(string) bool) {
	return func(yield func(string) bool) {
		for k := range m {
			if !yield(k) {
				return
			}
		}
	}
}

// How far the solver may be from ngspice.
const (
	peakTolerance   = 0.005
	ringTolerance   = 0.02
	energyTolerance = 0.03 // of the largest energy of the edge
	clearRing       = 0.05 // of the bus: a smaller swing is not compared, nor one that is a ripple in one of the two
	givenUp         = 0.1  // of the boards, on which ngspice may give up altogether
)

// Random boards of every network, topology and edge, live: peak, ring and energies beside ngspice.
func TestLiveRandomEdges(t *testing.T) {
	needNgspice(t)
	list := recipes()
	from, to := drawnBoards(t, len(list))
	root := t.TempDir()
	var lock sync.Mutex
	var peaks, rings, heats worst
	rang, carried, redrawn, lost := 0, 0, 0, 0
	_ = each(to-from, func(k int) error {
		n := from + k
		of := list[n%len(list)]
		c := compare(n, of, filepath.Join(root, strconv.Itoa(n)))
		lock.Lock()
		defer lock.Unlock()
		for _, text := range c.wrong {
			t.Errorf("board %d, %s: %s (again: DRIVEMEND_CIRCUIT=%d; DRIVEMEND_DECKS=folder keeps its deck)", n, of, text, n)
		}
		which := fmt.Sprintf("board %d, %s", n, of)
		kind := of.topology + " " + of.edge
		peaks.note(kind, which, c.peak)
		if c.rang {
			rang++
			rings.note(kind, which, c.ring)
		}
		if redrawn += c.redrawn; c.carried {
			carried++
		}
		if c.gaveUp {
			lost++
			t.Logf("%s: not compared, ngspice gave up on all draws", which)
		}
		for name, d := range c.energies {
			heats.note(name, which, d)
		}
		return nil
	})
	peaks.log(t, "peak")
	rings.log(t, "ring")
	heats.log(t, "energy")
	if float64(lost) > givenUp*float64(to-from) {
		t.Errorf("ngspice gave up on %d of %d boards", lost, to-from)
	}
	t.Logf("%d boards, %d of them ring clearly, %d with current left in the channel at the bus; %d drawn anew because ngspice gave up, %d not compared",
		to-from, rang, carried, redrawn, lost)
}

// A board on which ngspice does not come through with any of its options is drawn anew; how often is logged.
const (
	mostRedrawn  = 3
	redrawStride = 10_000
)

// comparison is how far the two are apart on one board.
type comparison struct {
	peak, ring    float64
	rang, carried bool
	redrawn       int  // how often ngspice did not come through
	gaveUp        bool // on all of them
	energies      map[string]float64
	wrong         []string
}

// compare solves one board twice.
func compare(n int, of recipe, dir string) comparison {
	c := comparison{energies: map[string]float64{}}
	fail := func(format string, args ...any) { c.wrong = append(c.wrong, fmt.Sprintf(format, args...)) }
	if keep := os.Getenv("DRIVEMEND_DECKS"); keep != "" {
		dir = filepath.Join(keep, strconv.Itoa(n))
	}
	if err := os.MkdirAll(dir, 0o700); err != nil {
		fail("%v", err)
		return c
	}
	var b sample
	var got *Edge
	var want spiced
	for ; c.redrawn <= mostRedrawn; c.redrawn++ {
		b = drawSample(uint64(n+c.redrawn*redrawStride), of)
		var err error
		if got, err = b.solve(false); err != nil {
			fail("%.300v", err)
			return c
		}
		if want, err = b.spice(dir, got.Waveform[len(got.Waveform)-1].T); err == nil {
			break
		}
	}
	if c.gaveUp = c.redrawn > mostRedrawn; c.gaveUp {
		return c
	}
	c.carried = want.held > 0.1*b.amps
	highest := math.Max(want.peak, b.bus)
	if c.peak = relative(got.Peak, highest); !(c.peak <= peakTolerance) {
		fail("peak %.3f V, ngspice %.3f V on a bus of %.0f V", got.Peak, highest, b.bus)
	}
	var own spiced
	own.swings(got.Waveform)
	if clear := want.swing > clearRing*b.bus && relative(own.swing, want.swing) < 0.1; clear && got.Ring > 0 && want.ring > 0 {
		c.rang = true
		if c.ring = relative(got.Ring, want.ring); !(c.ring <= ringTolerance) {
			fail("ring %.4g Hz, ngspice %.4g Hz", got.Ring, want.ring)
		}
	}
	c.heats(b, got, want, fail)
	return c
}

// heats compares the energies, as a share of the largest. With all gates off the common link is left out: the whole
// bridge has one, the solver its half.
func (c *comparison) heats(b sample, got *Edge, want spiced, fail func(string, ...any)) {
	most := 0.0
	for _, e := range want.energies {
		most = math.Max(most, math.Abs(e))
	}
	for name, e := range want.energies {
		if b.topology == "all-off" && name == "loop-resistance" {
			continue
		}
		d := math.Abs(got.energy(name)-e) / most
		if c.energies[name] = d; !(d <= energyTolerance) {
			fail("energy of %s %.4g J, ngspice %.4g J of %.4g J at most", name, got.energy(name), e, most)
		}
	}
}
