package circuit

import (
	"fmt"
	"math"
	"slices"
	"strings"
)

const (
	sameValue = 1e-9  // relative: a diode current or voltage this small is at its switching point
	rounding  = 1e-12 // relative: what the arithmetic can leave behind
	mismatch  = 1e-6  // relative: more than this between a loop and its capacitors is a contradiction
	trigger   = 2     // tolerances below zero that end a step: beyond doubt, so that a graze cannot come back at once
	mostFlips = 400   // diode patterns tried at one moment
	mostCrowd = 200   // events in a row that make no headway
)

// crowd counts events that follow each other without headway.
type crowd struct {
	count int
	since float64
}

// tolerance is how far from zero the margin of a diode says nothing about its state. For a diode with resistance it
// is one voltage, whether it blocks or conducts, so that both states agree on where the switching point is: well
// above rounding, and small in current too.
func (r *Run) tolerance(w *watch) float64 {
	ohm := r.c.branches[w.branch].value
	if ohm < leastOhm {
		if w.conducts {
			return float64(sameValue*r.amps) + 1e-18
		}
		return float64(sameValue*r.volts) + 1e-18
	}
	volt := float64(rounding*r.volts) + float64(sameValue*math.Min(r.volts, 300*r.amps*ohm)) + 1e-18
	if w.conducts {
		return volt / ohm
	}
	return volt
}

// system gives the equations of a pattern, from the cache if it was met before.
func (r *Run) system(p pattern) (*system, error) {
	for _, s := range r.cache {
		if s.pattern == p {
			return s, nil
		}
	}
	s, err := newSystem(r.c, p, r.room)
	if err != nil {
		return nil, err
	}
	r.cache = append(r.cache, s)
	return s, nil
}

// keep writes the states back to the branches, those in loops and cut sets included.
func (r *Run) keep() {
	for k := range r.c.branches {
		b := &r.c.branches[k]
		if b.kind == capacitor && b.value > 0 {
			r.held[k] = r.form(r.sys.v(k))
		} else if b.kind == inductor {
			r.held[k] = r.form(r.sys.i(k))
		}
	}
}

// settle finds the diode pattern that fits the present capacitor voltages, inductor currents and sources. The lowest
// diode in contradiction is flipped until none is left (least-index pivoting; it ends for passive networks). A
// diode at its switching point is judged by its first, then its second derivative; should rounding make these
// contradict each other, by its value alone.
func (r *Run) settle(culprit int) error {
	on := r.on
	if culprit >= 0 {
		on ^= 1 << uint(culprit)
	}
	for _, exact := range []bool{true, false} {
		done, err := r.pivot(on, exact)
		if err != nil {
			return r.at(err)
		}
		if done {
			r.settled()
			return nil
		}
	}
	return r.at(fmt.Errorf("circuit: no state of the diodes fits (%s contradict each other); give them more resistance", r.diodeNames()))
}

// pivot flips diodes until none is in contradiction; it is not done if a pattern comes back.
func (r *Run) pivot(on uint64, exact bool) (done bool, err error) {
	var seen []uint64
	for range mostFlips {
		cut, err := r.adopt(on)
		if err != nil {
			return false, err
		}
		k := r.contradiction(exact)
		if k < 0 && cut != "" {
			return false, fmt.Errorf("circuit: the current of inductor %q has no path; give it a diode, a resistor or a capacitor, or a matching start", cut)
		}
		if k < 0 || slices.Contains(seen, on) {
			return k < 0, nil
		}
		seen = append(seen, on)
		on ^= 1 << uint(k)
	}
	return false, nil
}

func (r *Run) at(err error) error { return fmt.Errorf("%w (at %g s)", err, r.Time()) }

func (r *Run) diodeNames() string {
	var names []string
	for k := range r.watch {
		if r.watch[k].isDiode {
			names = append(names, r.c.branches[r.watch[k].branch].name)
		}
	}
	return strings.Join(names, ", ")
}

