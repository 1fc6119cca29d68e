package measure

import (
	"bytes"
	"io/fs"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
)

// blob is the content of a file: what programs read, and what is on the disk for sure.
type blob struct {
	data, synced []byte
	dirty        bool // written to since the last sync
	mode         fs.FileMode
}

// whole makes a blob that is safe on the disk.
func whole(text string) *blob {
	return &blob{data: []byte(text), synced: []byte(text), mode: 0o644}
}

// afterPowerCut gives what a power cut may leave of a blob.
func (b *blob) afterPowerCut() [][]byte {
	switch {
	case b == nil:
		return [][]byte{nil}
	case !b.dirty:
		return [][]byte{b.synced}
	}
	return [][]byte{{}, b.data[:len(b.data)/2], b.data, make([]byte, len(b.data))}
}

// model is a file system in memory. It keeps apart what programs see and what the disk holds: bytes last from the
// sync of their file on, names from the sync of their folder on, and until then a power cut may leave either.
type model struct {
	now, lasting map[string]*blob
	pending      []map[string]*blob // changes of names since the last sync of the folder, in order; nil takes away
	links        map[string]string
	held         map[string]bool // locks
	pauses       int
	after        func() // runs after every change: the moment of a kill or a power cut
}

func newModel(files map[string]*blob) *model {
	m := &model{now: map[string]*blob{}, lasting: map[string]*blob{}, links: map[string]string{}, held: map[string]bool{}, after: func() {}}
	for name, b := range files {
		m.now[name], m.lasting[name] = b, b
	}
	return m
}

// names changes what names there are in one step.
func (m *model) names(change map[string]*blob) {
	for name, b := range change {
		if b == nil {
			delete(m.now, name)
		} else {
			m.now[name] = b
		}
	}
	m.pending = append(m.pending, change)
	m.after()
}

// survivors gives every content a path may have after a power cut at this moment; nil stands for no file.
func (m *model) survivors(path string) [][]byte {
	out := m.lasting[path].afterPowerCut()
	for _, change := range m.pending {
		if b, ok := change[path]; ok {
			out = append(out, b.afterPowerCut()...)
		}
	}
	return out
}

// content gives what programs read at a path, nil for no file.
func (m *model) content(path string) []byte {
	if b := m.now[path]; b != nil {
		return b.data
	}
	return nil
}

func missing(op, path string) error { return &fs.PathError{Op: op, Path: path, Err: syscall.ENOENT} }

func (m *model) ReadFile(path string, most int64) ([]byte, error) {
	if b := m.now[path]; b != nil {
		return bytes.Clone(b.data), nil
	}
	return nil, missing("open", path)
}

func (m *model) Real(path string) (string, error) {
	if to := m.links[path]; to != "" {
		return to, nil
	}
	return path, nil
}

func (m *model) Standing(path string) (fs.FileMode, error) {
	if b := m.now[path]; b != nil {
		return b.mode, nil
	}
	return 0, missing("lstat", path)
}

func (m *model) Writable(path string) error {
	_, err := m.Standing(path)
	return err
}

func (m *model) Names(folder string) ([]string, error) {
	var out []string
	for name := range m.now {
		if filepath.Dir(name) == folder {
			out = append(out, filepath.Base(name))
		}
	}
	slices.Sort(out)
	return out, nil
}

func (m *model) Temp(name, like string) (TempFile, error) {
	for n := 'a'; n <= 'z'; n++ {
		path := strings.Replace(name, "*", strings.Repeat("7", int(n-'a')+1), 1)
		if m.now[path] == nil {
			b := &blob{mode: 0o644}
			m.names(map[string]*blob{path: b})
			return &modelFile{m, b, path}, nil
		}
	}
	return nil, syscall.EEXIST
}

func (m *model) Rename(from, to string) error {
	b := m.now[from]
	if b == nil {
		return missing("rename", from)
	}
	m.names(map[string]*blob{from: nil, to: b})
	return nil
}

func (m *model) Remove(path string) error {
	if m.now[path] == nil {
		return missing("remove", path)
	}
	m.names(map[string]*blob{path: nil})
	return nil
}

func (m *model) SyncFolder(string) error {
	m.lasting, m.pending = map[string]*blob{}, nil
	for name, b := range m.now {
		m.lasting[name] = b
	}
	m.after()
	return nil
}

func (m *model) Lock(path string) (func() error, error) {
	if m.held[path] {
		return nil, ErrLocked
	}
	m.held[path] = true
	name := beside(path, ".lock")
	m.names(map[string]*blob{name: {mode: 0o644}})
	return func() error {
		m.held[path] = false
		return m.Remove(name)
	}, nil
}

func (m *model) Pause(int) { m.pauses++ }

// modelFile is a file being written in a model.
type modelFile struct {
	model *model
	blob  *blob
	name  string
}

func (f *modelFile) Name() string { return f.name }

func (f *modelFile) Write(b []byte) (int, error) {
	for _, half := range [][]byte{b[:len(b)/2], b[len(b)/2:]} {
		f.blob.data, f.blob.dirty = append(f.blob.data, half...), true
		f.model.after()
	}
	return len(b), nil
}

func (f *modelFile) Sync() error {
	f.blob.synced, f.blob.dirty = bytes.Clone(f.blob.data), false
	f.model.after()
	return nil
}

func (f *modelFile) Close() error { return nil }
