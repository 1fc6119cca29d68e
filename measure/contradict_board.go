package measure

import (
	"fmt"
	"slices"
	"strings"

	"gopkg.in/yaml.v3"

	"drivemend/measure/quantity"
)

// layer is one section of a stack.
type layer struct {
	entry *entry
	own   bool // what stands in it has not been held against the other layers before
	local bool // it describes just the place that is looked at
}

// stack is a board section with the sections it lies over, the uppermost first.
type stack struct {
	layers []layer
	base   string // is taken off a key's path: a position states switch keys without switch. in front
}

// found is a stated key with its layer; without an entry when the key is not stated.
type found struct {
	*entry
	own, local bool
}

// word gives the text of a found key, "" when it is not stated.
func (f found) word() string {
	if f.entry == nil || !f.good {
		return ""
	}
	return f.text
}

// number tells whether a found key holds a number.
func (f found) number() bool { return f.entry != nil && f.numeric() }

// rebuiltStack lays a rebuild over the board; empty without a rebuild.
func rebuiltStack(board, rebuild *entry) stack {
	if rebuild == nil {
		return stack{}
	}
	return stack{layers: []layer{{rebuild, true, true}, {board, false, true}}}
}

// find gives a key as the uppermost section states it. A stated network replaces the one below as a whole.
func (s stack) find(path string) found {
	path = strings.TrimPrefix(path, s.base)
	for _, l := range s.layers {
		if e := l.entry.at(path); e != nil {
			if e.node.Kind == yaml.MappingNode && e.row.Kind != KindMap {
				e = e.child("value")
			}
			return found{e, l.own, l.local}
		}
		if network := l.entry.child("snubber"); network != nil && network.stated && strings.HasPrefix(path, "snubber.") {
			break
		}
	}
	return found{}
}

// order is a pair of keys of which the first may not be above the second.
type order struct{ small, great, why string }

// orders are the pairs of board keys with a fixed order. Ratings that do not suit the board are no contradictions.
var orders = []order{
	{"bus.nominal", "bus.highest", "the highest bus voltage is below the working voltage"},
	{"switch.rated_current", "switch.pulse_current", "the pulse current is below the continuous current"},
	{"switch.leakage", "switch.rated_current", "the blocking current is above the rated current"},
	{"switch.gate_threshold", "switch.gate_limit", "the gate voltage it turns on at is above the highest it stands"},
	{"gate.off_voltage", "gate.on_voltage", "the gate's on voltage is below its off voltage"},
	{"loop.link", "loop.inductance", "the share common to all legs is more than the whole loop"},
	{"loop.leg", "loop.inductance", "the share of one leg is more than the whole loop"},
	{"load.running_current", "load.stall_current", "a stalled load draws no less than a running one"},
	{"cooling.coldest_air", "cooling.air", "the coldest air is warmer than the working air"},
}

// absence is a key that says something is not there, and the keys that then say nothing.
type absence struct {
	key   string
	words []string // any of them says so
	keys  []string // a group stands for every key below it
	only  string   // the one word of the keys that is a contradiction; "" for everything but none, no and unknown
	why   string   // "": what is not there has no such key
}

