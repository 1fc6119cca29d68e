package measure

import (
	"crypto/sha256"
	"errors"
	"fmt"
	"io/fs"
	"path/filepath"
	"strings"
)

// ChangedError tells that a case file is not what it was when it was read: another program or an editor wrote to it.
type ChangedError struct {
	Path  string
	What  []string // what changed, one thing an entry
	Gone  bool     // the file was taken away
	There bool     // a file stands where a new case was to be written
}

// Error says what changed and what to do.
func (e *ChangedError) Error() string {
	switch {
	case e.There:
		return e.Path + ": a file of this name is there already; choose another name, nothing was written"
	case e.Gone:
		return e.Path + ": the file was moved or removed since it was read; nothing was written, put it back or save under another name"
	}
	return e.Path + ": the file was changed since it was read: " + strings.Join(e.What, "; ") +
		"; nothing was written, read it again and repeat the entry"
}

// Save writes beside, syncs and renames: the old file stays whole until the new one is. It refuses with a
// ChangedError when the file is not what it was when it was read, and with ErrLocked while another program writes.
func (f *File) Save() error {
	target := f.system.Real(f.Path)
	unlock, err := f.system.Lock(target)
	if err != nil {
		return fmt.Errorf("%s: cannot be locked for writing: %w", f.Path, bareError(err))
	}
	defer unlock()
	if err := f.unchanged(target); err != nil {
		return err
	}
	if err := f.write(target); err != nil {
		return err
	}
	f.read = f.Bytes()
	if err := f.system.SyncFolder(folder(target)); err != nil {
		return fmt.Errorf("%s: saved, but the folder could not be synced: %w", f.Path, bareError(err))
	}
	return nil
}

// write puts the new bytes beside the file and renames them into its place.
func (f *File) write(target string) (err error) {
	temp, err := f.system.Temp(folder(target), "."+filepath.Base(target)+".*.part", target)
	if err != nil {
		return fmt.Errorf("%s: cannot be written in its folder: %w", f.Path, bareError(err))
	}
	defer func() {
		if err != nil {
			_ = f.system.Remove(temp.Name())
		}
	}()
	_, err = temp.Write(f.src.raw)
	if err == nil {
		err = temp.Sync()
	}
	if closed := temp.Close(); err == nil {
		err = closed
	}
	if err != nil {
		return fmt.Errorf("%s: cannot be written, the old file is untouched: %w", f.Path, bareError(err))
	}
	if err := f.unchanged(target); err != nil {
		return err
	}
	if err := f.system.Rename(temp.Name(), target); err != nil {
		return fmt.Errorf("%s: cannot be replaced, the old file is untouched: %w", f.Path, linkError(err))
	}
	return nil
}

// unchanged compares the file on disk with what was read.
func (f *File) unchanged(target string) error {
	now, err := f.system.ReadFile(target, mostBytes+1)
	missing := errors.Is(err, fs.ErrNotExist)
	switch {
	case err != nil && !missing:
		return fmt.Errorf("%s: cannot be compared with what was read: %w", f.Path, bareError(err))
	case f.read == nil && missing:
		return nil
	case f.read == nil:
		return &ChangedError{Path: f.Path, There: true}
	case missing:
		return &ChangedError{Path: f.Path, Gone: true}
	case sha256.Sum256(now) == sha256.Sum256(f.read):
		return nil
	}
	return &ChangedError{Path: f.Path, What: whatChanged(f.read, now)}
}

// whatChanged names the lines that differ and the observations that came or went.
func whatChanged(before, after []byte) []string {
	x, y := splitLines(before), splitLines(after)
	head := 0
	for head < len(x) && head < len(y) && x[head] == y[head] {
		head++
	}
	tail := 0
	for tail < len(x)-head && tail < len(y)-head && x[len(x)-1-tail] == y[len(y)-1-tail] {
		tail++
	}
	out := []string{changedLines(head, len(x)-head-tail, len(y)-head-tail)}
	old, errOld := Parse("", before)
	now, errNow := Parse("", after)
	if errNow != nil {
		return append(out, "as it stands now it does not load")
	}
	if errOld != nil {
		return out
	}
	if n := len(now.Case.Observations) - len(old.Case.Observations); n > 0 {
		var tests []string
		for _, o := range now.Case.Observations[len(old.Case.Observations):] {
			tests = append(tests, o.Test)
		}
		out = append(out, countOf(n, "observation")+" added: "+strings.Join(tests, ", "))
	} else if n < 0 {
		out = append(out, countOf(-n, "observation")+" taken out")
	}
	return out
}

// changedLines names a run of lines after the first head ones.
func changedLines(head, before, after int) string {
	lines := func(n int) string {
		if n == 1 {
			return fmt.Sprintf("line %d", head+1)
		}
		return fmt.Sprintf("lines %d to %d", head+1, head+n)
	}
	switch {
	case before == 0:
		return lines(after) + " added"
	case after == 0:
		return lines(before) + " taken out"
	}
	return lines(max(before, after)) + " changed"
}

// splitLines cuts a text into lines with their ends.
func splitLines(raw []byte) []string { return strings.SplitAfter(string(raw), "\n") }

// linkError takes the paths off a rename error; the message names the file already.
func linkError(err error) error {
	if u := errors.Unwrap(err); u != nil {
		return u
	}
	return err
}
