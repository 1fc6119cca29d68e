package safety

import (
	"strings"
	"testing"
	"time"

	"drivemend/measure"

	"pgregory.net/rapid"
)

func TestOtherSourcesAreNamedAndOff(t *testing.T) {
	for text, sound := range map[string]bool{
		"none": true, " None ": true,
		"24 V control supply off":                               true,
		"charger is off":                                        true,
		"charger switched off":                                  true,
		"Battery disconnected":                                  true,
		"24 V fan supply off, charger unplugged":                true,
		"24 V supply off; charger removed and battery isolated": true,
		"24 V supply off,\ncharger off":                         true,
		"24V/5V-supply off":                                     true,

		"K3 off":                 true,
		"24 V off":               true,
		"UPS off, solar PS2 off": true,
		"drive 2 shared bus off": true,

		"24 V on": false, "none off": false, "charger none": false, "none, charger on": false, "charger off on": false,
		"charger sometimes off": false, "charger usually off": false, "charger hardly off": false, "charger supposedly off": false,
		"make sure charger off": false, "turn charger off": false, "check charger off": false, "someone switch charger off": false,
		"charger needs switched off": false, "charger is is off": false, "k3 charger isn't off": false, "charger un-off": false, "n/a off": false,
		"switch off": false, "power off": false, "motor off": false, "low voltage off": false, "24v? off": false,
		"": false, " ": false, ",": false, "off": false, "all off": false, "both off": false, "everything off": false,
		"charger": false, "charger on": false, "unknown": false, "no": false, "nothing": false,
		"charger, 24 V supply, both off":          false,
		"24 V supply, off":                        false,
		"24 V supply off; charger":                false,
		"24 V supply off, charger on":             false,
		"24 V supply off and":                     false,
		"cannot be switched off":                  false,
		"charger cannot be switched off":          false,
		"battery can be disconnected":             false,
		"nothing off":                             false,
		"nothing is off":                          false,
		"turned off by nobody":                    false,
		"charger turned off":                      false,
		"will be off soon":                        false,
		"charger will be off":                     false,
		"charger off soon":                        false,
		"was off yesterday":                       false,
		"charger was off":                         false,
		"charger switched off?":                   false,
		"charger? off":                            false,
		"charger off?":                            false,
		"charger not off":                         false,
		"charger not-yet off":                     false,
		"charger (not) off":                       false,
		"charger isn't off":                       false,
		"charger still on, 24 V supply off":       false,
		"charger maybe off":                       false,
		"charger off tomorrow":                    false,
		"one two three four five off":             false,
		"24 off":                                  false,
		"charger off, none":                       false,
		"24 V supply off but charger unplugged":   false,
		"charger off\nbattery":                    false,
		"charger never switched off":              false,
		"charger is not switched off":             false,
		"nobody has switched off the charger":     false,
		"charger off when the isolator is opened": false,
	} {
		fault := sourcesFault(text)
		if (fault == "") != sound {
			t.Errorf("%q: sound %v, fault %q", text, fault == "", fault)
		}
	}
	missing := isolationFaults([]measure.Board{{}}, &measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "cannot be switched off"})
	if len(missing) != 1 || !strings.Contains(missing[0].Unlock, "24 V control supply off, charger unplugged") || !strings.Contains(missing[0].Unlock, "none") {
		t.Errorf("it does not say what to write: %+v", missing)
	}
}

func FuzzOtherSources(f *testing.F) {
	for _, seed := range []string{"none", "24 V supply off, charger unplugged", "and and off", "cannot be off", ",;", "\xff off", "é off"} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if sourcesFault(text) != "" {
			return
		}
		lower := strings.ToLower(text)
		if strings.Contains(lower, "?") || strings.TrimSpace(lower) == "" {
			t.Errorf("%q is taken as isolated", text)
		}
		for _, w := range strings.Fields(strings.NewReplacer(",", " ", ";", " ").Replace(lower)) {
			if w == "not" || w == "on" || w == "cannot" || w == "will" || w == "was" {
				t.Errorf("%q is taken as isolated", text)
			}
		}
	})
}

