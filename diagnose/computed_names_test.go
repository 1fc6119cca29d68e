package diagnose

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"
	"testing"

	"drivemend/diagnose/belief"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"

	"pgregory.net/rapid"
)

// figureBoards are boards that between them have every computed figure.
var figureBoards = map[string]string{
	"bare chopper": "topology: low-side-chopper\nsupply: rectified-mains\nbus: {nominal: 310 V, highest: 390 V}\nswitch: {kind: igbt, rated_voltage: 600 V, rated_current: 40 A}\n" +
		"freewheel: {fitted: yes}\nload: {running_current: 20 A, stall_current: 60 A}",
	"long loop": "topology: low-side-chopper\nsupply: rectified-mains\nbus: {nominal: 310 V, highest: 390 V}\nswitch: {kind: igbt, rated_voltage: 600 V, rated_current: 40 A, fall_time: 60 ns, rise_slope: 10 V/ns}\n" +
		"freewheel: {fitted: yes}\nloop: {inductance: 800 nH}\nsnubber: {kind: none}\nload: {running_current: 40 A, stall_current: 100 A}",
	"high rating": "topology: low-side-chopper\nsupply: battery\nbus: {nominal: 48 V}\nswitch: {kind: igbt, rated_voltage: 600 V, rated_current: 40 A, fall_time: 200 ns, rise_slope: 2 V/ns}\n" +
		"freewheel: {fitted: yes}\nloop: {inductance: 40 nH}\nsnubber: {kind: none}\nload: {running_current: 5 A, stall_current: 10 A}",
	"clamp": "topology: low-side-chopper\nbus: {nominal: 310 V}\nswitch: {kind: igbt, rated_voltage: 600 V, rated_current: 40 A, fall_time: 100 ns}\nfreewheel: {fitted: yes}\n" +
		"loop: {inductance: 100 nH}\nsnubber: {kind: clamp, capacitance: 1 µF, clamp_voltage: 430 V, resistance: 1 kΩ}\nload: {running_current: 20 A}",
	"wild bridge": "topology: h-bridge\nsupply: battery\nbus: {nominal: 48 V, highest: 56 V}\nswitch: {kind: mosfet, rated_voltage: 75 V, rated_current: 80 A, fall_time: 20 ns, rise_slope: 40 V/ns, turn_on_slope: 3 A/ns, avalanche: {energy: 20 µJ}}\n" +
		"freewheel: {fitted: yes, recovery_charge: 800 nC}\nloop: {inductance: 150 nH}\nsnubber: {kind: none}\nload: {running_current: 60 A, stall_current: 160 A}",
	"tame bridge": "topology: h-bridge\nsupply: battery\nbus: {nominal: 24 V, highest: 28 V}\nswitch: {kind: mosfet, rated_voltage: 200 V, rated_current: 80 A, fall_time: 200 ns, rise_slope: 0.2 V/ns, output_capacitance: 5 nF, turn_on_slope: 0.02 A/ns, avalanche: {energy: 300 mJ}}\n" +
		"freewheel: {fitted: yes, forward_voltage: 0.5 V, recovery_charge: 5 nC}\nloop: {inductance: 15 nH}\nsnubber: {kind: none}\nload: {running_current: 3 A, stall_current: 6 A}",
	"bare bridge":              "topology: h-bridge\nsupply: battery\nbus: {nominal: 48 V, highest: 56 V}\nswitch: {kind: mosfet, rated_voltage: 60 V, rated_current: 80 A, avalanche: {energy: 20 µJ}}\nload: {running_current: 40 A, stall_current: 120 A}",
	"part rated under the bus": "topology: low-side-chopper\nsupply: rectified-mains\nbus: {nominal: 310 V, highest: 390 V}\nswitch: {kind: igbt, rated_voltage: 250 V, rated_current: 40 A}\nload: {running_current: 20 A}",
}

// solvedBoards keeps the figures of a board, which take a while.
var solvedBoards = map[string]map[string]stress.Span{}

func figuresOf(t testing.TB, board string) (*measure.Case, map[string]stress.Span) {
	t.Helper()
	c := caseOf(t, board, "")
	if spans, ok := solvedBoards[board]; ok {
		return c, maps.Clone(spans)
	}
	spans, needs, err := stress.Spans(c.Board)
	if err != nil || len(spans) == 0 {
		t.Fatalf("no figures: %v, needs %v\n%s", err, needs, board)
	}
	solvedBoards[board] = maps.Clone(spans)
	return c, spans
}

