package safety

import (
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"drivemend/measure"
)

var update = flag.Bool("update", false, "write the golden files anew")

// What a technician reads for one board: stores, steps, cautions, wanted keys, and what stands between them and ohms
// at moments of the day.
func TestTextsOfOneBoard(t *testing.T) {
	f, err := measure.Load(filepath.Join("testdata", "pump-chopper.yaml"))
	if err != nil {
		t.Fatal(err)
	}
	p, err := Discharge(InputOf(f.Case.Board))
	if err != nil {
		t.Fatal(err)
	}
	text := planText(p)
	for _, clock := range []string{"09:35", "09:50", "10:00", "10:06", "10:12", "10:16", "10:18", "10:31"} {
		if clock == "10:31" {
			energise("10:30")(&f.Case.Safety)
		}
		text += "\nohms at " + clock + "\n"
		for _, m := range Check(f.Case, Work{Need: NeedDead}, at(t, clock), Evidence{}).Missing {
			text += fmt.Sprintf("  %d  %s\n     -> %s\n", m.Point, m.Text, m.Unlock)
		}
	}
	golden(t, filepath.Join("testdata", "pump-chopper.golden"), text)
}

func planText(p *Plan) string {
	var b strings.Builder
	for _, s := range p.Stores {
		fmt.Fprintf(&b, "store %s: %s, %s, %.4g J, to check %v: %s\n", s.Store.Point, s.Store.Voltage, s.Store.Capacitance, s.Store.EnergyJ, s.Store.ToCheck, s.Store.Because)
	}
	fmt.Fprintf(&b, "\nresistor %g Ω, %.3g A, %.4g W, RC %.3g s, to 60 V %.3g s, to 50 V %.3g s, to 5 V %.3g s\n",
		p.Resistor.Ohm, p.PeakCurrentA, p.PeakPowerW, p.TimeConstantS, p.Nominal.To60V, p.Nominal.To50V, p.Nominal.To5V)
	if p.Bleeder != nil {
		fmt.Fprintf(&b, "bleeder %g Ω, %.3g W, to 60 V %.4g s, label %g s\n", p.Bleeder.Ohm, p.Bleeder.PowerW, p.Bleeder.Nominal.To60V, p.Bleeder.LabelTimeS)
	}
	b.WriteString("\n")
	for k, s := range p.Steps {
		fmt.Fprintf(&b, "%d %s\n", k+1, s.Text)
	}
	b.WriteString("\n")
	for _, c := range p.Cautions {
		fmt.Fprintf(&b, "%s: %s [%s; %s]\n", c.ID, c.Text, c.Source, c.Read)
	}
	b.WriteString("\n")
	for _, w := range p.Needs {
		fmt.Fprintf(&b, "wanted %s: %s\n", w.Key, w.Why)
	}
	return b.String()
}

func golden(t *testing.T, path, got string) {
	t.Helper()
	if *update {
		if err := os.WriteFile(path, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		t.Errorf("%s differs; run the test with -update and read the difference\n%s", path, got)
	}
}
