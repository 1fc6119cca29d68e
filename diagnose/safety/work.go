package safety

import "time"

// Tool is what is put to the board beside the state it is in; some tools have conditions of their own.
type Tool string

// The tools with conditions of their own. Every other instrument is NoTool.
const (
	NoTool          Tool = ""
	ToolScope       Tool = "scope"             // hold point 4: the probe's reference
	ToolInjection   Tool = "injection"         // hold point 4: current through a shorted bank
	ToolInsulation  Tool = "insulation-tester" // hold point 3: only with the electronics disconnected
	ToolDoublePulse Tool = "double-pulse"      // hold point 3: behind a shield
)

// Tools lists every tool with conditions of its own.
func Tools() []Tool { return []Tool{ToolScope, ToolInjection, ToolInsulation, ToolDoublePulse} }

// Work is one kind of work at the board: the state it needs, and what is put to the board.
type Work struct {
	Need Need
	Tool Tool
}

// Evidence is what a rule base reads out of the observations of a case for the hold points. The zero Evidence proves
// nothing: no powered step is given on it.
type Evidence struct {
	Powered []time.Time // when a test put energy into the board; a zero time speaks against everything
	Statics []Static    // for every position of the board, every static test it has to pass
}

// Static is one static test of one position, as it stands after the rebuild.
type Static struct {
	Test, Title, Position string
	Passed                bool
	At                    time.Time // of the newest reading it rests on; zero without one
	Because               string    // why it is not passed, in words; "" when it is
}
