package safety

import (
	"fmt"
	"math"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// StoresAt lists the stores of a case as Stores does, each at the higher of what is stated or assumed and what the
// latest dead check that has come to be read there. A nil case gives nil.
func StoresAt(c *measure.Case, now time.Time) []Store {
	if c == nil {
		return nil
	}
	return historyOf(c, now, nil).stores()
}

// storesOf builds the stores twice: as the case states them, to know what was expected, and on a bus as high as read.
func storesOf(b measure.Board, h history) []Store {
	expected := storesOn(b, bankStore(b))
	if len(h.safety.DeadChecks) == 0 {
		return withWorst(b, expected)
	}
	bus := expected[0]
	for _, point := range []string{PointBus, PointFused, PointBrake} { // the places that carry the bus itself
		if v, d := h.read(point); v > bus.Voltage.Value {
			bus.Voltage = measured(v, d, bus.Voltage)
		}
	}
	stores := storesOn(b, bus.filled())
	for k, s := range stores {
		stores[k] = h.raised(b, s, voltageAt(expected, s))
	}
	return withWorst(b, stores)
}

func voltageAt(expected []Store, s Store) Figure {
	for _, e := range expected {
		if e.Point == s.Point {
			return e.Voltage
		}
	}
	return s.Voltage
}

// raised gives a store the voltage that its own latest check read, where that is above what was expected of it.
func (h history) raised(b measure.Board, s Store, expected Figure) Store {
	v, d := h.read(s.Point)
	if !(v > expected.Value) {
		return s
	}
	s.Expected = expected
	s.Voltage = measured(math.Max(v, s.Voltage.Value), d, expected)
	s.Alarm = alarm(b, s, v, d)
	return s.filled()
}

// read gives the DC of the latest check at a point, at the unkind end of its interval; 0 without one that is a voltage.
func (h history) read(point string) (float64, *measure.DeadCheck) {
	d := h.check(point)
	if d == nil || d.DC.Unit != quantity.Volt {
		return 0, nil
	}
	v := highestOf(d.DC)
	if math.IsInf(v, 0) {
		return 0, nil
	}
	return v, d
}

func measured(v float64, d *measure.DeadCheck, expected Figure) Figure {
	return Figure{Value: v, Unit: quantity.Volt, Basis: Measured,
		Because: fmt.Sprintf("read at %s at %s, above the %s expected", d.Point, clock(d.At), expected)}
}

// alarm names a reading above the stated highest voltage of the bus, at a store that hangs on the bus; "" otherwise.
func alarm(b measure.Board, s Store, v float64, d *measure.DeadCheck) string {
	switch s.Point {
	case PointClamp, PointReservoir, PointSnubber: // they stand above the bus by their work
		return ""
	}
	top, ok := positive(b, "bus.highest")
	if !ok || b.Assumed("bus.highest") || v <= top.High {
		return ""
	}
	return fmt.Sprintf("%s read at %s at %s, above bus.highest %s: keep away, the bank, its bleeders, the meter and its leads may be above their ratings",
		format(v, quantity.Volt), s.Point, clock(d.At), format(top.High, quantity.Volt))
}

// alarmUnlock is what to do about an alarm.
const alarmUnlock = "check that meter and leads are rated for it; find what raised it (a motor that drove the bus, a brake chopper that failed, a wrong supply); " +
	"if bus.highest was stated too low, correct it: drivemend enter CASE board.bus.highest …"

// alarmsOf collects the alarms of the stores, in their order.
func alarmsOf(stores []Store) []string {
	var out []string
	for _, s := range stores {
		if s.Alarm != "" {
			out = append(out, s.Alarm)
		}
	}
	return out
}

// withWorst fills in the energies with the capacitance at the top of its interval.
func withWorst(b measure.Board, stores []Store) []Store {
	spread := 1 + capacitorTolerance
	if q, ok := positive(b, "bus.capacitance"); ok && q.High > q.Value {
		spread = q.High / q.Value
	}
	return spreadBy(spread, stores)
}

// spreadBy gives the stores anew, with the worst energy at a capacitance that is spread times the marked one.
func spreadBy(spread float64, stores []Store) []Store {
	out := append([]Store(nil), stores...)
	for k := range out {
		out[k].WorstJ = out[k].EnergyJ * spread
	}
	return out
}