// Every figure that a rule may name under `computed:` is filled for a board that states what it takes, and no other.
func TestEveryComputedNameIsFilled(t *testing.T) {
	var want, got []string
	for _, figure := range knowledge.Computed() {
		want = append(want, figure.Name)
	}
	for board, text := range figureBoards {
		_, spans := figuresOf(t, text)
		for name, span := range spans {
			if !(span.Low >= 0 && span.Low <= span.High) || math.IsInf(span.High, 0) {
				t.Errorf("%s: %s runs from %g to %g", board, name, span.Low, span.High)
			}
			got = append(got, name)
		}
	}
	slices.Sort(want)
	slices.Sort(got)
	if got = slices.Compact(got); !slices.Equal(got, want) {
		t.Errorf("filled are %v, a rule may name %v", got, want)
	}
}

// Every computed figure reaches its tests: over the rating votes for the event, far under it against, and what rests on
// assumed values alone stays under 3 dB. Decibans are those of the event that the test observes.
func TestComputedVotes(t *testing.T) {
	base := loadBase(t)
	for _, c := range []struct {
		board, test string
		least, most float64 // dB
	}{
		{"long loop", "predicted-peak", 3, 12},
		{"high rating", "predicted-peak", -12, -3},
		{"bare chopper", "predicted-peak", -3, 3},
		{"part rated under the bus", "predicted-peak", 3, 12},
		{"wild bridge", "predicted-peak", 2, 12},
		{"tame bridge", "predicted-peak", -12, -2},
		{"wild bridge", "predicted-recovery-peak", 1, 12},
		{"tame bridge", "predicted-recovery-peak", -12, -1},
		{"wild bridge", "predicted-avalanche", 2, 12},
		{"tame bridge", "predicted-avalanche", -12, -1},
		{"bare bridge", "predicted-avalanche", -3, 3},
		{"wild bridge", "predicted-slope", 0.5, 3},
		{"tame bridge", "predicted-slope", -3, -0.5},
		{"bare bridge", "predicted-slope", -3, 3},
	} {
		cs, spans := figuresOf(t, figureBoards[c.board])
		r := ranked(t, base, cs, spans, base.Test(c.test).Observes)
		k := slices.IndexFunc(r.Findings, func(f Finding) bool { return f.Test.ID == c.test })
		if k < 0 {
			t.Errorf("%s: no vote of %s", c.board, c.test)
			continue
		}
		if f := r.Findings[k]; !(f.Decibans > c.least && f.Decibans < c.most) {
			t.Errorf("%s, %s: %s gives %+.2f dB, want %g to %g (%+v)", c.board, c.test, f.Shown, f.Decibans, c.least, c.most, spans[base.Test(c.test).Computed])
		}
	}
}

// A loop that is typed but not known to be true of this board is an assumed value like one that was taken as typical.
func TestTypedButAssumed(t *testing.T) {
	typed := figureBoards["bare chopper"] + "\nloop: {inductance: 800 nH}"
	_, known := figuresOf(t, typed)
	_, assumed := figuresOf(t, typed+"\nassumed: [loop.inductance]")
	const name = "turn_off.peak_over_rated"
	if known[name].Guessed || !assumed[name].Guessed || !slices.Contains(assumed[name].Assumed, "loop.inductance") {
		t.Errorf("known %+v, assumed %+v", known[name], assumed[name])
	}
}

// guessBase lets computed figures vote in every way a rule can have them vote: on a stress, a fault of parts, a fault
// of the board, straight on the causes.
func guessBase(t testing.TB) *knowledge.Base {
	base := loadBase(t)
	peak := base.Test("predicted-peak")
	for _, event := range []string{"turn-off-spike", "switch-shorted", "clamp-absent", "violent-discharge"} {
		one := *peak
		one.ID, one.Observes, one.Group, one.ReplacedBy = "guess-"+event, event, "", ""
		base.Tests = append(base.Tests, one)
	}
	straight := *peak
	straight.ID, straight.Observes, straight.Group, straight.ReplacedBy, straight.Present, straight.Absent = "guess-cause", "", "", "", nil, nil
	straight.Nominal = peak.Absent
	base.Tests = append(base.Tests, straight)
	for k := range base.Causes {
		if c := &base.Causes[k]; c.ID == "clamp-missing" {
			c.Answers = maps.Clone(c.Answers)
			c.Answers["guess-cause"] = peak.Present
		}
	}
	return base
}

