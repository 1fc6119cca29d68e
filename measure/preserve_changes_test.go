package measure

import (
	"fmt"
	"reflect"
	"slices"
	"strings"
	"testing"
	"time"

	"drivemend/measure/quantity"
)

// appends are changes that let a list grow, one for each mutator that does.
func appends(note string) []alteration {
	at := "2026-12-01T10:00:00+01:00"
	volts := quantity.Of(0.5, quantity.Volt)
	entry := func(pairs ...string) map[string]string {
		out := map[string]string{}
		for i := 0; i < len(pairs); i += 2 {
			if pairs[i+1] != "" {
				out[pairs[i]] = pairs[i+1]
			}
		}
		return out
	}
	sum := strings.Repeat("ab", 32)
	day := time.Date(2025, 6, 30, 0, 0, 0, 0, time.UTC)
	return []alteration{
		{"observe", func(f *File) error {
			return f.Observe(Observation{Test: "fan-turns", Result: "no", At: tenOClock, Note: note})
		},
			"observations", entry("test", "fan-turns", "result", "no", "at", at, "note", note), "", ""},
		{"isolate", func(f *File) error {
			return f.Isolate(Isolation{Locked: true, Motor: "unplugged", OtherSources: "none", At: tenOClock})
		}, "safety.isolation", entry("locked", "yes", "motor", "unplugged", "other_sources", "none", "at", at), "", ""},
		{"check", func(f *File) error {
			return f.Check(DeadCheck{Point: "bus", DC: volts, AC: volts, MeterProved: true, At: tenOClock})
		},
			"safety.dead_checks", entry("point", "bus", "dc", "0.5 V", "ac", "0.5 V", "meter_proved", "yes", "at", at), "", ""},
		{"fit link", func(f *File) error { return f.FitLink(tenOClock) }, "safety.link", entry("fitted", at), "", ""},
		{"energise", func(f *File) error { return f.Energise(Energised{What: "shaft", At: tenOClock}) },
			"safety.energised", entry("what", "shaft", "at", at), "", ""},
		{"state before", func(f *File) error {
			return f.StateBefore(Before{Step: BeforeFull, At: tenOClock, Motor: "uncoupled", Guard: true, Glasses: true, Fuse: quantity.Of(10, quantity.Ampere),
				Bank: "in-use", Note: note})
		}, "safety.before", entry("step", "full", "at", at, "motor", "uncoupled", "guard", "yes", "glasses", "yes", "fuse", "10 A", "bank", "in-use", "note", note), "", ""},
		{"add repair", func(f *File) error {
			return f.AddRepair(Repair{Part: "R12", Work: "replaced", Done: day, Because: note})
		},
			"repairs", entry("part", "R12", "work", "replaced", "done", "2025-06-30", "because", note), "", ""},
		{"add fault code", func(f *File) error { return f.AddFaultCode(FaultCode{Code: "E07", Count: 3, Note: note}) },
			"fault_log", entry("code", "E07", "count", "3", "note", note), "", ""},
		{"add setting", func(f *File) error { return f.AddSetting(Setting{Name: "P-12", Value: "20 kHz", Note: note}) },
			"settings", entry("name", "P-12", "value", "20 kHz", "note", note), "", ""},
		{"add photograph", func(f *File) error {
			return f.AddPhotograph(Photograph{Path: "a b.jpg", At: tenOClock, Bytes: 240311, SHA256: sum, Shows: note})
		}, "photographs", entry("path", "a b.jpg", "at", at, "bytes", "240311", "sha256", sum, "shows", note), "", ""},
		{"add capture", func(f *File) error {
			return f.AddCapture(Capture{Name: "a.csv", Kind: "scope", Bytes: 7, SHA256: sum, Note: note})
		},
			"captures", entry("name", "a.csv", "kind", "scope", "bytes", "7", "sha256", sum, "note", note), "", ""},
		{"add step", func(f *File) error {
			return f.AddStep(StepEntry{Step: StepPhotographed, Result: "done", At: tenOClock, Note: note})
		},
			"steps", entry("step", "photographed", "result", "done", "at", at, "note", note), "", ""},
		{"assume", func(f *File) error { return f.Assume("bus.esr") }, "board.assumed", map[string]string{"": "bus.esr"}, "", ""},
	}
}

