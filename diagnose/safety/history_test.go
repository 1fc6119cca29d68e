package safety

import (
	"math"
	"slices"
	"testing"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"

	"pgregory.net/rapid"
)

// statement is a statement of isolation of which the test knows by itself whether it is sound.
type statement struct {
	measure.Isolation
	sound bool
}

var statements = []statement{
	{measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "none"}, true},
	{measure.Isolation{Locked: true, Motor: "shaft-locked", OtherSources: "24 V supply off"}, true},
	{measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "charger off, fan supply unplugged"}, true},
	{measure.Isolation{Locked: false, Motor: "unplugged", OtherSources: "none"}, false},
	{measure.Isolation{Locked: true, Motor: "connected", OtherSources: "none"}, false},
	{measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: "24 V supply"}, false},
	{measure.Isolation{Locked: true, Motor: "unplugged", OtherSources: ""}, false},
}

// boards with the points that have to be dead, the motor terminals apart.
var boards = []struct {
	text   string
	points []string
	phases bool
}{
	{"topology: low-side-chopper\nsupply: battery\nload: {kind: resistive}\nbus: {highest: 60 V}", []string{"bus"}, false},
	{"topology: low-side-chopper\nsupply: battery\nload: {kind: dc-motor}\nbus: {highest: 60 V}", []string{"bus"}, true},
	{"topology: half-bridge\nsupply: rectified-mains\nload: {kind: dc-motor}\nbus: {highest: 390 V, halves: yes}",
		[]string{"bus", "upper-half", "lower-half", "auxiliary"}, true},
}

// event is one thing that happens to the board, in a replay of the record.
type event struct {
	at   time.Time
	rank int // within one moment: what speaks against a dead board comes last
	what string
	k    int
}

// replayed is the state of the board after everything that has come to be was played in order. It restates the hold
// points as a story, where the package under test asks for times.
type replayed struct {
	isolated, unplugged bool
	proof               map[string]*measure.DeadCheck
}

func replay(s measure.Safety, powered []time.Time, soundAt []bool, now time.Time) (replayed, bool) {
	events, valid := timeline(s, powered, soundAt, now)
	r := replayed{proof: map[string]*measure.DeadCheck{}}
	for _, e := range events {
		switch e.what {
		case "sound":
			if !r.isolated {
				r.isolated, r.proof = true, map[string]*measure.DeadCheck{}
			}
			r.unplugged = s.Isolation[e.k].Motor == "unplugged"
		case "check":
			r.proof[s.DeadChecks[e.k].Point] = &s.DeadChecks[e.k]
		case "power", "source", "unsound":
			r.isolated, r.proof = false, map[string]*measure.DeadCheck{}
		case "removed":
			r.proof = map[string]*measure.DeadCheck{}
		}
	}
	return r, valid
}

// timeline sorts what has come to be; valid is false where something speaks against the board at no known time.
func timeline(s measure.Safety, powered []time.Time, soundAt []bool, now time.Time) (events []event, valid bool) {
	valid = true
	add := func(moment time.Time, rank int, what string, k int) {
		gone := !moment.IsZero() && !moment.After(now)
		if gone {
			events = append(events, event{moment, rank, what, k})
		} else if rank >= 2 {
			valid = false
		}
	}
	for k, i := range s.Isolation {
		if soundAt[k] {
			add(i.At, 0, "sound", k)
		} else {
			add(i.At, 2, "unsound", k)
		}
	}
	for k, d := range s.DeadChecks {
		if math.Abs(d.AC.Value) > 5 { // a bank gives no AC
			add(d.At, 2, "source", k)
			continue
		}
		add(d.At, 1, "check", k)
	}
	for k, e := range s.Energised {
		add(e.At, 2, "power", k)
	}
	for k, p := range powered {
		add(p, 2, "power", k)
	}
	for k, l := range s.Links {
		add(l.Removed, 2, "removed", k)
		if l.Removed.Before(l.Fitted) {
			valid = false
		}
	}
	slices.SortStableFunc(events, func(a, b event) int {
		if c := a.at.Compare(b.at); c != 0 {
			return c
		}
		return a.rank - b.rank
	})
	return events, valid
}

