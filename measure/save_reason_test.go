package measure

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"syscall"
	"testing"
)

// saveErrors are the failures of single calls, and how the messages end.
var saveErrors = []struct {
	call  string // that fails
	err   error
	isNew bool
	want  string
}{
	{"write", syscall.ENOSPC, false, "the new file cannot be written beside it: the disk is full (no space left on device); " +
		"the old file is untouched; make room on it, then try again"},
	{"write", syscall.ENOSPC, true, "the new file cannot be written beside it: the disk is full (no space left on device); " +
		"no case was written; make room on it, then try again"},
	{"close", syscall.EDQUOT, false, "the disk is full (disk quota exceeded); the old file is untouched; make room on it, then try again"},
	{"sync", syscall.EIO, false, "the new file cannot be written beside it: the disk reports a fault (input/output error); " +
		"the old file is untouched; copy the case to another disk and go on there; trust this one no longer"},
	{"lock", &fs.PathError{Op: "open", Path: "/x", Err: syscall.EACCES}, false, "it cannot be locked for writing: this user may not write there (permission denied); " +
		"the old file is untouched; make the folder writable, or copy the case to one that is, then try again"},
	{"temp", &fs.PathError{Op: "open", Path: "/x", Err: syscall.EROFS}, false, "the new file cannot be written beside it: " +
		"the disk is write-protected (read-only file system); the old file is untouched; take the protection off, or copy the case to another disk, then try again"},
	{"lock", syscall.ENOENT, true, "it cannot be locked for writing: the folder is gone (no such file or directory); " +
		"no case was written; put the folder or the drive back, then try again"},
	{"temp", syscall.ENAMETOOLONG, false, "the path is too long (file name too long); the old file is untouched; " +
		"move the case to a folder with a shorter path, then try again"},
	{"rename", &os.LinkError{Op: "rename", Old: "/x", New: "/y", Err: syscall.ETIMEDOUT}, false, "the new file cannot be put in its place: " +
		"the network drive does not answer (connection timed out); the old file is untouched; connect it again, then try again"},
	{"rename", fmt.Errorf("%w: %w", ErrBusy, &os.LinkError{Op: "rename", Err: syscall.EBUSY}), false, "the new file cannot be put in its place: " +
		"another program holds the file open (device or resource busy); the old file is untouched; close it there, then try again"},
	{"lock", ErrLocked, false, "it cannot be locked for writing: another program is writing this case at this moment; " +
		"the old file is untouched; wait until it is done, then try again"},
	{"writable", syscall.EPERM, false, "it cannot be written over: the file is read-only; the old file is untouched; " +
		"somebody protected it: make it writable if it is to be changed, or work on a copy, then try again"},
	{"real", errLink, false, "its place cannot be found: it is a link that leads nowhere or in a circle; " +
		"the old file is untouched; point the link at the case, or take it away, then try again"},
	{"lock", errSide, false, "it cannot be locked for writing: what stands at the name of its lock file is no file; " +
		"the old file is untouched; take away the hidden .NAME.lock beside the case, then try again"},
	{"sync folder", syscall.EIO, false, "the system cannot confirm that the new file is on the disk: the disk reports a fault (input/output error); " +
		"the new file stands in its place but might not outlast a power cut; copy the case to another disk and go on there; trust this one no longer"},
	{"read", syscall.EISDIR, false, "it cannot be written over: is a directory; the old file is untouched; " +
		"try again; if it stays so, copy the case to another disk and go on there"},
}

// TestSaveErrorsSayWhatToDo reads the message of every failure: what could not be done, why, what stands on disk, what
// to do next.
func TestSaveErrorsSayWhatToDo(t *testing.T) {
	if runtime.GOOS != "linux" {
		t.Skip("the words in brackets are the system's own, here those of Linux")
	}
	all := stands(t)
	for _, tt := range saveErrors {
		s := all[0]
		if tt.isNew {
			s = all[3]
		}
		answered := s.answers[0]
		f := &File{Path: "pump.yaml", Case: answered.Case, src: answered.src, root: answered.root, read: s.old}
		files := map[string]*blob{}
		if s.old != nil {
			files[f.Path] = whole(string(s.old))
		}
		f.system = newFaulty(newModel(files), func(_ int, call string) (fault, bool) {
			return fault{err: tt.err, lasts: true}, call == tt.call
		})
		err := f.Save()
		if err == nil || !strings.HasPrefix(err.Error(), "pump.yaml: not saved, ") || !strings.HasSuffix(err.Error(), tt.want) {
			t.Errorf("%s fails with %v:\ngot  %v\nwant %s", tt.call, tt.err, err, tt.want)
		}
		if !errors.Is(err, tt.err) && tt.call != "writable" {
			t.Errorf("%s: the system's error is lost in %v", tt.call, err)
		}
	}
}

