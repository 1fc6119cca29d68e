package diagnose

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// hotCase is a test by camera whose results are temperatures: what a repairer compares is whether a case runs hot.
const hotCase = "- {id: case-temperature, title: Case, observes: heat-path-poor, per: position, instrument: camera, needs: full, minutes: 5, unit: celsius, " +
	"results: {cool: {median: 36 °C, times: 1.2}, hot: {median: 85 °C, times: 1.2}}, present: {cool: 0.1, hot: 0.9}, absent: {cool: 0.9, hot: 0.1}}\n"

func thermalBase(t testing.TB) *knowledge.Base {
	t.Helper()
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "tests.yaml"), []byte(hotCase), 0o644); err != nil {
		t.Fatal(err)
	}
	base, err := knowledge.LoadWith(dir)
	if err != nil {
		t.Fatal(err)
	}
	return base
}

// TestBareMetalCannotSpeakForCool: 80 °C on bare metal shows as 36 °C, so 36 °C there says nothing against hot.
func TestBareMetalCannotSpeakForCool(t *testing.T) {
	base := thermalBase(t)
	prior := chanceOf(t, ranked(t, base, caseOf(t, chopper, ""), nil, ""), "heat-path-poor")
	after := func(rest string) (float64, string) {
		r := ranked(t, base, caseOf(t, chopper, "", "case-temperature, position: low, "+rest), nil, "")
		return chanceOf(t, r, "heat-path-poor"), r.Findings[0].Shown
	}
	dot, shown := after("reading: 36 °C, surface: matt-dot")
	if !(dot < 0.5*prior) || shown != "36 °C" {
		t.Errorf("on a matt dot: %.4f from %.4f, shown %q", dot, prior, shown)
	}
	for _, rest := range []string{"reading: 36 °C, surface: bare-metal", "reading: 36 °C", "reading: < 36 °C, surface: bare-metal"} {
		if bare, shown := after(rest); !(bare > prior-1e-9) || shown == "36 °C" {
			t.Errorf("%s: %.4f from %.4f, shown %q", rest, bare, prior, shown)
		}
	}
	if hot, shown := after("reading: 70 °C, surface: bare-metal"); !(hot > 2*prior) || shown != "> 70 °C" {
		t.Errorf("hot bare metal is hot all the same: %.4f from %.4f, shown %q", hot, prior, shown)
	}
}

func TestLowerBound(t *testing.T) {
	camera, meter := &knowledge.Test{Instrument: "camera", Unit: quantity.Celsius}, &knowledge.Test{Instrument: "meter", Unit: quantity.Celsius}
	for _, c := range []struct {
		test             *knowledge.Test
		reading, surface string
		bound            bool
		want             string // the reading that counts
		low              float64
	}{
		{camera, "36 °C", "matt-dot", false, "36 °C", 36},
		{camera, "36 °C", "tape", false, "36 °C", 36},
		{camera, "36 °C", "moulded", false, "36 °C", 36},
		{camera, "36 °C", "painted", false, "36 °C", 36},
		{camera, "36 °C", "bare-metal", true, "> 36 °C", 36},
		{camera, "36 °C", "", true, "> 36 °C", 36},
		{camera, "34 °C to 38 °C", "", true, "> 34 °C", 34},
		{camera, "> 36 °C", "", true, "> 36 °C", 36},
		{camera, "< 36 °C", "", true, "< 36 °C as it looked, no bound", 0},
		{camera, "hot", "", false, "hot", 0},
		{meter, "36 °C", "", false, "36 °C", 36},
	} {
		r, err := quantity.ParseReading(c.reading, quantity.Celsius)
		if err != nil {
			t.Fatal(err)
		}
		ob := measure.Observation{Reading: &r, Surface: c.surface}
		if got := LowerBound(c.test, ob); got != c.bound {
			t.Errorf("%s on %q: lower bound %v", c.reading, c.surface, got)
		}
		got := effective(c.test, ob)
		if got.Text != c.want || got.Low != c.low || (got.Kind == quantity.Above) != (c.bound) {
			t.Errorf("%s on %q counts as %+v, want %s", c.reading, c.surface, got, c.want)
		}
	}
	if r := (measure.Observation{Result: "hot"}); LowerBound(camera, r) || LowerBound(nil, r) {
		t.Error("a named result is no bound")
	}
}

// TestReadAsTakesTheBound: what a technician checks a reading against is what votes.
func TestReadAsTakesTheBound(t *testing.T) {
	test := thermalBase(t).Test("case-temperature")
	r, err := quantity.ParseReading("36 °C", quantity.Celsius)
	if err != nil {
		t.Fatal(err)
	}
	best := func(surface string) string {
		return ReadAs(test, measure.Board{}, measure.Observation{Reading: &r, Surface: surface})[0].Result
	}
	if dot, bare := best("matt-dot"), best("bare-metal"); dot != "cool" || bare != "hot" {
		t.Errorf("on a dot %s, on bare metal %s", dot, bare)
	}
	if got := effective(test, measure.Observation{Reading: &r}); !strings.HasPrefix(got.Text, "> ") || r.Text != "36 °C" || r.Kind != quantity.Point {
		t.Errorf("counts as %q, and the entry is now %+v", got.Text, r)
	}
}
