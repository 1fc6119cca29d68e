package stress

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// netlist is a deck being written.
type netlist struct {
	text    strings.Builder
	options string  // instead of the usual ones
	loss    float64 // Ω beside each henry: what the ring loses by eddy currents
}

func (n *netlist) line(format string, args ...any) { fmt.Fprintf(&n.text, format+"\n", args...) }

// at writes a line in which # stands for the name of the part it belongs to.
func (n *netlist) at(part, format string, args ...any) {
	n.line(strings.ReplaceAll(format, "#", part), args...)
}

// coil writes a stray inductance with the loss of its ring beside it.
func (n *netlist) coil(name, a, b string, henry float64) {
	if henry < 1e-11 {
		n.line("R%s %s %s 10u", name, a, b)
		return
	}
	n.line("L%s %s %s %.6g", name, a, b, henry)
	if n.loss > 0 {
		n.line("R%sx %s %s %.6g", name, a, b, n.loss*henry)
	}
}

// waves are the vectors of one run, by their names.
type waves struct {
	time []float64
	all  map[string][]float64
}

// difference is one voltage less another.
func (w waves) difference(a, b string) []float64 {
	v := make([]float64, len(w.time))
	for k := range v {
		v[k] = w.all[a][k] - w.all[b][k]
	}
	return v
}

// ngspiceThere skips a test where ngspice is missing; on a build server it fails.
func ngspiceThere(t *testing.T) bool {
	t.Helper()
	_, err := exec.LookPath("ngspice")
	if err != nil && os.Getenv("CI") != "" {
		t.Fatal("ngspice is not installed; on a build server the cross-check must run")
	}
	if err != nil {
		t.Skip("ngspice is not installed (apt install ngspice)")
	}
	return err == nil
}

// solve runs the deck for that many seconds with steps of at most step; it tries gentler options when the first fail.
func (n *netlist) solve(seconds, step float64, saved ...string) (waves, error) {
	path, err := exec.LookPath("ngspice")
	if err != nil {
		return waves{}, err
	}
	var failed []error
	usual := "reltol=1e-3 method=trap"
	if n.options != "" {
		usual = n.options
	}
	for k, options := range []string{usual, "reltol=1e-3 method=gear itl1=500", "reltol=3e-3 method=gear itl1=1000 itl4=300"} {
		w, err := n.try(path, options, seconds, step/float64(1+k), saved)
		if err == nil {
			return w, nil
		}
		failed = append(failed, fmt.Errorf("with %s: %w", options, err))
	}
	return waves{}, errors.Join(failed...)
}

func (n *netlist) try(path, options string, seconds, step float64, saved []string) (waves, error) {
	dir, err := os.MkdirTemp("", "reference") // emptied at once: a whole set of boards would fill the disk
	if err != nil {
		return waves{}, err
	}
	defer os.RemoveAll(dir)
	file := filepath.Join(dir, "deck.cir")
	head := fmt.Sprintf("* reference\n.options %s abstol=1e-6 vntol=1e-5 chgtol=1e-15 itl4=100\n", options)
	tail := fmt.Sprintf(".save %s\n.tran %.6g %.6g 0 %.6g\n.end\n", strings.Join(saved, " "), step, seconds, step)
	text := head + n.text.String() + tail
	if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
		return waves{}, err
	}
	run := exec.Command(path, "-b", "-r", filepath.Join(dir, "raw"), file)
	run.Dir = dir
	out, err := run.CombinedOutput()
	if err != nil {
		return waves{}, fmt.Errorf("ngspice: %w, %s", err, complaint(out))
	}
	raw, err := os.ReadFile(filepath.Join(dir, "raw"))
	if err != nil {
		return waves{}, fmt.Errorf("no result, %s", complaint(out))
	}
	w, err := readRaw(raw)
	if err != nil {
		return waves{}, err
	}
	if k := len(w.time); k < 20 || w.time[k-1] < 0.999*seconds {
		return waves{}, fmt.Errorf("stopped after %d points, %s", k, complaint(out))
	}
	for _, name := range saved {
		if w.all[strings.ToLower(name)] == nil {
			return waves{}, fmt.Errorf("no vector %s", name)
		}
	}
	return w, nil
}

// complaint is what ngspice said of an error, in one line.
func complaint(out []byte) string {
	for _, line := range strings.Split(string(out), "\n") {
		if low := strings.ToLower(line); strings.Contains(low, "error") || strings.Contains(low, "too small") {
			return fmt.Sprintf("%.160s", strings.TrimSpace(line))
		}
	}
	return "without a word"
}

// readRaw reads a result file: a head in text, then the points as binary doubles.
func readRaw(raw []byte) (waves, error) {
	w := waves{all: map[string][]float64{}}
	head, body, ok := bytes.Cut(raw, []byte("Binary:\n"))
	if !ok {
		return w, errors.New("the result file holds no points")
	}
	var names []string
	points, listing := 0, false
	for _, line := range strings.Split(string(head), "\n") {
		field := strings.Fields(line)
		switch {
		case strings.HasPrefix(line, "No. Points:"):
			points, _ = strconv.Atoi(field[2])
		case strings.HasPrefix(line, "Variables:"):
			listing = true
		case listing && len(field) >= 3:
			names = append(names, field[1])
		}
	}
	if len(names) == 0 || len(body) < 8*points*len(names) {
		return w, errors.New("the result file is short")
	}
	for k, name := range names {
		v := make([]float64, points)
		for i := range v {
			v[i] = math.Float64frombits(binary.LittleEndian.Uint64(body[8*(i*len(names)+k):]))
		}
		w.all[strings.ToLower(name)] = v
	}
	w.time = w.all["time"]
	return w, nil
}

// top is the highest value and when it was reached.
func (w waves) top(v []float64) (peak, at float64) {
	peak = math.Inf(-1)
	for k, x := range v {
		if x > peak {
			peak, at = x, w.time[k]
		}
	}
	return peak, at
}

// before is how many points lie before a moment.
func (w waves) before(moment float64) int {
	k, _ := slices.BinarySearch(w.time, moment)
	return k
}

// crossing is the first time from a moment on at which v passes a level, upwards or downwards; NaN when it does not.
func (w waves) crossing(v []float64, level, from float64, up bool) float64 {
	for k := 1; k < len(v); k++ {
		if w.time[k] < from {
			continue
		}
		a, b := v[k-1]-level, v[k]-level
		if !up {
			a, b = -a, -b
		}
		if a < 0 && b >= 0 {
			return w.time[k-1] + (w.time[k]-w.time[k-1])*a/(a-b)
		}
	}
	return math.NaN()
}

// steepest is the largest slope of v between two moments, over stretches of at least span seconds.
func (w waves) steepest(v []float64, from, to, span float64) float64 {
	best, i := 0.0, 0
	for k := range v {
		if w.time[k] < from || w.time[k] > to {
			i = k
			continue
		}
		for i < k && w.time[k]-w.time[i+1] >= span {
			i++
		}
		if d := w.time[k] - w.time[i]; d >= span {
			best = max(best, math.Abs(v[k]-v[i])/d)
		}
	}
	return best
}

// integral is that of v between two moments.
func (w waves) integral(v []float64, from, to float64) float64 {
	sum := 0.0
	for k := 1; k < len(v); k++ {
		if w.time[k-1] >= from && w.time[k] <= to {
			sum += (v[k] + v[k-1]) / 2 * (w.time[k] - w.time[k-1])
		}
	}
	return sum
}

// mean is that of v from a moment on.
func (w waves) mean(v []float64, from float64) float64 {
	last := w.time[len(w.time)-1]
	return w.integral(v, from, last) / (last - from)
}
