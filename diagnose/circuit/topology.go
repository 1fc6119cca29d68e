package circuit

import (
	"fmt"
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
	room   *room
}

// newTree classes the branches for a pattern of conducting diodes. With leaky, every blocking diode leaks.
func newTree(c *Circuit, p pattern, space *room) (*tree, error) {
	t := &tree{c: c, room: space, class: make([]class, len(c.branches)), ohm: space.take(len(c.branches)), inTree: make([]bool, len(c.branches))}
	for i := range c.branches {
		t.class[i], t.ohm[i] = classify(&c.branches[i], p.on)
		if p.leaky && c.branches[i].kind == diode && t.class[i] == open {
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
	t.room.part = t.room.part[:0]
	for i := range t.c.nodes {
		t.room.part = append(t.room.part, i)
	}
	part := t.room.part
	clear(t.inTree)
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
	list := t.room.list[:0]
	for i, k := range t.class {
		if k != want {
			continue
		}
		at := len(list)
		list = append(list, i)
		for ; want == lossy && at > 0 && t.ohm[list[at-1]] > t.ohm[i]; at-- {
			list[at] = list[at-1]
		}
		list[at] = i
	}
	t.room.list = list
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
	t.up = t.room.ints.take(len(t.c.nodes))
	for n := range t.up {
		t.up[n] = -1
	}
	t.order = append(t.room.ints.take(len(t.c.nodes))[:0], 0)
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
	t.loop, t.cut = t.room.lists.take(len(t.class)), t.room.lists.take(len(t.class))
	all := t.room.terms.take(4 * len(t.class))[:0]
	size := t.room.ints.take(len(t.class)) // of the cuts
	for i := range t.c.branches {
		if t.inTree[i] || t.class[i] == open {
			continue
		}
		from := len(all)
		all = t.path(all, t.c.branches[i].a, t.c.branches[i].b)
		t.loop[i] = all[from:len(all):len(all)]
		for _, m := range t.loop[i] {
			size[m.branch]++
		}
	}
	space := t.room.terms.take(len(all))
	for k, n := range size {
		t.cut[k], space = space[:0:n], space[n:]
	}
	for i := range t.c.branches {
		for _, m := range t.loop[i] {
			t.cut[m.branch] = append(t.cut[m.branch], term{i, m.sign})
		}
	}
}

// path appends the tree branches whose voltages add up to v(a)-v(b).
func (t *tree) path(list []term, a, b int) []term {
	rise, fall := t.climb(t.room.rise[:0], a, 1), t.climb(t.room.fall[:0], b, -1)
	t.room.rise, t.room.fall = rise, fall
	for len(rise) > 0 && len(fall) > 0 && rise[len(rise)-1].branch == fall[len(fall)-1].branch {
		rise, fall = rise[:len(rise)-1], fall[:len(fall)-1]
	}
	return append(append(list, rise...), fall...)
}

// climb appends the branches from node n to the root, signed so that they add up to sign·v(n).
func (t *tree) climb(list []term, n int, sign float64) []term {
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
