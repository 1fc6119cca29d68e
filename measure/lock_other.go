//go:build !(darwin || dragonfly || freebsd || linux || netbsd || openbsd || windows)

package measure

import (
	"errors"
	"io/fs"
	"os"
)

// neverWait and neverFollow have no counterpart that all these systems share.
const (
	neverWait   = 0
	neverFollow = 0
)

// lockFile has no locks to take.
func lockFile(*os.File) error { return ErrNoLocks }

// unlockFile has nothing to give back.
func unlockFile(*os.File) error { return nil }

// release takes the lock file away.
func release(f *os.File, name string) error { return errors.Join(f.Close(), os.Remove(name)) }

// SyncFolder does nothing.
func (osFS) SyncFolder(string) error { return nil }

// keepOwner does nothing.
func keepOwner(*os.File, fs.FileInfo) {}

// heldOpen knows no such errors.
func heldOpen(error) bool { return false }

// cannotSync knows no such errors.
func cannotSync(error) bool { return false }

// systemTroubles are none.
var systemTroubles []trouble
