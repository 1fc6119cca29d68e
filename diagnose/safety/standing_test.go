package safety

import (
	"strings"
	"testing"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// A motor that is connected with its shaft free never counts as isolated, whatever kind of load is stated or not: only a
// load that cannot turn may stay connected, and only where the rebuilt board says so too.
func TestAFreeShaftIsNeverIsolated(t *testing.T) {
	for kind, still := range map[string]bool{"dc-motor": false, "induction-motor": false, "permanent-magnet-motor": false, "universal-motor": false,
		"stepper-motor": false, "other": false, "unknown": false, "": false, "winding": true, "resistive": true} {
		for motor, sound := range map[string]bool{motorUnplugged: true, motorShaftLocked: true, motorConnected: still, "": false} {
			board := "topology: low-side-chopper\nsupply: battery"
			if kind != "" {
				board += "\nload: {kind: " + kind + "}"
			}
			c := parse(t, board, "rebuild: {load: {inductance: 1 mH}}\n")
			c.Safety.Isolation = []measure.Isolation{{Locked: true, Motor: motor, OtherSources: "none", At: at(t, "09:40")}}
			if d := Check(c, Work{Need: NeedDeadCheck}, at(t, "10:12"), Evidence{}); d.Allowed != sound {
				t.Errorf("%q, %q: allowed %v, missing %+v", kind, motor, d.Allowed, d.Missing)
			}
			c.Rebuild.Done, c.Rebuild.Board = at(t, "08:00"), c.Board.WithWord("load.kind", "permanent-magnet-motor")
			if d := Check(c, Work{Need: NeedDeadCheck}, at(t, "10:12"), Evidence{}); d.Allowed != (sound && motor != motorConnected) {
				t.Errorf("%q, %q, rebuilt for a motor: allowed %v", kind, motor, d.Allowed)
			}
		}
	}
}

// Each store follows from what this very board states.
func TestStoresFollowFromTheBoard(t *testing.T) {
	for _, row := range []struct{ board, point, want string }{ // want: yes, doubt, no
		{"stages: {auxiliary: {fitted: no, primary_capacitance: unknown}}", PointAuxiliary, "no"},
		{"stages: {auxiliary: {fitted: no}}", PointAuxiliary, "no"},
		{"stages: {auxiliary: {primary_capacitance: none}}", PointAuxiliary, "no"},
		{"stages: {auxiliary: {fitted: unknown, primary_capacitance: none}}", PointAuxiliary, "no"},
		{"stages: {auxiliary: {primary_capacitance: unknown}}", PointAuxiliary, "doubt"},
		{"stages: {auxiliary: {fitted: unknown}}", PointAuxiliary, "doubt"},
		{"stages: {auxiliary: {fitted: yes}}", PointAuxiliary, "yes"},
		{"stages: {auxiliary: {fitted: yes, primary_capacitance: unknown}}", PointAuxiliary, "yes"},
		{"stages: {auxiliary: {primary_capacitance: 47 µF}}", PointAuxiliary, "yes"},
		{"title: any", PointAuxiliary, "no"},
		{"bus: {reservoir: 10 µF}", PointReservoir, "yes"},
		{"bus: {reservoir: unknown}", PointReservoir, "doubt"},
		{"bus: {reservoir: none}", PointReservoir, "no"},
		{"snubber: {kind: recovery}", PointReservoir, "yes"},
		{"snubber: {reservoir: 10 µF}", PointReservoir, "yes"},
		{"snubber: {reservoir: unknown}", PointReservoir, "doubt"},
		{"snubber: {kind: clamp}", PointClamp, "yes"},
		{"snubber: {kind: rcd, capacitance: 10 µF}", PointSnubber, "yes"},
		{"snubber: {kind: rcd, capacitance: 1 nF}", PointSnubber, "no"},
		{"bus: {halves: yes}", PointUpperHalf, "yes"},
		{"bus: {halves: unknown}", PointLowerHalf, "doubt"},
		{"bus: {halves: no}", PointLowerHalf, "no"},
		{"bus: {fuse: 63 A}", PointFused, "yes"},
		{"bus: {fuse: unknown}", PointFused, "doubt"},
		{"bus: {fuse: none}", PointFused, "no"},
		{"stages: {brake: {fitted: yes}}", PointBrake, "yes"},
		{"stages: {brake: {resistor: 47 Ω}}", PointBrake, "yes"},
		{"stages: {brake: {fitted: unknown}}", PointBrake, "doubt"},
		{"stages: {brake: {fitted: no}}", PointBrake, "no"},
		{"load: {kind: dc-motor}", PointPhases, "yes"},
		{"load: {kind: unknown}", PointPhases, "doubt"},
		{"load: {kind: resistive}", PointPhases, "no"},
	} {
		got := "no"
		if s, ok := storeAt(Stores(boardOf(t, "supply: battery\n"+row.board)), row.point); ok {
			got = map[bool]string{true: "doubt", false: "yes"}[s.ToCheck]
		}
		if got != row.want {
			t.Errorf("%s: %s %s, want %s", row.board, row.point, got, row.want)
		}
	}
}

// Once the rebuild is done its stores count beside those of the board as found; while it is planned they do not.
func TestTheRebuildAddsItsStores(t *testing.T) {
	const found = "supply: battery\nload: {kind: resistive}\nbus: {highest: 60 V, capacitance: 1 mF}\nsnubber: {kind: clamp, capacitance: 1 µF}\nstages: {brake: {fitted: unknown}}"
	for _, row := range []struct{ name, rebuild, want string }{
		{"none", "", "bus clamp brake?"},
		{"planned", "rebuild: {bus: {reservoir: 10 µF}}\n", "bus clamp brake?"},
		{"a reservoir more", "rebuild: {done: 2026-12-01T08:00:00+01:00, bus: {reservoir: 10 µF}}\n", "bus reservoir clamp brake?"},
		{"the clamp replaced", "rebuild: {done: 2026-12-01T08:00:00+01:00, snubber: {kind: recovery, reservoir: 10 µF}}\n", "bus reservoir brake? clamp"},
		{"the brake settled", "rebuild: {done: 2026-12-01T08:00:00+01:00, stages: {brake: {fitted: yes}}}\n", "bus clamp brake"},
		{"the brake taken out", "rebuild: {done: 2026-12-01T08:00:00+01:00, stages: {brake: {fitted: no}}}\n", "bus clamp brake?"},
		{"dated in the future", "rebuild: {done: 2026-12-01T18:00:00+01:00, bus: {reservoir: 10 µF}}\n", "bus reservoir clamp brake?"},
	} {
		c := parse(t, found, row.rebuild)
		if got := points(StoresAt(c, at(t, "10:12"))); got != row.want {
			t.Errorf("%s: %s, want %s", row.name, got, row.want)
		}
		var checked []string
		for _, p := range StatusOf(c, at(t, "10:12"), Evidence{}).Points {
			checked = append(checked, p.Store.Point)
		}
		if got := strings.Join(checked, " "); got != strings.ReplaceAll(row.want, "?", "") {
			t.Errorf("%s: to be proved %s, want %s", row.name, got, row.want)
		}
	}
}

// Of a store that both boards have the worse one counts.
func TestTheWorseOfTwoStoresCounts(t *testing.T) {
	c := parse(t, "supply: battery\nload: {kind: resistive}\nbus: {highest: 60 V, capacitance: 1 mF}", "rebuild: {done: 2026-12-01T08:00:00+01:00, bus: {highest: 50 V}}\n")
	for _, row := range []struct{ volt, farad, wantVolt, wantJoule float64 }{{50, 1e-3, 60, 1.8}, {80, 1e-3, 80, 3.2}, {50, 10e-3, 60, 18}, {80, 0.1e-3, 80, 3.2}} {
		c.Rebuild.Board = c.Board.With("bus.highest", quantity.Of(row.volt, quantity.Volt)).With("bus.capacitance", quantity.Of(row.farad, quantity.Farad))
		s := StoresAt(c, at(t, "10:12"))[0]
		near(t, "voltage", s.Voltage.Value, row.wantVolt, 1e-9)
		near(t, "energy", s.EnergyJ, row.wantJoule, 1e-9)
		near(t, "worst energy", s.WorstJ, 1.2*row.wantJoule, 1e-9)
	}
}

// What the found board surely has stays sure, and a rebuild of later adds no store to an earlier reading.
func TestDoubtAndTimeOfTheRebuild(t *testing.T) {
	c := parse(t, "supply: battery\nload: {kind: resistive}\nbus: {highest: 60 V, fuse: 63 A}", "rebuild: {done: 2026-12-01T18:00:00+01:00, bus: {fuse: unknown, reservoir: 10 µF}}\n")
	if got := points(StoresAt(c, at(t, "18:30"))); got != "bus fused-bank reservoir" {
		t.Errorf("stores %s", got)
	}
	c.Safety.Isolation = []measure.Isolation{sound(t, "09:40")}
	c.Safety.DeadChecks = []measure.DeadCheck{deadCheck(t, PointBus, "10:07"), deadCheck(t, PointFused, "10:07")}
	if outside, m := OutsideHoldPoint(c, measure.Observation{Result: "good", At: at(t, "10:12")}, Work{Need: NeedDead}, Evidence{}); outside {
		t.Errorf("the reservoir was not there yet: %+v", m)
	}
}
