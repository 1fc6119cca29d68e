package main

import (
	"io"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"drivemend/knowledge"
	"drivemend/measure"
)

// fullCase is the demonstration's case as it ends: board, safety history and fifteen answers.
func fullCase(b *testing.B) string {
	b.Helper()
	folder := filepath.Join(b.TempDir(), "demo")
	if status := run(quietly("demo", folder)); status != exitDone {
		b.Fatalf("the demonstration ends with %d", status)
	}
	return filepath.Join(folder, "quarry-belt.yaml")
}

// quietly is a world that shows nothing.
func quietly(args ...string) env {
	return env{args: args, in: strings.NewReader(""), out: io.Discard, err: io.Discard, getenv: func(string) string { return "" }, now: time.Now}
}

const duringTheJob = "2026-03-02T09:42:00+01:00"

// inProcess times a stage of the chain on the full case, base and case loaded before.
func inProcess(b *testing.B, stage func(k *chain, at time.Time) error) {
	f, err := measure.Load(fullCase(b))
	if err != nil {
		b.Fatal(err)
	}
	base, err := knowledge.Load()
	if err != nil {
		b.Fatal(err)
	}
	at, err := time.Parse(time.RFC3339, duringTheJob)
	if err != nil {
		b.Fatal(err)
	}
	k, err := chainOf(base, f.Case)
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if err := stage(k, at); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkSpans is the computed figures that the ranking reads.
func BenchmarkSpans(b *testing.B) {
	inProcess(b, func(k *chain, _ time.Time) error { _, err := chainOf(k.base, k.c); return err })
}

// BenchmarkRank is the ranking of a full case; it is to stay under 10 ms.
func BenchmarkRank(b *testing.B) {
	inProcess(b, func(k *chain, _ time.Time) error { _, err := k.rank(""); return err })
}

// BenchmarkNext is the next test of a full case; it is to stay under 60 ms.
func BenchmarkNext(b *testing.B) {
	inProcess(b, func(k *chain, at time.Time) error { _, err := k.next(at); return err })
}

// BenchmarkMargin is both edges with their draws.
func BenchmarkMargin(b *testing.B) {
	inProcess(b, func(k *chain, _ time.Time) error { _, err := k.margin(); return err })
}

// wholeCommand times a command in process, from reading the files to the last line.
func wholeCommand(b *testing.B, args ...string) {
	path := fullCase(b)
	for b.Loop() {
		if status := run(quietly(append([]string{args[0], path}, args[1:]...)...)); status != exitDone {
			b.Fatalf("status %d", status)
		}
	}
}

func BenchmarkRankCommand(b *testing.B) { wholeCommand(b, "rank") }
func BenchmarkNextCommand(b *testing.B) { wholeCommand(b, "next", "--at", duringTheJob) }

// wholeProcess times the program as it is started; it is to stay under 100 ms.
func wholeProcess(b *testing.B, args ...string) {
	path := fullCase(b)
	program := filepath.Join(b.TempDir(), "drivemend")
	if out, err := exec.Command("go", "build", "-o", program, ".").CombinedOutput(); err != nil {
		b.Fatalf("%v\n%s", err, out)
	}
	for b.Loop() {
		if out, err := exec.Command(program, append([]string{args[0], path}, args[1:]...)...).CombinedOutput(); err != nil {
			b.Fatalf("%v\n%s", err, out)
		}
	}
}

func BenchmarkRankProcess(b *testing.B) { wholeProcess(b, "rank") }
func BenchmarkNextProcess(b *testing.B) { wholeProcess(b, "next", "--at", duringTheJob) }
