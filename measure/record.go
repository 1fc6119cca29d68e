package measure

import (
	"strconv"
	"time"

	"drivemend/measure/quantity"
)

// Repair is one part's share of an earlier repair.
type Repair struct {
	Part, Position, By, Was, Fitted, Because, Note string
	Work                                           string    // replaced, reworked, adjusted, bridged, removed, added, ""
	Done                                           time.Time // a date, at midnight UTC; zero when not stated
	Line                                           int
}

// FaultCode is one entry of the board's own fault memory.
type FaultCode struct {
	Code, Text, At, Note string // At as the board shows it: its clock or its hours
	Count                int    // how often; 0 when not stated
	Line                 int
}

// Setting is one setting of the drive as found.
type Setting struct {
	Name, Value, Note string
	Line              int
}

// Photograph is one picture, by path; the file stays where it is.
type Photograph struct {
	Path, Shows, Part, SHA256 string
	Bytes                     int64
	At                        time.Time // zero when not stated
	Line                      int
}

// StepEntry is one step of the record that leaves no reading; Step is one of StepWords.
type StepEntry struct {
	Step, By, Note string
	Result         string // done, failed, not-possible, not-fitted
	At             time.Time
	Line           int
}

// Before is one statement of the conditions for a step that needs more than a dead board; Step is one of BeforeWords.
// What is not stated, or stated as no or unknown, does not hold.
type Before struct {
	Step                    string
	At                      time.Time
	Motor                   string            // unplugged, uncoupled, wheels-up, connected, ""
	BrakeResistor           string            // connected, disconnected, ""
	Bank                    string            // in-use, re-formed, stored, ""
	Fuse                    quantity.Quantity // without unit when none is stated
	Guard, RemoteOff        bool
	Glasses, SecondPerson   bool
	BusDisconnected         bool
	Shield                  bool
	ElectronicsDisconnected bool
	SourcesOff, GatesHeld   bool
	LimitSet, Attended      bool
	Probe                   string // differential, isolated-input, earth-clip, ""
	ClipOn                  string // earthed-node, live-node, ""
	Supply                  string // isolated, not-isolated, ""
	EarthClips              int    // 0 when not stated
	Note                    string
	Line                    int
}

// buildRecord adds what was found out and done beside the measuring.
func buildRecord(c *Case, root *entry) {
	for _, e := range root.items("repairs") {
		c.Repairs = append(c.Repairs, Repair{Part: e.word("part"), Position: e.word("position"), By: e.word("by"), Work: e.word("work"),
			Was: e.word("was"), Fitted: e.word("fitted"), Because: e.word("because"), Note: e.word("note"), Done: e.when("done"), Line: e.line})
	}
	for _, e := range root.items("fault_log") {
		c.FaultLog = append(c.FaultLog, FaultCode{Code: e.word("code"), Text: e.word("text"), At: e.word("at"), Note: e.word("note"),
			Count: e.count("count"), Line: e.line})
	}
	for _, e := range root.items("settings") {
		c.Settings = append(c.Settings, Setting{Name: e.word("name"), Value: e.word("value"), Note: e.word("note"), Line: e.line})
	}
	for _, e := range root.items("photographs") {
		c.Photographs = append(c.Photographs, Photograph{Path: e.word("path"), Shows: e.word("shows"), Part: e.word("part"),
			SHA256: e.word("sha256"), Bytes: int64(e.count("bytes")), At: e.when("at"), Line: e.line})
	}
	for _, e := range root.items("steps") {
		c.Steps = append(c.Steps, StepEntry{Step: e.word("step"), By: e.word("by"), Note: e.word("note"), Result: e.word("result"),
			At: e.when("at"), Line: e.line})
	}
}

// count gives a whole number; 0 when it is not stated.
func (e *entry) count(name string) int {
	q, _ := e.amount(name)
	return int(q.Value)
}

