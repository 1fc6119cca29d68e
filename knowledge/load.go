package knowledge

import (
	"bytes"
	"crypto/sha256"
	"embed"
	"encoding/hex"
	"errors"
	"fmt"
	"hash"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"strings"
)

//go:embed base/*.yaml
var embedded embed.FS

// embeddedName is how messages name the folder of the embedded base.
const embeddedName = "base"

// lists are the files of a rule base in the order in which they are read and hashed.
var lists = []string{"causes", "stresses", "faults", "signs", "tests", "repairs", "cautions", "sources"}

// maxFile is the size above which a rule file is refused: no hand-written list comes near it.
const maxFile = 1 << 20

// layer is one folder of rule files; later layers lie over earlier ones.
type layer struct {
	name string // as messages name the folder; "" for none
	fsys fs.FS
}

// Load gives the embedded base. The error is a Problems with every fault in order, at most twenty.
func Load() (*Base, error) { return load(embeddedLayer()) }

// LoadWith gives the embedded base with the files of a folder laid over it: an entry with a known id takes the
// place of the old one, a new id is added at the end. The folder may hold any of the files of a base; a folder
// without any, or with a YAML file of another name, is an error, and so is an entry that would let a step past a hold
// point before which the built-in one stood. Errors are as for Load.
func LoadWith(dir string) (*Base, error) {
	return load(embeddedLayer(), layer{name: dir, fsys: os.DirFS(dir)})
}

// LoadFS gives the base that the given folders hold, each laid over those before it. Errors are as for Load.
func LoadFS(folders ...fs.FS) (*Base, error) {
	layers := make([]layer, len(folders))
	for i, f := range folders {
		layers[i] = layer{fsys: f}
	}
	return load(layers...)
}

func embeddedLayer() layer {
	sub, err := fs.Sub(embedded, "base")
	if err != nil { // cannot be: the name is a valid path
		sub = embedded
	}
	return layer{name: embeddedName, fsys: sub}
}

// load reads, merges, decodes and checks. A file that is no list keeps the cross-checks from running: they would
// only repeat it as missing ids.
func load(layers ...layer) (*Base, error) {
	faults := &collector{}
	sum := sha256.New()
	merged := newMerge(faults)
	for _, l := range layers {
		readLayer(l, merged, sum, faults)
	}
	d := newDecoder(faults)
	d.decode(merged)
	if !faults.unreadable {
		d.crossCheck()
	}
	if err := faults.err(); err != nil {
		return nil, err
	}
	d.base.Hash = hex.EncodeToString(sum.Sum(nil))
	return d.base, nil
}

// readLayer adds the files of one folder to the merge and their bytes to the hash.
func readLayer(l layer, merged *merge, sum hash.Hash, faults *collector) {
	checkFolder(l, faults)
	found := false
	for _, list := range lists {
		raw, err := readFile(l.fsys, list+".yaml")
		if errors.Is(err, fs.ErrNotExist) {
			continue
		}
		found = true
		name := l.file(list + ".yaml")
		faults.enter(name)
		if err != nil {
			faults.unreadable = true
			faults.add(spot{file: name}, "cannot be read: "+cause(err), "")
			continue
		}
		sum.Write(raw)
		merged.add(list, name, raw)
	}
	if !found && len(faults.list) == 0 {
		faults.unreadable = true
		faults.add(spot{file: l.file("")}, "holds no file of a rule base",
			"expected any of "+strings.Join(lists, ".yaml, ")+".yaml")
	}
}

// checkFolder reports YAML files that no list reads, which are most often misspelt names.
func checkFolder(l layer, faults *collector) {
	entries, err := fs.ReadDir(l.fsys, ".")
	if err != nil {
		faults.enter(l.file(""))
		faults.unreadable = true
		faults.add(spot{file: l.file("")}, "cannot be read: "+cause(err), "give the folder that holds the rule files")
		return
	}
	for _, e := range entries {
		name := e.Name()
		stem, isYAML := strings.CutSuffix(name, ".yaml")
		if short, ok := strings.CutSuffix(name, ".yml"); ok {
			stem, isYAML = short, true
		}
		if !isYAML || (contains(lists, stem) && name == stem+".yaml") {
			continue
		}
		faults.enter(l.file(name))
		faults.unreadable = true
		hint := ""
		if near := closest(stem, lists); near != "" {
			hint = "rename it to " + near + ".yaml"
		}
		faults.add(spot{file: l.file(name)}, "is no file of a rule base; the files are "+
			strings.Join(lists, ".yaml, ")+".yaml", hint)
	}
}

// readFile gives the bytes of a file with the line ends of Windows taken out, so that the hash, and with it
// every seeded draw, is the same on every platform.
func readFile(fsys fs.FS, name string) ([]byte, error) {
	info, err := fs.Stat(fsys, name)
	if err != nil {
		return nil, err
	}
	if info.IsDir() {
		return nil, errors.New("it is a folder")
	}
	if info.Size() > maxFile {
		return nil, fmt.Errorf("it has %d bytes, the most is %d", info.Size(), maxFile)
	}
	raw, err := fs.ReadFile(fsys, name)
	if err != nil {
		return nil, err
	}
	return bytes.ReplaceAll(raw, []byte("\r\n"), []byte("\n")), nil
}

// file gives the name of a file of the layer as messages show it.
func (l layer) file(name string) string {
	if l.name == "" {
		return name
	}
	if l.name == embeddedName {
		return path.Join(l.name, name)
	}
	return filepath.Join(l.name, name)
}

// cause takes the operation and the path off a file error.
func cause(err error) string {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err.Error()
	}
	return err.Error()
}
