package stress

import (
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"sync"
	"testing"

	"drivemend/measure"
)

// soundKeys are what a sound board states of everything but its network.
var soundKeys = with(pump, [][2]string{{"bus.highest", "360 V"}, {"bus.esl", "15 nH"}, {"load.stall_current", "110 A"}, {"load.inductance", "1 mH"},
	{"switch.rated_current", "100 A"}, {"switch.fall_time.gate_resistance", "10 Ω"}, {"gate.turn_off_resistance", "12 Ω"}, {"gate.turn_on_resistance", "15 Ω"},
	{"gate.on_voltage", "15 V"}, {"gate.off_voltage", "-5 V"}, {"switch.gate_threshold", "4 V"}, {"switch.gate_collector_capacitance", "120 pF"},
	{"switch.gate_emitter_capacitance", "5 nF"}, {"switch.internal_gate_resistance", "2 Ω"}, {"switch.turn_on_slope", "1000 A/µs"},
	{"freewheel.recovery_charge", "0.9 µC"}, {"freewheel.softness", "0.3"}, {"loop.link", "70 nH"}, {"loop.leg", "50 nH"}, {"pwm.frequency", "16 kHz"},
	{"pwm.shortest_on_time", "4 µs"}, {"protection.trip_current", "100 A"}, {"protection.trip_delay", "3 µs"}}...)

// soundNetworks are the networks of such boards: every kind there is, a recovery network with its tie broken too.
var soundNetworks = map[string][][2]string{
	"none":       {{"snubber.kind", "none"}},
	"capacitor":  {{"snubber.kind", "capacitor"}, {"snubber.capacitance", "10 nF"}, {"snubber.lead_inductance", "15 nH"}},
	"rc":         {{"snubber.kind", "rc"}, {"snubber.capacitance", "2.2 nF"}, {"snubber.resistance", "22 Ω"}, {"snubber.lead_inductance", "15 nH"}},
	"rcd":        with(diodeOfNetwork, [][2]string{{"snubber.kind", "rcd"}, {"snubber.capacitance", "22 nF"}, {"snubber.resistance", "27 Ω"}}...),
	"clamp":      with(diodeOfNetwork, [][2]string{{"snubber.kind", "clamp"}, {"snubber.capacitance", "470 nF"}, {"snubber.resistance", "2.2 kΩ"}}...),
	"suppressor": {{"snubber.kind", "suppressor"}, {"snubber.clamp_voltage", "430 V"}, {"snubber.slope_resistance", "0.3 Ω"}, {"snubber.capacitance", "1.5 nF"}},
	"decoupling": {{"snubber.kind", "decoupling"}, {"snubber.capacitance", "470 nF"}, {"snubber.resistance", "50 mΩ"}},
	"recovery": with(diodeOfNetwork, [][2]string{{"snubber.kind", "recovery"}, {"snubber.reservoir", "2.2 µF"}, {"snubber.link.inductance", "1 µH"},
		{"snubber.link.resistance", "0.2 Ω"}}...),
	"recovery, tie broken": with(diodeOfNetwork, [][2]string{{"snubber.kind", "recovery"}, {"snubber.reservoir", "2.2 µF"}, {"snubber.link.open", "yes"}}...),
}

var everyTopology = []string{"low-side-chopper", "high-side-chopper", "half-bridge", "h-bridge", "three-phase"}

// impossible is a sound board with one or two values that no board has.
type impossible struct {
	name  string
	board measure.Board
}

// wellBuilt is a sound board.
func wellBuilt(t *testing.T, topology, network string) measure.Board {
	return boardOf(t, with(soundKeys, soundNetworks[network]...)...).WithWord("topology", topology)
}

// utmost are the least and the most that the key table allows, and nothing at all, which the loader refuses where the least
// is more.
func utmost(key string) []float64 {
	row, _ := measure.LookupKey("board." + key)
	list := []float64{row.Min, row.Max}
	if row.Min > 0 {
		list = append(list, 0)
	}
	return list
}

