//go:build darwin || dragonfly || freebsd || linux || netbsd || openbsd

package measure

import (
	"errors"
	"io/fs"
	"os"
	"syscall"
)

// neverWait keeps a pipe without a reader from hanging the program, neverFollow a link from leading it astray.
const (
	neverWait   = syscall.O_NONBLOCK
	neverFollow = syscall.O_NOFOLLOW
)

// lockFile takes the lock without waiting.
func lockFile(f *os.File) error {
	err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
	switch {
	case errors.Is(err, syscall.EWOULDBLOCK), errors.Is(err, syscall.EACCES):
		return ErrLocked // some network drives say access denied for a lock that another holds (from memory)
	case errors.Is(err, syscall.ENOTSUP), errors.Is(err, syscall.ENOSYS), errors.Is(err, syscall.ENOLCK), errors.Is(err, syscall.EINVAL):
		return ErrNoLocks
	}
	return err
}

// unlockFile gives the lock back; closing does the same.
func unlockFile(f *os.File) error { return syscall.Flock(int(f.Fd()), syscall.LOCK_UN) }

// release takes the lock file away while the lock is still held, so that nobody locks a file that is gone.
func release(f *os.File, name string) error {
	return errors.Join(os.Remove(name), unlockFile(f), f.Close())
}

// SyncFolder makes the rename last through a power cut.
func (osFS) SyncFolder(path string) error {
	d, err := os.Open(path)
	if errors.Is(err, fs.ErrPermission) {
		return nil // a folder that may be written but not read cannot be synced by this user
	}
	if err != nil {
		return err
	}
	defer d.Close()
	if err := d.Sync(); err != nil && !cannotSync(err) {
		return err
	}
	return nil
}

// cannotSync tells whether a file system has no sync at all.
func cannotSync(err error) bool {
	return errors.Is(err, syscall.EINVAL) || errors.Is(err, syscall.ENOTSUP) || errors.Is(err, syscall.ENOSYS)
}

// keepOwner gives a file the owner and group of the one it replaces, or the group alone: others of a shared folder
// go on reading and writing it.
func keepOwner(f *os.File, like fs.FileInfo) {
	if st, ok := like.Sys().(*syscall.Stat_t); ok && f.Chown(int(st.Uid), int(st.Gid)) != nil {
		_ = f.Chown(-1, int(st.Gid))
	}
}

// heldOpen tells whether an error passes when another program lets go of the file.
func heldOpen(err error) bool {
	return errors.Is(err, syscall.EBUSY) || errors.Is(err, syscall.ETXTBSY)
}

// systemTroubles are the errors of these systems that a technician can do something about.
var systemTroubles = []trouble{
	{diskFull, []error{syscall.ENOSPC, syscall.EDQUOT, syscall.EFBIG}},
	{writeProtected, []error{syscall.EROFS}},
	{diskFault, []error{syscall.EIO, syscall.ENXIO, syscall.ENODEV}},
	{notAnswering, []error{syscall.ETIMEDOUT, syscall.EHOSTDOWN, syscall.EHOSTUNREACH, syscall.ENETDOWN, syscall.ESTALE, syscall.ENOTCONN}},
	{pathTooLong, []error{syscall.ENAMETOOLONG}},
	{folderGone, []error{syscall.ENOTDIR}},
}
