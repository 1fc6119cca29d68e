package safety

import (
	"strings"
	"testing"
	"time"

	"drivemend/measure"
)

// bench is a board that is isolated at 09:40 and has a link from 09:53 to 10:05, as in the worked case of the format;
// every store of it is checked at 10:07.
func bench(t testing.TB, board string) *measure.Case {
	t.Helper()
	c := parse(t, board, "")
	c.Safety = measure.Safety{
		Isolation: []measure.Isolation{{Locked: true, Motor: "unplugged", OtherSources: "none", At: at(t, "09:40")}},
		Links:     []measure.Link{{Fitted: at(t, "09:53"), Removed: at(t, "10:05")}},
	}
	for _, s := range Stores(c.Board) {
		c.Safety.DeadChecks = append(c.Safety.DeadChecks, deadCheck(t, s.Point, "10:07"))
	}
	return c
}

func deadCheck(t testing.TB, point, clock string) measure.DeadCheck {
	return measure.DeadCheck{Point: point, DC: volts(0.4), AC: volts(0), MeterProved: true, At: at(t, clock)}
}

const wholeBoard = "topology: three-phase\nsupply: shared-bus\nload: {kind: permanent-magnet-motor}\n" +
	"bus: {highest: 800 V, capacitance: 2200 µF, halves: yes, fuse: 63 A, reservoir: 10 µF}\nsnubber: {kind: clamp, capacitance: 1 µF, clamp_voltage: 900 V}\n" +
	"stages: {brake: {fitted: yes}, auxiliary: {primary_capacitance: 47 µF}}"

// Every store, one at a time, in every way a check of it can fail: only the untouched one lets ohms through.
func TestEveryStoreHasToBeDead(t *testing.T) {
	faults := []struct {
		name  string
		spoil func(d *measure.DeadCheck)
		point int // hold point that must be named
	}{
		{"5.0 V is still dead", func(d *measure.DeadCheck) { d.DC = volts(5) }, -1},
		{"DC above 5 V", func(d *measure.DeadCheck) { d.DC = volts(5.001) }, 1},
		{"DC above 5 V, leads swapped", func(d *measure.DeadCheck) { d.DC = volts(-31) }, 1},
		{"AC above 5 V", func(d *measure.DeadCheck) { d.AC = volts(24) }, 0},
		{"no AC reading", func(d *measure.DeadCheck) { d.AC = measure.DeadCheck{}.AC }, 1},
		{"meter not proved", func(d *measure.DeadCheck) { d.MeterProved = false }, 1},
		{"another point", func(d *measure.DeadCheck) { d.Point = "elsewhere" }, 1},
		{"10 minutes old", func(d *measure.DeadCheck) { d.At = d.At.Add(-7 * time.Minute) }, 2},
		{"in the future", func(d *measure.DeadCheck) { d.At = d.At.Add(time.Hour) }, 1},
		{"no time", func(d *measure.DeadCheck) { d.At = time.Time{} }, 1},
		{"before the link came off", func(d *measure.DeadCheck) { d.At = d.At.Add(-3 * time.Minute) }, 2},
	}
	stores := Stores(boardOf(t, wholeBoard))
	if got := points(stores); got != "bus upper-half lower-half fused-bank reservoir clamp brake phases auxiliary" {
		t.Fatalf("the table needs every kind of store: %s", got)
	}
	for k, store := range stores {
		for _, f := range faults {
			c := bench(t, wholeBoard)
			c.Safety.Isolation[0].Motor = "shaft-locked" // so that the motor terminals count
			f.spoil(&c.Safety.DeadChecks[k])
			now := at(t, "10:12")
			if f.name == "10 minutes old" {
				now = at(t, "10:16")
				c.Safety.Links = nil
				for j := range c.Safety.DeadChecks {
					if j != k {
						c.Safety.DeadChecks[j].At = at(t, "10:15")
					}
				}
				c.Safety.DeadChecks[k].At = at(t, "10:06")
			}
			d := Check(c, Work{Need: NeedDead}, now, Evidence{})
			if d.Allowed != (f.point < 0) {
				t.Errorf("%s, %s: allowed %v, missing %+v", store.Point, f.name, d.Allowed, d.Missing)
			}
			if f.point >= 0 && (len(d.Missing) == 0 || d.Missing[0].Point != f.point || !strings.Contains(d.Missing[0].Text, store.Point)) {
				t.Errorf("%s, %s: missing %+v, want hold point %d at that store", store.Point, f.name, d.Missing, f.point)
			}
			if d.Allowed != d.Status.Dead {
				t.Errorf("%s, %s: status says dead %v", store.Point, f.name, d.Status.Dead)
			}
		}
	}
}

