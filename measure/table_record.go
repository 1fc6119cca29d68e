package measure

import (
	"slices"

	"drivemend/measure/quantity"
)

// recordKeys are the keys of what was found out and done beside the measuring: earlier repairs, what the board itself
// remembers, pictures, and the steps before touching and after the repair.
func recordKeys() []Key {
	return []Key{
		plain("repairs", KindList, "earlier repairs, part by part"),
		plain("repairs[].part", KindText, "the part as the board names it; need not be a switch").used("report", "ranking").required(),
		plain("repairs[].position", KindName, "the position it serves").used("report"),
		plain("repairs[].done", KindDate, "day of the repair").used("report"),
		plain("repairs[].by", KindText, "who did it; can be left out of reports").used("report"),
		word("repairs[].work", "what was done to it", "replaced", "reworked", "adjusted", "bridged", "removed", "added").
			used("report"),
		plain("repairs[].was", KindText, "type or value it had").used("report"),
		plain("repairs[].fitted", KindText, "type or value that was put in").used("report"),
		plain("repairs[].because", KindText, "why").used("report"),
		plain("repairs[].note", KindText, "anything worth keeping").used("report"),
		plain("fault_log", KindList, "what the board's own fault memory says"),
		plain("fault_log[].code", KindText, "the code as shown").used("report").required(),
		plain("fault_log[].text", KindText, "what the manual says of it").used("report"),
		count("fault_log[].count", 0, 1e9, "how often it is recorded").used("report"),
		plain("fault_log[].at", KindText, "when, as the board shows it: its clock or its running hours").used("report"),
		plain("fault_log[].note", KindText, "anything worth keeping").used("report"),
		plain("settings", KindList, "settings of the drive as found"),
		plain("settings[].name", KindText, "number or name of the setting, each once").used("report").required(),
		plain("settings[].value", KindText, "its value as found").used("report").required(),
		plain("settings[].note", KindText, "anything worth keeping").used("report"),
		plain("photographs", KindList, "pictures, by path; the files stay where they are"),
		plain("photographs[].path", KindText, "the file, as a path from the case file").used("report").required(),
		plain("photographs[].shows", KindText, "what is on it").used("report"),
		plain("photographs[].part", KindText, "the part it is of").used("report"),
		plain("photographs[].at", KindTime, "when it was taken").used("report"),
		count("photographs[].bytes", 0, 1e15, "its length in bytes").used("report"),
		sum("photographs[].sha256", "its SHA-256 sum").used("report"),
		plain("steps", KindList, "steps of the work that leave no reading: before touching, and after the repair"),
		word("steps[].step", "which step", StepWords()...).used("status", "report", "hold points").required(),
		word("steps[].result", "how it ended; why it was not possible stands under note", "done", "failed", "not-possible", "not-fitted").
			used("status", "report", "hold points").required(),
		plain("steps[].at", KindTime, "when").used("status", "hold points").required(),
		plain("steps[].by", KindText, "who did it; can be left out of reports").used("report"),
		plain("steps[].note", KindText, "what was found; why it was not possible, or failed").used("report"),
	}
}

// The steps of the record, in the order of the job.
const (
	StepPhotographed        = "photographed"          // as found, before anything is touched
	StepFaultLogRead        = "fault-log-read"        // the board's own fault memory
	StepSettingsSaved       = "settings-saved"        // the drive's settings
	StepPositionsMarked     = "positions-marked"      // every part and plug, before it is taken off
	StepDeadPartsBagged     = "dead-parts-bagged"     // each with its position
	StepProtectionsProved   = "protections-proved"    // at reduced limits
	StepSettingsRestored    = "settings-restored"     // and compared with what was saved
	StepMotorTested         = "motor-tested"          // insulation and windings, before it is connected again
	StepCableTested         = "cable-tested"          // insulation and continuity, before it is connected again
	StepBrakeResistorTested = "brake-resistor-tested" // resistance and insulation, before it is connected again
	StepLoadTested          = "load-tested"           // a dummy load or a free motor, up to the running current
	StepHandedOver          = "handed-over"           // to whom runs the machine, with the report
	StepFollowedUp          = "followed-up"           // 30 days later
)

// StepWords lists the steps of the record in the order of the job.
func StepWords() []string {
	return []string{StepPhotographed, StepFaultLogRead, StepSettingsSaved, StepPositionsMarked, StepDeadPartsBagged,
		StepProtectionsProved, StepSettingsRestored, StepMotorTested, StepCableTested, StepBrakeResistorTested, StepLoadTested,
		StepHandedOver, StepFollowedUp}
}

