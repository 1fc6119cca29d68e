package knowledge

import (
	"crypto/sha256"
	"io/fs"
	"regexp"
	"strings"
	"testing"
	"testing/fstest"
)

// builtIn gives a file of the built-in base.
func builtIn(t testing.TB, name string) string {
	t.Helper()
	raw, err := fs.ReadFile(embeddedLayer().fsys, name)
	if err != nil {
		t.Fatal(err)
	}
	return string(raw)
}

// shop lays one file of a shop over the built-in base.
func shop(name, content string) error {
	_, err := load(embeddedLayer(), layer{name: "shop", fsys: fstest.MapFS{name: {Data: []byte(content)}}})
	return err
}

// entryOf cuts one entry out of a list.
func entryOf(t testing.TB, list, id string) string {
	t.Helper()
	_, rest, found := strings.Cut(list, "- id: "+id+"\n")
	if !found {
		t.Fatalf("no entry %s", id)
	}
	if end := strings.Index(rest, "\n- "); end >= 0 {
		rest = rest[:end+1]
	}
	return "- id: " + id + "\n" + rest
}

// TestShopMayRepeatTheBase: the whole of the built-in tests, laid over themselves, is no change and is taken.
func TestShopMayRepeatTheBase(t *testing.T) {
	for _, list := range []string{"tests.yaml", "faults.yaml", "stresses.yaml", "signs.yaml"} {
		if err := shop(list, builtIn(t, list)); err != nil {
			t.Errorf("%s over itself: %v", list, err)
		}
	}
}

// TestShopCannotLowerAState replaces all tests of the base by themselves, each with another board state, and counts the
// problems of all of them, which a load cuts short.
func TestShopCannotLowerAState(t *testing.T) {
	b, err := Load()
	if err != nil {
		t.Fatal(err)
	}
	needs := regexp.MustCompile(`(?m)^  needs: .*$`)
	for _, other := range Needs() {
		moved := layer{name: "shop", fsys: fstest.MapFS{"tests.yaml": {Data: []byte(needs.ReplaceAllString(builtIn(t, "tests.yaml"), "  needs: "+other))}}}
		refused := map[string]bool{}
		for _, p := range problemsOf(embeddedLayer(), moved) {
			id, _, _ := strings.Cut(p.Key, ".")
			refused[id] = refused[id] || p.File == "shop/tests.yaml" && p.Line > 0 && p.Hint != ""
		}
		for i := range b.Tests {
			if x := &b.Tests[i]; x.Computed == "" && refused[x.ID] == (x.Needs == other) {
				t.Errorf("%s needs %s: with %s refused %v", x.ID, x.Needs, other, refused[x.ID])
			}
		}
	}
}

// problemsOf gives all problems of a load.
func problemsOf(layers ...layer) Problems {
	faults := &collector{}
	merged := newMerge(faults)
	for _, l := range layers {
		readLayer(l, merged, sha256.New(), faults)
	}
	d := newDecoder(faults)
	d.decode(merged)
	d.crossCheck()
	return faults.list
}

