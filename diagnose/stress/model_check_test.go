package stress

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// C = dQ/dv, for both kinds of curve.
func TestModelCurves(t *testing.T) {
	for _, c := range modelCurves {
		for _, v := range []float64{0.01, 1, 25, 100, 600} {
			h := v / 1000
			if slope := (c.chargeTo(v+h) - c.chargeTo(v-h)) / (2 * h); relative(slope, c.at(v)) > 1e-4 {
				t.Errorf("%+v at %g V: dQ/dv %g F, C %g F", c, v, slope, c.at(v))
			}
		}
	}
}

var modelCurves = []modelCurve{{1e-9, 0.8, 0.5, 1e-11, false}, {3e-9, 1.2, 0.75, 0, false}, {6e-9, 10, 0, 4e-11, true}}

// A capacitance as the deck has it takes the time Q/I to be charged by a constant current.
func TestModelCurvesInTheDeck(t *testing.T) {
	if !ngspiceThere(t) {
		return
	}
	n := &netlist{}
	for k, c := range modelCurves {
		n.line("I%d 0 c%d PWL(0 0 10n 0 10.1n 0.1)\nR%d c%d 0 1meg", k, k, k, k)
		c.put(n, fmt.Sprint(k), fmt.Sprintf("c%d", k), "0")
	}
	w, err := n.solve(1.5e-6, 0.5e-9, "v(c0)", "v(c1)", "v(c2)")
	if err != nil {
		t.Fatal(err)
	}
	for k, c := range modelCurves {
		for _, v := range []float64{2, 30, 300} {
			at := w.crossing(w.all[fmt.Sprintf("v(c%d)", k)], v, 0, true) - 10.05e-9
			if want := c.chargeTo(v) / 0.1; math.IsNaN(at) || math.Abs(at-want) > 0.01*want+0.05e-9 {
				t.Errorf("%+v: %g V after %g s, want %g s", c, v, at, want)
			}
		}
	}
}

// At the plateau's gate voltage the channel carries the current: gain·u²/(u+2·knee), times 1 + early·v; an IGBT's
// three shares together.
func TestModelChannel(t *testing.T) {
	if !ngspiceThere(t) {
		return
	}
	for _, kind := range []string{"igbt", "mosfet"} {
		for _, amps := range []float64{5, 40, 160} {
			s := modelSwitch{kind: kind, rated: 600, threshold: 5, gain: 30, knee: 2, early: 1e-3, ohm: 0.01, gateEmitter: 1e-9,
				gateCollector: modelCurves[0], collectorEmitter: modelCurves[1],
				plasma: 0.3, plasmaTime: 1e-8, tail: 0.2, tailTime: 1e-7,
				diode: modelDiode{drop: 1, ohm: 0.01, lifetime: 1e-7, transit: 5e-8, start: 0.1, modulation: 1, amps: 40}}
			n := &netlist{}
			s.put(n, "x", "d", "g", "0")
			n.line("Vd d 0 100\nVg g 0 %.9g", s.plateau(amps))
			w, err := n.solve(1e-7, 1e-9, "i(Vd)")
			if err != nil {
				t.Fatal(err)
			}
			if got := -w.all["i(vd)"][0]; relative(got, 1.1*amps) > 0.01 {
				t.Errorf("%s: %g A, want %g A", kind, got, 1.1*amps)
			}
		}
	}
}

// A diode's peak of recovery on a straight ramp has a closed form. With qM = tau·i + a·tau²·(1-exp(-t/tau)) and the
// end of the ramp at qE = 0: I = a·(tau-t0)·(1-exp(-T/tau)), t0 = tau·TM/(tau+TM), T = (IF+I)/a (derived from the
// model's two equations). The test's ramp bends by a few per cent.
func TestModelDiodePeak(t *testing.T) {
	if !ngspiceThere(t) {
		return
	}
	for _, c := range []struct{ lifetime, transit, amps, slope float64 }{
		{100e-9, 40e-9, 20, 200e6}, {300e-9, 90e-9, 75, 1e9}, {40e-9, 40e-9, 30, 500e6},
	} {
		d := modelDiode{drop: 0.9, ohm: 1e-3, lifetime: c.lifetime, transit: c.transit, amps: c.amps, rated: 600}
		d.start, d.modulation = 1e-3, 1
		b := modelBoard{diode: d, recoverySlope: c.slope}
		n, end, s := b.recoveryDeck()
		w, err := n.solve(end, end/3000, "i(Vk)")
		if err != nil {
			t.Fatal(err)
		}
		if err := s.recovery(w, w.all["i(vk)"]); err != nil {
			t.Fatal(err)
		}
		late := c.lifetime * c.transit / (c.lifetime + c.transit)
		want := 0.0
		for range 100 {
			want = c.slope * (c.lifetime - late) * (1 - math.Exp(-(c.amps+want)/c.slope/c.lifetime))
		}
		t.Logf("%.2f A, closed form %.2f A", s.peak, want)
		if relative(s.peak, want) > 0.04 {
			t.Errorf("%+v: peak %.2f A, closed form %.2f A", c, s.peak, want)
		}
	}
}

