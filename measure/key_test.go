package measure

import (
	"math"
	"slices"
	"strings"
	"testing"

	"drivemend/measure/quantity"
)

func TestKeyTable(t *testing.T) {
	seen := map[string]bool{}
	for _, k := range Keys() {
		if seen[k.Path] {
			t.Errorf("%s stands twice", k.Path)
		}
		seen[k.Path] = true
		if k.Help == "" || strings.ContainsAny(k.Help, "\n") {
			t.Errorf("%s has no help in one line", k.Path)
		}
		leaf := k.Kind != KindMap && k.Kind != KindNamed && k.Kind != KindList && !k.isCondition()
		if leaf && len(k.Users) == 0 {
			t.Errorf("%s has no user", k.Path)
		}
		if k.Min > k.Max {
			t.Errorf("%s has its range the wrong way round", k.Path)
		}
		if (k.Kind == KindWord || k.Kind == KindYesNo) && len(k.Words) < 2 {
			t.Errorf("%s has no choice of words", k.Path)
		}
		if k.Kind == KindQuantity && k.Unit == "" {
			t.Errorf("%s has no unit", k.Path)
		}
		if got, ok := LookupKey(k.Path); !ok || got.Path != k.Path {
			t.Errorf("%s is looked up as %q, %v", k.Path, got.Path, ok)
		}
	}
	if len(seen) < 250 {
		t.Errorf("only %d keys", len(seen))
	}
}

func TestLookupKey(t *testing.T) {
	tests := []struct{ path, want string }{
		{"switch.kind", "board.switch.kind"},
		{"board.switch.kind", "board.switch.kind"},
		{"positions.u-low.parts", "board.positions.*.parts"},
		{"positions.low.fall_time.voltage", "board.positions.*.fall_time.voltage"},
		{"observations[3].reading", "observations[].reading"},
		{"rebuild.snubber.diode.forward_recovery.time", "rebuild.snubber.diode.forward_recovery.time"},
		{"rebuild.cooling.foster[2].time", "rebuild.cooling.foster[].time"},
		{"board.bus", "board.bus"}, {"bus", "board.bus"}, {"safety.before", "safety.before"}, {"steps", "steps"},
		{"steps[].step", "steps[].step"}, {"steps.step", "steps[].step"}, {"safety.before.guard", "safety.before[].guard"},
		{"steps[]", "steps[]"}, {"steps[2]", "steps[]"}, {"locate.low.rises.part", "locate.*.rises[].part"},
		{"swich.kind", ""}, {"", ""}, {".", ""}, {"observations[", ""}, {"observations[1]x", ""}, {"board..kind", ""},
		{"switch.kind.igbt", ""},
	}
	for _, tt := range tests {
		if k, _ := LookupKey(tt.path); k.Path != tt.want {
			t.Errorf("%q gives %q, want %q", tt.path, k.Path, tt.want)
		}
	}
}

func TestNearestKey(t *testing.T) {
	tests := []struct{ path, want string }{
		{"swich.kind", "switch.kind"},
		{"board.swich.kind", "board.switch.kind"},
		{"bus.capacitence", "bus.capacitance"},
		{"recovery_charge", "freewheel.recovery_charge"},
		{"loop.induktance", "loop.inductance"},
		{"repair", "repairs"}, {"fault_logs", "fault_log"}, {"safety.befor", "safety.before"}, {"step", "steps"}, {"setings", "settings"},
		{"steps.result", "steps[].result"}, {"steps[2].reslt", "steps[].result"}, {"steps.stp", "steps[].step"},
		{"safety.before[1].remote-off", "safety.before[].remote_off"}, {"photographs.sha265", "photographs[].sha256"},
		{"observations[1].größer", ""}, {"safety.before[1].goggles", ""},
		{"zzzzzzzz", ""},
	}
	for _, tt := range tests {
		if got := NearestKey(tt.path); got != tt.want {
			t.Errorf("%q gives %q, want %q", tt.path, got, tt.want)
		}
	}
}

