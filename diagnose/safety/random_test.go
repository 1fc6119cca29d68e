package safety

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"time"
)

// The generator makes a record in good order and then spoils it in up to three places, so that what is allowed comes up
// as often as what is not.

const morning = 1440 + 540 // 09:00 of the second day, in minutes

type writer struct{ *rand.Rand }

func pick[T any](w writer, list ...T) T { return list[w.IntN(len(list))] }

func (w writer) board() boardFacts {
	return consistent(boardFacts{
		topology: pick(w, "low-side-chopper", "high-side-chopper", "half-bridge", "h-bridge", "three-phase", "other", ""),
		supply:   pick(w, "battery", "bench-supply", "rectified-mains", "shared-bus", ""),
		load:     pick(w, "dc-motor", "induction-motor", "permanent-magnet-motor", "universal-motor", "stepper-motor", "winding", "resistive", "other", "unknown", ""),
		highest:  pick(w, 60, 390, 800), running: pick(w, 0, 3, 20),
		fuse: pick(w, "", "", "none", "unknown", "5 A", "63 A"), halves: pick(w, "", "", "yes", "no", "unknown"),
		reservoir: pick(w, "", "", "", "none", "unknown", "10 µF"), recovery: pick(w, "", "", "", "unknown", "10 µF"),
		snubber: pick(w, "", "unknown", "none", "capacitor", "rc", "rcd", "clamp", "suppressor", "decoupling", "recovery"), capacitor: pick(w, "", "1 nF", "10 µF"),
		brake: pick(w, "", "", "yes", "no", "unknown"), brakeOhm: pick(w, "", "", "", "47 Ω"),
		aux: pick(w, "", "yes", "no", "unknown"), auxCap: pick(w, "", "none", "unknown", "47 µF"), bank: pick(w, "", "2200 µF", "2200 µF", "none", "unknown"),
	})
}

// consistent keeps a board from contradicting itself: what is not there has no halves and no capacitor.
func consistent(b boardFacts) boardFacts {
	if b.bank == "none" && b.halves != "" {
		b.halves = "no"
	}
	if b.snubber == "none" {
		b.capacitor, b.recovery = "", ""
	}
	return b
}

// rebuild changes what a rebuild may change and this test renders.
func (w writer) rebuild(b boardFacts) boardFacts {
	if w.IntN(2) == 0 {
		return b
	}
	b.fuse = pick(w, b.fuse, "none", "5 A", "63 A")
	if kind := pick(w, b.snubber, "clamp", "rcd", "recovery"); kind != b.snubber { // another network: nothing of the old one is left
		b.snubber, b.capacitor, b.recovery = kind, "", ""
	}
	b.reservoir = pick(w, b.reservoir, "none", "10 µF")
	b.brake = pick(w, b.brake, "yes", "no")
	b.load = pick(w, b.load, "resistive", "permanent-magnet-motor")
	b.halves = pick(w, b.halves, "yes", "no")
	return consistent(b)
}

// goodOrder writes a record in which everything may be done.
func (w writer) goodOrder() facts {
	f := facts{found: w.board(), done: morning - 60 - w.IntN(60)}
	f.rebuilt = w.rebuild(f.found)
	cut := morning + w.IntN(30)
	f.isolations = []isolationFact{{cut, true, "unplugged", "none", true}}
	if w.IntN(2) == 0 {
		f.isolations[0] = isolationFact{cut, true, pick(w, "unplugged", "shaft-locked"), pick(w, "24 V control supply off", "charger unplugged, UPS off"), true}
	}
	f.now = cut + 20 + w.IntN(9)
	points := []string{"phases", "bus"}
	for _, b := range f.boards() {
		points = append(points, places(b)...)
	}
	for _, p := range slices.Compact(slices.Sorted(slices.Values(points))) {
		f.checks = append(f.checks, checkFact{p, 0.4, 0.1, true, f.now - w.IntN(9)})
	}
	for _, step := range everyStep {
		f.before = append(f.before, w.said(f, step, cut+1+w.IntN(f.now-cut)))
	}
	for _, step := range []string{"motor-tested", "cable-tested", "brake-resistor-tested"} {
		f.steps = append(f.steps, stepFact{step, "done", cut - w.IntN(900)})
	}
	for _, p := range switches(f.rebuilt) {
		for range 1 + w.IntN(2) {
			f.statics = append(f.statics, staticFact{p, true, f.done + 1 + w.IntN(40)})
		}
	}
	f.failing = []failFact{{f.done + 1, f.done + 2}}
	return f
}

