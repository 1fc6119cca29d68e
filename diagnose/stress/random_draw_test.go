package stress

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// farness is how far a random board goes from the usual values.
type farness struct {
	name   string
	share  float64 // of the boards
	beyond float64 // factor by which the usual range is widened either way
	whole  float64 // share of the keys that are drawn over all that the key table allows, its ends too
	most   int     // steps of the solver that one edge is given, so that the ordinary boards take the time
}

var farnesses = []farness{{"usual", 0.8, 1, 0, 150_000}, {"wide", 0.1, 30, 0, 20_000}, {"mixed", 0.05, 3, 0.15, 20_000}, {"whole", 0.05, 1, 1, 20_000}}

// farFrom draws how far a board goes.
func (r drawing) farFrom() farness {
	x := r.Float64()
	for _, f := range farnesses {
		if x -= f.share; x < 0 {
			return f
		}
	}
	return farnesses[0]
}

// drawnBoard is a random board with how it was drawn.
type drawnBoard struct {
	seed  uint64
	board measure.Board
	far   farness
}

// drawAnyBoard draws the board of a number. It keeps to the orders of the key table: a case file could state it.
func drawAnyBoard(n uint64) drawnBoard {
	r := drawing{rand.New(rand.NewPCG((n+1)*0x9e3779b97f4a7c15, (n+1)*0xd1b54a32d192ed03))}
	r.Uint64() // the first of neighbouring seeds are alike
	far, often := r.farFrom(), pick(r, 0.35, 0.7, 1)
	d := drawnBoard{seed: n, far: far, board: r.words(measure.Board{})}
	for _, k := range usualRanges {
		if conditionOfNothing(d.board, k.key) {
			continue
		}
		needed := k.key == "bus.nominal" || k.key == "switch.rated_voltage"
		if v := r.number(k, far); needed || r.chance(often) {
			d.board = put(d.board, k.key, v)
		}
	}
	d.board = r.network(lawful(d.board), far)
	d.board = r.places(d.board, far)
	return d
}

// put states a number in the unit of its key.
func put(b measure.Board, key string, v float64) measure.Board {
	k, ok := measure.LookupKey("board." + key)
	if !ok {
		panic("no key " + key)
	}
	return b.With(key, quantity.Of(v, k.Unit))
}

// conditionOfNothing tells whether a key is the condition of a value that is not stated.
func conditionOfNothing(b measure.Board, key string) bool {
	for _, value := range []string{"switch.output_capacitance", "switch.fall_time", "switch.turn_on_slope", "freewheel.recovery_charge"} {
		if strings.HasPrefix(key, value+".") {
			_, ok := b.Quantity(value)
			return !ok
		}
	}
	return false
}

// words draws what is stated in words; half of the boards leave one or the other out.
func (r drawing) words(b measure.Board) measure.Board {
	say := func(key string, words ...string) {
		if w := pick(r, words...); w != "" {
			b = b.WithWord(key, w)
		}
	}
	say("topology", "low-side-chopper", "high-side-chopper", "half-bridge", "h-bridge", "three-phase")
	say("switch.kind", "igbt", "mosfet", "sic-mosfet", "bipolar")
	say("snubber.kind", "", "none", "capacitor", "rc", "rcd", "clamp", "suppressor", "decoupling", "recovery")
	say("freewheel.fitted", "yes", "yes", "yes", "yes", "no", "unknown", "")
	say("supply", "battery", "bench-supply", "rectified-mains", "shared-bus", "")
	say("build", "", "", "surface-mount", "to-220", "to-247", "module-busbar", "module-wired")
	say("snubber.across", "", "", "switch", "freewheel")
	say("snubber.link.open", "", "no", "yes")
	say("snubber.return", "", "bus", "rail")
	say("protection.soft_turn_off", "", "", "no", "yes")
	return b
}