// beforeKeys are the conditions stated before a step that needs more than a dead board. What is not stated does not
// hold.
func beforeKeys() []Key {
	const at = "safety.before[]."
	yes := func(name, help string) Key { return yesNo(at+name, help).used("hold points") }
	return []Key{
		plain("safety.before", KindList, "conditions stated before a step that needs more than a dead board, an entry for each step"),
		word(at+"step", "the step they were stated for", BeforeWords()...).used("hold points").required(),
		plain(at+"at", KindTime, "when they were looked at and stated").used("hold points").required(),
		word(at+"motor", "powered steps: how the motor is kept from doing harm", "unplugged", "uncoupled", "wheels-up", "connected").
			used("hold points"),
		word(at+"brake_resistor", "powered steps: the brake resistor", "connected", "disconnected").used("hold points"),
		yes("guard", "powered steps: a guard stands between the board and people"),
		amount(at+"fuse", quantity.Ampere, 1e-3, 20e3, "powered steps: rating of the fuse fitted for this step").orNone().
			used("hold points"),
		yes("remote_off", "powered steps: the supply can be switched off from where one stands"),
		yes("glasses", "powered steps: everybody near wears them"),
		yes("second_person", "powered steps: somebody stands by who knows how to switch off"),
		word(at+"bank", "powered steps: the bus capacitors were at voltage within a year, or were re-formed since",
			"in-use", "re-formed", "stored").used("hold points"),
		yes("bus_disconnected", "control power: the bus is disconnected from its source"),
		yes("shield", "double pulse: a shield stands over the board"),
		yes("electronics_disconnected", "insulation tester: the electronics are disconnected from what is tested"),
		yes("sources_off", "injection: every other source is off"),
		yes("gates_held", "injection: every gate that is not under test is held to its emitter or source"),
		yes("limit_set", "injection: current and voltage limit were set before connecting"),
		yes("attended", "injection: somebody stays with it"),
		word(at+"probe", "scope: what the probe's reference is", "differential", "isolated-input", "earth-clip").
			used("hold points"),
		word(at+"clip_on", "scope with an earth clip: what the clip is on", "earthed-node", "live-node").used("hold points"),
		word(at+"supply", "scope with an earth clip: the board's supply", "isolated", "not-isolated").used("hold points"),
		count(at+"earth_clips", 0, 100, "scope with an earth clip: how many earth clips are on the board").used("hold points"),
		plain(at+"note", KindText, "anything worth keeping").used("report"),
	}
}

// The steps that conditions are stated before.
const (
	BeforeControlPower = "control-power" // control supply on, bus disconnected
	BeforeLowBus       = "low-bus"       // current-limited bus
	BeforeFull         = "full"          // full bus
	BeforeDoublePulse  = "double-pulse"  // beside those of the bus it is done at
	BeforeInjection    = "injection"     // current from a limited supply
	BeforeInsulation   = "insulation"    // insulation tester
	BeforeScope        = "scope"         // any scope step, beside those of its power
)

// powered are the steps that put energy into the board.
var powered = []string{BeforeControlPower, BeforeLowBus, BeforeFull}

// beforeTakes tells which steps each condition belongs to; a key that is not listed belongs to all of them.
var beforeTakes = map[string][]string{
	"motor": powered, "brake_resistor": powered, "guard": powered, "fuse": powered, "remote_off": powered, "glasses": powered,
	"second_person": powered, "bank": powered, "bus_disconnected": {BeforeControlPower}, "shield": {BeforeDoublePulse},
	"electronics_disconnected": {BeforeInsulation}, "sources_off": {BeforeInjection}, "gates_held": {BeforeInjection},
	"limit_set": {BeforeInjection}, "attended": {BeforeInjection},
	"probe": {BeforeScope}, "clip_on": {BeforeScope}, "supply": {BeforeScope}, "earth_clips": {BeforeScope},
}

// BeforeTakes gives the steps that a condition of safety.before, by its key, is stated before.
func BeforeTakes(condition string) []string {
	if steps, ok := beforeTakes[condition]; ok {
		return slices.Clone(steps)
	}
	return BeforeWords()
}

// BeforeWords lists the steps that conditions are stated before.
func BeforeWords() []string {
	return []string{BeforeControlPower, BeforeLowBus, BeforeFull, BeforeDoublePulse, BeforeInjection, BeforeInsulation, BeforeScope}
}
