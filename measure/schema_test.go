package measure

import (
	"bytes"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/txtar"
	"github.com/santhosh-tekuri/jsonschema/v6"
	"gopkg.in/yaml.v3"
)

// compiledSchema is the schema as an editor holds it. Nothing is fetched: the compiler has no loader for addresses.
func compiledSchema(t testing.TB) *jsonschema.Schema {
	t.Helper()
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(Schema()))
	if err != nil {
		t.Fatal(err)
	}
	c := jsonschema.NewCompiler()
	c.UseLoader(jsonschema.SchemeURLLoader{})
	if err := c.AddResource(schemaID, doc); err != nil {
		t.Fatal(err)
	}
	s, err := c.Compile(schemaID)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// The numbers of YAML 1.2's core schema.
var (
	coreInt   = regexp.MustCompile(`^[-+]?[0-9]+$|^0o[0-7]+$|^0x[0-9a-fA-F]+$`)
	coreFloat = regexp.MustCompile(`^[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?$`)
)

// generic gives a node as an editor hands it to a schema: YAML 1.2's core schema, in which yes, no and dates are text.
// Numbers without end, which JSON has not, stay text. It fails where YAML has more than JSON.
func generic(n *yaml.Node) (any, bool) {
	switch n.Kind {
	case yaml.DocumentNode:
		if len(n.Content) == 0 {
			return nil, true
		}
		return generic(n.Content[0])
	case yaml.MappingNode:
		out := map[string]any{}
		for i := 0; i+1 < len(n.Content); i += 2 {
			if _, twice := out[n.Content[i].Value]; twice || n.Content[i].Kind != yaml.ScalarNode {
				return nil, false
			}
			v, ok := generic(n.Content[i+1])
			if !ok {
				return nil, false
			}
			out[n.Content[i].Value] = v
		}
		return out, true
	case yaml.SequenceNode:
		out := []any{}
		for _, c := range n.Content {
			v, ok := generic(c)
			if !ok {
				return nil, false
			}
			out = append(out, v)
		}
		return out, true
	case yaml.AliasNode:
		return generic(n.Alias)
	}
	return coreScalar(n), true
}

// coreScalar resolves one value.
func coreScalar(n *yaml.Node) any {
	if n.Style&^yaml.FlowStyle != 0 {
		return n.Value
	}
	switch n.Value {
	case "", "~", "null", "Null", "NULL":
		return nil
	case "true", "True", "TRUE":
		return true
	case "false", "False", "FALSE":
		return false
	}
	if coreInt.MatchString(n.Value) || coreFloat.MatchString(n.Value) {
		if v, err := strconv.ParseFloat(n.Value, 64); err == nil && !math.IsInf(v, 0) {
			return v
		}
		if v, err := strconv.ParseInt(n.Value, 0, 64); err == nil {
			return float64(v)
		}
	}
	return n.Value
}

// beyondSchema are the broken cases whose fault no schema can see.
var beyondSchema = map[string]string{
	"11-shortest-times-over-period.yaml": "two numbers behind units",
	"12-highest-below-nominal.yaml":      "two numbers behind units",
	"13-link-removed-before-fitted.yaml": "two times",
	"15-tag.yaml":                        "a tag, which is gone when a schema is asked",
	"20-no-such-part.yaml":               "names of parts and positions",
	"21-part-in-other-position.yaml":     "names of parts and positions",
	"22-part-and-position-apart.yaml":    "names of parts and positions",
	"23-assumed-not-stated.yaml":         "names of parts and positions",
	"24-present-and-absent.yaml":         "one key of what another says is not there",
	"25-closed-before-opened.yaml":       "two times",
	"38-loop-shares-over-whole.yaml":     "two numbers behind units",
	"39-leg-over-loop.yaml":              "two numbers behind units",
	"40-running-over-stall.yaml":         "two numbers behind units",
	"41-ratings-of-one-position.yaml":    "two numbers behind units",
	"42-bus-without-capacitors.yaml":     "one key of what another says is not there",
	"43-nothing-to-bridge.yaml":          "one key of what another says is not there",
	"44-brake-not-fitted.yaml":           "one key of what another says is not there",
	"45-brake-fitted-not-tested.yaml":    "one key of what another says is not there",
	"46-rebuild-over-board.yaml":         "one key of what another says is not there",
	"47-no-gate.yaml":                    "one key of what another says is not there",
	"48-nothing-that-turns.yaml":         "one key of what another says is not there",
	"49-diodes-let-nothing-back.yaml":    "one key of what another says is not there",
	"50-dead-time-over-period.yaml":      "two numbers behind units",
	"51-older-than-the-case.yaml":        "two times",
	"52-setting-with-two-values.yaml":    "two entries",
	"54-probe-and-clip.yaml":             "two keys of one entry",
	"55-followed-up-too-soon.yaml":       "two times",
	"56-held-too-short.yaml":             "two times",
	"57-held-and-failed.yaml":            "two entries",
}

