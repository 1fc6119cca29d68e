package reports

import (
	"io"

	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

type storeJSON struct {
	Point        string  `json:"point"`
	Title        string  `json:"title"`
	VoltageV     num     `json:"voltage_v"`
	CapacitanceF *num    `json:"capacitance_f"`
	EnergyJ      *num    `json:"energy_j"`
	ChargeC      *num    `json:"charge_c"`
	PartOf       *string `json:"part_of"`
	Known        bool    `json:"known"`
	ToCheck      bool    `json:"to_check"`
	To60         *num    `json:"time_to_60v_s"`
	To50         *num    `json:"time_to_50v_s"`
	To5          *num    `json:"time_to_5v_s"`
}

type cautionJSON struct {
	ID     string  `json:"id"`
	Text   string  `json:"text"`
	Source *string `json:"source"`
	Read   string  `json:"read"`
}

type stepJSON struct {
	Point *string `json:"point"`
	Text  string  `json:"text"`
}

type wantedJSON struct {
	Key string   `json:"key"`
	For []string `json:"for"`
}

type dischargeJSON struct {
	BusV            num           `json:"bus_v"`
	CapacitanceF    num           `json:"capacitance_f"`
	EnergyJ         num           `json:"energy_j"`
	Withheld        []missingJSON `json:"withheld"` // why the plan must not be carried out
	WorstEnergyJ    *num          `json:"worst_energy_j"`
	TotalEnergyJ    num           `json:"total_energy_j"`
	ChargeC         num           `json:"charge_c"`
	ResistorOhm     num           `json:"resistor_ohm"`
	ResistorSeries  int           `json:"resistor_series"`
	ResistorEnergyJ num           `json:"resistor_energy_j"`
	ResistorPowerW  num           `json:"resistor_power_w"`
	ResistorWithin  bool          `json:"resistor_within"`
	ResistorNotes   []string      `json:"resistor_notes"`
	PeakCurrentA    num           `json:"peak_current_a"`
	PeakPowerW      num           `json:"peak_power_w"`
	TimeConstantS   num           `json:"time_constant_s"`
	To60            num           `json:"time_to_60v_s"`
	To50            num           `json:"time_to_50v_s"`
	To5             num           `json:"time_to_5v_s"`
	Wait60          num           `json:"wait_to_60v_s"`
	Wait50          num           `json:"wait_to_50v_s"`
	Wait5           num           `json:"wait_to_5v_s"`
	Bleeder         *bleederJSON  `json:"bleeder"`
	RecoveryLowV    num           `json:"recovery_low_v"`
	RecoveryHighV   num           `json:"recovery_high_v"`
	Stores          []storeJSON   `json:"stores"`
	Steps           []stepJSON    `json:"steps"`
	Cautions        []cautionJSON `json:"cautions"`
	Assumed         []string      `json:"assumed"`
	Needs           []wantedJSON  `json:"needs"`
}

type bleederJSON struct {
	ResistanceOhm num `json:"resistance_ohm"`
	PowerW        num `json:"power_w"`
	To60          num `json:"time_to_60v_s"`
	To50          num `json:"time_to_50v_s"`
	To5           num `json:"time_to_5v_s"`
}

// DischargeJSON writes the discharge plan. time_to_… are with the capacitance as stated, wait_to_… with the top of its
// interval.
func DischargeJSON(w io.Writer, p *safety.Plan) error { return writeJSON(w, dischargeOf(p)) }

func dischargeOf(p *safety.Plan) *dischargeJSON {
	if p == nil {
		return nil
	}
	r := p.Resistor
	out := &dischargeJSON{BusV: num(p.BusV), CapacitanceF: num(p.CapacitanceF), EnergyJ: num(p.EnergyJ), Withheld: missingOf(p.Withheld), WorstEnergyJ: some(p.WorstEnergyJ), TotalEnergyJ: num(p.TotalEnergyJ), ChargeC: num(p.ChargeC),
		ResistorOhm: num(r.Ohm), ResistorSeries: r.Series, ResistorEnergyJ: num(r.JoulesJ), ResistorPowerW: num(r.RatedW), ResistorWithin: r.Within, ResistorNotes: list(r.Notes),
		PeakCurrentA: num(p.PeakCurrentA), PeakPowerW: num(p.PeakPowerW), TimeConstantS: num(p.TimeConstantS),
		To60: num(p.Nominal.To60V), To50: num(p.Nominal.To50V), To5: num(p.Nominal.To5V),
		Wait60: num(p.Wait.To60V), Wait50: num(p.Wait.To50V), Wait5: num(p.Wait.To5V),
		RecoveryLowV: num(p.Recovery.LowV), RecoveryHighV: num(p.Recovery.HighV), Assumed: []string{},
		Stores: []storeJSON{}, Steps: []stepJSON{}, Cautions: []cautionJSON{}, Needs: []wantedJSON{}}
	if b := p.Bleeder; b != nil {
		out.Bleeder = &bleederJSON{num(b.Ohm), num(b.PowerW), num(b.Wait.To60V), num(b.Wait.To50V), num(b.Wait.To5V)}
	}
	out.addLists(p)
	return out
}

func (out *dischargeJSON) addLists(p *safety.Plan) {
	if p.BusBasis == safety.Assumed {
		out.Assumed = append(out.Assumed, "bus_v")
	}
	if p.CapacitanceBasis == safety.Assumed {
		out.Assumed = append(out.Assumed, "capacitance_f")
	}
	for _, d := range p.Stores {
		out.Stores = append(out.Stores, storeOf(d))
	}
	for _, s := range p.Steps {
		out.Steps = append(out.Steps, stepJSON{orNull(s.Point), s.Text})
	}
	for _, c := range p.Cautions {
		out.Cautions = append(out.Cautions, cautionJSON{c.ID, c.Text, orNull(c.Source), string(c.Read)})
	}
	for _, n := range p.Needs {
		out.Needs = append(out.Needs, wantedJSON{n.Key, []string{n.Why}})
	}
}

func storeOf(d safety.StoreDischarge) storeJSON {
	st := d.Store
	out := storeJSON{Point: st.Point, Title: st.Title, VoltageV: num(st.Voltage.Value), PartOf: orNull(st.PartOf), Known: st.Known(), ToCheck: st.ToCheck}
	if st.Capacitance.Basis != safety.None {
		c, e, q := num(st.Capacitance.Value), num(st.EnergyJ), num(st.ChargeC)
		t60, t50, t5 := num(d.Wait.To60V), num(d.Wait.To50V), num(d.Wait.To5V)
		out.CapacitanceF, out.EnergyJ, out.ChargeC, out.To60, out.To50, out.To5 = &c, &e, &q, &t60, &t50, &t5
	}
	return out
}

type missingJSON struct {
	HoldPoint int    `json:"hold_point"`
	Text      string `json:"text"`
	Unlock    string `json:"unlock"`
}

func missingOf(missing []safety.Missing) []missingJSON {
	out := []missingJSON{}
	for _, m := range missing {
		out = append(out, missingJSON{m.Point, m.Text, m.Unlock})
	}
	return out
}

type checkJSON struct {
	Point       string        `json:"point"`
	Dead        bool          `json:"dead"`
	DCV         *num          `json:"dc_v"`
	ACV         *num          `json:"ac_v"`
	MeterProved *bool         `json:"meter_proved"`
	At          *string       `json:"at"`
	AgeS        *num          `json:"age_s"`
	ExpiresAt   *string       `json:"expires_at"`
	Missing     []missingJSON `json:"missing"`
}

type isolationJSON struct {
	Isolated  bool          `json:"isolated"`
	Since     *string       `json:"since"`
	Energised *string       `json:"energised"`
	Missing   []missingJSON `json:"missing"`
}

type linkJSON struct {
	Fitted  bool    `json:"fitted"`
	Since   *string `json:"since"`
	Removed *string `json:"removed"`
}

type statusJSON struct {
	Case      string        `json:"case"`
	At        *string       `json:"at"`
	Answers   int           `json:"answers"`
	Dead      bool          `json:"dead"`
	Isolation isolationJSON `json:"isolation"`
	Link      linkJSON      `json:"link"`
	Points    []checkJSON   `json:"points"`
	Unplaced  []string      `json:"unplaced"`
	Outcome   *outcomeJSON  `json:"outcome"`
}

// StatusJSON writes where a case stands at one moment.
func StatusJSON(w io.Writer, c *measure.Case, st safety.Status) error {
	return writeJSON(w, statusOf(c, st))
}

func statusOf(c *measure.Case, st safety.Status) *statusJSON {
	i, l := st.Isolation, st.Link
	out := &statusJSON{Case: c.ID, At: instant(st.At), Answers: answered(c), Dead: st.Dead,
		Isolation: isolationJSON{i.Isolated, instant(i.Since), instant(i.Energised), missingOf(i.Missing)},
		Link:      linkJSON{l.Fitted, instant(l.Since), instant(l.Removed)}, Points: []checkJSON{}, Unplaced: list(st.Unplaced), Outcome: outcomeOf(c.Outcome)}
	for _, p := range st.Points {
		out.Points = append(out.Points, checkOf(p))
	}
	return out
}

func checkOf(p safety.PointStatus) checkJSON {
	out := checkJSON{Point: p.Store.Point, Dead: p.Dead, Missing: missingOf(p.Missing)}
	if d := p.Last; d != nil {
		age := num(p.Age.Seconds())
		out.DCV, out.ACV, out.MeterProved, out.At, out.AgeS, out.ExpiresAt = voltOf(d.DC), voltOf(d.AC), &d.MeterProved, instant(d.At), &age, instant(p.ExpiresAt)
	}
	return out
}

func voltOf(q quantity.Quantity) *num {
	if q.Unit != quantity.Volt {
		return nil
	}
	n := num(q.Value)
	return &n
}

type outcomeJSON struct {
	Faults      []string `json:"faults"`
	Parts       []string `json:"parts"`
	Stress      *string  `json:"stress"`
	Causes      []string `json:"causes"`
	ConfirmedBy *string  `json:"confirmed_by"`
	Closed      *string  `json:"closed"`
}

func outcomeOf(o *measure.Outcome) *outcomeJSON {
	if o == nil {
		return nil
	}
	out := &outcomeJSON{list(o.Faults), list(o.Parts), orNull(o.Stress), list(o.Causes), orNull(o.ConfirmedBy), nil}
	if !o.Closed.IsZero() {
		out.Closed = orNull(o.Closed.Format("2006-01-02"))
	}
	return out
}
