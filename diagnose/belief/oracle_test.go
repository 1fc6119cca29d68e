package belief

import (
	"encoding/json"
	"math"
	"os"
	"slices"
	"testing"
)

// mapping says how the engine holds a published network: which nodes become the hypotheses (all their states), which
// leaf is no noisy-OR and enters as a finding at its only event parent; every other node is an event.
type mapping struct {
	network    string
	hypotheses []string
	finding    string
	why        string
	digits     int // decimals printed in the file
}

// A node that is an event or part of a hypothesis has its posterior read off one run. What cannot be held so is
// listed with the reason, and its posterior is then taken as P(evidence, node) / P(evidence) from two runs; no
// posterior of the file is left out.
var mappings = []mapping{
	{network: "asia", hypotheses: []string{"asia", "smoke", "bronc"}, finding: "dysp", digits: 8,
		why: "dysp given bronc and either is 0.9 where a noisy-OR would give 0.933, so it cannot be an event; as a finding at either its likelihood differs by hypothesis"},
	{network: "sprinkler", hypotheses: []string{"C"}, digits: 8, why: "W is a noisy-OR of S and R without leak"},
	{network: "burglary_alarm", hypotheses: []string{"B", "E"}, digits: 8, why: "A is no noisy-OR of B and E, but both are roots and so become hypotheses"},
}

// cpt is a probability table: one number, or one for each state of the parents.
type cpt []struct {
	When map[string]int `json:"when"`
	P    float64        `json:"p"`
}

func (c *cpt) UnmarshalJSON(data []byte) error {
	var p float64
	if json.Unmarshal(data, &p) == nil {
		*c = make(cpt, 1)
		(*c)[0].P = p
		return nil
	}
	type plain cpt
	return json.Unmarshal(data, (*plain)(c))
}

type node struct {
	ID      string   `json:"id"`
	Parents []string `json:"parents"`
	Table   cpt      `json:"p_true"`
}

func (n node) p(state map[string]int) float64 {
	for _, row := range n.Table {
		fits := true
		for parent, s := range row.When {
			fits = fits && state[parent] == s
		}
		if fits {
			return row.P
		}
	}
	return math.NaN()
}

type published struct {
	Nodes []node `json:"nodes"`
	Cases []struct {
		Evidence  map[string]int     `json:"evidence"`
		PEvidence float64            `json:"p_evidence"`
		Posterior map[string]float64 `json:"posterior_true"`
	} `json:"cases"`
}

func readOracles(t *testing.T) map[string]json.RawMessage {
	t.Helper()
	data, err := os.ReadFile("../../testdata/published/bayes-oracles.json")
	if err != nil {
		t.Fatal(err)
	}
	var all map[string]json.RawMessage
	if err := json.Unmarshal(data, &all); err != nil {
		t.Fatal(err)
	}
	return all
}

func decode(t *testing.T, raw json.RawMessage, into any) {
	t.Helper()
	if err := json.Unmarshal(raw, into); err != nil {
		t.Fatal(err)
	}
}

// held is a published network in the engine's terms.
type held struct {
	mapping
	nodes  map[string]node
	states []map[string]int // by hypothesis: the states of its nodes
	event  map[string]int
	model  *Model
}

func hold(t *testing.T, m mapping, nodes []node) *held {
	t.Helper()
	h := &held{mapping: m, nodes: map[string]node{}, states: []map[string]int{{}}, event: map[string]int{}}
	var events []Event
	var eventNodes []node
	weights := []float64{1}
	for _, n := range nodes {
		h.nodes[n.ID] = n
		switch {
		case n.ID == m.finding:
		case slices.Contains(m.hypotheses, n.ID):
			h.states, weights = branch(h.states, weights, n)
		default:
			h.event[n.ID] = len(events)
			events = append(events, Event{})
			eventNodes = append(eventNodes, n)
		}
	}
	hyps := make([]Hypothesis, len(h.states))
	for k, state := range h.states {
		hyps[k].Weight = weights[k]
		for e, n := range eventNodes {
			leak, parents := h.noisyOr(t, n, state)
			hyps[k].Triggers = append(hyps[k].Triggers, Trigger{e, leak})
			events[e].Parents = parents
		}
	}
	var err error
	if h.model, err = New(events, hyps); err != nil {
		t.Fatal(err)
	}
	return h
}

// branch splits every hypothesis by the state of one more node.
func branch(states []map[string]int, weights []float64, n node) ([]map[string]int, []float64) {
	var made []map[string]int
	var w []float64
	for k, state := range states {
		p := n.p(state)
		for s, share := range []float64{1 - p, p} {
			next := map[string]int{n.ID: s}
			for id, v := range state {
				next[id] = v
			}
			made, w = append(made, next), append(w, weights[k]*share)
		}
	}
	return made, w
}

