package stress

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// recordBoard is a board of which nothing is stated but the rows of some kinds of the record, where the switch stands,
// and a rated voltage, which decides the typical values of the diode.
func recordBoard(t *testing.T, topology, rated string, kinds ...string) measure.Board {
	keys := [][2]string{{"topology", topology}, {"switch.rated_voltage", rated}}
	for _, r := range table(t, "sic-turn-off.csv") {
		if slices.Contains(kinds, r["kind"]) {
			keys = append(keys, [2]string{r["name"], r["value"]})
		}
	}
	return boardOf(t, keys...)
}

// recordAnswer is a figure of the record that is to be foretold.
func recordAnswer(t *testing.T, name string, unit quantity.Unit) float64 {
	for _, r := range table(t, "sic-turn-off.csv") {
		if r["kind"] == "answer" && r["name"] == name {
			q, err := quantity.Parse(r["value"], unit)
			if err != nil {
				t.Fatal(err)
			}
			return q.Value
		}
	}
	t.Fatalf("the record has no %s", name)
	return 0
}

// shareBelow is how much of a sorted sample lies below a value, in per cent.
func shareBelow(sorted []float64, v float64) float64 {
	n, _ := slices.BinarySearch(sorted, v)
	return 100 * float64(n) / float64(len(sorted))
}

// terminalPeaks are the peaks of the draws where a probe stands, sorted.
func terminalPeaks(t *testing.T, p *problem) []float64 {
	sample, err := p.draw(1, draws)
	if err != nil {
		t.Fatal(err)
	}
	peaks := make([]float64, len(sample))
	err = each(len(sample), func(k int) error {
		e, err := watchingTerminals(sample[k].s).gateLimited()
		if err == nil {
			peaks[k] = e.terminals
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(peaks)
	return peaks
}

// A measured opening of a silicon-carbide MOSFET, 401 V and 22 A, which went to 476 V. With what the record says of the
// edge, its slope, fall time and damping, and everything else typical, the peak measured lies within the peaks drawn, and
// under the percentile. With nothing but bus, current and kind, the percentile is above it too; there the record is
// among the lowest draws, since its edge is slower than silicon carbide has it as a rule. Topology and rated voltage are
// not in the record: the two ends of what they do.
func TestSiCRecord(t *testing.T) {
	measured := recordAnswer(t, "peak", quantity.Volt)
	for _, c := range []struct {
		topology, rated string
		kinds           []string
	}{
		{"low-side-chopper", "650 V", []string{"setting", "edge"}},
		{"half-bridge", "1200 V", []string{"setting", "edge"}},
		{"low-side-chopper", "650 V", []string{"setting"}},
		{"half-bridge", "1200 V", []string{"setting"}},
	} {
		b := recordBoard(t, c.topology, c.rated, c.kinds...)
		p := problemOf(t, b)
		peaks := terminalPeaks(t, p)
		lowest, highest := peaks[0], peaks[len(peaks)-1]
		middle, err := watchingTerminals(p.nominal()).gateLimited()
		if err != nil {
			t.Fatal(err)
		}
		f := computed(t, b).AsFound
		name := fmt.Sprintf("%s of %s, by %s", c.topology, c.rated, strings.Join(c.kinds, " and "))
		t.Logf("%s: measured %.0f V; at the terminals %.0f V in the middle, draws %.0f V to %.0f V, %.1f %% of them below it",
			name, measured, middle.terminals, lowest, highest, shareBelow(peaks, measured))
		t.Logf("  at the chip %.0f V, 99.9th percentile %.0f V, corner %.0f V (%s, %s); ring %.1f MHz, measured %.1f MHz", f.Nominal.Peak,
			f.P999.Peak, f.Worst.Peak, f.Worst.Edge, f.Worst.Shape, middle.Ring/1e6, recordAnswer(t, "ring", quantity.Hertz)/1e6)
		if f.P999.Peak < measured || f.Worst.Peak < measured {
			t.Errorf("%s: percentile %.1f V and corner %.1f V, measured %.0f V", name, f.P999.Peak, f.Worst.Peak, measured)
		}
		if len(c.kinds) == 2 && (lowest > measured || highest < measured) {
			t.Errorf("%s: draws from %.1f V to %.1f V, measured %.0f V", name, lowest, highest, measured)
		}
	}
}

// watchingTerminals is a scene whose terminals are watched beside the chip.
func watchingTerminals(s scene) scene {
	s.outside = true
	return s
}