// spoil puts a key at one of its ends; the value that a condition belongs to stays.
func spoil(b measure.Board, key string, v float64) measure.Board {
	for _, value := range []string{"switch.fall_time", "switch.output_capacitance", "freewheel.recovery_charge", "switch.turn_on_slope"} {
		if strings.HasPrefix(key, value+".") {
			if _, ok := b.Quantity(value); !ok {
				return b
			}
		}
	}
	return put(b, key, v)
}

// impossibleBoards are every network with every key at each of its ends, over the topologies in turn, and random pairs.
func impossibleBoards(t *testing.T) []impossible {
	var out []impossible
	n := 0
	for _, network := range sortedNames(soundNetworks) {
		for _, k := range usualRanges {
			if strings.HasPrefix(k.key, "snubber.") && network == "none" {
				continue
			}
			for turn, v := range utmost(k.key) {
				if turn == 2 && n%4 != 0 { // what the loader refuses anyhow
					n++
					continue
				}
				topology := everyTopology[n%len(everyTopology)]
				n++
				out = append(out, impossible{fmt.Sprintf("%s, %s, %s %g", topology, network, k.key, v), spoil(wellBuilt(t, topology, network), k.key, v)})
			}
		}
	}
	r := drawing{rand.New(rand.NewPCG(7, 11))}
	for range 150 {
		topology, network := pick(r, everyTopology...), pick(r, sortedNames(soundNetworks)...)
		one, two := pick(r, usualRanges...).key, pick(r, usualRanges...).key
		v, w := pick(r, utmost(one)...), pick(r, utmost(two)...)
		out = append(out, impossible{fmt.Sprintf("%s, %s, %s %g, %s %g", topology, network, one, v, two, w), spoil(spoil(wellBuilt(t, topology, network), one, v), two, w)})
	}
	return out
}

func sortedNames(m map[string][][2]string) []string {
	var names []string
	for name := range m {
		names = append(names, name)
	}
	slices.Sort(names)
	return names
}

// stepsOfImpossible is how many steps an edge is given here; what takes more is refused, as a margin refuses what takes
// mostSteps.
const stepsOfImpossible = 3000

// faultsOf solves the graded edges and the cut one of a board's first place at the highest bus and worst current. Each
// gives figures, or a refusal that names a key and says what to do.
func faultsOf(b measure.Board) (solved, refused int, faults []string) {
	defer func() {
		if r := recover(); r != nil {
			faults = append(faults, fmt.Sprintf("panic: %v", r))
		}
	}()
	problems, needs := prepareAll(b)
	if len(problems) == 0 {
		return 0, 1, faultsOfNeeds(needs)
	}
	p := problems[0]
	s := p.highest().quick()
	s.most = stepsOfImpossible
	for _, g := range append([]graded{isCut}, p.edges...) {
		w := walked{}
		w.edge(g.name+" "+g.shape, p, g, s)
		solved, refused = solved+w.edges-w.refused-w.cut, refused+w.refused+w.cut
		faults = append(faults, w.faults...)
	}
	return solved, refused, faults
}

// faultsOfNeeds looks whether one says why there is no margin, by a key that there is.
func faultsOfNeeds(needs []Need) []string {
	for _, n := range needs {
		if _, known := measure.LookupKey(n.Key); known && slices.Contains(n.For, forMargin) && len(n.For) > 1 {
			return nil
		}
	}
	return []string{fmt.Sprintf("no place, and no need that says why: %v", needs)}
}

// Boards that cannot be: every key of the edge at nothing, at the least and at the most that the key table allows, alone
// and in pairs, with every network. Nothing panics or takes for ever; every edge has figures that are numbers, or a
// refusal that names what to change.
func TestImpossibleBoards(t *testing.T) {
	boards := impossibleBoards(t)
	var sum sync.Mutex
	solved, refused, shown := 0, 0, 0
	_ = each(len(boards), func(k int) error {
		good, bad, faults := faultsOf(boards[k].board)
		sum.Lock()
		defer sum.Unlock()
		solved, refused = solved+good, refused+bad
		if shown += min(1, len(faults)); len(faults) > 0 && shown < 20 {
			t.Errorf("%s: %s", boards[k].name, strings.Join(faults, "; "))
		}
		return nil
	})
	t.Logf("%d boards: %d edges solved, %d refused", len(boards), solved, refused)
	if solved < 3*refused {
		t.Errorf("only %d edges solved, %d refused", solved, refused)
	}
}

