//go:build darwin || dragonfly || freebsd || linux || netbsd || openbsd

package measure

import (
	"errors"
	"os"
	"syscall"
)

// lockFile takes the lock without waiting.
func lockFile(f *os.File) error {
	err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
	switch {
	case errors.Is(err, syscall.EWOULDBLOCK):
		return ErrLocked
	case errors.Is(err, syscall.ENOTSUP), errors.Is(err, syscall.ENOSYS), errors.Is(err, syscall.ENOLCK):
		return nil // some network folders have no locks; the content check before the rename remains
	}
	return err
}

// unlockFile gives the lock back; closing does the same.
func unlockFile(f *os.File) { _ = syscall.Flock(int(f.Fd()), syscall.LOCK_UN) }

// release takes the lock file away while the lock is still held, so that nobody locks a file that is gone.
func release(f *os.File, name string) {
	_ = os.Remove(name)
	unlockFile(f)
	_ = f.Close()
}

// SyncFolder makes the rename last through a power cut.
func (osFS) SyncFolder(path string) error {
	d, err := os.Open(path)
	if err != nil {
		return nil // the folder may be write-only; the file itself is synced
	}
	defer d.Close()
	if err := d.Sync(); err != nil && !errors.Is(err, syscall.EINVAL) && !errors.Is(err, syscall.ENOTSUP) {
		return err
	}
	return nil
}
