package stress

import (
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"
)

// needNgspice skips a test where ngspice is not installed; on a build server it fails.
func needNgspice(t testing.TB) {
	t.Helper()
	if _, err := exec.LookPath("ngspice"); err == nil {
		return
	}
	if os.Getenv("CI") != "" {
		t.Fatal("ngspice is not installed; on a build server the cross-check must run")
	}
	t.Skip("ngspice is not installed (apt install ngspice)")
}

// ngspice runs a hand-written deck and gives its measures.
func ngspice(t testing.TB, file string) map[string]float64 {
	t.Helper()
	needNgspice(t)
	found, err := spiceFile(file, handLimit)
	if err != nil {
		t.Fatal(err)
	}
	if _, ok := found["peak"]; !ok {
		t.Fatalf("ngspice on %s gave no peak", file)
	}
	return found
}

// How long ngspice may take; a deck on which it loses itself in vanishing steps would take for ever. One that does not
// come through in time is tried with other options (see deck.run).
const (
	spiceLimit = 1500 * time.Millisecond
	handLimit  = time.Minute
)

var measured = regexp.MustCompile(`(?m)^\s*(\w+)\s*=\s*(\S+)`)

// spiceFile runs a deck and gives its measures. Decks write nothing but to the folder they lie in.
func spiceFile(file string, patience time.Duration) (map[string]float64, error) {
	file, err := filepath.Abs(file)
	if err != nil {
		return nil, err
	}
	limit, stop := context.WithTimeout(context.Background(), patience)
	defer stop()
	run := exec.CommandContext(limit, "ngspice", "-b", file)
	run.Dir = filepath.Dir(file)
	out, err := run.CombinedOutput()
	if err != nil {
		return nil, fmt.Errorf("ngspice on %s: %w\n%.2000s", file, err, out)
	}
	for _, bad := range []string{"Timestep too small", "simulation(s) aborted", "singular matrix"} {
		if strings.Contains(string(out), bad) {
			return nil, fmt.Errorf("ngspice on %s: %s", file, bad)
		}
	}
	found := map[string]float64{}
	for _, m := range measured.FindAllSubmatch(out, -1) {
		if v, err := strconv.ParseFloat(string(m[2]), 64); err == nil {
			found[string(m[1])] = v
		}
	}
	return found, nil
}

// curve reads what ngspice wrote of one waveform: pairs of time and value.
func curve(file string) ([]Sample, error) {
	text, err := os.ReadFile(file)
	if err != nil {
		return nil, err
	}
	var out []Sample
	words := strings.Fields(string(text))
	for k := 0; k+1 < len(words); k += 2 {
		at, err := strconv.ParseFloat(words[k], 64)
		v, other := strconv.ParseFloat(words[k+1], 64)
		if err = errors.Join(err, other); err != nil {
			return nil, err
		}
		out = append(out, Sample{at, v})
	}
	return out, nil
}
