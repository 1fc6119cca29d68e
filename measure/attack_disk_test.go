package measure

import (
	"errors"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
)

// answered loads a case on the real disk and gives it one answer that is not saved.
func answered(t *testing.T) (f *File, path string) {
	t.Helper()
	f, path = newOnDisk(t, head)
	if err := f.SetStory("x"); err != nil {
		t.Fatal(err)
	}
	return f, path
}

// must ends a test whose preparation fails.
func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

// onDisk are things that happen to a file between reading and saving, on the real disk. Undo makes it possible again.
var onDisk = []struct {
	name string
	do   func(t *testing.T, path string) (undo func() error)
	want string // in the error
}{
	{"folder removed", func(t *testing.T, path string) func() error {
		away := filepath.Dir(path) + "-away"
		must(t, os.Rename(filepath.Dir(path), away))
		return func() error { return os.Rename(away, filepath.Dir(path)) }
	}, "the file was moved or removed"},
	{"folder replaced by a file", func(t *testing.T, path string) func() error {
		away := filepath.Dir(path) + "-away"
		must(t, os.Rename(filepath.Dir(path), away))
		must(t, os.WriteFile(filepath.Dir(path), nil, 0o644))
		return func() error {
			return errors.Join(os.Remove(filepath.Dir(path)), os.Rename(away, filepath.Dir(path)))
		}
	}, ""},
	{"file removed", func(t *testing.T, path string) func() error {
		must(t, os.Rename(path, path+"-away"))
		return func() error { return os.Rename(path+"-away", path) }
	}, "put it back"},
	{"file replaced by a folder", func(t *testing.T, path string) func() error {
		must(t, os.Rename(path, path+"-away"))
		must(t, os.Mkdir(path, 0o755))
		return func() error { return errors.Join(os.Remove(path), os.Rename(path+"-away", path)) }
	}, "what stands there is no file"},
	{"file replaced by a link to nowhere", func(t *testing.T, path string) func() error {
		must(t, os.Rename(path, path+"-away"))
		symlink(t, path+"-none", path)
		return func() error { return errors.Join(os.Remove(path), os.Rename(path+"-away", path)) }
	}, "leads nowhere"},
	{"file replaced by a link in a circle", func(t *testing.T, path string) func() error {
		must(t, os.Rename(path, path+"-away"))
		symlink(t, path, path+"-round")
		symlink(t, path+"-round", path)
		return func() error {
			return errors.Join(os.Remove(path), os.Remove(path+"-round"), os.Rename(path+"-away", path))
		}
	}, "in a circle"},
	{"file replaced by a link to a folder", func(t *testing.T, path string) func() error {
		must(t, os.Rename(path, path+"-away"))
		symlink(t, t.TempDir(), path)
		return func() error { return errors.Join(os.Remove(path), os.Rename(path+"-away", path)) }
	}, "what stands there is no file"},
	{"file made read-only", func(t *testing.T, path string) func() error {
		must(t, os.Chmod(path, 0o444))
		return func() error { return os.Chmod(path, 0o640) }
	}, "read-only"},
	{"folder made read-only", func(t *testing.T, path string) func() error {
		needsRights(t)
		must(t, os.Chmod(filepath.Dir(path), 0o555))
		return func() error { return os.Chmod(filepath.Dir(path), 0o755) }
	}, "make the folder writable"},
	{"lock file is a link", func(t *testing.T, path string) func() error {
		symlink(t, path+"-none", beside(path, ".lock"))
		return func() error { return os.Remove(beside(path, ".lock")) }
	}, ".lock"},
	{"lock file is a folder", func(t *testing.T, path string) func() error {
		must(t, os.Mkdir(beside(path, ".lock"), 0o755))
		return func() error { return os.Remove(beside(path, ".lock")) }
	}, ".lock"},
	{"file replaced by a pipe", func(t *testing.T, path string) func() error {
		must(t, os.Rename(path, path+"-away"))
		if err := exec.Command("mkfifo", path).Run(); err != nil {
			t.Skip("no pipes can be made here:", err)
		}
		return func() error { return errors.Join(os.Remove(path), os.Rename(path+"-away", path)) }
	}, "what stands there is no file"},
}

// symlink makes a link, or skips where there are none.
func symlink(t *testing.T, to, path string) {
	t.Helper()
	if err := os.Symlink(to, path); err != nil {
		t.Skip("no symbolic links here:", err)
	}
}

// needsRights skips where rights do not bind: for the superuser, and on systems that have none of folders.
func needsRights(t *testing.T) {
	t.Helper()
	if runtime.GOOS == "windows" {
		t.Skip("folders have no read-only rights here")
	}
	if os.Geteuid() == 0 {
		t.Skip("the rights of a folder do not bind the superuser; run the tests as another user")
	}
}

