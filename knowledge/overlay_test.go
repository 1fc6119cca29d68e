package knowledge

import (
	"errors"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
	"testing/fstest"
)

func TestOverlayReplacesInPlaceAndAdds(t *testing.T) {
	b, err := over(map[string]string{
		"tests.yaml": `
- {id: driver-look, title: Driver chip by eye, observes: driver-dead, present: {burst: 0.7, whole: 0.3}, absent: {burst: 0.02, whole: 0.98}}
- {id: smell, title: Smell, nominal: {burnt: 0.4, none: 0.6}}
`,
		"causes.yaml": "- {id: unlisted, share: {dc: 1, mains: 2, repeat: 3}}",
	})
	if err != nil {
		t.Fatal(err)
	}
	old := sample(t)
	want := append(old.IDs(KindTest), "smell")
	if got := b.IDs(KindTest); !reflect.DeepEqual(got, want) {
		t.Errorf("order %v, want %v", got, want)
	}
	if got := b.Test("driver-look"); got.Title != "Driver chip by eye" || got.File != "shop/tests.yaml" || got.Result("burst") == nil {
		t.Errorf("not replaced: %+v", got)
	}
	if b.Unlisted["mains"].Mid != 2 || !reflect.DeepEqual(b.IDs(KindCause), old.IDs(KindCause)) {
		t.Errorf("unlisted %v, causes %v", b.Unlisted, b.IDs(KindCause))
	}
	if b.Hash == old.Hash || len(b.Hash) != 64 {
		t.Errorf("hash %q after %q", b.Hash, old.Hash)
	}
}

// TestOverlayIsJudgedMerged shows that only the merged base is judged.
func TestOverlayIsJudgedMerged(t *testing.T) {
	_, err := over(map[string]string{"tests.yaml": "- {id: failure-moment, nominal: {start: 0.5, stop: 0.5}}"})
	if err == nil || !strings.Contains(err.Error(), "sample/causes.yaml:7:30: clamp-missing.answers.failure-moment.turn-off: there is no result turn-off") {
		t.Errorf("an answer that lost its result: %v", err)
	}
	broken := layer{name: "old", fsys: fstest.MapFS{"signs.yaml": {Data: []byte("- {id: no-control, leak: 2}")}}}
	if _, err := load(sampleLayer(), broken); err == nil {
		t.Error("a leak of 2 passes")
	}
	mended := layer{name: "new", fsys: fstest.MapFS{"signs.yaml": {Data: []byte("- {id: no-control, leak: 0.2}")}}}
	if _, err := load(sampleLayer(), broken, mended); err != nil {
		t.Errorf("the replaced entry still counts: %v", err)
	}
}

func TestHashIgnoresLineEnds(t *testing.T) {
	unix := fstest.MapFS{}
	windows := fstest.MapFS{}
	for _, list := range lists {
		raw, err := os.ReadFile(filepath.Join("testdata/sample", list+".yaml"))
		if err != nil {
			t.Fatal(err)
		}
		text := strings.ReplaceAll(string(raw), "\r\n", "\n")
		unix[list+".yaml"] = &fstest.MapFile{Data: []byte(text)}
		windows[list+".yaml"] = &fstest.MapFile{Data: []byte(strings.ReplaceAll(text, "\n", "\r\n"))}
	}
	a, err := LoadFS(unix)
	if err != nil {
		t.Fatal(err)
	}
	b, err := LoadFS(windows)
	if err != nil {
		t.Fatal(err)
	}
	if a.Hash != b.Hash {
		t.Errorf("hash %s with LF, %s with CRLF", a.Hash, b.Hash)
	}
}

func TestLoadWithNamesTheFolder(t *testing.T) {
	dir := t.TempDir()
	missing := filepath.Join(dir, "nowhere")
	empty := filepath.Join(dir, "empty")
	wrong := filepath.Join(dir, "wrong")
	for _, d := range []string{empty, filepath.Join(wrong, "tests.yaml")} {
		if err := os.MkdirAll(d, 0o755); err != nil {
			t.Fatal(err)
		}
	}
	tests := []struct{ dir, want string }{
		{missing, missing + ": cannot be read: "},
		{empty, empty + ": holds no file of a rule base"},
		{wrong, filepath.Join(wrong, "tests.yaml") + ": cannot be read: it is a folder"},
	}
	for _, test := range tests {
		_, err := LoadWith(test.dir)
		var problems Problems
		if !errors.As(err, &problems) || !strings.Contains(err.Error(), test.want) {
			t.Errorf("got %v, want %q", err, test.want)
		}
	}
}

func TestLargeFileIsRefused(t *testing.T) {
	_, err := over(map[string]string{"signs.yaml": strings.Repeat("#", maxFile+1)})
	if err == nil || !strings.Contains(err.Error(), "1048577 bytes") {
		t.Errorf("got %v", err)
	}
}

// TestLoadWithEmbedded lays a shop's folder over the base that is built in.
func TestLoadWithEmbedded(t *testing.T) {
	old, err := Load()
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	first := old.Repairs[0].ID
	shop := "- {id: " + first + ", title: The shop's own way, minutes: 7}\n- {id: shop-repair, title: New, minutes: 8}\n"
	if err := os.WriteFile(filepath.Join(dir, "repairs.yaml"), []byte(shop), 0o644); err != nil {
		t.Fatal(err)
	}
	b, err := LoadWith(dir)
	if err != nil {
		t.Fatal(err)
	}
	if b.Repairs[0].ID != first || b.Repairs[0].Minutes != 7 || len(b.Repairs) != len(old.Repairs)+1 || b.Repairs[len(old.Repairs)].ID != "shop-repair" {
		t.Errorf("repairs %v", b.IDs(KindRepair))
	}
	if len(b.Causes) != len(old.Causes) || b.Hash == old.Hash {
		t.Errorf("%d causes of %d, hash %s", len(b.Causes), len(old.Causes), b.Hash)
	}
}
