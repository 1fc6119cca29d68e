package safety

import (
	"strings"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Words of a case file for the motor under power.
const (
	motorUncoupled = "uncoupled"
	motorWheelsUp  = "wheels-up"
)

// The highest fuses where the board does not state its own.
const (
	// controlFuse is enough for a control supply and opens long before a bus capacitor's fault current. Judgement.
	controlFuse = 3.15
	// benchFuse is what a controller maker puts in series with the bench supply: Curtis PMC 1204/1205 manual, p. 32,
	// read. For other boards, and for the full bus where nothing is stated, a judgement.
	benchFuse = 10.0
	// fuseOverRunning is the fuse over the running current: it must carry the start. Judgement.
	fuseOverRunning = 2.0
)

// FuseFor gives the highest rating of the fuse for a powered step on this board, in amperes, with its reason: 3.15 A for
// control power; on a current-limited bus 10 A, or the board's own fuse where it is smaller; on the full bus the board's
// own fuse, else twice the running current, else 10 A. Zero, of basis None, for a need without power.
func FuseFor(b measure.Board, n Need) Figure {
	own, known := positive(b, "bus.fuse")
	running, runs := positive(b, "load.running_current")
	bench := Figure{benchFuse, quantity.Ampere, Assumed, "a controller maker's bench instruction"}
	fuse := stated(b, "bus.fuse", own)
	fuse.Because = "the board's own bus fuse"
	if fuse.Basis == Assumed {
		fuse.Because += ", which is listed as assumed"
	}
	switch {
	case n == NeedControlPower:
		return Figure{controlFuse, quantity.Ampere, Assumed, "enough for a control supply; judgement"}
	case n == NeedLowBus && known && own.Value < benchFuse, n == NeedFull && known:
		return fuse
	case n == NeedLowBus:
		return bench
	case n == NeedFull && runs:
		return Figure{fuseOverRunning * running.Value, quantity.Ampere, Computed, "twice the running current, for bus.fuse is not stated; judgement"}
	case n == NeedFull:
		bench.Because = "neither bus.fuse nor load.running_current is stated: no more than on the bench; judgement"
		return bench
	}
	return Figure{Unit: quantity.Ampere}
}

// openRebuild asks for the end of the repair: before it, power goes into the fault.
func openRebuild(s scene) []Missing {
	const enter = "drivemend enter CASE rebuild.done TIME"
	switch {
	case s.done.IsZero():
		return []Missing{{3, "the repair is not stated as finished: power would go into the fault",
			"finish the repair and enter when: " + enter + "; where nothing had to be replaced, enter in the same way when that was settled"}}
	case s.done.After(s.now):
		done, _ := clocks(s.done, s.now)
		return []Missing{{3, "the repair is dated " + done + ", in the future", "correct its time: " + enter}}
	}
	return nil
}

// openStatics asks that every static test of every position passed after the rebuild. Tests that are open for the same
// reason at several positions stand in one line.
func openStatics(s scene) []Missing {
	type line struct {
		test, title, because, flags string
		positions                   []string
	}
	var lines []*line
	seen := map[string]bool{}
	for _, t := range s.evidence.Statics {
		seen[t.Position] = true
		because := s.staticFault(t)
		if because == "" {
			continue
		}
		k := 0
		for k < len(lines) && (lines[k].test != t.Test || lines[k].because != because) {
			k++
		}
		if k == len(lines) {
			lines = append(lines, &line{t.Test, t.Title, because, t.flags(), nil})
		}
		lines[k].positions = append(lines[k].positions, t.Position)
	}
	var m []Missing
	for _, l := range lines {
		m = append(m, Missing{3, "static test \"" + l.title + "\" is open at " + strings.Join(l.positions, ", ") + ": " + l.because,
			s.onceRebuilt() + "make it on the dead board and enter it for each: drivemend enter CASE " + l.test + " RESULT" + l.flags})
	}
	return append(m, s.unproved(seen)...)
}

// onceRebuilt puts the rebuild before the static tests: what is read earlier is of the board as found.
func (s scene) onceRebuilt() string {
	if s.come(s.done) {
		return ""
	}
	return "first enter rebuild.done, a reading before it does not count; then "
}

// openFailing asks that no reading since the rebuild speaks for a fault. Such a reading stands, whatever its time, until
// a good one of the same place has come to be, or a newer rebuild.
func openFailing(s scene) []Missing {
	failing := s.evidence.Failing
	for _, m := range s.evidence.Mended {
		if !s.come(m.Good) {
			f := m.Static
			f.Because += "; the good reading since " + s.dated(m.Good)
			failing = append(failing[:len(failing):len(failing)], f)
		}
	}
	var m []Missing
	for _, f := range failing {
		if f.At.IsZero() || f.At.After(s.done) {
			m = append(m, Missing{3, "\"" + f.Title + "\" speaks for a fault" + f.where() + ": " + f.Because + s.entryTime(f.At),
				"mend it, then enter rebuild.done anew, or read the same again on the dead board: drivemend enter CASE " + f.Test + " RESULT" + f.flags() +
					"; a reading of what the rebuild took out is entered with its own time (--at)"})
		}
	}
	return m
}

// where names the place of a reading in words; "" for the board as a whole.
func (s Static) where() string {
	switch {
	case s.Part != "" && s.Position != "":
		return " at " + s.Part + " (" + s.Position + ")"
	case s.Part != "" || s.Position != "":
		return " at " + s.Part + s.Position
	}
	return ""
}

// flags is how the place of a reading is entered.
func (s Static) flags() string {
	switch {
	case s.Part != "" && s.Lifted:
		return " --part " + s.Part + " --lifted"
	case s.Part != "":
		return " --part " + s.Part
	case s.Position != "":
		return " --position " + s.Position
	}
	return ""
}

// staticFault says why a static test does not count as passed; "" when it does.
func (s scene) staticFault(t Static) string {
	switch {
	case !t.Passed && t.Because == "":
		return "not passed"
	case !t.Passed:
		return t.Because
	case t.At.IsZero():
		return "its reading carries no time"
	case t.At.After(s.now):
		return "its reading " + s.dated(t.At)
	case !t.At.After(s.done):
		return "read at " + clock(t.At) + ", not after the rebuild"
	case !t.At.After(s.failedUnderPower()):
		return "read at " + clock(t.At) + ", not after the step under power that failed"
	}
	return ""
}

// unproved names the positions of the board that no static test speaks of.
func (s scene) unproved(seen map[string]bool) []Missing {
	var open []string
	for _, p := range s.board().Positions() {
		if !seen[p.Name] {
			open = append(open, p.Name)
		}
	}
	if len(open) == 0 {
		return nil
	}
	return []Missing{{3, "no static test proves position " + strings.Join(open, ", "),
		"enter a static reading for each after the repair (drivemend next CASE names it); a rule base without a test that has the key static cannot prove a position"}}
}

// openReconnection asks that whatever stays electrically connected under power was tested before. It goes by the
// statement that counts.
func openReconnection(s scene) []Missing {
	b, _ := s.statementOf(string(s.work.Need))
	if b == nil {
		return nil
	}
	var m []Missing
	if b.Motor == motorUncoupled || b.Motor == motorWheelsUp {
		m = append(m, s.untested(measure.StepMotorTested, "the motor is connected ("+b.Motor+")", "unplug the motor")...)
		m = append(m, s.untested(measure.StepCableTested, "the motor cable is connected ("+b.Motor+")", "unplug the motor at the board")...)
	}
	if hasBrake(s) && b.BrakeResistor == "connected" {
		m = append(m, s.untested(measure.StepBrakeResistorTested, "the brake resistor is connected", "disconnect the brake resistor")...)
	}
	return m
}

func (s scene) untested(step, what, instead string) []Missing {
	e := s.entry(step)
	if e != nil && e.Result == resultDone {
		return nil
	}
	why := " is not on record"
	if e != nil {
		why = " is on record as " + e.Result + s.entryTime(e.At)
	}
	r, _ := recordStep(step)
	return []Missing{{3, what + ", but \"" + r.Title + "\"" + why,
		"test it and enter: drivemend record step CASE " + step + " done; or " + instead + " and state that anew: " + s.command(string(s.work.Need), measure.Before{})}}
}

func (s scene) entryTime(at time.Time) string {
	if s.come(at) {
		return " at " + clock(at)
	}
	return ", and " + s.dated(at)
}

// entry gives the entry of a step of the record that counts.
func (s scene) entry(step string) *measure.StepEntry { return entryOf(s.steps, step, s.now) }
