package stress

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// record is one line of a table of check values, by the names of its first line.
type record map[string]string

func table(t *testing.T, name string) []record {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "published", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var out []record
	for _, row := range rows[1:] {
		rec := record{}
		for k, head := range rows[0] {
			rec[head] = row[k]
		}
		out = append(out, rec)
	}
	return out
}

// values are the inputs of a line.
type values map[string]float64

func (r record) inputs(t *testing.T) values {
	t.Helper()
	v := values{}
	for _, field := range strings.Fields(r["inputs"]) {
		name, number, _ := strings.Cut(field, "=")
		x, err := strconv.ParseFloat(number, 64)
		if err != nil {
			t.Fatalf("%v: %v", r, err)
		}
		v[name] = x
	}
	return v
}

func (r record) number(t *testing.T, column string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(r[column], 64)
	if err != nil {
		t.Fatalf("%v: %v", r, err)
	}
	return x
}

// charged is a load current that charges a discharged rcd capacitor with next to nothing stray in the way.
func charged(v values) scene {
	s := ideal(v["V"], v["I"], map[string]float64{"switch.fall_time": straight(v["tf"]), "switch.output_capacitance": 2e-4 * v["C"],
		"freewheel.slope_resistance": 1e-4})
	return s.withNetwork("rcd", math.Max(v["R"], 1e4), v["C"]).put("snubber.diode.slope_resistance", 1e-4)
}

// stepped is a step of V into L with an rc network and current x·V/Z0 already in L; the output capacitance is C.
func stepped(v values) scene {
	amps := v["x"] * v["V"] / math.Sqrt(v["L"]/v["C"])
	s := ideal(v["V"], amps, map[string]float64{"switch.output_capacitance": v["C"]}).winding(v["L"])
	if v["n"] == 0 {
		return s
	}
	return s.withNetwork("rc", v["r"]*math.Sqrt(v["L"]/v["C"]), v["n"]*v["C"])
}

// damped is the same step with an rc network alone.
func damped(v values) scene {
	return ideal(v["V"], v["I"], map[string]float64{"switch.output_capacitance": 1e-9 * v["C"]}).winding(v["L"]).withNetwork("rc", v["R"], v["C"])
}

// ringing is the loop with its output capacitance, and one more capacitor at the terminals.
func ringing(v values) scene {
	s := ideal(v["V"], v["I"], map[string]float64{"loop.inductance": v["L"], "loop.resistance": 0.02 * math.Sqrt(v["L"]/v["C"]), "switch.output_capacitance": v["C"]})
	if v["Cadd"] > 0 {
		s = s.withNetwork("capacitor", 0, v["Cadd"])
	}
	return s
}

// checks are what the edge circuit can be asked; every one solves it.
var checks = map[string]func(*testing.T, values) float64{
	"capacitor_at_end_of_fall": func(t *testing.T, v values) float64 { return solveCut(t, charged(v)).volts(v["tf"]) },
	"stored_energy": func(t *testing.T, v values) float64 {
		return solveCut(t, charged(v)).energy("snubber-capacitor")
	},
	"half_cv2f": func(t *testing.T, v values) float64 {
		return solveCut(t, charged(v)).energy("snubber-capacitor") * v["f"]
	},
	"cv2f": func(t *testing.T, v values) float64 {
		return 2 * solveCut(t, charged(v)).energy("snubber-capacitor") * v["f"]
	},
	"discharge_current": func(t *testing.T, v values) float64 {
		s := charged(v)
		return solveCut(t, s.put("snubber.resistance", v["R"])).Discharge
	},
	"left_after": func(t *testing.T, v values) float64 {
		return ideal(v["V"], 1, nil).withNetwork("rcd", v["R"], v["C"]).put("pwm.shortest_on_time", v["t"]).left()
	},
	"initial_slope": func(t *testing.T, v values) float64 {
		return firstSlope(solveCut(t, damped(v)), 2e-4*math.Sqrt(v["L"]*v["C"]))
	},
	"critical_resistance": criticalResistance,
	"mean_step":           meanStep,
	"ring_from_bus": func(t *testing.T, v values) float64 {
		return solveCut(t, ideal(v["V"], v["I"], map[string]float64{"loop.inductance": v["L"], "switch.output_capacitance": v["C"]})).Peak
	},
	"ring_from_rest": func(t *testing.T, v values) float64 {
		return solveCut(t, ideal(v["V"], v["I"], map[string]float64{"switch.output_capacitance": v["C"]}).winding(v["L"])).Peak
	},
	"ring_frequency": func(t *testing.T, v values) float64 { return solveCut(t, ringing(v)).Ring },
	"ring_ratio": func(t *testing.T, v values) float64 {
		alone := solveCut(t, ringing(v)).Ring
		v["Cadd"] = (v["times"] - 1) * v["C"]
		return solveCut(t, ringing(v)).Ring / alone
	},
	"step_peak":    func(t *testing.T, v values) float64 { return solveCut(t, resisted(v)).Peak },
	"step_damping": func(t *testing.T, v values) float64 { return solveCut(t, resisted(v)).Damping },
	"damped_step": func(t *testing.T, v values) float64 {
		v["V"], v["L"], v["C"] = 100, 100e-9, 1e-9
		return solveCut(t, stepped(v)).Peak / v["V"]
	},
	"mcmurray": func(t *testing.T, v values) float64 {
		v["V"], v["L"], v["C"] = 100, 1e-6, 10e-9
		z := math.Sqrt(v["L"] / v["C"])
		v["R"], v["I"] = 2*v["zeta"]*z, v["xi"]*v["V"]/z
		return solveCut(t, damped(v)).Peak / v["V"]
	},
	"rcd_switch_loss": func(t *testing.T, v values) float64 {
		e, unit := rcdLoss(t, values{"V": 400, "I": 100, "tf": 200e-9, "k": v["k"]})
		return e.energy("switch") / unit
	},
	"rcd_resistor_loss": func(t *testing.T, v values) float64 {
		e, unit := rcdLoss(t, values{"V": 400, "I": 100, "tf": 200e-9, "k": v["k"]})
		return e.energy("snubber-capacitor") / unit // all of it goes into the resistor when the switch closes
	},
	"rcd_total_joule": func(t *testing.T, v values) float64 {
		e, _ := rcdLoss(t, v)
		return e.energy("switch") + e.energy("snubber-capacitor")
	},
}

