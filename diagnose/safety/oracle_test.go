package safety

import "slices"

// The oracle restates section 9 of the design as a story: a log of what happened, told minute by minute, to a bench that
// remembers only what it has just been told. It knows nothing of the package under test: neither its types, nor the
// parsed case; it reads what the generator meant to write.

// never is a minute that is not stated.
const never = -1

type boardFacts struct {
	topology, supply, load                                string // "" where silent
	highest                                               int    // volts
	fuse, halves, reservoir, recovery, snubber, capacitor string
	brake, brakeOhm, aux, auxCap, bank                    string
	running                                               int // amperes, 0 where silent
}

type isolationFact struct {
	at             int
	locked         bool
	motor, sources string
	off            bool // what the writer meant: the sources are none, or named and off
}

type checkFact struct {
	point  string
	dc, ac float64 // ac below zero: not read
	proved bool
	at     int
}

type beforeFact struct {
	step, motor, resistor, bank, probe, clip, supply string
	fuse                                             float64 // 0: none stated
	clips, at                                        int
	yes                                              map[string]bool
}

type stepFact struct {
	step, result string
	at           int
}

type staticFact struct {
	position string
	passed   bool
	at       int
}

type linkFact struct{ fitted, removed int }

type facts struct {
	found      boardFacts
	rebuilt    boardFacts // as planned; it is there once it is done
	done       int
	isolations []isolationFact
	checks     []checkFact
	links      []linkFact
	power      []int // energised, powered readings, stages of the bring-up
	before     []beforeFact
	steps      []stepFact
	statics    []staticFact
	failing    []failFact
	now        int
}

func (f facts) boards() []boardFacts {
	if f.done != never {
		return []boardFacts{f.found, f.rebuilt}
	}
	return []boardFacts{f.found}
}

func (f facts) standing() boardFacts { b := f.boards(); return b[len(b)-1] }

func turns(b boardFacts) bool { return b.load != "resistive" && b.load != "winding" }

func (f facts) canTurn() bool { return slices.ContainsFunc(f.boards(), turns) }

// places lists the stores of a board that have to be proved dead, the motor's terminals apart.
func places(b boardFacts) []string {
	out := []string{"bus"}
	add := func(there bool, names ...string) {
		if there {
			out = append(out, names...)
		}
	}
	add(b.halves == "yes" || b.halves == "unknown" || (b.halves == "" && b.highest > 450), "upper-half", "lower-half")
	add(b.fuse != "" && b.fuse != "none", "fused-bank")
	stated := b.reservoir == "10 µF" || b.recovery == "10 µF"
	add(b.snubber == "recovery" || stated || (b.reservoir != "none" && (b.reservoir == "unknown" || b.recovery == "unknown")), "reservoir")
	add(b.snubber == "clamp" || b.snubber == "unknown", "clamp")
	micro := map[string]float64{"10 µF": 10, "1 nF": 0.001, "": 0.1}[b.capacitor]
	add((b.snubber == "rc" || b.snubber == "rcd" || b.snubber == "capacitor") && micro*float64(b.highest) >= 50, "snubber")
	add(hasBrakeFact(b), "brake")
	low := b.supply == "battery" || b.supply == "bench-supply"
	switch {
	case b.auxCap == "47 µF", b.aux == "yes":
		out = append(out, "auxiliary")
	case b.auxCap == "none", b.aux == "no":
	case b.auxCap == "unknown", b.aux == "unknown", !low:
		out = append(out, "auxiliary")
	}
	return out
}

func hasBrakeFact(b boardFacts) bool {
	return b.brake == "yes" || b.brakeOhm == "47 Ω" || (b.brake == "unknown" && b.brakeOhm == "")
}

var switchPlaces = map[string][]string{"low-side-chopper": {"low"}, "high-side-chopper": {"high"}, "half-bridge": {"high", "low"},
	"h-bridge": {"a-high", "a-low", "b-high", "b-low"}, "three-phase": {"u-high", "u-low", "v-high", "v-low", "w-high", "w-low"}, "other": {"switch"}, "": {"switch"}}

func switches(b boardFacts) []string {
	out := slices.Clone(switchPlaces[b.topology])
	if b.brake == "yes" || (b.brake != "no" && b.brakeOhm == "47 Ω") {
		out = append(out, "brake")
	}
	return out
}

// teller is what the bench remembers.
type teller struct {
	isolated, unplugged bool
	looked              int            // the last look at the lock
	dead                map[string]int // point -> minute of the reading that proves it
	linked              int            // links fitted
	said                map[string]*beforeFact
	over                map[string]bool // what was said is overtaken
	broken              bool            // power or a source at an unknown moment, or one still to come
}