func TestADeadCheckLivesTenMinutes(t *testing.T) {
	for _, row := range []struct {
		now     string
		allowed bool
	}{
		{"10:06", false}, {"10:07", true}, {"10:12", true}, {"10:16:59", true}, {"10:17", false}, {"10:18", false}, {"23:00", false}, {"09:00", false},
	} {
		c := bench(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 60 V, capacitance: 10 mF}")
		d := Check(c, Work{Need: NeedDead}, at(t, row.now), Evidence{})
		if d.Allowed != row.allowed {
			t.Errorf("%s: allowed %v, missing %+v", row.now, d.Allowed, d.Missing)
		}
		p := d.Status.Points[0]
		if row.allowed && (p.Age != at(t, row.now).Sub(at(t, "10:07")) || !p.ExpiresAt.Equal(at(t, "10:17"))) {
			t.Errorf("%s: age %s, expires at %s", row.now, p.Age, p.ExpiresAt)
		}
	}
}

func TestIsolation(t *testing.T) {
	sound := measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "none"}
	for _, row := range []struct {
		name    string
		load    string
		change  func(i *measure.Isolation)
		allowed bool
	}{
		{"as it should be", "dc-motor", func(i *measure.Isolation) {}, true},
		{"not locked", "dc-motor", func(i *measure.Isolation) { i.Locked = false }, false},
		{"shaft locked", "permanent-magnet-motor", func(i *measure.Isolation) { i.Motor = "shaft-locked" }, true},
		{"permanent magnets, connected", "permanent-magnet-motor", func(i *measure.Isolation) { i.Motor = "connected" }, false},
		{"any motor, connected", "induction-motor", func(i *measure.Isolation) { i.Motor = "connected" }, false},
		{"load not known, connected", "other", func(i *measure.Isolation) { i.Motor = "connected" }, false},
		{"resistive load, connected", "resistive", func(i *measure.Isolation) { i.Motor = "connected" }, true},
		{"motor not stated", "dc-motor", func(i *measure.Isolation) { i.Motor = "" }, false},
		{"other sources not stated", "dc-motor", func(i *measure.Isolation) { i.OtherSources = " " }, false},
		{"named with off", "dc-motor", func(i *measure.Isolation) { i.OtherSources = "24 V control supply off, charger unplugged" }, true},
		{"one of two off", "dc-motor", func(i *measure.Isolation) { i.OtherSources = "24 V control supply off; charger" }, false},
		{"in the future", "dc-motor", func(i *measure.Isolation) { i.At = at(t, "11:00") }, false},
		{"without a time", "dc-motor", func(i *measure.Isolation) { i.At = time.Time{} }, false},
	} {
		c := parse(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: "+row.load+"}\nbus: {highest: 60 V}", "")
		i := sound
		i.At = at(t, "09:40")
		row.change(&i)
		c.Safety.Isolation = []measure.Isolation{i}
		for _, need := range []Need{NeedDeadCheck, NeedDischarge} {
			d := Check(c, Work{Need: need}, at(t, "10:00"), Evidence{})
			if d.Allowed != row.allowed {
				t.Errorf("%s, %s: allowed %v, missing %+v", row.name, need, d.Allowed, d.Missing)
			}
			if !row.allowed && d.Missing[0].Point != 0 {
				t.Errorf("%s: hold point %d", row.name, d.Missing[0].Point)
			}
		}
	}
}