// number draws one value: on a logarithmic scale where it has one.
func (r drawing) number(k usualRange, far farness) float64 {
	row, _ := measure.LookupKey("board." + k.key)
	low, high := k.low/far.beyond, k.high*far.beyond
	if r.chance(far.whole) {
		switch x := r.Float64(); {
		case x < 0.05:
			return row.Min
		case x < 0.1:
			return row.Max
		}
		low, high = math.Max(row.Min, 1e-12*row.Max), row.Max
		if row.Min < 0 {
			return r.flat(row.Min, row.Max)
		}
	}
	if row.Min < 0 || k.low <= 0 {
		return r.flat(math.Max(k.low, row.Min), math.Min(k.high, row.Max))
	}
	if row.Max > row.Min {
		low, high = math.Max(low, row.Min), math.Min(high, row.Max)
	}
	return r.decade(low, high)
}

// network states the parts without which the network is none, nine times out of ten.
func (r drawing) network(b measure.Board, far farness) measure.Board {
	kind, _ := b.Word("snubber.kind")
	parts := networkParts[kind]
	if kind == "clamp" {
		parts = append(parts[:1:1], pick(r, "snubber.clamp_voltage", "snubber.resistance"), "pwm.frequency")
	}
	for _, k := range usualRanges {
		for _, key := range parts {
			if _, ok := b.Quantity(key); key == k.key && !ok && r.chance(0.9) {
				b = put(b, key, r.number(k, far))
			}
		}
	}
	if _, ok := b.Quantity("load.running_current"); !ok {
		b = put(b, "load.running_current", r.number(usualRange{"load.running_current", 1, 300}, far))
	}
	return lawful(b)
}

// places puts parts in parallel, and on some boards another device into one position.
func (r drawing) places(b measure.Board, far farness) measure.Board {
	positions := b.Positions()
	for _, p := range positions {
		if r.chance(0.3) {
			var parts []string
			for k := range 1 + r.IntN(6) {
				parts = append(parts, fmt.Sprintf("Q-%s-%d", p.Name, k))
			}
			b = b.WithParts(p.Name, parts...)
		}
	}
	if !r.chance(0.25) {
		return b
	}
	at := "positions." + pick(r, positions...).Name + "."
	for _, k := range usualRanges {
		own, is := strings.CutPrefix(k.key, "switch.")
		if is && !strings.Contains(own, ".") && r.chance(0.3) {
			b = put(b, at+own, r.number(k, far))
		}
	}
	return b
}

// lawOfOrder are the keys of which the first may not be above the second; the loader refuses them.
var lawOfOrder = [][2]string{{"bus.nominal", "bus.highest"}, {"load.running_current", "load.stall_current"},
	{"loop.link", "loop.inductance"}, {"loop.leg", "loop.inductance"}, {"gate.off_voltage", "gate.on_voltage"}}

// lawful takes out what contradicts something else.
func lawful(b measure.Board) measure.Board {
	for _, keys := range lawOfOrder {
		small, one := b.Quantity(keys[0])
		great, two := b.Quantity(keys[1])
		if one && two && small.Value > great.Value {
			b = b.Without(keys[1])
		}
	}
	if all, ok := b.Quantity("loop.inductance"); ok {
		link, _ := b.Quantity("loop.link")
		if leg, _ := b.Quantity("loop.leg"); link.Value+leg.Value > all.Value {
			b = b.Without("loop.leg")
		}
	}
	hertz, _ := b.Quantity("pwm.frequency")
	if on, ok := b.Quantity("pwm.shortest_on_time"); ok && on.Value*hertz.Value > 1 {
		b = b.Without("pwm.shortest_on_time")
	}
	if fitted, _ := b.Word("freewheel.fitted"); fitted == "no" {
		b = b.Without("freewheel").WithWord("freewheel.fitted", "no")
		if across, _ := b.Word("snubber.across"); across == "freewheel" {
			b = b.Without("snubber.across")
		}
	}
	if kind, _ := b.Word("snubber.kind"); kind == "none" {
		b = b.Without("snubber").WithWord("snubber.kind", "none")
	}
	if kind, _ := b.Word("switch.kind"); kind == "bipolar" {
		for _, key := range []string{"threshold", "collector_capacitance", "emitter_capacitance"} {
			b = b.Without("switch.gate_" + key)
		}
		b = b.Without("switch.internal_gate_resistance")
	}
	return b
}
