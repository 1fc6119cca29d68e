package safety

import (
	"encoding/binary"
	"flag"
	"fmt"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"drivemend/measure"
)

// record makes one random record, its lists in random order.
func (w writer) record() facts {
	f := w.goodOrder()
	for n := w.IntN(10); n > 0; n-- {
		w.spoil(&f)
	}
	f.readable()
	shuffle(w, f.isolations)
	shuffle(w, f.checks)
	shuffle(w, f.links)
	shuffle(w, f.before)
	shuffle(w, f.steps)
	shuffle(w, f.statics)
	return f
}

func shuffle[T any](w writer, list []T) {
	w.Shuffle(len(list), func(i, j int) { list[i], list[j] = list[j], list[i] })
}

// failFact is a reading that speaks for a fault, and when a good one of the same place followed.
type failFact struct{ at, good int }

// evidenceOf reads out of the parsed case what a rule base would.
func evidenceOf(c *measure.Case, f facts) Evidence {
	var e Evidence
	for _, o := range c.Observations {
		if o.Test == "under-power" {
			e.Powered = append(e.Powered, o.At)
		}
	}
	for _, s := range f.statics {
		e.Statics = append(e.Statics, Static{Test: "ohms", Title: "resistance", Position: s.position, Passed: s.passed, At: instant(s.at)})
	}
	for _, x := range f.failing {
		reading := Static{Test: "look", Title: "a look", At: instant(x.at), Because: "reads cracked"}
		if x.good == never {
			e.Failing = append(e.Failing, reading)
		} else {
			e.Mended = append(e.Mended, Mended{reading, instant(x.good)})
		}
	}
	return e
}

// upToNow is the record as it stood: what lies ahead had not been written.
func (f facts) upToNow() facts {
	past := func(at int) bool { return at <= f.now }
	g := f
	g.isolations = only(f.isolations, func(i isolationFact) bool { return past(i.at) })
	g.checks = only(f.checks, func(c checkFact) bool { return past(c.at) })
	g.before = only(f.before, func(b beforeFact) bool { return past(b.at) })
	g.steps = only(f.steps, func(s stepFact) bool { return past(s.at) })
	g.power = only(f.power, past)
	g.failing = only(f.failing, func(x failFact) bool { return past(x.at) })
	g.links = only(f.links, func(l linkFact) bool { return past(l.fitted) || (l.removed != never && past(l.removed)) })
	for k, l := range g.links {
		if l.removed > f.now {
			g.links[k].removed = never
		}
	}
	if f.done > f.now {
		g.done = never
	}
	return g
}

func only[T any](list []T, keep func(T) bool) []T {
	return slices.DeleteFunc(slices.Clone(list), func(e T) bool { return !keep(e) })
}

// Ten thousand records written by hand and loaded as a file: what may be done is exactly what the oracle says, and so is
// what is marked as done outside a hold point.
// drawTimes sets how many histories rapid draws, for this test alone.
func drawTimes(t *testing.T, n int) {
	const name = "rapid.checks"
	before := flag.Lookup(name).Value.String()
	if more, err := strconv.Atoi(before); err == nil && more > n {
		return
	}
	t.Cleanup(func() { _ = flag.Set(name, before) })
	if err := flag.Set(name, strconv.Itoa(n)); err != nil {
		t.Fatal(err)
	}
}

// seed draws eight bytes each by itself: rapid's whole numbers are mostly small ones.
func seed(t *rapid.T) uint64 {
	return binary.LittleEndian.Uint64(rapid.SliceOfN(rapid.Byte(), 8, 8).Draw(t, "seed"))
}