// What was energised or linked, and when, against an isolation at 09:40 and checks at 10:07, asked at 10:12.
func TestOrderInTime(t *testing.T) {
	for _, row := range []struct {
		name   string
		change func(s *measure.Safety)
		extra  []string // observations of powered tests
		step   bool     // a dead check may be offered
		ohms   bool
	}{
		{"nothing happened", func(s *measure.Safety) {}, nil, true, true},
		{"energised before the isolation", energise("09:30"), nil, true, true},
		{"energised at the isolation", energise("09:40"), nil, false, false},
		{"energised between isolation and check", energise("10:06"), nil, false, false},
		{"energised at the check", energise("10:07"), nil, false, false},
		{"energised after the check", energise("10:10"), nil, false, false},
		{"energised in the future", energise("11:00"), nil, false, false},
		{"energised at no time", func(s *measure.Safety) { s.Energised = append(s.Energised, measure.Energised{What: "shaft"}) }, nil, false, false},
		{"powered observation before the isolation", func(s *measure.Safety) {}, []string{"09:00"}, true, true},
		{"powered observation after the check", func(s *measure.Safety) {}, []string{"10:10"}, false, false},
		{"energised, isolated again, not checked again", isolatedAgain("10:08", "10:09"), nil, true, false},
		{"energised, isolated again, checked again", func(s *measure.Safety) {
			isolatedAgain("10:08", "10:09")(s)
			s.DeadChecks = append(s.DeadChecks, deadCheck(t, "bus", "10:10"))
		}, nil, true, true},
		{"isolation broken and restored, not checked again", func(s *measure.Safety) {
			s.Isolation = append(s.Isolation, measure.Isolation{Motor: "connected", OtherSources: "none", At: at(t, "10:08")}, sound(t, "10:09"))
		}, nil, true, false},
		{"isolation broken", func(s *measure.Safety) {
			s.Isolation = append(s.Isolation, measure.Isolation{Motor: "unplugged", OtherSources: "none", At: at(t, "10:08")})
		}, nil, false, false},
		{"isolation stated again after the check", func(s *measure.Safety) { s.Isolation = append(s.Isolation, sound(t, "10:09")) }, nil, true, true},
		{"isolated only after the check", func(s *measure.Safety) { s.Isolation = []measure.Isolation{sound(t, "10:09")} }, nil, true, false},
		{"isolated at the check", func(s *measure.Safety) { s.Isolation = []measure.Isolation{sound(t, "10:07")} }, nil, true, true},
		{"link fitted", func(s *measure.Safety) { s.Links = append(s.Links, measure.Link{Fitted: at(t, "10:10")}) }, nil, true, false},
		{"link taken off after the check", func(s *measure.Safety) {
			s.Links = append(s.Links, measure.Link{Fitted: at(t, "10:08"), Removed: at(t, "10:09")})
		}, nil, true, false},
		{"link taken off at the check", func(s *measure.Safety) { s.Links[0].Removed = at(t, "10:07") }, nil, true, false},
		{"link taken off in the future", func(s *measure.Safety) { s.Links[0].Removed = at(t, "10:30") }, nil, true, false},
		{"link taken off before it was fitted", func(s *measure.Safety) { s.Links[0].Removed = at(t, "09:00") }, nil, true, false},
		{"a later check reads 30 V", func(s *measure.Safety) {
			d := deadCheck(t, "bus", "10:09")
			d.DC = volts(30)
			s.DeadChecks = append(s.DeadChecks, d)
		}, nil, true, false},
		{"an earlier check read 30 V", func(s *measure.Safety) {
			d := deadCheck(t, "bus", "10:06")
			d.DC = volts(30)
			s.DeadChecks = append(s.DeadChecks, d)
		}, nil, true, true},
		{"a later entry reads 30 V in the future", func(s *measure.Safety) {
			d := deadCheck(t, "bus", "17:09")
			d.DC = volts(30)
			s.DeadChecks = append(s.DeadChecks, d)
		}, nil, true, false},
		{"a good check in the future beside the good one", func(s *measure.Safety) {
			s.DeadChecks = append(s.DeadChecks, deadCheck(t, "bus", "17:09"))
		}, nil, true, true},
		{"no check", func(s *measure.Safety) { s.DeadChecks = nil }, nil, true, false},
		{"no isolation", func(s *measure.Safety) { s.Isolation = nil }, nil, false, false},
	} {
		c := bench(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 60 V, capacitance: 10 mF}")
		c.Safety.DeadChecks = c.Safety.DeadChecks[:1]
		row.change(&c.Safety)
		var powered []time.Time
		for _, clock := range row.extra {
			powered = append(powered, at(t, clock))
		}
		now := at(t, "10:12")
		if d := Check(c, Work{Need: NeedDeadCheck}, now, Evidence{Powered: powered}); d.Allowed != row.step {
			t.Errorf("%s: dead check allowed %v, missing %+v", row.name, d.Allowed, d.Missing)
		}
		if d := Check(c, Work{Need: NeedDead}, now, Evidence{Powered: powered}); d.Allowed != row.ohms {
			t.Errorf("%s: ohms allowed %v, missing %+v", row.name, d.Allowed, d.Missing)
		}
	}
}

func sound(t testing.TB, clock string) measure.Isolation {
	return measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "none", At: at(t, clock)}
}

func energise(clock string) func(*measure.Safety) {
	return func(s *measure.Safety) {
		moment, err := time.Parse(time.RFC3339, "2026-12-01T"+clock+":00+01:00")
		if err == nil {
			s.Energised = append(s.Energised, measure.Energised{What: "source", At: moment})
		}
	}
}

func isolatedAgain(energised, isolated string) func(*measure.Safety) {
	return func(s *measure.Safety) {
		energise(energised)(s)
		moment, err := time.Parse(time.RFC3339, "2026-12-01T"+isolated+":00+01:00")
		if err == nil {
			s.Isolation = append(s.Isolation, measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "none", At: moment})
		}
	}
}