// A record with an isolation at one moment and sound statements after it, asked at another.
func TestAnIsolationIsLookedAtAgain(t *testing.T) {
	moment := func(text string) time.Time {
		m, err := time.Parse(time.RFC3339, text)
		if err != nil {
			t.Fatal(err)
		}
		return m
	}
	for _, row := range []struct {
		name       string
		statements []string
		now        string
		since      string // "" when it counts no more
	}{
		{"the same hour", []string{"2026-12-01T09:40:00+01:00"}, "2026-12-01T10:00:00+01:00", "2026-12-01T09:40:00+01:00"},
		{"eight hours", []string{"2026-12-01T09:40:00+01:00"}, "2026-12-01T17:40:00+01:00", "2026-12-01T09:40:00+01:00"},
		{"a second more", []string{"2026-12-01T09:40:00+01:00"}, "2026-12-01T17:40:01+01:00", ""},
		{"the next morning", []string{"2026-12-01T17:40:00+01:00"}, "2026-12-02T07:30:00+01:00", ""},
		{"an hour later, but the next day", []string{"2026-12-01T23:30:00+01:00"}, "2026-12-02T00:30:00+01:00", ""},
		{"written in another zone", []string{"2026-12-01T23:30:00Z"}, "2026-12-02T01:00:00+01:00", "2026-12-01T23:30:00Z"},
		{"a week", []string{"2026-12-01T09:40:00+01:00"}, "2026-12-08T09:41:00+01:00", ""},
		{"looked at again in time", []string{"2026-12-01T08:00:00+01:00", "2026-12-01T15:00:00+01:00"}, "2026-12-01T20:00:00+01:00", "2026-12-01T08:00:00+01:00"},
		{"looked at again too late", []string{"2026-12-01T08:00:00+01:00", "2026-12-01T17:00:00+01:00"}, "2026-12-01T20:00:00+01:00", "2026-12-01T17:00:00+01:00"},
		{"the next day, written in another zone", []string{"2026-12-01T23:30:00+01:00", "2026-12-01T18:30:00-05:00"}, "2026-12-02T01:00:00+01:00", "2026-12-01T18:30:00-05:00"},
		{"looked at again the next day", []string{"2026-12-01T17:00:00+01:00", "2026-12-02T07:30:00+01:00"}, "2026-12-02T08:00:00+01:00", "2026-12-02T07:30:00+01:00"},
	} {
		c := parse(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 60 V}", "")
		for _, s := range row.statements {
			i := sound(t, "09:40")
			i.At = moment(s)
			c.Safety.Isolation = append(c.Safety.Isolation, i)
		}
		now := moment(row.now)
		d := Check(c, Work{Need: NeedDeadCheck}, now, Evidence{})
		i := d.Status.Isolation
		if i.Isolated != (row.since != "") || i.Reconfirm == i.Isolated || d.Allowed != i.Isolated {
			t.Errorf("%s: isolated %v, to look at again %v, allowed %v", row.name, i.Isolated, i.Reconfirm, d.Allowed)
		}
		if row.since != "" && !i.Since.Equal(moment(row.since)) {
			t.Errorf("%s: since %s, want %s", row.name, i.Since, row.since)
		}
		if want := now.Sub(moment(row.statements[len(row.statements)-1])); i.Age != want {
			t.Errorf("%s: age %s, want %s", row.name, i.Age, want)
		}
		for _, need := range []Need{NeedDeadCheck, NeedDischarge, NeedDead} {
			m := Check(c, Work{Need: need}, now, Evidence{}).Missing
			if row.since == "" && (len(m) == 0 || m[0].Point != 0 || !strings.Contains(m[0].Unlock, "look at the lock again and state the isolation anew")) {
				t.Errorf("%s, %s: %+v", row.name, need, m)
			}
		}
	}
}