// Finer steps and sharper tolerances move no peak by more than 1 %.
func TestModelConverged(t *testing.T) {
	if !ngspiceThere(t) {
		return
	}
	for _, n := range []uint64{5, 12, 34} {
		b := drawModel(n)
		for _, opening := range []bool{true, false} {
			coarse, err := b.edge(b.bus, b.amps, opening)
			if err != nil {
				t.Fatalf("board %d: %v", n, err)
			}
			fine, err := b.fineEdge(opening)
			if err != nil {
				t.Fatalf("board %d, fine: %v", n, err)
			}
			if relative(coarse.Chip, fine.Chip) > 0.01 {
				t.Errorf("board %d, opening %v: peak %.1f V, with finer steps %.1f V", n, opening, coarse.Chip, fine.Chip)
			}
		}
	}
}

func (b modelBoard) fineEdge(opening bool) (modelEdge, error) {
	n, end := b.deck(b.bus, b.amps, opening)
	n.options = "reltol=1e-4 trtol=1 method=trap"
	w, err := n.solve(end, b.step(b.bus)/2, savedNodes...)
	if err != nil {
		return modelEdge{}, err
	}
	e, _ := b.read(w, b.bus, b.amps, opening)
	return e, nil
}

// Every key that a board states is in the key table, of its unit and within its range; what nobody measured is not
// stated; what was measured contains the truth.
func TestModelKeys(t *testing.T) {
	for n := range uint64(200) {
		b := drawModel(n)
		b.data = modelSheet{50e-9, 1e9, 1e10, 300, 20, 10, 1e-6, 0.5, 20, 1e8, 1.2, 10}
		for _, gate := range []bool{true, false} {
			board := b.spoken().board(t, gate)
			for _, k := range b.spoken().keys(gate) {
				checkKey(t, board, k)
			}
			for _, k := range b.quiet().keys(gate) {
				if strings.HasSuffix(k[0], "_inductance") || k[0] == "loop.inductance" {
					t.Errorf("board %d: %s is stated and nobody measured it", n, k[0])
				}
				if !gate && (strings.HasPrefix(k[0], "gate.") || strings.Contains(k[0], "turn_on")) {
					t.Errorf("board %d: %s is stated without a gate", n, k[0])
				}
			}
			if loop, _ := board.Quantity("loop.inductance"); loop.Low > b.measuredLoop() || loop.High < b.measuredLoop() {
				t.Errorf("board %d: loop stated %v, true %g H", n, loop, b.measuredLoop())
			}
		}
	}
}

func checkKey(t *testing.T, board measure.Board, k [2]string) {
	t.Helper()
	path := "board." + k[0]
	row, ok := measure.LookupKey(path)
	if !ok {
		t.Errorf("%s is not in the key table", path)
		return
	}
	if row.Kind == measure.KindYesNo {
		if word, stated := board.Word(k[0]); !stated || word != k[1] {
			t.Errorf("%s: %q is stated as %q", path, k[1], word)
		}
		return
	}
	if row.Kind == measure.KindWord {
		if word, stated := board.Word(k[0]); !stated || !slices.Contains(row.Words, word) {
			t.Errorf("%s: %q is not one of %v", path, k[1], row.Words)
		}
		return
	}
	q, stated := board.Quantity(k[0])
	if !stated || q.Value < row.Min || q.Value > row.Max {
		t.Errorf("%s: %s is not a value from %g to %g", path, k[1], row.Min, row.Max)
	}
	if row.Kind == measure.KindQuantity {
		if _, err := quantity.Parse(k[1], row.Unit); err != nil {
			t.Errorf("%s: %v", path, err)
		}
	}
}