// said makes a full statement before a step.
func (w writer) said(f facts, step string, at int) beforeFact {
	b := beforeFact{step: step, at: at, yes: map[string]bool{}}
	switch step {
	case "double-pulse":
		b.yes["shield"] = true
	case "insulation":
		b.yes["electronics_disconnected"] = true
	case "injection":
		for _, k := range []string{"sources_off", "gates_held", "limit_set", "attended"} {
			b.yes[k] = true
		}
	case "scope":
		if b.probe = pick(w, "differential", "isolated-input", "earth-clip"); b.probe == "earth-clip" {
			b.clip, b.supply, b.clips = pick(w, "earthed-node", "live-node"), "isolated", 1
		}
	default:
		for _, k := range []string{"guard", "remote_off", "glasses", "second_person"} {
			b.yes[k] = true
		}
		if step == "control-power" {
			b.yes["bus_disconnected"] = true
		}
		b.motor, b.bank, b.resistor = pick(w, "unplugged", "uncoupled", "wheels-up"), pick(w, "in-use", "re-formed"), pick(w, "connected", "disconnected")
		b.fuse = pick(w, 1, mostFuse(f.standing(), step))
	}
	return b
}

// moment gives a minute anywhere: before, at, near and after what else happens.
func (w writer) moment(f facts) int {
	switch w.IntN(7) {
	case 0:
		return f.now + 1 + w.IntN(2000)
	case 1:
		return f.now
	case 2:
		return f.isolations[0].at
	case 3:
		return max(0, f.now-w.IntN(1200))
	case 4:
		return max(0, f.done)
	}
	return max(0, f.now-w.IntN(40))
}

// spoil changes one thing.
func (w writer) spoil(f *facts) {
	at := w.moment(*f)
	iso, check := &f.isolations[w.IntN(len(f.isolations))], &f.checks[w.IntN(len(f.checks))]
	said, step := &f.before[w.IntN(len(f.before))], &f.steps[w.IntN(len(f.steps))]
	switch w.IntN(28) {
	case 0:
		iso.at = at
	case 1:
		iso.locked = false
	case 2:
		iso.motor = pick(w, "connected", "connected", "shaft-locked")
	case 3:
		iso.sources, iso.off = pick(w, "24 V on", "none off", "charger", "off", "charger sometimes off"), false
	case 4:
		again := *iso
		again.at, again.locked = at, w.IntN(3) > 0
		f.isolations = append(f.isolations, again)
	case 5, 6:
		check.at = at
	case 7:
		check.dc = pick(w, 5.0, 30, -30)
	case 8:
		check.ac = pick(w, -1.0, 24, 5)
	case 9:
		check.proved = false
	case 10:
		again := *check
		again.at, again.dc = at, pick(w, 0.1, 0.1, 30)
		f.checks = append(f.checks, again)
	case 11:
		*check = f.checks[0]
	case 12, 13:
		f.power = append(f.power, at)
	case 14, 15:
		l := linkFact{at, at + w.IntN(8)}
		f.links = append(f.links, pick(w, l, l, linkFact{at, never}, linkFact{l.removed, l.fitted}, linkFact{f.isolations[0].at, f.isolations[0].at + 1}))
	case 16, 17:
		said.at = at
	case 18, 19:
		w.spoilStatement(said)
	case 20:
		again := w.said(*f, said.step, at)
		if w.IntN(2) == 0 {
			w.spoilStatement(&again)
		}
		f.before = append(f.before, again)
	case 21:
		*step = stepFact{step.step, pick(w, "done", "failed", "not-possible", "not-fitted"), at}
	case 22:
		f.steps = append(f.steps, stepFact{pick(w, step.step, "load-tested", "protections-proved", "handed-over"), pick(w, "done", "failed", "not-possible"), at})
	case 23:
		s := &f.statics[w.IntN(len(f.statics))]
		*s = pick(w, staticFact{s.position, false, s.at}, staticFact{s.position, true, never}, staticFact{s.position, true, at}, f.statics[0])
	case 24:
		f.done = pick(w, never, at)
	case 26, 27:
		f.failing = append(f.failing, failFact{pick(w, at, at, f.done, never), pick(w, never, w.moment(*f), w.moment(*f))})
	case 25:
		f.now += pick(w, 5, 12, 440, 481, 900, 1440)
	}
}

