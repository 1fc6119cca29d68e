package reports

import (
	"drivemend/measure"
	"drivemend/measure/quantity"
)

type repairJSON struct {
	Part     string  `json:"part"`
	Position *string `json:"position"`
	Done     *string `json:"done"`
	By       *string `json:"by"` // null also where the report leaves out who
	Work     *string `json:"work"`
	Was      *string `json:"was"`
	Fitted   *string `json:"fitted"`
	Because  *string `json:"because"`
	Note     *string `json:"note"`
}

type faultCodeJSON struct {
	Code  string  `json:"code"`
	Text  *string `json:"text"`
	Count *int    `json:"count"`
	At    *string `json:"at"` // the board's own clock or hours
	Note  *string `json:"note"`
}

type settingJSON struct {
	Name  string  `json:"name"`
	Value string  `json:"value"`
	Note  *string `json:"note"`
}

type fileJSON struct {
	Path   string  `json:"path"`
	Shows  *string `json:"shows"`
	Part   *string `json:"part"`
	At     *string `json:"at"`
	Bytes  *int64  `json:"bytes"`
	SHA256 *string `json:"sha256"`
}

type captureJSON struct {
	Name     string                `json:"name"`
	Kind     *string               `json:"kind"`
	Position *string               `json:"position"`
	Edge     *string               `json:"edge"`
	At       *string               `json:"at"`
	Bytes    *int64                `json:"bytes"`
	SHA256   *string               `json:"sha256"`
	Note     *string               `json:"note"`
	Figures  map[string]figureJSON `json:"figures"` // by key of the case file
}

type figureJSON struct {
	Value num    `json:"value"`
	Unit  string `json:"unit"`
}

type entryJSON struct {
	Step   string  `json:"step"`
	Result string  `json:"result"`
	At     *string `json:"at"`
	By     *string `json:"by"`
	Note   *string `json:"note"`
	// Superseded tells that another entry of the same step counts instead, or that this one does not count yet.
	Superseded bool          `json:"superseded"`
	Outside    bool          `json:"outside_hold_point"`
	Missing    []missingJSON `json:"missing"` // at the hold point, when it was done
}

type conditionsJSON struct {
	Step                    string  `json:"step"`
	At                      *string `json:"at"`
	Motor                   *string `json:"motor"`
	BrakeResistor           *string `json:"brake_resistor"`
	Bank                    *string `json:"bank"`
	FuseA                   *num    `json:"fuse_a"`
	Guard                   bool    `json:"guard"`
	RemoteOff               bool    `json:"remote_off"`
	Glasses                 bool    `json:"glasses"`
	SecondPerson            bool    `json:"second_person"`
	BusDisconnected         bool    `json:"bus_disconnected"`
	Shield                  bool    `json:"shield"`
	ElectronicsDisconnected bool    `json:"electronics_disconnected"`
	SourcesOff              bool    `json:"sources_off"`
	GatesHeld               bool    `json:"gates_held"`
	LimitSet                bool    `json:"limit_set"`
	Attended                bool    `json:"attended"`
	Probe                   *string `json:"probe"`
	ClipOn                  *string `json:"clip_on"`
	Supply                  *string `json:"supply"`
	EarthClips              *int    `json:"earth_clips"`
	Note                    *string `json:"note"`
}

// jobJSON is the record of a job beside its measuring.
type jobJSON struct {
	Repairs     []repairJSON     `json:"repairs"`
	FaultLog    []faultCodeJSON  `json:"fault_log"`
	Settings    []settingJSON    `json:"settings"`
	Photographs []fileJSON       `json:"photographs"`
	Captures    []captureJSON    `json:"captures"`
	Steps       []entryJSON      `json:"steps"`      // every entry, in file order
	Record      []recordJSON     `json:"record"`     // how each step stands
	Conditions  []conditionsJSON `json:"conditions"` // stated before steps that need more than a dead board
}

func jobOf(r Report) jobJSON {
	c := r.Case
	out := jobJSON{[]repairJSON{}, []faultCodeJSON{}, []settingJSON{}, []fileJSON{}, []captureJSON{}, []entryJSON{}, recordOf(r.Record), []conditionsJSON{}}
	for _, x := range c.Repairs {
		j := repairJSON{x.Part, orNull(x.Position), nil, orNull(r.who(x.By)), orNull(x.Work), orNull(x.Was), orNull(x.Fitted), orNull(x.Because), orNull(x.Note)}
		if !x.Done.IsZero() {
			j.Done = orNull(day(x.Done))
		}
		out.Repairs = append(out.Repairs, j)
	}
	for _, x := range c.FaultLog {
		out.FaultLog = append(out.FaultLog, faultCodeJSON{x.Code, orNull(x.Text), nonZero(x.Count), orNull(x.At), orNull(x.Note)})
	}
	for _, x := range c.Settings {
		out.Settings = append(out.Settings, settingJSON{x.Name, x.Value, orNull(x.Note)})
	}
	for _, x := range c.Photographs {
		out.Photographs = append(out.Photographs, fileJSON{x.Path, orNull(x.Shows), orNull(x.Part), instant(x.At), nonZero(x.Bytes), orNull(x.SHA256)})
	}
	for _, x := range c.Captures {
		out.Captures = append(out.Captures, captureOf(x))
	}
	for i := range c.Steps {
		out.Steps = append(out.Steps, r.entryOf(i))
	}
	for _, x := range c.Safety.Before {
		out.Conditions = append(out.Conditions, conditionsOf(x))
	}
	return out
}

// entryOf is one entry of the record with what is to be said of it.
func (r Report) entryOf(i int) entryJSON {
	x := r.Case.Steps[i]
	out := entryJSON{Step: x.Step, Result: x.Result, At: instant(x.At), By: orNull(r.who(x.By)), Note: orNull(x.Note),
		Superseded: r.resultWords(i) != stepName(x.Result), Missing: []missingJSON{}}
	if o := r.outsideStep(i); o != nil {
		out.Outside, out.Missing = true, missingOf(o.Missing)
	}
	return out
}

// nonZero gives a whole number that may be missing.
func nonZero[T int | int64](n T) *T {
	if n == 0 {
		return nil
	}
	return &n
}

func captureOf(x measure.Capture) captureJSON {
	out := captureJSON{x.Name, orNull(x.Kind), orNull(x.Position), orNull(x.Edge), instant(x.At), nonZero(x.Bytes), orNull(x.SHA256), orNull(x.Note), map[string]figureJSON{}}
	for key, q := range x.Figures {
		out.Figures[key] = figureJSON{num(q.Value), string(q.Unit)}
	}
	return out
}

func conditionsOf(b measure.Before) conditionsJSON {
	out := conditionsJSON{Step: b.Step, At: instant(b.At), Motor: orNull(b.Motor), BrakeResistor: orNull(b.BrakeResistor), Bank: orNull(b.Bank),
		Guard: b.Guard, RemoteOff: b.RemoteOff, Glasses: b.Glasses, SecondPerson: b.SecondPerson, BusDisconnected: b.BusDisconnected, Shield: b.Shield,
		ElectronicsDisconnected: b.ElectronicsDisconnected, SourcesOff: b.SourcesOff, GatesHeld: b.GatesHeld, LimitSet: b.LimitSet, Attended: b.Attended,
		Probe: orNull(b.Probe), ClipOn: orNull(b.ClipOn), Supply: orNull(b.Supply), EarthClips: nonZero(b.EarthClips), Note: orNull(b.Note)}
	if b.Fuse.Unit == quantity.Ampere {
		fuse := num(b.Fuse.Value)
		out.FuseA = &fuse
	}
	return out
}
