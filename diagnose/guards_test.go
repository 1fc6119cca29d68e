package diagnose

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"drivemend/knowledge"
	"drivemend/measure"
)

const linked = `drivemend: 1
case: linked
board: {topology: low-side-chopper, supply: battery, positions: {low: {parts: [Q1]}}}
safety:
  link: [{fitted: 2026-12-01T09:50:00+01:00, removed: 2026-12-01T10:05:00+01:00}]
observations:
  - {test: power-terminals-resistance, part: Q1, at: TIME, reading: 0.3 Ω}
`

// A meter reading taken across a fitted link is no evidence: everything reads shorted.
func TestReadingsUnderALinkDoNotVote(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	for at, votes := range map[string]bool{
		"2026-12-01T09:49:00+01:00": true, "2026-12-01T09:55:00+01:00": false, "2026-12-01T10:05:00+01:00": true,
	} {
		f, err := measure.Parse("linked.yaml", []byte(strings.Replace(linked, "TIME", at, 1)))
		if err != nil {
			t.Fatal(err)
		}
		r, err := Rank(base, f.Case, nil, "")
		if err != nil {
			t.Fatal(err)
		}
		if got := len(r.Findings) == 1; got != votes {
			t.Errorf("at %s: votes %v, want %v (%v)", at, got, votes, r.Unbound)
		}
	}
}

// On a new case the history stands first, in the order of the base, whatever else saves a minute.
func TestHistoryStandsFirst(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	f, err := measure.Parse("new.yaml", []byte("drivemend: 1\ncase: new\nboard: {topology: three-phase}\n"))
	if err != nil {
		t.Fatal(err)
	}
	n, err := Next(base, f.Case, nil, time.Time{})
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []string{"failure-moment", "what-changed", "dead-parts"} {
		if got := n.Tests[i].Test.ID; got != want {
			t.Errorf("test %d is %s, want %s", i+1, got, want)
		}
	}
}

// A powered observation ends the dead checks, and so does what a test that the base does not know
// showed at a time; a result without one, as hand-written cases have many, does not.
func TestUnknownReadingsCountAsPowered(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	for line, want := range map[string]int{
		"{test: scoped-overshoot, at: 2026-12-01T10:00:00Z, reading: 0.8 ratio}":  1,
		"{test: scoped-overshoot, at: 2026-12-01T10:00:00Z, answer: skipped}":     0,
		"{test: shop-bus-ramp, at: 2026-12-01T10:00:00Z, reading: 48 V}":          1,
		"{test: shop-sticker-look, at: 2026-12-01T10:00:00Z, result: faded}":      1,
		"{test: shop-sticker-look, result: faded}":                                0,
		"{test: snubber-resistor-value, at: 2026-12-01T10:00:00Z, reading: 98 %}": 0,
	} {
		f, err := measure.Parse("p.yaml", []byte("drivemend: 1\ncase: p\nobservations:\n  - "+line+"\n"))
		if err != nil {
			t.Fatal(err)
		}
		if got := len(poweredTimes(base, f.Case)); got != want {
			t.Errorf("%s: %d powered times, want %d", line, got, want)
		}
	}
}

// A reading at one part and a test of the whole board are places of different kinds: no chance passes one.
func TestPlaceSharesStayChances(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	f, err := measure.Parse("p.yaml", []byte("drivemend: 1\ncase: p\nboard: {topology: half-bridge}\nobservations:\n  - {test: driver-look, position: low, result: whole}\n  - {test: driver-look, position: high, result: whole}\n"))
	if err != nil {
		t.Fatal(err)
	}
	s, err := solve(base, f.Case, nil, false)
	if err != nil {
		t.Fatal(err)
	}
	for _, where := range []place{onBoard, onBank, onPart} {
		for _, tt := range s.tests {
			if p := s.placeShare(tt, where); !(p >= 0 && p <= 1) {
				t.Errorf("%s at %v: share %g", tt.ID, where, p)
			}
		}
	}
}

// A base that is kept compiled gives what a fresh one gives, also when the board changes under it.
func TestCompiledGivesTheSame(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	kept := For(base)
	for _, name := range []string{"full-case.yaml", "cases/orchard-pump-3.yaml", "full-case.yaml", "full-case.yaml"} {
		f, err := measure.Load("../testdata/" + name)
		if err != nil {
			t.Fatal(err)
		}
		want, err := Rank(base, f.Case, nil, "")
		if err != nil {
			t.Fatal(err)
		}
		got, err := kept.Rank(f.Case, nil, "")
		if err != nil {
			t.Fatal(err)
		}
		if fmt.Sprintf("%+v", got.Causes) != fmt.Sprintf("%+v", want.Causes) || len(got.Findings) != len(want.Findings) {
			t.Errorf("%s ranks otherwise when the base is kept", name)
		}
	}
}