// TestConditionsBelong proves that each condition stated before a step belongs to known steps, and that nothing else is
// listed.
func TestConditionsBelong(t *testing.T) {
	free := map[string]bool{"step": true, "at": true, "note": true}
	names := keyTable().find("safety.before[]").names
	for _, name := range names {
		takes := beforeTakes[name]
		if (takes == nil) != free[name] {
			t.Errorf("%s belongs to %q", name, takes)
		}
		for _, step := range takes {
			if !slices.Contains(BeforeWords(), step) {
				t.Errorf("%s belongs to %s, which is no step", name, step)
			}
		}
	}
	for name := range beforeTakes {
		if !slices.Contains(names, name) {
			t.Errorf("%s is listed, but is no condition", name)
		}
	}
}

// TestEveryKeyCanBeSet sets each key that holds one value, in a file of its own, and reads it back.
func TestEveryKeyCanBeSet(t *testing.T) {
	for _, k := range Keys() {
		if strings.Contains(k.Path, "[]") || strings.HasPrefix(k.Path, "locate.") || k.Path == "drivemend" || k.Path == "board.assumed" ||
			k.Path == "rebuild.assumed" {
			continue
		}
		text, ok := sampleOf(k)
		if !ok {
			continue
		}
		path := strings.Replace(k.Path, "*", "low", 1)
		f := mustParse(t, head+"board: {topology: low-side-chopper}\n")
		if of := strings.TrimSuffix(path, path[strings.LastIndex(path, ".")+1:]); k.isCondition() {
			parent, _ := LookupKey(strings.TrimSuffix(of, "."))
			first, _ := sampleOf(parent)
			if err := f.Set(strings.TrimSuffix(of, "."), first); err != nil {
				t.Errorf("%s: %v", of, err)
			}
		}
		if err := f.Set(path, text); err != nil {
			t.Errorf("%s: %v\n%s", path, err, f.Bytes())
			continue
		}
		checkSet(t, f, k, path, text)
		if err := f.Clear(path); err != nil && !k.Required {
			t.Errorf("%s cannot be taken out: %v", path, err)
		}
	}
}

// checkSet compares a set key of the board or the rebuild with what was set.
func checkSet(t *testing.T, f *File, k Key, path, text string) {
	t.Helper()
	b := f.Case.Board
	if rest, ok := strings.CutPrefix(path, "rebuild."); ok {
		path, b = rest, f.Case.Rebuild.Board
	} else if !strings.HasPrefix(path, "board.") {
		return
	}
	path = strings.TrimSuffix(path, ".value")
	switch k.Kind {
	case KindQuantity, KindRatio, KindCount:
		want, err := quantity.Parse(text, k.Unit)
		got, ok := b.Quantity(path)
		if err != nil || !ok || math.Abs(got.Value-want.Value) > 1e-9*math.Abs(want.Value) {
			t.Errorf("%s is %v, %v; set was %s", path, got, ok, text)
		}
	case KindWord, KindYesNo, KindText:
		if got, ok := b.Word(path); !ok || got != text {
			t.Errorf("%s is %q, %v; set was %s", path, got, ok, text)
		}
	}
}

// sampleOf gives a value that fits a key; false for groups.
func sampleOf(k Key) (string, bool) {
	switch k.Kind {
	case KindQuantity, KindRatio, KindCount:
		v := (k.Min + k.Max) / 2
		if k.Min > 0 {
			v = math.Sqrt(k.Min * k.Max)
		}
		if k.Kind == KindCount {
			return quantity.Format(math.Round(v), k.Unit), true
		}
		return quantity.Format(v, k.Unit), true
	case KindWord, KindYesNo:
		return k.Words[0], true
	case KindText:
		return "plain: text", true
	case KindName:
		return "name", true
	case KindTime:
		return "2026-12-01T10:00:00+01:00", true
	case KindDate:
		return "2026-12-01", true
	case KindList:
		return "Q1 Q2", !hasItems(k)
	}
	return "", false
}

func TestDistance(t *testing.T) {
	tests := []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"abc", "abc", 0}, {"abc", "", 3}, {"abc", "acb", 1}, {"abc", "abcd", 1}, {"abc", "xbc", 1},
		{"kitten", "sitting", 3}, {"µH", "uH", 1},
	}
	for _, test := range tests {
		if got := Distance(test.a, test.b); got != test.want || Distance(test.b, test.a) != got {
			t.Errorf("Distance(%q, %q) = %d, want %d", test.a, test.b, got, test.want)
		}
	}
}
