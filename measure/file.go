package measure

import (
	"fmt"
	"io/fs"
	"path/filepath"
	"strconv"

	"gopkg.in/yaml.v3"
)

// File is a case file: the bytes as read and the case they hold. Changes are appended or rewrite only the line
// that changed; every other byte stays.
type File struct {
	Path string
	Case *Case

	src    *source
	root   *yaml.Node // the map at the top of the file
	read   []byte     // what is on disk as far as this file knows; nil for a file that is not there yet
	tried  []byte     // what a Save wrote that could not be confirmed; it may be on disk
	system FS
}

// Load reads a case file. The error is a Problems with every fault of the file in order, or tells why the file
// cannot be read.
func Load(path string) (*File, error) { return LoadFrom(osFS{}, path) }

// LoadFrom reads a case file of a file system.
func LoadFrom(system FS, path string) (*File, error) {
	raw, err := system.ReadFile(path, mostBytes+1)
	if err != nil {
		return nil, fmt.Errorf("%s: cannot be read: %w", path, bareError(err))
	}
	f, err := Parse(path, raw)
	if err != nil {
		return nil, err
	}
	f.read, f.system = f.src.raw, system
	return f, nil
}

// Parse reads a case from bytes; name is used in messages and as the path to save to. The error is a Problems.
func Parse(name string, raw []byte) (*File, error) {
	raw = append([]byte{}, raw...)
	doc, whole, problems := document(raw)
	if doc == nil {
		return nil, problems.sorted(name)
	}
	root, problems := checkVersion(doc, problems)
	if root == nil {
		return nil, problems.sorted(name)
	}
	r := &reader{problems: problems, cut: !whole}
	tree := r.read(root, keyTable().root, "", "", 0)
	if r.cut {
		return nil, r.problems.sorted(name)
	}
	c := buildCase(tree)
	r.contradictions(tree, c)
	if p := r.problems.sorted(name); p != nil {
		return nil, p
	}
	return &File{Path: name, Case: c, src: newSource(raw), root: root, system: osFS{}}, nil
}

// checkVersion finds the map at the top and refuses versions this program does not know; without a root nothing
// further can be read.
func checkVersion(doc *yaml.Node, problems Problems) (*yaml.Node, Problems) {
	refuse := func(n *yaml.Node, key, message, hint string) (*yaml.Node, Problems) {
		r := &reader{problems: problems}
		r.fault(n, key, message, hint)
		return nil, r.problems
	}
	if len(doc.Content) == 0 || empty(doc.Content[0]) {
		return refuse(nil, "", "the file is empty", "a case file begins with drivemend: 1")
	}
	root := doc.Content[0]
	if root.Kind != yaml.MappingNode {
		return refuse(root, "", "a case file is a map of keys, not "+shape(root), "it begins with drivemend: 1")
	}
	for i := 0; i+1 < len(root.Content); i += 2 {
		if root.Content[i].Value != "drivemend" {
			continue
		}
		v := root.Content[i+1]
		n, err := strconv.Atoi(v.Value)
		if err == nil && n > 1 {
			return refuse(v, "drivemend", "version "+v.Value+" is newer than this program, which reads version 1",
				"use a newer program; nothing was changed")
		}
		return root, problems
	}
	return root, problems
}

// New starts a case file that is not yet on disk: id is its short name, opened a date as 2026-12-01.
func New(path, id, opened string) (*File, error) {
	text := "drivemend: 1\ncase: " + scalar(id, false) + "\n"
	if opened != "" {
		text += "opened: " + scalar(opened, false) + "\n"
	}
	f, err := Parse(path, []byte(text))
	if p, ok := err.(Problems); ok {
		return nil, p.placeless()
	}
	return f, err
}

// Bytes gives the file as it would be saved.
func (f *File) Bytes() []byte { return append([]byte{}, f.src.raw...) }

// Saved tells whether the file on disk, as last read or written, holds all changes.
func (f *File) Saved() bool {
	return f.tried == nil && f.read != nil && string(f.read) == string(f.src.raw)
}

// bareError takes the path off a file error; the message names it already.
func bareError(err error) error {
	if p, ok := err.(*fs.PathError); ok {
		return p.Err
	}
	return err
}

// folder gives the folder a path lies in.
func folder(path string) string { return filepath.Dir(path) }
