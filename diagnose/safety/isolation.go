package safety

import (
	"slices"
	"strings"
	"unicode"

	"drivemend/measure"
)

// Words of a case file for the motor.
const (
	motorUnplugged   = "unplugged"
	motorShaftLocked = "shaft-locked"
	motorConnected   = "connected"
)

// How the safety record is entered; CASE stands for the name of the case.
const isolationCommand = "drivemend safe isolation CASE --locked --motor unplugged --other-sources none"

func checkCommand(point string) string {
	return "enter it: drivemend safe dead-check CASE " + point + " --dc … --ac … --proved"
}

// isolationFaults says what a statement of isolation lacks; nothing when it is sound.
func isolationFaults(b measure.Board, i *measure.Isolation) []Missing {
	var m []Missing
	if !i.Locked {
		m = append(m, Missing{0, "the isolation is not locked", "open the isolator, lock and tag it, then enter it: " + isolationCommand})
	}
	if fault := motorFault(b, i.Motor); fault != "" {
		m = append(m, Missing{0, fault, "unplug the motor or lock its shaft, then enter it: drivemend safe isolation CASE --locked --motor unplugged (or shaft-locked) --other-sources …"})
	}
	if fault := sourcesFault(i.OtherSources); fault != "" {
		m = append(m, Missing{0, fault,
			"look for a shared bus, battery, charger, external 24 V, fan and relay supplies; switch them off, lock them, and enter it: " +
				"drivemend safe isolation CASE --locked --motor unplugged --other-sources none; or each by a name of up to four words with off, between commas: " +
				"--other-sources \"24 V control supply off, charger unplugged\""})
	}
	return m
}

func motorFault(b measure.Board, motor string) string {
	switch motor {
	case motorUnplugged, motorShaftLocked:
		return ""
	case motorConnected:
		can, known := generates(b)
		switch {
		case !can:
			return ""
		case known:
			return "the motor is connected and its shaft is free: when it turns, it puts voltage on the bus"
		}
		return "the motor is connected and its kind is not known: a permanent-magnet motor makes voltage whenever it turns"
	}
	return "it is not stated whether the motor is unplugged or its shaft locked"
}

// How a source that is not there any more is written; the longer wording stands before the one it ends in.
var offWords = [][]string{{"switched", "off"}, {"is", "off"}, {"off"}, {"disconnected"}, {"unplugged"}, {"removed"}, {"isolated"}}

// mostNameWords keeps a name a name: a sentence can say anything.
const mostNameWords = 4

// notInName are the words that make a statement of something else: a doubt, a denial, another time, or no name at all.
var notInName = words(
	"not", "no", "nothing", "nobody", "none", "never", "neither", "nor", "without", "cannot", "can", "could", "should", "would", "might", "may", "must",
	"will", "be", "been", "was", "were", "is", "are", "has", "had", "if", "when", "once", "until", "unless", "before", "after", "except", "but", "or",
	"soon", "later", "tomorrow", "yesterday", "yet", "still", "on", "live", "running", "off", "turned", "half", "partly", "nearly", "almost",
	"unknown", "unclear", "maybe", "perhaps", "probably", "presumably", "hopefully", "isnt", "cant", "wont", "wasnt",
	"it", "they", "this", "that", "these", "those", "all", "both", "each", "every", "everything", "other", "others", "rest", "some", "any", "source", "sources")

func words(list ...string) map[string]bool {
	set := map[string]bool{}
	for _, w := range list {
		set[w] = true
	}
	return set
}

// sourcesFault says why other sources are not known to be gone. They are when there are none, or when every part of
// the statement, between commas, semicolons or "and", is a short name followed by a word for off, and nothing else.
// Whatever reads differently is taken as not isolated: a sentence that holds "off" can say the opposite.
func sourcesFault(text string) string {
	trimmed := strings.ToLower(strings.TrimSpace(text))
	if trimmed == "none" {
		return ""
	}
	parts := sourceParts(trimmed)
	if len(parts) == 0 {
		return "it is not stated whether other sources feed the board"
	}
	for _, part := range parts {
		if !namedOff(part) {
			return "other sources: \"" + strings.Join(part, " ") + "\" is not a name with off, so it does not say that this source is off"
		}
	}
	return ""
}

// sourceParts splits a statement into its parts, and each part into words.
func sourceParts(text string) [][]string {
	var parts [][]string
	for _, part := range strings.FieldsFunc(text, func(r rune) bool { return strings.ContainsRune(",;\n\r", r) }) {
		var now []string
		for _, w := range strings.Fields(part) {
			if w == "and" {
				parts, now = append(parts, now), nil
				continue
			}
			now = append(now, w)
		}
		parts = append(parts, now)
	}
	return parts
}

func namedOff(part []string) bool {
	for _, off := range offWords {
		if n := len(part) - len(off); n > 0 && slices.Equal(part[n:], off) {
			return isName(part[:n])
		}
	}
	return false
}

// isName takes one to four plain words with a letter among them.
func isName(name []string) bool {
	if len(name) > mostNameWords {
		return false
	}
	letter := false
	for _, w := range name {
		for _, piece := range strings.FieldsFunc(w, func(r rune) bool { return strings.ContainsRune("-/.", r) }) {
			if notInName[piece] {
				return false
			}
			for _, r := range piece {
				letter = letter || unicode.IsLetter(r)
				if !unicode.IsLetter(r) && !unicode.IsDigit(r) {
					return false
				}
			}
		}
	}
	return letter
}
