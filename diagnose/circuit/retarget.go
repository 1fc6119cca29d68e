package circuit

import (
	"errors"
	"fmt"
	"math"
)

// turn is a moment at which a source was given another waveform.
type turn struct {
	source int
	at     float64
	before source
}

// Retarget replaces the waveform of a source from now on (times stay absolute); curves, sorted by time, take its place
// in theirs. A name that is no source, or an unusable waveform, is reported by the next To.
func (r *Run) Retarget(name string, w Waveform, curves ...Curve) {
	k, ok := r.source(name)
	if !ok {
		r.err = errors.Join(r.err, fmt.Errorf("circuit: Retarget: %q is not a source", name))
		return
	}
	next := source{w, curves}
	if err := next.check(); err != nil {
		r.err = errors.Join(r.err, fmt.Errorf("circuit: Retarget of %q: %w", name, err))
		return
	}
	r.turns = append(r.turns, turn{k, r.Time(), r.waves[k]})
	r.waves[k] = next
	r.fail(r.enterSegment(r.Time()))
}

// source gives the number of a named source.
func (r *Run) source(name string) (number int, ok bool) {
	k, ok := r.find(name)
	if !ok || (r.c.branches[k].kind != voltageSource && r.c.branches[k].kind != currentSource) {
		return 0, false
	}
	return r.c.branches[k].index, true
}

// Source gives the waveform of a named source as it was run so far and stands from now on: the pieces between calls of
// Retarget put together, a jump where the values differ there, curves in straight pieces. Nil for a name that is no source.
func (r *Run) Source(name string) Waveform {
	k, ok := r.source(name)
	if !ok {
		return nil
	}
	return r.ran(k)
}

// ran puts together what a source did.
func (r *Run) ran(source int) Waveform {
	var w Waveform
	from := math.Inf(-1)
	for _, t := range r.turns {
		if t.source == source && t.at > from { // of several changes at one moment the last one stays
			w = w.join(t.before.straight().cut(from, t.at))
			from = t.at
		}
	}
	return w.join(r.waves[source].straight().cut(from, math.Inf(1)))
}

// Netlist gives the circuit as it was run as an ngspice deck: like Circuit.Netlist, but every source with the waveform
// that Source gives, so that the deck needs nobody to change it on the way. An end after Time runs on with the present
// waveforms.
func (r *Run) Netlist(title string, end, step float64, measures ...Measure) (string, error) {
	if r.sys == nil {
		return "", r.err
	}
	c := r.c.snapshot()
	for k := range c.branches {
		if b := &c.branches[k]; b.kind == voltageSource || b.kind == currentSource {
			b.wave, b.bends = r.ran(b.index), nil
		}
	}
	return c.Netlist(title, end, step, measures...)
}
