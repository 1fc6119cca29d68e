// Package stress works out what a board does to its switches: the opening and closing edges of choppers and bridges
// with the network they have and the network chosen for the rebuild, how high the voltage may go, and whether that
// stays within the rating. Nothing is guessed in silence: every value a case does not state comes from a table with its
// interval and reason.
//
// A high side is the mirror image of a low side: the same circuit with the rails exchanged, so the same figures hold.
package stress

import (
	"math"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// Assumed is a value taken because the case does not state it, states it as assumed, or gives it in another form.
type Assumed struct {
	Key       string
	Value     quantity.Quantity // with the interval that was scanned
	Why       string
	MovesPeak float64 // V, highest less lowest peak over the interval, all else at its middle; 0 when it has none
}

// Need is a key without which something could not be worked out.
type Need struct {
	Key string
	For []string
}

// forMargin marks a need without which no margin is worked out at all.
const forMargin = "margin"

// input is one number of the edge: its middle and the interval it may lie in.
type input struct {
	key            string
	unit           quantity.Unit
	mid, low, high float64
	assumed        bool
	why            string
	edge           string // turn-off or turn-on where it moves only that one; the turn-on is graded in legs only
}

// at gives the point at share x of the interval: on a logarithmic scale, or straight where it may be nothing.
func (in input) at(x float64) float64 {
	if in.low > 0 {
		return in.low * math.Exp(x*math.Log(in.high/in.low))
	}
	return in.low + x*(in.high-in.low)
}

// share is where in the interval a value lies; the inverse of at.
func (in input) share(v float64) float64 {
	if in.low > 0 {
		return math.Log(v/in.low) / math.Log(in.high/in.low)
	}
	return (v - in.low) / (in.high - in.low)
}

// open tells whether the input has an interval at all.
func (in input) open() bool { return in.low < in.high }

// inputs are the numbers of one board's edge, in a fixed order.
type inputs struct {
	class   class
	bank    int
	farBank int // of the opposite switch of a leg
	values  []input
	at      map[string]int
	needs   []Need
}

func (in *inputs) add(i input) {
	in.at[i.key] = len(in.values)
	in.values = append(in.values, i)
}

func (in *inputs) has(key string) bool {
	_, ok := in.at[key]
	return ok
}

func (in *inputs) mid(key string) float64 {
	if k, ok := in.at[key]; ok {
		return in.values[k].mid
	}
	return 0
}

func (in *inputs) need(key string, forWhat ...string) {
	in.needs = append(in.needs, Need{key, forWhat})
}

// gather reads the numbers of one place for its edges; what is missing becomes typical or a need.
func gather(at place) *inputs {
	in := &inputs{class: classOf(at.own), at: map[string]int{}, bank: 1}
	g := gatherer{at.own, in}
	g.parallel(at.position)
	g.supply()
	g.current()
	g.device()
	g.loop()
	g.freewheel()
	g.recovery()
	g.network()
	g.cold()
	if at.leg() {
		g.far(at.far, at.opposite)
	}
	for key, edge := range oneEdge {
		if k, ok := in.at[key]; ok {
			in.values[k].edge = edge
		}
	}
	return in
}

// oneEdge lists the inputs that move only one of the edges.
var oneEdge = map[string]string{
	"switch.fall_time": turnOff, "switch.rise_slope": turnOff, "pwm.shortest_on_time": turnOff,
	"freewheel.forward_recovery.voltage": turnOff, "freewheel.forward_recovery.time": turnOff,
	"switch.turn_on_slope": turnOn, "switch.closing_slope": turnOn, "freewheel.recovery_charge": turnOn,
	"freewheel.recovery_time": turnOn, "freewheel.softness": turnOn,
	oppositeSwitch + "switch.turn_on_slope": turnOn, oppositeSwitch + "switch.closing_slope": turnOn,
}

// far takes what the opposite switch of a leg has otherwise than this one.
func (g gatherer) far(b measure.Board, position string) {
	in := &inputs{class: g.in.class, at: map[string]int{}, bank: 1}
	in.add(g.in.values[g.in.at["load.stall_current"]])
	gatherer{b, in}.parallel(position)
	gatherer{b, in}.device()
	g.in.farBank = in.bank
	for _, key := range []string{"switch.output_capacitance", "switch.package_inductance", "switch.turn_on_slope", "switch.closing_slope"} {
		own, other := g.in.values[g.in.at[key]], in.values[in.at[key]]
		if own.low != other.low || own.mid != other.mid || own.high != other.high {
			other.key = oppositeSwitch + key
			g.in.add(other)
		}
	}
}

type gatherer struct {
	b  measure.Board
	in *inputs
}

func (g gatherer) stated(key string) bool {
	_, ok := g.b.Quantity(key)
	return ok
}

func (g gatherer) value(key string) float64 {
	q, _ := g.b.Quantity(key)
	return q.Value
}

// known is an interval that other statements of the case give, with the reason; empty when they do not.
type known struct {
	interval
	why string
}

// take adds a key's stated value, or the typical one over its interval, or what other statements give. A value that is
// stated as assumed gets the relative width of the typical one, unless it states its own.
func (g gatherer) take(key string, unit quantity.Unit, typical interval, why string, given ...known) input {
	for _, k := range given {
		if k.why != "" {
			typical, why = k.interval, k.why
		}
	}
	i := input{key: key, unit: unit, low: typical.low, mid: typical.mid, high: typical.high, assumed: true, why: why}
	if q, ok := g.b.Quantity(key); ok {
		i.low, i.mid, i.high = q.Low, q.Value, q.High
		i.assumed, i.why = g.b.Assumed(key), ""
		if i.assumed {
			i.why = "stated as assumed"
			if !i.open() && typical.mid > 0 {
				i.low, i.high = i.mid*typical.low/typical.mid, i.mid*typical.high/typical.mid
			}
		}
	}
	g.in.add(i)
	return i
}

// parallel takes how many devices of a position share the current.
func (g gatherer) parallel(position string) {
	if _, ok := g.b.Quantity("positions.parallel"); !ok {
		g.in.add(input{key: "positions.parallel", unit: quantity.Count, low: 1, mid: 1, high: 1, assumed: true, why: "no parts are named: taken as a single device"})
		return
	}
	for _, p := range g.b.Positions() {
		if p.Name == position {
			g.in.bank = len(p.Parts)
		}
	}
}

// supply takes the bus. The highest voltage, when silent, is the mains at +10 %, a charged battery at +20 %, or the
// setting of a bench supply (judgement).
func (g gatherer) supply() {
	nominal, ok := g.b.Quantity("bus.nominal")
	if !ok {
		if nominal, ok = g.b.Quantity("bus.highest"); !ok {
			g.in.need("bus.nominal", "opening edge", forMargin)
		}
	}
	v := nominal.Value
	g.in.add(input{key: "bus.nominal", unit: quantity.Volt, low: v, mid: v, high: v})
	rise, why := interval{1, 1.10, 1.20}, "nominal and 10 %, up to 20 %: mains at its upper limit, judgement"
	switch supply, _ := g.b.Word("supply"); supply {
	case "battery":
		rise, why = interval{1, 1.20, 1.25}, "nominal and 20 %, up to 25 %: a battery on charge, judgement"
	case "bench-supply":
		rise, why = only(1), "a bench supply stays at its setting"
	}
	g.take("bus.highest", quantity.Volt, interval{v * rise.low, v * rise.mid, v * rise.high}, why)
	g.capacitors()
}

// capacitors takes the bus capacitor; its series resistance is 60 or 120 mΩ·mF over the capacitance, doubled when
// aged. Without a capacitance the bus is stiff.
func (g gatherer) capacitors() {
	if !g.stated("bus.capacitance") {
		g.in.need("bus.capacitance", "sag and ring of the bus (taken as stiff)")
		return
	}
	c := g.take("bus.capacitance", quantity.Farad, around(1, 1.25), "").mid
	esr := g.in.class.esrFixed
	if esr == 0 {
		esr = g.in.class.esrPerFarad / c
	}
	g.take("bus.esr", quantity.Ohm, around(esr, 2), g.in.class.judged()+"; the upper end is an aged capacitor")
	if g.stated("bus.esl") {
		g.take("bus.esl", quantity.Henry, around(1, 2), "")
	}
	g.take("bus.supply_inductance", quantity.Henry, around(g.in.class.supply, 3), g.in.class.judged())
}

// current takes the running current and the worst one: the highest of stall and trip plus what the current gains
// during the delay, V/L·delay.
func (g gatherer) current() {
	bank := g.value("switch.rated_current") * float64(g.in.bank)
	if !g.stated("load.running_current") && bank == 0 {
		g.in.need("load.running_current", "opening edge", forMargin)
	}
	running := g.take("load.running_current", quantity.Ampere, interval{0.25 * bank, 0.5 * bank, 0.75 * bank}, "half of the bank's rated current, judgement")
	worst := g.stall(running.high)
	switch top := max(bank, running.high); {
	case worst.mid > 0:
	case bank > 0:
		worst.low, worst.mid, worst.high, worst.assumed = min(running.high, top), top, top, true
		worst.why = "the bank's rated current, judgement: neither stall nor trip current is stated"
	default:
		worst.low, worst.mid, worst.high, worst.assumed = running.mid, 2*running.mid, 3*running.mid, true
		worst.why = "twice the running current, judgement: neither stall nor trip current is stated"
	}
	g.in.add(worst)
	if g.stated("protection.short_circuit_current") && g.saysYes("protection.soft_turn_off") {
		g.in.need("the slope of the soft turn-off", "turn-off from a short circuit")
	} else if !g.stated("protection.short_circuit_current") {
		g.in.need("protection.short_circuit_current", "turn-off from a short circuit")
	}
}

func (g gatherer) saysYes(key string) bool {
	word, _ := g.b.Word(key)
	return word == "yes"
}

// stall is the worst current that the case states, nothing when it states none; never below the running current.
func (g gatherer) stall(running float64) input {
	in := input{key: "load.stall_current", unit: quantity.Ampere}
	if q, ok := g.b.Quantity("load.stall_current"); ok {
		in.low, in.mid, in.high, in.assumed = q.Low, q.Value, q.High, g.b.Assumed("load.stall_current")
	}
	if trip := g.trip(); trip >= in.mid && trip > 0 {
		in.low, in.mid, in.high, in.assumed = trip, trip, trip, g.b.Assumed("protection.trip_current")
		in.why = "the trip current and what is gained until the trip acts"
	}
	if in.mid == 0 {
		return in
	}
	if in.assumed {
		in.why = "stated as assumed: taken within 30 %, judgement"
		in.low, in.high = min(in.low, 0.7*in.mid), max(in.high, 1.3*in.mid)
	}
	in.low, in.mid, in.high = max(in.low, running), max(in.mid, running), max(in.high, running)
	return in
}

// trip is the trip current and V/L·delay; 0 when it is not stated.
func (g gatherer) trip() float64 {
	trip, ok := g.b.Quantity("protection.trip_current")
	if !ok {
		return 0
	}
	delay, l := g.value("protection.trip_delay"), g.value("load.inductance")
	switch {
	case !g.stated("protection.trip_delay"):
		g.in.need("protection.trip_delay", "current gained before the trip acts (taken as none)")
	case l <= 0:
		g.in.need("load.inductance", "current gained before the trip acts (taken as none)")
	default:
		return trip.High + g.in.mid("bus.highest")/l*delay
	}
	return trip.High
}

// cold takes the coldest air, which lowers the rating; it bears on no edge.
func (g gatherer) cold() {
	g.take("cooling.coldest_air", quantity.Celsius, only(0), "0 °C where the case is silent")
}