// resisted is a step without a network, damped by the loop's resistance.
func resisted(v values) scene {
	z := math.Sqrt(v["L"] / v["C"])
	return ideal(v["V"], 0, map[string]float64{"switch.output_capacitance": v["C"], "loop.resistance": 2 * v["zeta"] * z}).winding(v["L"])
}

// rcdLoss is the edge with C = k·I·tf/(2V), and the loss without a network, ½·V·I·tf.
func rcdLoss(t *testing.T, v values) (*Edge, float64) {
	v["C"] = v["k"] * v["I"] * v["tf"] / (2 * v["V"])
	s := charged(v)
	if v["k"] == 0 {
		s = ideal(v["V"], v["I"], map[string]float64{"switch.fall_time": straight(v["tf"]), "switch.output_capacitance": 1e-14, "freewheel.slope_resistance": 1e-3})
	}
	return solveCut(t, s), v["V"] * v["I"] * v["tf"] / 2
}

// firstSlope is the slope just after the step.
func firstSlope(e *Edge, within float64) float64 { return (e.volts(within) - e.Waveform[0].V) / within }

// criticalResistance finds by halving the resistor of an rc network, with no current trapped, at which the peak is
// that of critical damping: 1.135 of the step.
func criticalResistance(t *testing.T, v values) float64 {
	low, high := 1.0, 1e4
	for range 40 {
		v["R"] = math.Sqrt(low * high)
		if solveCut(t, damped(v)).Peak/v["V"] > 1+math.Exp(-2) {
			low = v["R"]
		} else {
			high = v["R"]
		}
	}
	return low
}

// meanStep is the mean of the chip over the bus while the current falls, over whole turns of the ring.
func meanStep(t *testing.T, v values) float64 {
	farad := v["tf"] * v["tf"] / (900 * v["L"]) // some five turns within the fall
	e := solveCut(t, ideal(v["V"], v["I"], map[string]float64{
		"loop.inductance": v["L"], "switch.output_capacitance": farad, "switch.fall_time": straight(v["tf"])}))
	level := v["V"] + v["L"]*v["I"]/v["tf"]
	var up []int
	for k := 1; k < len(e.Waveform) && e.Waveform[k].T < v["tf"]; k++ {
		if e.Waveform[k-1].V < level && e.Waveform[k].V >= level {
			up = append(up, k)
		}
	}
	if len(up) < 2 {
		t.Fatal("no whole turn within the fall")
	}
	area, from, to := 0.0, e.Waveform[up[0]], e.Waveform[up[len(up)-1]]
	for k := up[0] + 1; k <= up[len(up)-1]; k++ {
		a, b := e.Waveform[k-1], e.Waveform[k]
		area += (a.V + b.V) / 2 * (b.T - a.T)
	}
	return area/(to.T-from.T) - v["V"]
}

// Every published example that the edge circuit contains, through the circuit; the known misprints as such.
func TestPublishedExamples(t *testing.T) {
	count := map[string]int{}
	for _, r := range table(t, "edge-examples.csv") {
		count[r["status"]]++
		t.Run(r["id"], func(t *testing.T) {
			if r["source"] == "" {
				t.Error("a check value without a source")
			}
			if r["status"] == "outside" {
				if r["note"] == "" {
					t.Error("outside the circuit without a reason")
				}
				return
			}
			want := r["printed"]
			if r["status"] == "misprint" {
				want = r["true"]
			}
			checkRecord(t, r, want)
		})
	}
	t.Logf("%v", fmt.Sprint(count))
}

func checkRecord(t *testing.T, r record, want string) {
	check, ok := checks[r["check"]]
	if !ok {
		t.Fatalf("no check named %q", r["check"])
	}
	x, tolerance := record{"want": want}.number(t, "want"), r.number(t, "tolerance")
	got := check(t, r.inputs(t))
	if d := relative(got, x); !(d <= tolerance) {
		t.Errorf("%s: %.6g, want %.6g within %g (%s)", r["check"], got, x, tolerance, r["source"])
	}
	if r["status"] == "misprint" && r["printed"] != "" {
		if d := relative(got, r.number(t, "printed")); d <= tolerance {
			t.Errorf("%s gives the misprint %s (%s)", r["check"], r["printed"], r["source"])
		}
	}
}

// The closed forms and computed tables in testdata/published, through the circuit.
func TestComputedTables(t *testing.T) {
	worst := map[string]float64{}
	for _, r := range table(t, "edge-tables.csv") {
		got, want := checks[r["table"]](t, r.inputs(t)), r.number(t, "value")
		d := math.Abs(got - want)
		if strings.HasPrefix(r["table"], "ring_") {
			d = relative(got, want)
		}
		worst[r["table"]] = math.Max(worst[r["table"]], d)
		if !(d <= r.number(t, "tolerance")) {
			t.Errorf("%s %s: %.5f, want %.5f (%s)", r["table"], r["inputs"], got, want, r["source"])
		}
	}
	t.Logf("largest differences: %v", fmt.Sprint(worst))
}
