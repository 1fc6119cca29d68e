package safety

import (
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

// drawn is a board of random figures whose capacitance is known without an interval.
func drawn(t *rapid.T) Input {
	in := Input{BusV: rapid.Float64Range(1, 2000).Draw(t, "bus"), CapacitanceF: math.Exp(rapid.Float64Range(math.Log(1e-8), math.Log(10)).Draw(t, "log C")),
		ResistorOhm: math.Exp(rapid.Float64Range(math.Log(100), math.Log(1e5)).Draw(t, "log R")), BleederOhm: 1e5}
	in.HighestF = in.CapacitanceF * rapid.Float64Range(1.01, 2).Draw(t, "spread")
	return in
}

func plan(t *rapid.T, in Input) *Plan {
	p, err := Discharge(in)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// same fails when two figures differ by more than 1e-12 of the wanted one.
func same(t *rapid.T, what string, got, want float64) {
	if !(math.Abs(got-want) <= 1e-12*math.Abs(want)) {
		t.Fatalf("%s: got %.17g, want %.17g", what, got, want)
	}
}

func TestClosedForms(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		in := drawn(t)
		p := plan(t, in)
		v, c, r := in.BusV, in.CapacitanceF, in.ResistorOhm
		same(t, "energy", p.EnergyJ, c*v*v/2)
		same(t, "charge", p.ChargeC, c*v)
		same(t, "energy by charge", p.EnergyJ, p.ChargeC*p.ChargeC/(2*c))
		same(t, "worst energy", p.WorstEnergyJ, in.HighestF*v*v/2)
		same(t, "peak current", p.PeakCurrentA, v/r)
		same(t, "peak power", p.PeakPowerW, v*v/r)
		same(t, "time constant", p.TimeConstantS, r*c)
		same(t, "bleeder power", p.Bleeder.PowerW, v*v/1e5)
		for level, to := range map[float64][3]float64{
			60: {p.Nominal.To60V, p.Wait.To60V, p.Bleeder.Nominal.To60V},
			50: {p.Nominal.To50V, p.Wait.To50V, p.Bleeder.Nominal.To50V},
			5:  {p.Nominal.To5V, p.Wait.To5V, p.Bleeder.Nominal.To5V},
		} {
			if v <= level {
				if to != [3]float64{} {
					t.Fatalf("%g V to %g V: %v", v, level, to)
				}
				continue
			}
			same(t, "time", to[0], r*c*math.Log(v/level))
			same(t, "wait", to[1], r*in.HighestF*math.Log(v/level))
			same(t, "bleeder", to[2], 1e5*c*math.Log(v/level))
		}
	})
}

// Twice the capacitance, the resistance or the voltage.
func TestScalingLaws(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		in := drawn(t)
		in.BusV = rapid.Float64Range(70, 1000).Draw(t, "bus again")
		p := plan(t, in)
		more := in
		more.CapacitanceF, more.HighestF = 2*in.CapacitanceF, 2*in.HighestF
		q := plan(t, more)
		same(t, "energy by C", q.WorstEnergyJ, 2*p.WorstEnergyJ)
		same(t, "time by C", q.Wait.To50V, 2*p.Wait.To50V)
		same(t, "current by C", q.PeakCurrentA, p.PeakCurrentA)
		more = in
		more.ResistorOhm = 2 * in.ResistorOhm
		q = plan(t, more)
		same(t, "time by R", q.Nominal.To5V, 2*p.Nominal.To5V)
		same(t, "power by R", q.PeakPowerW, p.PeakPowerW/2)
		more = in
		more.BusV = 2 * in.BusV
		q = plan(t, more)
		same(t, "energy by V", q.EnergyJ, 4*p.EnergyJ)
		same(t, "charge by V", q.ChargeC, 2*p.ChargeC)
		same(t, "recovery by V", q.Recovery.HighV, 2*p.Recovery.HighV)
		if extra := q.Nominal.To60V - p.Nominal.To60V; math.Abs(extra-p.TimeConstantS*math.Ln2) > 1e-12*q.Nominal.To60V {
			t.Fatalf("twice the voltage takes RC·ln 2 longer: %g", extra)
		}
	})
}

// What flows through the resistor until a level, integrated, is what left the capacitor; and the mean power over the first
// time constant is (1−e⁻²)/2 of the peak.
func TestEnergyThroughTheResistor(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		in := drawn(t)
		in.BusV = rapid.Float64Range(61, 2000).Draw(t, "bus again")
		p := plan(t, in)
		power := func(at float64) float64 { return p.PeakPowerW * math.Exp(-2*at/p.TimeConstantS) }
		for level, to := range map[float64]float64{60: p.Nominal.To60V, 50: p.Nominal.To50V, 5: p.Nominal.To5V} {
			if got, want := integral(power, to), p.EnergyJ-Energy(in.CapacitanceF, level); math.Abs(got-want) > 1e-12*p.EnergyJ {
				t.Fatalf("to %g V: %.15g J through the resistor, %.15g J left the bank", level, got, want)
			}
		}
		same(t, "average power", p.Resistor.AverageW, integral(power, p.TimeConstantS)/p.TimeConstantS)
	})
}

