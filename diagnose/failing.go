package diagnose

import (
	"sort"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// openFailing is a dead test whose newest reading after the rebuild speaks for a fault.
type openFailing struct {
	test *knowledge.Test
	safety.Static
}

// candidate asks for the same reading again.
func (f openFailing) candidate() Candidate {
	c := Candidate{Test: f.test, Position: f.Position, Part: f.Part, Lifted: f.Lifted, Must: true, Serves: true, Minutes: f.test.Minutes,
		Again: f.Because + ": mend it, then read it again, or enter the new rebuild.done"}
	if c.Part != "" {
		c.Position = ""
	}
	if c.Lifted {
		c.Minutes += liftMinutes
	}
	return c
}

// failing gives the readings since the rebuild that speak for what their test looks for, and those of them that a good
// one of the same place has followed. Static tests are judged by themselves, but for a reading that does not say where.
func (s *statics) failing() (standing []safety.Static, mended []safety.Mended, open []openFailing) {
	static := map[string]bool{}
	for _, t := range s.tests {
		static[t.ID] = true
	}
	for _, place := range s.places() {
		if static[place.test] && place.name == "" {
			continue
		}
		t := s.base.Test(place.test)
		fault, good, because := s.followed(t, place)
		if fault < 0 {
			continue
		}
		f := s.named(t, place, fault)
		f.Because += because
		if good >= 0 {
			mended = append(mended, safety.Mended{Static: f, Good: s.c.Observations[good].At})
			continue
		}
		standing = append(standing, f)
		open = append(open, openFailing{t, f})
	}
	return standing, mended, open
}

// places lists the places of all readings, in the order of the base, then of the board.
func (s *statics) places() []staticPlace {
	rank := map[string]int{}
	for i := range s.base.Tests {
		rank[s.base.Tests[i].ID] = i
	}
	out := make([]staticPlace, 0, len(s.readings))
	for place := range s.readings {
		out = append(out, place)
	}
	sort.Slice(out, func(i, j int) bool {
		a, b := out[i], out[j]
		switch {
		case a.test != b.test:
			return rank[a.test] < rank[b.test]
		case a.bank != b.bank:
			return a.bank < b.bank
		case a.part != b.part:
			return a.part < b.part
		}
		return a.name < b.name
	})
	return out
}

// followed gives the newest reading of a place that speaks for a fault, and the first good one after it; -1 without. A
// good one counts only if it was taken within its hold point. One of the whole board speaks for each of its places,
// where the test is one of the board.
func (s *statics) followed(t *knowledge.Test, place staticPlace) (fault, good int, because string) {
	list, whole := s.readings[place], staticPlace{test: t.ID, bank: -1, part: -1}
	if t.Per == "" && place != whole && len(s.readings[whole]) > 0 {
		list = append(append([]int(nil), list...), s.readings[whole]...)
		s.inOrder(list)
	}
	fault, good = -1, -1
	for _, i := range list {
		ob := s.c.Observations[i]
		switch lean := s.leans(t, place, ob); {
		case lean > 0 && s.placeOf[i] == place:
			fault, good, because = i, -1, ""
		case lean >= 0 || fault < 0 || good >= 0:
		case s.held.outside(WorkOf(t), ob):
			because = "; the good reading of " + ob.At.Format("15:04") + " was taken outside its hold point"
		default:
			good, because = i, ""
		}
	}
	return fault, good, because
}

// leans tells whether a reading speaks for what its test looks for (1), against it (-1), or neither: an answer without
// a reading, what was known before the bench, a slip, or what cannot be judged.
func (s *statics) leans(t *knowledge.Test, place staticPlace, ob measure.Observation) int {
	if ob.Answer != "" || ob.Seen != "" && ob.Seen != "at-bench" {
		return 0
	}
	result := s.readsAs(t, place, ob)
	switch present, absent := t.Present[result].Mid, t.Absent[result].Mid; {
	case present > absent:
		return 1
	case present < absent:
		return -1
	}
	return 0
}

// readsAs gives the result that a reading fits best; "" or "misread" where there is none.
func (s *statics) readsAs(t *knowledge.Test, place staticPlace, ob measure.Observation) string {
	parts := 0
	if place.bank >= 0 {
		parts = len(s.positions[place.bank].Parts)
	}
	word, shares, err := s.fits(t, parts, ob)
	if word != "" || err != nil || len(shares) == 0 {
		return word
	}
	return shares[0].Result
}

// named puts a reading and its place into words.
func (s *statics) named(t *knowledge.Test, place staticPlace, i int) safety.Static {
	ob := s.c.Observations[i]
	f := safety.Static{Test: t.ID, Title: t.Title, Position: ob.Position, Part: ob.Part, Lifted: ob.State == "lifted", At: ob.At,
		Because: "reads " + s.readsAs(t, place, ob)}
	if place.name == "" {
		f.Position, f.Part = "", ""
		if place.bank >= 0 {
			f.Position = s.positions[place.bank].Name
		}
		if place.part >= 0 {
			f.Part = s.positions[place.bank].Parts[place.part]
		}
	}
	if ob.Reading != nil && ob.Reading.Kind != quantity.Word {
		f.Because += " (" + ob.Reading.Text + ")"
	}
	return f
}