// adopt makes a pattern the present one. If it would cut off the current of an inductor, blocking diodes are
// made to leak so that the voltage shows which of them must conduct; the inductor's name is returned.
func (r *Run) adopt(on uint64) (cut string, err error) {
	s, err := r.system(pattern{on, false})
	if err != nil {
		return "", err
	}
	r.use(s, on)
	k := r.clash()
	if k < 0 {
		return "", nil
	}
	name := r.c.branches[k].name
	if r.c.branches[k].kind == capacitor {
		return "", fmt.Errorf("circuit: capacitor %q (%g V) contradicts its loop %s (%g V): the current would have no limit; put a resistance into the loop or make the voltages equal",
			name, r.held[k], s.tree.names(s.tree.loop[k]), r.form(s.v(k)))
	}
	if s, err = r.system(pattern{on, true}); err != nil {
		return "", err
	}
	r.use(s, on)
	if k := r.clash(); k >= 0 {
		return "", fmt.Errorf("circuit: inductor %q (%g A) contradicts the currents that meet it (%g A); make the starting currents equal or put a resistor across it",
			r.c.branches[k].name, r.held[k], r.form(s.i(k)))
	}
	return name, nil
}

// use loads the states of a system from the branches.
func (r *Run) use(s *system, on uint64) {
	old, bends := 0, 2*len(r.seg.bends)
	if r.sys != nil {
		old = r.sys.nx
	}
	r.stretch(max(old, s.nx) + bends)
	copy(r.x[s.nx:], r.x[old:old+bends])
	r.stretch(s.nx + bends)
	r.sys, r.on = s, on
	for x, k := range s.states {
		r.x[x] = r.held[k]
	}
	for k := range r.watch {
		if w := &r.watch[k]; w.isDiode {
			w.conducts = on>>uint(r.c.branches[w.branch].index)&1 == 1
		}
	}
}

// clash gives a capacitor or inductor outside the states whose value contradicts them, or -1.
func (r *Run) clash() int {
	amps := float64(mismatch*r.amps) + 1e-15
	for k := range r.watch {
		if w := r.watch[k]; w.isDiode { // a diode that stops leaves its tolerance in the inductor before it
			w.conducts = true
			amps = math.Max(amps, 4*r.tolerance(&w))
		}
	}
	for k, c := range r.sys.tree.class {
		if r.sys.column[k] >= 0 {
			continue
		}
		if c == store && math.Abs(r.form(r.sys.v(k))-r.held[k]) > float64(mismatch*r.volts)+1e-15 {
			return k
		}
		if c == choke && math.Abs(r.form(r.sys.i(k))-r.held[k]) > amps {
			return k
		}
	}
	return -1
}

// contradiction gives the lowest diode whose state does not fit, or -1. Exact looks at the derivatives of a diode at
// its switching point too.
func (r *Run) contradiction(exact bool) int {
	s := r.sys
	work := r.scratch(3 * s.width)
	form, first, second := work[:s.width], work[s.width:2*s.width], work[2*s.width:]
	for k := range r.watch {
		w := &r.watch[k]
		if !w.isDiode {
			continue
		}
		r.margin(form, w.branch)
		tol := r.tolerance(w)
		if !exact {
			tol *= 0.9 * trigger
		}
		g := r.form(form)
		for order := 0; exact && order < 2 && math.Abs(g) <= tol; order++ {
			if order == 0 {
				clear(first)
				s.derive(first, form, 1)
				g = r.form(first)
			} else {
				clear(second)
				s.derive(second, first, 1)
				g = r.form(second) + r.bending(first)
			}
			tol *= s.norm
		}
		if g < -tol {
			return r.c.branches[w.branch].index
		}
	}
	return -1
}

// margin writes the form that must stay positive: threshold - v of a blocking diode, the current of a conducting one.
func (r *Run) margin(f []float64, k int) {
	b := &r.c.branches[k]
	clear(f)
	if r.on>>uint(b.index)&1 == 1 {
		copy(f, r.sys.i(k))
		return
	}
	addTo(f, r.sys.v(k), -1)
	f[r.sys.width-1] += b.volt
}

// settled ends a change of pattern: scales, restart, samples on the far side of the event.
func (r *Run) settled() {
	for k := range r.c.branches {
		r.volts = math.Max(r.volts, math.Abs(r.form(r.sys.v(k))))
		r.amps = math.Max(r.amps, math.Abs(r.form(r.sys.i(k))))
	}
	r.clearMoment()
	r.restart(false)
	r.sys.solver.segment = -1
	r.refresh()
	r.look(r.x, r.tau)
	r.sample()
}
