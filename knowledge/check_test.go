package knowledge

import (
	"os"
	"strings"
	"testing"
)

// TestCheckSample compares the warnings about the sample, which leaves out on purpose what may be left out.
func TestCheckSample(t *testing.T) {
	compareGolden(t, "testdata/sample-warnings.txt", sample(t).Check().Error()+"\n")
}

// TestEmbeddedBase holds the base to its own rules: it loads, and nothing is left to be desired.
func TestEmbeddedBase(t *testing.T) {
	b, err := Load()
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range b.Check() {
		t.Error(p)
	}
}

// TestCheckShabby compares the warnings about a folder that loads but that nobody would want.
func TestCheckShabby(t *testing.T) {
	b, err := load(sampleLayer(), layer{name: "shabby", fsys: os.DirFS("testdata/shabby")})
	if err != nil {
		t.Fatal(err)
	}
	var lines []string
	for _, p := range b.Check() {
		if strings.HasPrefix(p.File, "shabby") {
			lines = append(lines, p.String())
		}
	}
	compareGolden(t, "testdata/shabby-warnings.txt", strings.Join(lines, "\n")+"\n")
}

func TestCheckWithoutUnlisted(t *testing.T) {
	b := sample(t)
	b.Unlisted = nil
	if got := b.Check().Error(); !strings.Contains(got, "causes.yaml: the entry unlisted is missing") {
		t.Errorf("got\n%s", got)
	}
}