// notNumbers walks everything that a margin shows and gives the places of what is no number.
func notNumbers(at string, v reflect.Value) []string {
	var out []string
	switch v.Kind() {
	case reflect.Float64:
		if x := v.Float(); math.IsNaN(x) || math.IsInf(x, 0) {
			out = append(out, fmt.Sprintf("%s %g", at, x))
		}
	case reflect.Pointer:
		if !v.IsNil() {
			out = notNumbers(at, v.Elem())
		}
	case reflect.Slice:
		for k := range v.Len() {
			out = append(out, notNumbers(fmt.Sprintf("%s[%d]", at, k), v.Index(k))...)
		}
	case reflect.Struct:
		for k := range v.NumField() {
			if f := v.Type().Field(k); f.IsExported() {
				out = append(out, notNumbers(at+"."+f.Name, v.Field(k))...)
			}
		}
	}
	return out
}

// What a board states that the edges do not follow to the end is named beside its figures, and takes the verdict of within
// from a board that has it otherwise.
func TestLimitsAreNamed(t *testing.T) {
	for _, c := range []struct {
		keys [][2]string
		want string
	}{
		{[][2]string{{"bus.capacitance", "4.7 nF"}}, "snubber.capacitance 10 nF is larger than the bus bank (bus.capacitance 4.7 nF)"},
		{[][2]string{{"snubber.capacitance", "10 mF"}}, "is larger than the bus bank"},
		{[][2]string{{"pwm.shortest_on_time", "1 ns"}}, "pwm.shortest_on_time 1 ns is shorter than one turn"},
		{[][2]string{{"snubber.kind", "suppressor"}, {"snubber.clamp_voltage", "270 V"}, {"snubber.slope_resistance", "0.1 Ω"}, {"snubber.capacitance", "1 nF"}},
			"conduct at 270 V (snubber.clamp_voltage), under the highest bus"},
	} {
		m := computed(t, soundBoard(t, c.keys...))
		f := m.AsFound
		if f == nil {
			t.Errorf("%v: no figures, needs %v", c.keys, m.Needs)
			continue
		}
		t.Logf("%v: %s, %q", c.keys, f.Verdict, f.Rests)
		if f.Verdict == Within || !strings.Contains(strings.Join(f.Rests, "; "), c.want) {
			t.Errorf("%v: %s, rests on %q, want %q", c.keys, f.Verdict, f.Rests, c.want)
		}
		for _, odd := range notNumbers("margin", reflect.ValueOf(m)) {
			t.Errorf("%v: %s", c.keys, odd)
		}
	}
}

// What is impossible by itself does not come as far as an edge: the loader says where it stands, what is allowed and what
// to do.
func TestImpossibleValuesAreRefused(t *testing.T) {
	for _, c := range []struct {
		line string
		want []string
	}{
		{"  switch: {fall_time: 0 ns}", []string{"board.switch.fall_time", "from 1 ns to 1 ms"}},
		{"  loop: {inductance: 0 nH}", []string{"board.loop.inductance", "from 100 pH to 1 mH"}},
		{"  bus: {nominal: 0 V}", []string{"board.bus.nominal", "from 1 V to 20 kV"}},
		{"  pwm: {frequency: 100 kHz, shortest_on_time: 20 us}", []string{"board.pwm.shortest_on_time", "does not fit in the period", "fit in one period"}},
	} {
		_, err := measure.Parse("bench.yaml", []byte("drivemend: 1\ncase: bench\nboard:\n  topology: half-bridge\n"+c.line+"\n"))
		if err == nil {
			t.Errorf("%s loads", c.line)
			continue
		}
		for _, want := range append(c.want, "bench.yaml:5:") {
			if !strings.Contains(err.Error(), want) {
				t.Errorf("%s: %q lacks %q", c.line, err, want)
			}
		}
	}
}

