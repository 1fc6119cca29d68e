package measure

import (
	"reflect"
	"testing"

	"drivemend/measure/quantity"
)

func TestPositions(t *testing.T) {
	tests := []struct {
		name, board string
		want        []Position
		parallel    float64 // 0: not known
	}{
		{"chopper", "{topology: low-side-chopper}", []Position{{"low", "", false, []string{"Q-LOW"}}}, 0},
		{"high chopper", "{topology: high-side-chopper}", []Position{{"high", "", true, []string{"Q-HIGH"}}}, 0},
		{"half bridge", "{topology: half-bridge, positions: {low: {parts: [Q3, Q4]}}}",
			[]Position{{"high", "", true, []string{"Q-HIGH"}}, {"low", "", false, []string{"Q3", "Q4"}}}, 2},
		{"bridge with brake", "{topology: h-bridge, stages: {brake: {resistor: 47 Ω}}, positions: {brake: {parts: [Q9, Q8]}, a-low: {parts: [Q1]}}}",
			[]Position{{"a-high", "a", true, []string{"Q-A-HIGH"}}, {"a-low", "a", false, []string{"Q1"}}, {"b-high", "b", true, []string{"Q-B-HIGH"}},
				{"b-low", "b", false, []string{"Q-B-LOW"}}, {"brake", "brake", false, []string{"Q9", "Q8"}}}, 1},
		{"three-phase", "{topology: three-phase, stages: {brake: {fitted: no}}}", []Position{{"u-high", "u", true, []string{"Q-U-HIGH"}},
			{"u-low", "u", false, []string{"Q-U-LOW"}}, {"v-high", "v", true, []string{"Q-V-HIGH"}}, {"v-low", "v", false, []string{"Q-V-LOW"}},
			{"w-high", "w", true, []string{"Q-W-HIGH"}}, {"w-low", "w", false, []string{"Q-W-LOW"}}}, 0},
		{"other", "{topology: other, positions: {x-high: {parts: [T1]}, sync: {}}}",
			[]Position{{"x-high", "x", true, []string{"T1"}}, {"sync", "", false, []string{"Q-SYNC"}}}, 1},
		{"not stated", "{}", []Position{{"switch", "", false, []string{"Q-SWITCH"}}}, 0},
		{"nobody knows", "{topology: unknown}", []Position{{"switch", "", false, []string{"Q-SWITCH"}}}, 0},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			b := mustParse(t, head+"board: "+tt.board+"\n").Case.Board
			if got := b.Positions(); !reflect.DeepEqual(got, tt.want) {
				t.Errorf("got %v, want %v", got, tt.want)
			}
			q, ok := b.Quantity("positions.parallel")
			if ok != (tt.parallel > 0) || q.Value != tt.parallel || q.Unit != quantity.Count {
				t.Errorf("parallel is %v, %v", q, ok)
			}
		})
	}
}

func TestPositionOverrides(t *testing.T) {
	b := mustParse(t, head+`board:
  topology: half-bridge
  switch: {kind: mosfet, rated_current: 40 A, fall_time: {value: 40 ns, voltage: 300 V}}
  positions: {low: {kind: igbt, fall_time: 96 ns, output_capacitance: {value: 1 nF, voltage: 25 V}}}
  assumed: [positions.low.fall_time]
`).Case.Board
	low, high := b.At("low"), b.At("high")
	for _, tt := range []struct {
		b    Board
		path string
		want float64
		ok   bool
	}{
		{high, "switch.fall_time", 40e-9, true}, {high, "switch.fall_time.voltage", 300, true}, {high, "switch.output_capacitance", 0, false},
		{low, "switch.fall_time", 96e-9, true}, {low, "switch.fall_time.voltage", 0, false}, {low, "switch.rated_current", 40, true},
		{low, "switch.output_capacitance.voltage", 25, true}, {b, "switch.fall_time", 40e-9, true},
	} {
		if q, ok := tt.b.Quantity(tt.path); ok != tt.ok || q.Value != tt.want {
			t.Errorf("%s is %v, %v; want %v", tt.path, q, ok, tt.want)
		}
	}
	if w, _ := low.Word("switch.kind"); w != "igbt" {
		t.Errorf("low is a %s", w)
	}
	if !low.Assumed("switch.fall_time") || high.Assumed("switch.fall_time") {
		t.Error("the assumption did not go with the override")
	}
}

