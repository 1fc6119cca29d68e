package safety

import (
	"math"
	"sort"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// Boards from a toy to a shared bus: which lines each of them is above, which line is the lowest of its hazard there, and
// of which lines the board's figure is not known. Energies and charges are at +20 %. Written from the notes by hand.
func TestLimitsOfChosenBoards(t *testing.T) {
	const (
		always   = " us-live vehicle-ac meter noise"                                     // the lowest at any voltage
		sixty    = " us-live machine-voltage drive-voltage plug-voltage vehicle-voltage" // passed above 60 V
		hundred  = " lab-voltage lab-section-voltage"                                    // passed from 100 V
		charges  = " drive-charge machine-charge"                                        // passed by every bank
		alwaysAC = " vehicle-ac workplace-ac lab-section-ac"                             // never known
		lowBurns = " lab-burn article-360-burn lab-battery-burn class-low"               // drawn below 100 V alone
		highArcs = " drive-charge vehicle-crash lab-arc lab-arc-source"                  // drawn from 100 V
		// The same where no battery feeds the board, so that it is no vehicle's.
		plain      = " us-live workplace-ac lab-section-ac meter noise"
		plainAC    = " workplace-ac lab-section-ac"
		plainSixty = " us-live machine-voltage drive-voltage plug-voltage"
		plainArcs  = " drive-charge article-360 lab-arc lab-arc-source"
	)
	for _, row := range []struct {
		name                   string
		in                     Input
		above, lowest, unknown string
	}{
		{"12 V battery, 1 mF: 0.09 J", Input{BusV: 12, CapacitanceF: 1e-3, Supply: "battery"},
			"lab-battery-burn meter", always + lowBurns, alwaysAC},
		{"48 V battery, 80 mF: 111 J", Input{BusV: 48, CapacitanceF: 80e-3, Supply: "battery"},
			"meter noise lab-burn article-360-burn lab-battery-burn class-low", always + lowBurns, alwaysAC},
		{"48 V bench supply, 69 mF: 95 J", Input{BusV: 48, CapacitanceF: 69e-3, Supply: "bench-supply"},
			"meter", plain + lowBurns, plainAC},
		{"60 V, 1 mF: at the line is not above it", Input{BusV: 60, CapacitanceF: 1e-3, Supply: "bench-supply"},
			"us-live meter", plain + lowBurns, plainAC},
		{"90 V, 10 mF, supply not stated: 49 J", Input{BusV: 90, CapacitanceF: 10e-3},
			"meter vehicle-crash" + sixty + charges, always + lowBurns + " drive-charge vehicle-crash", alwaysAC + " lab-battery-burn"},
		{"100 V battery, 10 mF: 60 J", Input{BusV: 100, CapacitanceF: 10e-3, Supply: "battery"},
			"meter vehicle-crash article-360 lab-shock class-middle lab-battery-voltage lab-arc-source" + sixty + hundred + charges,
			always + highArcs + " class-middle", alwaysAC},
		{"325 V mains, 470 µF: 30 J", Input{BusV: 325, CapacitanceF: 470e-6, Supply: "rectified-mains"},
			"meter article-360 lab-shock class-middle" + plainSixty + hundred + charges, plain + plainArcs + " class-middle", plainAC},
		{"325 V mains, 5 µF: 0.32 J", Input{BusV: 325, CapacitanceF: 5e-6, Supply: "rectified-mains"},
			"meter" + plainSixty + hundred + charges, plain + plainArcs + " class-middle", plainAC},
		{"400 V mains, 1.2 µF: 0.12 J", Input{BusV: 400, CapacitanceF: 1.2e-6, Supply: "rectified-mains"},
			"meter" + plainSixty + hundred + charges, plain + plainArcs + " class-middle", plainAC},
		{"400 V mains, 5 µF: 0.48 J", Input{BusV: 400, CapacitanceF: 5e-6, Supply: "rectified-mains"},
			"meter" + plainSixty + hundred + charges, plain + plainArcs + " class-middle", plainAC},
		{"50 V, 100 J at the top: at one line, not above the other", Input{BusV: 50, CapacitanceF: 0.04, HighestF: 0.08, Supply: "bench-supply"},
			"us-live meter noise article-360-burn class-low", plain + lowBurns, plainAC},
		{"401 V mains, 3 µF: 0.29 J", Input{BusV: 401, CapacitanceF: 3e-6, Supply: "rectified-mains"},
			"meter reflex article-360 class-high" + plainSixty + hundred + charges, plain + plainArcs + " reflex class-high", plainAC},
		{"565 V, 2200 µF, supply not stated: 421 J", Input{BusV: 565, CapacitanceF: 2200e-6},
			"meter noise vehicle-crash reflex article-360 lab-shock class-high lab-battery-voltage" + sixty + hundred + charges,
			always + highArcs + " class-high", alwaysAC + " lab-arc-source"},
		{"800 V mains, 4.7 mF: 1.8 kJ", Input{BusV: 800, CapacitanceF: 4.7e-3, Supply: "rectified-mains"},
			"meter noise reflex article-360 lab-shock class-high" + plainSixty + hundred + charges, plain + plainArcs + " reflex class-high", plainAC},
		{"1000 V shared bus, 25 mF: 15 kJ", Input{BusV: 1000, CapacitanceF: 25e-3, Supply: "shared-bus"},
			"meter noise reflex article-360 lab-shock class-high lab-arc lab-arc-source" + plainSixty + hundred + charges,
			plain + plainArcs + " reflex class-high", plainAC},
		{"800 V mains, 55 nF: 53 µC lies between the two charges", Input{BusV: 800, CapacitanceF: 55e-9, Supply: "rectified-mains"},
			"meter drive-charge" + plainSixty + hundred, plain + plainArcs + " reflex class-high", plainAC},
	} {
		p, err := Discharge(row.in)
		if err != nil {
			t.Fatal(err)
		}
		for _, want := range []struct {
			what, ids string
			is        func(Limit) bool
		}{
			{"above", row.above, func(l Limit) bool { return l.Above }},
			{"lowest", row.lowest, func(l Limit) bool { return l.Lowest }},
			{"not known", row.unknown, func(l Limit) bool { return l.Unknown }},
		} {
			if got, wanted := idsOf(p.Limits, want.is), sortedWords(want.ids); got != wanted {
				t.Errorf("%s, %s:\n got  %s\n want %s", row.name, want.what, got, wanted)
			}
		}
	}
}

func idsOf(limits []Limit, is func(Limit) bool) string {
	var ids []string
	for _, l := range limits {
		if is(l) {
			ids = append(ids, l.ID)
		}
	}
	sort.Strings(ids)
	return strings.Join(ids, " ")
}

func sortedWords(text string) string {
	words := strings.Fields(text)
	sort.Strings(words)
	return strings.Join(words, " ")
}

// The lines as the safety notes give them, A1 and A2.1: level, where it is drawn, and how the source was read.
func TestThresholdsOfTheNotes(t *testing.T) {
	nowhere := math.Inf(1)
	for id, want := range map[string]struct {
		at12, at90, at325, at565 float64
		read                     Grade
		source                   string
	}{
		"us-live":             {50, 50, 50, 50, SecondHand, "29 CFR 1910.333(a)(1)"},
		"machine-voltage":     {60, 60, 60, 60, SecondHand, "IEC 60204-1 6.2.4"},
		"drive-voltage":       {60, 60, 60, 60, Memory, "IEC 61800-5-1 and EN 50178 5.2.8.1"},
		"plug-voltage":        {60, 60, 60, 60, SecondHand, "IEC 60204-1 6.2.4"},
		"vehicle-voltage":     {60, 60, 60, 60, Memory, "UN R100 and ISO 6469-3"},
		"lab-voltage":         {100, 100, 100, 100, Read, "table 2.2.13"},
		"lab-section-voltage": {100, 100, 100, 100, SecondHand, "NFPA 70E-2021 350.9"},
		"lab-battery-voltage": {100, 100, 100, 100, Read, "table 2.2.13"},
		"vehicle-ac":          {30, 30, 30, 30, Memory, "UN R100 and ISO 6469-3"},
		"workplace-ac":        {50, 50, 50, 50, SecondHand, "NFPA 70E"},
		"lab-section-ac":      {50, 50, 50, 50, SecondHand, "NFPA 70E-2021 350.9"},
		"drive-charge":        {nowhere, 50e-6, 50e-6, 50e-6, Memory, "IEC 61800-5-1"},
		"machine-charge":      {nowhere, 60e-6, 60e-6, 60e-6, SecondHand, "IEC 60204-1 6.2.4"},
		"vehicle-crash":       {nowhere, 0.2, 0.2, 0.2, SecondHand, "SAE J1766"},
		"reflex":              {nowhere, nowhere, nowhere, 0.25, SecondHand, "DOE-HDBK-1092-2013"},
		"article-360":         {nowhere, nowhere, 1, 0.25, Memory, "article 360"},
		"lab-shock":           {nowhere, nowhere, 10, 10, Read, "table 2.2.13"},
		"class-low":           {100, 100, nowhere, nowhere, Memory, "capacitor charts"},
		"class-middle":        {nowhere, nowhere, 1, nowhere, Memory, "capacitor charts"},
		"class-high":          {nowhere, nowhere, nowhere, 0.25, Memory, "capacitor charts"},
		"lab-burn":            {100, 100, nowhere, nowhere, Read, "table 2.3.5"},
		"article-360-burn":    {100, 100, nowhere, nowhere, Memory, "article 360"},
		"lab-battery-burn":    {1000, 1000, nowhere, nowhere, Read, "table 2.3.5"},
		"lab-arc":             {nowhere, nowhere, 10e3, 10e3, Read, "table 2.3.3"},
		"lab-arc-source":      {nowhere, nowhere, 500, 500, Read, "table 2.3.3"},
		"noise":               {100, 100, 100, 100, Memory, "annex R"},
		"meter":               {5, 5, 5, 5, CommonPractice, "bench practice"},
	} {
		th := thresholdOf(id)
		if th == nil {
			t.Errorf("%s is missing", id)
			continue
		}
		if got := [4]float64{th.level(12), th.level(90), th.level(325), th.level(565)}; got != [4]float64{want.at12, want.at90, want.at325, want.at565} {
			t.Errorf("%s: level at 12, 90, 325 and 565 V is %v", id, got)
		}
		if th.from.read != want.read || !strings.Contains(th.from.long, want.source) {
			t.Errorf("%s: %s, %s", id, th.from.long, th.from.read)
		}
	}
	if len(thresholds) != 27 {
		t.Errorf("%d thresholds: one is not in this table", len(thresholds))
	}
}

func thresholdOf(id string) *threshold {
	for k := range thresholds {
		if thresholds[k].id == id {
			return &thresholds[k]
		}
	}
	return nil
}

// The classes of the handbook's capacitor charts, from memory, on both sides of every step.
func TestHazardClasses(t *testing.T) {
	for _, row := range []struct {
		volt, joule float64
		class       string
	}{
		{48, 99.9, "none"}, {48, 100, "low"}, {99.9, 999, "low"}, {99.9, 1000, "burn and arc"},
		{100, 0.99, "none"}, {100, 1, "low"}, {400, 9.99, "low"}, {400, 10, "moderate"}, {325, 999, "moderate"}, {325, 1000, "high"}, {325, 10e3, "very high"},
		{401, 0.249, "none"}, {401, 0.25, "low"}, {565, 1, "moderate"}, {565, 10, "high"}, {800, 1000, "very high"}, {800, 10e3, "extreme"},
	} {
		if got := classAt(row.volt, row.joule); got != row.class {
			t.Errorf("%g V, %g J: %s, want %s", row.volt, row.joule, got, row.class)
		}
	}
}

// Every store is held against the lines by itself: a small clamp above the bus, a bank behind it.
func TestLimitsNameTheStore(t *testing.T) {
	stores := splitStores(90, 1e-3)[:1]
	clamp := Store{Point: PointClamp, Voltage: Figure{Value: 480, Unit: "V", Basis: Stated}, Capacitance: Figure{Value: 10e-6, Unit: "F", Basis: Stated}}.filled()
	phases := Store{Point: PointPhases, Voltage: Figure{Value: 600, Unit: "V", Basis: Stated}}
	p, err := Discharge(Input{Stores: append(stores, clamp, phases), Supply: "battery"})
	if err != nil {
		t.Fatal(err)
	}
	for id, board := range map[string]string{
		"us-live":          "phases 600 V",
		"vehicle-crash":    "bus 90 V, 4.86 J at +20 %; also clamp",
		"article-360":      "clamp 480 V, 1.382 J at +20 %",
		"lab-shock":        "clamp 480 V, 1.382 J at +20 %",
		"lab-burn":         "bus 90 V, 4.86 J at +20 %",
		"class-low":        "bus 90 V, 4.86 J at +20 %: none",
		"class-middle":     "no store in its range (phases 600 V)",
		"class-high":       "clamp 480 V, 1.382 J at +20 %: moderate",
		"drive-charge":     "bus 90 V, 108 mC at +20 %; also clamp",
		"noise":            "6.242 J at +20 % in all",
		"lab-battery-burn": "battery 90 V; what it can give is not stated, counted as above",
		"vehicle-ac":       "no AC is stored",
	} {
		if got := p.limit(id).Board; got != board {
			t.Errorf("%s: %q, want %q", id, got, board)
		}
	}
	if p.limit("lab-shock").Above || !p.limit("article-360").Above || !p.limit("lab-burn").Lowest || !p.limit("class-high").Lowest {
		t.Errorf("%+v", p.Limits)
	}
}

// A part of the bank is not named beside the bank, and stands by itself where the bank is out of a line's range.
func TestLimitsDoNotCountTheBankTwice(t *testing.T) {
	p, err := Discharge(Input{Stores: splitStores(800, 1e-3)})
	if err != nil {
		t.Fatal(err)
	}
	for id, board := range map[string]string{"lab-shock": "bus 800 V, 384 J at +20 %", "class-middle": "upper-half 400 V, 192 J at +20 %: moderate; also lower-half"} {
		if got := p.limit(id).Board; got != board {
			t.Errorf("%s: %q, want %q", id, got, board)
		}
	}
}

// A caution that follows a limit stands exactly where the board is above it, and gives its source and grade.
func TestCautionsAgreeWithTheLimits(t *testing.T) {
	follows := map[string][]string{"arc-flash": {"lab-arc"}, "arc-flash-source": {"lab-arc-source"}, "live": {"us-live"}, "touch-limit": {"machine-voltage"},
		"drive-limit": {"drive-voltage"}, "stored-energy": {"lab-shock"}, "stored-energy-low-limit": {"vehicle-crash", "reflex", "article-360"}, "burn": {"lab-burn", "article-360-burn"}, "noise": {"noise"}}
	for _, w := range warnings {
		if (w.follows != nil) != (follows[w.id] != nil) || (w.follows == nil) != (w.when != nil) {
			t.Errorf("%s: follows a limit %v, this test knows of %v", w.id, w.follows != nil, follows[w.id])
		}
	}
	supplies := []string{"", "battery", "bench-supply", "rectified-mains", "shared-bus"}
	rapid.Check(t, func(t *rapid.T) {
		in := Input{BusV: rapid.Float64Range(1, 2000).Draw(t, "bus"), Supply: rapid.SampledFrom(supplies).Draw(t, "supply"),
			CapacitanceF: math.Exp(rapid.Float64Range(math.Log(1e-9), math.Log(10)).Draw(t, "log C"))}
		p := plan(t, in)
		for id, lines := range follows {
			above := ""
			for _, l := range p.Limits {
				for _, line := range lines {
					if l.ID == line && l.Above && above == "" {
						above = l.Source
					}
				}
			}
			said := ""
			for _, c := range p.Cautions {
				if c.ID == id {
					said = c.Source
				}
			}
			if above != said {
				t.Fatalf("%g V, %g F, %q: caution %s says %q, the limit %q", in.BusV, in.CapacitanceF, in.Supply, id, said, above)
			}
		}
	})
}

// In every hazard that reaches the board at least one line is the lowest; nothing above a line is left out of it, and what
// is above a line is above the lower ones of the same hazard at the same store.
func TestTheLowestLineIsGoneBy(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := plan(t, Input{BusV: rapid.Float64Range(1, 2000).Draw(t, "bus"), Supply: "battery",
			CapacitanceF: math.Exp(rapid.Float64Range(math.Log(1e-9), math.Log(10)).Draw(t, "log C"))})
		lowest, above := map[string]bool{}, map[string]bool{}
		for _, l := range p.Limits {
			lowest[l.Hazard] = lowest[l.Hazard] || l.Lowest && l.Above
			above[l.Hazard] = above[l.Hazard] || l.Above
			if l.Board == "" || l.Answers == "" || l.Source == "" || l.Short == "" || l.Read == "" || l.Unknown && l.Above {
				t.Fatalf("incomplete: %+v", l)
			}
		}
		for h := range above {
			if above[h] != lowest[h] {
				t.Fatalf("%s: above a line %v, above the lowest %v", h, above[h], lowest[h])
			}
		}
	})
}
