package safety

import (
	"fmt"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Status is what the safety record says at one moment: whether the board is cut off, whether a link is fitted, and
// how old the dead check of every store is.
type Status struct {
	At        time.Time
	Isolation IsolationStatus
	Link      LinkStatus
	Points    []PointStatus // one a store, in the order of Stores
	Dead      bool          // isolated, no link, every store fresh and dead: ohms may be offered
	Unplaced  []string      // points of dead checks that this board does not have
	Alarms    []string      // readings above the highest voltage that is stated for the bus
	Spared    []string      // stores that need no check now, and why
}

// IsolationStatus tells whether the board counts as cut off from every source.
type IsolationStatus struct {
	Isolated  bool
	Since     time.Time          // start of the unbroken isolation; zero when not isolated
	Last      *measure.Isolation // the statement that counts; nil without one
	Energised time.Time          // the last moment at which energy was put in; zero without one
	Age       time.Duration      // of Last; 0 without one, and where its time is not stated or in the future
	Reconfirm bool               // Last is older than IsolationLife or of another day: look at the lock again, state it anew
	Source    *measure.DeadCheck // the last dead check that read AC above DeadVolts: a source was still connected; nil without one
	Missing   []Missing          // empty exactly when isolated
}

// LinkStatus tells about the shorting link.
type LinkStatus struct {
	Fitted  bool
	Since   time.Time // when it was fitted; zero while none is
	Removed time.Time // when the last one came off; zero without one
}

// PointStatus is the state of one store.
type PointStatus struct {
	Store     Store
	Last      *measure.DeadCheck // nil without one
	Age       time.Duration      // of Last; 0 without one
	ExpiresAt time.Time          // the first moment at which Last no longer counts; zero without one
	Dead      bool               // proved dead at this moment
	Touch     string             // what the last reading allows, in words; "" without one
	Missing   []Missing          // empty exactly when dead
}

// StatusOf gives the safety status of a case at a moment, on the same evidence as Check.
func StatusOf(c *measure.Case, now time.Time, e Evidence) Status {
	return Check(c, Work{Need: NeedQuestion}, now, e).Status
}

func (h history) status() Status {
	s := Status{At: h.now, Isolation: h.isolationStatus()}
	s.Link = h.link()
	s.Dead = s.Isolation.Isolated && !s.Link.Fitted
	stores := h.stores()
	s.Alarms = alarmsOf(stores)
	burn := burns(h.boards, stores)
	checked := standing(stores, s.Isolation)
	if len(checked) < len(stores) {
		s.Spared = []string{PointPhases + ": needs no check while the motor is unplugged"}
	}
	for _, store := range checked {
		p := h.pointStatus(store, s, burn)
		s.Dead = s.Dead && p.Dead
		s.Points = append(s.Points, p)
	}
	s.Unplaced = h.unplaced(stores)
	return s
}

// standing leaves out the motor terminals while the board is isolated with the motor unplugged: its voltage has no
// way onto the board. With the shaft only locked they are checked.
func standing(stores []Store, i IsolationStatus) []Store {
	if !i.Isolated || i.Last.Motor != motorUnplugged {
		return stores
	}
	var out []Store
	for _, s := range stores {
		if s.Point != PointPhases {
			out = append(out, s)
		}
	}
	return out
}

func (h history) isolationStatus() IsolationStatus {
	s := IsolationStatus{Last: h.isolation()}
	s.Energised, _ = h.energised()
	s.Source, _ = h.sourceSeen()
	if s.Last != nil && !s.Last.At.IsZero() && !s.Last.At.After(h.now) {
		s.Age, s.Reconfirm = h.now.Sub(s.Last.At), lapsed(s.Last.At, h.now)
	}
	s.Missing = h.withAhead(h.isolationMissing(s), s.Last)
	if len(s.Missing) == 0 {
		s.Since = h.isolatedSince()
		s.Isolated = !s.Since.IsZero()
	}
	if !s.Isolated && len(s.Missing) == 0 {
		s.Missing = []Missing{{0, "the statements of isolation contradict each other at " + clock(s.Last.At), "isolate it again and state it: " + isolationCommand}}
	}
	return s
}

// isolationMissing says what stands against the isolation, the most telling first.
func (h history) isolationMissing(s IsolationStatus) []Missing {
	_, undated := h.energised()
	_, seenUndated := h.sourceSeen()
	switch {
	case undated:
		return []Missing{{0, "energy was put in, or a powered test observed, at a moment that is not stated or lies in the future", "correct that time in the case file"}}
	case seenUndated:
		return []Missing{{0, "a dead check read AC above " + format(DeadVolts, quantity.Volt) + " at a moment that is not stated or lies in the future: a source may still be connected",
			"correct that time in the case file; then isolate again and find the source"}}
	case s.Last == nil:
		return []Missing{{0, neverIsolated, "cut the board off from every source, lock it, unplug the motor or lock its shaft, and enter it: " + isolationCommand}}
	case len(isolationFaults(h.boards, s.Last)) > 0:
		return isolationFaults(h.boards, s.Last)
	case !s.Last.At.After(s.Energised):
		isolated, power := clocks(s.Last.At, s.Energised)
		return []Missing{{0, "the board had energy put in at " + power + ", after it was isolated at " + isolated, "isolate it again and state it: " + isolationCommand}}
	case s.Source != nil && !s.Last.At.After(s.Source.At):
		isolated, seen := clocks(s.Last.At, s.Source.At)
		return []Missing{{0, sourceText(s.Source) + " (read at " + s.Source.Point + " at " + seen + ", isolated at " + isolated + ")",
			"find and cut off what feeds the board, then state the isolation anew: " + isolationCommand}}
	case s.Reconfirm:
		return []Missing{{0, fmt.Sprintf("the isolation of %s is %s old: it speaks for %s, and for its own day", clock(s.Last.At), hours(s.Age), hours(IsolationLife)),
			"look at the lock again and state the isolation anew: " + isolationCommand}}
	}
	return nil
}

// withAhead adds to what is missing that a sound statement does not count because of its time.
func (h history) withAhead(m []Missing, last *measure.Isolation) []Missing {
	ahead := h.isolationAhead()
	if len(m) == 0 || ahead == nil {
		return m
	}
	text := "the isolation on record " + h.dated(ahead.At) + ", and does not count before its time"
	if last == nil && m[0].Text == neverIsolated {
		m[0].Text = text
	} else {
		m[0].Text += "; " + text
	}
	m[0].Unlock = "correct that time in the case file if it is wrong; else " + m[0].Unlock
	return m
}

// isolationAhead gives the first sound statement of isolation whose time has not come to be; nil without one.
func (h history) isolationAhead() *measure.Isolation {
	for k := range h.safety.Isolation {
		i := &h.safety.Isolation[k]
		if !h.come(i.At) && len(isolationFaults(h.boards, i)) == 0 {
			return i
		}
	}
	return nil
}

const neverIsolated = "no isolation is stated"

// sourceText says what AC at a store means: a bank gives none.
func sourceText(d *measure.DeadCheck) string {
	return "AC " + format(highestOf(d.AC), quantity.Volt) + ": a source is still connected; isolate again and find it"
}

func (h history) pointStatus(store Store, s Status, burn bool) PointStatus {
	p := PointStatus{Store: store, Last: h.check(store.Point)}
	if p.Last == nil {
		p.Missing = []Missing{{1, fmt.Sprintf("no dead check at %s: %s%s", store.Point, store.Title, worstText(store)),
			"measure DC and AC " + store.Where + " and " + checkCommand(store.Point) + ruledOut(store)}}
		p.Missing = afterIsolation(p, s)
		return p
	}
	p.Age, p.ExpiresAt = h.now.Sub(p.Last.At), p.Last.At.Add(CheckLife)
	p.Touch = touch(highest(p.Last), burn)
	if above(highestOf(p.Last.AC), DeadVolts) {
		p.Touch = "a source is still connected: do not touch"
	}
	p.Missing = h.checkFaults(store, p.Last, s, p.Touch)
	p.Dead = len(p.Missing) == 0
	p.Missing = afterIsolation(p, s)
	return p
}

// afterIsolation takes out how a store is checked and emptied while the board is not cut off: nothing is told that would
// bring somebody near a live store.
func afterIsolation(p PointStatus, s Status) []Missing {
	if len(s.Isolation.Missing) == 0 {
		return p.Missing
	}
	for k := range p.Missing {
		if p.Missing[k].Unlock == alarmUnlock {
			continue
		}
		p.Missing[k].Unlock = "after the isolation: the dead check at " + p.Store.Point
	}
	return p.Missing
}

// worstText puts the figures of a store in words, ", up to 390 V, 167.3 J", with what is doubtful about them.
func worstText(s Store) string {
	text := ", up to " + format(s.Voltage.Value, quantity.Volt)
	if s.EnergyJ > 0 {
		text += ", " + s.energyText()
	}
	return text + s.doubt()
}

// ruledOut says which entry takes a store off the list that this board does not have; "" for a store that is there.
func ruledOut(s Store) string {
	if !s.ToCheck {
		return ""
	}
	no := func(path, word string) string {
		return "; if the board has none, state " + path + ": " + word + " (drivemend enter CASE board." + path + " " + word + ")"
	}
	switch s.Point {
	case PointUpperHalf, PointLowerHalf:
		return no("bus.halves", "no")
	case PointFused:
		return no("bus.fuse", "none")
	case PointReservoir:
		return no("bus.reservoir", "none")
	case PointBrake:
		return no("stages.brake.fitted", "no")
	case PointAuxiliary:
		return no("stages.auxiliary.fitted", "no")
	case PointPhases:
		return "; a load that cannot turn needs none: drivemend enter CASE board.load.kind resistive"
	}
	return ""
}

// checkFaults says why a dead check does not prove its store dead: what it reads first, then its age and order.
func (h history) checkFaults(store Store, d *measure.DeadCheck, s Status, touch string) []Missing {
	var m []Missing
	at := "at " + store.Point + ": "
	again := "check again, DC and AC, and " + checkCommand(store.Point)
	source := above(highestOf(d.AC), DeadVolts)
	if source {
		m = append(m, Missing{1, at + sourceText(d), "no resistor while a source feeds it; after a new isolation " + again})
	}
	if v := highestOf(d.DC); above(v, DeadVolts) {
		unlock := "discharge through the resistor (drivemend discharge CASE), then " + again
		if source {
			unlock = "find the source first; after a new isolation " + again
		}
		if store.Alarm != "" {
			m = append(m, Missing{1, "ALARM: " + store.Alarm, alarmUnlock})
		}
		m = append(m, Missing{1, at + format(v, quantity.Volt) + " read: " + touch, unlock})
	}
	if d.DC.Unit != quantity.Volt || d.AC.Unit != quantity.Volt {
		m = append(m, Missing{1, at + "the check lacks its DC or its AC reading", again})
	}
	if !d.MeterProved {
		m = append(m, Missing{1, at + "the meter was not proved before and after", "prove the meter on a known DC source, check, prove it again, and " + checkCommand(store.Point)})
	}
	fault := orderFault(d, s)
	if fault == "" {
		fault = h.ageFault(d)
	}
	if fault != "" {
		m = append(m, Missing{2, at + fault, again})
	}
	return m
}

func (h history) ageFault(d *measure.DeadCheck) string {
	switch {
	case d.At.IsZero():
		return "the check carries no time"
	case d.At.After(h.now):
		dated, _ := clocks(d.At, h.now)
		return "the check is dated " + dated + ", in the future: it counts as expired"
	case !h.now.Before(d.At.Add(CheckLife)):
		return fmt.Sprintf("the check of %s is %s old: it lives %s", clock(d.At), minutes(h.now.Sub(d.At)), minutes(CheckLife))
	}
	return ""
}

// orderFault says what has ended a check since it was made. A check of the very moment of isolation counts: one stamp
// may stand for both. At the moment of energy or of a link's removal it does not, for the order cannot be told.
func orderFault(d *measure.DeadCheck, s Status) string {
	i := s.Isolation
	switch {
	case !i.Energised.IsZero() && !d.At.After(i.Energised):
		check, power := clocks(d.At, i.Energised)
		return "energy was put in at " + power + ", which ended the check of " + check
	case i.Isolated && d.At.Before(i.Since):
		check, since := clocks(d.At, i.Since)
		return "the check of " + check + " was made before the isolation of " + since
	case !s.Link.Removed.IsZero() && !d.At.After(s.Link.Removed):
		check, removed := clocks(d.At, s.Link.Removed)
		return "the shorting link came off at " + removed + ", after the check of " + check
	}
	return ""
}

func (h history) unplaced(stores []Store) []string {
	var out []string
	for _, d := range h.safety.DeadChecks {
		known := false
		for _, s := range stores {
			known = known || samePoint(d.Point, s.Point)
		}
		for _, name := range out {
			known = known || name == d.Point
		}
		if !known {
			out = append(out, d.Point)
		}
	}
	return out
}

func clock(t time.Time) string { return t.Format("2006-01-02 15:04") }

// clocks prints two moments to be told apart, both in the zone of the first: with seconds where their minutes are equal.
func clocks(a, b time.Time) (string, string) {
	b = b.In(a.Location())
	if clock(a) != clock(b) {
		return clock(a), clock(b)
	}
	const layout = "2006-01-02 15:04:05"
	return a.Format(layout), b.Format(layout)
}

// hours prints a long age in hours and minutes.
func hours(d time.Duration) string {
	h, m := int64(d/time.Hour), int64(d%time.Hour/time.Minute)
	if m == 0 {
		return fmt.Sprintf("%d h", h)
	}
	return fmt.Sprintf("%d h %d min", h, m)
}

// minutes prints a duration in whole minutes, rounded up so that an age never looks younger than it is.
func minutes(d time.Duration) string {
	n := int64((d + time.Minute - 1) / time.Minute)
	return fmt.Sprintf("%d min", n)
}
