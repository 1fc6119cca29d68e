package measure

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
)

// FS is what saving a case needs of a file system; the operating system's is used unless a test gives another.
type FS interface {
	// ReadFile gives at most most bytes of a file.
	ReadFile(path string, most int64) ([]byte, error)
	// Real gives the path behind a symbolic link; the path itself when there is no file.
	Real(path string) string
	// Temp makes a new file in a folder, with the permissions of the file it will replace if there is one.
	Temp(folder, pattern, like string) (TempFile, error)
	// Rename puts one file in the place of another in one step.
	Rename(from, to string) error
	Remove(path string) error
	// SyncFolder makes a rename last; file systems that cannot do it report no error.
	SyncFolder(path string) error
	// Lock takes the writer's lock of a file without waiting; ErrLocked when another holds it.
	Lock(path string) (unlock func(), err error)
}

// TempFile is a file being written.
type TempFile interface {
	io.WriteCloser
	Name() string
	Sync() error
}

// ErrLocked tells that another program is writing the case.
var ErrLocked = errors.New("another program is writing this case at this moment; try again")

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
func (osFS) Real(path string) string {
	if real, err := filepath.EvalSymlinks(path); err == nil {
		return real
	}
	return path
}

// Temp makes a file readable like the one it replaces, or by those the user's own settings allow.
func (osFS) Temp(folder, pattern, like string) (TempFile, error) {
	var f *os.File
	err := fs.ErrExist
	for n := 0; n < 1000 && errors.Is(err, fs.ErrExist); n++ {
		name := filepath.Join(folder, strings.Replace(pattern, "*", strconv.Itoa(os.Getpid()+n), 1))
		f, err = os.OpenFile(name, os.O_RDWR|os.O_CREATE|os.O_EXCL, 0o666)
	}
	if err != nil {
		return nil, err
	}
	if info, statErr := os.Stat(like); statErr == nil {
		err = f.Chmod(info.Mode().Perm())
	}
	if err != nil {
		return nil, errors.Join(err, f.Close(), os.Remove(f.Name()))
	}
	return f, nil
}

// Rename replaces a file.
func (osFS) Rename(from, to string) error { return os.Rename(from, to) }

// Remove takes a file away.
func (osFS) Remove(path string) error { return os.Remove(path) }
