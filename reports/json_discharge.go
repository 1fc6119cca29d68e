package reports

import (
	"io"

	"drivemend/diagnose/safety"
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
	// Uneven is a half of a split bank with the whole voltage of the bus on it; null for every other store.
	Uneven *unevenJSON `json:"out_of_balance"`
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
	ResistorUnevenJ *num          `json:"resistor_uneven_energy_j"` // one half of a split bank holding the whole voltage; null without halves
	ResistorPowerW  num           `json:"resistor_power_w"`
	ResistorEachV   num           `json:"resistor_body_v"` // over each part in series
	AveragePowerW   num           `json:"average_power_w"` // over the first time constant
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
	RecoveryAbove50 bool          `json:"recovery_above_50v"`
	RecoveryAbove60 bool          `json:"recovery_above_60v"`
	Stores          []storeJSON   `json:"stores"`
	Steps           []stepJSON    `json:"steps"`
	Cautions        []cautionJSON `json:"cautions"`
	Limits          []limitJSON   `json:"limits"`
	Assumed         []string      `json:"assumed"`
	Needs           []wantedJSON  `json:"needs"`
}

type bleederJSON struct {
	ResistanceOhm num `json:"resistance_ohm"`
	PowerW        num `json:"power_w"`
	To60          num `json:"time_to_60v_s"`
	To50          num `json:"time_to_50v_s"`
	To5           num `json:"time_to_5v_s"`
	// LabelTimeS is what a label would name, down to 60 V: a lower bound while the bleeder is whole.
	LabelTimeS  num  `json:"label_time_s"`
	WithinFiveS bool `json:"within_5s"`
}

type unevenJSON struct {
	VoltageV     num `json:"voltage_v"`
	EnergyJ      num `json:"energy_j"`
	PeakCurrentA num `json:"peak_current_a"`
	To60         num `json:"time_to_60v_s"`
	To50         num `json:"time_to_50v_s"`
	To5          num `json:"time_to_5v_s"`
}

type limitJSON struct {
	Hazard    string `json:"hazard"`
	Threshold string `json:"threshold"`
	Answers   string `json:"answers"`
	Board     string `json:"board"`
	Above     *bool  `json:"above"` // null where this board's figure is not known
	Applies   bool   `json:"applies"`
	Lowest    bool   `json:"lowest"`
	Source    string `json:"source"`
	Read      string `json:"read"`
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
		ResistorOhm: num(r.Ohm), ResistorSeries: r.Series, ResistorEnergyJ: num(r.JoulesJ), ResistorUnevenJ: some(r.UnevenJ), ResistorPowerW: num(r.RatedW), ResistorEachV: num(r.EachV), AveragePowerW: num(r.AverageW), ResistorWithin: r.Within, ResistorNotes: list(r.Notes),
		PeakCurrentA: num(p.PeakCurrentA), PeakPowerW: num(p.PeakPowerW), TimeConstantS: num(p.TimeConstantS),
		To60: num(p.Nominal.To60V), To50: num(p.Nominal.To50V), To5: num(p.Nominal.To5V),
		Wait60: num(p.Wait.To60V), Wait50: num(p.Wait.To50V), Wait5: num(p.Wait.To5V),
		RecoveryLowV: num(p.Recovery.LowV), RecoveryHighV: num(p.Recovery.HighV), RecoveryAbove50: p.Recovery.BackAbove50V, RecoveryAbove60: p.Recovery.BackAbove60V, Assumed: []string{},
		Stores: []storeJSON{}, Steps: []stepJSON{}, Cautions: []cautionJSON{}, Limits: []limitJSON{}, Needs: []wantedJSON{}}
	if b := p.Bleeder; b != nil {
		out.Bleeder = &bleederJSON{num(b.Ohm), num(b.PowerW), num(b.Wait.To60V), num(b.Wait.To50V), num(b.Wait.To5V), num(b.LabelTimeS), b.WithinFiveS}
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
	for _, l := range p.Limits {
		out.Limits = append(out.Limits, limitOf(l))
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
	if u := d.Uneven; u != nil {
		out.Uneven = &unevenJSON{num(u.Volt), num(u.EnergyJ), num(u.PeakCurrentA), num(u.Wait.To60V), num(u.Wait.To50V), num(u.Wait.To5V)}
	}
	return out
}

func limitOf(l safety.Limit) limitJSON {
	out := limitJSON{Hazard: l.Hazard, Threshold: l.Threshold, Answers: l.Answers, Board: l.Board, Above: &l.Above, Applies: !l.Apart, Lowest: l.Lowest, Source: l.Source, Read: string(l.Read)}
	if l.Unknown {
		out.Above = nil
	}
	return out
}
