package diagnose

import (
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// shownFailing puts readings that speak for a fault in short words: "test position part: because".
func shownFailing(list []safety.Static) []string {
	var out []string
	for _, f := range list {
		place := f.Part
		if f.Lifted {
			place += " lifted"
		}
		out = append(out, strings.Join(strings.Fields(f.Test+" "+f.Position+" "+place), " ")+": "+f.Because)
	}
	return out
}

// TestReadingsThatSpeakForAFault enters dead readings after the rebuild and asks which of them stand against power.
func TestReadingsThatSpeakForAFault(t *testing.T) {
	base := loadBase(t)
	const half = "topology: half-bridge\nsupply: rectified-mains"
	diode := func(q, rest string) string { return "reverse-diode-drop, part: " + q + ", state: lifted, " + rest }
	for _, c := range []struct {
		name, board string
		answers     []string
		failing     []string
		mended      int
	}{
		{"nothing read", chopper, nil, nil, 0},
		{"a good one", chopper, []string{"gate-resistor-value, result: right"}, nil, 0},
		{"an open gate resistor", chopper, []string{"gate-resistor-value, result: open"}, []string{"gate-resistor-value low: reads open"}, 0},
		{"by its number", chopper, []string{"gate-resistor-value, reading: 4000 %"}, []string{"gate-resistor-value low: reads open (4000 %)"}, 0},
		{"a number near its marking", chopper, []string{"gate-resistor-value, reading: 101 %"}, nil, 0},
		{"before the rebuild", chopper, []string{"gate-resistor-value, result: open, at: 2026-12-01T14:50:00+01:00"}, nil, 0},
		{"known on arrival", chopper, []string{"bus-short-check, result: shorted, seen: on-arrival"}, nil, 0},
		{"skipped", chopper, []string{"bus-short-check, answer: skipped"}, nil, 0},
		{"a clamp", chopper, []string{"gate-clamp-check, result: failed"}, []string{"gate-clamp-check low: reads failed"}, 0},
		{"a bus short", half, []string{"bus-short-check, result: shorted"}, []string{"bus-short-check: reads shorted"}, 0},
		{"a rectifier", half, []string{"rectifier-diode-check, result: shorted"}, []string{"rectifier-diode-check: reads shorted"}, 0},
		{"wires that are mixed", half, []string{"terminal-check, result: mixed"}, []string{"terminal-check: reads mixed"}, 0},
		{"two, in the order of the base", half, []string{"bus-short-check, result: shorted", "driver-look, result: cratered"},
			[]string{"driver-look: reads cratered", "bus-short-check: reads shorted"}, 0},
		{"good since", half, []string{"bus-short-check, result: shorted", "bus-short-check, result: climbs"}, nil, 1},
		{"bad again", half, []string{"bus-short-check, result: shorted", "bus-short-check, result: climbs", "bus-short-check, result: shorted"}, []string{"bus-short-check: reads shorted"}, 0},
		{"by the time, not the line", half, []string{"bus-short-check, result: shorted, at: 2026-12-01T15:12:00+01:00", "bus-short-check, result: climbs, at: 2026-12-01T15:11:00+01:00"},
			[]string{"bus-short-check: reads shorted"}, 0},
		{"put off since", half, []string{"bus-short-check, result: shorted", "bus-short-check, answer: later"}, []string{"bus-short-check: reads shorted"}, 0},
		{"good since, outside its hold point", half, []string{"bus-short-check, result: shorted", "bus-short-check, result: climbs, at: 2026-12-01T15:19:00+01:00"},
			[]string{"bus-short-check: reads shorted; the good reading of 15:19 was taken outside its hold point"}, 0},
		{"one position, then the board", half, []string{"gate-resistor-value, position: low, result: open", "gate-resistor-value, result: right"}, nil, 1},
		{"the board, then one position", half, []string{"gate-resistor-value, result: open", "gate-resistor-value, position: low, result: right"}, []string{"gate-resistor-value: reads open"}, 0},
		{"one position, then the other", half, []string{"gate-resistor-value, position: low, result: open", "gate-resistor-value, position: high, result: right"}, []string{"gate-resistor-value low: reads open"}, 0},
		{"a part, lifted", chopper, []string{diode("Q2", "result: open")}, []string{"reverse-diode-drop low Q2 lifted: reads open"}, 0},
		{"another part since", chopper, []string{diode("Q2", "result: open"), diode("Q3", "result: normal")}, []string{"reverse-diode-drop low Q2 lifted: reads open"}, 0},
		{"its bank since", chopper, []string{diode("Q2", "result: open"), "reverse-diode-drop, position: low, result: normal"}, []string{"reverse-diode-drop low Q2 lifted: reads open"}, 0},
		{"the part since", chopper, []string{diode("Q2", "result: open"), diode("Q2", "result: normal")}, nil, 1},
		{"a static test that fails speaks for itself", half, []string{terminals + ", position: low, result: shorted", "gate-pull-down, result: open"}, nil, 0},
		{"a static test without its place", half, []string{terminals + ", reading: 0.3 Ω"}, []string{terminals + ": reads shorted (0.3 Ω)"}, 0},
		{"the same place, good since", half, []string{terminals + ", reading: 0.3 Ω", terminals + ", reading: OL"}, nil, 1},
		{"a test that is static on other boards", half, []string{"freewheel-diode-drop, result: shorted"}, []string{"freewheel-diode-drop: reads shorted"}, 0},
	} {
		e := EvidenceOf(base, rebuiltCase(t, c.board, "", c.answers...))
		if got := shownFailing(e.Failing); !slices.Equal(got, c.failing) || len(e.Mended) != c.mended {
			t.Errorf("%s: %q and %d mended, want %q and %d", c.name, got, len(e.Mended), c.failing, c.mended)
		}
	}
	planned := rebuiltCase(t, half, "rebuild: {gate: {pull_down: 10 kΩ}}\n", "bus-short-check, result: shorted")
	if e := EvidenceOf(base, planned); len(e.Failing) != 0 {
		t.Errorf("nothing is rebuilt yet: %+v", e.Failing)
	}
}

// TestAFailingReadingHoldsPowerBack: with everything else in order it is the one thing that is missing, it is asked
// again, and a good reading lets power through from its own time on.
func TestAFailingReadingHoldsPowerBack(t *testing.T) {
	base := loadBase(t)
	c := withStatics(base, caseOf(t, "topology: half-bridge", ""))
	for _, step := range []string{measure.BeforeControlPower, measure.BeforeLowBus, measure.BeforeFull} {
		c.Safety.Before = append(c.Safety.Before, measure.Before{Step: step, At: afterwards.Add(-time.Minute), Motor: "unplugged", BrakeResistor: "disconnected",
			Fuse: quantity.Of(1, quantity.Ampere), Bank: "in-use", Guard: true, RemoteOff: true, Glasses: true, SecondPerson: true, BusDisconnected: true})
	}
	ask := func(want int) []safety.Missing {
		t.Helper()
		var m []safety.Missing
		for _, need := range []safety.Need{safety.NeedControlPower, safety.NeedLowBus, safety.NeedFull} {
			d := safety.Check(c, safety.Work{Need: need}, afterwards, EvidenceOf(base, c))
			if m = d.Missing; len(m) != want {
				t.Errorf("%s: %+v, want %d missing", need, m, want)
			}
		}
		return m
	}
	ask(0)
	c.Observations = append(c.Observations, measure.Observation{Test: "gate-resistor-value", Position: "low", Result: "open", At: rebuildTime.Add(12 * time.Minute)})
	m := ask(1)
	for _, want := range []string{"Gate resistors", "at low", "reads open", "2026-12-01 14:12"} {
		if len(m) == 1 && (m[0].Point != 3 || !strings.Contains(m[0].Text, want)) {
			t.Errorf("%+v does not name %q", m[0], want)
		}
	}
	if len(m) == 1 && (!strings.Contains(m[0].Unlock, "rebuild.done") || !strings.Contains(m[0].Unlock, "enter CASE gate-resistor-value RESULT --position low")) {
		t.Errorf("unlocked by %q", m[0].Unlock)
	}
	s := nextAt(t, base, c, afterwards)
	if again := s.find("gate-resistor-value", "", "low"); again == nil || !again.Serves || !again.Must || again.Static || !again.Allowed || !strings.HasPrefix(again.Again, "reads open: mend it") {
		t.Errorf("asked again: %+v", again)
	}
	good := measure.Observation{Test: "gate-resistor-value", Position: "low", Result: "right", At: afterwards.Add(30 * time.Second)}
	c.Observations = append(c.Observations, good)
	ask(1) // it lies ahead
	c.Observations[len(c.Observations)-1].At = afterwards.Add(-30 * time.Second)
	ask(0)
}

// TestALiftedPartIsAskedLifted: what failed lifted is asked of the part, at the price of lifting it.
func TestALiftedPartIsAskedLifted(t *testing.T) {
	base := loadBase(t)
	s := nextAt(t, base, rebuiltCase(t, chopper, "", terminals+", part: Q2, state: lifted, reading: 0.4 Ω", terminals+", position: low, reading: OL"), afterwards)
	part, bank := s.find(terminals, "Q2", ""), s.find(terminals, "", "low")
	if part == nil || !part.Lifted || !part.Static || part.Minutes != part.Test.Minutes+liftMinutes || !strings.Contains(part.Again, "Q2 reads shorted") {
		t.Errorf("the part: %+v", part)
	}
	if bank != nil {
		t.Errorf("the bank is asked although it passed: %+v", bank)
	}
}
