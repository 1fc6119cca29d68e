package reports

import (
	"math"
	"testing"
	"time"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// reportTime is long after the pump case was closed, so that its repair has held.
var reportTime = time.Date(2027, 1, 4, 16, 30, 0, 0, time.UTC)

// frozen is a report filled by hand on the pump case, so that its golden files change only when this package does.
func frozen(t *testing.T) Report {
	t.Helper()
	file, err := measure.Load("../testdata/cases/orchard-pump-3.yaml")
	if err != nil {
		t.Fatal(err)
	}
	file.Case.Steps = append(file.Case.Steps, measure.StepEntry{Step: measure.StepHandedOver, Result: "done", At: reportTime.AddDate(0, 0, -33)},
		measure.StepEntry{Step: measure.StepFollowedUp, Result: "done", At: reportTime.AddDate(0, 0, -1)})
	file.Case.Board = file.Case.Board.With("pwm.frequency", quantity.Of(8e3, quantity.Hertz))
	if file.Case.Rebuild != nil {
		file.Case.Rebuild.Board = file.Case.Rebuild.Board.With("pwm.frequency", quantity.Of(8e3, quantity.Hertz))
	}
	base := frozenBase()
	return Report{Case: file.Case, Base: base, At: reportTime, Ranking: frozenRanking(base), Next: frozenNext(base), Margin: frozenMargin(),
		Discharge: frozenPlan(), Safety: frozenStatus(), Outside: []Outside{{1, []safety.Missing{{Point: 2, Text: "the check of 10:00 is 12 min old: it lives 10 min", Unlock: "check again"}}}}}
}

func frozenBase() *knowledge.Base {
	return &knowledge.Base{Hash: "0123456789abcdef0123456789abcdef",
		Causes: []knowledge.Cause{
			{ID: "clamp-missing", Title: "No working snubber or clamp", Role: "latent", Repair: "fit-clamp", File: "causes.yaml", Line: 9,
				Share:   map[string]knowledge.Band{"dc": {Low: 4, Mid: 7.2, High: 11}, "mains": {Low: 3, Mid: 4.5, High: 7}},
				LeadsTo: []knowledge.Link{{To: "turn-off-spike", P: knowledge.Band{Low: 0.9, Mid: 0.97, High: 0.99}}},
				Answers: map[string]map[string]knowledge.Band{"failure-moment": {"turn-off": {Mid: 0.5}}}},
			{ID: "stray-loop-long", Title: "Current loop too long: stretched leads, long bars or a far-off capacitor", Role: "latent", File: "causes.yaml", Line: 20},
			{ID: "line-surge", Title: "Surge on the supply line", Role: "trigger", File: "causes.yaml", Line: 30},
		},
		Events: []knowledge.Event{
			{ID: "turn-off-spike", Title: "Voltage spike above the rating", Layer: knowledge.Stress, Leak: knowledge.Band{Low: 0.002, Mid: 0.005, High: 0.01}},
			{ID: "switch-shorted", Title: "Switch shorted", Layer: knowledge.Fault, Of: "switch", Leak: knowledge.Band{Mid: 0.003}, File: "faults.yaml", Line: 3},
		},
		Tests: []knowledge.Test{
			{ID: "failure-moment", Title: "The exact moment", Ask: "What was the machine doing in the very second it failed?", How: "Ask the person who stood beside it.", Needs: "question", Minutes: 3, Instrument: "question",
				Results: []knowledge.Result{{ID: "turn-off", Means: "A high current was switched off."}, {ID: "nobody-there", Means: "Nobody saw it."}}},
			{ID: "power-terminals-resistance", Title: "Power terminals of each switch", Ask: "What does it read between collector and emitter?", How: "Ohm range, red on the collector; let it settle.", Observes: "switch-shorted",
				Needs: "dead", Minutes: 2, Instrument: "meter", Per: "part", Unit: quantity.Ohm, Must: true, Cautions: []string{"ohms-only-dead", "gone-from-the-base"},
				Results: []knowledge.Result{{ID: "shorted", Median: 0.5, Times: 3, Means: "Near zero both ways round."}, {ID: "good", Expected: "expected.gate_bleed", Times: 1.3, Means: "As the gate bleed."}},
				Present: map[string]knowledge.Band{"shorted": {Mid: 0.93}}, Absent: map[string]knowledge.Band{"good": {Mid: 0.98}}, File: "tests.yaml", Line: 500},
			{ID: "predicted-peak", Title: "Computed peak at switch-off", Needs: "question", Computed: "turn_off.peak_over_rated"},
			{ID: "fan-turns", Title: "Fan turns", Needs: "control-power", Minutes: 4, Instrument: "eye"},
		},
		Repairs:  []knowledge.Repair{{ID: "fit-clamp", Title: "Fit a snubber or clamp at the switch", Minutes: 45, Parts: []string{"film capacitor", "resistor"}, Steps: []string{"Size it for this loop.", "Solder it at the terminals, leads under 15 mm."}, File: "repairs.yaml", Line: 2}},
		Cautions: []knowledge.Caution{{ID: "ohms-only-dead", Text: "Ohm ranges only after the bus reads 5 V or less.", When: "before every meter step", Source: "common-practice"}},
		Sources:  []knowledge.Source{{ID: "common-practice", Title: "Common bench practice", Where: "no publication", Read: "not read"}},
	}
}

func frozenRanking(b *knowledge.Base) *diagnose.Ranking {
	return &diagnose.Ranking{Case: "orchard-pump-3", Setting: "mains", About: "clamp-missing", Unlisted: 0.09, UnlistedPrior: 0.05,
		Causes: []diagnose.Line{{ID: "clamp-missing", Title: "No working snubber or clamp", Role: "latent", Probability: 0.58},
			{ID: "stray-loop-long", Title: "Current loop too long: stretched leads, long bars or a far-off capacitor", Role: "latent", Probability: 0.21},
			{ID: "line-surge", Title: "Surge on the supply line", Role: "trigger", Probability: 0.004}},
		Stresses: []diagnose.Line{{ID: "turn-off-spike", Title: "Voltage spike above the rating", Probability: 0.71}},
		Faults: []diagnose.Line{{ID: "switch-shorted", Title: "Switch shorted", Probability: 0.998, Parts: []diagnose.PartChance{{Part: "Q1", Probability: 0.31}, {Part: "Q2", Probability: 0.98}, {Part: "Q3", Probability: 0.31}}},
			{ID: "driver-dead", Title: "Gate driver output dead", Probability: 0.4}},
		Prior: []diagnose.Line{{ID: "clamp-missing", Probability: 0.045}, {ID: "stray-loop-long", Probability: 0.02}, {ID: "line-surge", Probability: 0.05}},
		Findings: []diagnose.Finding{
			{Test: b.Test("failure-moment"), Shown: "turn-off", Source: "answered", Seen: "on-arrival", Decibans: 6.76, Alone: 3.2},
			{Test: b.Test("power-terminals-resistance"), Part: "Q2", Shown: "0.4 Ω", Source: "measured", Observation: 1, Decibans: 9.1, Alone: 8.7},
			{Test: b.Test("predicted-peak"), Shown: "0.8348 to 1.086", Source: "computed", Assumed: []string{"loop.inductance"}, Observation: -1, Decibans: -1.2, Alone: -4.1}},
		Unexplained: []diagnose.Finding{{Test: b.Test("predicted-peak"), Shown: "0.8348 to 1.086", Source: "computed", Observation: -1, Decibans: -1.2, Alone: -4.1}},
		Alike:       [][]string{{"clamp-missing", "stray-loop-long"}},
		Unbound:     []diagnose.Unbound{{Observation: 2, Why: "skipped"}},
	}
}

func frozenNext(b *knowledge.Base) *diagnose.Suggestion {
	n := &diagnose.Suggestion{Case: "orchard-pump-3", At: testTime, Price: 210.75, Repair: []string{"fit-clamp"}, Tests: []diagnose.Candidate{
		{Test: b.Test("fan-turns"), Value: 60.2, Bits: 0.91, Minutes: 4, BlockedBy: []string{"the repair is not stated as finished"}, UnlockedBy: []string{"finish the repair and enter rebuild.done"}},
		{Test: b.Test("power-terminals-resistance"), Part: "Q1", Lifted: true, Value: 41.3, Bits: 0.83, Minutes: 2, Allowed: true},
		{Test: b.Test("power-terminals-resistance"), Position: "low", Value: 12.6, Bits: 0.2, Minutes: 2, Allowed: true},
		{Test: b.Test("failure-moment"), Value: -2, Bits: 0.01, Minutes: 3, Allowed: true}}}
	n.Locked = &n.Tests[0]
	return n
}

func frozenEdge(name, shape string, bus, amps, peak float64) *stress.Edge {
	e := &stress.Edge{Name: name, Shape: shape, Position: "low", Bus: bus, Current: amps, Peak: peak, PeakTime: 60e-9, Slope: 15e9, Ring: 13.9e6, Damping: 0.1,
		Energies: []stress.Energy{{Element: "switch", Joule: 0.0034}, {Element: "output-capacitance", Joule: 0.00004}, {Element: "freewheel", Joule: 0.00015}, {Element: "bus-esr", Joule: 1e-9}}}
	for k := range 200 {
		v := min(float64(k)*bus/40, peak)
		if k > 60 {
			v = bus + (peak-bus)*float64(60-k%60)/float64(k)
		}
		e.Waveform = append(e.Waveform, stress.Sample{T: float64(k) * 1e-9, V: v})
	}
	return e
}

// frozenDiode is the closing edge of the chopper, at its diode.
func frozenDiode(peak float64) *stress.Edge {
	e := frozenEdge("turn-on", "ramp", 310, 60, peak)
	e.Position, e.Surge, e.Slope = "freewheel", 96, 0
	return e
}

func frozenMargin() *stress.Margin {
	v := func(low, mid, high float64, u quantity.Unit) quantity.Quantity {
		return quantity.Quantity{Low: low, Value: mid, High: high, Unit: u}
	}
	figures := func(kind string, verdict stress.Verdict, peak float64) *stress.Figures {
		running := frozenEdge("turn-off", "gate-limited", 310, 60, peak-150)
		return &stress.Figures{Network: stress.Network{Kind: kind}, Position: "low", Alike: []string{"low"}, Rated: 585, Nominal: running, Cut: frozenEdge("turn-off", "cut", 310, 60, peak-90), Highest: frozenEdge("turn-off", "gate-limited", 390, 120, peak),
			Edges: []*stress.Edge{running, frozenDiode(peak - 20)},
			Worst: stress.Worst{Peak: 2 * peak, Edge: "turn-off", Shape: "cut", Corner: []stress.Corner{{Key: "loop.inductance", Value: 200e-9, Unit: quantity.Henry, Assumed: true}, {Key: "bus.highest", Value: 390, Unit: quantity.Volt}}},
			P999:  stress.Percentile{Peak: peak + 20, Samples: 400}, Verdict: verdict}
	}
	m := &stress.Margin{Case: "orchard-pump-3", Rated: 585, Stated: 600, Allowed: 468, AsFound: figures("none", stress.OverIt, 635), Rebuild: figures("rcd", stress.Thin, 440),
		Assumed: []stress.Assumed{{Key: "freewheel.forward_recovery.voltage", Value: v(7.5, 15, 30, quantity.Volt), Why: "judgement, by class of board", MovesPeak: 0.2}, {Key: "loop.inductance", Value: v(60e-9, 120e-9, 200e-9, quantity.Henry), Why: "stated as assumed", MovesPeak: 271.3}},
		Needs:   []stress.Need{{Key: "protection.short_circuit_current", For: []string{"turn-off from a short circuit"}}}}
	m.Rebuild.Network.Parts = []stress.Part{{Key: "snubber.resistance", Value: quantity.Of(27, quantity.Ohm)}, {Key: "snubber.capacitance", Value: quantity.Of(22e-9, quantity.Farad)}}
	m.Rebuild.Rests = []string{"within only while loop.inductance stays between 60 nH and 110 nH"}
	m.Rebuild.LiftedBy = []string{"switch.fall_time.gate_resistance"}
	m.Rebuild.Edges[1].Discharge = 11.5
	m.Rebuild.Edges[0].Energies = append(m.Rebuild.Edges[0].Energies, stress.Energy{Element: "snubber-resistor", Joule: 0.00106})
	m.Rebuild.Duty = &stress.Duty{CapacitorRMS: 1.26, CapacitorPeak: 44.4, Slope: 2.02e9, ResistorWatts: 8.5, Discharge: 11.5, Emptied: 0.984}
	return m
}

// frozenLeg is the margin of a bridge with everything that can follow from its edges: as found a MOSFET that avalanches
// in every cycle and a part that opens last, rebuilt with a clamp.
func frozenLeg() *stress.Margin {
	m := frozenMargin()
	m.Case, m.Assumed, m.Needs = "hall-door-7", nil, nil
	for _, f := range []*stress.Figures{m.AsFound, m.Rebuild} {
		f.Position, f.Alike = "a-high", []string{"a-high", "b-high"}
		opens, closes := frozenEdge("turn-off", "gate-limited", 310, 60, f.Highest.Peak-150), frozenEdge("turn-on", "ramp", 310, 60, f.Highest.Peak-60)
		opens.Position, closes.Position, closes.Surge = "a-high", "a-high", 96
		f.Edges, f.Nominal, f.Highest.Position = []*stress.Edge{opens, closes}, closes, "a-high"
		f.ShortCircuit = frozenEdge("turn-off", "gate-limited", 390, 320, f.Highest.Peak+40)
		f.Worst.Edge, f.Worst.Shape, f.LiftedBy, f.Rests, f.Duty = "turn-on", "ramp", nil, nil, nil
		f.LastPart = &stress.LastPart{Current: 72, Energy: 0.0021, Share: 0.6}
	}
	m.AsFound.Highest.Name, m.AsFound.Highest.Shape = "turn-on", "ramp"
	m.AsFound.Avalanche = &stress.Avalanched{Prospective: 812, Volt: 600, Energy: 0.0042, Time: 230e-9, Current: 37, Rise: 41, EveryCycle: true, OverEnergy: true, Rated: true}
	m.AsFound.Measured = &stress.FromCapture{Name: "edge-at-40V.csv", Low: 610, Mid: 642, High: 690, Why: "overshoot in proportion to the current", Loop: 131e-9, LoopLow: 118e-9, LoopHigh: 146e-9}
	m.Rebuild.Highest.Name, m.Rebuild.Network = "all-off", stress.Network{Kind: "clamp", Parts: []stress.Part{{Key: "snubber.capacitance", Value: quantity.Of(470e-9, quantity.Farad)}}}
	m.Rebuild.Clamp = &stress.Clamped{Volt: 402.5, Watts: 3.9, Charge: 1.7e-6, Ripple: 3.6}
	m.Rebuild.Duty = &stress.Duty{CapacitorRMS: 0.31, CapacitorPeak: 19.5, Slope: 41e6, ResistorWatts: 3.9}
	return m
}

// frozenReservoir is a chopper whose recovery network has lost its tie, with no PWM frequency stated.
func frozenReservoir() *stress.Margin {
	m := frozenMargin()
	m.Rebuild, m.Needs, m.Case = nil, nil, "barn-winch-2"
	f := m.AsFound
	f.Network = stress.Network{Kind: "recovery", Parts: []stress.Part{{Key: "snubber.reservoir", Value: quantity.Of(10e-6, quantity.Farad)}}}
	f.PumpUp = &stress.PumpedUp{FirstEdge: 2.4, End: 600, EndsBy: "breakdown", Edges: 131}
	f.Avalanche = &stress.Avalanched{Prospective: 655, Volt: 600, Energy: 0.0007, Time: 40e-9, Current: 12}
	f.Clamp = &stress.Clamped{Volt: 400, Stated: true, Charge: 1.7e-6, Ripple: 3.6}
	f.Duty = &stress.Duty{CapacitorPeak: 60, Slope: 6e6}
	return m
}

// with is a report on another margin.
func with(r Report, m *stress.Margin) Report {
	r.Margin = m
	return r
}

func frozenStore() safety.Store {
	return safety.Store{Point: "bus", Title: "bus capacitor bank", Where: "between the rails", Because: "every drive board has one", EnergyJ: 167.31, ChargeC: 0.858,
		Voltage: safety.Figure{Value: 390, Unit: quantity.Volt, Basis: safety.Stated}, Capacitance: safety.Figure{Value: 2200e-6, Unit: quantity.Farad, Basis: safety.Stated}}
}

func frozenPlan() *safety.Plan {
	phases := safety.Store{Point: "phases", Title: "motor terminals", ToCheck: true, Voltage: safety.Figure{Value: 390, Unit: quantity.Volt, Basis: safety.Assumed}}
	times := safety.Times{To60V: 2.17, To50V: 2.39, To5V: 5.06}
	return &safety.Plan{BusV: 390, CapacitanceF: 2200e-6, EnergyJ: 167.31, ChargeC: 0.858, BusBasis: safety.Stated, CapacitanceBasis: safety.Assumed, TotalEnergyJ: 167.31,
		Resistor:     safety.Resistor{Ohm: 440, Series: 2, EachOhm: 220, EachV: 195, JoulesJ: 209.9, PeakW: 345.7, PeakA: 0.886, RatedW: 50, Within: true, Notes: []string{"look at its pulse curve"}},
		PeakCurrentA: 0.886, PeakPowerW: 345.7, TimeConstantS: 0.968, Nominal: safety.Times{To60V: 1.81, To50V: 1.99, To5V: 4.22}, Wait: times,
		Stores:   []safety.StoreDischarge{{Store: frozenStore(), PeakCurrentA: 0.886, Wait: times, FiveRC: 6}, {Store: phases}},
		Bleeder:  &safety.Bleeder{Ohm: 100e3, PowerW: 1.52, Wait: safety.Times{To60V: 494, To50V: 542, To5V: 1150}},
		Recovery: safety.Recovery{LowV: 39, HighV: 58.5, DaysLow: 10, DaysHigh: 20, BackAbove50V: true, Text: "left open, the bank can come back to 39 V to 58.5 V by itself"},
		Steps:    []safety.Step{{Text: "Cut the board off from every source."}, {Point: "bus", Text: "measure DC and AC between the rails. It can stand at 390 V, 167.3 J."}},
		Cautions: []safety.Caution{{ID: "shock", Text: "Shock hazard: 390 V, 167.3 J.", Source: "a manual, table 1", Read: safety.Read}, {ID: "ohms", Text: "No ohms above 5 V.", Source: "bench practice", Read: safety.CommonPractice},
			{ID: "limit", Text: "60 V within 5 s.", Source: "a standard", Read: safety.Memory}},
		Needs: []safety.Wanted{{Key: "bus.halves", Why: "a split bank is discharged half by half"}}}
}

func frozenStatus() safety.Status {
	check := &measure.DeadCheck{Point: "bus", DC: quantity.Of(0.4, quantity.Volt), AC: quantity.Of(0, quantity.Volt), MeterProved: true, At: testTime.Add(-12 * time.Minute)}
	old := []safety.Missing{{Point: 2, Text: "at bus: the check of 09:01 is 12 min old: it lives 10 min", Unlock: "check again"}}
	return safety.Status{At: testTime, Isolation: safety.IsolationStatus{Isolated: true, Since: testTime.Add(-time.Hour), Age: time.Hour, Last: &measure.Isolation{At: testTime.Add(-time.Hour), Locked: true, Motor: "unplugged", OtherSources: "none"}},
		Link:     safety.LinkStatus{Removed: testTime.Add(-15 * time.Minute)},
		Points:   []safety.PointStatus{{Store: frozenStore(), Last: check, Age: 12 * time.Minute, ExpiresAt: testTime.Add(-2 * time.Minute), Missing: old}},
		Unplaced: []string{"clamp"}}
}

// broken is a margin and a ranking of figures that are no numbers.
func broken(r Report) Report {
	k := *r.Ranking
	k.Causes = append([]diagnose.Line(nil), k.Causes...)
	k.Causes[0].Probability, k.Unlisted = math.NaN(), math.Inf(1)
	m := *r.Margin
	f := *m.AsFound
	e := *f.Highest
	e.Peak, e.Waveform = math.NaN(), []stress.Sample{{T: 0, V: math.NaN()}, {T: 1, V: math.Inf(1)}}
	f.Highest, m.AsFound, m.Rated = &e, &f, math.Inf(1)
	r.Ranking, r.Margin = &k, &m
	return r
}
