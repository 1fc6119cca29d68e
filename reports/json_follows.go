package reports

import "drivemend/diagnose/stress"

// followJSON is what follows from the edges; null where it does not arise on the board.
type followJSON struct {
	Avalanche *avalancheJSON `json:"avalanche"`
	Clamp     *clampJSON     `json:"clamp"`
	PumpUp    *pumpJSON      `json:"pump_up"`
	Duty      *dutyJSON      `json:"network_duty"`
	LastPart  *lastJSON      `json:"last_part"`
	Measured  *measuredJSON  `json:"measured"`
}

type avalancheJSON struct {
	ProspectiveV num   `json:"prospective_v"`
	BreakdownV   num   `json:"breakdown_v"`
	EnergyJ      num   `json:"energy_j"`
	TimeS        num   `json:"time_s"`
	CurrentA     num   `json:"current_a"`
	RiseK        *num  `json:"junction_rise_k"` // null without a thermal ladder
	EveryCycle   bool  `json:"every_cycle"`
	OverEnergy   *bool `json:"over_rated_energy"` // null while energy and current of one pulse are not stated
	OverCurrent  *bool `json:"over_rated_current"`
}

type clampJSON struct {
	HeldV   num  `json:"held_v"`
	Stated  bool `json:"stated"`
	ResistW *num `json:"resistor_w"` // null without a PWM frequency
	ChargeC num  `json:"charge_c"`
	RippleV num  `json:"ripple_v"`
}

type pumpJSON struct {
	FirstV num    `json:"first_edge_v"`
	EndV   num    `json:"end_v"`
	EndsBy string `json:"ends_by"`
	Edges  num    `json:"edges"`
	TimeS  *num   `json:"time_s"` // null without a PWM frequency
}

type dutyJSON struct {
	RMS       *num `json:"capacitor_rms_a"` // null without a PWM frequency
	Peak      num  `json:"capacitor_peak_a"`
	Slope     num  `json:"capacitor_dvdt_v_per_s"`
	ResistorW *num `json:"resistor_w"` // null without a PWM frequency or a resistor
	Discharge *num `json:"discharge_a"`
	Emptied   *num `json:"emptied_share"` // of its charge, within the shortest on-time
}

type lastJSON struct {
	CurrentA num `json:"current_a"`
	EnergyJ  num `json:"energy_j"`
	Share    num `json:"share"`
}

type measuredJSON struct {
	Name  string    `json:"name"`
	PeakV num       `json:"peak_v"`
	LowV  num       `json:"low_v"`
	HighV num       `json:"high_v"`
	Why   string    `json:"why"`
	Loop  *loopJSON `json:"loop"`
}

type loopJSON struct {
	InductanceH num `json:"inductance_h"`
	LowH        num `json:"low_h"`
	HighH       num `json:"high_h"`
}

func followsOf(f *stress.Figures) followJSON {
	out := followJSON{Avalanche: avalancheOf(f.Avalanche), Measured: measuredOf(f.Measured)}
	if c := f.Clamp; c != nil {
		out.Clamp = &clampJSON{num(c.Volt), c.Stated, some(c.Watts), num(c.Charge), num(c.Ripple)}
	}
	if p := f.PumpUp; p != nil {
		out.PumpUp = &pumpJSON{num(p.FirstEdge), num(p.End), p.EndsBy, num(p.Edges), some(p.Time)}
	}
	if d := f.Duty; d != nil {
		out.Duty = &dutyJSON{some(d.CapacitorRMS), num(d.CapacitorPeak), num(d.Slope), some(d.ResistorWatts), some(d.Discharge), some(d.Emptied)}
	}
	if l := f.LastPart; l != nil {
		out.LastPart = &lastJSON{num(l.Current), num(l.Energy), num(l.Share)}
	}
	return out
}

func avalancheOf(a *stress.Avalanched) *avalancheJSON {
	if a == nil {
		return nil
	}
	out := &avalancheJSON{ProspectiveV: num(a.Prospective), BreakdownV: num(a.Volt), EnergyJ: num(a.Energy), TimeS: num(a.Time), CurrentA: num(a.Current), RiseK: some(a.Rise), EveryCycle: a.EveryCycle}
	if a.Rated {
		energy, current := a.OverEnergy, a.OverCurrent
		out.OverEnergy, out.OverCurrent = &energy, &current
	}
	return out
}

func measuredOf(x *stress.FromCapture) *measuredJSON {
	if x == nil {
		return nil
	}
	out := &measuredJSON{Name: x.Name, PeakV: num(x.Mid), LowV: num(x.Low), HighV: num(x.High), Why: x.Why}
	if x.Loop > 0 {
		out.Loop = &loopJSON{num(x.Loop), num(x.LoopLow), num(x.LoopHigh)}
	}
	return out
}
