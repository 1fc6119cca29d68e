package safety

import (
	"strings"
	"testing"
)

const splitBoard = "topology: half-bridge\nsupply: battery\nload: {kind: resistive}\nbus: {highest: 800 V, capacitance: 2200 µF, halves: yes}"

// One reading at one point of the split board: what the plan is made for, and what is said about it.
func TestAReadingAboveThePlanRaisesIt(t *testing.T) {
	for _, row := range []struct {
		name, point string
		dc          float64
		bus, upper  float64
		higher      bool // a caution that it read higher than expected
		alarm       bool // above bus.highest
	}{
		{"as expected", "bus", 780, 800, 400, false, false},
		{"just at it", "bus", 800, 800, 400, false, false},
		{"above it", "bus", 900, 900, 450, true, true},
		{"leads swapped", "bus", -900, 900, 450, true, true},
		{"a half out of balance", "upper-half", 600, 800, 600, true, false},
		{"a half above the bus", "upper-half", 850, 800, 850, true, true},
		{"discharged", "bus", 2, 800, 400, false, false},
	} {
		c := bench(t, splitBoard)
		for k := range c.Safety.DeadChecks {
			if c.Safety.DeadChecks[k].Point == row.point {
				c.Safety.DeadChecks[k].DC = volts(row.dc)
			}
		}
		p, err := Discharge(InputAt(c, at(t, "10:12")))
		if err != nil {
			t.Fatal(err)
		}
		near(t, row.name+": bus", p.BusV, row.bus, 1e-9)
		near(t, row.name+": upper half", p.Stores[1].Store.Voltage.Value, row.upper, 1e-9)
		near(t, row.name+": energy of the upper half", p.Stores[1].Store.EnergyJ, Energy(4400e-6, row.upper), 1e-9)
		if hasCaution(p, "read-higher") != row.higher || hasCaution(p, "above-highest") != row.alarm {
			t.Errorf("%s: read-higher %v, above-highest %v", row.name, hasCaution(p, "read-higher"), hasCaution(p, "above-highest"))
		}
		s := StatusOf(c, at(t, "10:12"), Evidence{})
		if (len(s.Alarms) == 1) != row.alarm || strings.Contains(missingText(Check(c, Work{Need: NeedDead}, at(t, "10:12"), Evidence{}).Missing), "ALARM") != row.alarm {
			t.Errorf("%s: alarms %v", row.name, s.Alarms)
		}
		if p.PeakPowerW > mostPeakWatts || p.Resistor.PeakW > mostPeakWatts {
			t.Errorf("%s: the resistor was not chosen for what was read: %+v", row.name, p.Resistor)
		}
	}
}

func TestOnlyWhatHasBeenReadRaisesThePlan(t *testing.T) {
	c := bench(t, splitBoard)
	c.Safety.DeadChecks[0].DC = volts(900)
	for clock, want := range map[string]float64{"10:06": 900, "10:07": 900, "10:12": 900} { // before its time it counts against the board
		near(t, clock, InputAt(c, at(t, clock)).BusV, want, 1e-9)
	}
	c.Safety.DeadChecks = append(c.Safety.DeadChecks, deadCheck(t, "bus", "10:09"))
	near(t, "after a later reading", InputAt(c, at(t, "10:12")).BusV, 800, 1e-9)
	near(t, "the board alone", InputOf(c.Board).BusV, 800, 1e-9)
	if len(StoresAt(nil, at(t, "10:12"))) != 0 || InputAt(nil, at(t, "10:12")).BusV != 0 {
		t.Error("a nil case has no stores")
	}
}

// What is read behind the fuse is the bank: the bus is planned for it, and the alarm names where it was read.
func TestAReadingBehindTheFuseRaisesTheBank(t *testing.T) {
	c := bench(t, "topology: half-bridge\nsupply: battery\nload: {kind: resistive}\nbus: {highest: 300 V, capacitance: 1 mF, fuse: 63 A}")
	c.Safety.DeadChecks[1].DC = volts(340)
	stores := StoresAt(c, at(t, "10:12"))
	near(t, "bus", stores[0].Voltage.Value, 340, 1e-9)
	near(t, "total", TotalEnergy(stores), Energy(1e-3, 340), 1e-9)
	if stores[0].Alarm != "" || !strings.Contains(stores[1].Alarm, "fused-bank") || !strings.Contains(stores[1].Alarm, "300 V") {
		t.Errorf("alarms %q, %q", stores[0].Alarm, stores[1].Alarm)
	}
}

