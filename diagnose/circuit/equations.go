package circuit

import "fmt"

// system holds the equations of one diode pattern. Every quantity is a form: a row of factors on the vector
// y = [states | source values | source slopes | 1].
type system struct {
	pattern
	tree   *tree
	room   *room
	nx, nu int
	width  int
	states []int     // branch whose voltage (capacitor) or current (inductor) is the state
	column []int     // state number of a branch, -1 if none
	mass   []float64 // capacitance or inductance seen by each state, for scaling
	rate   []float64 // nx forms: time derivative of the states
	volt   []float64 // a form per branch
	amp    []float64 // a form per branch
	node   []float64 // a form per node
	norm   float64   // no mode is faster than this rate
	solver solver
}

// newSystem forms the equations of a pattern of conducting diodes.
func newSystem(c *Circuit, p pattern, space *room) (*system, error) {
	t, err := newTree(c, p, space)
	if err != nil {
		return nil, err
	}
	s := &system{pattern: p, tree: t, room: space, nu: c.sources, column: space.ints.take(len(c.branches))}
	s.number()
	s.known()
	for _, step := range []func() error{s.resistive, s.capacitive, s.inductive} {
		if err := step(); err != nil {
			return nil, err
		}
	}
	s.rest()
	s.norm = s.balancedNorm()
	return s, nil
}

// number gives every capacitor of the tree and every inductor outside it a state.
func (s *system) number() {
	s.states = s.room.ints.take(len(s.tree.class))[:0]
	for i, k := range s.tree.class {
		s.column[i] = -1
		if (k == store && s.tree.inTree[i]) || (k == choke && !s.tree.inTree[i]) {
			s.column[i] = len(s.states)
			s.states = append(s.states, i)
		}
	}
	nb := len(s.tree.class)
	s.nx = len(s.states)
	s.width = s.nx + 2*s.nu + 1
	s.mass = s.room.take(s.nx)
	s.rate = s.room.take(s.nx * s.width)
	s.volt = s.room.take(nb * s.width)
	s.amp = s.room.take(nb * s.width)
	s.node = s.room.take(len(s.tree.c.nodes) * s.width)
}

func (s *system) v(branch int) []float64 { return row(s.volt, s.width, branch) }
func (s *system) i(branch int) []float64 { return row(s.amp, s.width, branch) }
func (s *system) value(source int) int   { return s.nx + source }
func (s *system) slope(source int) int   { return s.nx + s.nu + source }

// known fills in what needs no solving: sources, states, capacitors in loops, inductors in cut sets.
func (s *system) known() {
	for k, b := range s.tree.c.branches {
		switch s.tree.class[k] {
		case fixed:
			if b.kind == voltageSource {
				s.v(k)[s.value(b.index)] = 1
			} else if b.kind == diode {
				s.v(k)[s.width-1] = b.volt
			}
		case forced:
			s.i(k)[s.value(b.index)] = 1
		case store:
			if s.tree.inTree[k] {
				s.v(k)[s.column[k]] = 1
			}
		case choke:
			if !s.tree.inTree[k] {
				s.i(k)[s.column[k]] = 1
			}
		}
	}
	for k := range s.tree.class {
		if s.tree.class[k] == store && !s.tree.inTree[k] {
			s.sum(s.v(k), s.tree.loop[k], s.volt, 1)
		}
		if s.tree.class[k] == choke && s.tree.inTree[k] {
			s.sum(s.i(k), s.tree.cut[k], s.amp, -1)
		}
	}
}

// sum adds k·Σ sign·form over the terms, leaving out branches of the classes named.
func (s *system) sum(dst []float64, list []term, forms []float64, k float64, without ...class) {
next:
	for _, m := range list {
		for _, w := range without {
			if s.tree.class[m.branch] == w {
				continue next
			}
		}
		addTo(dst, row(forms, s.width, m.branch), k*m.sign)
	}
}

// threshold is the source voltage in series with a lossy branch.
func (s *system) threshold(k int) float64 {
	if b := &s.tree.c.branches[k]; b.kind == diode && s.tree.ohm[k] != leakage {
		return b.volt
	}
	return 0
}

