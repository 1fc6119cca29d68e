package main

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/measure"
)

func (a *app) recordPhotoCommand() *cobra.Command {
	var p measure.Photograph
	c := &cobra.Command{
		Use:   "photo CASE FILE",
		Short: "a picture, by path, length and SHA-256 sum",
		Long: "Records a picture: where it lies as seen from the case file, its length and its SHA-256 sum. The file stays where it is, and is never changed. " +
			"The time it was taken is kept only where --at states it.",
		Example: "drivemend record photo pump pictures/arrival.jpg --shows 'low bank as found' --part Q2",
		Args:    takes(2, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			return a.recordFile(args[0], args[1], "picture", p.Part, func(f *measure.File, one recorded) error {
				p.Path, p.Bytes, p.SHA256, p.At = one.name, one.bytes, one.sum, one.at
				return f.AddPhotograph(p)
			})
		},
	}
	c.Flags().StringVar(&p.Shows, "shows", "", "what is on it, in `WORDS`")
	c.Flags().StringVar(&p.Part, "part", "", "the `PART` it is of")
	return a.timed(c)
}

func (a *app) recordCaptureCommand() *cobra.Command {
	var one measure.Capture
	c := &cobra.Command{
		Use:     "capture CASE FILE",
		Short:   "an instrument file, by path, length and SHA-256 sum",
		Long:    "Records a file of a scope or a camera without taking figures from it. The file stays where it is, and is never changed. The time it was taken is kept only where --at states it.",
		Example: "drivemend record capture pump low-turn-off.csv --kind scope --position low --edge opening",
		Args:    takes(2, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			return a.recordFile(args[0], args[1], "capture", "", func(f *measure.File, r recorded) error {
				if err := knownPosition(f.Case.Board, one.Position); err != nil {
					return err
				}
				one.Name, one.Bytes, one.SHA256, one.At = r.name, r.bytes, r.sum, r.at
				return f.AddCapture(one)
			})
		},
	}
	c.Flags().StringVar(&one.Kind, "kind", "", "`scope` or thermal")
	c.Flags().StringVar(&one.Position, "position", "", "the `POSITION` it shows")
	c.Flags().StringVar(&one.Edge, "edge", "", "`opening` or closing")
	c.Flags().StringVar(&one.Note, "note", "", "anything worth keeping, in `WORDS`")
	return a.timed(c)
}

// knownPosition refuses a position that this board does not have.
func knownPosition(b measure.Board, position string) error {
	var names []string
	for _, p := range b.Positions() {
		names = append(names, p.Name)
	}
	if position == "" || slices.Contains(names, position) {
		return nil
	}
	return noSuch("position", position, nearestOf(position, names), "this board has "+strings.Join(names, ", "))
}

// recorded is a file as the record keeps it.
type recorded struct {
	name  string // as seen from the case file
	bytes int64
	sum   string // SHA-256, hexadecimal
	at    time.Time
}

// recordFile keeps where a file lies, how long it is and its sum. The time it was taken is known only when it is stated.
func (a *app) recordFile(path, file, what, part string, enter func(*measure.File, recorded) error) error {
	var one recorded
	f, _, err := a.record(path, a.at != "", func(f *measure.File, at time.Time) error {
		var err error
		if one, err = summed(file); err != nil {
			return err
		}
		one.name, one.at = fromCase(f.Path, file), at
		return enter(f, one)
	})
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "recorded: %s %s, %d bytes, SHA-256 %s\n", what, ask.Clean(one.name), one.bytes, one.sum)
	if one.at.IsZero() {
		fmt.Fprintln(a.out, "when it was taken is not stated; --at TIME states it")
	} else {
		fmt.Fprintln(a.out, "taken at "+one.at.Format(time.RFC3339))
	}
	if part != "" && !hasPart(f.Case, part) {
		fmt.Fprintf(a.out, "note: %s is no switch of this case; kept as it was typed, for it may be any part\n", ask.Clean(part))
	}
	if n := sameSum(f.Case, one.sum); n > 1 {
		fmt.Fprintf(a.out, "note: these bytes now stand in the case %d times\n", n)
	}
	if what == "picture" {
		a.untilAll(f, measure.StepPhotographed)
	}
	return nil
}

// hasPart tells whether a part is one of the switches of a case, as found or as rebuilt.
func hasPart(c *measure.Case, part string) bool {
	_, parts := placesOf(boardsOf(c))
	return slices.Contains(parts, part)
}

// summed reads a file's length and sum.
func summed(file string) (recorded, error) {
	in, err := os.Open(file)
	if errors.Is(err, fs.ErrNotExist) {
		return recorded{}, wrongInput(file+": there is no such file", "name it as seen from the folder you are in; nothing was changed")
	}
	if err != nil {
		return recorded{}, wrongInput(file+": cannot be read: "+bareReason(err), "nothing was changed")
	}
	defer in.Close()
	if info, err := in.Stat(); err == nil && !info.Mode().IsRegular() {
		return recorded{}, wrongInput(file+": this is no file that can be recorded", "name one picture or capture; nothing was changed")
	}
	sum := sha256.New()
	n, err := io.Copy(sum, in)
	if err != nil {
		return recorded{}, wrongInput(file+": cannot be read: "+bareReason(err), "nothing was changed")
	}
	return recorded{bytes: n, sum: hex.EncodeToString(sum.Sum(nil))}, nil
}

// bareReason is an error of the file system without the path, which the message names already.
func bareReason(err error) string {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err.Error()
	}
	return err.Error()
}

// fromCase gives a path as seen from the folder of the case file, with forward slashes on every system, so that case and
// pictures can be moved together. Where there is no way from one to the other, the path stays as it was typed.
func fromCase(casePath, file string) string {
	folder, err := filepath.Abs(folderOf(casePath))
	if err == nil {
		var whole string
		if whole, err = filepath.Abs(file); err == nil {
			if rel, err := filepath.Rel(folder, whole); err == nil {
				return filepath.ToSlash(rel)
			}
		}
	}
	return filepath.ToSlash(file)
}

// sameSum counts the pictures and captures of a case with a sum.
func sameSum(c *measure.Case, sum string) int {
	n := 0
	for _, p := range c.Photographs {
		if p.SHA256 == sum {
			n++
		}
	}
	for _, one := range c.Captures {
		if one.SHA256 == sum {
			n++
		}
	}
	return n
}
