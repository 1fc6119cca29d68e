package measure

import (
	"errors"
	"os"
)

// errSide tells that something that is no plain file stands where the lock file belongs.
var errSide = errors.New("what stands at the name of its lock file is no plain file")

// Lock takes an operating-system lock on a small file beside the case, .NAME.lock, which is taken away again when
// the lock is given back. A program that dies gives its lock back with it; the file it leaves locks nobody out.
func (osFS) Lock(path string) (unlock func() error, err error) {
	name := beside(path, ".lock")
	// The file may be taken away between opening and locking it; then the lock is on nothing, and is taken anew.
	for range 100 {
		f, err := openLock(name)
		if err != nil {
			return nil, err
		}
		if err := lockFile(f); err != nil {
			if errors.Is(err, ErrNoLocks) {
				_ = os.Remove(name)
			}
			return nil, errors.Join(err, f.Close())
		}
		if held, err := f.Stat(); err == nil {
			if there, err := os.Stat(name); err == nil && os.SameFile(held, there) {
				return func() error { return release(f, name) }, nil
			}
		}
		_ = unlockFile(f)
		_ = f.Close()
	}
	return nil, ErrLocked
}

// openLock opens the lock file, which another user may have left so that it can only be read.
func openLock(name string) (*os.File, error) {
	f, err := os.OpenFile(name, os.O_RDWR|os.O_CREATE|neverWait|neverFollow, 0o666)
	if errors.Is(err, os.ErrPermission) {
		if readable, second := os.OpenFile(name, os.O_RDONLY|neverWait|neverFollow, 0); second == nil {
			f, err = readable, nil
		}
	}
	if info, there := os.Lstat(name); there == nil && !info.Mode().IsRegular() {
		if err == nil {
			_ = f.Close()
		}
		return nil, errSide
	}
	return f, err
}
