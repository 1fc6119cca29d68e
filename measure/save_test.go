package measure

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"testing"
)

// newOnDisk writes a case file into a folder of its own and loads it.
func newOnDisk(t *testing.T, text string) (*File, string) {
	t.Helper()
	path := filepath.Join(t.TempDir(), "case.yaml")
	if err := os.WriteFile(path, []byte(text), 0o640); err != nil {
		t.Fatal(err)
	}
	f, err := Load(path)
	if err != nil {
		t.Fatal(err)
	}
	return f, path
}

// onlyFile proves that nothing but the case is left in its folder.
func onlyFile(t *testing.T, path string) {
	t.Helper()
	left, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range left {
		if e.Name() != filepath.Base(path) {
			t.Errorf("left behind: %s", e.Name())
		}
	}
}

func TestSave(t *testing.T) {
	f, path := newOnDisk(t, head)
	for _, story := range []string{"one", "two"} {
		if err := f.SetStory(story); err != nil {
			t.Fatal(err)
		}
		if f.Saved() {
			t.Error("an unsaved change counts as saved")
		}
		if err := f.Save(); err != nil {
			t.Fatal(err)
		}
	}
	got, err := os.ReadFile(path)
	if err != nil || string(got) != head+"story: two\n" || !f.Saved() {
		t.Errorf("on disk is %q, %v", got, err)
	}
	if info, err := os.Stat(path); err != nil || runtime.GOOS != "windows" && info.Mode().Perm() != 0o640 {
		t.Errorf("permissions are %v, %v", info.Mode(), err)
	}
	onlyFile(t, path)
}

func TestSaveThroughLink(t *testing.T) {
	f, path := newOnDisk(t, head)
	link := filepath.Join(t.TempDir(), "link.yaml")
	if err := os.Symlink(path, link); err != nil {
		t.Skip("no symbolic links here")
	}
	f.Path = link
	if err := f.SetStory("x"); err != nil {
		t.Fatal(err)
	}
	if err := f.Save(); err != nil {
		t.Fatal(err)
	}
	if got, _ := os.ReadFile(path); string(got) != head+"story: x\n" {
		t.Errorf("behind the link is %q", got)
	}
	if info, err := os.Lstat(link); err != nil || info.Mode()&fs.ModeSymlink == 0 {
		t.Error("the link was replaced by a file")
	}
}

func TestSaveNew(t *testing.T) {
	path := filepath.Join(t.TempDir(), "new.yaml")
	if _, err := New(path, "orchard pump", "2026-12-01"); err == nil {
		t.Fatal("an id of two words was taken")
	}
	f, err := New(path, "orchard-pump", "2026-12-01")
	if err != nil {
		t.Fatal(err)
	}
	if f.Saved() {
		t.Error("a new case counts as saved")
	}
	if err := f.Save(); err != nil {
		t.Fatal(err)
	}
	again, err := New(path, "other", "2026-12-01")
	if err != nil {
		t.Fatal(err)
	}
	var changed *ChangedError
	if err := again.Save(); !errors.As(err, &changed) || !changed.There {
		t.Errorf("a file was written over: %v", err)
	}
	onlyFile(t, path)
}

func TestSaveRefusesSecondWriter(t *testing.T) {
	tests := []struct{ name, other, want string }{
		{"line added", head + "owner: x\n", "line 3 added"},
		{"line changed", "drivemend: 1\ncase: b\n", "line 2 changed"},
		{"broken meanwhile", head + "owner: [\n", "does not load"},
		{"observation added", head + "observations:\n  - {test: fan-turns, result: no}\n  - {test: smell, result: burnt}\n",
			"2 observations added: fan-turns, smell"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			f, path := newOnDisk(t, head)
			if err := f.SetStory("mine"); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(path, []byte(tt.other), 0o644); err != nil {
				t.Fatal(err)
			}
			var changed *ChangedError
			err := f.Save()
			if !errors.As(err, &changed) || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if got, _ := os.ReadFile(path); string(got) != tt.other {
				t.Errorf("the other writer's file became %q", got)
			}
			onlyFile(t, path)
		})
	}
	t.Run("gone", func(t *testing.T) {
		f, path := newOnDisk(t, head)
		if err := os.Remove(path); err != nil {
			t.Fatal(err)
		}
		var changed *ChangedError
		if err := f.Save(); !errors.As(err, &changed) || !changed.Gone {
			t.Errorf("error is %v", err)
		}
	})
}

