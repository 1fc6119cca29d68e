package measure

import (
	"slices"

	"drivemend/measure/quantity"
)

// caseKeys are the keys at the top of a case file.
func caseKeys() []Key {
	return []Key{
		count("drivemend", 1, 1, "version of the case file: 1").used("loader").required(),
		plain("case", KindName, "short name of this case").used("every screen and report").required(),
		plain("opened", KindDate, "day the case was opened").used("report"),
		plain("owner", KindText, "whose board it is; can be left out of reports").used("report"),
		plain("technician", KindText, "who works on it; can be left out of reports").used("report"),
		plain("serial", KindText, "serial number of the board; can be left out of reports").used("report"),
		plain("firmware", KindText, "firmware version; can be left out of reports").used("report"),
		plain("story", KindText, "what happened, in the owner's words").used("report"),
		plain("source", KindMap, "where a published case was read"),
		plain("source.title", KindText, "title of the page or paper").used("report"),
		plain("source.site", KindText, "kind of place it stands in").used("report"),
		plain("source.year", KindText, "year it was written").used("report"),
		plain("source.address", KindText, "where to find it").used("report"),
		plain("source.read", KindText, "how much of it was read: full, excerpt").used("report"),
		plain("board", KindMap, "what the board is"),
	}
}

// historyKeys are the keys of the safety history and of what was observed, located and captured.
func historyKeys() []Key {
	return append([]Key{
		plain("safety", KindMap, "the safety history"),
		plain("safety.isolation", KindList, "statements that the board is cut off from every source"),
		yesNo("safety.isolation[].locked", "the isolator is locked off").used("hold points").required(),
		word("safety.isolation[].motor", "what keeps the motor from feeding the board",
			"unplugged", "shaft-locked", "connected").used("hold points").required(),
		plain("safety.isolation[].other_sources", KindText, "none, or which are there and that they are off").
			used("hold points").required(),
		plain("safety.isolation[].at", KindTime, "when").used("hold points").required(),
		plain("safety.dead_checks", KindList, "voltages read at the stores of energy"),
		plain("safety.dead_checks[].point", KindName, "the store of energy that was read: bus, reservoir, brake").
			used("hold points").required(),
		amount("safety.dead_checks[].dc", quantity.Volt, -20e3, 20e3, "DC voltage read").used("hold points").required(),
		amount("safety.dead_checks[].ac", quantity.Volt, 0, 20e3, "AC voltage read").used("hold points"),
		yesNo("safety.dead_checks[].meter_proved", "the meter was proved on a known source before and after").
			used("hold points"),
		plain("safety.dead_checks[].at", KindTime, "when").used("hold points").required(),
		plain("safety.link", KindList, "shorting links across the bus"),
		plain("safety.link[].fitted", KindTime, "when the link was fitted").used("hold points").required(),
		plain("safety.link[].removed", KindTime, "when it was taken off; leave out while it is fitted").used("hold points"),
		plain("safety.energised", KindList, "moments at which energy was, or may have been, put into the board"),
		word("safety.energised[].what", "what put energy in", "powered-step", "source", "shaft").
			used("hold points").required(),
		plain("safety.energised[].at", KindTime, "when").used("hold points").required(),
	}, slices.Concat(beforeKeys(), observationKeys())...)
}

// surfaces are what a camera can look at.
var surfaces = []string{"matt-dot", "tape", "moulded", "painted", "bare-metal"}

