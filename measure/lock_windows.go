package measure

import (
	"errors"
	"os"

	"golang.org/x/sys/windows"
)

// lockFile takes the lock without waiting.
func lockFile(f *os.File) error {
	const flags = windows.LOCKFILE_EXCLUSIVE_LOCK | windows.LOCKFILE_FAIL_IMMEDIATELY
	err := windows.LockFileEx(windows.Handle(f.Fd()), flags, 0, 1, 0, &windows.Overlapped{})
	if errors.Is(err, windows.ERROR_LOCK_VIOLATION) || errors.Is(err, windows.ERROR_IO_PENDING) {
		return ErrLocked
	}
	return err
}

// unlockFile gives the lock back; closing does the same.
func unlockFile(f *os.File) {
	_ = windows.UnlockFileEx(windows.Handle(f.Fd()), 0, 1, 0, &windows.Overlapped{})
}

// release gives the lock back and takes the file away if nobody else has it open: here an open file cannot be
// taken away.
func release(f *os.File, name string) {
	unlockFile(f)
	_ = f.Close()
	_ = os.Remove(name)
}

// SyncFolder does nothing: folders cannot be synced here, the file system keeps its own journal.
func (osFS) SyncFolder(string) error { return nil }
