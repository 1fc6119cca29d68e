package main

import (
	"encoding/json"
	"errors"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"testing"
)

// netlistBoard is a board that a netlist is written of, by the words in which the three differ.
const netlistBoard = `drivemend: 1
case: bench
board:
  topology: TOPOLOGY
  supply: rectified-mains
  build: to-247
  bus: {nominal: 310 V, highest: 340 V, capacitance: 1500 µF, esr: 60 mΩ}
  switch: {kind: KIND, rated_voltage: 900 V, rated_current: 40 A, output_capacitance: 250 pF, fall_time: {value: 110 ns, gate_resistance: 10 Ω}, rise_slope: 8 V/ns, turn_on_slope: 900 A/µs, package_inductance: 13 nH}
  freewheel: {fitted: yes, forward_voltage: 1.3 V, recovery_charge: 400 nC, softness: 0.4, forward_recovery: {voltage: 15 V, time: 100 ns}}
  gate: {turn_off_resistance: 10 Ω}
  loop: {inductance: 120 nH, resistance: 20 mΩ}
  snubber: NETWORK
  load: {running_current: 15 A, stall_current: 40 A}
  pwm: {frequency: 4 kHz, shortest_on_time: 6 µs}
`

// ngspicePeak runs a netlist as it stands. Without ngspice a test is skipped, on a build server it fails.
func ngspicePeak(t *testing.T, file string) float64 {
	t.Helper()
	path, err := exec.LookPath("ngspice")
	if err != nil {
		if os.Getenv("CI") != "" {
			t.Fatal("ngspice is not installed; on a build server the cross-check must run")
		}
		t.Skip("ngspice is not installed (apt install ngspice)")
	}
	run := exec.Command(path, "-b", file)
	run.Dir = t.TempDir()
	out, err := run.CombinedOutput()
	if err != nil {
		t.Fatalf("ngspice on %s: %v\n%.2000s", file, err, out)
	}
	return numberIn(t, `(?m)^peak\s*=\s*(\S+)`, out)
}

func numberIn(t *testing.T, pattern string, text []byte) float64 {
	t.Helper()
	m := regexp.MustCompile(pattern).FindSubmatch(text)
	if m == nil {
		t.Fatalf("no %s in:\n%.3000s", pattern, text)
	}
	v, err := strconv.ParseFloat(string(m[1]), 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// marginRun runs the program on a case and gives what it printed; that a rebuild is not within is no failure here.
func marginRun(t *testing.T, args ...string) []byte {
	t.Helper()
	out, err := exec.Command("drivemend", append([]string{"margin"}, args...)...).Output()
	var exit *exec.ExitError
	if err != nil && !(errors.As(err, &exit) && exit.ExitCode() == exitWithheld) {
		t.Fatalf("margin %v: %v", args, err)
	}
	return out
}

// TestLiveNetlists: what --netlist writes runs unchanged in ngspice and finds the peak that the head, the JSON and
// the solver say, within 1 %.
func TestLiveNetlists(t *testing.T) {
	for _, c := range []struct{ name, topology, kind, network, edge string }{
		{"chopper with rcd", "low-side-chopper", "igbt", "{kind: rcd, capacitance: 22 nF, resistance: 27 Ω, lead_inductance: 20 nH}", ""},
		{"half-bridge with rc", "half-bridge", "igbt", "{kind: rc, capacitance: 4.7 nF, resistance: 8 Ω, lead_inductance: 20 nH}", ""},
		{"its opening", "half-bridge", "igbt", "{kind: rc, capacitance: 4.7 nF, resistance: 8 Ω, lead_inductance: 20 nH}", "turn-off"},
		{"chopper with clamp", "low-side-chopper", "mosfet", "{kind: clamp, capacitance: 470 nF, resistance: 4.7 kΩ, clamp_voltage: 400 V, lead_inductance: 20 nH}", ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			board := netlistBoard
			for word, with := range map[string]string{"TOPOLOGY": c.topology, "KIND": c.kind, "NETWORK": c.network} {
				board = regexp.MustCompile(word).ReplaceAllLiteralString(board, with)
			}
			folder := t.TempDir()
			file, deck := filepath.Join(folder, "bench.yaml"), filepath.Join(folder, "edge.cir")
			if err := os.WriteFile(file, []byte(board), 0o600); err != nil {
				t.Fatal(err)
			}
			args := []string{file, "--json", "--netlist", deck}
			if c.edge != "" {
				args = append(args, "--edge", c.edge)
			}
			var m struct {
				AsFound struct {
					Highest struct {
						PeakV float64 `json:"peak_v"`
					} `json:"highest"`
				} `json:"as_found"`
			}
			if err := json.Unmarshal(marginRun(t, args...), &m); err != nil {
				t.Fatal(err)
			}
			text, err := os.ReadFile(deck)
			if err != nil {
				t.Fatal(err)
			}
			ours := numberIn(t, `(?m)^\* peak: +(\S+) V`, text)
			if c.edge == "" && math.Abs(ours/m.AsFound.Highest.PeakV-1) > 1e-5 {
				t.Errorf("the head says %g V, the figures %g V", ours, m.AsFound.Highest.PeakV)
			}
			theirs := ngspicePeak(t, deck)
			t.Logf("%.2f V, ngspice %.2f V (%+.4f %%)", ours, theirs, 100*(theirs/ours-1))
			if math.Abs(theirs/ours-1) > 0.01 {
				t.Errorf("peak %g V, ngspice %g V", ours, theirs)
			}
			if ours < 320 {
				t.Errorf("the edge hardly passes its bus: %g V proves nothing", ours)
			}
		})
	}
}
