package meter

import (
	"testing"

	"drivemend/measure"
)

func board(t *testing.T, keys string) measure.Board {
	t.Helper()
	f, err := measure.Parse("test.yaml", []byte("drivemend: 1\ncase: test\nboard:\n  topology: low-side-chopper\n"+keys))
	if err != nil {
		t.Fatal(err)
	}
	return f.Case.Board
}

// The published pair: a service manual gives 1 kΩ protective resistors for one board and 500 Ω for two in parallel
// (plasma-welder service manual as quoted in the trade, second hand).
func TestGateBleedDividesInParallel(t *testing.T) {
	b := board(t, "  gate: {pull_down: 1 kΩ}\n")
	for _, c := range []struct {
		at   Place
		want float64
	}{
		{Place{Parallel: 1}, 1000}, {Place{Parallel: 2}, 500}, {Place{Parallel: 4}, 250}, {Place{Parallel: 4, Lifted: true}, 1000},
	} {
		q, ok, err := Expected(b, "expected.gate_bleed", c.at)
		if err != nil || !ok || q.Value != c.want {
			t.Errorf("%+v: %v %v %v, want %g Ω", c.at, q, ok, err, c.want)
		}
	}
}

// Read in circuit, a switch that blocks shows what lies across the rails: the meter's current goes on through the
// freewheel diode (topology; parallel resistors).
func TestABlockingSwitchReadsWhatLiesAcrossTheRails(t *testing.T) {
	for _, c := range []struct {
		keys string
		at   Place
		want float64
	}{
		{"", Place{Parallel: 1}, 20e6},
		{"  bus: {bleeder: 100 kΩ}\n", Place{Parallel: 3}, 99502.5},
		{"  bus: {bleeder: 100 kΩ}\n", Place{Parallel: 3, Lifted: true}, 20e6},
		{"  bus: {bleeder: 100 kΩ}\n  freewheel: {fitted: no}\n", Place{Parallel: 1}, 20e6},
		{"  bus: {halves: yes, balancing: 47 kΩ}\n", Place{Parallel: 1}, 93560.4},
		{"  bus: {bleeder: none}\n", Place{Parallel: 1}, 20e6},
	} {
		q, ok, err := Expected(board(t, c.keys), "expected.blocking", c.at)
		if err != nil || !ok || q.Value < c.want*0.99999 || q.Value > c.want*1.00001 {
			t.Errorf("%q %+v: %v %v %v, want %g Ω", c.keys, c.at, q, ok, err, c.want)
		}
	}
}

func TestExpectedSaysWhatItCannotTell(t *testing.T) {
	if _, ok, err := Expected(board(t, ""), "expected.gate_bleed", Place{Parallel: 2}); ok || err != nil {
		t.Errorf("a bleed that is not stated: %v %v", ok, err)
	}
	if _, _, err := Expected(board(t, ""), "expected.moonlight", Place{}); err == nil {
		t.Error("an unknown name is no error")
	}
}
