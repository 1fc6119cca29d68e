package reports

import (
	"strings"

	"drivemend/diagnose"
	"drivemend/knowledge"
	"drivemend/measure/quantity"
)

// writeEnter says how the answer to a test is entered: a command that can be pasted but for its value.
func writeEnter(s *screen, c diagnose.Candidate) {
	value, note := valueWord(c.Test), ""
	choices := resultIDs(c.Test)
	switch {
	case c.Test.Unit != "":
		note = readingNote(c.Test, choices)
	case columns(enterCommand(c, strings.Join(choices, "|"))) <= s.width-labelColumns:
		value = strings.Join(choices, "|")
	default:
		note = value + ": " + strings.Join(choices, " | ")
	}
	if command := enterCommand(c, value); columns(command) <= s.width-labelColumns {
		s.item(mandatory, "enter", command)
	} else { // a line of its own, so that it can be taken in one piece
		s.line(mandatory, " enter")
		s.hang(mandatory, " ", command)
	}
	if note != "" {
		s.item(neutral, "", note)
	}
	if c.Test.Instrument == camera {
		s.item(neutral, "", "with --surface matt-dot|tape|moulded|painted|bare-metal: what it looked at")
	}
}

// camera is the instrument whose readings are lower bounds on some surfaces.
const camera = "camera"

// enterCommand is the command that enters a value for a test at its place.
func enterCommand(c diagnose.Candidate, value string) string {
	text := "drivemend enter CASE " + c.Test.ID + " " + value
	switch {
	case c.Part != "":
		text += " --part " + shellWord(c.Part)
	case c.Position != "":
		text += " --position " + shellWord(c.Position)
	}
	if c.Lifted {
		text += " --lifted"
	}
	return text
}

// shellWord puts a name that is more than letters, digits and the usual marks between them in quotes.
func shellWord(name string) string {
	plainName := strings.IndexFunc(name, func(r rune) bool {
		return !strings.ContainsRune("-_.+:/", r) && (r < '0' || r > '9') && (r < 'A' || r > 'Z') && (r < 'a' || r > 'z')
	}) < 0
	if plainName && name != "" {
		return name
	}
	return "'" + strings.ReplaceAll(name, "'", `'\''`) + "'"
}

func valueWord(t *knowledge.Test) string {
	if t.Unit != "" {
		return "READING"
	}
	return "RESULT"
}

func resultIDs(t *knowledge.Test) []string {
	var out []string
	for _, r := range t.Results {
		out = append(out, r.ID)
	}
	return out
}

// readingNote says what a reading may be: a number, in the unit of the test without one, or the name of a result.
func readingNote(t *knowledge.Test, choices []string) string {
	text := "READING: a number"
	switch t.Unit {
	case quantity.Any:
		text += " with its unit"
	case quantity.Ratio:
		text += " without a unit, a ratio"
	case quantity.Count:
	default:
		text += ", in " + string(t.Unit) + " unless its unit stands with it"
	}
	if len(choices) > 0 {
		text += "; or " + strings.Join(choices, " | ")
	}
	return text
}
