// Package diagnose joins a case with the rule base: it keeps what applies to this board, weighs the rival
// explanations, turns observations into evidence, ranks faults, stresses and causes, and values the next test.
// Every call is a pure function of its arguments.
package diagnose

import (
	"fmt"
	"sync"

	"drivemend/diagnose/belief"
	"drivemend/knowledge"
	"drivemend/measure"
)

const (
	twoCauses     = 0.12 // prior probability that two causes acted together; band 0.05 to 0.25, judgement
	matchedPair   = 3.0  // weight of a pair of one latent cause and one trigger against any other pair, judgement
	earlyHours    = 100.0
	agedHours     = 25000.0 // five years of service counted in hours of running, judgement
	secondsInHour = 3600.0
	mostParts     = 500 // beyond, the number of sets of parts leaves the range of numbers
)

// hypothesis is one rival explanation: one cause, two causes, or a cause that is not listed.
type hypothesis struct {
	causes   []int // indices into view.causes; empty for the unlisted cause
	weight   float64
	unlisted bool
}

func (h hypothesis) has(cause int) bool {
	for _, c := range h.causes {
		if c == cause {
			return true
		}
	}
	return false
}

// view is the rule base as this board sees it.
type view struct {
	base    *knowledge.Base
	board   measure.Board
	setting string

	causes []*knowledge.Cause // those that apply and have a share, in base order
	shares []float64
	hyps   []hypothesis

	events  []*knowledge.Event // those that apply, parents first
	eventAt map[string]int
	tests   []*knowledge.Test // those that apply, in base order
	testAt  map[string]int

	model *belief.Model
	rates func() []float64 // base rate of each event

	parts layout
	rows  map[string]*rowSet // nominal and pattern rows by test id, filled when first needed
	even  *rowSet            // of a fault of parts without a pattern test, filled when first needed
}

// newView restricts the base to a board and compiles the network of its events.
func newView(base *knowledge.Base, board measure.Board) (*view, error) {
	v := &view{base: base, board: board, setting: setting(board), eventAt: map[string]int{}, testAt: map[string]int{}, rows: map[string]*rowSet{}}
	v.parts = newLayout(board.Positions())
	v.keepCauses()
	v.keepEvents()
	v.keepTests()
	if len(v.causes) == 0 {
		return nil, fmt.Errorf("no cause of the rule base applies to this board: check topology, supply and history of the board, and the shares for %s in causes.yaml", v.setting)
	}
	if n := len(v.parts.parts); n > mostParts {
		return nil, fmt.Errorf("the board has %d switches; at most %d can be ranked", n, mostParts)
	}
	v.hyps = weigh(v.causes, v.shares, v.unlistedShare())
	if err := v.compile(); err != nil {
		return nil, err
	}
	return v, nil
}

// setting names the column of shares: a repeat failure outweighs the supply, a board that never worked is new.
func setting(b measure.Board) string {
	switch history, _ := b.Word("history"); history {
	case "failed-after-repair":
		return "repeat"
	case "never-worked":
		return "new"
	}
	return supplySetting(b)
}

func supplySetting(b measure.Board) string {
	switch supply, _ := b.Word("supply"); supply {
	case "battery", "bench-supply":
		return "dc"
	}
	return "mains"
}

func (v *view) lookup(path string) (word string, number float64, known bool) {
	if q, ok := v.board.Quantity(path); ok {
		return "", q.Value, true
	}
	w, ok := v.board.Word(path)
	return w, 0, ok && w != "unknown"
}

func (v *view) applies(conditions []knowledge.Condition) bool {
	for _, c := range conditions {
		if !c.Holds(v.lookup) {
			return false
		}
	}
	return true
}

func (v *view) keepCauses() {
	for i := range v.base.Causes {
		c := &v.base.Causes[i]
		if s := v.share(c); s > 0 && v.applies(c.Applies) {
			v.causes, v.shares = append(v.causes, c), append(v.shares, s)
		}
	}
}

// share is a cause's weight in this setting. A board that never worked takes the cause's own "new" share, else the
// share of its supply times the factor for boards under 100 hours; long service has a factor too.
func (v *view) share(c *knowledge.Cause) float64 {
	if b, ok := c.Share[v.setting]; ok {
		return b.Mid * v.serviceFactor(c)
	}
	if v.setting == "new" {
		return c.Share[supplySetting(v.board)].Mid * factor(c, "early")
	}
	return 0
}

func (v *view) serviceFactor(c *knowledge.Cause) float64 {
	service, ok := v.board.Quantity("service")
	switch hours := service.Value / secondsInHour; {
	case !ok || v.setting == "new":
		return 1
	case hours < earlyHours:
		return factor(c, "early")
	case hours > agedHours:
		return factor(c, "aged")
	}
	return 1
}

func factor(c *knowledge.Cause, name string) float64 {
	if f, ok := c.Factors[name]; ok {
		return f
	}
	return 1
}

