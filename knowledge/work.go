package knowledge

import (
	"fmt"
	"regexp"
	"slices"
	"strings"

	"drivemend/measure/quantity"
)

// stateRule says in which states of the board a thing is read, and why in no other.
type stateRule struct {
	needs []string
	why   string
}

var (
	touching = Needs()[1:] // every state but that of a question
	powered  = Needs()[2:]
)

// instrumentStates are the states in which each instrument is put to the board. One that is not in the table, as the
// eye, touches nothing.
var instrumentStates = map[string]stateRule{
	"meter":             {touching, "its leads touch the board, and no hold point stands before a question"},
	"scope":             {touching, "its probe touches the board, and no hold point stands before a question"},
	"double-pulse":      {Needs()[3:], "it pulses the bus"},
	"camera":            {powered, "it sees what power heats; to heat a part with a supply is instrument: supply"},
	"insulation-tester": {[]string{"dead"}, "it puts hundreds of volts on a board that has to be dead before"},
	"supply":            {Needs()[1:4], "it passes a current, which has hold points of its own and no place beside a full bus"},
}

// unitStates are the states in which a reading of a unit is taken. A unit that is not in the table can be asked for.
var unitStates = map[quantity.Unit]stateRule{
	quantity.Ohm:   {[]string{"dead"}, "on a charged board the reading lies and the meter can burn"},
	quantity.Farad: {[]string{"dead"}, "on a charged board the reading lies and the meter can burn"},
	quantity.Henry: {[]string{"dead"}, "on a charged board the reading lies and the meter can burn"},

	quantity.Volt:            {touching, "it is read at the board, and no hold point stands before a question"},
	quantity.Ampere:          {touching, "it is read at the board, and no hold point stands before a question"},
	quantity.Watt:            {touching, "it is read at the board, and no hold point stands before a question"},
	quantity.Joule:           {touching, "it is read at the board, and no hold point stands before a question"},
	quantity.Coulomb:         {touching, "it is read at the board, and no hold point stands before a question"},
	quantity.VoltPerSecond:   {touching, "it is read at the board, and no hold point stands before a question"},
	quantity.AmperePerSecond: {touching, "it is read at the board, and no hold point stands before a question"},
}

// spoken are words of a measurement in the text of a test, and the instruments they belong to; nil for any.
type spoken struct {
	words       *regexp.Regexp
	instruments []string
}

var measuring = []spoken{
	{regexp.MustCompile(`(?i)\b(?:insulation tester|megger)\b`), []string{"insulation-tester"}},
	{regexp.MustCompile(`(?i)\bdouble pulses?\b`), []string{"double-pulse"}},
	{regexp.MustCompile(`(?i)\b(?:oscilloscope|scope (?:on|at|across|in))\b`), []string{"scope", "double-pulse"}},
	{regexp.MustCompile(`(?i)\b(?:inject(?:s|ed|ing)?\b|pass(?:es)? (?:[0-9.]+ to )?[0-9.]+ m?A\b)`), []string{"supply"}},
	{regexp.MustCompile(`(?i)\b(?:(?:ohms?|diode|continuity|capacitance|resistance) range|(?:ohm|esr|lcr) ?-?meter|thermal camera|limited supply)\b`), nil},
}

// NeedsOf gives the board states in which an instrument may be used, nil for one that touches nothing.
func NeedsOf(instrument string) []string { return slices.Clone(instrumentStates[instrument].needs) }

// testWork reports a test that would come before the hold points of what is done in it: they go by board state and
// instrument. It runs when both are known. A computed test is done by nobody.
func (d *decoder) testWork(e entry, f map[string]spot, t *Test) {
	needs := d.place(e.spot, "needs")
	if t.Computed != "" {
		if t.Instrument != "" && t.Instrument != "none" {
			d.add(f["instrument"], "a computed test is done with nothing, not with the "+t.Instrument, "write instrument: none")
		}
	} else {
		d.inState(needs, t, "done with instrument "+t.Instrument, instrumentStates[t.Instrument])
		d.inState(needs, t, "read in the unit "+unitWord(t.Unit), unitStates[t.Unit])
	}
	if contains(powered, t.Needs) && t.Instrument == "" {
		d.add(needs, "is "+t.Needs+", and the test does not say what it is done with, on which its hold points depend",
			"add instrument: "+strings.Join(Instruments(), ", "))
	}
	for _, key := range []string{"ask", "how"} {
		d.spokenOf(f[key], t)
	}
}

// spokenOf reports a text that speaks of a measurement which the test, by its board state and instrument, is not.
func (d *decoder) spokenOf(s spot, t *Test) {
	if !s.given() {
		return
	}
	for _, m := range measuring {
		word := m.words.FindString(s.node.Value)
		switch {
		case word == "":
		case t.Needs == "question":
			d.add(s, fmt.Sprintf("speaks of %q, but the test needs question, before which no hold point stands", word),
				"write the needs of that step: "+strings.Join(touching, ", "))
		case m.instruments != nil && !contains(m.instruments, t.Instrument):
			d.add(s, fmt.Sprintf("speaks of %q, but the instrument of the test is %s, which has other hold points", word, orNone(t.Instrument)),
				"write instrument: "+strings.Join(m.instruments, " or "))
		}
	}
}

// inState reports a test in a board state that a rule does not allow.
func (d *decoder) inState(s spot, t *Test, what string, rule stateRule) {
	if len(rule.needs) > 0 && !contains(rule.needs, t.Needs) {
		d.add(s, "a test "+what+" cannot need "+t.Needs+": "+rule.why, "write needs: "+strings.Join(rule.needs, ", "))
	}
}

// place gives the value of a key of an entry, or the entry where the key is absent.
func (d *decoder) place(s spot, key string) spot {
	for i := 0; i+1 < len(s.node.Content); i += 2 {
		if s.node.Content[i].Value == key {
			return spot{s.file, join(s.path, key), s.node.Content[i+1]}
		}
	}
	return s
}