// observationKeys are the keys of observations, of locating a part and of captures.
func observationKeys() []Key {
	return []Key{
		plain("observations", KindList, "answers and readings in the order they were taken"),
		plain("observations[].test", KindName, "id of the test").used("ranking").required(),
		plain("observations[].part", KindName, "the part it was taken at").used("ranking"),
		plain("observations[].position", KindName, "the position it was taken at").used("ranking"),
		plain("observations[].at", KindTime, "when").used("hold points", "ranking"),
		plain("observations[].result", KindName, "a result the test names").used("ranking"),
		plain("observations[].reading", KindReading, "what the instrument showed").used("ranking"),
		plain("observations[].twin", KindReading, "the same reading on a part that should be alike").used("ranking"),
		word("observations[].answer", "why there is neither result nor reading", "skipped", "later").used("ranking"),
		word("observations[].seen", "who saw it and when; silent: at the bench", "on-arrival", "at-bench", "by-cure").
			used("ranking"),
		word("observations[].polarity", "red lead on the collector, drain or anode: forward", "forward", "reverse").
			used("ranking"),
		word("observations[].state", "the part lifted out of the circuit, or in it", "lifted", "in-circuit").used("ranking"),
		word("observations[].motor", "motor connected during the reading", "on", "off").used("ranking"),
		word("observations[].surface", "what a camera looked at; bare metal, or nothing stated, reads too cold", surfaces...).
			used("ranking", "report"),
		plain("observations[].instrument", KindText, "which instrument").used("report"),
		ratio("observations[].accuracy", 0, 1, "accuracy of the instrument, relative").used("ranking").
			typical("", "2 %", "design, judgement"),
		amount("observations[].range", quantity.Any, 0, 0, "top of the instrument's range").used("ranking").
			typical("ohm", "20 MΩ", "design, judgement"),
		plain("observations[].note", KindText, "anything worth keeping").used("report"),
		plain("locate", KindNamed, "which of the paralleled parts carries the current, by position"),
		plain("locate.*", KindMap, "one bank under injection"),
		plain("locate.*.injection", KindMap, "the current sent through the bank"),
		amount("locate.*.injection.current", quantity.Ampere, 1e-3, 200, "injected current").used("locate"),
		amount("locate.*.injection.voltage", quantity.Volt, 0, 60, "voltage across the bank meanwhile").used("locate"),
		plain("locate.*.feed", KindName, "the part next to which the current enters").used("locate"),
		plain("locate.*.rises", KindList, "how much warmer each part became"),
		plain("locate.*.rises[].part", KindName, "the part").used("locate").required(),
		amount("locate.*.rises[].rise", quantity.Kelvin, -50, 400, "rise over its start").used("locate").required(),
		word("locate.*.rises[].surface", "what the camera looked at", surfaces...).used("locate"),
		plain("locate.*.drops", KindList, "voltage drops along the bank"),
		plain("locate.*.drops[].from", KindName, "the part the drop was read from").used("locate").required(),
		plain("locate.*.drops[].to", KindName, "the part it was read to").used("locate").required(),
		amount("locate.*.drops[].drop", quantity.Volt, -10, 10, "the drop").used("locate").required(),
		plain("captures", KindList, "figures taken from instrument files"),
		plain("captures[].name", KindText, "name of the file").used("report").required(),
		count("captures[].bytes", 0, 1e15, "its length in bytes").used("report"),
		sum("captures[].sha256", "its SHA-256 sum").used("report"),
		word("captures[].kind", "what the file holds", "scope", "thermal").used("report"),
		plain("captures[].at", KindTime, "when it was taken").used("report"),
		plain("captures[].position", KindName, "the position it shows").used("edge"),
		word("captures[].edge", "which edge it shows", "opening", "closing").used("edge"),
		amount("captures[].bus", quantity.Volt, 0, 20e3, "bus voltage in it").used("edge"),
		amount("captures[].peak", quantity.Volt, 0, 20e3, "highest voltage in it").used("edge"),
		amount("captures[].current", quantity.Ampere, 0, 20e3, "current switched in it").used("edge"),
		amount("captures[].fall_time", quantity.Second, 1e-9, 1e-3, "fall time in it").used("edge"),
		amount("captures[].ring_frequency", quantity.Hertz, 1, 10e9, "ring frequency in it").used("edge"),
		ratio("captures[].damping_ratio", 0, 10, "damping of the ring").used("edge"),
		amount("captures[].loop_inductance", quantity.Henry, 1e-10, 1e-3, "loop inductance found from it").used("edge"),
		plain("captures[].note", KindText, "anything worth keeping").used("report"),
	}
}

// rebuildKeys are the keys of the chosen rebuild: the board's own, laid over it, and when it was built.
func rebuildKeys() []Key {
	groups := []string{"assumed", "bus", "positions", "switch", "freewheel", "loop", "snubber", "gate", "driver", "load",
		"pwm", "protection", "cooling", "stages"}
	head := []Key{
		plain("rebuild", KindMap, "what the technician chose to build; its board keys lie over the board's"),
		plain("rebuild.done", KindTime, "when it was built; leave out while it is planned").used("hold points", "ranking"),
	}
	return append(head, moved(boardKeys(), "board", "rebuild", func(path string) bool {
		for _, g := range groups {
			if within(path, "board."+g) {
				return true
			}
		}
		return false
	})...)
}

// outcomeKeys are the keys of the bring-up and of how the case ended.
func outcomeKeys() []Key {
	return []Key{
		plain("bring_up", KindList, "what was measured stage by stage"),
		plain("bring_up[].stage", KindName, "the stage of the ladder").used("bring-up").required(),
		plain("bring_up[].at", KindTime, "when").used("bring-up", "hold points"),
		amount("bring_up[].bus", quantity.Volt, 0, 20e3, "bus voltage").used("bring-up"),
		amount("bring_up[].current", quantity.Ampere, 0, 20e3, "current switched").used("bring-up"),
		amount("bring_up[].peak", quantity.Volt, 0, 20e3, "highest voltage at the switch").used("bring-up", "edge"),
		amount("bring_up[].gate_peak", quantity.Volt, -100, 100, "highest voltage at the gate").used("bring-up"),
		amount("bring_up[].temperature", quantity.Celsius, -65, 400, "heat-sink temperature").used("bring-up"),
		amount("bring_up[].loop_inductance", quantity.Henry, 1e-10, 1e-3, "loop inductance found").used("edge"),
		plain("bring_up[].note", KindText, "anything worth keeping").used("report"),
		plain("outcome", KindMap, "how the case ended"),
		plain("outcome.faults", KindList, "ids of the faults found").used("report", "learn"),
		plain("outcome.parts", KindList, "the broken parts").used("report", "learn"),
		plain("outcome.stress", KindName, "id of what killed it").used("report", "learn"),
		plain("outcome.causes", KindList, "ids of what let it happen").used("report", "learn"),
		word("outcome.confirmed_by", "how sure that is", "held-30-days", "reproduced", "plausible").used("report", "learn"),
		plain("outcome.closed", KindDate, "day the case was closed").used("report"),
	}
}

// within tells whether a path is a key or stands below it.
func within(path, key string) bool {
	return path == key || len(path) > len(key) && path[:len(key)] == key && (path[len(key)] == '.' || path[len(key)] == '[')
}
