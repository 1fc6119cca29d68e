package safety

import (
	"fmt"
	"math"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// The ranges a discharge is planned for; outside them a figure is more likely a slip of the unit than a board.
const (
	leastBus, mostBus                 = 1.0, 2000.0
	leastCapacitance, mostCapacitance = 1e-9, 100.0
	leastResistor, mostResistor       = 0.1, 10e6
)

// capacitorTolerance is added to a capacitance without a stated interval: electrolytics are made to ±20 % (from memory).
const capacitorTolerance = 0.20

// Input is what a discharge is planned from: InputOf a board, to which a resistor may be added, or bus, capacitance and
// resistor alone. A zero capacitance or resistor is chosen by Discharge, a zero bleeder is taken as open. Where Stores
// are given, bus and capacitance are those of the first one.
type Input struct {
	BusV         float64
	CapacitanceF float64
	// HighestF is the top of the capacitance's interval; 0 adds the usual tolerance.
	HighestF     float64
	ResistorOhm  float64
	BleederOhm   float64
	Supply       string  // as in a case: battery, bench-supply, rectified-mains, shared-bus; "" when not stated
	Stores       []Store // empty: the bank alone
	Needs        []Wanted
	MotorCanTurn bool // the load makes voltage when it turns, or may
	// BusUnknown takes the worst bus of a board whose supply is not stated, where no stores are given.
	BusUnknown bool
}

// Wanted is a key the case does not state, and what it would settle.
type Wanted struct{ Key, Why string }

// InputOf takes bus, stores and supply from a board; what is not stated is the worst case of its class, listed
// under Needs. InputAt counts the readings of a case, too, and is the one to plan a discharge by.
func InputOf(b measure.Board) Input { return inputOn(b, Stores(b)) }

// InputAt is InputOf the board of a case, with every store at least as high as the latest dead check that has come to
// be read there. A nil case gives an empty input.
func InputAt(c *measure.Case, now time.Time) Input {
	if c == nil {
		return Input{}
	}
	return inputOn(c.Board, StoresAt(c, now))
}

func inputOn(b measure.Board, stores []Store) Input {
	in := Input{Stores: stores, BusV: stores[0].Voltage.Value, CapacitanceF: stores[0].Capacitance.Value, Needs: wanted(b, stores)}
	if q, ok := positive(b, "bus.capacitance"); ok && q.High > q.Value {
		in.HighestF = q.High
	}
	if q, ok := positive(b, "bus.bleeder"); ok {
		in.BleederOhm = q.Value
	}
	in.Supply, _ = b.Word("supply")
	in.MotorCanTurn, _ = generates(b)
	return in
}

// wanted lists what would replace an assumption: figures first, then stores that the case neither states nor rules out.
func wanted(b measure.Board, stores []Store) []Wanted {
	var out []Wanted
	for _, path := range []string{"supply", "bus.halves", "bus.fuse", "bus.bleeder"} {
		if present(b, path) == silent {
			out = append(out, Wanted{path, silentKeys[path]})
		}
	}
	seen := map[string]bool{}
	for _, s := range stores {
		for _, f := range []Figure{s.Voltage, s.Capacitance} {
			if f.Basis == Assumed && !seen[f.Because] {
				seen[f.Because] = true
				out = append(out, Wanted{figureKey(s, f), f.String() + " is shown at " + s.Point + "; " + f.Because})
			}
		}
		if key := storeKey(s); s.ToCheck && s.PartOf == "" && !lists(out, key) {
			out = append(out, Wanted{key, "whether this board has: " + s.Title})
		}
	}
	return out
}

func lists(wanted []Wanted, key string) bool {
	for _, w := range wanted {
		if w.Key == key {
			return true
		}
	}
	return false
}

var silentKeys = map[string]string{
	"supply":      "which worst case is taken, and whether anything feeds the bus with the isolator open",
	"bus.halves":  "a split bank is discharged and checked half by half",
	"bus.fuse":    "a bank behind a fuse is discharged and checked behind it",
	"bus.bleeder": "how long the board would take by itself; without it no bleeder is counted on",
}

func figureKey(s Store, f Figure) string {
	volt := f.Unit == quantity.Volt
	switch {
	case s.Point == PointClamp && volt:
		return "snubber.clamp_voltage"
	case s.Point == PointReservoir && volt:
		return "switch.rated_voltage"
	case s.Point == PointReservoir:
		return "snubber.reservoir"
	case s.Point == PointClamp, s.Point == PointSnubber && !volt:
		return "snubber.capacitance"
	case s.Point == PointAuxiliary && !volt:
		return "stages.auxiliary.primary_capacitance"
	case volt:
		return "bus.highest"
	}
	return "bus.capacitance"
}

func storeKey(s Store) string {
	switch s.Point {
	case PointPhases:
		return "load.kind"
	case PointAuxiliary:
		return "stages.auxiliary.primary_capacitance"
	}
	return "bus.reservoir"
}

// Times are the seconds down to the three levels that matter, 0 for a level at or above the start.
type Times struct {
	To60V, To50V, To5V float64
}

// Level is a voltage and the seconds down to it.
type Level struct{ Volt, Seconds float64 }

// Levels gives the levels that lie below the voltage at the start, the highest first: a store that starts at or below
// one of them needs no time to it.
func (t Times) Levels() []Level {
	var out []Level
	for _, l := range []Level{{TouchVolts, t.To60V}, {LiveVolts, t.To50V}, {DeadVolts, t.To5V}} {
		if l.Seconds > 0 {
			out = append(out, l)
		}
	}
	return out
}

// timesFrom gives the times of one capacitor through one resistor, t = RC·ln(V0/V).
func timesFrom(ohm, farad, volt float64) Times {
	return Times{To60V: TimeTo(ohm, farad, volt, TouchVolts), To50V: TimeTo(ohm, farad, volt, LiveVolts), To5V: TimeTo(ohm, farad, volt, DeadVolts)}
}

// StoreDischarge is the discharge of one store through the chosen resistor. The figures are zero for a place without
// a capacitor of its own.
type StoreDischarge struct {
	Store        Store
	PeakCurrentA float64
	Wait         Times // with the capacitance at the top of its interval
	// FiveRC is how long the resistor stays on before the second reading, seconds: five time constants, and never less
	// than the time to 5 V, of a half also out of balance.
	FiveRC float64
	Uneven *Uneven // of a half of a split bank; nil for every other store
}

// Uneven is a half of a split bank at the worst of an imbalance: the whole voltage of the bus stands on it, the other half
// holds nothing. Energy and times are with the capacitance at the top of its interval.
type Uneven struct {
	Volt, EnergyJ, PeakCurrentA float64
	Wait                        Times
}

// Plan is how this board is made dead.
type Plan struct {
	// Withheld says why this plan must not be carried out: its resistor is as good as a short. Empty when it may; the
	// steps then connect nothing.
	Withheld []Missing
	// EnergyJ and TotalEnergyJ are at the marked values, WorstEnergyJ is TotalEnergyJ with every capacitance at the top
	// of its interval: the basis of the resistor, of the waiting times and of the cautions.
	BusV, CapacitanceF, EnergyJ, ChargeC float64
	BusBasis, CapacitanceBasis           Basis
	TotalEnergyJ, WorstEnergyJ           float64 // all stores
	Spread                               float64 // top of the capacitance's interval over its marked value, 1.2 where none is stated
	Resistor                             Resistor
	PeakCurrentA, PeakPowerW             float64 // V/R and V²/R at the first moment, at the bus
	TimeConstantS                        float64
	Nominal                              Times // with the capacitance as stated
	Wait                                 Times // with the capacitance at the top of its interval
	Stores                               []StoreDischarge
	Bleeder                              *Bleeder // nil where none is stated
	Recovery                             Recovery
	Steps                                []Step
	Cautions                             []Caution
	Limits                               []Limit // the thresholds of every source, side by side
	Needs                                []Wanted
}

// Discharge plans how the stores are emptied through a resistor. The error names the value that is out of range,
// what is allowed, and what to do.
func Discharge(in Input) (*Plan, error) {
	in, err := in.checked()
	if err != nil {
		return nil, err
	}
	p := &Plan{BusV: in.BusV, CapacitanceF: in.CapacitanceF, Needs: in.Needs, TotalEnergyJ: TotalEnergy(in.Stores),
		BusBasis: in.Stores[0].Voltage.Basis, CapacitanceBasis: in.Stores[0].Capacitance.Basis,
		EnergyJ: Energy(in.CapacitanceF, in.BusV), ChargeC: Charge(in.CapacitanceF, in.BusV)}
	p.WorstEnergyJ, p.Spread = worstEnergy(in.Stores), in.spread()
	p.Resistor = chooseResistor(in)
	p.Withheld = p.Resistor.withheld(in)
	r := p.Resistor.Ohm
	p.PeakCurrentA, p.PeakPowerW, p.TimeConstantS = in.BusV/r, in.BusV*in.BusV/r, r*in.CapacitanceF
	p.Nominal, p.Wait = timesFrom(r, in.CapacitanceF, in.BusV), timesFrom(r, in.HighestF, in.BusV)
	for _, s := range in.Stores {
		p.Stores = append(p.Stores, storeDischarge(in, s, r))
	}
	if in.BleederOhm > 0 {
		p.Bleeder = bleederOf(in)
	}
	p.Recovery = recoveryOf(in.BusV)
	p.Steps = steps(in, p)
	p.Limits = limits(hazardOf(in, p))
	p.Cautions = cautions(in, p)
	return p, nil
}

// storeDischarge takes the tolerance of the bank for every store.
func storeDischarge(in Input, s Store, ohm float64) StoreDischarge {
	d := StoreDischarge{Store: s}
	if s.Capacitance.Basis == None {
		return d
	}
	farad := s.Capacitance.Value * in.spread()
	d.PeakCurrentA, d.Wait = s.Voltage.Value/ohm, timesFrom(ohm, farad, s.Voltage.Value)
	d.FiveRC = math.Max(5*ohm*farad, d.Wait.To5V)
	if s.isHalf() {
		v := math.Max(in.BusV, s.Voltage.Value)
		d.Uneven = &Uneven{Volt: v, EnergyJ: Energy(farad, v), PeakCurrentA: v / ohm, Wait: timesFrom(ohm, farad, v)}
		d.FiveRC = math.Max(d.FiveRC, d.Uneven.Wait.To5V)
	}
	return d
}

func (s Store) isHalf() bool { return s.Point == PointUpperHalf || s.Point == PointLowerHalf }

// uneven is the worse of the two halves out of balance; nil where the bank is not split.
func (p *Plan) uneven() *Uneven {
	var worst *Uneven
	for _, d := range p.Stores {
		if d.Uneven != nil && (worst == nil || d.Uneven.EnergyJ > worst.EnergyJ) {
			worst = d.Uneven
		}
	}
	return worst
}

// unevenEnergy is the energy of all stores, one half of the bank holding the whole voltage of the bus in the bank's stead;
// 0 without halves.
func unevenEnergy(in Input) float64 {
	half, others := 0.0, 0.0
	for _, s := range in.Stores {
		switch {
		case s.isHalf():
			half = math.Max(half, Energy(s.Capacitance.Value*in.spread(), math.Max(in.BusV, s.Voltage.Value)))
		case s.Point != PointBus && s.PartOf != PointBus:
			others += s.WorstJ
		}
	}
	if half == 0 {
		return 0
	}
	return half + others
}

// checked gives the input with everything filled in that has a default, or the error of its first bad value.
func (in Input) checked() (Input, error) {
	if len(in.Stores) > 0 {
		in.BusV, in.CapacitanceF = in.Stores[0].Voltage.Value, in.Stores[0].Capacitance.Value
		in.BusUnknown = false
	}
	if in.BusUnknown {
		f := worstBus()
		in.BusV, in.Needs = f.Value, append(in.Needs, Wanted{"bus.highest", f.String() + " is shown; " + f.Because})
	}
	if err := inRange("bus voltage", in.BusV, leastBus, mostBus, quantity.Volt); err != nil {
		return in, err
	}
	if in.CapacitanceF == 0 && len(in.Stores) == 0 {
		in.CapacitanceF = worstBank
		if in.BusV <= lowBankVolts {
			in.CapacitanceF = worstLowBank
		}
		in.Stores = []Store{bareBank(in, Assumed)}
		in.Needs = append(in.Needs, Wanted{"bus.capacitance", in.Stores[0].Capacitance.String() + " is shown: " + largeBank})
	}
	if err := inRange("bus capacitance", in.CapacitanceF, leastCapacitance, mostCapacitance, quantity.Farad); err != nil {
		return in, err
	}
	if len(in.Stores) == 0 {
		in.Stores = []Store{bareBank(in, Stated)}
	}
	if !(in.HighestF > in.CapacitanceF) {
		in.HighestF = in.CapacitanceF * (1 + capacitorTolerance)
	}
	in.Stores = spreadBy(in.spread(), in.Stores)
	if in.ResistorOhm != 0 {
		if err := inRange("discharge resistor", in.ResistorOhm, leastResistor, mostResistor, quantity.Ohm); err != nil {
			return in, err
		}
	}
	if in.BleederOhm != 0 {
		if err := inRange("bleeder", in.BleederOhm, 1, 1e9, quantity.Ohm); err != nil {
			return in, err
		}
	}
	return in, nil
}

// spread is the top of the capacitance's interval over its value.
func (in Input) spread() float64 { return in.HighestF / in.CapacitanceF }

// largeBank says what stands in for a capacitance that is not stated.
const largeBank = "a large bank (judgement)"

func bareBank(in Input, basis Basis) Store {
	volt := Figure{Value: in.BusV, Unit: quantity.Volt, Basis: Stated}
	if in.BusUnknown {
		volt = worstBus()
	}
	bank := Figure{Value: in.CapacitanceF, Unit: quantity.Farad, Basis: basis}
	if basis == Assumed {
		bank.Because = "bus capacitance not stated: " + largeBank
	}
	return Store{Point: PointBus, Title: "bus capacitor bank", Where: "between the rails, at the capacitor terminals", Because: "given",
		Voltage:     volt,
		Capacitance: bank}.filled()
}

func inRange(what string, value, least, most float64, unit quantity.Unit) error {
	if value >= least && value <= most {
		return nil
	}
	shown := "not a number"
	if !math.IsNaN(value) && !math.IsInf(value, 0) {
		shown = format(value, unit)
	}
	return fmt.Errorf("%s: %s is out of range: %s to %s is allowed; check the prefix of the unit (what lies above is not bench work)",
		what, shown, format(least, unit), format(most, unit))
}
