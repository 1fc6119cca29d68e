package safety

import (
	"regexp"
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

// isolationFaults says what a statement of isolation lacks on these boards, found and rebuilt; nothing when it is sound.
func isolationFaults(boards []measure.Board, i *measure.Isolation) []Missing {
	var m []Missing
	if !i.Locked {
		m = append(m, Missing{0, "the isolation is not locked", "open the isolator, lock and tag it, then enter it: " + isolationCommand})
	}
	if fault := motorFault(boards, i.Motor); fault != "" {
		m = append(m, Missing{0, fault, "unplug the motor or lock its shaft, then enter it: drivemend safe isolation CASE --locked --motor unplugged (or shaft-locked) --other-sources …"})
	}
	if fault := sourcesFault(i.OtherSources); fault != "" {
		m = append(m, Missing{0, fault,
			"look for a shared bus, battery, charger, external 24 V, fan and relay supplies; switch them off, lock them, and enter it: " +
				"drivemend safe isolation CASE --locked --motor unplugged --other-sources none; or each by a name of up to four words with off, between commas: " +
				"--other-sources \"24 V control supply off, charger unplugged\"; what has no common name goes by the label on it, with its number: \"K3 off\""})
	}
	return m
}

func motorFault(boards []measure.Board, motor string) string {
	switch motor {
	case motorUnplugged, motorShaftLocked:
		return ""
	case motorConnected:
		for _, b := range boards {
			if can, known := generates(b); can {
				return freeShaft(known)
			}
		}
		if len(boards) > 0 {
			return ""
		}
		return freeShaft(false)
	}
	return "it is not stated whether the motor is unplugged or its shaft locked"
}

func freeShaft(known bool) string {
	if known {
		return "the motor is connected and its shaft is free: when it turns, it puts voltage on the bus"
	}
	return "the motor is connected and its kind is not known: a permanent-magnet motor makes voltage whenever it turns"
}

// How a source that is not there any more is written; the longer wording stands before the one it ends in.
var offWords = [][]string{{"switched", "off"}, {"is", "off"}, {"off"}, {"disconnected"}, {"unplugged"}, {"removed"}, {"isolated"}}

// mostNameWords keeps a name a name: a sentence can say anything.
const mostNameWords = 4

// A name is made of the words of these two lists, with one of the first or a label among them. The lists are closed: an
// open one lets a statement of something else pass for a name ("charger sometimes off", "make sure charger off").
// Whatever they lack goes by the label on it, with its number (K3, F12, PS2).
var (
	sourceNames = words("adapter", "adaptor", "alternator", "batteries", "battery", "blower", "bus", "busbar", "buses", "charger", "chargers", "circuit", "compressor",
		"computer", "contactor", "contactors", "controller", "conveyor", "cooler", "drive", "drives", "encoder", "exciter", "fan", "fans", "feed", "feeder", "feedback",
		"fieldbus", "generator", "heater", "heaters", "hoist", "inverter", "inverters", "lamp", "laptop", "lift", "lighting", "line", "lines", "mains", "network", "pack",
		"panel", "plc", "programmer", "psu", "pump", "rectifier", "relay", "relays", "sensor", "servo", "socket", "starter", "supplies", "supply", "tachometer",
		"transformer", "turbine", "ups", "usb", "vac", "vdc", "ventilator", "winch")
	sourceKinds = words("ac", "anti", "auxiliary", "backup", "bench", "board", "brake", "cabinet", "coil", "common", "condensation", "control", "cooling", "crane", "dc",
		"door", "emergency", "external", "field", "heating", "high", "holding", "hz", "input", "logic", "low", "machine", "main", "motor", "neighbour", "neighbouring",
		"phase", "power", "precharge", "pre", "charge", "pv", "second", "first", "third", "shared", "signal", "solar", "standby", "telephone", "traction", "trickle",
		"v", "volt", "voltage", "wind")
)

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

// isName takes one to four words of the lists and labels: a name among them, or a label and a letter ("24 V", "K3").
func isName(name []string) bool {
	if len(name) > mostNameWords {
		return false
	}
	named, labelled := false, false
	for _, w := range name {
		for _, piece := range strings.FieldsFunc(w, func(r rune) bool { return strings.ContainsRune("-/.", r) }) {
			label := isLabel(piece)
			if !label && !sourceNames[piece] && !sourceKinds[piece] {
				return false
			}
			named, labelled = named || sourceNames[piece], labelled || label
		}
	}
	return named || (labelled && strings.ContainsFunc(strings.Join(name, ""), unicode.IsLetter))
}

// labels are a figure with or without its unit (24, 230vac), or what stands on a part: one or two letters and a number
// (k3, ps12). Letters that are a word of their own make no label: "no1 off" says nothing.
var (
	labels    = regexp.MustCompile(`^([0-9]{1,4}(v|vac|vdc|a|hz|kv)?|([a-z]{1,2})[0-9]{1,3})$`)
	noLetters = words("no", "on", "if", "or", "as", "at", "is", "in", "to", "up", "ok")
)

func isLabel(piece string) bool {
	m := labels.FindStringSubmatch(piece)
	return m != nil && !noLetters[m[3]]
}