// proves restates what a dead check must read, and how young it must be.
func proves(d *measure.DeadCheck, now time.Time) bool {
	age := now.Sub(d.At)
	return d.MeterProved && d.AC.Unit == quantity.Volt &&
		math.Abs(d.DC.Value) <= 5 && math.Abs(d.AC.Value) <= 5 && age >= 0 && age < 10*time.Minute
}

// denied restates the one rule that goes by the order of the file: a reading above 5 V from the future stands against
// its point until a later entry has become the last one.
func denied(s measure.Safety, point string, now time.Time) bool {
	for j, bad := range s.DeadChecks {
		future := bad.At.IsZero() || bad.At.After(now)
		high := math.Abs(bad.DC.Value) > 5 || math.Abs(bad.AC.Value) > 5
		if bad.Point != point || !future || !high {
			continue
		}
		answered := false
		for k := j + 1; k < len(s.DeadChecks); k++ {
			answered = answered || isLast(s.DeadChecks[:k+1], point, now)
		}
		if !answered {
			return true
		}
	}
	return false
}

// isLast tells whether the last entry of a list is also the last in time of those at a point that have come to be.
func isLast(list []measure.DeadCheck, point string, now time.Time) bool {
	e := list[len(list)-1]
	if e.Point != point || e.At.IsZero() || e.At.After(now) {
		return false
	}
	for _, d := range list {
		if d.Point == point && !d.At.After(now) && d.At.After(e.At) {
			return false
		}
	}
	return true
}

// drawHistory makes a record that is mostly in good order, so that what is allowed comes up as well.
func drawHistory(t *rapid.T, origin time.Time, points []string) (s measure.Safety, soundAt []bool, powered []time.Time) {
	// moments lie in the whole span, half of them in the part of it where good order would have them
	moment := func(label string, low, high int) time.Time {
		switch rapid.IntRange(0, 80).Draw(t, label+" how") % 4 {
		case 0, 1:
			return origin.Add(time.Duration(rapid.IntRange(low, high).Draw(t, label)) * time.Minute)
		case 2:
			if rapid.IntRange(0, 20).Draw(t, label+" missing") == 20 {
				return time.Time{}
			}
		}
		return origin.Add(time.Duration(rapid.IntRange(0, 24).Draw(t, label)) * time.Minute)
	}
	for n := 1 + rapid.IntRange(0, 4).Draw(t, "isolations")/2 - rapid.IntRange(0, 9).Draw(t, "no isolation")/9; n > 0; n-- {
		pick := rapid.IntRange(0, 3*len(statements)).Draw(t, "statement")
		if pick >= len(statements) {
			pick %= 3 // the sound ones
		}
		i := statements[pick].Isolation
		i.At = moment("isolated at", 2, 6)
		s.Isolation, soundAt = append(s.Isolation, i), append(soundAt, statements[pick].sound)
	}
	for _, point := range append(points, "bus", "elsewhere") {
		for n := 1 + rapid.IntRange(0, 4).Draw(t, "checks")/3 - rapid.IntRange(0, 9).Draw(t, "no check")/9; n > 0; n-- {
			d := measure.DeadCheck{Point: point, DC: volts(0.3), AC: volts(0), MeterProved: true, At: moment("checked at", 8, 14)}
			switch rapid.IntRange(0, 14).Draw(t, "reading") {
			case 10:
				d.DC = volts(-30)
			case 11:
				d.AC = volts(5.5)
			case 12:
				d.MeterProved = false
			case 13:
				d.AC = quantity.Quantity{}
			case 14:
				d.DC = volts(5)
			}
			s.DeadChecks = append(s.DeadChecks, d)
		}
	}
	for n := rapid.IntRange(0, 3).Draw(t, "links") / 3; n > 0; n-- {
		s.Links = append(s.Links, measure.Link{Fitted: moment("fitted at", 2, 5), Removed: moment("removed at", 5, 8)})
	}
	for n := rapid.IntRange(0, 3).Draw(t, "energised") / 3; n > 0; n-- {
		s.Energised = append(s.Energised, measure.Energised{What: "source", At: moment("energised at", 0, 2)})
	}
	for n := rapid.IntRange(0, 3).Draw(t, "powered") / 3; n > 0; n-- {
		powered = append(powered, moment("powered at", 0, 2))
	}
	return s, soundAt, powered
}

