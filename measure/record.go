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
	m := flowMap{}
	m.add("part", r.Part)
	m.add("position", r.Position)
	m.date("done", r.Done)
	m.add("by", r.By)
	m.add("work", r.Work)
	m.add("was", r.Was)
	m.add("fitted", r.Fitted)
	m.add("because", r.Because)
	m.add("note", r.Note)
	return f.appendTo("repairs", m)
}

// AddFaultCode appends one entry of the board's own fault memory.
func (f *File) AddFaultCode(c FaultCode) error {
	m := flowMap{}
	m.add("code", c.Code)
	m.add("text", c.Text)
	m.count("count", int64(c.Count))
	m.add("at", c.At)
	m.add("note", c.Note)
	return f.appendTo("fault_log", m)
}

// AddSetting appends one setting of the drive as found.
func (f *File) AddSetting(s Setting) error {
	m := flowMap{}
	m.add("name", s.Name)
	m.add("value", s.Value)
	m.add("note", s.Note)
	return f.appendTo("settings", m)
}

// AddPhotograph appends one picture.
func (f *File) AddPhotograph(p Photograph) error {
	m := flowMap{}
	m.add("path", p.Path)
	m.add("shows", p.Shows)
	m.add("part", p.Part)
	m.time("at", p.At)
	m.count("bytes", p.Bytes)
	m.add("sha256", p.SHA256)
	return f.appendTo("photographs", m)
}

// AddCapture appends one instrument file by its name, length and sum; figures are not written.
func (f *File) AddCapture(c Capture) error {
	m := flowMap{}
	m.add("name", c.Name)
	m.count("bytes", c.Bytes)
	m.add("sha256", c.SHA256)
	m.add("kind", c.Kind)
	m.time("at", c.At)
	m.add("position", c.Position)
	m.add("edge", c.Edge)
	m.add("note", c.Note)
	return f.appendTo("captures", m)
}

// AddStep appends one step of the record.
func (f *File) AddStep(s StepEntry) error {
	m := flowMap{}
	m.add("step", s.Step)
	m.add("result", s.Result)
	m.time("at", s.At)
	m.add("by", s.By)
	m.add("note", s.Note)
	return f.appendTo("steps", m)
}

// StateBefore appends one statement of conditions; a condition that does not hold is left out.
func (f *File) StateBefore(b Before) error {
	m := flowMap{}
	m.add("step", b.Step)
	m.time("at", b.At)
	m.add("motor", b.Motor)
	m.add("brake_resistor", b.BrakeResistor)
	if b.Fuse.Unit != "" || b.Fuse.Text != "" {
		m.add("fuse", quantityText(b.Fuse))
	}
	m.add("bank", b.Bank)
	for _, c := range []struct {
		key   string
		holds bool
	}{{"guard", b.Guard}, {"remote_off", b.RemoteOff}, {"glasses", b.Glasses}, {"second_person", b.SecondPerson},
		{"bus_disconnected", b.BusDisconnected}, {"shield", b.Shield}, {"electronics_disconnected", b.ElectronicsDisconnected},
		{"sources_off", b.SourcesOff}, {"gates_held", b.GatesHeld}, {"limit_set", b.LimitSet}, {"attended", b.Attended}} {
		if c.holds {
			m.add(c.key, "yes")
		}
	}
	m.add("probe", b.Probe)
	m.add("clip_on", b.ClipOn)
	m.add("supply", b.Supply)
	m.count("earth_clips", int64(b.EarthClips))
	m.add("note", b.Note)
	return f.appendTo("safety.before", m)
}

// count adds a whole number unless it is zero.
func (m *flowMap) count(key string, n int64) {
	if n != 0 {
		m.add(key, strconv.FormatInt(n, 10))
	}
}

// date adds a day unless it is zero.
func (m *flowMap) date(key string, at time.Time) {
	if !at.IsZero() {
		m.add(key, at.Format("2006-01-02"))
	}
}