// A board that the solver gives up on is no hang and no bare error: the need says at which position and edge, which of
// the stated values are far from what boards have, and what to do.
func TestRefusalNamesWhatToChange(t *testing.T) {
	b := soundBoard(t, [2]string{"load.stall_current", "20 A"}, [2]string{"snubber.kind", "capacitor"}, [2]string{"snubber.capacitance", "10 mF"},
		[2]string{"snubber.lead_inductance", "0 nH"}, [2]string{"switch.output_capacitance", "0.1 pF"}, [2]string{"loop.damping_ratio", "0"})
	m := computed(t, b)
	if m.AsFound != nil {
		t.Fatalf("the board was to be refused: %+v", m.AsFound.P999)
	}
	for _, n := range m.Needs {
		if n.Key != unsolved {
			continue
		}
		text := strings.Join(n.For, "; ")
		t.Log(text)
		for _, want := range []string{"position low", "turn-off", "snubber.capacitance 10000 µF (usually 100 pF to 2.2 µF)", "switch.output_capacitance", "check the prefix"} {
			if !strings.Contains(text, want) {
				t.Errorf("%q lacks %q", text, want)
			}
		}
		return
	}
	t.Errorf("no need says why: %v", m.Needs)
}

// Without a freewheel path the load hangs on the leg, behind a decoupling network's link, not before it; the circuit could
// not be solved otherwise. What the load's inductance drives the chip to does not ask for the network.
func TestDecouplingWithoutFreewheel(t *testing.T) {
	keys := with(local, [2]string{"freewheel.fitted", "no"}, [2]string{"load.inductance", "20 µH"})
	for _, solve := range []edgeShape{scene.cut, scene.gateLimited} {
		decoupled := peakOf(t, problemOf(t, boardOf(t, keys...)).nominal(), solve)
		bare := peakOf(t, problemOf(t, boardOf(t, with(keys, [2]string{"snubber.kind", "none"})...)).nominal(), solve)
		if relative(decoupled, bare) > 0.02 {
			t.Errorf("decoupled %.0f V, bare %.0f V", decoupled, bare)
		}
	}
}

// A clamp whose search begins at no voltage is refused: it was taken as one that had not been looked for yet, without end.
func TestClampThatHoldsNothing(t *testing.T) {
	b := put(put(wellBuilt(t, "low-side-chopper", "clamp"), "bus.nominal", 0), "bus.highest", 0)
	_, err := problemOf(t, b).highest().settled()
	if err == nil || !strings.Contains(err.Error(), "state snubber.clamp_voltage") {
		t.Errorf("%v", err)
	}
}

// A damping ratio next to nothing damps as none does; as a resistor beside the loop it had a time constant that no step of
// the solver could follow.
func TestNextToNoDamping(t *testing.T) {
	with := func(ratio float64) scene {
		return problemOf(t, put(wellBuilt(t, "half-bridge", "rc"), "loop.damping_ratio", ratio)).highest()
	}
	for _, solve := range []edgeShape{scene.cut, scene.gateLimited, scene.turnOn} {
		if none, tiny := peakOf(t, with(0), solve), peakOf(t, with(1e-10), solve); none != tiny {
			t.Errorf("%g V without damping, %g V with next to none", none, tiny)
		}
	}
}

// A rating under the bus is over, with its figures, whatever a reservoir does that climbs from the bus to the rating.
func TestRatingUnderTheBus(t *testing.T) {
	for _, network := range []string{"none", "recovery, tie broken"} {
		m := computed(t, put(wellBuilt(t, "low-side-chopper", network), "switch.rated_voltage", 250))
		if m.AsFound == nil || m.AsFound.Verdict != OverIt || m.AsFound.PumpUp != nil {
			t.Errorf("%s: %+v, needs %v", network, m.AsFound, m.Needs)
		}
	}
}
