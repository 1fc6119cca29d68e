package stress

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// BenchmarkAgainstNgspice solves the same cut edges on one core by the solver, only the peak wanted, and by ngspice
// with the first options of the cross-check, all circuits in one process, its start-up taken off. Both follow the edge
// for the same time, and neither is timed while its boards are drawn and its decks written. Ratio is how many times faster
// the solver is.
func BenchmarkAgainstNgspice(b *testing.B) {
	needNgspice(b)
	scenes, decks := edgesForBoth(b, 24)
	run := func(decks []string) time.Duration { return wallTime(b, inOneProcess(b.TempDir(), decks)) }
	start := time.Duration(1 << 62)
	for range 3 {
		start = min(start, run(nil))
	}
	theirs := (run(decks) - start).Seconds() / float64(len(decks))
	for b.Loop() {
		for _, s := range scenes {
			if _, err := s.cut(); err != nil {
				b.Fatal(err)
			}
		}
	}
	ours := b.Elapsed().Seconds() / float64(b.N*len(scenes))
	b.ReportMetric(1/ours, "edges/s")
	b.ReportMetric(1/theirs, "ngspice-edges/s")
	b.ReportMetric(theirs/ours, "ratio")
	b.ReportMetric(0, "ns/op")
}

// edgesForBoth draws boards whose cut edge ngspice comes through with the first options, of all topologies and
// networks in turn, with their decks.
func edgesForBoth(b *testing.B, count int) (scenes []scene, decks []string) {
	b.Helper()
	for n, of := range recipes() {
		if of.edge != shapeCut || len(scenes) == count {
			continue
		}
		one := drawSample(uint64(n), of)
		s := one.scene()
		window := s.span()
		d := one.opening()
		d.channels(func() { d.put("ich", "ch", "0", "pwl(0 %.12g %.12g 0)", one.amps, one.fall/0.8) })
		d.line("%s %s", spiceAlways, spiceOptions[0])
		step := one.step(window)
		d.line(".tran %.6g %.6g 0 %.6g uic", step, window, step)
		text := d.text.String()
		file := filepath.Join(b.TempDir(), "alone.cir")
		if err := os.WriteFile(file, []byte(text+".meas tran peak max v(chip)\n.end\n"), 0o600); err != nil {
			b.Fatal(err)
		}
		if _, err := spiceFile(file, spiceLimit); err == nil {
			scenes, decks = append(scenes, s), append(decks, text+".end\n")
		}
	}
	return scenes, decks
}

// inOneProcess writes the decks and one that loads and runs them one after the other.
func inOneProcess(dir string, decks []string) string {
	var all strings.Builder
	all.WriteString("* one after the other\nv1 a 0 1\nr1 a 0 1\n.control\n")
	for k, deck := range decks {
		name := fmt.Sprintf("%d.cir", k)
		_ = os.WriteFile(filepath.Join(dir, name), []byte(deck), 0o600)
		fmt.Fprintf(&all, "source %s\nrun\nmeas tran peak max v(chip)\ndestroy all\nremcirc\n", name)
	}
	all.WriteString("quit\n.endc\n.end\n")
	file := filepath.Join(dir, "all.cir")
	_ = os.WriteFile(file, []byte(all.String()), 0o600)
	return file
}

// wallTime runs a deck and gives how long it took.
func wallTime(b *testing.B, file string) time.Duration {
	b.Helper()
	limit, stop := context.WithTimeout(context.Background(), handLimit)
	defer stop()
	run := exec.CommandContext(limit, "ngspice", "-b", file)
	run.Dir = filepath.Dir(file)
	begun := time.Now()
	out, err := run.CombinedOutput()
	took := time.Since(begun)
	if err != nil {
		b.Fatalf("ngspice: %v\n%.2000s", err, out)
	}
	if got, want := strings.Count(string(out), "peak  "), strings.Count(readText(b, file), "source "); got != want {
		b.Fatalf("ngspice gave %d peaks of %d\n%.3000s", got, want, out)
	}
	return took
}

func readText(b *testing.B, file string) string {
	b.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		b.Fatal(err)
	}
	return string(text)
}