// resistive solves the resistors: R_link + loop resistances of the tree form a positive definite matrix.
func (s *system) resistive() error {
	list := s.room.ints.take(3 * len(s.tree.class))
	at, links, twigs := list[:len(s.tree.class)], list[len(s.tree.class):][:0], list[2*len(s.tree.class):][:0]
	for k, c := range s.tree.class {
		if c == lossy && s.tree.inTree[k] {
			twigs = append(twigs, k)
		} else if c == lossy {
			at[k] = len(links)
			links = append(links, k)
		}
	}
	n, t := len(links), s.tree
	m, rhs := s.room.take(n*n), s.room.take(n*s.width)
	for a, k := range links {
		m[a*n+a] += t.ohm[k]
		s.sum(row(rhs, s.width, a), t.loop[k], s.volt, 1, lossy)
		row(rhs, s.width, a)[s.width-1] -= s.threshold(k)
	}
	twig := s.room.take(s.width)
	for _, k := range twigs {
		clear(twig)
		s.sum(twig, t.cut[k], s.amp, -t.ohm[k], lossy, store)
		twig[s.width-1] += s.threshold(k)
		for _, p := range t.cut[k] {
			if t.class[p.branch] != lossy {
				continue
			}
			addTo(row(rhs, s.width, at[p.branch]), twig, p.sign)
			for _, q := range t.cut[k] {
				if t.class[q.branch] == lossy {
					m[at[p.branch]*n+at[q.branch]] += float64(p.sign * q.sign * t.ohm[k])
				}
			}
		}
	}
	if err := solveSPD(m, s.room.take(n), n, rhs, s.width); err != nil {
		return fmt.Errorf("circuit: resistances differ too much to be solved together (%w); leave out the smallest or the largest", err)
	}
	for a, k := range links {
		copy(s.i(k), row(rhs, s.width, a))
	}
	for _, k := range twigs {
		s.sum(s.i(k), t.cut[k], s.amp, -1)
	}
	for _, k := range append(links, twigs...) {
		addTo(s.v(k), s.i(k), t.ohm[k])
		s.v(k)[s.width-1] += s.threshold(k)
	}
	return nil
}

// capacitive gives the derivative of the capacitor voltages. Capacitors outside the tree add to the mass matrix.
func (s *system) capacitive() error {
	t := s.tree
	first := s.firstStates(store)
	n := len(first)
	m, rhs := s.room.take(n*n), s.room.take(n*s.width)
	for j, x := range first {
		k := s.states[x]
		m[j*n+j] += t.c.branches[k].value
		s.sum(row(rhs, s.width, j), t.cut[k], s.amp, -1, store)
	}
	place := s.places(first)
	for k, c := range t.class {
		if c != store || t.inTree[k] {
			continue
		}
		farad := t.c.branches[k].value
		for _, p := range t.loop[k] {
			if t.class[p.branch] != store {
				continue
			}
			for _, q := range t.loop[k] {
				if t.class[q.branch] == store {
					m[place[p.branch]*n+place[q.branch]] += float64(farad * p.sign * q.sign)
				} else if b := &t.c.branches[q.branch]; b.kind == voltageSource {
					row(rhs, s.width, place[p.branch])[s.slope(b.index)] -= float64(farad * p.sign * q.sign)
				}
			}
		}
	}
	if err := s.solveStates(m, rhs, first); err != nil {
		return fmt.Errorf("circuit: capacitances differ too much to be solved together (%w)", err)
	}
	s.capacitorCurrents()
	return nil
}

func (s *system) capacitorCurrents() {
	for k, c := range s.tree.class {
		if c != store {
			continue
		}
		farad := s.tree.c.branches[k].value
		if s.tree.inTree[k] {
			addTo(s.i(k), row(s.rate, s.width, s.column[k]), farad)
			continue
		}
		s.derive(s.i(k), s.v(k), farad)
	}
}