// integral is the five-point Gauss rule on 64 pieces of equal length.
func integral(f func(float64) float64, to float64) float64 {
	inner, outer := math.Sqrt(5-2*math.Sqrt(10.0/7))/3, math.Sqrt(5+2*math.Sqrt(10.0/7))/3
	nearWeight, farWeight := (322+13*math.Sqrt(70))/900, (322-13*math.Sqrt(70))/900
	const pieces = 64
	half, sum := to/(2*pieces), 0.0
	for i := range pieces {
		mid := half * float64(2*i+1)
		sum += 128.0/225*f(mid) + nearWeight*(f(mid-inner*half)+f(mid+inner*half)) + farWeight*(f(mid-outer*half)+f(mid+outer*half))
	}
	return sum * half
}

// The halves of a split bank: in balance they hold what the bank holds, in the same time constant doubled; out of balance
// one of them holds twice the bank.
func TestHalvesOfASplitBank(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(130, 2000).Draw(t, "bus")
		c := rapid.Float64Range(1e-5, 0.1).Draw(t, "capacitance")
		in := Input{ResistorOhm: 2200, HighestF: 1.1 * c, Stores: splitStores(v, c)}
		p := plan(t, in)
		bus, half := p.Stores[0], p.Stores[1]
		if bus.Uneven != nil || half.Uneven == nil || p.Stores[2].Uneven == nil {
			t.Fatalf("the halves alone can be out of balance: %+v", p.Stores)
		}
		same(t, "both halves", half.Store.WorstJ+p.Stores[2].Store.WorstJ, bus.Store.WorstJ)
		same(t, "half the voltage", half.Wait.To60V, 2*2200*1.1*c*math.Log(v/2/60))
		same(t, "whole voltage", half.Uneven.Wait.To60V, 2*bus.Wait.To60V)
		same(t, "whole voltage to 5 V", half.Uneven.Wait.To5V, 2*bus.Wait.To5V)
		same(t, "twice the energy", half.Uneven.EnergyJ, 2*bus.Store.WorstJ)
		same(t, "same current", half.Uneven.PeakCurrentA, bus.PeakCurrentA)
		same(t, "the resistor takes it", p.Resistor.UnevenJ, 2*bus.Store.WorstJ)
		same(t, "the bank itself", p.WorstEnergyJ, bus.Store.WorstJ)
		for _, d := range p.Stores {
			least := math.Max(5*2200*1.1*d.Store.Capacitance.Value, d.Wait.To5V)
			if d.Uneven != nil {
				least = math.Max(least, d.Uneven.Wait.To5V)
			}
			same(t, "leave on", d.FiveRC, least)
		}
		if alone := plan(t, Input{BusV: v, CapacitanceF: c, HighestF: 1.1 * c, ResistorOhm: 2200}); alone.Resistor.UnevenJ != 0 || alone.Resistor.RatedW > p.Resistor.RatedW {
			t.Fatalf("a bank of one piece: %+v", alone.Resistor)
		}
	})
}

// A split bank of 800 V and 2200 µF beside a clamp: what is said of it out of balance, and a resistor that stands it.
func TestABankOutOfBalance(t *testing.T) {
	clamp := Store{Point: PointClamp, Voltage: Figure{Value: 900, Unit: "V", Basis: Stated}, Capacitance: Figure{Value: 100e-6, Unit: "F", Basis: Stated}}.filled()
	p, err := Discharge(Input{Stores: append(splitStores(800, 2200e-6), clamp), ResistorOhm: 2000})
	if err != nil {
		t.Fatal(err)
	}
	// 1.2 · (4400 µF · 800²/2 + 100 µF · 900²/2); the bank alone holds half of the first
	near(t, "uneven", p.Resistor.UnevenJ, 1.2*(1408+40.5), 1e-12)
	near(t, "even", p.Resistor.JoulesJ, 1.2*(704+40.5), 1e-12)
	alone, err := Discharge(Input{BusV: 900, CapacitanceF: p.Resistor.JoulesJ / 1.2 / 405e3, ResistorOhm: 2000})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "same energy in one piece", alone.Resistor.JoulesJ, p.Resistor.JoulesJ, 1e-12)
	if !(alone.Resistor.RatedW < p.Resistor.RatedW) {
		t.Errorf("rated %g W out of balance, %g W in one piece", p.Resistor.RatedW, alone.Resistor.RatedW)
	}
	said := ""
	for _, c := range p.Cautions {
		if c.ID == "halves" {
			said = c.Text
		}
	}
	if !strings.Contains(said, "one half can hold the whole 800 V: 1.69 kJ at +20 %") {
		t.Errorf("halves: %s", said)
	}
}

func splitStores(v, c float64) []Store {
	figure := func(point, partOf string, v, c float64) Store {
		return Store{Point: point, PartOf: partOf, Voltage: Figure{Value: v, Unit: "V", Basis: Stated}, Capacitance: Figure{Value: c, Unit: "F", Basis: Stated}}.filled()
	}
	return []Store{figure(PointBus, "", v, c), figure(PointUpperHalf, PointBus, v/2, 2*c), figure(PointLowerHalf, PointBus, v/2, 2*c)}
}