// TestSaveOnDisk lets things happen to a file on the real disk: the save is refused with what to do, nothing is lost,
// and once it is put right the same save works.
func TestSaveOnDisk(t *testing.T) {
	for _, tt := range onDisk {
		t.Run(tt.name, func(t *testing.T) {
			f, path := answered(t)
			undo := tt.do(t, path)
			err := f.Save()
			if err == nil || !strings.Contains(err.Error(), tt.want) || !strings.HasPrefix(err.Error(), path) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if f.Saved() {
				t.Error("it counts as saved")
			}
			must(t, undo())
			if got, err := os.ReadFile(path); string(got) != head {
				t.Errorf("the old file became %q, %v", got, err)
			}
			if err := f.Save(); err != nil {
				t.Errorf("put right, and still: %v", err)
			}
			if got, _ := os.ReadFile(path); string(got) != head+"story: x\n" || !f.Saved() {
				t.Errorf("on disk is %q", got)
			}
			onlyFile(t, path)
		})
	}
}

// TestNewCaseOverSomething starts a case where something stands already, or nothing can.
func TestNewCaseOverSomething(t *testing.T) {
	tests := []struct {
		name string
		do   func(t *testing.T, path string)
		want string
	}{
		{"a file", func(t *testing.T, path string) { must(t, os.WriteFile(path, []byte("x"), 0o644)) }, "there already"},
		{"a folder", func(t *testing.T, path string) { must(t, os.Mkdir(path, 0o755)) }, "there already"},
		{"a link to nowhere", func(t *testing.T, path string) { symlink(t, path+"-none", path) }, "leads nowhere"},
		{"no folder", func(t *testing.T, path string) { must(t, os.Remove(filepath.Dir(path))) }, "the folder is gone"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "new.yaml")
			f, err := New(path, "a", "2026-12-01")
			must(t, err)
			tt.do(t, path)
			before, _ := os.Lstat(path)
			if err := f.Save(); err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if after, _ := os.Lstat(path); before != nil && !os.SameFile(before, after) {
				t.Error("what stood there was replaced")
			}
		})
	}
}

// TestSaveWithOddNames saves cases whose names strain a file system.
func TestSaveWithOddNames(t *testing.T) {
	for _, name := range []string{"pump 3.yaml", "-pump.yaml", "pump*?.yaml", "Pumpe ü Ω.yaml", "a\nb.yaml", ".yaml", "%d*.yaml",
		strings.Repeat("l", 250) + ".yaml", strings.Repeat("Ω", 125) + ".yaml"} {
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, []byte(head), 0o644); err != nil {
			t.Logf("%.20q: not a name here: %v", name, err)
			continue
		}
		f, err := Load(path)
		must(t, err)
		must(t, f.SetStory("x"))
		if err := f.Save(); err != nil {
			t.Errorf("%q: %v", name, err)
		}
		onlyFile(t, path)
	}
}

// TestSaveAfterKill proves that what a killed program left locks nobody out, and is swept, and nothing else is.
func TestSaveAfterKill(t *testing.T) {
	f, path := answered(t)
	stale := []string{".case.yaml.lock", ".case.yaml.1.part", ".case.yaml.99999.part"}
	others := []string{".case.yaml.x.part", ".case.yaml..part", ".other.yaml.1.part", "case.yaml.1.part", ".case.yaml.1.partly"}
	for _, name := range append(stale, others...) {
		must(t, os.WriteFile(filepath.Join(filepath.Dir(path), name), []byte("half"), 0o644))
	}
	if err := f.Save(); err != nil {
		t.Error(err)
	}
	for i, name := range append(stale, others...) {
		if _, err := os.Lstat(filepath.Join(filepath.Dir(path), name)); errors.Is(err, fs.ErrNotExist) != (i < len(stale)) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// TestSaveKeepsHardLink proves that another name of the file, as backups make them, keeps the old bytes.
func TestSaveKeepsHardLink(t *testing.T) {
	f, path := answered(t)
	backup := filepath.Join(t.TempDir(), "backup.yaml")
	if err := os.Link(path, backup); err != nil {
		t.Skip("no hard links here:", err)
	}
	must(t, f.Save())
	if got, _ := os.ReadFile(backup); string(got) != head {
		t.Errorf("the backup became %q", got)
	}
}

// TestLinkTurnedAway points a link elsewhere while the new file is written: neither file is replaced.
func TestLinkTurnedAway(t *testing.T) {
	f, path := answered(t)
	other, link := filepath.Join(t.TempDir(), "other.yaml"), filepath.Join(t.TempDir(), "link.yaml")
	must(t, os.WriteFile(other, []byte(head), 0o644))
	symlink(t, path, link)
	f.Path, f.system = link, turning{link: link, to: other}
	if err := f.Save(); !errors.Is(err, errElsewhere) {
		t.Errorf("error is %v", err)
	}
	for _, p := range []string{path, other} {
		if got, _ := os.ReadFile(p); string(got) != head {
			t.Errorf("%s became %q", p, got)
		}
		onlyFile(t, p)
	}
}

// turning is the real disk on which a link is turned to another file while the new one is written.
type turning struct {
	osFS
	link, to string
}

func (f turning) Temp(name, like string) (TempFile, error) {
	if err := errors.Join(os.Remove(f.link), os.Symlink(f.to, f.link)); err != nil {
		return nil, err
	}
	return f.osFS.Temp(name, like)
}