func (w writer) spoilStatement(b *beforeFact) {
	for _, k := range sortedKeys(b.yes) {
		if w.IntN(3) == 0 {
			delete(b.yes, k)
		}
	}
	switch {
	case b.step == "scope":
		b.probe, b.clip, b.supply, b.clips = "", "", pick(w, "", "isolated", "not-isolated"), 0
		if w.IntN(3) > 0 {
			b.probe, b.clip, b.clips = "earth-clip", pick(w, "live-node", "live-node", "earthed-node", ""), pick(w, 0, 1, 2)
		}
	case b.motor != "":
		b.motor = pick(w, b.motor, "connected", "")
		b.resistor = pick(w, b.resistor, "")
		b.bank = pick(w, b.bank, "stored", "")
		b.fuse = pick(w, b.fuse, 0, 4, 7, 30, 100)
	}
}

// readable mends what the loader refuses: a brake resistor where there is said to be none, and the other way round.
func (f *facts) readable() {
	last := f.rebuilt.brake
	for k := range f.before {
		if b := &f.before[k]; last == "no" && b.resistor == "connected" {
			b.resistor = "disconnected"
		}
	}
	for k := range f.steps {
		s := &f.steps[k]
		switch {
		case s.step != "brake-resistor-tested":
		case last == "no" && s.result == "done":
			s.result = "not-fitted"
		case last == "yes" && s.result == "not-fitted":
			s.result = "not-possible"
		}
	}
}

func sortedKeys(m map[string]bool) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// yaml writes the case by hand, every time in a random zone.
func (w writer) yaml(f facts) string {
	var lines []string
	list := func(name string, entries []string) {
		if len(entries) > 0 {
			lines = append(lines, name+":")
			for _, e := range entries {
				lines = append(lines, strings.Repeat(" ", len(name)-len(strings.TrimLeft(name, " ")))+"  - {"+e+"}")
			}
		}
	}
	lines = append(lines, "drivemend: 1", "case: written-by-hand", "board:")
	lines = append(lines, boardLines(f.found)...)
	lines = append(lines, "safety:", "  energised: []")
	list("  isolation", each(f.isolations, func(i isolationFact) string {
		return fmt.Sprintf("locked: %s, motor: %s, other_sources: %q, at: %s", yesNo(i.locked), i.motor, i.sources, w.time(i.at))
	}))
	list("  dead_checks", each(f.checks, func(c checkFact) string {
		text := fmt.Sprintf("point: %s, dc: %g V, meter_proved: %s, at: %s", c.point, c.dc, yesNo(c.proved), w.time(c.at))
		if c.ac >= 0 {
			text += fmt.Sprintf(", ac: %g V", c.ac)
		}
		return text
	}))
	list("  link", each(f.links, func(l linkFact) string {
		if l.removed == never {
			return "fitted: " + w.time(l.fitted)
		}
		return "fitted: " + w.time(l.fitted) + ", removed: " + w.time(l.removed)
	}))
	list("  before", each(f.before, w.beforeLine))
	list("observations", each(f.power, func(at int) string { return "test: under-power, result: clean, at: " + w.time(at) }))
	list("steps", each(f.steps, func(s stepFact) string { return "step: " + s.step + ", result: " + s.result + ", at: " + w.time(s.at) }))
	lines = append(lines, "rebuild:")
	lines = append(lines, rebuildLines(f.found, f.rebuilt)...)
	if f.done != never {
		lines = append(lines, "  done: "+w.time(f.done))
	}
	return strings.Join(lines, "\n") + "\n"
}

