package measure

import (
	"errors"
	"os"
	"path/filepath"
)

// Lock takes an operating-system lock on a small file beside the case, .NAME.lock, which is taken away again when
// the lock is given back. A program that dies gives its lock back with it.
func (osFS) Lock(path string) (unlock func(), err error) {
	name := filepath.Join(folder(path), "."+filepath.Base(path)+".lock")
	// The file may be taken away between opening and locking it; then the lock is on nothing, and is taken anew.
	for range 100 {
		f, err := os.OpenFile(name, os.O_RDWR|os.O_CREATE, 0o666)
		if err != nil {
			return nil, err
		}
		if err := lockFile(f); err != nil {
			return nil, errors.Join(err, f.Close())
		}
		if held, err := f.Stat(); err == nil {
			if there, err := os.Stat(name); err == nil && os.SameFile(held, there) {
				return func() { release(f, name) }, nil
			}
		}
		unlockFile(f)
		f.Close()
	}
	return nil, ErrLocked
}
