package main

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"drivemend/measure"
	"drivemend/measure/quantity"
	"drivemend/reports"
)

func (a *app) keysCommand() *cobra.Command {
	var schema, markdown bool
	c := &cobra.Command{
		Use:   "keys [NAME]",
		Short: "what a key of a case file means",
		Long: "Says what a key of a case file means: its unit, its physical range, its words, its typical value with the source, who uses it, and a line to copy. " +
			"NAME is a key, a group (bus, safety.before) or the last word of a key; without it all are listed. " +
			"--markdown prints the page of all keys, --schema the JSON Schema that an editor checks a case file with.",
		Example: "drivemend keys switch.fall_time",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			if schema || markdown {
				return a.allKeys(schema, markdown, args)
			}
			return a.keys(args)
		},
	}
	c.Flags().BoolVar(&schema, "schema", false, "print the JSON Schema of a case file")
	c.Flags().BoolVar(&markdown, "markdown", false, "print the page of all keys as Markdown")
	return a.figures(c)
}

// allKeys prints the whole table in a form that is made for a file.
func (a *app) allKeys(schema, markdown bool, args []string) error {
	if schema && markdown || len(args) > 0 || a.asJSON {
		return wrongCommand("--schema and --markdown print the whole table, one form at a time", "drivemend keys --schema, drivemend keys --markdown, or drivemend keys NAME")
	}
	page := measure.KeyPage()
	if schema {
		page = measure.Schema()
	}
	_, err := a.out.Write(append(bytes.TrimRight(page, "\n"), '\n'))
	return err
}

func (a *app) keys(args []string) error {
	found := measure.Keys()
	if len(args) == 1 {
		if found = keysNamed(args[0]); len(found) == 0 {
			if key := expectedKeys[args[0]]; key != "" {
				return wrongInput(args[0]+" is no key: it is worked out from board."+key, "drivemend keys "+key+"; to state it: drivemend enter CASE board."+key+" 10k")
			}
			near := measure.NearestKey(args[0])
			return noSuch("key", args[0], near, "see drivemend keys")
		}
	}
	return a.show(func(w io.Writer) error { return reports.KeysJSON(w, found) },
		func(w io.Writer) error { return a.writeKeys(w, found) })
}

// writeKeys prints keys as a list, and a value by itself in full, with a line that can be copied into a case file; the
// conditions of the value stand below it.
func (a *app) writeKeys(w io.Writer, found []measure.Key) error {
	if len(found) > 1 && (holdsKeys(found[0]) || !strings.HasPrefix(found[1].Path, found[0].Path+".")) {
		if k := found[0]; holdsKeys(k) {
			fmt.Fprintf(w, "%s: %s\n", k.Path, k.Help)
			found = found[1:]
		}
		return reports.Keys(w, found, a.style())
	}
	if err := reports.Keys(w, found[:1], a.style()); err != nil {
		return err
	}
	if line := exampleOf(found[0]); line != "" {
		fmt.Fprintf(w, " example  %s\n", line)
	}
	if len(found) > 1 {
		return reports.Keys(w, found[1:], a.style())
	}
	return nil
}

// holdsKeys tells whether a key is a group: it holds other keys and no value.
func holdsKeys(k measure.Key) bool {
	return k.Kind == measure.KindMap || k.Kind == measure.KindNamed || k.Kind == measure.KindList && len(keysBelow(k.Path)) > 0
}

// keysNamed gives a key, or the keys of a group: the path, "board." in front left out or not, or its last word.
func keysNamed(name string) []measure.Key {
	if k, ok := measure.LookupKey(name); ok {
		if below := keysBelow(k.Path); len(below) > 0 {
			return append([]measure.Key{k}, below...)
		}
		return []measure.Key{k}
	}
	var out []measure.Key
	for _, k := range measure.Keys() {
		if plain := strings.ReplaceAll(k.Path, "[]", ""); strings.HasSuffix("."+plain, "."+name) {
			out = append(out, k)
		}
	}
	return out
}

func keysBelow(path string) []measure.Key {
	var out []measure.Key
	for _, k := range measure.Keys() {
		if strings.HasPrefix(k.Path, path+".") || strings.HasPrefix(k.Path, path+"[]") {
			out = append(out, k)
		}
	}
	return out
}