// absences are what cannot be stated of a thing that is not there.
var absences = []absence{
	{"snubber.kind", []string{"none"}, []string{"snubber"}, "", ""},
	{"freewheel.fitted", []string{"no"}, []string{"freewheel"}, "", ""},
	{"freewheel.fitted", []string{"no"}, []string{"snubber.across"}, "freewheel", "a network cannot lie across what is not there"},
	{"stages.brake.fitted", []string{"no"}, []string{"stages.brake"}, "", ""},
	{"stages.auxiliary.fitted", []string{"no"}, []string{"stages.auxiliary"}, "", ""},
	{"stages.precharge.resistor", []string{"none"}, []string{"stages.precharge.relay"}, "", "without a charging resistor there is nothing to bridge"},
	{"bus.halves", []string{"no"}, []string{"bus.balancing"}, "", "only a split bank has balancing resistors"},
	{"bus.capacitance", []string{"none"}, []string{"bus.esr", "bus.esl", "bus.halves", "bus.balancing"}, "",
		"a bus without capacitors has nothing of the kind"},
	{"protection.trip_current", []string{"none"}, []string{"protection.trip_delay"}, "", "what never trips has no delay"},
	{"load.kind", []string{"resistive", "winding"}, []string{"load.back_emf", "load.inertia", "load.speed"}, "",
		"only a machine that turns has that"},
	{"switch.kind", []string{"bipolar"}, []string{"switch.gate_threshold", "switch.gate_limit", "switch.gate_charge",
		"switch.gate_collector_capacitance", "switch.gate_emitter_capacitance", "switch.internal_gate_resistance"}, "",
		"a bipolar transistor has no gate"},
	{"history", []string{"never-worked"}, []string{"service"}, "", "a board that never worked has run no hours"},
}

// checkSection holds the keys of a board section against each other, and against the section it lies over.
func (r *reader) checkSection(e, below *entry) {
	if e == nil {
		return
	}
	s := stack{layers: []layer{{e, true, true}}}
	if below != nil {
		s = rebuiltStack(below, e)
	}
	r.checkStack(s)
	r.checkShares(s)
	r.checkPeriod(s)
	r.checkAbsorbing(s)
	for _, name := range positionsOf(s) {
		r.checkStack(s.at(name))
	}
}

// positionsOf gives the names of the positions a stack states, each once.
func positionsOf(s stack) []string {
	var out []string
	for _, l := range s.layers {
		for _, p := range l.entry.child(positionsKey).children() {
			if !slices.Contains(out, p.name) {
				out = append(out, p.name)
			}
		}
	}
	return out
}

// children gives the entries below one; none below nil.
func (e *entry) children() []*entry {
	if e == nil {
		return nil
	}
	return e.below
}

// at gives the switch keys as one position sees them: its own over the board's, those of a rebuild over both.
func (s stack) at(position string) stack {
	out := stack{base: "switch."}
	for _, l := range s.layers {
		out.layers = append(out.layers,
			layer{l.entry.at(positionsKey + "." + position), l.own, true}, layer{l.entry.child("switch"), l.own, false})
	}
	return out
}

// holds tells whether a key can be looked up in the stack: a position has switch keys only.
func (s stack) holds(paths ...string) bool {
	return !slices.ContainsFunc(paths, func(p string) bool { return !strings.HasPrefix(p, s.base) })
}

// checkStack holds a stack against the orders and absences.
func (r *reader) checkStack(s stack) {
	for _, o := range orders {
		small, great := s.find(o.small), s.find(o.great)
		if !s.holds(o.small, o.great) || !small.number() || !great.number() || small.quantity.Low <= great.quantity.High {
			continue
		}
		if !small.own && !great.own || !small.local && !great.local {
			continue // both stand in sections that were held against each other before
		}
		at, other := great.entry, small.entry
		if !great.own {
			at, other = other, at
		}
		r.conflict(at, other, o.why, "")
	}
	for _, a := range absences {
		if gone := s.find(a.key); s.holds(a.key) && slices.Contains(a.words, gone.word()) {
			r.checkAbsence(s, a, gone)
		}
	}
}

// checkAbsence refuses what is stated of something that is said not to be there. A rebuild that takes something out
// does not contradict what the board says of it.
func (r *reader) checkAbsence(s stack, a absence, gone found) {
	for _, key := range a.keys {
		f := s.find(key)
		if f.entry == nil || !f.own || !f.local && !gone.local {
			continue
		}
		for _, leaf := range f.leaves() {
			why := a.why
			if why == "" {
				key := strings.TrimSuffix(leaf.path, ".value")
				why = "what is not there has no " + key[strings.LastIndex(key, ".")+1:]
			}
			if leaf != gone.entry && leaf.says(a.only) {
				r.conflict(leaf, gone.entry, why, "take this key out, or correct "+gone.path)
			}
		}
	}
}