func TestTenThousandHistoriesAgreeWithTheOracle(t *testing.T) {
	histories := 10_000
	if testing.Short() {
		histories = 500
	}
	allowed, within := map[Work]int{}, map[Work]int{}
	loaded, refused := 0, 0
	drawTimes(t, histories)
	rapid.Check(t, func(t *rapid.T) {
		n := loaded
		w := writer{rand.New(rand.NewPCG(seed(t), seed(t)))}
		f := w.record()
		text := w.yaml(f)
		file, err := measure.Parse("case.yaml", []byte(text))
		swapped := slices.ContainsFunc(f.links, func(l linkFact) bool { return l.removed != never && l.removed < l.fitted })
		switch {
		case swapped && err == nil:
			t.Fatalf("history %d: a link that came off before it was fitted is read\n%s", n, text)
		case err != nil && !strings.Contains(err.Error(), "contradicts"):
			t.Fatalf("history %d: %v\n%s", n, err, text)
		case err != nil:
			refused++
			t.Skip("the loader refuses it")
		}
		loaded++
		e, now, story := evidenceOf(file.Case, f), instant(f.now), f.live()
		for _, named := range Works() {
			work := named.Work
			d, want := Check(file.Case, work, now, e), f.allows(story, work)
			if d.Allowed != want {
				t.Fatalf("history %d, %s at %s: allowed %v, the oracle says %v; missing %+v\n%s%+v", n, named.Title, now, d.Allowed, want, d.Missing, text, f)
			}
			if fault := incomplete(d); fault != "" {
				t.Fatalf("history %d, %s: %s: %+v", n, named.Title, fault, d.Missing)
			}
			if want {
				allowed[work]++
			}
		}
		work := Works()[1+n%(len(Works())-1)].Work
		own := e
		if work.Energises() { // the reading itself is among what put energy in
			own.Powered = append(slices.Clone(e.Powered), now)
		}
		outside, missing := OutsideHoldPoint(file.Case, measure.Observation{Test: "any", Result: "good", At: now}, work, own)
		if past := f.upToNow(); outside == past.allows(past.live(), work) {
			t.Fatalf("history %d, a reading of %+v at %s: outside %v, the oracle says %v; missing %+v\n%s", n, work, now, outside, !outside, missing, text)
		}
		if !outside {
			within[work]++
		}
	})
	t.Logf("%d histories, no violation; %d more contradict themselves, which the loader refuses", loaded, refused)
	if refused > histories/3 {
		t.Errorf("the loader refuses %d histories: the generator contradicts itself too often", refused)
	}
	for _, named := range Works() {
		share := 100 * float64(allowed[named.Work]) / float64(histories)
		t.Logf("%-40s allowed in %5d, %.1f %%; a reading within its hold point in %d", named.Title, allowed[named.Work], share, within[named.Work])
		if share < 2 || share > 98 && named.Work.Need != NeedQuestion {
			t.Errorf("%s: allowed in %.1f %% of the histories: the test says too little about it", named.Title, share)
		}
	}
}

// incomplete tells what a decision does not say; "" when it says everything.
func incomplete(d Decision) string {
	if d.Allowed != (len(d.Missing) == 0) {
		return "allowed and missing disagree"
	}
	for _, m := range d.Missing {
		if m.Text == "" || m.Unlock == "" || m.Point < 0 || m.Point > 4 {
			return fmt.Sprintf("incomplete: %+v", m)
		}
		if strings.Contains(m.Text+m.Unlock, "0001-01-01") {
			return fmt.Sprintf("a time that is not stated is shown: %+v", m)
		}
	}
	return ""
}

// A time without its zone is refused by the loader, wherever in the record it stands: it cannot speak for anything.
func TestATimeWithoutItsZoneIsRefused(t *testing.T) {
	refused := 0
	for n := range 300 {
		w := writer{rand.New(rand.NewPCG(10, uint64(n)))}
		lines := strings.Split(w.yaml(w.record()), "\n")
		k := w.IntN(len(lines))
		at := strings.LastIndex(lines[k], "2026-12-0")
		if at < 0 {
			continue
		}
		end := at + len("2026-12-01T09:00:00")
		tail := strings.TrimLeft(lines[k][end:], "Z+-0123456789:")
		lines[k] = lines[k][:end] + tail
		if _, err := measure.Parse("case.yaml", []byte(strings.Join(lines, "\n"))); err == nil {
			t.Fatalf("history %d is read without a zone in line %d: %s", n, k+1, lines[k])
		}
		refused++
	}
	if refused < 100 {
		t.Errorf("only %d records were tried", refused)
	}
}
