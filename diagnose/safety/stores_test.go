package safety

import (
	"strings"
	"testing"
)

func TestStoresOfThisVeryBoard(t *testing.T) {
	const mains = "topology: low-side-chopper\nsupply: rectified-mains\nload: {kind: resistive}\n"
	const battery = "topology: low-side-chopper\nsupply: battery\nload: {kind: resistive}\n"
	for _, row := range []struct{ name, board, want string }{
		{"battery chopper, nothing turns", battery + "bus: {nominal: 48 V, highest: 60 V, capacitance: 10 mF}", "bus"},
		{"mains chopper: its auxiliary supply is not stated", mains + "bus: {highest: 390 V, capacitance: 2200 µF}", "bus auxiliary?"},
		{"its auxiliary supply is stated", mains + "bus: {highest: 390 V}\nstages: {auxiliary: {primary_capacitance: 47 µF}}", "bus auxiliary"},
		{"split bank", battery + "bus: {highest: 390 V, halves: yes}", "bus upper-half lower-half"},
		{"split bank not known", battery + "bus: {highest: 390 V, halves: unknown}", "bus upper-half? lower-half?"},
		{"above 450 V, halves not stated", battery + "bus: {highest: 700 V}", "bus upper-half? lower-half?"},
		{"above 450 V, no halves", battery + "bus: {highest: 700 V, halves: no}", "bus"},
		{"bank behind a fuse", battery + "bus: {highest: 60 V, fuse: 100 A}", "bus fused-bank"},
		{"reservoir", battery + "bus: {highest: 60 V, reservoir: 100 µF}", "bus reservoir"},
		{"recovery network", battery + "bus: {highest: 60 V}\nsnubber: {kind: recovery}", "bus reservoir"},
		{"clamp", battery + "bus: {highest: 60 V}\nsnubber: {kind: clamp, capacitance: 1 µF}", "bus clamp"},
		{"small snubber: 100 nF at 390 V is 39 µC", battery + "bus: {highest: 390 V}\nsnubber: {kind: rcd, capacitance: 100 nF}", "bus"},
		{"large snubber: 220 nF at 390 V is 86 µC", battery + "bus: {highest: 390 V}\nsnubber: {kind: rcd, capacitance: 220 nF}", "bus snubber"},
		{"brake", battery + "bus: {highest: 60 V}\nstages: {brake: {resistor: 22 Ω}}", "bus brake"},
		{"brake not known", battery + "bus: {highest: 60 V}\nstages: {brake: {fitted: unknown}}", "bus brake?"},
		{"no brake", battery + "bus: {highest: 60 V}\nstages: {brake: {fitted: no}}", "bus"},
		{"motor", "topology: low-side-chopper\nsupply: battery\nload: {kind: permanent-magnet-motor}\nbus: {highest: 60 V}", "bus phases"},
		{"load not stated", "topology: low-side-chopper\nsupply: battery\nbus: {highest: 60 V}", "bus phases?"},
		{"other load", "topology: low-side-chopper\nsupply: battery\nload: {kind: other}\nbus: {highest: 60 V}", "bus phases?"},
		{"nothing stated but the topology", "topology: three-phase", "bus upper-half? lower-half? phases? auxiliary?"},
		{"everything", "topology: three-phase\nsupply: shared-bus\nload: {kind: induction-motor}\n" +
			"bus: {highest: 800 V, capacitance: 2200 µF, halves: yes, fuse: 63 A}\nsnubber: {kind: clamp}\n" +
			"stages: {brake: {fitted: yes}, auxiliary: {primary_capacitance: 47 µF}}",
			"bus upper-half lower-half fused-bank clamp brake phases auxiliary"},
	} {
		if got := points(Stores(boardOf(t, row.board))); got != row.want {
			t.Errorf("%s: got %s, want %s", row.name, got, row.want)
		}
	}
}

func TestHalvesShareTheEnergyOfTheBank(t *testing.T) {
	stores := Stores(boardOf(t, "topology: half-bridge\nsupply: battery\nload: {kind: resistive}\nbus: {highest: 800 V, capacitance: 2200 µF, halves: yes}"))
	near(t, "bank", stores[0].EnergyJ, 704, 1e-9) // the worked example of the safety notes, A2.3
	near(t, "upper half", stores[1].EnergyJ, 352, 1e-9)
	near(t, "voltage of a half", stores[1].Voltage.Value, 400, 1e-9)
	near(t, "total", TotalEnergy(stores), 704, 1e-9)
	if !stores[1].Known() || stores[1].Voltage.Basis != Computed {
		t.Errorf("a half of a stated bank is known: %+v", stores[1])
	}
}