func (v *view) unlistedShare() float64 {
	if b, ok := v.base.Unlisted[v.setting]; ok {
		return b.Mid
	}
	return v.base.Unlisted[supplySetting(v.board)].Mid
}

func (v *view) keepEvents() {
	for i := range v.base.Events {
		e := &v.base.Events[i]
		if v.applies(e.Applies) {
			v.eventAt[e.ID] = len(v.events)
			v.events = append(v.events, e)
		}
	}
}

func (v *view) keepTests() {
	for i := range v.base.Tests {
		t := &v.base.Tests[i]
		if !v.applies(t.Applies) {
			continue
		}
		if event := v.observed(t); event != "" {
			if _, ok := v.eventAt[event]; !ok {
				continue
			}
		}
		v.testAt[t.ID] = len(v.tests)
		v.tests = append(v.tests, t)
	}
}

// observed is the event a test looks at, "" for one that bears on the causes themselves.
func (v *view) observed(t *knowledge.Test) string {
	if t.PatternOf != "" {
		return v.base.Test(t.PatternOf).Observes
	}
	return t.Observes
}

func (v *view) test(id string) *knowledge.Test {
	if i, ok := v.testAt[id]; ok {
		return v.tests[i]
	}
	return nil
}

// weigh gives the prior weights of one cause, two causes and none of the list.
func weigh(causes []*knowledge.Cause, shares []float64, unlisted float64) []hypothesis {
	q, sum := twoCauses, 0.0
	for _, s := range shares {
		sum += s
	}
	if len(causes) < 2 {
		q = 0
	}
	n := len(causes)
	hyps, each := make([]hypothesis, 0, 1+n*(n+1)/2), countUp(n)
	for i, s := range shares {
		hyps = append(hyps, hypothesis{causes: each[i : i+1 : i+1], weight: (1 - q) * s / (sum + unlisted)})
	}
	if n > 1 {
		hyps = pairs(hyps, causes, shares, q)
	}
	return append(hyps, hypothesis{unlisted: true, weight: (1 - q) * unlisted / (sum + unlisted)})
}

func countUp(n int) []int {
	out := make([]int, n)
	for i := range out {
		out[i] = i
	}
	return out
}

// pairs appends every two causes; their indices share one backing array.
func pairs(hyps []hypothesis, causes []*knowledge.Cause, shares []float64, q float64) []hypothesis {
	n, total, start := len(causes), 0.0, len(hyps)
	both := make([]int, 0, n*(n-1))
	for i := range causes {
		for j := i + 1; j < n; j++ {
			w := shares[i] * shares[j]
			if latentWithTrigger(causes[i].Role, causes[j].Role) {
				w *= matchedPair
			}
			total += w
			both = append(both, i, j)
			hyps = append(hyps, hypothesis{causes: both[len(both)-2 : len(both) : len(both)], weight: w})
		}
	}
	for i := start; i < len(hyps); i++ {
		hyps[i].weight *= q / total
	}
	return hyps
}

func latentWithTrigger(a, b string) bool {
	return a == "latent" && b == "trigger" || a == "trigger" && b == "latent"
}

// compile hands events and hypotheses to the inference engine.
func (v *view) compile() error {
	events := make([]belief.Event, len(v.events))
	for i, e := range v.events {
		events[i].Leak = e.Leak.Mid
		for _, l := range e.LeadsTo {
			if to, ok := v.eventAt[l.To]; ok {
				events[to].Parents = append(events[to].Parents, belief.Parent{Event: i, P: l.P.Mid})
			}
		}
	}
	hyps := v.compileHypotheses()
	var err error
	if v.model, err = belief.New(events, hyps); err == nil {
		v.rates = sync.OnceValue(v.model.BaseRates)
		go v.rates() // they are there, or nearly, when first asked for
	}
	return err
}

// compileHypotheses gives each hypothesis the links of its causes, all in one backing array.
func (v *view) compileHypotheses() []belief.Hypothesis {
	byCause, size := make([][]belief.Trigger, len(v.causes)), 0
	for i, c := range v.causes {
		for _, l := range c.LeadsTo {
			if to, ok := v.eventAt[l.To]; ok {
				byCause[i] = append(byCause[i], belief.Trigger{Event: to, P: l.P.Mid})
			}
		}
		size += len(byCause[i]) * len(v.causes) // once alone and once with each other cause
	}
	hyps, all := make([]belief.Hypothesis, len(v.hyps)), make([]belief.Trigger, 0, size)
	for i, h := range v.hyps {
		start := len(all)
		for _, c := range h.causes {
			all = append(all, byCause[c]...)
		}
		hyps[i] = belief.Hypothesis{Weight: h.weight, Free: h.unlisted, Triggers: all[start:len(all):len(all)]}
	}
	return hyps
}