// derive adds k times the time derivative of a form that hangs on states and source values only.
func (s *system) derive(dst, form []float64, k float64) {
	for x := range s.nx {
		if form[x] != 0 {
			addTo(dst, row(s.rate, s.width, x), k*form[x])
		}
	}
	for u := range s.nu {
		dst[s.slope(u)] += float64(k * form[s.value(u)])
	}
}

// inductive gives the derivative of the inductor currents; coupled and tree inductors enter the mass matrix.
func (s *system) inductive() error {
	t := s.tree
	first := s.firstStates(choke)
	n := len(first)
	m, rhs := s.room.take(n*n), s.room.take(n*s.width)
	for j, x := range first {
		s.sum(row(rhs, s.width, j), t.loop[s.states[x]], s.volt, 1, choke)
	}
	s.eachInductance(func(p, q int, henry float64) {
		for j, x := range first {
			flux := float64(henry * s.i(p)[x])
			if flux == 0 {
				continue
			}
			for k, z := range first {
				m[j*n+k] += float64(flux * s.i(q)[z])
			}
			for u := range s.nu {
				row(rhs, s.width, j)[s.slope(u)] -= float64(flux * s.i(q)[s.value(u)])
			}
		}
	})
	if err := s.solveStates(m, rhs, first); err != nil {
		return fmt.Errorf("circuit: inductors differ too much or are coupled too tightly (%w)", err)
	}
	s.eachInductance(func(p, q int, henry float64) {
		if t.inTree[p] {
			s.derive(s.v(p), s.i(q), henry)
		}
	})
	return nil
}

// eachInductance visits self and mutual inductances in a fixed order; mutual ones both ways.
func (s *system) eachInductance(visit func(p, q int, henry float64)) {
	for k, c := range s.tree.class {
		if c == choke {
			visit(k, k, s.tree.c.branches[k].value)
		}
	}
	for _, m := range s.tree.c.couples {
		if s.tree.class[m.first] == choke && s.tree.class[m.second] == choke {
			visit(m.first, m.second, m.mutual)
			visit(m.second, m.first, m.mutual)
		}
	}
}

// firstStates lists the states of a class.
func (s *system) firstStates(want class) []int {
	list := s.room.ints.take(s.nx)[:0]
	for x, k := range s.states {
		if s.tree.class[k] == want {
			list = append(list, x)
		}
	}
	return list
}

// places tells at which place in the list of states a branch stands.
func (s *system) places(states []int) []int {
	place := s.room.ints.take(len(s.tree.class))
	for j, x := range states {
		place[s.states[x]] = j
	}
	return place
}

// solveStates solves mass·rate = rhs for the listed states and keeps the diagonal of the mass for scaling.
func (s *system) solveStates(m, rhs []float64, states []int) error {
	n := len(states)
	for j, x := range states {
		s.mass[x] = m[j*n+j]
	}
	if err := solveSPD(m, s.room.take(n), n, rhs, s.width); err != nil {
		return err
	}
	for j, x := range states {
		copy(row(s.rate, s.width, x), row(rhs, s.width, j))
	}
	return nil
}

// rest fills in currents of voltage sources, voltages of inductors and current sources, nodes and blocking diodes.
func (s *system) rest() {
	t := s.tree
	for k, c := range t.class {
		switch {
		case c == fixed:
			s.sum(s.i(k), t.cut[k], s.amp, -1)
		case (c == choke && !t.inTree[k]) || c == forced:
			s.sum(s.v(k), t.loop[k], s.volt, 1)
		}
	}
	for _, n := range t.order[1:] {
		b := &t.c.branches[t.up[n]]
		near, sign := b.b, 1.0
		if b.b == n {
			near, sign = b.a, -1
		}
		form := row(s.node, s.width, n)
		copy(form, row(s.node, s.width, near))
		addTo(form, s.v(t.up[n]), sign)
	}
	for k, c := range t.class {
		if b := &t.c.branches[k]; c == open {
			s.difference(s.v(k), b.a, b.b)
		}
	}
}

// difference sets dst to the form of v(a)-v(b).
func (s *system) difference(dst []float64, a, b int) {
	copy(dst, row(s.node, s.width, a))
	addTo(dst, row(s.node, s.width, b), -1)
}