// exampleOf is a line of a case file that states a key, with the keys beside it that must be stated; "" for a group.
func exampleOf(k measure.Key) string {
	if line, ok := wholeExamples[k.Path]; ok || holdsKeys(k) {
		return line
	}
	text, path := exampleValue(k), k.Path
	for {
		cut := strings.LastIndex(path, ".")
		name, holder := path[cut+1:], path[:max(cut, 0)]
		list := strings.HasSuffix(holder, "[]")
		text = exampleName(name) + ": " + text
		if holder == "" {
			return text
		}
		text = "{" + strings.Join(append(beside(holder, name), text), ", ") + "}"
		if list {
			holder, text = strings.TrimSuffix(holder, "[]"), "["+text+"]"
		}
		path = holder
	}
}

// wholeExamples are the lines of keys that speak of another key.
var wholeExamples = map[string]string{
	"drivemend":       "drivemend: 1",
	"board.assumed":   "board: {bus: {nominal: 310 V}, assumed: [bus.nominal]}",
	"rebuild.assumed": "rebuild: {bus: {nominal: 310 V}, assumed: [bus.nominal]}",
}

// answers are the keys of which an observation has exactly one.
var answers = []string{"result", "reading", "answer"}

// beside gives the other keys that must be stated together with one.
func beside(holder, name string) []string {
	var out []string
	for _, k := range measure.Keys() {
		own, ok := strings.CutPrefix(k.Path, holder+".")
		if ok && k.Required && own != name && !strings.Contains(own, ".") {
			out = append(out, own+": "+exampleBeside(k, name))
		}
	}
	if holder == "observations[]" && !slices.Contains(answers, name) {
		out = append(out, "reading: 0.4 Ω")
	}
	return out
}

// exampleBeside is the value of a key that stands beside another: a condition stands under a step that takes it.
func exampleBeside(k measure.Key, other string) string {
	for _, c := range conditions {
		if k.Path == "safety.before[].step" && c.key().Path == "safety.before[]."+other {
			return c.steps()[0]
		}
	}
	return exampleValue(k)
}

// exampleName stands for a name of one's own.
func exampleName(name string) string {
	if name == "*" {
		return "low"
	}
	return name
}

// exampleValue is a value that a key takes.
func exampleValue(k measure.Key) string {
	switch k.Kind {
	case measure.KindQuantity, measure.KindRatio:
		return exampleAmount(k)
	case measure.KindCount:
		return strconv.Itoa(int(math.Max(k.Min, math.Min(2, k.Max))))
	case measure.KindWord, measure.KindYesNo:
		return k.Words[0]
	case measure.KindReading:
		return "0.4 Ω"
	case measure.KindTime:
		return "2026-12-01T10:12:00+01:00"
	case measure.KindDate:
		return "2026-12-01"
	case measure.KindList:
		return "[" + exampleNameOf(k.Path) + "]"
	case measure.KindName:
		return exampleNameOf(k.Path)
	}
	return "some words"
}

// exampleNames are names by the last word of their key; a name that is not in it may be any.
var exampleNames = map[string]string{"parts": "Q1, Q2", "part": "Q1", "feed": "Q1", "from": "Q1", "to": "Q2", "position": "low", "point": "bus",
	"test": "power-terminals-resistance", "result": "shorted", "faults": "switch-shorted", "causes": "clamp-missing", "stress": "turn-off-spike", "case": "pump",
	"sha256": "59c23ba90de33bf498fc20a36cc5332afc95739eff8b71070abe17c7b77d4e83"}

func exampleNameOf(path string) string {
	if name, ok := exampleNames[path[strings.LastIndexAny(path, ".")+1:]]; ok {
		return name
	}
	return "name"
}

// exampleAmount is the typical value where there is one, else a round number from the middle of the physical range.
func exampleAmount(k measure.Key) string {
	for _, t := range k.Typical {
		text, _, _ := strings.Cut(t.Text, " (") // 20 nH (10 to 40)
		if q, err := quantity.Parse(text, k.Unit); err == nil && k.Unit != quantity.Any && q.Value >= k.Min && q.Value <= k.Max {
			return text
		}
	}
	if k.Unit == quantity.Any {
		return "20 MΩ"
	}
	low, high := math.Max(k.Min, k.Max*1e-6), k.Max
	v := math.Sqrt(low * high)
	v = math.Pow(10, math.Floor(math.Log10(v)))
	if v < k.Min {
		v *= 10
	}
	return quantity.Format(v, k.Unit)
}
