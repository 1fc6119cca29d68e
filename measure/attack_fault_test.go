package measure

import (
	"fmt"
	"io/fs"
	"syscall"
)

// fault is one way a call fails.
type fault struct {
	kind  string
	err   error
	only  string // the one call it happens to, "" for any
	done  bool   // the call is done all the same
	lasts bool   // every later call of the same name fails too
	share int    // of a write: how many per cent of the bytes are written before it fails
}

// kinds are the errors of full, broken, protected, unplugged and networked disks.
var kinds = []fault{
	{kind: "disk full", err: syscall.ENOSPC},
	{kind: "disk fault", err: syscall.EIO},
	{kind: "no rights", err: syscall.EACCES},
	{kind: "write-protected", err: syscall.EROFS},
	{kind: "folder gone", err: syscall.ENOENT},
	{kind: "open elsewhere", err: fmt.Errorf("%w: %w", ErrBusy, syscall.EBUSY)},
	{kind: "timed out", err: syscall.ETIMEDOUT},
	{kind: "stale handle", err: syscall.ESTALE},
	{kind: "path too long", err: syscall.ENAMETOOLONG},
	{kind: "interrupted", err: syscall.EINTR},
	{kind: "already there", err: syscall.EEXIST},
	{kind: "locked", err: ErrLocked, only: "lock"},
	{kind: "no locks", err: ErrNoLocks, only: "lock"},
	{kind: "short write", only: "write"},
}

// changing are the calls that may be done and report an error all the same; the others only look.
var changing = map[string]bool{"temp": true, "write": true, "sync": true, "close": true, "rename": true, "remove": true,
	"sync folder": true, "lock": true, "unlock": true}

// faults lists every way a call can fail.
func faults(call string) []fault {
	var out []fault
	for _, k := range kinds {
		if k.only != "" && k.only != call {
			continue
		}
		for _, done := range []bool{false, true} {
			for _, lasts := range []bool{false, true} {
				f := k
				f.done, f.lasts = done, lasts
				switch {
				case done && !changing[call] || done && k.only != "":
				case call == "write" && !done:
					for _, share := range []int{0, 1, 50, 99} {
						f.share = share
						out = append(out, f)
					}
				default:
					out = append(out, f)
				}
			}
		}
	}
	return out
}

// faulty is a model in which planned calls fail.
type faulty struct {
	*model
	plan    func(n int, call string) (fault, bool) // by the number of the call
	calls   []string
	lasting map[string]fault
	hits    map[string]int // failures by kind
	litters bool           // a failure that must leave something behind
}

func newFaulty(m *model, plan func(n int, call string) (fault, bool)) *faulty {
	return &faulty{model: m, plan: plan, lasting: map[string]fault{}, hits: map[string]int{}}
}

// hit tells whether and how a call fails.
func (f *faulty) hit(call string) (fault, bool) {
	hit, ok := f.lasting[call]
	if !ok {
		hit, ok = f.plan(len(f.calls), call)
	}
	f.calls = append(f.calls, call)
	if !ok {
		return fault{}, false
	}
	if hit.lasts {
		f.lasting[call] = hit
	}
	f.hits[hit.kind]++
	switch call {
	case "remove", "unlock":
		f.litters = f.litters || !hit.done
	case "temp", "lock":
		f.litters = f.litters || hit.done
	}
	return hit, true
}

// try runs a call or lets it fail.
func (f *faulty) try(call string, do func() error) error {
	hit, ok := f.hit(call)
	if !ok {
		return do()
	}
	if hit.done {
		_ = do()
	}
	return hit.err
}

func (f *faulty) ReadFile(path string, most int64) (b []byte, err error) {
	err = f.try("read", func() (err error) { b, err = f.model.ReadFile(path, most); return err })
	return b, err
}

func (f *faulty) Real(path string) (real string, err error) {
	err = f.try("real", func() (err error) { real, err = f.model.Real(path); return err })
	return real, err
}

func (f *faulty) Standing(path string) (mode fs.FileMode, err error) {
	err = f.try("standing", func() (err error) { mode, err = f.model.Standing(path); return err })
	return mode, err
}

func (f *faulty) Writable(path string) error {
	return f.try("writable", func() error { return f.model.Writable(path) })
}

func (f *faulty) Names(folder string) (names []string, err error) {
	err = f.try("names", func() (err error) { names, err = f.model.Names(folder); return err })
	return names, err
}

func (f *faulty) Temp(name, like string) (temp TempFile, err error) {
	err = f.try("temp", func() (err error) { temp, err = f.model.Temp(name, like); return err })
	if err != nil {
		return nil, err
	}
	return &faultyFile{temp, f}, nil
}

func (f *faulty) Rename(from, to string) error {
	return f.try("rename", func() error { return f.model.Rename(from, to) })
}

func (f *faulty) Remove(path string) error {
	return f.try("remove", func() error { return f.model.Remove(path) })
}

func (f *faulty) SyncFolder(path string) error {
	return f.try("sync folder", func() error { return f.model.SyncFolder(path) })
}

// Lock that fails after it was done leaves the lock file lying, as a program that dies does. An unlock that fails
// leaves it too; the lock itself goes with the open file.
func (f *faulty) Lock(path string) (unlock func() error, err error) {
	var done func() error
	err = f.try("lock", func() (err error) { done, err = f.model.Lock(path); return err })
	if err != nil {
		if done != nil {
			f.held[path] = false
		}
		return nil, err
	}
	return func() error {
		defer func() { f.held[path] = false }()
		return f.try("unlock", done)
	}, nil
}

// faultyFile is a file of a faulty file system.
type faultyFile struct {
	TempFile
	faulty *faulty
}

func (f *faultyFile) Write(b []byte) (int, error) {
	hit, ok := f.faulty.hit("write")
	if !ok {
		return f.TempFile.Write(b)
	}
	n := len(b) * hit.share / 100
	if hit.done {
		n = len(b)
	}
	_, _ = f.TempFile.Write(b[:n])
	return n, hit.err
}

func (f *faultyFile) Sync() error  { return f.faulty.try("sync", f.TempFile.Sync) }
func (f *faultyFile) Close() error { return f.faulty.try("close", f.TempFile.Close) }