func TestRebuiltBoard(t *testing.T) {
	c := mustParse(t, head+`board:
  topology: half-bridge
  switch: {kind: igbt, rated_voltage: 600 V, fall_time: {value: 40 ns, voltage: 300 V}}
  positions: {low: {parts: [Q1, Q2], rated_voltage: 500 V, rated_current: 20 A}}
  snubber: {kind: rcd, capacitance: 22 nF, resistance: 27 Ω, lead_inductance: 30 nH}
  gate: {turn_on_resistance: 10 Ω, turn_off_resistance: 10 Ω}
  loop: {inductance: 120 nH}
  cooling: {foster: [{resistance: 1 K/W, time: 1 s}, {resistance: 2 K/W, time: 2 s}]}
  assumed: [loop.inductance, gate]
rebuild:
  snubber: {kind: rc, resistance: 10 Ω}
  gate: {turn_off_resistance: 22 Ω}
  switch: {rated_voltage: 900 V, fall_time: 60 ns}
  positions: {high: {parts: [Q7, Q8]}, low: {rated_current: 30 A}}
  loop: {inductance: 80 nH}
  cooling: {foster: [{resistance: 3 K/W, time: 3 s}]}
  assumed: [loop.inductance]
`).Case
	b := c.Rebuild.Board
	for path, want := range map[string]float64{"snubber.resistance": 10, "gate.turn_on_resistance": 10, "gate.turn_off_resistance": 22,
		"switch.rated_voltage": 900, "switch.fall_time": 60e-9, "loop.inductance": 80e-9, "cooling.foster[1].resistance": 3} {
		if q, ok := b.Quantity(path); !ok || q.Value != want {
			t.Errorf("%s is %v, %v; want %v", path, q, ok, want)
		}
	}
	for _, path := range []string{"snubber.capacitance", "snubber.lead_inductance", "switch.fall_time.voltage", "cooling.foster[2].resistance"} {
		if q, ok := b.Quantity(path); ok {
			t.Errorf("%s is still %v", path, q)
		}
	}
	low := b.At("low")
	if q, _ := low.Quantity("switch.rated_voltage"); q.Value != 900 {
		t.Errorf("the new switch in position low is rated %v", q)
	}
	if q, _ := low.Quantity("switch.rated_current"); q.Value != 30 {
		t.Errorf("position low is rated %v", q)
	}
	if b.PositionOf("Q8") != "high" || b.PositionOf("Q2") != "low" || c.Board.PositionOf("Q8") != "" {
		t.Error("the parts are not laid over")
	}
	if !b.Assumed("loop.inductance") || b.Assumed("gate.turn_off_resistance") || !b.Assumed("gate.turn_on_resistance") {
		t.Error("what is assumed of the rebuilt board is wrong")
	}
	if q, _ := c.Board.Quantity("gate.turn_off_resistance"); q.Value != 10 {
		t.Errorf("the found board changed: %v", q)
	}
}

func TestWith(t *testing.T) {
	var none Board
	b := none.With("board.switch.fall_time", quantity.Of(40e-9, quantity.Second)).With("switch.fall_time.voltage", quantity.Of(300, quantity.Volt)).
		WithWord("topology", "half-bridge").WithParts("low", "Q1", "Q2")
	if _, ok := none.Quantity("switch.fall_time"); ok || none.Stated("switch") {
		t.Error("the empty board changed")
	}
	if q, _ := b.Quantity("switch.fall_time.voltage"); q.Value != 300 || b.PositionOf("Q2") != "low" {
		t.Errorf("board is %v", b)
	}
	if want := []string{"topology", "positions", "positions.low.parts", "switch.fall_time", "switch.fall_time.voltage"}; !reflect.DeepEqual(b.Paths(), want) {
		t.Errorf("paths are %v", b.Paths())
	}
	if names, ok := b.Names("positions.low.parts"); !ok || len(names) != 2 {
		t.Errorf("parts are %v", names)
	}
	b = b.With("switch.fall_time", quantity.Of(50e-9, quantity.Second))
	if _, ok := b.Quantity("switch.fall_time.voltage"); ok {
		t.Error("the condition of the old value stands beside the new one")
	}
	if b = b.Without("switch"); b.Stated("switch") || !b.Stated("positions.low") {
		t.Error("taking out went wrong")
	}
}

func TestUnknownAndNone(t *testing.T) {
	b := mustParse(t, head+"board: {bus: {capacitance: unknown, bleeder: none, halves: unknown}, switch: {kind: unknown}, freewheel: {fitted: false}}\n").Case.Board
	if _, ok := b.Quantity("bus.capacitance"); ok || !b.Unknown("bus.capacitance") {
		t.Error("an unknown capacitance counts as known")
	}
	if w, ok := b.Word("bus.bleeder"); w != "none" || !ok {
		t.Errorf("bleeder is %q", w)
	}
	if w, ok := b.Word("bus.halves"); w != "unknown" || !ok {
		t.Errorf("halves is %q", w)
	}
	if _, ok := b.Word("switch.kind"); ok || !b.Unknown("switch.kind") {
		t.Error("an unknown kind counts as known")
	}
	if w, _ := b.Word("freewheel.fitted"); w != "no" {
		t.Errorf("false is read as %q", w)
	}
}

func TestCurrentObservations(t *testing.T) {
	c := mustParse(t, head+`board: {topology: half-bridge, positions: {low: {parts: [Q1, Q2]}}}
observations:
  - {test: ohms, part: Q1, reading: 1 Ω}                                       # 0 replaced by 3: the part brings its position
  - {test: ohms, part: Q2, reading: 2 Ω}                                       # 1
  - {test: ohms, part: Q1, reading: 3 Ω, polarity: reverse}                    # 2
  - {test: ohms, part: Q1, position: low, reading: 4 Ω, note: again}           # 3
  - {test: ohms, part: Q1, reading: 5 Ω, state: lifted}                        # 4
  - {test: ohms, part: Q1, at: 2026-12-02T10:00:00+01:00, reading: 6 Ω}        # 5 after the rebuild, replaced by 7
  - {test: smell, at: 2026-12-01T10:00:00+01:00, result: burnt}                # 6 replaced by 8
  - {test: ohms, part: Q1, at: 2026-12-02T11:00:00+01:00, answer: skipped}     # 7
  - {test: smell, at: 2026-12-01T11:00:00+01:00, result: none}                 # 8
  - {test: smell, at: 2026-12-01T12:00:00.5Z, result: none}                    # 9 half a second after the rebuild
rebuild: {done: 2026-12-01T13:00:00+01:00}
`).Case
	want := map[int]bool{0: true, 5: true, 6: true}
	for i := range c.Observations {
		if c.Superseded(i) != want[i] {
			t.Errorf("observation %d: superseded is %v", i, c.Superseded(i))
		}
	}
	if n := len(c.Current()); n != 7 || c.Superseded(-1) || c.Superseded(99) {
		t.Errorf("%d observations count", n)
	}
	if !c.After(c.Observations[5]) || c.After(c.Observations[0]) {
		t.Error("before and after the rebuild are mixed up")
	}
}
