package reports

import (
	"io"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure/quantity"
)

// suffix is what a key carries to name the SI unit of its value.
var suffix = map[quantity.Unit]string{
	quantity.Volt: "_v", quantity.Ampere: "_a", quantity.Ohm: "_ohm", quantity.Farad: "_f", quantity.Henry: "_h",
	quantity.Second: "_s", quantity.Hertz: "_hz", quantity.Watt: "_w", quantity.Joule: "_j", quantity.Coulomb: "_c",
	quantity.Kelvin: "_k", quantity.VoltPerSecond: "_v_per_s", quantity.AmperePerSecond: "_a_per_s", quantity.Celsius: "_c",
}

// pairs is an object whose keys are made while writing; JSON sorts them by name.
type pairs map[string]any

type edgeJSON struct {
	Edge     string         `json:"edge"`
	Shape    string         `json:"shape"`
	Position string         `json:"position"`
	BusV     num            `json:"bus_v"`
	CurrentA num            `json:"current_a"`
	PeakV    num            `json:"peak_v"`
	PeakS    num            `json:"peak_time_s"`
	Slope    *num           `json:"dvdt_v_per_s"`
	RingHz   *num           `json:"ring_hz"`
	Damping  *num           `json:"damping_ratio"`
	EnergyJ  map[string]num `json:"energy_j"`
}

type worstJSON struct {
	PeakV    num            `json:"peak_v"`
	Edge     string         `json:"edge"`
	Shape    *string        `json:"shape"`
	Position string         `json:"position"`
	Corner   map[string]num `json:"corner"`
	Assumed  []string       `json:"assumed"`
}

type p999JSON struct {
	PeakV   num    `json:"peak_v"`
	Samples int    `json:"samples"`
	Method  string `json:"method"`
}

type figuresJSON struct {
	Network   pairs      `json:"network"`
	Position  string     `json:"position"`
	RatedV    num        `json:"rated_v"`
	Nominal   *edgeJSON  `json:"nominal"`
	Highest   *edgeJSON  `json:"highest"`
	Cut       *edgeJSON  `json:"cut"`
	Worst     *worstJSON `json:"worst"`
	P999      *p999JSON  `json:"p999"`
	Avalanche *pairs     `json:"avalanche"` // not computed yet
	Verdict   string     `json:"verdict"`
	LiftedBy  []string   `json:"lifted_by"`
	Rests     []string   `json:"rests_on_assumed"`
}

type assumedJSON struct {
	Key       string `json:"key"`
	Value     num    `json:"value"`
	Low       num    `json:"low"`
	High      num    `json:"high"`
	Unit      string `json:"unit"`
	Why       string `json:"why"`
	MovesPeak num    `json:"moves_peak_v"`
}

type marginJSON struct {
	Case     string        `json:"case"`
	RatedV   *num          `json:"rated_v"`
	StatedV  *num          `json:"stated_v"`
	AllowedV *num          `json:"allowed_v"`
	AsFound  *figuresJSON  `json:"as_found"`
	Rebuild  *figuresJSON  `json:"rebuild"`
	Stresses []pairs       `json:"stresses"` // null: the other stresses are not computed yet
	Assumed  []assumedJSON `json:"assumed"`
	Needs    []needJSON    `json:"needs"`
	NotYet   *string       `json:"not_worked_out"` // why there are no figures although nothing is missing
}

// MarginJSON writes what the switch saw and what the rebuild will see.
func MarginJSON(w io.Writer, m *stress.Margin) error { return writeJSON(w, marginOf(m)) }

func marginOf(m *stress.Margin) *marginJSON {
	if m == nil {
		return nil
	}
	out := &marginJSON{Case: m.Case, RatedV: some(m.Rated), StatedV: some(m.Stated), AllowedV: some(m.Allowed),
		AsFound: figuresOf(m.AsFound), Rebuild: figuresOf(m.Rebuild), Needs: needsJSON(m.Needs), Assumed: []assumedJSON{}}
	if otherTopology(m) {
		out.NotYet = orNull(otherTopologyWords)
	}
	for _, a := range m.Assumed {
		out.Assumed = append(out.Assumed, assumedJSON{a.Key, num(a.Value.Value), num(a.Value.Low), num(a.Value.High), string(a.Value.Unit), a.Why, num(a.MovesPeak)})
	}
	return out
}

func figuresOf(f *stress.Figures) *figuresJSON {
	if f == nil {
		return nil
	}
	out := &figuresJSON{Network: pairs{"kind": f.Network.Kind}, Position: f.Position, RatedV: num(f.Rated), Verdict: string(f.Verdict),
		Nominal: edgeOf(f.Nominal), Highest: edgeOf(f.Highest), Cut: edgeOf(f.Cut), LiftedBy: list(f.LiftedBy), Rests: list(f.Rests)}
	for _, p := range f.Network.Parts {
		name := p.Key[strings.LastIndexByte(p.Key, '.')+1:]
		out.Network[name+suffix[p.Value.Unit]] = num(p.Value.Value)
	}
	if f.Worst.Peak != 0 {
		out.Worst = &worstJSON{PeakV: num(f.Worst.Peak), Edge: f.Worst.Edge, Shape: orNull(f.Worst.Shape), Position: f.Position, Corner: map[string]num{}, Assumed: []string{}}
		for _, c := range f.Worst.Corner {
			out.Worst.Corner[c.Key] = num(c.Value)
			if c.Assumed {
				out.Worst.Assumed = append(out.Worst.Assumed, c.Key)
			}
		}
	}
	if f.P999.Samples > 0 {
		out.P999 = &p999JSON{num(f.P999.Peak), f.P999.Samples, percentileWords(f)}
	}
	return out
}

func edgeOf(e *stress.Edge) *edgeJSON {
	if e == nil {
		return nil
	}
	out := &edgeJSON{Edge: e.Name, Shape: e.Shape, Position: e.Position, BusV: num(e.Bus), CurrentA: num(e.Current), PeakV: num(e.Peak), PeakS: num(e.PeakTime),
		Slope: some(e.Slope), RingHz: some(e.Ring), Damping: some(e.Damping), EnergyJ: map[string]num{}}
	for _, x := range e.Energies {
		out.EnergyJ[x.Element] = num(x.Joule)
	}
	return out
}
