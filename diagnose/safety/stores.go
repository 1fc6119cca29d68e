package safety

import (
	"fmt"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// The points of a dead check, as written in a case file.
const (
	PointBus       = "bus"
	PointUpperHalf = "upper-half"
	PointLowerHalf = "lower-half"
	PointFused     = "fused-bank"
	PointReservoir = "reservoir"
	PointClamp     = "clamp"
	PointSnubber   = "snubber"
	PointBrake     = "brake"
	PointPhases    = "phases"
	PointAuxiliary = "auxiliary"
)

// Store is one store of energy of a board, or one place where energy stored elsewhere comes out.
type Store struct {
	Point string // as a dead check names it
	Title string // plain words
	Where string // where the meter goes, to stand after "measure"
	// ToCheck marks a store that the case neither states nor rules out. It needs its dead check like any other.
	ToCheck bool
	Because string // why it is named, for ToCheck also which answer would settle it
	// Voltage is the highest the store may have stood at; Capacitance its own, of basis None for a place without one.
	Voltage, Capacitance Figure
	EnergyJ, ChargeC     float64 // ½CV² and CV of its own capacitance at its marked value; 0 without one
	WorstJ               float64 // EnergyJ with the capacitance at the top of its interval, +20 % where none is stated
	PartOf               string  // the point whose energy this is a part of, "" for a store of its own
	Expected             Figure  // where a dead check read more than was stated or assumed: what that was; else of basis None
	Alarm                string  // a reading above the stated highest voltage of the bus; "" without one
}

// Known tells whether the store is known to be there, and its voltage and capacitance rest on stated values alone.
func (s Store) Known() bool { return !s.ToCheck && !s.assumed() }

func (s Store) assumed() bool { return s.Voltage.Basis == Assumed || s.Capacitance.Basis == Assumed }

// doubt puts in words what is not known of a store, to stand behind its figures.
func (s Store) doubt() string {
	text := ""
	if s.assumed() {
		text += " (worst case assumed)"
	}
	if s.ToCheck {
		text += ", if fitted"
	}
	return text
}

// Stores lists the stores of energy of this very board, in the order in which they are proved dead. A store the
// case neither states nor rules out is named as to check where boards of this class usually have it: the halves of a
// bank above 450 V, the primary side of an auxiliary supply on a mains or shared bus, a motor (judgements). StoresAt
// counts the readings of a case, too.
func Stores(b measure.Board) []Store { return storesOf(b, history{}) }

// storesOn lists the stores of a board on a bus of known voltage.
func storesOn(b measure.Board, bus Store) []Store {
	stores := []Store{bus}
	for _, more := range []func(measure.Board, Store) []Store{halves, fusedBank, reservoir, clamp, snubber, brake, phases, auxiliary} {
		stores = append(stores, more(b, bus)...)
	}
	return stores
}

// TotalEnergy gives the energy of all stores at the marked values of their capacitances, in joules. A part of the bank
// counts only where the parts together hold more than the bank, as halves out of balance can.
func TotalEnergy(stores []Store) float64 {
	return total(stores, func(s Store) float64 { return s.EnergyJ })
}

// worstEnergy is TotalEnergy with every capacitance at the top of its interval.
func worstEnergy(stores []Store) float64 {
	return total(stores, func(s Store) float64 { return s.WorstJ })
}

func total(stores []Store, energy func(Store) float64) float64 {
	bank, halves, others := 0.0, 0.0, 0.0
	for _, s := range stores {
		switch {
		case s.Point == PointUpperHalf || s.Point == PointLowerHalf:
			halves += energy(s)
		case s.Point == PointBus || s.PartOf == PointBus:
			bank = max(bank, energy(s))
		default:
			others += energy(s)
		}
	}
	return max(bank, halves) + others
}

// energyText puts the energy of a store in words: "200.8 J at +20 % (167.3 J marked value)".
func (s Store) energyText() string {
	if s.EnergyJ <= 0 || !(s.WorstJ > s.EnergyJ*1.0005) {
		return format(s.EnergyJ, quantity.Joule)
	}
	return format(s.WorstJ, quantity.Joule) + " " + atTop(s.WorstJ/s.EnergyJ) + " (" + format(s.EnergyJ, quantity.Joule) + " marked value)"
}

// atTop names the basis of a worst figure: "at +20 %", the top of the capacitance's interval over its marked value.
func atTop(spread float64) string { return fmt.Sprintf("at +%.3g %%", 100*(spread-1)) }

func (s Store) filled() Store {
	if s.Capacitance.Basis != None {
		s.EnergyJ = Energy(s.Capacitance.Value, s.Voltage.Value)
		s.ChargeC = Charge(s.Capacitance.Value, s.Voltage.Value)
	}
	return s
}

func bankStore(b measure.Board) Store {
	v := busVoltage(b)
	return Store{
		Point: PointBus, Title: "bus capacitor bank", Where: "between the rails, at the capacitor terminals",
		Because: "every drive board has one",
		Voltage: v, Capacitance: bankCapacitance(b, v.Value),
	}.filled()
}

// halves are the two series banks of a split bus. In balance each holds half the voltage at twice the capacitance;
// with a balancing resistor open one of them can hold far more, and both keep their charge while the rails read zero.
func halves(b measure.Board, bus Store) []Store {
	p := present(b, "bus.halves")
	high := bus.Voltage.Value > oneCanVolts
	if p == absent || (p == silent && !high) {
		return nil
	}
	because := "the bank is split: the rails can read zero while a half is charged"
	if p != fitted {
		because = "bus.halves is not stated: a bank above " + format(oneCanVolts, quantity.Volt) + " is usually split (judgement); state bus.halves: no if it is not"
	}
	half := func(point, title, where string) Store {
		s := Store{Point: point, Title: title, Where: where, ToCheck: p != fitted, Because: because, PartOf: PointBus,
			Voltage: derived(bus.Voltage, bus.Voltage.Value/2), Capacitance: derived(bus.Capacitance, 2*bus.Capacitance.Value)}
		return s.filled()
	}
	return []Store{
		half(PointUpperHalf, "upper half of the split bank", "from the positive rail to the midpoint"),
		half(PointLowerHalf, "lower half of the split bank", "from the midpoint to the negative rail"),
	}
}

func derived(from Figure, value float64) Figure {
	f := Figure{Value: value, Unit: from.Unit, Basis: from.Basis, Because: from.Because}
	if f.Basis == Stated {
		f.Basis = Computed
	}
	return f
}

// fusedBank is the part of the bank behind a fuse; how much of it is not known, so it is shown as all of it.
func fusedBank(b measure.Board, bus Store) []Store {
	p := present(b, "bus.fuse")
	if p == absent || p == silent {
		return nil
	}
	return []Store{Store{Point: PointFused, Title: "bank behind the bus fuse", Where: "at the capacitor terminals behind the fuse, not at the rails",
		ToCheck: p == doubtful, Because: "a blown fuse cuts the bank off from the rails with its charge", PartOf: PointBus,
		Voltage: bus.Voltage, Capacitance: bus.Capacitance}.filled()}
}

// reservoir takes the energy of a recovery network. With its link open it is pumped up until something breaks down.
func reservoir(b measure.Board, bus Store) []Store {
	p := presentAny(b, "bus.reservoir", "snubber.reservoir")
	kind, _ := b.Word("snubber.kind")
	if kind != "recovery" && (p == silent || p == absent) {
		return nil
	}
	s := Store{Point: PointReservoir, Title: "reservoir capacitor of the recovery network", Where: "at the reservoir's own terminals",
		ToCheck: p == doubtful && kind != "recovery", Because: "with its link open it is pumped above the bus and keeps the charge",
		Voltage: pumped(b, bus), Capacitance: firstCapacitance(b, worstClamp, "snubber.reservoir", "bus.reservoir")}
	return []Store{s.filled()}
}

// clamp is the capacitor of a clamp, and of a network whose kind nobody could tell: it may be one.
func clamp(b measure.Board, bus Store) []Store {
	kind, _ := b.Word("snubber.kind")
	doubt := b.Unknown("snubber.kind")
	if kind != "clamp" && !doubt {
		return nil
	}
	because := "it stands above the bus; with its resistor open it keeps the charge"
	if doubt {
		because += "; snubber.kind is unknown: state it, or none"
	}
	v := pumped(b, bus)
	if q, ok := positive(b, "snubber.clamp_voltage"); ok {
		v = stated(b, "snubber.clamp_voltage", q)
	}
	s := Store{Point: PointClamp, Title: "clamp capacitor", Where: "at the clamp capacitor's own terminals", ToCheck: doubt, Because: because,
		Voltage: v, Capacitance: firstCapacitance(b, worstClamp, "snubber.capacitance")}
	return []Store{s.filled()}
}

// pumped is the voltage of a capacitor that every opening of the switch charges: at most what the switch withstands.
func pumped(b measure.Board, bus Store) Figure {
	because := "its voltage is not stated: it is pumped until the switch breaks down, here twice the highest bus (judgement)"
	value := 2 * bus.Voltage.Value
	if q, ok := positive(b, "switch.rated_voltage"); ok && q.Value >= bus.Voltage.Value {
		value, because = q.Value, "its voltage is not stated: it is pumped until the switch breaks down, here at its rated voltage (judgement)"
	}
	return Figure{Value: value, Unit: quantity.Volt, Basis: Assumed, Because: because}
}

func firstCapacitance(b measure.Board, worst float64, paths ...string) Figure {
	for _, path := range paths {
		if q, ok := positive(b, path); ok && q.Unit == quantity.Farad {
			return stated(b, path, q)
		}
	}
	return Figure{Value: worst, Unit: quantity.Farad, Basis: Assumed, Because: paths[0] + " not stated: a large one (judgement)"}
}

// snubber capacitors count from the charge at which a drive's residual charge is no longer exempt.
func snubber(b measure.Board, bus Store) []Store {
	kind, _ := b.Word("snubber.kind")
	if kind != "capacitor" && kind != "rc" && kind != "rcd" {
		return nil
	}
	s := Store{Point: PointSnubber, Title: "snubber capacitor across the switch", Where: "at the snubber capacitor's own terminals",
		Because: "its charge is above " + format(smallCoulombs, quantity.Coulomb) + " (limit from memory)",
		Voltage: bus.Voltage, Capacitance: firstCapacitance(b, worstSnubber, "snubber.capacitance")}
	s = s.filled()
	if s.ChargeC < smallCoulombs {
		return nil
	}
	return []Store{s}
}

func brake(b measure.Board, bus Store) []Store {
	p := presentAny(b, "stages.brake.fitted", "stages.brake.resistor", "stages.brake.on_voltage")
	for _, at := range b.Positions() {
		if at.Name == "brake" {
			p = fitted
		}
	}
	if p == silent || p == absent {
		return nil
	}
	return []Store{{Point: PointBrake, Title: "brake terminals", Where: "from each brake terminal to the negative rail", ToCheck: p == doubtful,
		Because: "the brake resistor and a shorted brake switch carry the bus voltage outside", Voltage: bus.Voltage, PartOf: PointBus}}
}

// still are the loads that cannot make a voltage by turning.
var still = map[string]bool{"resistive": true, "winding": true}

// generates tells whether the load can make a voltage: every load does that is not known to stand still.
func generates(b measure.Board) (can, known bool) {
	kind, ok := b.Word("load.kind")
	if !ok || kind == "" || kind == "unknown" || kind == "other" {
		return true, false
	}
	return !still[kind], true
}

func phases(b measure.Board, bus Store) []Store {
	can, known := generates(b)
	if !can {
		return nil
	}
	because := "a motor that turns charges the bus through the freewheel diodes"
	if !known {
		because += "; load.kind is not stated"
	}
	return []Store{{Point: PointPhases, Title: "motor terminals", Where: "from each motor terminal to both rails and to earth",
		ToCheck: !known, Because: because, Voltage: bus.Voltage}}
}

// auxiliary is the primary side of the auxiliary supply. Where it is neither stated nor ruled out, a board on the
// mains or on a shared bus is taken to have one of its own (judgement); one on a battery hangs on the bus itself.
func auxiliary(b measure.Board, bus Store) []Store {
	const path = "stages.auxiliary.primary_capacitance"
	p := presentAny(b, path, "stages.auxiliary.fitted")
	supply, _ := b.Word("supply")
	low := supply == "battery" || supply == "bench-supply"
	if p == absent || (p == silent && low) {
		return nil
	}
	s := Store{Point: PointAuxiliary, Title: "primary capacitor of the auxiliary supply", Where: "at the auxiliary supply's input capacitor",
		ToCheck: p != fitted, Because: "a diode or a blown fuse before it keeps its charge off the bus",
		Voltage: bus.Voltage, Capacitance: firstCapacitance(b, worstPrimary, path)}
	if s.ToCheck {
		s.Because += "; " + path + " is not stated. Where the supply hangs straight on the bus, the reading at the bus is its reading: enter it for both"
	}
	return []Store{s.filled()}
}
