package knowledge

import (
	"errors"
	"os"
	"path/filepath"
	"testing"
	"testing/fstest"
)

// FuzzLoad lays any bytes over one list of the sample: loading gives a base or problems, never a panic, and a
// base that loads can be checked and has its parents first.
func FuzzLoad(f *testing.F) {
	for _, pattern := range []string{"testdata/sample/*.yaml", "../testdata/broken-rules/*/*.yaml"} {
		files, err := filepath.Glob(pattern)
		if err != nil || len(files) == 0 {
			f.Fatalf("no seeds in %s (%v)", pattern, err)
		}
		for _, file := range files {
			raw, err := os.ReadFile(file)
			if err != nil {
				f.Fatal(err)
			}
			f.Add(listNumber(file), raw)
		}
	}
	for _, odd := range []string{"", "[", "- *a", "- &a [*a]", "? {}", "- {<<: {id: x}}", "- [[[[[[", "\xff\xfe", "- {id: \"\x00\"}", "- {? [a]: b, id: c}"} {
		f.Add(0, []byte(odd))
	}
	f.Fuzz(func(t *testing.T, number int, raw []byte) {
		list := lists[uint(number)%uint(len(lists))]
		base, err := load(sampleLayer(), layer{fsys: fstest.MapFS{list + ".yaml": {Data: raw}}})
		if (base == nil) == (err == nil) {
			t.Fatalf("base %v with error %v", base, err)
		}
		var problems Problems
		if err != nil {
			if !errors.As(err, &problems) || len(problems) > maxProblems+1 {
				t.Fatalf("not a list of at most %d problems: %v", maxProblems, err)
			}
			return
		}
		base.Check()
		parentsFirst(t, base)
	})
}

// listNumber gives the place of a file's list, 0 for a file that is none.
func listNumber(file string) int {
	for i, list := range lists {
		if filepath.Base(file) == list+".yaml" {
			return i
		}
	}
	return 0
}

func parentsFirst(t *testing.T, base *Base) {
	seen := map[string]bool{}
	for _, e := range base.Events {
		seen[e.ID] = true
		for _, l := range e.LeadsTo {
			if seen[l.To] {
				t.Fatalf("%s leads to %s, which stands before it", e.ID, l.To)
			}
		}
	}
}
