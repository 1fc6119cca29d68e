// Package measure holds the case record of one failed board: what it is, what was seen and measured, and the
// safety history. Strict YAML in, byte-preserving atomic save out. It knows neither rules nor the clock.
//
// One table of keys decides what a case file may hold; the loader, its hints and whatever describes the keys
// read that table.
package measure

import (
	"time"

	"drivemend/measure/quantity"
)

// Case is one failed board.
type Case struct {
	ID                                         string
	Opened                                     time.Time // a date, at midnight UTC; zero when not stated
	Owner, Technician, Serial, Firmware, Story string
	Source                                     Source
	Board                                      Board
	Safety                                     Safety
	Observations                               []Observation // in file order, superseded ones included
	Locate                                     []Bank
	Captures                                   []Capture
	Rebuild                                    *Rebuild
	BringUp                                    []Stage
	Outcome                                    *Outcome
	Repairs                                    []Repair // before this case
	FaultLog                                   []FaultCode
	Settings                                   []Setting // as found
	Photographs                                []Photograph
	Steps                                      []StepEntry
}

// Source cites where a published case was read.
type Source struct{ Title, Site, Year, Address, Read string }

// Observation is one answer or reading. Exactly one of Result, Reading and Answer is set.
type Observation struct {
	Test           string
	Part, Position string            // as written; "" when not stated
	At             time.Time         // zero when not stated
	Result         string            // a named result of the test
	Reading        *quantity.Reading // what the instrument showed
	Twin           *quantity.Reading // the same reading on a part that should be alike
	Answer         string            // skipped, later
	Seen           string            // on-arrival, at-bench, by-cure; "" is at-bench
	Polarity       string            // forward, reverse, ""
	State          string            // lifted, in-circuit, ""
	Motor          string            // on, off, ""
	Surface        string            // what a camera looked at: matt-dot, tape, moulded, painted, bare-metal, ""
	Instrument     string
	Accuracy       float64 // relative; 0 when not stated
	Range          float64 // top of the instrument's range in the unit of the reading, 0 when not stated
	Note           string
	Line           int // in the file
}

// Safety is the safety history in file order.
type Safety struct {
	Isolation  []Isolation
	DeadChecks []DeadCheck
	Links      []Link
	Energised  []Energised
	Before     []Before
}

// Isolation is one statement that the board is cut off from every source.
type Isolation struct {
	Locked       bool
	Motor        string // unplugged, shaft-locked, connected
	OtherSources string // none, or which are there and off
	At           time.Time
	Line         int
}

// DeadCheck is one voltage reading at a store of energy.
type DeadCheck struct {
	Point       string
	DC, AC      quantity.Quantity // AC has no unit while it was not read: then it proves nothing
	MeterProved bool              // on a known source before and after
	At          time.Time
	Line        int
}

// Link is a shorting link; Removed is zero while it is fitted.
type Link struct {
	Fitted, Removed time.Time
	Line            int
}

// Energised is a moment at which the board had, or may have had, energy put into it.
type Energised struct {
	What string // powered-step, source, shaft
	At   time.Time
	Line int
}

// Bank is what was read to find which of the paralleled parts of a position carries the current.
type Bank struct {
	Position         string
	Current, Voltage quantity.Quantity // of the injection; without unit when not stated
	Feed             string            // the part the current enters at
	Rises            []Rise
	Drops            []Drop
	Line             int
}

// Rise is how much warmer one part became.
type Rise struct {
	Part    string
	Rise    quantity.Quantity
	Surface string // matt-dot, tape, moulded, painted, bare-metal, ""
}

// Drop is a voltage between two parts of a bank.
type Drop struct {
	From, To string
	Drop     quantity.Quantity
}

// Capture is one instrument file and the figures taken from it, by key of the table below captures[].
type Capture struct {
	Name, SHA256, Kind, Position, Edge, Note string
	Bytes                                    int64
	At                                       time.Time
	Figures                                  map[string]quantity.Quantity
	Line                                     int
}

// Stage is one stage of the bring-up; its figures go by key of the table below bring_up[].
type Stage struct {
	Stage, Note string
	At          time.Time
	Figures     map[string]quantity.Quantity
	Line        int
}

// Rebuild is what the technician chose to build; its board keys lie over the board's.
type Rebuild struct {
	Done  time.Time // zero while not done
	Board Board     // the rebuilt board: the found board with the rebuild's keys laid over it
	Keys  []string  // the paths the rebuild states, without "rebuild.", in file order
	Line  int
}

// Outcome is how the case ended.
type Outcome struct {
	Faults, Parts, Causes []string
	Stress, ConfirmedBy   string    // confirmed by: held-30-days, reproduced, plausible
	Closed                time.Time // a date, at midnight UTC; zero when not stated
}

// After tells whether an observation was taken after the rebuild was done. One without a time was not.
func (c *Case) After(o Observation) bool {
	return c.Rebuild != nil && !c.Rebuild.Done.IsZero() && o.At.After(c.Rebuild.Done)
}

// vote is what two observations share when the later one replaces the earlier.
type vote struct {
	test, part, position, polarity, state string
	after                                 bool
}

// voteOf gives the vote of an observation. A part brings its position along, so that naming both is the same as
// naming the part.
func (c *Case) voteOf(o Observation) vote {
	position := o.Position
	if position == "" && o.Part != "" {
		position = c.Board.PositionOf(o.Part)
	}
	if position == "" && o.Part != "" && c.Rebuild != nil {
		position = c.Rebuild.Board.PositionOf(o.Part)
	}
	return vote{o.Test, o.Part, position, o.Polarity, o.State, c.After(o)}
}

// Current gives the observations that count, in file order: of those with the same test, part, position, polarity
// and state the last one; what was observed after the rebuild never replaces what was observed before.
func (c *Case) Current() []Observation {
	var out []Observation
	for i, superseded := range c.superseded() {
		if !superseded {
			out = append(out, c.Observations[i])
		}
	}
	return out
}

// Superseded tells whether a later observation replaces number i (from 0); false out of range.
func (c *Case) Superseded(i int) bool {
	s := c.superseded()
	return i >= 0 && i < len(s) && s[i]
}

// superseded tells for each observation whether a later one replaces it.
func (c *Case) superseded() []bool {
	out := make([]bool, len(c.Observations))
	later := map[vote]bool{}
	for i := len(c.Observations) - 1; i >= 0; i-- {
		v := c.voteOf(c.Observations[i])
		out[i] = later[v]
		later[v] = true
	}
	return out
}
