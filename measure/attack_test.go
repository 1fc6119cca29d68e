package measure

import (
	"bytes"
	"errors"
	"fmt"
	"math/rand"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// fewestFailures is the number of injected failures below which the attack proves too little.
const fewestFailures = 10_000

// stand is a state of the file on disk, and the answers that are to be saved over it, one after the other.
type stand struct {
	name         string
	path, target string
	old          []byte  // nil for a new case
	answers      []*File // with one answer, with two, with three
	litter       []string
}

// stands are the states that are attacked.
func stands(t *testing.T) []stand {
	t.Helper()
	bench := filepath.Join(string(filepath.Separator), "bench")
	target, link := filepath.Join(bench, "pump.yaml"), filepath.Join(bench, "link.yaml")
	long := head + "observations:\n" + strings.Repeat("  - {test: smell, result: burnt}\n", 60)
	out := []stand{
		{name: "short", path: target, old: []byte(head)},
		{name: "long", path: target, old: []byte(long)},
		{name: "line ends and mark", path: target, old: []byte(byteOrderMark + strings.ReplaceAll(head, "\n", "\r\n"))},
		{name: "new", path: target},
		{name: "link", path: link, old: []byte(head)},
		{name: "after a kill", path: target, old: []byte(head), litter: []string{".pump.yaml.lock", ".pump.yaml.7.part", ".pump.yaml.123.part"}},
	}
	for i := range out {
		s := &out[i]
		s.target = target
		f, err := New(s.path, "a", "2026-12-01")
		if s.old != nil {
			f, err = Parse(s.path, s.old)
		}
		if err != nil {
			t.Fatal(err)
		}
		for _, result := range []string{"storm", "rain", "dry"} {
			if err := f.Observe(Observation{Test: "weather", Result: result}); err != nil {
				t.Fatal(err)
			}
			answered := *f
			s.answers = append(s.answers, &answered)
		}
	}
	return out
}

// bytes gives the file with so many answers, nil for no file.
func (s *stand) bytes(answers int) []byte {
	if answers == 0 {
		return s.old
	}
	return s.answers[answers-1].src.raw
}

// model makes the state anew.
func (s *stand) model() *model {
	files := map[string]*blob{}
	if s.old != nil {
		files[s.target] = whole(string(s.old))
	}
	for _, name := range s.litter {
		files[filepath.Join(filepath.Dir(s.target), name)] = whole("half a fi")
	}
	m := newModel(files)
	if s.path != s.target {
		m.links[s.path] = s.target
	}
	return m
}

// attack counts what happened.
type attack struct {
	t                                        *testing.T
	saves, oldKept, newInPlace, told, resume int
	moments, cuts                            int // kills and power cuts that were looked at
	hits                                     map[string]int
	loaded                                   map[string]bool

	stand       *stand
	where       string
	acked, last int // answers: acknowledged so far, given so far
}

// allowed tells whether a content holds every answer that was acknowledged, is one of the whole files, and loads.
func (a *attack) allowed(got []byte) bool {
	for n := a.acked; n <= a.last; n++ {
		want := a.stand.bytes(n)
		if (got == nil) != (want == nil) || !bytes.Equal(got, want) {
			continue
		}
		if _, seen := a.loaded[string(got)]; !seen && got != nil { // equal bytes load alike
			_, err := Parse("", got)
			a.loaded[string(got)] = err == nil
		}
		return got == nil || a.loaded[string(got)]
	}
	return false
}

// fail tells what went wrong and where.
func (a *attack) fail(format string, args ...any) {
	a.t.Helper()
	a.t.Errorf(a.stand.name+", "+a.where+": "+format, args...)
}

// watch looks at the file after every change of the disk, as a killed program and as a power cut would leave it.
func (a *attack) watch(m *model) func() {
	return func() {
		a.moments++
		if got := m.content(a.stand.target); !a.allowed(got) {
			a.fail("a kill leaves %q", got)
		}
		for _, got := range m.survivors(a.stand.target) {
			a.cuts++
			if !a.allowed(got) {
				a.fail("a power cut leaves %q", got)
			}
		}
	}
}

// run gives and saves answers under the planned failures, then saves once more without any, and judges all of it.
func (a *attack) run(s *stand, where string, answers int, plan func(n int, call string) (fault, bool)) (calls []string) {
	a.stand, a.where, a.acked, a.last = s, where, 0, 0
	m := s.model()
	bad := newFaulty(m, plan)
	f := &File{Path: s.path, read: s.old, system: bad}
	for range answers {
		given := s.answers[a.last]
		f.Case, f.src, f.root = given.Case, given.src, given.root
		a.last++
		m.after = a.watch(m)
		a.saves++
		a.judge(m, bad, f, f.Save())
	}
	f.system = m
	if err := f.Save(); err != nil {
		a.fail("saved again without a failure: %v", err)
	}
	a.resume++
	a.judge(m, newFaulty(m, nil), f, nil)
	if left, _ := m.Names(filepath.Dir(s.target)); len(left) != 1 {
		a.fail("saved again, and %v is there", left)
	}
	for kind, n := range bad.hits {
		a.hits[kind] += n
	}
	if a.t.Failed() {
		a.t.FailNow()
	}
	return bad.calls
}

// judge looks at the disk and the file after one Save.
func (a *attack) judge(m *model, bad *faulty, f *File, err error) {
	want := a.stand.bytes(a.last)
	if err == nil {
		a.acked = a.last
	} else {
		a.told++
		a.explains(err)
	}
	a.watch(m)()
	if bytes.Equal(m.content(a.stand.target), want) {
		a.newInPlace++
	} else {
		a.oldKept++
	}
	if !bytes.Equal(f.Bytes(), want) || f.Saved() != (err == nil) {
		a.fail("error %v, saved %v, in memory %q", err, f.Saved(), f.Bytes())
	}
	left, _ := m.Names(filepath.Dir(a.stand.target))
	if hidden := func(name string) bool { return name[0] == '.' }; !bad.litters && len(a.stand.litter) == 0 && slices.ContainsFunc(left, hidden) {
		a.fail("left behind: %v", left)
	}
	if m.held[a.stand.target] {
		a.fail("the lock is still held")
	}
}

// explains proves that an error names the file and says what to do.
func (a *attack) explains(err error) {
	var save *SaveError
	var changed *ChangedError
	switch {
	case errors.As(err, &save):
		if save.Todo == "" || save.Reason == "" || save.Stands == "" || !strings.HasPrefix(err.Error(), a.stand.path+": not saved, ") {
			a.fail("the error says too little: %v", err)
		}
	case !errors.As(err, &changed):
		a.fail("an error of another kind: %v", err)
	}
}

// report prints the figures.
func (a *attack) report() int {
	total := 0
	var lines []string
	for _, k := range kinds {
		total += a.hits[k.kind]
		lines = append(lines, fmt.Sprintf("%s %d", k.kind, a.hits[k.kind]))
	}
	a.t.Logf("%d injected failures in %d saves: old kept %d, new in place %d, told as not saved %d, saved again after it %d, "+
		"%d moments of a kill and %d outcomes of a power cut looked at\nby kind: %s",
		total, a.saves, a.oldKept, a.newInPlace, a.told, a.resume, a.moments, a.cuts, strings.Join(lines, ", "))
	return total
}

// never plans no failure.
func never(int, string) (fault, bool) { return fault{}, false }

// TestSaveUnderAttack lets every call of a save fail in every way, alone and in pairs, then several saves in a row at
// random. After each the disk holds the old file or the new one, whole; a save without an error survives a power cut;
// and the next save works.
func TestSaveUnderAttack(t *testing.T) {
	a := &attack{t: t, hits: map[string]int{}, loaded: map[string]bool{}}
	for _, s := range stands(t) {
		calls := a.run(&s, "no failure", 1, never)
		for i, call := range calls {
			for _, first := range faults(call) {
				where := fmt.Sprintf("call %d (%s) %+v", i, call, first)
				one := func(n int, _ string) (fault, bool) { return first, n == i }
				after := a.run(&s, where, 1, one)
				for j := i + 1; j < len(after); j++ {
					second := kinds[(i+j)%11]
					second.done = (i+j)%3 == 0 && changing[after[j]]
					a.run(&s, fmt.Sprintf("%s, call %d (%s) %+v", where, j, after[j], second), 1, func(n int, c string) (fault, bool) {
						if n == j {
							return second, true
						}
						return one(n, c)
					})
				}
			}
		}
	}
	a.atRandom(3000)
	if n := a.report(); n < fewestFailures {
		t.Errorf("only %d failures were injected, want %d", n, fewestFailures)
	}
	for _, k := range kinds {
		if a.hits[k.kind] == 0 {
			t.Errorf("%s never happened", k.kind)
		}
	}
}

// atRandom runs series of three saves in which each call fails with a chance of one in eight.
func (a *attack) atRandom(series int) {
	all := stands(a.t)
	for seed := range series {
		r := rand.New(rand.NewSource(int64(seed)))
		a.run(&all[seed%len(all)], fmt.Sprintf("series %d", seed), 3, func(_ int, call string) (fault, bool) {
			if r.Intn(8) > 0 {
				return fault{}, false
			}
			ways := faults(call)
			way := ways[r.Intn(len(ways))]
			way.lasts = way.lasts && r.Intn(4) == 0
			return way, true
		})
	}
}
