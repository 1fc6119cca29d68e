// Package knowledge is the rule base: causes, stresses, faults, signs, tests, repairs, cautions and sources as
// YAML files that a technician can read, with their loader and checks. It computes nothing.
package knowledge

import "drivemend/measure/quantity"

// Band is a belief about a probability (0 to 1) or a share (0 and up): 10, 50 and 90 %, Low <= Mid <= High.
// A single number in the file gives three equal values, which a draw leaves alone.
type Band struct {
	Low, Mid, High float64
	Grade          string // one of Grades: judgement, read, second-hand, memory, computed
	Source         string // id of sources.yaml; "" for a judgement
}

// Link is a causal link to an event: the probability that the parent alone brings it about.
type Link struct {
	To   string
	P    Band
	Line int
}

// Condition limits an entry to boards: a board path with allowed words, or a comparison with a number.
// A path the case does not state counts as fulfilled.
type Condition struct {
	Path   string        // board path without the leading "board.", or positions.parallel
	Words  []string      // any of
	Op     string        // >=, <=, >, <, =, "" for words
	Number float64       // SI value
	Unit   quantity.Unit // as written; "" for a bare number
}

// Base is a loaded rule base. Slices keep file order, which decides ties everywhere.
type Base struct {
	Causes   []Cause
	Unlisted map[string]Band // shares of the entry "unlisted" by setting
	Events   []Event         // stresses, then faults, then signs; a parent always before its children
	Tests    []Test
	Repairs  []Repair
	Cautions []Caution
	Sources  []Source
	Hash     string // of the loaded bytes, hex; seeds every draw
}

// Cause is what let it happen.
type Cause struct {
	ID, Title string
	Role      string // latent, trigger, sufficient
	Applies   []Condition
	Share     map[string]Band    // by setting: dc, mains, repeat and, where it differs from the usual rule, new
	Factors   map[string]float64 // on the share, by service: early, aged; a missing one is 1
	LeadsTo   []Link
	Answers   map[string]map[string]Band // nominal test -> result -> P(result | cause)
	Repair    string
	Note      string
	File      string // the file the entry came from, as messages name it
	Line      int
	missing   []string // keys worth having that the entry does not give; Check reports them
}

// Layer tells what kind of event an Event is.
type Layer string

// The layers of events.
const (
	Stress Layer = "stress"
	Fault  Layer = "fault"
	Sign   Layer = "sign"
)

// Event is a stress, a fault or a sign: a noisy-OR of its parents and a leak.
type Event struct {
	ID, Title string
	Layer     Layer
	Of        string // "switch" when the fault sits in one or more of the parts; else ""
	Leak      Band
	LeadsTo   []Link
	Applies   []Condition
	Repair    string // for a fault: what mends it
	Note      string
	File      string
	Line      int
	missing   []string
}

// Result is one outcome of a test.
type Result struct {
	ID       string
	Means    string  // plain words
	Median   float64 // of a log-normal reading, SI; 0 for a named result
	Expected string  // full name of an expected value instead of Median, out of Expected()
	Times    float64 // one sigma as a factor, > 1
}

// Test is anything that can be observed. Exactly one of Observes, Pattern and Nominal is used.
type Test struct {
	ID, Title, Ask, How string
	Observes            string          // event id
	PatternOf           string          // a part test: this one names the pattern of its dead parts
	Nominal             map[string]Band // default row over the causes
	Silent              []string
	Present, Absent     map[string]Band // rows for Observes
	Per                 string          // part, position, "" for the board
	Unit                quantity.Unit   // "" for named results only
	Results             []Result        // in file order
	Computed            string          // full name of a computed figure out of Computed(), "" when observed
	ReplacedBy          string          // the observing test that takes this one's place when answered
	AnsweredBy          *AnsweredBy
	UsedIn              string  // "prior": already in the share, never votes
	Needs               string  // question, dead, control-power, low-bus, full
	Minutes             float64 // 0 only for a computed test
	Instrument          string  // out of Instruments()
	Group               string
	Must                bool        // a check that stands until done
	Static              []string    // results that pass: one of the tests every position passes before power; nil for others
	StaticOn            []Condition // the boards it counts on as a static test; every board it applies to when empty
	Applies             []Condition
	Cautions            []string
	File                string
	Line                int
	missing             []string
}

// AnsweredBy maps the words of a board key to results. A word without a result leaves the test to be asked.
type AnsweredBy struct {
	Path    string // board path without the leading "board."
	Results map[string]string
}

// Repair removes causes.
type Repair struct {
	ID, Title string
	Minutes   float64
	Parts     []string
	Steps     []string
	File      string
	Line      int
}

// Caution is a warning with the condition it stands under.
type Caution struct {
	ID, Text, When, Source string
	File                   string
	Line                   int
}

// Source is where a number was read.
type Source struct {
	ID, Title, Where, Read string
	File                   string
	Line                   int
}
