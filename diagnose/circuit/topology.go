package circuit

import (
	"fmt"
	"sort"
	"strings"
)

// class is the part a branch plays in one diode pattern.
type class int

const (
	fixed  class = iota // voltage known: source, wire, conducting diode without resistance
	store               // capacitor
	lossy               // resistor, conducting diode with resistance, leakage
	choke               // inductor
	forced              // current source
	open                // blocking diode, capacitor of zero farad
)

// leakage is the resistance put across a blocking diode where, without it, a part of the circuit would be tied to
// nothing and its voltage would be undefined (1 nS). Everywhere else a blocking diode is an open circuit.
const leakage = 1e9

// leastOhm is the least resistance a diode has; below, it counts as zero. It also stands in for a diode of zero ohm
// that closes a loop of voltage sources.
const leastOhm = 1e-6

// term is one signed member of a loop or cut.
type term struct {
	branch int
	sign   float64
}

// tree is a proper tree of one diode pattern: sources first, then capacitors, resistors, inductors. Capacitors left
// out of it depend on others (capacitor loops), inductors taken into it likewise (inductor cut sets).
type tree struct {
	c      *Circuit
	class  []class
	ohm    []float64 // of lossy branches
	inTree []bool
	loop   [][]term // of a link: v(link) = Σ sign·v(tree branch)
	cut    [][]term // of a tree branch: i(tree branch) = -Σ sign·i(link)
	up     []int    // per node: tree branch towards node 0, -1 at the root
	order  []int    // nodes from the root outwards
}

// newTree classes the branches for a pattern of conducting diodes. With leaky, every blocking diode leaks.
func newTree(c *Circuit, on uint64, leaky bool) (*tree, error) {
	t := &tree{c: c, class: make([]class, len(c.branches)), ohm: make([]float64, len(c.branches))}
	for i := range c.branches {
		t.class[i], t.ohm[i] = classify(&c.branches[i], on)
		if leaky && c.branches[i].kind == diode && t.class[i] == open {
			t.class[i], t.ohm[i] = lossy, leakage
		}
	}
	part, err := t.grow()
	if err != nil {
		return nil, err
	}
	if t.leak(part) {
		if part, err = t.grow(); err != nil {
			return nil, err
		}
	}
	if err := t.whole(part); err != nil {
		return nil, err
	}
	t.root()
	t.links()
	return t, nil
}

func classify(b *branch, on uint64) (class, float64) {
	switch b.kind {
	case voltageSource:
		return fixed, 0
	case currentSource:
		return forced, 0
	case capacitor:
		if b.value == 0 {
			return open, 0
		}
		return store, 0
	case inductor:
		if b.value == 0 {
			return fixed, 0
		}
		return choke, 0
	case diode:
		if on>>uint(b.index)&1 == 0 {
			return open, 0
		}
		if b.value < leastOhm {
			return fixed, 0
		}
	}
	if b.value == 0 {
		return fixed, 0
	}
	return lossy, b.value
}

// parts is a union-find over the nodes.
type parts []int

func (p parts) find(n int) int {
	for p[n] != n {
		p[n] = p[p[n]]
		n = p[n]
	}
	return n
}

// join ties two nodes together and tells whether they were apart.
func (p parts) join(a, b int) bool {
	a, b = p.find(a), p.find(b)
	p[a] = b
	return a != b
}

// grow chooses the tree branches: fixed, store, lossy (low resistance first), choke.
func (t *tree) grow() (parts, error) {
	part := make(parts, len(t.c.nodes))
	for i := range part {
		part[i] = i
	}
	t.inTree = make([]bool, len(t.class))
	if err := t.growFixed(part); err != nil {
		return nil, err
	}
	for _, want := range []class{store, lossy, choke} {
		for _, i := range t.members(want) {
			t.inTree[i] = part.join(t.c.branches[i].a, t.c.branches[i].b)
		}
	}
	return part, nil
}