func TestSaveWhileLocked(t *testing.T) {
	f, path := newOnDisk(t, head)
	unlock, err := osFS{}.Lock(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.SetStory("x"); err != nil {
		t.Fatal(err)
	}
	if err := f.Save(); !errors.Is(err, ErrLocked) {
		t.Errorf("saved under another's lock: %v", err)
	}
	if err := unlock(); err != nil {
		t.Error(err)
	}
	if err := f.Save(); err != nil {
		t.Error(err)
	}
	onlyFile(t, path)
}

// TestManyWriters lets several writers add to one case at once; each reads again when it is refused. No entry is lost.
func TestManyWriters(t *testing.T) {
	const writers, entries = 4, 5
	_, path := newOnDisk(t, head)
	var wait sync.WaitGroup
	for range writers {
		wait.Go(func() {
			for n := 0; n < entries; {
				f, err := Load(path)
				if err != nil {
					t.Error(err)
					return
				}
				if err := f.Observe(Observation{Test: "smell", Result: "burnt"}); err != nil {
					t.Error(err)
					return
				}
				var changed *ChangedError
				switch err := f.Save(); {
				case err == nil:
					n++
				case !errors.Is(err, ErrLocked) && !errors.As(err, &changed):
					t.Error(err)
					return
				}
			}
		})
	}
	wait.Wait()
	f, err := Load(path)
	if err != nil {
		t.Fatal(err)
	}
	if n := len(f.Case.Observations); n != writers*entries {
		t.Errorf("%d observations are left of %d", n, writers*entries)
	}
	onlyFile(t, path)
}

// failing is a file system in which one operation fails.
type failing struct {
	osFS
	at string
}

var errBroken = errors.New("broken for the test")

func (f failing) err(op string) error {
	if f.at == op {
		return errBroken
	}
	return nil
}

func (f failing) Temp(name, like string) (TempFile, error) {
	if err := f.err("temp"); err != nil {
		return nil, err
	}
	t, err := f.osFS.Temp(name, like)
	return failingFile{t, f}, err
}

func (f failing) Rename(from, to string) error {
	if err := f.err("rename"); err != nil {
		return err
	}
	return f.osFS.Rename(from, to)
}

// failingFile is a file of a failing file system.
type failingFile struct {
	TempFile
	failing failing
}

func (f failingFile) Write(b []byte) (int, error) {
	if err := f.failing.err("write"); err != nil {
		n, _ := f.TempFile.Write(b[:len(b)/2])
		return n, err
	}
	return f.TempFile.Write(b)
}

func (f failingFile) Sync() error {
	if err := f.failing.err("sync"); err != nil {
		return err
	}
	return f.TempFile.Sync()
}

func (f failingFile) Close() error { return errors.Join(f.TempFile.Close(), f.failing.err("close")) }

func TestFailedSaveLeavesOldFile(t *testing.T) {
	for _, at := range []string{"temp", "write", "sync", "close", "rename"} {
		t.Run(at, func(t *testing.T) {
			_, path := newOnDisk(t, head)
			f, err := LoadFrom(failing{at: at}, path)
			if err != nil {
				t.Fatal(err)
			}
			if err := f.SetStory("x"); err != nil {
				t.Fatal(err)
			}
			if err := f.Save(); !errors.Is(err, errBroken) {
				t.Errorf("error is %v", err)
			}
			if got, _ := os.ReadFile(path); string(got) != head {
				t.Errorf("the old file became %q", got)
			}
			if f.Saved() {
				t.Error("a failed save counts as saved")
			}
			onlyFile(t, path)
		})
	}
}

func TestLoadSaysWhy(t *testing.T) {
	dir := t.TempDir()
	if _, err := Load(filepath.Join(dir, "none.yaml")); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("a missing file gives %v", err)
	}
	if _, err := Load(dir); err == nil || !strings.Contains(err.Error(), dir) {
		t.Errorf("a folder gives %v", err)
	}
}