// noisyOr reads leak and links off a table under one hypothesis, and insists that they give the whole table.
func (h *held) noisyOr(t *testing.T, n node, state map[string]int) (float64, []Parent) {
	t.Helper()
	var ids []string
	for _, p := range n.Parents {
		if _, ok := h.event[p]; ok {
			ids = append(ids, p)
		}
	}
	at := func(bits int) float64 {
		full := map[string]int{}
		for id, v := range state {
			full[id] = v
		}
		for k, id := range ids {
			full[id] = bits >> k & 1
		}
		return n.p(full)
	}
	leak := at(0)
	var parents []Parent
	for k, id := range ids {
		parents = append(parents, Parent{h.event[id], 1 - (1-at(1<<k))/(1-leak)})
	}
	for bits := 0; bits < 1<<len(ids); bits++ {
		absent := 1 - leak
		for k, p := range parents {
			if bits>>k&1 == 1 {
				absent *= 1 - p.P
			}
		}
		if math.Abs(1-absent-at(bits)) > 1e-12 {
			t.Fatalf("%s: %s is no noisy-OR: %v for states %b, table says %v", h.network, n.ID, 1-absent, bits, at(bits))
		}
	}
	return leak, parents
}

// observe turns a node's state into evidence.
func (h *held) observe(id string, state int) Evidence {
	if e, ok := h.event[id]; ok {
		return Evidence{Event: e, Absent: []float64{float64(1 - state)}, Present: []float64{float64(state)}}
	}
	ev := Evidence{Event: -1}
	n := h.nodes[id]
	for _, s := range h.states {
		if id != h.finding {
			ev.Present = append(ev.Present, sureIf(s[id] == state))
			continue
		}
		ev.Event = h.event[h.eventParent(n)]
		ev.Absent = append(ev.Absent, sideOf(n, s, h.eventParent(n), 0, state))
		ev.Present = append(ev.Present, sideOf(n, s, h.eventParent(n), 1, state))
	}
	return ev
}

func (h *held) eventParent(n node) string {
	for _, p := range n.Parents {
		if _, ok := h.event[p]; ok {
			return p
		}
	}
	return ""
}

func sideOf(n node, hypothesis map[string]int, parent string, parentState, state int) float64 {
	full := map[string]int{parent: parentState}
	for id, v := range hypothesis {
		full[id] = v
	}
	if state == 1 {
		return n.p(full)
	}
	return 1 - n.p(full)
}

func sureIf(yes bool) float64 {
	if yes {
		return 1
	}
	return 0
}

// probability gives P(evidence) over all hypotheses.
func (h *held) probability(t *testing.T, ev []Evidence) float64 {
	t.Helper()
	up, err := h.model.Infer(ev)
	if err != nil {
		t.Fatal(err)
	}
	sum := 0.0
	for k, l := range up.LogLikelihood {
		sum += h.model.hyps[k].Weight * math.Exp(l)
	}
	return sum
}

// posterior gives P(node | evidence) by the way the mapping allows.
func (h *held) posterior(t *testing.T, id string, ev []Evidence) float64 {
	t.Helper()
	if id == h.finding {
		with := append(append([]Evidence(nil), ev...), h.observe(id, 1))
		return h.probability(t, with) / h.probability(t, ev)
	}
	up, joint, err := h.model.Joint(ev)
	if err != nil {
		t.Fatal(err)
	}
	sum := 0.0
	for k, p := range up.Posterior {
		if e, ok := h.event[id]; ok {
			sum += p * joint[k][e]
		} else {
			sum += p * float64(h.states[k][id])
		}
	}
	return sum
}

// TestPublishedNetworks holds the engine against every posterior of the published networks, to the printed digits.
func TestPublishedNetworks(t *testing.T) {
	oracles := readOracles(t)
	for _, m := range mappings {
		var net published
		decode(t, oracles[m.network], &net)
		h := hold(t, m, net.Nodes)
		for k, c := range net.Cases {
			var ev []Evidence
			for _, n := range net.Nodes {
				if s, ok := c.Evidence[n.ID]; ok {
					ev = append(ev, h.observe(n.ID, s))
				}
			}
			checkPrinted(t, m, k, "the evidence", h.probability(t, ev), c.PEvidence, 10)
			if len(c.Posterior)+len(c.Evidence) != len(net.Nodes) {
				t.Errorf("%s case %d: %d posteriors and %d findings for %d nodes", m.network, k, len(c.Posterior), len(c.Evidence), len(net.Nodes))
			}
			for id, want := range c.Posterior {
				checkPrinted(t, m, k, id, h.posterior(t, id, ev), want, m.digits)
			}
		}
	}
}

func checkPrinted(t *testing.T, m mapping, k int, what string, got, want float64, digits int) {
	t.Helper()
	if !(math.Abs(got-want) <= 0.5001*math.Pow(10, -float64(digits))) {
		t.Errorf("%s case %d: P(%s) is %.12g, published %.12g (%s)", m.network, k, what, got, want, m.why)
	}
}
