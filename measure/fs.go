package measure

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// FS is what saving a case needs of a file system; the operating system's is used unless a test gives another. Every
// one of its calls may fail, and a call may report an error though it was done, as network drives do.
type FS interface {
	// ReadFile gives at most most bytes of a file.
	ReadFile(path string, most int64) ([]byte, error)
	// Real gives the path behind symbolic links; where no file is, that of the file to be made. It fails for a link
	// that leads nowhere or in a circle.
	Real(path string) (string, error)
	// Standing tells what kind of file stands at a path, a link not followed; fs.ErrNotExist when nothing does.
	Standing(path string) (fs.FileMode, error)
	// Writable tells why this user may not write to a file that is there.
	Writable(path string) error
	// Names lists a folder.
	Names(folder string) ([]string, error)
	// Temp makes a new file beside another one, never more open than that one is; * in the name becomes a number.
	Temp(name, like string) (TempFile, error)
	// Rename puts one file in the place of another in one step; ErrBusy when another program holds that open.
	Rename(from, to string) error
	Remove(path string) error
	// SyncFolder makes a rename last; file systems that cannot do it report no error.
	SyncFolder(path string) error
	// Lock takes the writer's lock of a file without waiting; ErrLocked when another holds it, ErrNoLocks where there
	// are none.
	Lock(path string) (unlock func() error, err error)
	// Pause waits a moment before a call is tried again, the longer the more tries went before.
	Pause(tries int)
}

// TempFile is a file being written.
type TempFile interface {
	io.WriteCloser
	Name() string
	// Sync brings the bytes to the disk.
	Sync() error
}

// Errors of a file system that Save acts on.
var (
	// ErrLocked tells that another program is writing the case.
	ErrLocked = errors.New("another program is writing this case at this moment")
	// ErrNoLocks tells that a folder, most often on a network drive, knows no locks.
	ErrNoLocks = errors.New("this folder knows no locks")
	// ErrBusy tells that another program holds the case open so that it cannot be replaced.
	ErrBusy = errors.New("another program holds the file open")
)

// errLink tells that a path is a link without a file behind it.
var errLink = errors.New("the link leads nowhere or in a circle")

// osFS is the operating system's.
type osFS struct{}

// ReadFile reads at most so many bytes, so that an endless device cannot hang the program.
func (osFS) ReadFile(path string, most int64) ([]byte, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return io.ReadAll(io.LimitReader(f, most))
}

// Real follows symbolic links.
func (osFS) Real(path string) (string, error) {
	real, err := filepath.EvalSymlinks(path)
	if err == nil {
		return real, nil
	}
	if info, there := os.Lstat(path); there == nil {
		if info.Mode()&fs.ModeSymlink != 0 {
			return "", fmt.Errorf("%w: %w", errLink, err)
		}
		return path, nil // a plain file in a folder whose links cannot be followed here
	}
	if dir, err := filepath.EvalSymlinks(folder(path)); err == nil {
		return filepath.Join(dir, filepath.Base(path)), nil
	}
	return path, nil
}

// Standing looks without following a link.
func (osFS) Standing(path string) (fs.FileMode, error) {
	info, err := os.Lstat(path)
	if err != nil {
		return 0, err
	}
	return info.Mode(), nil
}

// Writable opens the file for writing and writes nothing: that asks for the rights of the user as well.
func (osFS) Writable(path string) error {
	f, err := os.OpenFile(path, os.O_WRONLY|neverWait, 0)
	if err != nil {
		return busy(err)
	}
	return f.Close()
}

// Names lists a folder.
func (osFS) Names(folder string) ([]string, error) {
	d, err := os.Open(folder)
	if err != nil {
		return nil, err
	}
	defer d.Close()
	return d.Readdirnames(-1)
}

// Temp makes a file with the owner and the rights of the one it will replace as far as the system lets it.
func (osFS) Temp(name, like string) (TempFile, error) {
	perm := fs.FileMode(0o666)
	info, missing := os.Stat(like)
	if missing == nil {
		perm = info.Mode().Perm()
	}
	var f *os.File
	err := fs.ErrExist
	for n := 0; n < 1000 && errors.Is(err, fs.ErrExist); n++ {
		f, err = os.OpenFile(strings.Replace(name, "*", fmt.Sprint(os.Getpid()+n), 1), os.O_RDWR|os.O_CREATE|os.O_EXCL, perm)
	}
	if err != nil {
		return nil, err
	}
	if missing == nil {
		// A memory stick may know neither owners nor rights: then the file keeps what it was made with, which is
		// never more than the old one allowed.
		keepOwner(f, info)
		_ = f.Chmod(perm)
	}
	return osTemp{f}, nil
}

// osTemp is a file of the operating system.
type osTemp struct{ *os.File }

// Sync reports no error where a file system cannot sync at all: there is nothing better to be had there.
func (f osTemp) Sync() error {
	if err := f.File.Sync(); err != nil && !cannotSync(err) {
		return err
	}
	return nil
}

// Rename replaces a file.
func (osFS) Rename(from, to string) error { return busy(os.Rename(from, to)) }

// busy marks the errors that pass by themselves when another program lets go of the file.
func busy(err error) error {
	if err != nil && heldOpen(err) {
		return fmt.Errorf("%w: %w", ErrBusy, err)
	}
	return err
}

// Remove takes a file away.
func (osFS) Remove(path string) error { return os.Remove(path) }

// Pause waits 5 ms and twice as long each time, 0.6 s over seven tries: what a virus scanner or another command takes
// to let go of a small file (judgement).
func (osFS) Pause(tries int) { time.Sleep(5 * time.Millisecond << min(tries, mostTries)) }
