package main

import (
	"fmt"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// entry is what the flags of enter say beside the answer.
type entry struct {
	part, position, polarity, seen, instrument, note, twin string
	motor, surface, reach, accuracy                        string
	lifted, inCircuit, assumed                             bool
}

func (a *app) enterCommand() *cobra.Command {
	var e entry
	c := &cobra.Command{
		Use:   "enter CASE TEST RESULT",
		Short: "enter one answer, reading or board value",
		Long: "Enters what a test showed: a result by name, or a reading (a number without a unit gets the unit of the test); skipped and later are answers too. " +
			"A changed answer is entered again: the last one for the same test, place, polarity and state counts, the one before stays in the file.\n" +
			"With a key of the case instead of a test, its value is set: enter pump board.bus.nominal 310V. A time may be given as now: enter pump rebuild.done now.",
		Example: "drivemend enter pump power-terminals-resistance 0.4 --part Q2 --lifted",
		Args:    takes(3, 3),
		RunE: func(c *cobra.Command, args []string) error {
			return a.enter(args[0], args[1], args[2], e, c.Flags())
		},
	}
	f := c.Flags()
	f.StringVar(&e.part, "part", "", "the `PART` it was taken at, Q2")
	f.StringVar(&e.position, "position", "", "the `POSITION` it was taken at, low: its whole bank")
	f.BoolVar(&e.lifted, "lifted", false, "the part had a lead lifted")
	f.BoolVar(&e.inCircuit, "in-circuit", false, "the part was in the circuit")
	f.StringVar(&e.polarity, "polarity", "", "`forward` (red on collector, drain or anode) or reverse")
	f.StringVar(&e.motor, "motor", "", "`on` or off: the motor was connected during the reading, or not")
	f.StringVar(&e.surface, "surface", "", "what a camera looked at: `matt-dot`, tape, moulded, painted or bare-metal")
	f.StringVar(&e.twin, "twin", "", "the same `READING` on a part that should be alike")
	f.StringVar(&e.seen, "seen", "", "`on-arrival` (told by others), at-bench (default) or by-cure")
	f.StringVar(&e.instrument, "instrument", "", "which `INSTRUMENT`")
	f.StringVar(&e.accuracy, "accuracy", "", "accuracy of the instrument, '`1 %`' (2 % is taken without it)")
	f.StringVar(&e.reach, "range", "", "top of the instrument's range, '`20 MΩ`': what OL lies above")
	f.StringVar(&e.note, "note", "", "anything worth keeping, in `WORDS`")
	f.BoolVar(&e.assumed, "assumed", false, "a board value that is not known to be true of this board")
	return a.timed(c)
}

func (a *app) enter(path, name, text string, e entry, flags *pflag.FlagSet) error {
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
	if t := base.Test(name); t != nil {
		if e.assumed {
			return wrongCommand("--assumed goes with a board value; "+t.ID+" is a test", "say in --note what makes the answer doubtful, or --seen on-arrival if others told it")
		}
		return a.enterAnswer(f, base, t, text, e, at)
	}
	if key, ok := keyOf(name); ok && !isGroup(key) {
		if other := besideKey(flags); other != "" {
			return wrongCommand("--"+other+" goes with a test; "+key+" is a key of the case", "leave it out; with a key only --assumed says more")
		}
		return a.enterKey(f, key, text, e, at)
	}
	return noTestOrKey(base, name)
}

// isGroup tells whether a key holds other keys and no value of its own.
func isGroup(key string) bool {
	k, _ := measure.LookupKey(key)
	return holdsKeys(k)
}

// besideKey names a flag that says nothing of a key, "" when there is none.
func besideKey(flags *pflag.FlagSet) string {
	found := ""
	flags.Visit(func(f *pflag.Flag) {
		switch f.Name {
		case "assumed", "at", "rules":
		default:
			found = f.Name
		}
	})
	return found
}

// noTestOrKey says that a name is neither a test nor a key, and which ones may be meant.
func noTestOrKey(base *knowledge.Base, name string) error {
	var hints []string
	near := nearestOf(name, base.IDs(knowledge.KindTest))
	key, group := keyOf(name)
	switch {
	case group:
		hints = append(hints, key+" is a group of keys: drivemend keys "+name)
	case near == "":
		near = measure.NearestKey(name)
	}
	if near != "" {
		hints = append(hints, "the nearest is "+near)
	}
	for _, t := range testsWith(base, name) {
		if t.ID != near {
			hints = append(hints, "perhaps "+t.ID+": "+t.Title)
		}
	}
	return wrongInput("there is no test or key "+name, append(hints, "see drivemend rules list tests, drivemend keys")...)
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

func (a *app) enterKey(f *measure.File, key, text string, e entry, at time.Time) error {
	text, err := keyText(f.Case.Board, key, text)
	if err != nil {
		return err
	}
	if k, ok := measure.LookupKey(key); ok && k.Kind == measure.KindTime {
		if text, err = a.past(key, text, at); err != nil {
			return err
		}
	}
	was, before := statedText(f.Case, key), f.Case
	if err := f.Set(key, text); err != nil {
		return err
	}
	mark := f.Settle // what is entered without --assumed is known to be true of this board
	if e.assumed {
		mark = f.Assume
	}
	if err := mark(key); err != nil {
		return err
	}
	if err := f.Save(); err != nil {
		return err
	}
	if was != "" && was != text {
		text += " (was " + was + ")"
	}
	if e.assumed {
		text += ", assumed"
	}
	fmt.Fprintf(a.out, "%s: %s\n", key, ask.Clean(text))
	for _, line := range nowAfter(before, f.Case) {
		a.wrapped(line, "", "  ")
	}
	return nil
}

// past is a time that is set under a key: what has been done lies in the past, and now is the time of the entry.
func (a *app) past(key, text string, at time.Time) (string, error) {
	if strings.EqualFold(strings.TrimSpace(text), "now") {
		return at.Format(time.RFC3339), nil
	}
	t, err := time.Parse(time.RFC3339, strings.TrimSpace(text))
	if err == nil && t.After(a.env.now()) {
		return "", wrongInput(key+" "+text+" lies in the future: the clock of this computer says "+a.env.now().Format(time.RFC3339),
			"give the time at which it was done, or now; nothing was changed")
	}
	return text, nil // what is no time is said by the loader
}

// statedText is a board value as it stands in the case, "" where none is stated or it is of another kind.
func statedText(c *measure.Case, key string) string {
	b, path := c.Board, strings.TrimPrefix(key, "board.")
	if rest, ok := strings.CutPrefix(key, "rebuild."); ok {
		if c.Rebuild == nil {
			return ""
		}
		if rest == "done" && !c.Rebuild.Done.IsZero() {
			return c.Rebuild.Done.Format(time.RFC3339)
		}
		if !slices.Contains(c.Rebuild.Keys, rest) {
			return "" // it is the board's own
		}
		b, path = c.Rebuild.Board, rest
	} else if path == key {
		return ""
	}
	if q, ok := b.Quantity(path); ok {
		if q.Text != "" {
			return q.Text
		}
		return q.String()
	}
	if names, ok := b.Names(path); ok {
		return strings.Join(names, ", ")
	}
	word, _ := b.Word(path)
	return word
}

func (a *app) enterAnswer(f *measure.File, base *knowledge.Base, t *knowledge.Test, text string, e entry, at time.Time) error {
	if t.Computed != "" {
		return wrongInput(t.ID+" is worked out from the board values", "enter those: see drivemend margin "+f.Path)
	}
	o, err := answerTo(t, text)
	if err != nil {
		return err
	}
	if err := place(boardsOf(f.Case), t, &o, e.part, e.position); err != nil {
		return err
	}
	if err := e.beside(t, &o); err != nil {
		return err
	}
	o.At = at
	before := f.Case
	if err := f.Observe(o); err != nil {
		return err
	}
	if err := f.Save(); err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s: %s\nat %s\n", t.ID, echo(t, f.Case.Board, o), at.Format(time.RFC3339))
	for _, line := range replaces(before, f.Case) {
		fmt.Fprintln(a.out, line)
	}
	if bank := f.Case.Board.PositionOf(o.Part); o.Reading != nil && bank != "" && t.Instrument == "meter" && o.State != "lifted" && inBank(f.Case.Board, bank) > 1 {
		fmt.Fprintf(a.out, "in circuit it stands for the whole bank %s; was a lead lifted, enter it again with --lifted\n", bank)
	}
	return a.counts(base, f.Case)
}

// counts says what stands against the answer that was entered last.
func (a *app) counts(base *knowledge.Base, c *measure.Case) error {
	k, err := chainOf(base, c)
	if err != nil {
		return err
	}
	r, err := k.rank("")
	if err != nil {
		return err
	}
	for _, line := range append(k.served(), k.afterwards(r)...) {
		indent := line[:len(line)-len(strings.TrimLeft(line, " "))]
		a.wrapped(line, indent, indent+"  ")
	}
	return nil
}

// beside adds to an observation what the flags say of how it was taken.
func (e entry) beside(t *knowledge.Test, o *measure.Observation) error {
	for _, w := range []struct {
		key, text, means string
		to               *string
	}{
		{"polarity", e.polarity, "forward is red on collector, drain or anode; reverse is red on emitter, source or cathode", &o.Polarity},
		{"motor", e.motor, "on: it was connected during the reading", &o.Motor},
		{"surface", e.surface, "bare metal reads too cold, and so may what is not stated", &o.Surface},
		{"seen", e.seen, "on-arrival is what others told or saw", &o.Seen},
	} {
		word, err := observed(w.key, w.text, w.means)
		if err != nil {
			return err
		}
		*w.to = word
	}
	o.Instrument, o.Note = e.instrument, e.note
	switch {
	case e.lifted && e.inCircuit:
		return wrongCommand("--lifted and --in-circuit cannot both be so", "keep the one that was so")
	case e.lifted:
		o.State = "lifted"
	case e.inCircuit:
		o.State = "in-circuit"
	}
	return e.ofReading(t, o)
}

// observed is a word of an observation, in small letters.
func observed(key, text, means string) (string, error) {
	word := strings.ToLower(strings.TrimSpace(text))
	k, _ := measure.LookupKey("observations[]." + key)
	for _, w := range k.Words {
		if word == w {
			return word, nil
		}
	}
	if word == "" {
		return "", nil
	}
	return "", wrongCommand(fmt.Sprintf("--%s cannot be %q", key, text), append(nearHints(word, k.Words, "it is "+orWords(k.Words)), means)...)
}

// ofReading adds what only a reading can have: its twin, and the accuracy and range of what it was read with.
func (e entry) ofReading(t *knowledge.Test, o *measure.Observation) error {
	for _, f := range []struct{ flag, text string }{{"twin", e.twin}, {"accuracy", e.accuracy}, {"range", e.reach}} {
		if f.text != "" && o.Reading == nil {
			return wrongCommand(fmt.Sprintf("--%s goes with a reading; %s is none", f.flag, o.Result+o.Answer), "leave it out, or enter what the instrument showed")
		}
	}
	if e.twin != "" {
		r, err := readingOf(t, e.twin)
		if err != nil {
			return within("--twin", err)
		}
		o.Twin = &r
	}
	if e.accuracy != "" {
		q, err := quantity.Parse(e.accuracy, quantity.Ratio)
		if err != nil || q.Value <= 0 || q.Value > 1 {
			return wrongCommand(fmt.Sprintf("--accuracy %q is none", e.accuracy), "give it in per cent of the reading: '1 %'")
		}
		o.Accuracy = q.Value
	}
	if e.reach != "" {
		if err := ambiguousRatio(t.Unit, strings.TrimSpace(e.reach)); err != nil {
			return within("--range", err)
		}
		q, err := quantity.Parse(withTestUnit(t.Unit, e.reach), t.Unit)
		if err != nil {
			return wrongInput("--range: " + err.Error())
		}
		o.Range = q.Value
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
