package measure

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"io"
	"io/fs"
	"path/filepath"
	"strings"
	"unicode/utf8"
)

// mostTries is how often Save tries again while another program holds the lock or the file.
const mostTries = 7

// Save writes beside, syncs, renames and syncs the folder: the old file stays whole until the new one is, and without
// an error the new one outlives a power cut. It refuses with a ChangedError when the file is not what it was when it
// was read; a SaveError tells every other reason, wrapping ErrLocked while another program writes. After an error the
// changes are still in memory and Save may be called again. Where a folder knows no locks, the look at the file just
// before the rename is all that holds off a second writer. Hard links to the file keep the old bytes.
func (f *File) Save() error {
	target, err := f.system.Real(f.Path)
	if err != nil {
		return f.failed(finding, err)
	}
	if err := f.allowed(target); err != nil {
		return err
	}
	unlock, held, err := f.lock(target)
	if err != nil {
		return f.failed(locking, err)
	}
	// A lock that cannot be given back ends with the program; what was saved is saved.
	defer func() { _ = unlock() }()
	if held {
		f.sweep(target)
	}
	temp, err := f.write(target)
	if err != nil {
		return err
	}
	if err := f.replace(temp, target); err != nil {
		return err
	}
	if err := f.system.SyncFolder(folder(target)); err != nil {
		return f.failed(confirming, err)
	}
	f.read, f.tried = f.Bytes(), nil
	return nil
}

// allowed looks before anything is made: the file must be what was read, and this user must be free to write to it,
// for a rename would go past a file that somebody made read-only.
func (f *File) allowed(target string) error {
	there, err := f.unchanged(target)
	if err != nil || !there {
		return err
	}
	if err := f.again(ErrBusy, func() error { return f.system.Writable(target) }); err != nil {
		if errors.Is(err, fs.ErrPermission) && !errors.Is(err, ErrBusy) {
			err = errReadOnly
		}
		return f.failed(looking, err)
	}
	return nil
}

// lock takes the writer's lock; held is false where there are none to be had.
func (f *File) lock(target string) (unlock func() error, held bool, err error) {
	err = f.again(ErrLocked, func() (err error) {
		unlock, err = f.system.Lock(target)
		return err
	})
	if errors.Is(err, ErrNoLocks) {
		return func() error { return nil }, false, nil
	}
	return unlock, err == nil, err
}

// again repeats a call a few times while it fails with an error that passes by itself.
func (f *File) again(passing error, call func() error) error {
	err := call()
	for n := 0; n < mostTries && errors.Is(err, passing); n++ {
		f.system.Pause(n)
		err = call()
	}
	return err
}

// sweep takes away what programs that died while saving this case have left. Nobody else writes while the lock is held.
func (f *File) sweep(target string) {
	names, err := f.system.Names(folder(target))
	if err != nil {
		return // they harm nobody
	}
	before, after, _ := strings.Cut(filepath.Base(beside(target, ".*.part")), "*")
	for _, name := range names {
		number, ok := strings.CutPrefix(name, before)
		number, part := strings.CutSuffix(number, after)
		if ok && part && number != "" && strings.Trim(number, "0123456789") == "" {
			_ = f.system.Remove(filepath.Join(folder(target), name))
		}
	}
}

// write puts the new bytes beside the file and gives their path.
func (f *File) write(target string) (string, error) {
	temp, err := f.system.Temp(beside(target, ".*.part"), target)
	if err != nil {
		return "", f.failed(writing, err)
	}
	n, err := temp.Write(f.src.raw)
	if err == nil && n != len(f.src.raw) {
		err = io.ErrShortWrite
	}
	if err == nil {
		err = temp.Sync()
	}
	if closed := temp.Close(); err == nil {
		err = closed
	}
	if err != nil {
		_ = f.system.Remove(temp.Name())
		return "", f.failed(writing, err)
	}
	return temp.Name(), nil
}

// replace looks again and renames the new file into the place of the old one.
func (f *File) replace(temp, target string) error {
	var refused error
	err := f.again(ErrBusy, func() error {
		if refused = f.still(target); refused != nil {
			return nil
		}
		f.tried = f.Bytes()
		return f.system.Rename(temp, target)
	})
	if refused != nil {
		_ = f.system.Remove(temp)
		return refused
	}
	if err == nil {
		return nil
	}
	return f.settle(temp, target, err)
}

// settle finds out what a failed rename did: on a network drive it may have been done. Once the new file is taken
// away it cannot be renamed late.
func (f *File) settle(temp, target string, err error) error {
	_ = f.system.Remove(temp)
	now, lookErr := f.system.ReadFile(target, mostBytes+1)
	switch {
	case lookErr == nil && bytes.Equal(now, f.tried):
		return nil
	case lookErr == nil && bytes.Equal(now, f.read), f.read == nil && errors.Is(lookErr, fs.ErrNotExist):
		return f.failed(replacing, err)
	}
	return f.failed(unsettled, err)
}

// still proves just before the rename that the path leads to the same file and that nobody changed it.
func (f *File) still(target string) error {
	now, err := f.system.Real(f.Path)
	if err == nil && now != target {
		err = errElsewhere
	}
	if err != nil {
		return f.failed(finding, err)
	}
	_, err = f.unchanged(target)
	return err
}

// unchanged compares the file on disk with what was read, or with what an earlier Save wrote and could not confirm.
func (f *File) unchanged(target string) (there bool, err error) {
	mode, err := f.system.Standing(target)
	var now []byte
	switch {
	case err != nil || f.read == nil && f.tried == nil:
	case !mode.IsRegular():
		return true, f.failed(looking, errNotPlain)
	case mode.Perm()&0o222 == 0:
		return true, f.failed(looking, errReadOnly)
	default:
		now, err = f.system.ReadFile(target, mostBytes+1)
	}
	missing := errors.Is(err, fs.ErrNotExist)
	switch {
	case err != nil && !missing:
		return false, f.failed(looking, err)
	case missing && f.read == nil:
		return false, nil
	case missing:
		return false, &ChangedError{Path: f.Path, Gone: true}
	case f.tried != nil && bytes.Equal(now, f.tried):
		f.read = f.tried
		return true, nil
	case f.read == nil:
		return true, &ChangedError{Path: f.Path, There: true}
	case sha256.Sum256(now) == sha256.Sum256(f.read):
		return true, nil
	}
	return true, &ChangedError{Path: f.Path, What: whatChanged(f.read, now)}
}

// longestName is how many bytes of a file's own name go into the names beside it; systems end at 255.
const longestName = 200

// beside gives the path of a file that belongs to another one, hidden and in the same folder: .NAME and an ending. A
// long name is cut and told apart by its hash.
func beside(path, ending string) string {
	name := filepath.Base(path)
	if len(name) > longestName {
		sum := sha256.Sum256([]byte(name))
		cut := longestName
		for !utf8.RuneStart(name[cut]) {
			cut--
		}
		name = name[:cut] + "-" + hex.EncodeToString(sum[:4])
	}
	return filepath.Join(folder(path), "."+name+ending)
}
