package main

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"drivemend/cmd/drivemend/internal/ask"
	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
	"drivemend/reports"
)

// condition is one condition that can be stated before a step: its flag, and how it goes into the statement. Its words,
// what it means and the steps it belongs to stand in the key table, below safety.before.
type condition struct {
	flag  string
	word  func(*measure.Before) *string              // where a word goes
	yes   func(*measure.Before) *bool                // where a yes goes
	other func(b *measure.Before, text string) error // anything else
}

// conditions are all that can be stated, in the order in which help lists them.
var conditions = []condition{
	{flag: "motor", word: func(b *measure.Before) *string { return &b.Motor }},
	{flag: "brake-resistor", word: func(b *measure.Before) *string { return &b.BrakeResistor }},
	{flag: "guard", yes: func(b *measure.Before) *bool { return &b.Guard }},
	{flag: "fuse", other: stateFuse},
	{flag: "remote-off", yes: func(b *measure.Before) *bool { return &b.RemoteOff }},
	{flag: "glasses", yes: func(b *measure.Before) *bool { return &b.Glasses }},
	{flag: "second-person", yes: func(b *measure.Before) *bool { return &b.SecondPerson }},
	{flag: "bank", word: func(b *measure.Before) *string { return &b.Bank }},
	{flag: "bus-disconnected", yes: func(b *measure.Before) *bool { return &b.BusDisconnected }},
	{flag: "shield", yes: func(b *measure.Before) *bool { return &b.Shield }},
	{flag: "electronics-disconnected", yes: func(b *measure.Before) *bool { return &b.ElectronicsDisconnected }},
	{flag: "sources-off", yes: func(b *measure.Before) *bool { return &b.SourcesOff }},
	{flag: "gates-held", yes: func(b *measure.Before) *bool { return &b.GatesHeld }},
	{flag: "limit-set", yes: func(b *measure.Before) *bool { return &b.LimitSet }},
	{flag: "attended", yes: func(b *measure.Before) *bool { return &b.Attended }},
	{flag: "probe", word: func(b *measure.Before) *string { return &b.Probe }},
	{flag: "clip-on", word: func(b *measure.Before) *string { return &b.ClipOn }},
	{flag: "supply", word: func(b *measure.Before) *string { return &b.Supply }},
	{flag: "earth-clips", other: stateClips},
	{flag: "note", other: func(b *measure.Before, text string) error { b.Note = text; return nil }},
}

// key is the row of the key table that a condition is kept under.
func (c condition) key() measure.Key {
	k, _ := measure.LookupKey("safety.before[]." + c.name())
	return k
}

func (c condition) name() string { return strings.ReplaceAll(c.flag, "-", "_") }

// steps are those that a condition is stated before.
func (c condition) steps() []string { return measure.BeforeTakes(c.name()) }

func (a *app) beforeCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "before CASE STEP",
		Short: "the conditions for a step that needs more than a dead board",
		Long: "States the conditions for one step: " + strings.Join(measure.BeforeWords(), ", ") + ". " +
			"Nothing is implied: what is not given does not hold, and the newest statement of a step replaces the one before it. " +
			"It counts for 8 hours of its own day, until the board is isolated anew or a link is fitted. Look at each condition at the board, then state it. " +
			"What is still missing for the step is said; nothing is instructed.",
		Example: "drivemend safe before pump low-bus --motor uncoupled --guard --fuse '10 A' --remote-off --glasses --second-person --bank in-use",
		Args:    takes(2, 2),
		RunE:    func(c *cobra.Command, args []string) error { return a.before(args[0], args[1], c.Flags()) },
	}
	for _, one := range conditions {
		one.register(c.Flags())
	}
	c.Flags().SortFlags = false
	return a.timed(c)
}

// register adds the flag of a condition, explained in the words of the key table.
func (c condition) register(f *pflag.FlagSet) {
	k := c.key()
	switch {
	case c.yes != nil:
		f.Bool(c.flag, false, k.Help)
	case c.word != nil:
		f.String(c.flag, "", k.Help+"; the `WORD` is "+orWords(k.Words))
	case k.Kind == measure.KindCount:
		f.String(c.flag, "", k.Help+", a `NUMBER`")
	case k.Kind == measure.KindQuantity:
		f.String(c.flag, "", k.Help+", in `AMPERES`")
	default:
		f.String(c.flag, "", k.Help+", in `WORDS`")
	}
}

// before makes one statement and says what its step still waits for.
func (a *app) before(path, step string, flags *pflag.FlagSet) error {
	typed := step
	step = strings.ToLower(step)
	if !slices.Contains(measure.BeforeWords(), step) {
		return wrongCommand(fmt.Sprintf("no conditions are stated before %q", typed), nearHints(step, measure.BeforeWords(), "the steps are "+strings.Join(measure.BeforeWords(), ", "))...)
	}
	b := measure.Before{Step: step}
	if err := stated(&b, flags); err != nil {
		return err
	}
	f, at, err := a.enterSafety(path, func(f *measure.File, at time.Time) error {
		b.At = at
		return f.StateBefore(b)
	})
	if err != nil {
		return err
	}
	a.sayAsItStood(at)
	fmt.Fprintf(a.out, "stated before %s at %s: %s\n", step, at.Format(time.RFC3339), saidOf(f.Case.Safety.Before[len(f.Case.Safety.Before)-1]))
	base, err := a.base()
	if err != nil {
		return err
	}
	return a.waitsFor(safety.Works(), step, f.Case, at, diagnose.EvidenceOf(base, f.Case))
}

