package safety

import "time"

// Tool is what is put to the board beside the state it is in; some tools have conditions of their own.
type Tool string

// The tools with conditions of their own. Every other instrument is NoTool.
const (
	NoTool          Tool = ""
	ToolScope       Tool = "scope"             // hold point 4: the probe's reference
	ToolInjection   Tool = "injection"         // hold point 4: current from a limited supply
	ToolInsulation  Tool = "insulation-tester" // hold point 3: only with the electronics disconnected
	ToolDoublePulse Tool = "double-pulse"      // hold point 3: behind a shield; 4: read with a scope
)

// Tools lists every tool with conditions of its own.
func Tools() []Tool { return []Tool{ToolScope, ToolInjection, ToolInsulation, ToolDoublePulse} }

// Work is one kind of work at the board: the state it needs, and what is put to the board.
type Work struct {
	Need Need
	Tool Tool
}

// Energises tells whether a reading of this work puts energy into the board. The insulation tester does: what it has
// charged stays charged (judgement).
func (w Work) Energises() bool { return w.Need.Powered() || w.Tool == ToolInsulation }

// Evidence is what a rule base reads out of the observations of a case for the hold points. The zero Evidence proves
// nothing: no powered step is given on it.
type Evidence struct {
	Powered []time.Time // when a test put energy into the board; a zero time speaks against everything
	Statics []Static    // for every position of the board, every static test it has to pass
	Failing []Static    // other dead tests whose newest reading after the rebuild, at its place, speaks for a fault
	Mended  []Mended    // those that a newer good reading of the same place has answered
}

// Static is one static test of one position, as it stands after the rebuild; among Failing, one reading of a dead test.
type Static struct {
	Test, Title, Position string // Position: "" for the board as a whole
	Part                  string // the part that was read by itself; "" for a position or the board
	Lifted                bool   // the part was read with a lead lifted
	Passed                bool
	At                    time.Time // of the newest reading it rests on; zero without one
	Because               string    // why it is not passed, in words; "" when it is
}

// Mended is a reading that spoke for a fault, and when a good one of the same place followed. The good one counts once
// its time has come: until then the first one stands.
type Mended struct {
	Static
	Good time.Time
}

// NamedWork is one kind of work with its name in plain words.
type NamedWork struct {
	Work  Work
	Title string // "ohms, diode, capacitance"
}

// Works lists every kind of work that has conditions, in the order of the job.
func Works() []NamedWork {
	return []NamedWork{
		{Work{NeedQuestion, NoTool}, "asking and looking"},
		{Work{NeedDeadCheck, NoTool}, "dead checks"},
		{Work{NeedDischarge, NoTool}, "discharging"},
		{Work{NeedDead, NoTool}, "ohms, diode, capacitance, ESR"},
		{Work{NeedDead, ToolInjection}, "injected current, board dead"},
		{Work{NeedDead, ToolInsulation}, "insulation tester"},
		{Work{NeedControlPower, NoTool}, "control power, bus disconnected"},
		{Work{NeedControlPower, ToolScope}, "scope on control power"},
		{Work{NeedControlPower, ToolInjection}, "injected current on control power"},
		{Work{NeedLowBus, NoTool}, "current-limited bus"},
		{Work{NeedLowBus, ToolScope}, "scope on a current-limited bus"},
		{Work{NeedLowBus, ToolInjection}, "injected current on a current-limited bus"},
		{Work{NeedLowBus, ToolDoublePulse}, "double pulse on a current-limited bus"},
		{Work{NeedFull, NoTool}, "full bus"},
		{Work{NeedFull, ToolScope}, "scope on the full bus"},
		{Work{NeedFull, ToolDoublePulse}, "double pulse on the full bus"},
	}
}
