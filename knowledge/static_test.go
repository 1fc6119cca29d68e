package knowledge

import (
	"slices"
	"testing"
)

// TestStaticTestsOfTheBase names the tests that each topology passes before power, and the results that pass.
func TestStaticTestsOfTheBase(t *testing.T) {
	b, err := Load()
	if err != nil {
		t.Fatal(err)
	}
	chopper := []string{"power-terminals-resistance bleeder", "gate-resistance good", "freewheel-diode-drop normal", "freewheel-path-check closed", "gate-pull-down present"}
	leg := []string{"power-terminals-resistance bleeder", "gate-resistance good", "reverse-diode-drop normal", "gate-pull-down present"}
	all := []string{"power-terminals-resistance bleeder", "gate-resistance good", "reverse-diode-drop normal", "freewheel-diode-drop normal", "freewheel-path-check closed", "gate-pull-down present"}
	for _, c := range []struct {
		stated map[string]string
		want   []string
	}{
		{map[string]string{"topology": "low-side-chopper"}, chopper},
		{map[string]string{"topology": "high-side-chopper", "freewheel.fitted": "yes"}, chopper},
		{map[string]string{"topology": "low-side-chopper", "freewheel.fitted": "no"}, []string{chopper[0], chopper[1], chopper[4]}},
		{map[string]string{"topology": "half-bridge"}, leg},
		{map[string]string{"topology": "h-bridge"}, leg},
		{map[string]string{"topology": "h-bridge", "gate.pull_down": "none"}, leg[:3]},
		{map[string]string{"topology": "three-phase"}, leg},
		{map[string]string{"topology": "other"}, all},
		{nil, all}, // what is not stated counts as applying
	} {
		lookup := func(path string) (string, float64, bool) { w, ok := c.stated[path]; return w, 0, ok }
		var got []string
		for i := range b.Tests {
			if x := &b.Tests[i]; x.StaticFor(lookup) {
				got = append(got, x.ID+" "+x.Static[0])
			}
		}
		if !slices.Equal(got, c.want) {
			t.Errorf("%v: got %v, want %v", c.stated, got, c.want)
		}
	}
}

// TestStaticPasses: of a static test the named results pass and no other; of any other test none does.
func TestStaticPasses(t *testing.T) {
	b, err := over(map[string]string{"tests.yaml": observing + "static: [none]}"})
	if err != nil {
		t.Fatal(err)
	}
	smell, look := b.Test("driver-smell"), b.Test("driver-look")
	if !smell.Passes("none") || smell.Passes("burnt") || smell.Passes("") {
		t.Error("the passing result of driver-smell is none alone")
	}
	if look.Passes("whole") || look.StaticFor(func(string) (string, float64, bool) { return "", 0, false }) {
		t.Error("driver-look is no static test")
	}
}

// TestInsulationTester: what is done with hundreds of volts says so by its instrument, and warns.
func TestInsulationTester(t *testing.T) {
	b, err := Load()
	if err != nil {
		t.Fatal(err)
	}
	for _, id := range []string{"motor-insulation", "board-insulation", "sink-insulation"} {
		if x := b.Test(id); x.Instrument != "insulation-tester" || !slices.Contains(x.Cautions, "insulation-tester") {
			t.Errorf("%s: instrument %s, cautions %v", id, x.Instrument, x.Cautions)
		}
	}
}