// However the lock was looked at: the board counts as cut off exactly when the last look is neither old nor of another day.
func TestOnlyTheLastLookDecides(t *testing.T) {
	origin := at(t, "00:00")
	b := boardOf(t, "topology: low-side-chopper\nsupply: battery")
	rapid.Check(t, func(t *rapid.T) {
		c := &measure.Case{Board: b}
		now := rapid.IntRange(0, 4000).Draw(t, "now")
		last := -1
		for _, m := range rapid.SliceOfN(rapid.IntRange(0, 4000), 0, 5).Draw(t, "looks") {
			c.Safety.Isolation = append(c.Safety.Isolation, measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "none", At: origin.Add(time.Duration(m) * time.Minute)})
			if m <= now {
				last = max(last, m)
			}
		}
		want := last >= 0 && now-last <= 480 && now/1440 == last/1440
		if i := StatusOf(c, origin.Add(time.Duration(now)*time.Minute), Evidence{}).Isolation; i.Isolated != want || (i.Isolated && i.Since.After(i.Last.At)) {
			t.Fatalf("now %d, last look %d: %+v", now, last, i)
		}
	})
}

// AC at a store, against an isolation at 09:40, asked at 10:12.
func TestACMeansASourceIsStillConnected(t *testing.T) {
	const board = "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 400 V, capacitance: 10 mF}"
	for _, row := range []struct {
		name   string
		dc, ac float64
		after  []string // isolations stated after it
		again  bool     // and checked again at 10:10
		step   bool     // a dead check or a discharge may be offered
		ohms   bool
	}{
		{"5 V AC", 0.4, 5, nil, false, true, true},
		{"above 5 V AC", 0.4, 5.1, nil, false, false, false},
		{"24 V AC and a charged bank", 310, 24, nil, false, false, false},
		{"checked again without isolating", 0.4, 24, nil, true, false, false},
		{"isolated at the check", 0.4, 24, []string{"10:07"}, true, false, false},
		{"isolated after it", 0.4, 24, []string{"10:09"}, false, true, false},
		{"isolated after it and checked again", 0.4, 24, []string{"10:09"}, true, true, true},
	} {
		c := bench(t, board)
		c.Safety.DeadChecks = c.Safety.DeadChecks[:1]
		c.Safety.DeadChecks[0].DC, c.Safety.DeadChecks[0].AC = volts(row.dc), volts(row.ac)
		for _, clock := range row.after {
			c.Safety.Isolation = append(c.Safety.Isolation, sound(t, clock))
		}
		if row.again {
			c.Safety.DeadChecks = append(c.Safety.DeadChecks, deadCheck(t, "bus", "10:10"))
		}
		now := at(t, "10:12")
		for _, need := range []Need{NeedDeadCheck, NeedDischarge} {
			if d := Check(c, Work{Need: need}, now, Evidence{}); d.Allowed != row.step || (!row.step && d.Missing[0].Point != 0) {
				t.Errorf("%s, %s: allowed %v, missing %+v", row.name, need, d.Allowed, d.Missing)
			}
		}
		d := Check(c, Work{Need: NeedDead}, now, Evidence{})
		if d.Allowed != row.ohms {
			t.Errorf("%s: ohms allowed %v, missing %+v", row.name, d.Allowed, d.Missing)
		}
		text := missingText(d.Missing)
		if row.ac > 5 && !row.again && !strings.Contains(text, "AC "+format(row.ac, "V")+": a source is still connected; isolate again and find it") {
			t.Errorf("%s: %s", row.name, text)
		}
		if row.ac > 5 && strings.Contains(text, "through the resistor") {
			t.Errorf("%s leads to the resistor: %s", row.name, text)
		}
	}
	c := bench(t, board)
	c.Safety.DeadChecks[0].AC = volts(24)
	if p := StatusOf(c, at(t, "10:12"), Evidence{}).Points[0]; !strings.Contains(p.Touch, "do not touch") {
		t.Errorf("24 V AC: %q", p.Touch)
	}
	c.Safety.DeadChecks[0].At = time.Time{}
	if d := Check(c, Work{Need: NeedDeadCheck}, at(t, "10:12"), Evidence{}); d.Allowed {
		t.Error("AC read at no stated time is let through")
	}
}