func each[T any](list []T, text func(T) string) []string {
	var out []string
	for _, e := range list {
		out = append(out, text(e))
	}
	return out
}

func yesNo(b bool) string { return map[bool]string{true: "yes", false: "no"}[b] }

var firstMidnight = time.Date(2026, 12, 1, 0, 0, 0, 0, time.FixedZone("", 3600))

func instant(minute int) time.Time {
	if minute == never {
		return time.Time{}
	}
	return firstMidnight.Add(time.Duration(minute) * time.Minute)
}

func (w writer) time(minute int) string {
	zone := pick(w, 3600, 3600, 0, -5*3600, 19800)
	return instant(minute).In(time.FixedZone("", zone)).Format(time.RFC3339)
}

func (w writer) beforeLine(b beforeFact) string {
	text := "step: " + b.step + ", at: " + w.time(b.at)
	add := func(key, value string) {
		if value != "" {
			text += ", " + key + ": " + value
		}
	}
	add("motor", b.motor)
	add("brake_resistor", b.resistor)
	add("bank", b.bank)
	add("probe", b.probe)
	add("clip_on", b.clip)
	add("supply", b.supply)
	if b.fuse > 0 {
		add("fuse", fmt.Sprintf("%g A", b.fuse))
	}
	if b.clips > 0 {
		add("earth_clips", fmt.Sprint(b.clips))
	}
	for _, k := range sortedKeys(b.yes) {
		add(k, "yes")
	}
	return text
}

// boardKeysOf gives what a board states, by path, in order.
func boardKeysOf(b boardFacts) [][2]string {
	rows := [][2]string{{"topology", b.topology}, {"supply", b.supply}, {"load.kind", b.load}, {"bus.highest", fmt.Sprint(b.highest, " V")}, {"bus.fuse", b.fuse},
		{"bus.halves", b.halves}, {"bus.reservoir", b.reservoir}, {"bus.capacitance", b.bank}, {"snubber.kind", b.snubber}, {"snubber.capacitance", b.capacitor},
		{"snubber.reservoir", b.recovery}, {"stages.brake.fitted", b.brake}, {"stages.brake.resistor", b.brakeOhm}, {"stages.auxiliary.fitted", b.aux},
		{"stages.auxiliary.primary_capacitance", b.auxCap}}
	if b.running > 0 {
		rows = append(rows, [2]string{"load.running_current", fmt.Sprint(b.running, " A")})
	}
	return rows
}

func boardLines(b boardFacts) []string { return nested(boardKeysOf(b)) }

// rebuildLines states what differs, as a rebuild does.
func rebuildLines(found, rebuilt boardFacts) []string {
	was := boardKeysOf(found)
	var rows [][2]string
	for k, row := range boardKeysOf(rebuilt) {
		if row != was[k] {
			rows = append(rows, row)
		}
	}
	if len(rows) == 0 {
		rows = append(rows, [2]string{"loop.inductance", "80 nH"})
	}
	return nested(rows)
}

// nested writes paths as a tree of flow maps two levels deep.
func nested(rows [][2]string) []string {
	groups, order := map[string]map[string][]string{}, []string{}
	var lines []string
	for _, row := range rows {
		path := strings.Split(row[0], ".")
		if row[1] == "" {
			continue
		}
		if len(path) == 1 {
			lines = append(lines, "  "+path[0]+": "+row[1])
			continue
		}
		if groups[path[0]] == nil {
			groups[path[0]], order = map[string][]string{}, append(order, path[0])
		}
		middle := strings.Join(path[1:len(path)-1], ".")
		groups[path[0]][middle] = append(groups[path[0]][middle], path[len(path)-1]+": "+row[1])
	}
	for _, g := range order {
		items := slices.Clone(groups[g][""])
		for _, m := range []string{"brake", "auxiliary"} {
			if len(groups[g][m]) > 0 {
				items = append(items, m+": {"+strings.Join(groups[g][m], ", ")+"}")
			}
		}
		lines = append(lines, "  "+g+": {"+strings.Join(items, ", ")+"}")
	}
	return lines
}