// Random records: what may be offered is exactly what a replay of the record allows, and the marking of a reading of
// that moment agrees with it wherever nothing lies in the future.
func TestRandomHistoriesAgreeWithAReplay(t *testing.T) {
	var parsed []measure.Board
	for _, b := range boards {
		parsed = append(parsed, boardOf(t, b.text))
	}
	origin := at(t, "10:00")
	tried, allowed := 0, 0
	for tried < 2000 { // rapid runs a hundred histories a check
		rapid.Check(t, func(t *rapid.T) {
			k := rapid.IntRange(0, len(boards)-1).Draw(t, "board")
			c := &measure.Case{Board: parsed[k]}
			need := append([]string(nil), boards[k].points...)
			checked := need
			if boards[k].phases {
				checked = append(slices.Clone(need), "phases")
			}
			var soundAt []bool
			var powered []time.Time
			c.Safety, soundAt, powered = drawHistory(t, origin, checked)
			for j, i := range c.Safety.Isolation { // a load that cannot turn may stay connected
				soundAt[j] = soundAt[j] || (i.Motor == "connected" && !boards[k].phases)
			}
			now := origin.Add(time.Duration(rapid.IntRange(10, 20).Draw(t, "now")) * time.Minute)

			r, valid := replay(c.Safety, powered, soundAt, now)
			linked := slices.ContainsFunc(c.Safety.Links, func(l measure.Link) bool {
				return l.Removed.IsZero() || l.Removed.After(now) || l.Removed.Before(l.Fitted)
			})
			isolated := r.isolated && !undatedPower(c.Safety, powered, soundAt, now)
			if boards[k].phases && !(isolated && r.unplugged) {
				need = append(need, "phases")
			}
			dead := isolated && valid && !linked
			for _, point := range need {
				dead = dead && r.proof[point] != nil && proves(r.proof[point], now) && !denied(c.Safety, point, now)
			}
			tried++
			if dead {
				allowed++
			}
			compare(t, c, now, powered, isolated, dead)
		})
	}
	t.Logf("%d histories, ohms allowed in %d", tried, allowed)
	if allowed < 100 {
		t.Errorf("only %d of %d histories allow ohms: the test says too little about them", allowed, tried)
	}
}

func undatedPower(s measure.Safety, powered []time.Time, soundAt []bool, now time.Time) bool {
	onlyPower := measure.Safety{Isolation: s.Isolation, Energised: s.Energised}
	for _, d := range s.DeadChecks {
		if math.Abs(d.AC.Value) > 5 {
			onlyPower.DeadChecks = append(onlyPower.DeadChecks, d)
		}
	}
	_, valid := timeline(onlyPower, powered, soundAt, now)
	return !valid
}

func compare(t *rapid.T, c *measure.Case, now time.Time, powered []time.Time, isolated, dead bool) {
	want := map[Need]bool{NeedQuestion: true, NeedDeadCheck: isolated, NeedDischarge: isolated, NeedDead: dead}
	for _, need := range Needs() {
		d := Check(c, Work{Need: need}, now, Evidence{Powered: powered})
		if d.Allowed != want[need] {
			t.Fatalf("%s: allowed %v, the replay says %v; missing %+v\n%+v powered %v now %s", need, d.Allowed, want[need], d.Missing, c.Safety, powered, now)
		}
		if d.Allowed != (len(d.Missing) == 0) {
			t.Fatalf("%s: allowed %v with %+v", need, d.Allowed, d.Missing)
		}
		for _, m := range d.Missing {
			if m.Text == "" || m.Unlock == "" || m.Point < 0 || m.Point > 6 {
				t.Fatalf("incomplete: %+v", m)
			}
		}
	}
	outside, _ := OutsideHoldPoint(c, measure.Observation{Result: "shorted", At: now}, Work{Need: NeedDead}, Evidence{Powered: powered})
	if dead && outside {
		t.Fatalf("ohms were allowed at %s, and a reading of that moment is marked", now)
	}
}
