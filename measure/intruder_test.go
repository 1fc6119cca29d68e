package measure

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// intruder is the operating system's file layer with another program that writes the case while ours is written beside.
type intruder struct {
	osFS
	path, text string
}

func (i intruder) Temp(name, like string) (TempFile, error) {
	if err := os.WriteFile(i.path, []byte(i.text), 0o644); err != nil {
		return nil, err
	}
	return i.osFS.Temp(name, like)
}

// A change that comes between the first look at the file and the rename is seen, and nothing of it is lost.
func TestSaveLooksAgainBeforeTheRename(t *testing.T) {
	path := filepath.Join(t.TempDir(), "case.yaml")
	mine, theirs := "drivemend: 1\ncase: a\n", "drivemend: 1\ncase: a\nstory: written by another\n"
	if err := os.WriteFile(path, []byte(mine), 0o644); err != nil {
		t.Fatal(err)
	}
	f, err := LoadFrom(intruder{path: path, text: theirs}, path)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.SetStory("mine"); err != nil {
		t.Fatal(err)
	}
	var changed *ChangedError
	if err := f.Save(); !errors.As(err, &changed) || !strings.Contains(err.Error(), path) {
		t.Fatalf("saved over another's change: %v", err)
	}
	if now, _ := os.ReadFile(path); string(now) != theirs {
		t.Errorf("on disk:\n%s", now)
	}
	left, _ := filepath.Glob(filepath.Join(filepath.Dir(path), ".*.part"))
	if len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}
