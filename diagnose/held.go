package diagnose

import (
	"sort"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// held tells whether readings were taken within their hold points. Between two entries of the record a permission only
// runs out: a reading is within if a later one of the same stretch is, and outside if an earlier one is. So one or two
// questions to the hold points serve most stretches.
type held struct {
	c      *measure.Case // without its observations: what they put into the board stands in the evidence
	e      safety.Evidence
	marks  []time.Time           // when an entry changed the record, in order
	latest map[stretch]time.Time // the last reading of each stretch
	known  map[stretch]runsOut
}

// stretch is the time between two entries of the record, for one kind of work.
type stretch struct {
	work    safety.Work
	entries int // made by then
}

// runsOut is what is known of a stretch.
type runsOut struct {
	within  time.Time // readings up to here are within
	outside time.Time // those from here on are outside; zero while none is known to be
}

func newHeld(c *measure.Case, powered []time.Time) *held {
	lean := *c
	lean.Observations = nil
	h := &held{c: &lean, e: safety.Evidence{Powered: powered}, latest: map[stretch]time.Time{}, known: map[stretch]runsOut{}}
	h.marks = append(h.marks, powered...)
	for _, i := range c.Safety.Isolation {
		h.marks = append(h.marks, i.At)
	}
	for _, d := range c.Safety.DeadChecks {
		h.marks = append(h.marks, d.At)
	}
	for _, l := range c.Safety.Links {
		h.marks = append(h.marks, l.Fitted, l.Removed)
	}
	for _, e := range c.Safety.Energised {
		h.marks = append(h.marks, e.At)
	}
	for _, b := range c.Safety.Before {
		h.marks = append(h.marks, b.At)
	}
	for _, s := range c.Steps {
		h.marks = append(h.marks, s.At)
	}
	for _, s := range c.BringUp {
		h.marks = append(h.marks, s.At)
	}
	sort.Slice(h.marks, func(i, j int) bool { return h.marks[i].Before(h.marks[j]) })
	return h
}

func (h *held) stretchOf(w safety.Work, at time.Time) stretch {
	return stretch{w, sort.Search(len(h.marks), func(i int) bool { return h.marks[i].After(at) })}
}

// note keeps a reading that will be asked about.
func (h *held) note(w safety.Work, at time.Time) {
	s := h.stretchOf(w, at)
	if at.After(h.latest[s]) {
		h.latest[s] = at
	}
}

// outside tells whether a reading was taken outside its hold points. What energises the board is asked about by itself:
// it is an entry of the record, too.
func (h *held) outside(w safety.Work, ob measure.Observation) bool {
	if w.Energises() {
		out, _ := safety.OutsideHoldPoint(h.c, ob, w, h.e)
		return out
	}
	s := h.stretchOf(w, ob.At)
	if _, asked := h.known[s]; !asked {
		h.ask(s, h.latest[s])
	}
	if k := h.known[s]; ob.At.After(k.within) && ob.At.Before(k.outside) {
		h.ask(s, ob.At)
	}
	return ob.At.After(h.known[s].within)
}

// ask puts one reading of a stretch to the hold points.
func (h *held) ask(s stretch, at time.Time) {
	k := h.known[s]
	if out, _ := safety.OutsideHoldPoint(h.c, measure.Observation{At: at}, s.work, h.e); out {
		k.outside = at
	} else {
		k.within = at
	}
	h.known[s] = k
}