func TestNoAlarmWhereTheHighestVoltageIsNotKnown(t *testing.T) {
	c := bench(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: resistive}\nbus: {nominal: 48 V, capacitance: 10 mF}")
	c.Safety.DeadChecks[0].DC = volts(75)
	p, err := Discharge(InputAt(c, at(t, "10:12")))
	if err != nil {
		t.Fatal(err)
	}
	near(t, "bus", p.BusV, 75, 1e-9)
	if !hasCaution(p, "read-higher") || hasCaution(p, "above-highest") || p.BusBasis != Measured {
		t.Errorf("basis %s, cautions %+v", p.BusBasis, p.Cautions)
	}
}

func missingText(missing []Missing) string {
	text := ""
	for _, m := range missing {
		text += m.Text + " -> " + m.Unlock + "\n"
	}
	return text
}

func TestEnergiesNameTheirBasis(t *testing.T) {
	p, err := Discharge(InputOf(boardOf(t, splitBoard)))
	if err != nil {
		t.Fatal(err)
	}
	near(t, "marked", p.TotalEnergyJ, 704, 1e-9)
	near(t, "worst", p.WorstEnergyJ, 844.8, 1e-9)
	near(t, "worst of the bus", p.Stores[0].Store.WorstJ, 844.8, 1e-9)
	near(t, "resistor", p.Resistor.JoulesJ, 844.8, 1e-9)
	text := ""
	for _, s := range p.Steps {
		text += s.Text + "\n"
	}
	for _, c := range p.Cautions {
		text += c.Text + "\n"
	}
	if !strings.Contains(text, "844.8 J at +20 % (704 J marked value)") {
		t.Errorf("both figures with their basis:\n%s", text)
	}
	rest := strings.ReplaceAll(strings.ReplaceAll(strings.ReplaceAll(text, "844.8 J at +20 %", ""), "704 J marked value", ""), "844.8 J in all (capacitance at +20 %)", "")
	if strings.Contains(rest, "844.8 J") || strings.Contains(rest, "704 J") {
		t.Errorf("a figure without its basis:\n%s", rest)
	}
	stated, err := Discharge(InputOf(boardOf(t, strings.Replace(splitBoard, "2200 µF", "2200 µF ±10 %", 1))))
	if err != nil {
		t.Fatal(err)
	}
	near(t, "its own interval", stated.WorstEnergyJ, 774.4, 1e-9)
	if !strings.Contains(stated.Steps[3].Text, "at +10 %") {
		t.Errorf("label: %s", stated.Steps[3].Text)
	}
}

func TestTimesToLevelsAboveTheStartAreLeftOut(t *testing.T) {
	for _, row := range []struct {
		volt   float64
		levels []float64
	}{{390, []float64{60, 50, 5}}, {60, []float64{50, 5}}, {55, []float64{50, 5}}, {50, []float64{5}}, {48, []float64{5}}, {5, nil}, {3, nil}} {
		p, err := Discharge(Input{BusV: row.volt, CapacitanceF: 1e-3})
		if err != nil {
			t.Fatal(err)
		}
		levels := p.Wait.Levels()
		if len(levels) != len(row.levels) {
			t.Fatalf("%g V: levels %+v", row.volt, levels)
		}
		for k, l := range levels {
			if l.Volt != row.levels[k] || !(l.Seconds > 0) {
				t.Errorf("%g V: level %+v, want %g V", row.volt, l, row.levels[k])
			}
		}
		for _, s := range p.Steps {
			if strings.Contains(s.Text, "after 0 s") || strings.Contains(s.Text, "Below  ") {
				t.Errorf("%g V: %s", row.volt, s.Text)
			}
		}
	}
}
