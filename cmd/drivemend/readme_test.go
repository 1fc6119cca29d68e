package main

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

var rewrite = flag.Bool("readme", false, "write the real output into README.md")

const readmePath = "../../README.md"

// TestReadmeShowsRealOutput runs every "$ drivemend …" line of the README's console blocks, one after the other in an
// empty folder, and compares what it prints. A line "…" in a block stands for lines left out.
func TestReadmeShowsRealOutput(t *testing.T) {
	raw, err := os.ReadFile(readmePath)
	if err != nil {
		t.Fatal(err)
	}
	readme, err := filepath.Abs(readmePath)
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	blocks := strings.Split(string(raw), "```console\n")
	commands := 0
	for i, rest := range blocks[1:] {
		block, after, ok := strings.Cut(rest, "```\n")
		if !ok {
			t.Fatal("a console block is not closed")
		}
		shown, n := replay(t, block)
		commands += n
		blocks[i+1] = shown + "```\n" + after
	}
	if commands < 4 {
		t.Errorf("only %d commands are shown", commands)
	}
	if *rewrite {
		if err := os.WriteFile(readme, []byte(strings.Join(blocks, "```console\n")), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// replay runs the commands of a block and gives the block with what they print now.
func replay(t *testing.T, block string) (shown string, commands int) {
	var b strings.Builder
	parts := strings.Split(block, "$ ")
	for _, part := range parts[1:] {
		line, want, _ := strings.Cut(part, "\n")
		args, ok := strings.CutPrefix(line, "drivemend ")
		if !ok {
			b.WriteString("$ " + part)
			continue
		}
		commands++
		var out, progress bytes.Buffer // progress shows only on a slow machine
		run(env{args: words(args), in: strings.NewReader(""), out: &out, err: &progress,
			getenv: func(string) string { return "" }, now: func() time.Time { return time.Date(2026, 12, 1, 9, 0, 0, 0, time.UTC) }})
		got := out.String()
		if !*rewrite && !matches(got, want) {
			t.Errorf("$ %s\nshows:\n%s\nbut prints:\n%s", line, want, got)
		}
		b.WriteString("$ " + line + "\n" + cutAs(got, want))
	}
	return b.String(), commands
}

// words splits a command line at blanks outside double quotes.
func words(line string) []string {
	var out []string
	for i, piece := range strings.Split(line, `"`) {
		if i%2 == 1 {
			out = append(out, piece)
		} else {
			out = append(out, strings.Fields(piece)...)
		}
	}
	return out
}

// matches compares output with a shown text in which a line "…" stands for any lines.
func matches(got, want string) bool {
	rest := got
	for i, piece := range strings.Split(want, "…\n") {
		at := strings.Index(rest, piece)
		if at < 0 || i == 0 && at > 0 {
			return false
		}
		rest = rest[at+len(piece):]
	}
	return strings.HasSuffix(want, "…\n") || rest == ""
}

// cutAs keeps the shown pieces when they still hold, else gives all of the output.
func cutAs(got, want string) string {
	if strings.Contains(want, "…\n") && matches(got, want) {
		return want
	}
	return got
}