// editorReads gives a file as an editor hands it to a schema; false when it is no YAML, or more than one document.
func editorReads(raw []byte) (any, bool) {
	d := yaml.NewDecoder(bytes.NewReader(raw))
	var doc, second yaml.Node
	if err := d.Decode(&doc); err != nil && len(raw) > 0 && err.Error() != "EOF" {
		return nil, false
	}
	if d.Decode(&second) == nil {
		return nil, false
	}
	return generic(&doc)
}

// casePlaces are where case files stand in the tree.
var casePlaces = []string{"../testdata/cases/*.yaml", "../testdata/full-case.yaml", "../testdata/older-cases/*.yaml", "testdata/*.yaml",
	"../testdata/broken-cases/*.yaml", "../reports/testdata/*.yaml", "../cmd/drivemend/demo/*.yaml", "../diagnose/safety/testdata/*.yaml"}

// TestSchemaAgrees proves for every case file at hand, also for those inside the scripts, that loader and schema agree,
// and that the list of faults that no schema sees is no longer than it must be.
func TestSchemaAgrees(t *testing.T) {
	s := compiledSchema(t)
	listed := map[string]bool{}
	for _, pattern := range casePlaces {
		for _, path := range filesOf(t, pattern) {
			raw, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			if name := filepath.Base(path); name != "labels.yaml" {
				agree(t, s, path, name, raw, listed)
			}
		}
	}
	scripted := 0
	for _, path := range filesOf(t, "../testdata/scripts/*.txtar") {
		archive, err := txtar.ParseFile(path)
		if err != nil {
			t.Fatal(err)
		}
		for _, f := range archive.Files {
			if isCase.Match(f.Data) {
				scripted++
				name := filepath.Base(path) + "/" + f.Name
				agree(t, s, name, name, f.Data, listed)
			}
		}
	}
	if scripted < 20 {
		t.Errorf("only %d cases stand in the scripts", scripted)
	}
	for name := range beyondSchema {
		if !listed[name] {
			t.Errorf("%s is listed, but not there", name)
		}
	}
}

// isCase finds the cases among the files of a script: they begin a line with the version of the form.
var isCase = regexp.MustCompile(`(?m)^drivemend:`)

// filesOf gives the files of a pattern; none is a fault of the test.
func filesOf(t *testing.T, pattern string) []string {
	t.Helper()
	paths, err := filepath.Glob(pattern)
	if err != nil || len(paths) == 0 {
		t.Fatalf("no files %s", pattern)
	}
	return paths
}

// agree compares loader and schema on one file.
func agree(t *testing.T, s *jsonschema.Schema, path, name string, raw []byte, listed map[string]bool) {
	t.Helper()
	_, loads := Parse(name, raw)
	var refused error
	v, ok := editorReads(raw)
	if ok {
		refused = s.Validate(v)
	}
	why, beyond := beyondSchema[name]
	listed[name] = true
	switch {
	case loads == nil && (!ok || refused != nil):
		t.Errorf("%s loads, but the schema refuses it: %v", path, refused)
	case loads != nil && ok && refused == nil && !beyond:
		t.Errorf("%s is refused by the loader, but not by the schema, and is not listed", path)
	case beyond && (!ok || refused != nil):
		t.Errorf("%s is listed as beyond a schema (%s), but is refused: %v", path, why, refused)
	}
}

// TestSchemaGolden compares the schema and the page of keys with the files that stand for them.
func TestSchemaGolden(t *testing.T) {
	for path, got := range map[string][]byte{"../testdata/golden/case-schema.json": Schema(), "../testdata/golden/case-keys.md": KeyPage()} {
		if *update {
			if err := os.WriteFile(path, got, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s is out of date; read the difference after -update", path)
		}
	}
}

// TestSchemaTellsEveryKey proves that each key has a title and a description, and each unit a definition.
func TestSchemaTellsEveryKey(t *testing.T) {
	page := string(KeyPage())
	for _, k := range Keys() {
		if unitNames[k.Unit] == "" && k.Unit != "" {
			t.Errorf("%s has a unit without a definition", k.Path)
		}
		if d := describeKey(k); !strings.HasPrefix(d, k.Help) || !strings.Contains(d, "Write: ") {
			t.Errorf("%s is described as %q", k.Path, d)
		}
		if !strings.Contains(page, "| `"+k.Path+"` |") {
			t.Errorf("%s is not on the page", k.Path)
		}
	}
	if !bytes.Equal(Schema(), Schema()) || strings.Contains(string(Schema()), "http://") {
		t.Error("the schema changes, or names an address")
	}
}
