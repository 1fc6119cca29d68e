package main

import (
	"io"
	"strings"

	"github.com/spf13/cobra"

	"drivemend/measure"
	"drivemend/reports"
)

func (a *app) keysCommand() *cobra.Command {
	return a.figures(&cobra.Command{
		Use:     "keys [NAME]",
		Short:   "what a key of a case file means",
		Long:    "Says what a key of a case file means: its unit, its physical range, its typical value, who uses it. NAME is a key or a group; without it all are listed.",
		Example: "drivemend keys switch.fall_time",
		Args:    takes(0, 1),
		RunE:    func(_ *cobra.Command, args []string) error { return a.keys(args) },
	})
}

func (a *app) keys(args []string) error {
	found := measure.Keys()
	if len(args) == 1 {
		if found = keysNamed(args[0]); len(found) == 0 {
			near := measure.NearestKey(args[0])
			return noSuch("key", args[0], near, "see drivemend keys")
		}
	}
	return a.show(func(w io.Writer) error { return reports.KeysJSON(w, found) },
		func(w io.Writer) error { return reports.Keys(w, found, a.style()) })
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
		if strings.HasSuffix(k.Path, "."+name) {
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
