package safety

import "drivemend/measure"

// Phase is when in a job a step of the record is done.
type Phase string

// The phases, in the order of the job.
const (
	BeforeTouching Phase = "before touching"
	WhileRepairing Phase = "while repairing"
	AfterRepair    Phase = "after the repair"
)

// RecordStep is one step of the record: work that leaves no reading, but must not be forgotten.
type RecordStep struct {
	ID    string // one of measure.StepWords
	Phase Phase
	Title string // plain words
	Ask   string // the question, to be answered done, failed, not-possible, not-fitted
	How   string // how it is done, with the caution where the hazard is
	Work  Work   // the hold points it stands behind
}

// RecordSteps lists every step of the record in the order of the job.
func RecordSteps() []RecordStep { return append([]RecordStep(nil), recordSteps...) }

// recordStep gives one step of the record by its name.
func recordStep(id string) (RecordStep, bool) {
	for _, s := range recordSteps {
		if s.ID == id {
			return s, true
		}
	}
	return RecordStep{}, false
}

var (
	look      = Work{Need: NeedQuestion}
	insulated = Work{Need: NeedDead, Tool: ToolInsulation}
)

// The steps, and how they are done, are common practice.
var recordSteps = []RecordStep{
	{measure.StepPhotographed, BeforeTouching, "photographs as found", "Is the board photographed as it was found?",
		"From above and from the sides, every burn mark, plug and label, before anything is moved. Covers stay on while the board may be live.", look},
	{measure.StepFaultLogRead, BeforeTouching, "fault memory read", "Is the board's own fault memory read out?",
		"Only if the display can be read without putting power on a board that has blown; otherwise not-possible, and ask whoever ran the machine which code it showed.", look},
	{measure.StepSettingsSaved, BeforeTouching, "settings saved", "Are the settings of the drive saved?",
		"From the drive's own copy, its keypad, a backup or the papers of the machine. Do not put power on a blown board for it.", look},
	{measure.StepPositionsMarked, BeforeTouching, "parts and plugs marked", "Is every part and plug marked with its position?",
		"On the part and on the board, before the first one is taken off: a swapped plug or pair of gate leads kills the repaired board. Mark only on a board that is isolated.", look},
	{measure.StepDeadPartsBagged, WhileRepairing, "dead parts bagged", "Is every dead part kept in a bag with its position?",
		"One bag for one part: position, marking, lot. What broke where is the evidence for the cause. Broken ceramic insulators can hold beryllia: do not grind or crush them.", look},
	{measure.StepProtectionsProved, AfterRepair, "protections proved at reduced limits", "Did every protection trip at its reduced limit?",
		"On the current-limited bus, each protection by itself: over-current with the trip set low, emergency stop, over-temperature by its sensor's wire or a lowered limit, " +
			"under- and over-voltage by moving the bench supply or the limit. Each must take every gate off and stay off until it is reset. Set the limits back afterwards. " +
			"Never prove over-current by shorting the output.", Work{Need: NeedLowBus}},
	{measure.StepSettingsRestored, AfterRepair, "settings restored", "Are the settings restored and compared with what was saved?",
		"Value by value, limits and trips first: reduced limits of the bench must not stay, and nor must a setting that killed the board. With control power off the bus only behind its own hold point.", look},
	{measure.StepMotorTested, AfterRepair, "motor tested", "Did the motor pass: windings to earth, windings alike, turning freely?",
		"Electronics disconnected: unplug the motor from the drive first, and disconnect encoder and temperature sensors, for the insulation tester kills them. Windings to the frame with the tester, " +
			"at the voltage its maker names; windings among themselves with an ohmmeter. Discharge winding and cable to earth afterwards before anybody touches them; keep hands off while the tester runs.", insulated},
	{measure.StepCableTested, AfterRepair, "motor cable tested", "Did the motor cable pass: every core to the others, to the screen and to earth?",
		"Electronics disconnected: both ends off, the drive first. Every core against all the others, the screen and earth, with the insulation tester; then continuity end to end. " +
			"A long cable holds the tester's charge: discharge every core to earth afterwards, before it is touched.", insulated},
	{measure.StepBrakeResistorTested, AfterRepair, "brake resistor tested", "Did the brake resistor pass: its resistance, and against its case?",
		"Electronics disconnected: take both leads off the drive. It can be hot for a long time after work: let it cool. Resistance against the plate, then against the case with the insulation tester; " +
			"discharge it to its case afterwards. A resistor that is shorted or too small kills the brake switch at its first pulse.", insulated},
	{measure.StepLoadTested, AfterRepair, "tested under load on the bench", "Did the board carry its running current on the bench, into a dummy load or a motor that turns freely?",
		"On the bench: a dummy load, or the motor with its shaft free or the wheels up, its shaft turned by hand first while all is isolated. Then rising current, up to the running current and no further, " +
			"with a second person at the switch, watching current, temperature and noise; stop at anything that is not as predicted. Nobody stands near what turns. " +
			"Full load in the machine belongs to its commissioning after the hand-over, under local rules.", Work{Need: NeedFull}},
	{measure.StepHandedOver, AfterRepair, "handed over", "Is the machine handed over to whoever runs it, with the report?",
		"Say what broke, what let it happen, what was changed and what to watch. Leave the report with them.", look},
	{measure.StepFollowedUp, AfterRepair, "asked again after 30 days", "Does it still run, 30 days after it was handed over?",
		"Ask whoever runs it: does it run as before, has it tripped, was anything changed? Only then does the repair count as held.", look},
}
