package knowledge

import (
	"errors"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/fstest"
)

var update = flag.Bool("update", false, "rewrite the expected messages of the broken rules")

// sampleLayer holds the shapes that the format is described with, and what they refer to.
func sampleLayer() layer { return layer{name: "sample", fsys: os.DirFS("testdata/sample")} }

func sample(t testing.TB) *Base {
	t.Helper()
	b, err := load(sampleLayer())
	if err != nil {
		t.Fatalf("the sample does not load:\n%v", err)
	}
	return b
}

// over lays files, given by name and content, over the sample.
func over(files map[string]string) (*Base, error) {
	fsys := fstest.MapFS{}
	for name, content := range files {
		fsys[name] = &fstest.MapFile{Data: []byte(content)}
	}
	return load(sampleLayer(), layer{name: "shop", fsys: fsys})
}

// TestBrokenRules loads every folder of broken rules over the sample and compares all messages.
func TestBrokenRules(t *testing.T) {
	folders, err := filepath.Glob("../testdata/broken-rules/*")
	if err != nil || len(folders) < 15 {
		t.Fatalf("found %d folders of broken rules, want 15 or more (%v)", len(folders), err)
	}
	for _, folder := range folders {
		t.Run(filepath.Base(folder), func(t *testing.T) {
			base, err := load(sampleLayer(), layer{fsys: os.DirFS(folder)})
			var problems Problems
			if base != nil || !errors.As(err, &problems) || len(problems) == 0 {
				t.Fatalf("loads without a problem (error %v)", err)
			}
			if len(problems) > maxProblems+1 {
				t.Errorf("%d problems, want at most %d and one that counts the rest", len(problems), maxProblems)
			}
			compareGolden(t, filepath.Join(folder, "want.txt"), err.Error()+"\n")
		})
	}
}

func compareGolden(t *testing.T, file, got string) {
	t.Helper()
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if clean := strings.ReplaceAll(string(want), "\r\n", "\n"); got != clean {
		t.Errorf("got\n%s\nwant\n%s", got, clean)
	}
}