func TestWhatIsNotKnownIsNeverGiven(t *testing.T) {
	c := bench(t, wholeBoard)
	for _, w := range []Work{{Need: ""}, {Need: "ohms"}, {NeedQuestion, "hammer"}, {NeedDead, "hammer"}, {NeedQuestion, ToolScope}, {NeedQuestion, ToolInjection},
		{NeedFull, ToolInjection}, {NeedFull, ToolInsulation}, {NeedDead, ToolDoublePulse}, {NeedControlPower, ToolDoublePulse}, {NeedDeadCheck, ToolScope}} {
		d := Check(c, w, at(t, "10:12"), Evidence{})
		if d.Allowed || len(d.Missing) != 1 || d.Missing[0].Unlock == "" {
			t.Errorf("%+v: %+v", w, d.Missing)
		}
	}
	if d := Check(nil, Work{Need: NeedQuestion}, at(t, "10:12"), Evidence{}); d.Allowed {
		t.Error("allowed without a case")
	}
	if d := Check(&measure.Case{}, Work{Need: NeedQuestion}, at(t, "10:12"), Evidence{}); !d.Allowed {
		t.Errorf("a question needs nothing: %+v", d.Missing)
	}
}

func TestBetweenFiveAndFiftyVolts(t *testing.T) {
	for _, row := range []struct {
		volt  float64
		board string
		want  string
	}{
		{4.9, "supply: battery", "dead"},
		{12, "supply: rectified-mains", "may be touched, no ohms"},
		{12, "supply: battery", "burn hazard"},
		{49.9, "supply: battery", "may be touched, no ohms"},
		{50, "supply: battery", "do not touch"},
		{-310, "supply: battery", "do not touch"},
	} {
		c := bench(t, "topology: low-side-chopper\n"+row.board+"\nload: {kind: resistive}\nbus: {highest: 60 V, capacitance: 1 mF}")
		c.Safety.DeadChecks[0].DC = volts(row.volt)
		d := Check(c, Work{Need: NeedDead}, at(t, "10:12"), Evidence{})
		if got := d.Status.Points[0].Touch; !strings.Contains(got, row.want) {
			t.Errorf("%g V, %s: %q does not say %q", row.volt, row.board, got, row.want)
		}
		if d.Status.Points[0].Dead != (row.volt <= 5 && row.volt >= -5) {
			t.Errorf("%g V: dead %v", row.volt, d.Status.Points[0].Dead)
		}
	}
}

func TestReadingsOutsideTheirHoldPointAreMarked(t *testing.T) {
	c := bench(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 60 V, capacitance: 10 mF}")
	// what comes after a reading must not mark it
	energise("10:30")(&c.Safety)
	c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "10:20"), Removed: at(t, "10:28")})
	c.Safety.Isolation = append(c.Safety.Isolation, measure.Isolation{Motor: "connected", OtherSources: "charger", At: at(t, "10:29")})
	live := deadCheck(t, "bus", "10:30")
	live.DC = volts(48)
	c.Safety.DeadChecks = append(c.Safety.DeadChecks, live)
	powered := []time.Time{at(t, "10:31")}
	for _, row := range []struct {
		name    string
		need    Need
		o       measure.Observation
		outside bool
	}{
		{"within", NeedDead, measure.Observation{Result: "shorted", At: at(t, "10:12")}, false},
		{"check expired", NeedDead, measure.Observation{Result: "shorted", At: at(t, "10:18")}, true},
		{"before the check", NeedDead, measure.Observation{Result: "shorted", At: at(t, "10:06")}, true},
		{"after it was energised", NeedDead, measure.Observation{Result: "shorted", At: at(t, "10:31")}, true},
		{"no time", NeedDead, measure.Observation{Result: "shorted"}, true},
		{"skipped", NeedDead, measure.Observation{Answer: "skipped", At: at(t, "10:18")}, false},
		{"question", NeedQuestion, measure.Observation{Result: "turn-off"}, false},
		{"powered", NeedLowBus, measure.Observation{Result: "clean", At: at(t, "10:12")}, true},
	} {
		outside, missing := OutsideHoldPoint(c, row.o, Work{Need: row.need}, Evidence{Powered: powered})
		if outside != row.outside || outside != (len(missing) > 0) {
			t.Errorf("%s: outside %v, missing %+v", row.name, outside, missing)
		}
	}
}

func TestALinkThatComesOffInTheFutureIsFitted(t *testing.T) {
	c := bench(t, "topology: low-side-chopper\nsupply: battery")
	c.Safety.Links[0].Removed = at(t, "10:30")
	if s := StatusOf(c, at(t, "10:12"), Evidence{}); !s.Link.Fitted || s.Dead {
		t.Errorf("link %+v, dead %v", s.Link, s.Dead)
	}
	if d := Check(c, Work{Need: NeedFull}, at(t, "10:12"), Evidence{}); len(d.Missing) < 2 || d.Missing[0].Point != 2 {
		t.Errorf("a fitted link stands against power too: %+v", d.Missing)
	}
}
