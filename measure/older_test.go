package measure

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"drivemend/measure/quantity"
)

// TestOlderCases proves that a case file of an earlier program loads as it did then. The .read file beside each was
// written by the program of that time; it is never rewritten, so there is no flag for it.
func TestOlderCases(t *testing.T) {
	paths, err := filepath.Glob("../testdata/older-cases/*.yaml")
	if err != nil || len(paths) == 0 {
		t.Fatalf("%d older cases, error %v", len(paths), err)
	}
	for _, path := range paths {
		t.Run(filepath.Base(path), func(t *testing.T) {
			f, err := Load(path)
			if err != nil {
				t.Fatal(err)
			}
			want, err := os.ReadFile(strings.TrimSuffix(path, ".yaml") + ".read")
			if err != nil {
				t.Fatal(err)
			}
			if got := older(f.Case); got != string(want) {
				t.Errorf("reads otherwise than before, now\n%s", got)
			}
		})
	}
}

// older writes out what the first version of the case record held, a line for each fact.
func older(c *Case) string {
	var w strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&w, format+"\n", args...) }
	line("case %q opened %s owner %q technician %q serial %q firmware %q story %q", c.ID, olderTime(c.Opened), c.Owner, c.Technician, c.Serial, c.Firmware, c.Story)
	line("source %q", []string{c.Source.Title, c.Source.Site, c.Source.Year, c.Source.Address, c.Source.Read})
	olderBoard(line, "board", c.Board)
	olderSafety(line, c.Safety)
	olderObservations(line, c)
	olderInstruments(line, c)
	if r := c.Rebuild; r != nil {
		line("rebuild line %d done %s keys %q", r.Line, olderTime(r.Done), r.Keys)
		olderBoard(line, "rebuilt", r.Board)
	}
	if o := c.Outcome; o != nil {
		line("outcome %q %q %q %q %q %s", o.Faults, o.Parts, o.Causes, o.Stress, o.ConfirmedBy, olderTime(o.Closed))
	}
	return w.String()
}

func olderTime(t time.Time) string {
	if t.IsZero() {
		return "-"
	}
	return t.Format(time.RFC3339Nano)
}

func olderQuantity(q quantity.Quantity) string {
	return fmt.Sprintf("%.12g [%.12g %.12g] %s", q.Value, q.Low, q.High, q.Unit)
}

func olderFigures(figures map[string]quantity.Quantity) string {
	var parts []string
	for _, k := range Keys() {
		name := k.Path[strings.LastIndex(k.Path, ".")+1:]
		if q, ok := figures[name]; ok && (strings.HasPrefix(k.Path, "captures[]") || strings.HasPrefix(k.Path, "bring_up[]")) {
			parts = append(parts, name+" "+olderQuantity(q))
		}
	}
	return strings.Join(parts, "; ")
}

func olderReading(r *quantity.Reading) string {
	if r == nil {
		return "-"
	}
	return fmt.Sprintf("%v %q %.12g [%.12g %.12g] %s", r.Kind, r.Text, r.Value, r.Low, r.High, r.Unit)
}

func olderBoard(line func(string, ...any), name string, b Board) {
	for _, path := range b.Paths() {
		q, isNumber := b.Quantity(path)
		word, isWord := b.Word(path)
		names, isList := b.Names(path)
		line("%s %s %v %s %v %q %v %q assumed %v unknown %v", name, path, isNumber, olderQuantity(q), isWord, word, isList, names, b.Assumed(path), b.Unknown(path))
	}
	for _, p := range b.Positions() {
		line("%s position %q %q %v %q", name, p.Name, p.Leg, p.Upper, p.Parts)
	}
}

func olderSafety(line func(string, ...any), s Safety) {
	for _, i := range s.Isolation {
		line("isolation line %d %v %q %q %s", i.Line, i.Locked, i.Motor, i.OtherSources, olderTime(i.At))
	}
	for _, d := range s.DeadChecks {
		line("dead check line %d %q %s %s %v %s", d.Line, d.Point, olderQuantity(d.DC), olderQuantity(d.AC), d.MeterProved, olderTime(d.At))
	}
	for _, l := range s.Links {
		line("link line %d %s %s", l.Line, olderTime(l.Fitted), olderTime(l.Removed))
	}
	for _, e := range s.Energised {
		line("energised line %d %q %s", e.Line, e.What, olderTime(e.At))
	}
}

func olderObservations(line func(string, ...any), c *Case) {
	for i, o := range c.Observations {
		line("observation line %d %q %q %q %s result %q answer %q", o.Line, o.Test, o.Part, o.Position, olderTime(o.At), o.Result, o.Answer)
		line("  reading %s twin %s", olderReading(o.Reading), olderReading(o.Twin))
		line("  %q %q %q %q %q %.12g %.12g %q superseded %v after %v", o.Seen, o.Polarity, o.State, o.Motor, o.Instrument, o.Accuracy, o.Range, o.Note, c.Superseded(i), c.After(o))
	}
}

func olderInstruments(line func(string, ...any), c *Case) {
	for _, b := range c.Locate {
		line("locate line %d %q %s %s %q", b.Line, b.Position, olderQuantity(b.Current), olderQuantity(b.Voltage), b.Feed)
		for _, r := range b.Rises {
			line("  rise %q %s %q", r.Part, olderQuantity(r.Rise), r.Surface)
		}
		for _, d := range b.Drops {
			line("  drop %q %q %s", d.From, d.To, olderQuantity(d.Drop))
		}
	}
	for _, k := range c.Captures {
		line("capture line %d %q %q %q %q %q %q %d %s %s", k.Line, k.Name, k.SHA256, k.Kind, k.Position, k.Edge, k.Note, k.Bytes, olderTime(k.At), olderFigures(k.Figures))
	}
	for _, s := range c.BringUp {
		line("stage line %d %q %q %s %s", s.Line, s.Stage, s.Note, olderTime(s.At), olderFigures(s.Figures))
	}
}