// leaves gives the entries at and below one that hold a value; of a figure with conditions the value alone.
func (e *entry) leaves() []*entry {
	if e.row.Kind == KindQuantity && len(e.below) > 0 {
		e = e.child("value")
	}
	switch {
	case e == nil:
		return nil
	case len(e.below) == 0:
		return []*entry{e}
	}
	var out []*entry
	for _, c := range e.below {
		out = append(out, c.leaves()...)
	}
	return out
}

// says tells whether a value states that something is there: the one word that is asked for, or anything but none,
// no, unknown and zero.
func (e *entry) says(only string) bool {
	switch {
	case !e.good || !e.stated || e.node.Kind != yaml.ScalarNode:
		return false
	case only != "":
		return e.text == only
	case e.numeric():
		return e.quantity.High != 0 || e.quantity.Low != 0
	}
	return !slices.Contains([]string{"none", "no", unknown}, e.text)
}

// checkShares holds the two shares of the loop together against the whole.
func (r *reader) checkShares(s stack) {
	whole, link, leg := s.find("loop.inductance"), s.find("loop.link"), s.find("loop.leg")
	if !whole.number() || !link.number() || !leg.number() || !whole.own && !link.own && !leg.own {
		return
	}
	most := whole.quantity.High * (1 + 1e-9) // sums of decimal fractions are off in the last digit
	if link.quantity.Low > most || leg.quantity.Low > most || link.quantity.Low+leg.quantity.Low <= most {
		return // the orders name one that is too large by itself
	}
	at, others := whole, []found{link, leg}
	switch {
	case leg.own:
		at, others = leg, []found{link, whole}
	case link.own:
		at, others = link, []found{leg, whole}
	}
	r.fault(at.node, at.path, fmt.Sprintf("%s contradicts %s %s and %s %s: the shares of the link and of one leg are more than the whole loop",
		at.shown(), others[0].path, others[0].shown(), others[1].path, others[1].shown()), "correct one of the three")
}

// periodGroups are the times that fit in one period of the modulation, those of a group together.
var periodGroups = []struct {
	keys []string
	hint string
}{
	{[]string{"pwm.shortest_on_time", "pwm.shortest_off_time"}, "the shortest times fit in one period together"},
	{[]string{"driver.dead_time"}, "with a dead time this long no switch would ever close; check the prefix"},
}

// checkPeriod holds the shortest times and the dead time against the period.
func (r *reader) checkPeriod(s stack) {
	f := s.find("pwm.frequency")
	if !f.number() || f.quantity.Low <= 0 {
		return
	}
	period := 1 / f.quantity.Low
	for _, g := range periodGroups {
		sum, own := 0.0, f.own
		for _, name := range g.keys {
			t := s.find(name)
			if !t.number() {
				continue
			}
			own = own || t.own
			if sum += t.quantity.Low; sum <= period*(1+1e-9) || !own {
				continue
			}
			at := t
			if !t.own {
				at = f
			}
			r.fault(at.node, at.path, fmt.Sprintf("%s %s does not fit in the period of %s %s, which is %s", t.path, t.shown(),
				f.path, f.shown(), quantity.Format(period, quantity.Second)), g.hint)
			break
		}
	}
}

// checkAbsorbing refuses a source that takes energy back through plain diodes.
func (r *reader) checkAbsorbing(s stack) {
	absorbs, rectifier, supply := s.find("load.source_absorbs"), s.find("stages.rectifier"), s.find("supply")
	diodes := slices.Contains([]string{"half-wave", "single-phase", "three-phase"}, rectifier.word())
	if absorbs.word() != "yes" || !diodes || supply.word() != "rectified-mains" || !absorbs.own && !rectifier.own {
		return
	}
	at, other := absorbs, rectifier
	if !absorbs.own {
		at, other = other, at
	}
	r.conflict(at.entry, other.entry, "with "+supply.path+" rectified-mains the diodes of the rectifier let no energy back", "")
}