// growFixed takes all voltage sources and wires, then the diodes without resistance.
func (t *tree) growFixed(part parts) error {
	for _, diodes := range []bool{false, true} {
		for i := range t.c.branches {
			b := &t.c.branches[i]
			if t.class[i] != fixed || (b.kind == diode) != diodes {
				continue
			}
			t.inTree[i] = part.join(b.a, b.b)
			if t.inTree[i] {
				continue
			}
			if !diodes {
				return fmt.Errorf("circuit: %s %q closes a loop of voltage sources and wires; put a resistance into the loop", kindName[b.kind], b.name)
			}
			t.class[i], t.ohm[i] = lossy, leastOhm
		}
	}
	return nil
}

// members lists the branches of a class, resistors from low to high.
func (t *tree) members(want class) []int {
	var list []int
	for i, k := range t.class {
		if k == want {
			list = append(list, i)
		}
	}
	if want == lossy {
		sort.SliceStable(list, func(a, b int) bool { return t.ohm[list[a]] < t.ohm[list[b]] })
	}
	return list
}

// leak turns blocking diodes between parts that float against each other into leakages; false if there are none.
func (t *tree) leak(part parts) bool {
	found := false
	for i := range t.c.branches {
		b := &t.c.branches[i]
		if b.kind == diode && t.class[i] == open && part.find(b.a) != part.find(b.b) {
			t.class[i], t.ohm[i] = lossy, leakage
			found = true
		}
	}
	return found
}

// whole checks that every node is tied to the reference.
func (t *tree) whole(part parts) error {
	for n := range part {
		if part.find(n) == part.find(0) {
			continue
		}
		for i := range t.c.branches {
			b := &t.c.branches[i]
			if t.class[i] == forced && part.find(b.a) != part.find(b.b) && (part.find(b.a) == part.find(n) || part.find(b.b) == part.find(n)) {
				return fmt.Errorf("circuit: current source %q drives node %q, which has no way back; add a resistor, capacitor or diode there", b.name, t.c.nodes[n])
			}
		}
		return fmt.Errorf("circuit: node %q has no connection to the reference node 0; tie it with a resistor", t.c.nodes[n])
	}
	return nil
}

// root orders the nodes outwards from node 0 and notes each node's tree branch towards it.
func (t *tree) root() {
	t.up = make([]int, len(t.c.nodes))
	for n := range t.up {
		t.up[n] = -1
	}
	t.order = append(t.order[:0], 0)
	for k := 0; k < len(t.order); k++ {
		n := t.order[k]
		for i := range t.c.branches {
			b := &t.c.branches[i]
			if !t.inTree[i] || i == t.up[n] || (b.a != n && b.b != n) {
				continue
			}
			far := b.a + b.b - n
			t.up[far] = i
			t.order = append(t.order, far)
		}
	}
}

// links finds the loop every link closes in the tree, and from the loops the cuts.
func (t *tree) links() {
	t.loop = make([][]term, len(t.class))
	t.cut = make([][]term, len(t.class))
	for i := range t.c.branches {
		if t.inTree[i] || t.class[i] == open {
			continue
		}
		t.loop[i] = t.path(t.c.branches[i].a, t.c.branches[i].b)
		for _, m := range t.loop[i] {
			t.cut[m.branch] = append(t.cut[m.branch], term{i, m.sign})
		}
	}
}

// path lists the tree branches whose voltages add up to v(a)-v(b).
func (t *tree) path(a, b int) []term {
	var rise, fall []term
	rise, fall = t.climb(a, 1), t.climb(b, -1)
	for len(rise) > 0 && len(fall) > 0 && rise[len(rise)-1].branch == fall[len(fall)-1].branch {
		rise, fall = rise[:len(rise)-1], fall[:len(fall)-1]
	}
	return append(rise, fall...)
}

// climb lists the branches from node n to the root, signed so that they add up to sign·v(n).
func (t *tree) climb(n int, sign float64) []term {
	var list []term
	for t.up[n] >= 0 {
		b := &t.c.branches[t.up[n]]
		s := sign
		if b.b == n {
			s = -sign
		}
		list = append(list, term{t.up[n], s})
		n = b.a + b.b - n
	}
	return list
}

// names joins the names of branches for a message.
func (t *tree) names(list []term) string {
	var names []string
	for _, m := range list {
		names = append(names, t.c.branches[m.branch].name)
	}
	return strings.Join(names, ", ")
}
