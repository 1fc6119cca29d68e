package measure

import (
	"errors"
	"io/fs"
	"os"

	"golang.org/x/sys/windows"
)

// neverWait and neverFollow are not needed here: opening never waits, and a link needs special rights to be made.
const (
	neverWait   = 0
	neverFollow = 0
)

// lockFile takes the lock without waiting.
func lockFile(f *os.File) error {
	const flags = windows.LOCKFILE_EXCLUSIVE_LOCK | windows.LOCKFILE_FAIL_IMMEDIATELY
	err := windows.LockFileEx(windows.Handle(f.Fd()), flags, 0, 1, 0, &windows.Overlapped{})
	switch {
	case errors.Is(err, windows.ERROR_LOCK_VIOLATION), errors.Is(err, windows.ERROR_IO_PENDING):
		return ErrLocked
	case errors.Is(err, windows.ERROR_INVALID_FUNCTION), errors.Is(err, windows.ERROR_NOT_SUPPORTED):
		return ErrNoLocks
	}
	return err
}

// unlockFile gives the lock back; closing does the same.
func unlockFile(f *os.File) error {
	return windows.UnlockFileEx(windows.Handle(f.Fd()), 0, 1, 0, &windows.Overlapped{})
}

// release gives the lock back and takes the file away if nobody else has it open: here an open file cannot be
// taken away.
func release(f *os.File, name string) error {
	return errors.Join(unlockFile(f), f.Close(), os.Remove(name))
}

// SyncFolder does nothing: folders cannot be synced here, the file system keeps its own journal.
func (osFS) SyncFolder(string) error { return nil }

// cannotSync tells whether a file system has no sync at all.
func cannotSync(err error) bool {
	return errors.Is(err, windows.ERROR_INVALID_FUNCTION) || errors.Is(err, windows.ERROR_NOT_SUPPORTED)
}

// keepOwner does nothing: a new file takes the rights of its folder.
func keepOwner(*os.File, fs.FileInfo) {}

// heldOpen tells whether an error passes when another program lets go of the file. Replacing a file that is open
// elsewhere is refused as access denied.
func heldOpen(err error) bool {
	for _, e := range []error{windows.ERROR_SHARING_VIOLATION, windows.ERROR_LOCK_VIOLATION, windows.ERROR_ACCESS_DENIED,
		windows.ERROR_DELETE_PENDING, windows.ERROR_USER_MAPPED_FILE} {
		if errors.Is(err, e) {
			return true
		}
	}
	return false
}

// systemTroubles are the errors of this system that a technician can do something about.
var systemTroubles = []trouble{
	{diskFull, []error{windows.ERROR_DISK_FULL, windows.ERROR_HANDLE_DISK_FULL, windows.ERROR_DISK_QUOTA_EXCEEDED}},
	{writeProtected, []error{windows.ERROR_WRITE_PROTECT}},
	{diskFault, []error{windows.ERROR_CRC, windows.ERROR_IO_DEVICE, windows.ERROR_WRITE_FAULT, windows.ERROR_NOT_READY}},
	{notAnswering, []error{windows.ERROR_BAD_NETPATH, windows.ERROR_NETNAME_DELETED, windows.ERROR_SEM_TIMEOUT, windows.ERROR_UNEXP_NET_ERR,
		windows.ERROR_DEV_NOT_EXIST, windows.ERROR_BAD_NET_NAME}},
	{pathTooLong, []error{windows.ERROR_FILENAME_EXCED_RANGE}},
}