// TestSaveThatEndsHalfWay lets the rename and every look after it fail: the message does not claim what nobody knows.
func TestSaveThatEndsHalfWay(t *testing.T) {
	s := stands(t)[0]
	for _, done := range []bool{false, true} {
		m := s.model()
		over := false
		f := &File{Path: s.path, read: s.old, Case: s.answers[0].Case, src: s.answers[0].src, root: s.answers[0].root}
		f.system = newFaulty(m, func(_ int, call string) (fault, bool) {
			over = over || call == "rename"
			return fault{err: syscall.ETIMEDOUT, done: done && call == "rename"}, over
		})
		err := f.Save()
		if err == nil || !strings.Contains(err.Error(), "the old file or the new one stands there, whole; connect it again") || f.Saved() {
			t.Errorf("error is %v, saved %v", err, f.Saved())
		}
		f.system = m
		if err := f.Save(); err != nil || !f.Saved() {
			t.Errorf("when the drive is back: %v", err)
		}
	}
}

// TestSaveWaitsForOthers proves that a lock or a file that is let go of soon does not stop a save, and that one that is
// not does so after a bounded number of tries.
func TestSaveWaitsForOthers(t *testing.T) {
	s := stands(t)[0]
	for call, passing := range map[string]error{"lock": ErrLocked, "rename": ErrBusy, "writable": ErrBusy} {
		for _, busy := range []int{1, mostTries, mostTries + 1} {
			m, n := s.model(), 0
			f := &File{Path: s.path, read: s.old, Case: s.answers[0].Case, src: s.answers[0].src, root: s.answers[0].root}
			f.system = newFaulty(m, func(_ int, c string) (fault, bool) {
				if c == call {
					n++
				}
				return fault{err: passing}, c == call && n <= busy
			})
			err := f.Save()
			if (err == nil) != (busy <= mostTries) || m.pauses != min(busy, mostTries) || err != nil && !errors.Is(err, passing) {
				t.Errorf("%s fails %d times: %d pauses, %v", call, busy, m.pauses, err)
			}
		}
	}
}

// TestSaveWithoutLocks saves where there are no locks: what another writer may be writing at this moment is left alone.
func TestSaveWithoutLocks(t *testing.T) {
	s := stands(t)[5]
	m := s.model()
	f := &File{Path: s.path, read: s.old, Case: s.answers[0].Case, src: s.answers[0].src, root: s.answers[0].root}
	f.system = newFaulty(m, func(_ int, call string) (fault, bool) { return fault{err: ErrNoLocks}, call == "lock" })
	if err := f.Save(); err != nil || !f.Saved() {
		t.Errorf("it is not saved: %v", err)
	}
	for _, name := range s.litter {
		if m.content(filepath.Join(filepath.Dir(s.target), name)) == nil {
			t.Errorf("%s was taken away", name)
		}
	}
}

// TestRenameThatWasDone lets a network drive report a failure although it did the rename: the answer is on disk, and
// saying otherwise would have it entered twice.
func TestRenameThatWasDone(t *testing.T) {
	s := stands(t)[0]
	for _, kind := range faults("rename") {
		if !kind.done || kind.lasts {
			continue
		}
		m := s.model()
		f := &File{Path: s.path, read: s.old, Case: s.answers[0].Case, src: s.answers[0].src, root: s.answers[0].root}
		hit := false
		f.system = newFaulty(m, func(_ int, call string) (fault, bool) {
			now := call == "rename" && !hit
			hit = hit || now
			return kind, now
		})
		if err := f.Save(); err != nil || !f.Saved() || !hit {
			t.Errorf("%s: %v, saved %v", kind.kind, err, f.Saved())
		}
	}
}