// Whatever the board, whatever the computed test: a figure that rests on assumed values alone moves the odds of no
// hypothesis, and of no cause, stress or fault, by 3 dB or more.
func TestGuessStaysUnderThreeDecibels(t *testing.T) {
	base, voted := guessBase(t), map[string]bool{}
	rapid.Check(t, func(t *rapid.T) {
		c := drawCase(t, base)
		c.Observations = nil
		spans := map[string]stress.Span{}
		for _, f := range knowledge.Computed() {
			scale := map[bool]float64{true: 1, false: 1e9}[f.Unit == "ratio" || !strings.Contains(string(f.Unit), "/")]
			low := scale * math.Pow(10, rapid.Float64Range(-4, 4).Draw(t, f.Name))
			spans[f.Name] = stress.Span{Low: low, High: low * rapid.SampledFrom([]float64{1, 1.1, 3, 1e4}).Draw(t, "width"), Assumed: []string{"loop.inductance"}, Guessed: true}
		}
		s, err := solve(base, c, spans, true)
		if err != nil {
			t.Fatal(err)
		}
		for k, e := range s.ev {
			if s.votes[k].finding.Source != "computed" {
				continue
			}
			voted[s.votes[k].finding.Test.ID] = true
			if db := spreadOf(t, s, e); !(db < 3) {
				t.Fatalf("%s: the hypotheses lie %.2f dB apart", s.votes[k].finding.Test.ID, db)
			}
		}
		about := rapid.SampledFrom([]string{"", "turn-off-spike", "switch-shorted", "clamp-missing", "unlisted"}).Draw(t, "about")
		r, err := Rank(base, c, spans, about)
		if err != nil {
			t.Skip(err)
		}
		for _, f := range r.Findings {
			if f.Source == "computed" && !(math.Abs(f.Decibans) < 3 && math.Abs(f.Alone) < 3) {
				t.Fatalf("%s for %q: %.2f dB, alone %.2f", f.Test.ID, about, f.Decibans, f.Alone)
			}
		}
	})
	for _, test := range base.Tests {
		if test.Computed != "" && !voted[test.ID] {
			t.Errorf("%s never voted", test.ID)
		}
	}
}

// spreadOf is how far apart one finding puts the hypotheses, in decibans.
func spreadOf(t *rapid.T, s *state, e belief.Evidence) float64 {
	u, err := s.model.Infer([]belief.Evidence{e})
	if err != nil {
		t.Fatal(err)
	}
	return 10 / math.Ln10 * (slices.Max(u.LogLikelihood) - slices.Min(u.LogLikelihood))
}

// What is known is not held back, and a guess still points the way that the same figure points when it is known.
func TestGuessPointsTheSameWay(t *testing.T) {
	base := loadBase(t)
	for _, test := range base.Tests {
		if test.Computed == "" {
			continue
		}
		cs, _ := figuresOf(t, figureBoards["bare bridge"])
		scale := map[bool]float64{true: 1e9, false: 1}[test.Computed == "edge.slope"]
		for _, x := range []float64{0.1, 0.3, 1.1, 3, 30} {
			var db []float64
			for _, guessed := range []bool{false, true} {
				spans := map[string]stress.Span{test.Computed: {Low: x * scale, High: x * scale, Guessed: guessed}}
				db = append(db, ranked(t, base, cs, spans, test.Observes).Findings[0].Decibans)
			}
			if name := fmt.Sprintf("%s at %g", test.ID, x); db[0]*db[1] < 0 || math.Abs(db[1]) > math.Abs(db[0])+1e-9 || math.Abs(db[0]) < 2.9 && math.Abs(db[0]-db[1]) > 1e-9 {
				t.Errorf("%s: known %+.2f dB, guessed %+.2f dB", name, db[0], db[1])
			}
		}
	}
}