// stated takes the conditions that were given on the command line into a statement. One that does not belong to the
// step is refused: it would be kept, and speak for nothing.
func stated(b *measure.Before, flags *pflag.FlagSet) error {
	for _, c := range conditions {
		f := flags.Lookup(c.flag)
		if f == nil || !f.Changed {
			continue
		}
		if !slices.Contains(c.steps(), b.Step) {
			return wrongCommand(fmt.Sprintf("--%s is no condition of %s", c.flag, b.Step),
				"it is stated before "+orWords(c.steps()), "before "+b.Step+" one states "+conditionsOf(b.Step))
		}
		if err := c.put(b, f.Value.String()); err != nil {
			return err
		}
	}
	return nil
}

// put takes one condition into a statement.
func (c condition) put(b *measure.Before, text string) error {
	switch {
	case c.yes != nil:
		*c.yes(b) = text == "true"
		return nil
	case c.other != nil:
		return c.other(b, text)
	}
	word := strings.ToLower(strings.TrimSpace(text))
	if words := c.key().Words; !slices.Contains(words, word) {
		return wrongCommand(fmt.Sprintf("--%s cannot be %q", c.flag, text), nearHints(word, words, "it is "+orWords(words))...)
	}
	*c.word(b) = word
	return nil
}

// stateFuse reads the rating of the fuse; a bare number is taken in amperes.
func stateFuse(b *measure.Before, text string) error {
	text = strings.TrimSpace(text)
	if strings.EqualFold(text, "none") {
		b.Fuse = quantity.Quantity{Text: "none"}
		return nil
	}
	if bareNumber.MatchString(text) {
		text += " A"
	}
	q, err := quantity.Parse(text, quantity.Ampere)
	if err != nil {
		return wrongInput("--fuse: "+err.Error(), "give the rating that is printed on it, '10 A', or none")
	}
	b.Fuse = q
	return nil
}

// stateClips reads how many earth clips are on the board.
func stateClips(b *measure.Before, text string) error {
	n, err := strconv.Atoi(strings.TrimSpace(text))
	if err != nil || n < 1 {
		return wrongCommand(fmt.Sprintf("--earth-clips %q is no number of clips", text), "count the earth clips on the board: 1 or more; leave it out where no earth clip is used")
	}
	b.EarthClips = n
	return nil
}

// conditionsOf lists the flags of a step.
func conditionsOf(step string) string {
	var flags []string
	for _, c := range conditions {
		if slices.Contains(c.steps(), step) && c.flag != "note" {
			flags = append(flags, "--"+c.flag)
		}
	}
	return strings.Join(flags, " ")
}

// saidOf reads a statement back.
func saidOf(b measure.Before) string {
	said := reports.Conditions(b)
	if len(said) == 0 {
		return "nothing holds"
	}
	return strings.Join(said, ", ")
}

// waitsFor says for every work that stands behind a statement whether it may be done now, and what it waits for; behind
// one for power only that without a tool. What was said for one work is not said again for the next.
func (a *app) waitsFor(works []safety.NamedWork, step string, c *measure.Case, at time.Time, e safety.Evidence) error {
	told := map[string]bool{}
	for _, w := range works {
		if !slices.Contains(safety.Statements(w.Work), step) || w.Work.Tool != safety.NoTool && step == string(w.Work.Need) {
			continue
		}
		d := safety.Check(c, w.Work, at, e)
		if d.Allowed {
			fmt.Fprintf(a.out, "%s: nothing is missing\n", w.Title)
			continue
		}
		fmt.Fprintf(a.out, "%s: still missing\n", w.Title)
		var fresh []safety.Missing
		for _, m := range d.Missing {
			if !told[m.Text] {
				fresh = append(fresh, m)
			}
			told[m.Text] = true
		}
		if err := reports.Missing(a.out, fresh, a.style()); err != nil {
			return err
		}
		if again := len(d.Missing) - len(fresh); again > 0 {
			fmt.Fprintf(a.out, "  and %d of what stands above\n", again)
		}
	}
	return nil
}

// wrapped prints a text broken to the width.
func (a *app) wrapped(text, first, rest string) {
	for _, line := range ask.Wrapped(ask.Clean(text), first, rest, a.columns()) {
		fmt.Fprintln(a.out, line)
	}
}

// columns is the width that plain text is broken to.
func (a *app) columns() int {
	if a.width < 40 {
		return 80
	}
	return a.width
}

// orWords joins words as alternatives: "a, b or c".
func orWords(words []string) string {
	if n := len(words); n > 1 {
		return strings.Join(words[:n-1], ", ") + " or " + words[n-1]
	}
	return strings.Join(words, "")
}

// nearHints names the word that is spelt most like a wrong one, and then what is allowed.
func nearHints(word string, words []string, allowed string) []string {
	if near := nearestOf(word, words); near != "" {
		return []string{"did you mean " + near + "?", allowed}
	}
	return []string{allowed}
}