func TestUnknownFiguresAreTheWorstCaseAndListed(t *testing.T) {
	for _, row := range []struct {
		board       string
		volt, farad float64
		keys        string
	}{
		{"topology: three-phase\nsupply: rectified-mains", 825, 4700e-6, "bus.highest bus.capacitance"},
		{"topology: three-phase", 825, 4700e-6, "supply bus.highest bus.capacitance"},
		{"topology: low-side-chopper\nsupply: battery", 120, 22e-3, "bus.highest bus.capacitance"},
		{"topology: low-side-chopper\nsupply: battery\nbus: {nominal: 48 V, capacitance: 10 mF}", 60, 10e-3, "bus.highest"},
		{"topology: low-side-chopper\nsupply: rectified-mains\nbus: {nominal: 310 V}", 403, 4700e-6, "bus.highest bus.capacitance"},
		{"topology: low-side-chopper\nsupply: rectified-mains\nbus: {highest: 390 V, capacitance: 1 mF}\nassumed: [bus.capacitance]", 390, 1e-3, "bus.capacitance"},
	} {
		p, err := Discharge(InputOf(boardOf(t, row.board)))
		if err != nil {
			t.Fatal(err)
		}
		near(t, "voltage", p.BusV, row.volt, 1e-9)
		near(t, "capacitance", p.CapacitanceF, row.farad, 1e-9)
		for _, key := range strings.Fields(row.keys) {
			if !wants(p, key) {
				t.Errorf("%s: %s is not listed: %+v", row.board, key, p.Needs)
			}
		}
		if strings.Contains(row.keys, "bus.capacitance") != (p.CapacitanceBasis == Assumed) {
			t.Errorf("%s: basis of the capacitance %q", row.board, p.CapacitanceBasis)
		}
	}
}

func TestStatedFiguresAreNotListed(t *testing.T) {
	p, err := Discharge(InputOf(boardOf(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: resistive}\n"+
		"bus: {highest: 60 V, capacitance: 10 mF, halves: no, fuse: 100 A, bleeder: 10 kΩ}")))
	if err != nil {
		t.Fatal(err)
	}
	if len(p.Needs) != 0 {
		t.Errorf("nothing is missing, listed: %+v", p.Needs)
	}
	if p.Bleeder == nil {
		t.Fatal("the bleeder is stated")
	}
	near(t, "bleeder to 50 V", p.Bleeder.Nominal.To50V, 18.23, 1e-3) // 100 s · ln(60/50)
}

// A clamp above the bus decides the resistor for all stores, and every store gets its own steps in order.
func TestPlanCoversEveryStore(t *testing.T) {
	p, err := Discharge(InputOf(boardOf(t, "topology: low-side-chopper\nsupply: rectified-mains\nload: {kind: permanent-magnet-motor}\n"+
		"bus: {highest: 390 V, capacitance: 2200 µF ±10 %}\nsnubber: {kind: clamp, capacitance: 4.7 µF, clamp_voltage: 520 V}")))
	if err != nil {
		t.Fatal(err)
	}
	near(t, "bank with its stated tolerance", p.Wait.To60V/p.Nominal.To60V, 1.1, 1e-9)
	if p.Resistor.Ohm != 940 || p.Resistor.EachOhm != 470 || p.Resistor.Series != 2 {
		t.Errorf("520 V: two of 220 Ω would take 615 W, so two of 470 Ω; got %+v", p.Resistor)
	}
	order := ""
	for _, s := range p.Steps {
		if s.Point != "" && !strings.HasSuffix(order, s.Point) {
			order += " " + s.Point
		}
	}
	if order != " bus clamp phases auxiliary" {
		t.Errorf("order of the steps:%s", order)
	}
	if len(p.Stores) != 4 || p.Stores[2].PeakCurrentA != 0 {
		t.Errorf("a place without a capacitor is not discharged by itself: %+v", p.Stores)
	}
	for _, id := range []string{"pumped", "motor", "stored-energy", "meter"} {
		if !hasCaution(p, id) {
			t.Errorf("no %s", id)
		}
	}
}

func TestPumpedReservoirStandsAtWhatTheSwitchWithstands(t *testing.T) {
	stores := Stores(boardOf(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: resistive}\nbus: {highest: 60 V}\n"+
		"switch: {kind: mosfet, rated_voltage: 200 V}\nsnubber: {kind: recovery, reservoir: 100 µF}"))
	near(t, "reservoir", stores[1].Voltage.Value, 200, 1e-9)
	if stores[1].Voltage.Basis != Assumed || stores[1].Known() {
		t.Errorf("it is not known: %+v", stores[1])
	}
}

func wants(p *Plan, key string) bool {
	for _, w := range p.Needs {
		if w.Key == key {
			return true
		}
	}
	return false
}
