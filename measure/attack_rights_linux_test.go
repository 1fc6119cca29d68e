package measure

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"
)

// nobody is a user without rights to anything of another's.
const nobody = 65534

// asNobody runs a function with the rights that nobody has to files, also where the tests run as superuser.
func asNobody(t *testing.T, do func()) {
	t.Helper()
	if os.Geteuid() != 0 {
		t.Skip("only the superuser can act as another user; TestSaveOnDisk tests rights as this one")
	}
	done := make(chan error)
	go func() { // the thread ends with its changed rights, for it is never unlocked
		runtime.LockOSThread()
		err := syscall.Setfsuid(nobody)
		if err == nil {
			do()
		}
		done <- err
	}()
	must(t, <-done)
}

// TestSaveWithoutRights saves into a folder that may not be written, over a file that is another's, and beside a lock
// file that is another's.
func TestSaveWithoutRights(t *testing.T) {
	tests := []struct {
		name   string
		folder fs.FileMode
		file   fs.FileMode
		want   string // "" when it must work
	}{
		{"folder of another", 0o755, 0o666, "make the folder writable"},
		{"file of another", 0o777, 0o644, "the file is read-only"},
		{"file that cannot be read", 0o777, 0o600, "it cannot be written over"},
		{"open to all", 0o777, 0o666, ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			f, path := answered(t)
			must(t, os.Chmod(path, tt.file))
			must(t, os.Chmod(filepath.Dir(path), tt.folder))
			must(t, os.Chmod(filepath.Dir(filepath.Dir(path)), 0o755))
			must(t, os.WriteFile(beside(path, ".lock"), nil, 0o644))
			var err error
			asNobody(t, func() { err = f.Save() })
			if (err == nil) != (tt.want == "") || err != nil && !strings.Contains(err.Error(), tt.want) {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if got, _ := os.ReadFile(path); (string(got) == head) != (tt.want != "") {
				t.Errorf("on disk is %q", got)
			}
			must(t, f.Save())
			onlyFile(t, path)
		})
	}
}

// TestSaveKeepsOwner saves another user's file as superuser: it stays that user's.
func TestSaveKeepsOwner(t *testing.T) {
	f, path := answered(t)
	if os.Chown(path, nobody, nobody) != nil {
		t.Skip("this user cannot give files away")
	}
	must(t, f.Save())
	info, err := os.Stat(path)
	must(t, err)
	if st := info.Sys().(*syscall.Stat_t); st.Uid != nobody || st.Gid != nobody || info.Mode().Perm() != 0o640 {
		t.Errorf("it belongs to %d:%d with %v", st.Uid, st.Gid, info.Mode())
	}
}

// TestSaveOnFullDisk fills a small disk, and protects one: the old file stays, and room or leave to write is enough to
// save after all.
func TestSaveOnFullDisk(t *testing.T) {
	dir := t.TempDir()
	if err := syscall.Mount("tmpfs", dir, "tmpfs", 0, "size=64k"); err != nil {
		t.Skip("no small disk can be mounted here:", err)
	}
	t.Cleanup(func() { must(t, syscall.Unmount(dir, syscall.MNT_DETACH)) })
	path, filler := filepath.Join(dir, "case.yaml"), filepath.Join(dir, "filler")
	must(t, os.WriteFile(path, []byte(head), 0o644))
	f, err := Load(path)
	must(t, err)
	for _, size := range []int{64 << 10, 60 << 10} {
		must(t, f.SetStory(strings.Repeat("x", 5000)))
		if err := os.WriteFile(filler, bytes.Repeat([]byte{1}, size), 0o644); err != nil && !errors.Is(err, syscall.ENOSPC) {
			t.Fatal(err)
		}
		if err := f.Save(); !errors.Is(err, syscall.ENOSPC) || !strings.Contains(err.Error(), "the disk is full") {
			t.Errorf("error is %v", err)
		}
		if got, _ := os.ReadFile(path); string(got) != head {
			t.Errorf("the old file became %q", got)
		}
		must(t, os.Remove(filler))
	}
	must(t, syscall.Mount("", dir, "", syscall.MS_REMOUNT|syscall.MS_RDONLY, "size=64k"))
	if err := f.Save(); !errors.Is(err, syscall.EROFS) || !strings.Contains(err.Error(), "write-protected") {
		t.Errorf("error is %v", err)
	}
	must(t, syscall.Mount("", dir, "", syscall.MS_REMOUNT, "size=64k"))
	must(t, f.Save())
	onlyFile(t, path)
}
