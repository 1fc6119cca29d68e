package main

import (
	"fmt"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// entry is what the flags of enter say beside the answer.
type entry struct {
	part, position, polarity, seen, instrument, note, twin string
	lifted, assumed                                        bool
}

func (a *app) enterCommand() *cobra.Command {
	var e entry
	c := &cobra.Command{
		Use:   "enter CASE TEST RESULT",
		Short: "enter one answer, reading or board value",
		Long: "Enters what a test showed: a result by name, or a reading (a number without a unit gets the unit of the test); skipped and later are answers too. " +
			"With a key of the case instead of a test, its value is set: enter pump board.bus.nominal 310V. What was entered before stays in the file.",
		Example: "drivemend enter pump power-terminals-resistance 0.4 --part Q2 --lifted",
		Args:    takes(3, 3),
		RunE:    func(_ *cobra.Command, args []string) error { return a.enter(args[0], args[1], args[2], e) },
	}
	f := c.Flags()
	f.StringVar(&e.part, "part", "", "the `PART` it was taken at, Q2")
	f.StringVar(&e.position, "position", "", "the `POSITION` it was taken at, low: its whole bank")
	f.BoolVar(&e.lifted, "lifted", false, "the part had a lead lifted")
	f.StringVar(&e.polarity, "polarity", "", "`forward` (red on collector or drain) or reverse")
	f.StringVar(&e.twin, "twin", "", "the same `READING` on a part that should be alike")
	f.StringVar(&e.seen, "seen", "", "`on-arrival` (told by others), at-bench (default) or by-cure")
	f.StringVar(&e.instrument, "instrument", "", "which `INSTRUMENT`")
	f.StringVar(&e.note, "note", "", "anything worth keeping, in `WORDS`")
	f.BoolVar(&e.assumed, "assumed", false, "a board value that is not known to be true of this board")
	return a.timed(c)
}

func (a *app) enter(path, name, text string, e entry) error {
	at, err := a.stamp()
	if err != nil {
		return err
	}
	f, err := a.loadToChange(path)
	if err != nil {
		return err
	}
	if err := notBefore(f.Case, at); err != nil {
		return err
	}
	base, err := a.base()
	if err != nil {
		return err
	}
	t := base.Test(name)
	if t == nil {
		if key, ok := keyOf(name); ok {
			return a.enterKey(f, key, text, e)
		}
		near := base.Nearest(knowledge.KindTest, name)
		if near == "" {
			near = measure.NearestKey(name)
		}
		return noSuch("test or key", name, near, "see drivemend rules list tests, drivemend keys")
	}
	return a.enterAnswer(f, base, t, text, e, at)
}

// keyOf gives the whole path of a key that is named with or without "board." in front.
func keyOf(name string) (string, bool) {
	if _, ok := measure.LookupKey(name); !ok {
		return "", false
	}
	for _, k := range measure.Keys() {
		if k.Path == name {
			return name, true
		}
	}
	if _, ok := measure.LookupKey("board." + name); ok && !strings.HasPrefix(name, "board.") {
		return "board." + name, true
	}
	return name, true
}

func (a *app) enterKey(f *measure.File, key, text string, e entry) error {
	text, err := keyText(f.Case.Board, key, text)
	if err != nil {
		return err
	}
	if err := f.Set(key, text); err != nil {
		return err
	}
	if e.assumed {
		if err := f.Assume(key); err != nil {
			return err
		}
	}
	if err := f.Save(); err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s: %s\n", key, text)
	return nil
}

func (a *app) enterAnswer(f *measure.File, base *knowledge.Base, t *knowledge.Test, text string, e entry, at time.Time) error {
	if t.Computed != "" {
		return wrongInput(t.ID+" is worked out from the board values", "enter those: see drivemend margin "+f.Path)
	}
	o, err := answerTo(t, text)
	if err != nil {
		return err
	}
	if err := place(f.Case.Board, t, &o, e.part, e.position); err != nil {
		return err
	}
	o.At, o.Seen, o.Polarity, o.Instrument, o.Note = at, e.seen, e.polarity, e.instrument, e.note
	if e.lifted {
		o.State = "lifted"
	}
	if e.twin != "" {
		r, err := quantity.ParseReading(e.twin, t.Unit)
		if err != nil {
			return wrongInput("--twin: " + err.Error())
		}
		o.Twin = &r
	}
	if err := f.Observe(o); err != nil {
		return err
	}
	if err := f.Save(); err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s: %s\nat %s\n", t.ID, echo(t, f.Case.Board, o), at.Format(time.RFC3339))
	if bank := f.Case.Board.PositionOf(o.Part); o.Reading != nil && bank != "" && t.Instrument == "meter" && o.State != "lifted" && inBank(f.Case.Board, bank) > 1 {
		fmt.Fprintf(a.out, "in circuit it stands for the whole bank %s; was a lead lifted, enter it again with --lifted\n", bank)
	}
	k, err := chainOf(base, f.Case)
	if err != nil {
		return err
	}
	r, err := k.rank("")
	if err != nil {
		return err
	}
	for _, line := range k.afterwards(r) {
		fmt.Fprintln(a.out, line)
	}
	return nil
}

// inBank counts the parts of a position.
func inBank(b measure.Board, position string) int {
	for _, p := range b.Positions() {
		if p.Name == position {
			return len(p.Parts)
		}
	}
	return 0
}