// live tells the story up to now.
func (f facts) live() teller {
	t := teller{dead: map[string]int{}, said: map[string]*beforeFact{}, over: map[string]bool{}}
	busy := f.busy()
	for m := 0; m <= f.now; m++ {
		if t.isolated && (m-t.looked > 480 || m/1440 != t.looked/1440) {
			t.cut()
		}
		if busy[m] {
			f.speaksFor(&t, m)
			f.speaksAgainst(&t, m)
		}
	}
	later := func(at int) bool { return at == never || at > f.now }
	t.broken = slices.ContainsFunc(f.power, later) ||
		slices.ContainsFunc(f.isolations, func(i isolationFact) bool { return !f.sound(i) && later(i.at) }) ||
		slices.ContainsFunc(f.checks, func(c checkFact) bool { return c.ac > 5 && later(c.at) }) ||
		slices.ContainsFunc(f.steps, func(s stepFact) bool { return f.powers(s) && later(s.at) })
	for _, l := range f.links {
		if later(l.removed) || l.removed < l.fitted {
			t.linked++
		}
	}
	return t
}

// busy marks the minutes up to now in which anything happens at all.
func (f facts) busy() []bool {
	out := make([]bool, f.now+1)
	mark := func(minutes ...int) {
		for _, m := range minutes {
			if m >= 0 && m <= f.now {
				out[m] = true
			}
		}
	}
	mark(f.power...)
	mark(f.done)
	for _, i := range f.isolations {
		mark(i.at)
	}
	for _, c := range f.checks {
		mark(c.at)
	}
	for _, l := range f.links {
		mark(l.fitted, l.removed)
	}
	for _, b := range f.before {
		mark(b.at)
	}
	for _, s := range f.steps {
		mark(s.at)
	}
	return out
}

func (t *teller) cut() { t.isolated, t.dead = false, map[string]int{} }

func (t *teller) overtake(steps ...string) {
	for _, s := range steps {
		t.over[s] = true
	}
}

var withPower = []string{"control-power", "low-bus", "full", "double-pulse"}
var everyStep = append([]string{"injection", "insulation", "scope"}, withPower...)

// speaksFor plays what helps. What is said about the bench comes before the isolation of the same minute, which it does
// not survive.
func (f facts) speaksFor(t *teller, m int) {
	for k := range f.before {
		if b := &f.before[k]; b.at == m && f.complete(*b) {
			t.said[b.step], t.over[b.step] = b, false
		}
	}
	for _, i := range f.isolations {
		if i.at == m && f.sound(i) {
			if !t.isolated {
				t.dead = map[string]int{}
			}
			t.isolated, t.looked, t.unplugged = true, m, i.motor == "unplugged"
		}
	}
	for _, c := range f.checks {
		if c.at != m || c.ac > 5 {
			continue
		}
		delete(t.dead, c.point)
		if c.proved && c.ac >= 0 && c.dc <= 5 && c.dc >= -5 {
			t.dead[c.point] = m
		}
	}
}

// speaksAgainst plays what ends things; it has the last word of its minute.
func (f facts) speaksAgainst(t *teller, m int) {
	for _, i := range f.isolations {
		if i.at == m {
			t.overtake(everyStep...)
			if !f.sound(i) {
				t.cut()
			}
		}
	}
	source := slices.ContainsFunc(f.checks, func(c checkFact) bool { return c.at == m && c.ac > 5 })
	ran := slices.ContainsFunc(f.steps, func(s stepFact) bool { return s.at == m && f.powers(s) })
	if source || ran || slices.Contains(f.power, m) {
		t.cut()
	}
	for _, l := range f.links {
		if l.removed == m {
			t.dead = map[string]int{}
		}
		if l.removed == m || l.fitted == m {
			t.overtake(withPower...)
		}
	}
	if f.done == m || f.lastFailure() == m {
		t.overtake(withPower...)
	}
	for k := range f.before {
		if b := &f.before[k]; b.at == m && !f.complete(*b) {
			t.said[b.step], t.over[b.step] = nil, true
		}
	}
}

func (f facts) powers(s stepFact) bool {
	return (s.step == "load-tested" || s.step == "protections-proved") && (s.result == "done" || s.result == "failed")
}

func (f facts) sound(i isolationFact) bool {
	still := i.motor == "unplugged" || i.motor == "shaft-locked" || (i.motor == "connected" && !f.canTurn())
	return i.locked && still && i.off
}

// complete tells whether a statement says all that its step takes.
func (f facts) complete(b beforeFact) bool {
	all := func(keys ...string) bool {
		return !slices.ContainsFunc(keys, func(k string) bool { return !b.yes[k] })
	}
	switch b.step {
	case "double-pulse":
		return all("shield")
	case "insulation":
		return all("electronics_disconnected")
	case "injection":
		return all("sources_off", "gates_held", "limit_set", "attended")
	case "scope":
		earthed := b.probe == "earth-clip" && (b.clip == "earthed-node" || (b.clip == "live-node" && b.supply == "isolated" && b.clips == 1))
		return b.probe == "differential" || b.probe == "isolated-input" || earthed
	}
	board := f.standing()
	motor := b.motor == "unplugged" || b.motor == "uncoupled" || b.motor == "wheels-up"
	braked := !slices.ContainsFunc(f.boards(), hasBrakeFact) || b.resistor != ""
	bank := board.bank == "none" || b.bank == "in-use" || b.bank == "re-formed"
	bus := b.step != "control-power" || b.yes["bus_disconnected"]
	return motor && braked && bank && bus && b.fuse > 0 && b.fuse <= mostFuse(board, b.step) && all("guard", "remote_off", "glasses", "second_person")
}