// TestShopChangesATest replaces tests of the base by themselves with something changed.
func TestShopChangesATest(t *testing.T) {
	for _, c := range []struct {
		name, id, old, new, want string // no want: the change is the shop's to make
	}{
		{"title and minutes", "power-terminals-resistance", "  minutes: 2\n", "  minutes: 6\n", ""},
		{"fewer results that pass", "power-terminals-resistance", "static: [bleeder, blocking]", "static: [blocking]", ""},
		{"on more boards", "reverse-diode-drop", "  static_on: {topology: [half-bridge, h-bridge, three-phase, other]}\n", "", ""},
		{"another caution", "driver-output-check", "cautions: [ohms-only-dead]", "cautions: [static-on-gates, ohms-only-dead]", ""},
		{"other chances", "driver-look", "{cratered: 0.6, whole: 0.4}", "{cratered: 0.5, whole: 0.5}", ""},
		{"static at last", "gate-clamp-check", "  must: yes\n", "  must: yes\n  static: [good]\n", ""},
		{"static dropped", "power-terminals-resistance", "  static: [bleeder, blocking]\n", "", "has no result that passes before power"},
		{"a short that passes", "power-terminals-resistance", "static: [bleeder, blocking]", "static: [bleeder, blocking, shorted]", "lets shorted pass"},
		{"a short that reads as blocking", "power-terminals-resistance", "blocking: {median: 20 MΩ, times: 5}", "blocking: {median: 1 Ω, times: 5}", "results: is shorted 0.5 times 3"},
		{"on fewer boards", "reverse-diode-drop", "static_on: {topology: [half-bridge, h-bridge, three-phase, other]}", "static_on: {topology: [other]}", "static_on: is topology other"},
		{"not on any board", "power-terminals-resistance", "  needs: dead\n", "  needs: dead\n  applies: {topology: [other]}\n", "applies: is topology other"},
		{"of another event", "gate-resistance", "observes: gate-leaky", "observes: gate-rings", "observes: is gate-rings"},
		{"of a whole position", "gate-resistance", "  per: part\n", "", "per is not given"},
		{"a pulse by scope", "scoped-overshoot", "instrument: double-pulse", "instrument: scope", "instrument: is scope, but double-pulse"},
		{"a current by meter", "survivor-on-voltage", "instrument: supply", "instrument: meter", "instrument: is meter, but supply"},
		{"without an instrument", "connector-drop", "  instrument: supply\n", "", "does not say what it is done with"},
		{"a tester by meter", "motor-insulation", "instrument: insulation-tester", "instrument: meter", `the instrument of the test is meter`},
		{"a caution less", "driver-output-check", "  cautions: [ohms-only-dead]\n", "", "lacks the caution ohms-only-dead"},
		{"a fault that speaks for nothing", "gate-clamp-check", "present: {failed: 0.92, good: 0.08}", "present: {failed: 0.03, good: 0.97}", "makes failed speak against gate-clamp-lost"},
	} {
		entry := entryOf(t, builtIn(t, "tests.yaml"), c.id)
		if strings.Count(entry, c.old) != 1 {
			t.Errorf("%s: %q stands %d times in %s", c.name, c.old, strings.Count(entry, c.old), c.id)
			continue
		}
		err := shop("tests.yaml", strings.Replace(entry, c.old, c.new, 1))
		if c.want == "" && err != nil || c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want)) {
			t.Errorf("%s: got %v, want %q", c.name, err, c.want)
		}
	}
}

// TestShopCannotHideAnEvent: an event that a static test observes holds for as many boards as before.
func TestShopCannotHideAnEvent(t *testing.T) {
	entry := entryOf(t, builtIn(t, "faults.yaml"), "switch-shorted")
	narrow := strings.Replace(entry, "  title:", "  applies: {topology: [other]}\n  title:", 1)
	if err := shop("faults.yaml", narrow); err == nil || !strings.Contains(err.Error(), "switch-shorted.applies: is topology other, but not given") {
		t.Errorf("got %v", err)
	}
	if err := shop("faults.yaml", regexp.MustCompile(`title: .*`).ReplaceAllString(entry, "title: Seen often")); err != nil {
		t.Errorf("a title: %v", err)
	}
}

// TestSecondShopIsJudgedByTheBase: a layer between does not make way for the next one.
func TestSecondShopIsJudgedByTheBase(t *testing.T) {
	entry := entryOf(t, builtIn(t, "tests.yaml"), "power-terminals-resistance")
	open := strings.Replace(entry, "  static: [bleeder, blocking]\n", "", 1)
	two := func(text string) layer { return layer{fsys: fstest.MapFS{"tests.yaml": {Data: []byte(text)}}} }
	if _, err := load(embeddedLayer(), two(open), two(open)); err == nil || !strings.Contains(err.Error(), "base/tests.yaml") {
		t.Errorf("got %v", err)
	}
	if _, err := load(embeddedLayer(), two(open), two(entry)); err != nil {
		t.Errorf("a layer that is mended by the next one: %v", err)
	}
}

// TestNeedsOf: what touches the board is never read before a hold point.
func TestNeedsOf(t *testing.T) {
	for _, instrument := range Instruments() {
		needs := NeedsOf(instrument)
		harmless := instrument == "eye" || instrument == "question" || instrument == "none"
		if harmless != (needs == nil) || contains(needs, "question") {
			t.Errorf("%s may be used in %v", instrument, needs)
		}
	}
}