// changes are changes of one key: set, cleared, a link taken off, the rebuild done.
func changes(f *File, text string) []alteration {
	var out []alteration
	for path, value := range map[string]string{"owner": text, "story": text, "board.title": text, "board.bus.nominal": "325 V", "board.bus.esr": "41 mΩ",
		"board.switch.fall_time": "50 ns", "board.loop.inductance": "80 nH", "rebuild.snubber.kind": "rc", "outcome.stress": "stress-1"} {
		if value != "" {
			out = append(out, alteration{"set " + path, set(path, value), "", nil, path, value})
		}
		out = append(out, alteration{"clear " + path, take(path), "", nil, path, ""})
	}
	at := tenOClock.Add(time.Hour)
	out = append(out, alteration{"mark rebuilt", func(f *File) error { return f.MarkRebuilt(at) }, "", nil, "rebuild.done", stamp(at)})
	if n := len(f.Case.Safety.Links); n > 0 && f.Case.Safety.Links[n-1].Removed.IsZero() {
		out = append(out, alteration{"remove link", func(f *File) error { return f.RemoveLink(at) }, "", nil,
			fmt.Sprintf("safety.link[%d].removed", n-1), stamp(at)})
	}
	slices.SortFunc(out, func(a, b alteration) int { return strings.Compare(a.name, b.name) })
	return out
}

// TestRecordComesBack proves that each entry of the record comes back as it was given, every key of it.
func TestRecordComesBack(t *testing.T) {
	f := mustParse(t, head+"board: {topology: half-bridge}\n")
	sum := strings.Repeat("0f", 32)
	day := time.Date(2025, 6, 30, 0, 0, 0, 0, time.UTC)
	repair := Repair{Part: "R12", Position: "high", By: "A. Bench", Work: "replaced", Was: "27R", Fitted: "22R", Because: "open", Note: "a: #b", Done: day}
	code := FaultCode{Code: "E07", Text: "over-current", At: "5199 h", Note: "last", Count: 3}
	setting := Setting{Name: "P-12", Value: "20 kHz", Note: "as found"}
	picture := Photograph{Path: "a/b.jpg", Shows: "all", Part: "Q2", SHA256: sum, Bytes: 240311, At: tenOClock}
	step := StepEntry{Step: StepMotorTested, By: "A. Bench", Note: "2 MΩ", Result: "not-possible", At: tenOClock}
	power := Before{Step: BeforeControlPower, At: tenOClock, Motor: "wheels-up", BrakeResistor: "connected", Bank: "re-formed",
		Guard: true, RemoteOff: true, Glasses: true, SecondPerson: true, BusDisconnected: true, Note: "x"}
	injection := Before{Step: BeforeInjection, At: tenOClock, SourcesOff: true, GatesHeld: true, LimitSet: true, Attended: true}
	scope := Before{Step: BeforeScope, At: tenOClock, Probe: "earth-clip", ClipOn: "live-node", Supply: "isolated", EarthClips: 1}
	for _, err := range []error{f.AddRepair(repair), f.AddFaultCode(code), f.AddSetting(setting), f.AddPhotograph(picture), f.AddStep(step),
		f.StateBefore(power), f.StateBefore(injection), f.StateBefore(scope), f.StateBefore(Before{Step: BeforeDoublePulse, At: tenOClock, Shield: true}),
		f.StateBefore(Before{Step: BeforeInsulation, At: tenOClock, ElectronicsDisconnected: true})} {
		if err != nil {
			t.Fatal(err)
		}
	}
	c := f.Case
	for i, b := range []Before{power, injection, scope} {
		same(t, c.Safety.Before[i], b)
	}
	if !c.Safety.Before[3].Shield || !c.Safety.Before[4].ElectronicsDisconnected {
		t.Error("shield and electronics are lost")
	}
	same(t, c.Repairs[0], repair)
	same(t, c.FaultLog[0], code)
	same(t, c.Settings[0], setting)
	same(t, c.Photographs[0], picture)
	same(t, c.Steps[0], step)
}

// same compares an entry with what was given, its line left out.
func same[E any](t *testing.T, got, want E) {
	t.Helper()
	v := reflect.ValueOf(&got).Elem()
	v.FieldByName("Line").SetInt(0)
	if at := v.FieldByName("At"); at.IsValid() && at.Type() == reflect.TypeFor[time.Time]() {
		if wanted := reflect.ValueOf(want).FieldByName("At"); at.Interface().(time.Time).Equal(wanted.Interface().(time.Time)) {
			at.Set(wanted)
		}
	}
	if !reflect.DeepEqual(got, want) {
		t.Errorf("came back as %+v, was %+v", got, want)
	}
}
