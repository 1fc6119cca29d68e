package reports

import (
	"io"
	"strings"

	"drivemend/diagnose/stress"
	"drivemend/measure"
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
	Edge       string         `json:"edge"`
	Shape      string         `json:"shape"`
	Position   string         `json:"position"`
	BusV       num            `json:"bus_v"`
	CurrentA   num            `json:"current_a"`
	PeakV      num            `json:"peak_v"`
	PeakS      num            `json:"peak_time_s"`
	Slope      *num           `json:"dvdt_v_per_s"`
	RingHz     *num           `json:"ring_hz"`
	Damping    *num           `json:"damping_ratio"`
	SurgeA     *num           `json:"surge_a"`     // highest current of the switch that closes; null at an opening
	DischargeA *num           `json:"discharge_a"` // what the network pushes into it; null without one
	EnergyJ    map[string]num `json:"energy_j"`
	LossW      map[string]num `json:"loss_w"` // of what does not give it back, at the PWM frequency; null without one
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
	Network      pairs      `json:"network"`
	Position     string     `json:"position"`
	Alike        []string   `json:"alike"`
	RatedV       num        `json:"rated_v"`
	Nominal      *edgeJSON  `json:"nominal"`
	Highest      *edgeJSON  `json:"highest"`
	Cut          *edgeJSON  `json:"cut"`
	Edges        []edgeJSON `json:"edges"`
	ShortCircuit *edgeJSON  `json:"short_circuit"`
	Worst        *worstJSON `json:"worst"`
	P999         *p999JSON  `json:"p999"`
	followJSON
	Verdict  string   `json:"verdict"`
	LiftedBy []string `json:"lifted_by"`
	Rests    []string `json:"rests_on_assumed"`
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

// MarginJSON writes what the switch saw and what the rebuild will see. The case gives the PWM frequency for the
// watts; nil gives none.
func MarginJSON(w io.Writer, c *measure.Case, m *stress.Margin) error {
	return writeJSON(w, marginOf(c, m))
}

func marginOf(c *measure.Case, m *stress.Margin) *marginJSON {
	if m == nil {
		return nil
	}
	out := &marginJSON{Case: m.Case, RatedV: some(m.Rated), StatedV: some(m.Stated), AllowedV: some(m.Allowed),
		Needs: needsJSON(m.Needs), Assumed: []assumedJSON{}, NotYet: orNull(topologyWords(m))}
	boards := boardsOf(c, m)
	out.AsFound = figuresOf(boards[0])
	if len(boards) > 1 {
		out.Rebuild = figuresOf(boards[1])
	}
	for _, a := range m.Assumed {
		out.Assumed = append(out.Assumed, assumedJSON{a.Key, num(a.Value.Value), num(a.Value.Low), num(a.Value.High), string(a.Value.Unit), a.Why, num(a.MovesPeak)})
	}
	return out
}

func figuresOf(b marginBoard) *figuresJSON {
	f := b.f
	if f == nil {
		return nil
	}
	out := &figuresJSON{Network: networkJSON(f.Network), Position: f.Position, Alike: list(f.Alike), RatedV: num(f.Rated), Verdict: string(f.Verdict),
		Nominal: edgeOf(f.Nominal, b.hertz), Highest: edgeOf(f.Highest, b.hertz), Cut: edgeOf(f.Cut, b.hertz), ShortCircuit: edgeOf(f.ShortCircuit, b.hertz),
		Edges: []edgeJSON{}, Worst: worstOf(f), LiftedBy: list(f.LiftedBy), Rests: list(f.Rests), followJSON: followsOf(f)}
	for _, e := range f.Edges {
		out.Edges = append(out.Edges, *edgeOf(e, b.hertz))
	}
	if f.P999.Samples > 0 {
		out.P999 = &p999JSON{num(f.P999.Peak), f.P999.Samples, percentileWords(f)}
	}
	return out
}

func networkJSON(n stress.Network) pairs {
	out := pairs{"kind": n.Kind}
	for _, p := range n.Parts {
		name := p.Key[strings.LastIndexByte(p.Key, '.')+1:]
		out[name+suffix[p.Value.Unit]] = num(p.Value.Value)
	}
	return out
}

func worstOf(f *stress.Figures) *worstJSON {
	if f.Worst.Peak == 0 {
		return nil
	}
	out := &worstJSON{PeakV: num(f.Worst.Peak), Edge: f.Worst.Edge, Shape: orNull(f.Worst.Shape), Position: f.Position, Corner: map[string]num{}, Assumed: []string{}}
	for _, c := range f.Worst.Corner {
		out.Corner[c.Key] = num(c.Value)
		if c.Assumed {
			out.Assumed = append(out.Assumed, c.Key)
		}
	}
	return out
}

func edgeOf(e *stress.Edge, hertz float64) *edgeJSON {
	if e == nil {
		return nil
	}
	out := &edgeJSON{Edge: e.Name, Shape: e.Shape, Position: e.Position, BusV: num(e.Bus), CurrentA: num(e.Current), PeakV: num(e.Peak), PeakS: num(e.PeakTime),
		Slope: some(e.Slope), RingHz: some(e.Ring), Damping: some(e.Damping), SurgeA: some(e.Surge), DischargeA: some(e.Discharge), EnergyJ: map[string]num{}}
	for _, x := range e.Energies {
		out.EnergyJ[x.Element] = num(x.Joule)
		if hertz > 0 && !keeps(x.Element) {
			if out.LossW == nil {
				out.LossW = map[string]num{}
			}
			out.LossW[x.Element] = num(x.Joule * hertz)
		}
	}
	return out
}