// buildBefore makes one statement of conditions.
func buildBefore(e *entry) Before {
	yes := func(name string) bool { return e.word(name) == "yes" }
	b := Before{Step: e.word("step"), At: e.when("at"), Motor: e.word("motor"), BrakeResistor: e.word("brake_resistor"), Bank: e.word("bank"),
		Guard: yes("guard"), RemoteOff: yes("remote_off"), Glasses: yes("glasses"), SecondPerson: yes("second_person"),
		BusDisconnected: yes("bus_disconnected"), Shield: yes("shield"), ElectronicsDisconnected: yes("electronics_disconnected"),
		SourcesOff: yes("sources_off"), GatesHeld: yes("gates_held"), LimitSet: yes("limit_set"), Attended: yes("attended"),
		Probe: e.word("probe"), ClipOn: e.word("clip_on"), Supply: e.word("supply"), EarthClips: e.count("earth_clips"),
		Note: e.word("note"), Line: e.line}
	b.Fuse, _ = e.amount("fuse")
	return b
}

// AddRepair appends one part's share of an earlier repair.
func (f *File) AddRepair(r Repair) error {
	return f.appendTo("repairs", fields("part", r.Part, "position", r.Position, "done", dayText(r.Done), "by", r.By, "work", r.Work,
		"was", r.Was, "fitted", r.Fitted, "because", r.Because, "note", r.Note))
}

// AddFaultCode appends one entry of the board's own fault memory.
func (f *File) AddFaultCode(c FaultCode) error {
	return f.appendTo("fault_log", fields("code", c.Code, "text", c.Text, "count", countText(int64(c.Count)), "at", c.At, "note", c.Note))
}

// AddSetting appends one setting of the drive as found.
func (f *File) AddSetting(s Setting) error {
	return f.appendTo("settings", fields("name", s.Name, "value", s.Value, "note", s.Note))
}

// AddPhotograph appends one picture.
func (f *File) AddPhotograph(p Photograph) error {
	return f.appendTo("photographs", fields("path", p.Path, "shows", p.Shows, "part", p.Part, "at", timeText(p.At),
		"bytes", countText(p.Bytes), "sha256", p.SHA256))
}

// AddCapture appends one instrument file by its name, length and sum; figures are not written.
func (f *File) AddCapture(c Capture) error {
	return f.appendTo("captures", fields("name", c.Name, "bytes", countText(c.Bytes), "sha256", c.SHA256, "kind", c.Kind,
		"at", timeText(c.At), "position", c.Position, "edge", c.Edge, "note", c.Note))
}

// AddStep appends one step of the record.
func (f *File) AddStep(s StepEntry) error {
	return f.appendTo("steps", fields("step", s.Step, "result", s.Result, "at", timeText(s.At), "by", s.By, "note", s.Note))
}

// StateBefore appends one statement of conditions; a condition that does not hold is left out.
func (f *File) StateBefore(b Before) error {
	fuse := ""
	if b.Fuse.Unit != "" || b.Fuse.Text != "" {
		fuse = quantityText(b.Fuse)
	}
	return f.appendTo("safety.before", fields("step", b.Step, "at", timeText(b.At), "motor", b.Motor, "brake_resistor", b.BrakeResistor,
		"fuse", fuse, "bank", b.Bank, "guard", yesText(b.Guard), "remote_off", yesText(b.RemoteOff), "glasses", yesText(b.Glasses),
		"second_person", yesText(b.SecondPerson), "bus_disconnected", yesText(b.BusDisconnected), "shield", yesText(b.Shield),
		"electronics_disconnected", yesText(b.ElectronicsDisconnected), "sources_off", yesText(b.SourcesOff),
		"gates_held", yesText(b.GatesHeld), "limit_set", yesText(b.LimitSet), "attended", yesText(b.Attended),
		"probe", b.Probe, "clip_on", b.ClipOn, "supply", b.Supply, "earth_clips", countText(int64(b.EarthClips)), "note", b.Note))
}

// yesText writes what holds; what does not is left out.
func yesText(holds bool) string {
	if holds {
		return "yes"
	}
	return ""
}

// countText writes a whole number; zero is left out.
func countText(n int64) string {
	if n == 0 {
		return ""
	}
	return strconv.FormatInt(n, 10)
}

// dayText writes a day; none is left out.
func dayText(at time.Time) string {
	if at.IsZero() {
		return ""
	}
	return at.Format(time.DateOnly)
}
