package measure

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "write what is found into the expected files")

// TestBrokenCases reads every file of ../testdata/broken-cases and compares what is said about it with the file of
// the same name that ends in .want. A new case needs new files only.
func TestBrokenCases(t *testing.T) {
	paths, err := filepath.Glob("../testdata/broken-cases/*.yaml")
	if err != nil {
		t.Fatal(err)
	}
	if len(paths) < 30 {
		t.Fatalf("only %d broken cases found", len(paths))
	}
	for _, path := range paths {
		name := filepath.Base(path)
		t.Run(name, func(t *testing.T) {
			raw, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if _, err = Parse(name, raw); err == nil {
				t.Fatal("the broken case loads")
			}
			got := err.Error() + "\n"
			wantPath := strings.TrimSuffix(path, ".yaml") + ".want"
			if *update {
				if err := os.WriteFile(wantPath, []byte(got), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(wantPath)
			if err != nil {
				t.Fatal(err)
			}
			if got != string(want) {
				t.Errorf("got\n%swant\n%s", got, want)
			}
		})
	}
}