func mostFuse(b boardFacts, step string) float64 {
	own := map[string]float64{"5 A": 5, "63 A": 63}[b.fuse]
	switch {
	case step == "control-power":
		return 3.15
	case own > 0 && (step == "full" || own < 10):
		return own
	case step == "full" && b.running > 0:
		return float64(2 * b.running)
	}
	return 10
}

// allows answers for one work, from what the story has left at the bench.
func (f facts) allows(t teller, w Work) bool {
	cut := t.isolated && !t.broken
	ok := map[Need]bool{NeedQuestion: true, NeedDeadCheck: cut, NeedDischarge: cut, NeedDead: cut && t.linked == 0 && f.allDead(t),
		NeedControlPower: f.powerOn(t, "control-power"), NeedLowBus: f.powerOn(t, "low-bus"), NeedFull: f.powerOn(t, "full")}[w.Need]
	for _, step := range map[Tool][]string{ToolScope: {"scope"}, ToolInjection: {"injection"}, ToolInsulation: {"insulation"}, ToolDoublePulse: {"double-pulse", "scope"}}[w.Tool] {
		ok = ok && f.speaks(t, step)
	}
	return ok
}

// speaks tells whether what was said before a step still holds.
func (f facts) speaks(t teller, step string) bool {
	toCome := slices.ContainsFunc(f.before, func(b beforeFact) bool { return b.step == step && b.at > f.now && !f.complete(b) })
	isolation := slices.ContainsFunc(f.isolations, func(i isolationFact) bool { return i.at > f.now })
	b := t.said[step]
	return b != nil && !t.over[step] && !toCome && !isolation && f.now-b.at <= 480 && f.now/1440 == b.at/1440
}

func (f facts) allDead(t teller) bool {
	var all []string
	for _, b := range f.boards() {
		all = append(all, places(b)...)
	}
	if !t.unplugged && f.canTurn() {
		all = append(all, "phases")
	}
	return !slices.ContainsFunc(all, func(p string) bool {
		read, ok := t.dead[p]
		return !ok || f.now-read >= 10 || f.denied(p)
	})
}

// denied is the one rule that goes by the order of the file: a high reading that lies ahead stands against its point until
// a later line of the file has been the newest reading there.
func (f facts) denied(point string) bool {
	against, newest := false, never
	for _, c := range f.checks {
		switch {
		case c.point != point:
		case c.at > f.now:
			against = against || c.dc > 5 || c.dc < -5 || c.ac > 5
		case c.at >= newest:
			against, newest = false, c.at
		}
	}
	return against
}

func (f facts) powerOn(t teller, step string) bool {
	if f.done == never || f.done > f.now || t.linked > 0 || !f.speaks(t, step) {
		return false
	}
	proved := map[string]bool{}
	for _, s := range f.statics {
		if !s.passed || s.at == never || s.at <= f.done || s.at <= f.lastFailure() || s.at > f.now {
			return false
		}
		proved[s.position] = true
	}
	for _, p := range switches(f.standing()) {
		if !proved[p] {
			return false
		}
	}
	if slices.ContainsFunc(f.failing, func(x failFact) bool { return (x.at == never || x.at > f.done) && (x.good == never || x.good > f.now) }) {
		return false
	}
	b := t.said[step]
	tested := b.motor == "unplugged" || (f.wasDone("motor-tested") && f.wasDone("cable-tested"))
	brake := !slices.ContainsFunc(f.boards(), hasBrakeFact) || b.resistor != "connected" || f.wasDone("brake-resistor-tested")
	return tested && brake
}

// lastFailure is when the board last failed under power; what is written for later has failed already.
func (f facts) lastFailure() int {
	last := never
	for _, s := range f.steps {
		if s.result == "failed" && (s.step == "load-tested" || s.step == "protections-proved") {
			last = max(last, min(s.at, f.now))
		}
	}
	return last
}

// wasDone tells whether the newest word on a step is that it is done; bad news counts from the day it is written.
func (f facts) wasDone(step string) bool {
	at, done := never, false
	for _, s := range f.steps {
		if s.step != step {
			continue
		}
		m := min(s.at, f.now)
		switch {
		case s.result == "done" && s.at > f.now:
		case m > at:
			at, done = m, s.result == "done"
		case m == at && s.result != "done":
			done = false
		}
	}
	return done
}
