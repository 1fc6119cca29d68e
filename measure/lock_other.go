//go:build !(darwin || dragonfly || freebsd || linux || netbsd || openbsd || windows)

package measure

import "os"

// lockFile does nothing on systems without such locks; the content check before the rename remains.
func lockFile(*os.File) error { return nil }

// unlockFile has nothing to give back.
func unlockFile(*os.File) {}

// release takes the lock file away.
func release(f *os.File, name string) {
	_ = f.Close()
	_ = os.Remove(name)
}

// SyncFolder does nothing.
func (osFS) SyncFolder(string) error { return nil }