func TestPowerWithALinkFittedNamesTheLink(t *testing.T) {
	c := bench(t, wholeBoard)
	c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "10:10")})
	for _, need := range []Need{NeedControlPower, NeedLowBus, NeedFull} {
		if d := Check(c, Work{Need: need}, at(t, "10:12"), Evidence{}); !names(d.Missing, 2, "shorting link") || !names(d.Missing, 3, "") {
			t.Errorf("%s: %+v", need, d.Missing)
		}
		outside, m := OutsideHoldPoint(c, measure.Observation{Result: "clean", At: at(t, "10:12")}, Work{Need: need}, Evidence{})
		if !outside || !names(m, 2, "shorting link") || !names(m, 3, "") {
			t.Errorf("reading under %s: %+v", need, m)
		}
		if _, m := OutsideHoldPoint(c, measure.Observation{Result: "clean", At: at(t, "10:08")}, Work{Need: need}, Evidence{}); names(m, 2, "") {
			t.Errorf("reading under %s before the link was fitted: %+v", need, m)
		}
	}
}

func names(missing []Missing, point int, text string) bool {
	for _, m := range missing {
		if m.Point == point && strings.Contains(m.Text, text) {
			return true
		}
	}
	return false
}

// Each thing that is missing says which command enters it.
func TestUnlocksSayHow(t *testing.T) {
	c := bench(t, "topology: three-phase\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 700 V, capacitance: 2200 µF}")
	now := at(t, "10:12")
	c.Safety.DeadChecks = nil
	open := missingText(Check(c, Work{Need: NeedDead}, now, Evidence{}).Missing)
	c.Safety.Links = append(c.Safety.Links, measure.Link{Fitted: at(t, "10:10")})
	linked := missingText(Check(c, Work{Need: NeedDead}, now, Evidence{}).Missing)
	c.Safety.Isolation = nil
	for _, row := range []struct{ text, want string }{
		{open, "drivemend safe dead-check CASE bus --dc … --ac … --proved"},
		{open, "drivemend safe dead-check CASE upper-half --dc … --ac … --proved"},
		{open, "state bus.halves: no (drivemend enter CASE board.bus.halves no)"},
		{linked, "drivemend safe link CASE removed"},
		{missingText(Check(c, Work{Need: NeedDischarge}, now, Evidence{}).Missing), "drivemend safe isolation CASE --locked --motor unplugged --other-sources none"},
	} {
		if !strings.Contains(row.text, row.want) {
			t.Errorf("no %q in\n%s", row.want, row.text)
		}
	}
}

func TestMomentsOfOneMinuteShowTheirSeconds(t *testing.T) {
	c := bench(t, "topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 60 V, capacitance: 10 mF}")
	c.Safety.Links = nil
	c.Safety.DeadChecks = []measure.DeadCheck{deadCheck(t, "bus", "10:07:05")}
	c.Safety.Isolation = []measure.Isolation{sound(t, "10:07:40")}
	if text := missingText(Check(c, Work{Need: NeedDead}, at(t, "10:12"), Evidence{}).Missing); !strings.Contains(text, "the check of 2026-12-01 10:07:05 was made before the isolation of 2026-12-01 10:07:40") {
		t.Error(text)
	}
	c.Safety.Isolation = []measure.Isolation{sound(t, "10:08:40")}
	if text := missingText(Check(c, Work{Need: NeedDead}, at(t, "10:12"), Evidence{}).Missing); !strings.Contains(text, "the check of 2026-12-01 10:07 was made before the isolation of 2026-12-01 10:08") {
		t.Error(text)
	}
}
