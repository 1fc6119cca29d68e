package reports

import (
	"io"

	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

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
	Stated    *string       `json:"stated_at"` // the statement that counts
	AgeS      *num          `json:"age_s"`     // of that statement
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
	Alarms    []string      `json:"alarms"`
	Isolation isolationJSON `json:"isolation"`
	Link      linkJSON      `json:"link"`
	Points    []checkJSON   `json:"points"`
	Unplaced  []string      `json:"unplaced"`
	Spared    []string      `json:"spared"` // stores that need no check now, and why
	Outcome   *outcomeJSON  `json:"outcome"`
}

// statusOf is the safety record at one moment, as the status and the report carry it.
func statusOf(c *measure.Case, st safety.Status) *statusJSON {
	i, l := st.Isolation, st.Link
	out := &statusJSON{Case: c.ID, At: instant(st.At), Answers: answered(c), Dead: st.Dead, Alarms: list(st.Alarms),
		Isolation: isolationJSON{i.Isolated, instant(i.Since), isolationStated(i), isolationAge(i), instant(i.Energised), missingOf(i.Missing)},
		Link:      linkJSON{l.Fitted, instant(l.Since), instant(l.Removed)}, Points: []checkJSON{}, Unplaced: list(st.Unplaced), Spared: list(st.Spared), Outcome: outcomeOf(c.Outcome)}
	for _, p := range st.Points {
		out.Points = append(out.Points, checkOf(p))
	}
	return out
}

func isolationStated(i safety.IsolationStatus) *string {
	if i.Last == nil {
		return nil
	}
	return instant(i.Last.At)
}

func isolationAge(i safety.IsolationStatus) *num {
	if i.Last == nil || i.Age <= 0 {
		return nil
	}
	age := num(i.Age.Seconds())
	return &age
}

type workJSON struct {
	Need    string        `json:"need"`
	Tool    *string       `json:"tool"`
	Title   string        `json:"title"`
	Allowed bool          `json:"allowed"`
	Missing []missingJSON `json:"missing"`
}

type recordJSON struct {
	Step    string        `json:"step"`
	Phase   string        `json:"phase"`
	Title   string        `json:"title"`
	Applies bool          `json:"applies"`
	Result  *string       `json:"result"`
	At      *string       `json:"at"`
	Settled bool          `json:"settled"`
	Due     *string       `json:"due"`
	Missing []missingJSON `json:"missing"`
}

type openJSON struct {
	Test  string `json:"test"`
	Title string `json:"title"`
	Why   string `json:"why"`
}

type pageJSON struct {
	*statusJSON
	Works   []workJSON    `json:"works"`
	Record  []recordJSON  `json:"record"`
	Outside []outsideJSON `json:"outside"`
	// OutsideSteps are entries of the record done outside their hold points.
	OutsideSteps []outsideStepJSON `json:"outside_steps"`
	Open         []openJSON        `json:"open"`
	Needs        []needJSON        `json:"needs"`
	Stated       int               `json:"stated"`  // values of the board
	Assumed      int               `json:"assumed"` // of the stated ones
}

// StatusJSON writes where a case stands at one moment, with the same content as the screen and everything that is
// missing.
func StatusJSON(w io.Writer, p StatusPage) error {
	out := pageJSON{statusJSON: statusOf(p.Case, p.Safety), Works: []workJSON{}, Record: recordOf(p.Record), Outside: outsideOf(p.Case, p.Outside), OutsideSteps: outsideStepsOf(p.Case, p.OutsideSteps),
		Open: []openJSON{}, Needs: needsJSON(p.Needs), Stated: p.Stated, Assumed: p.Assumed}
	for _, x := range p.Works {
		d := x.Decision
		out.Works = append(out.Works, workJSON{string(d.Need), orNull(string(d.Tool)), x.Title, d.Allowed, missingOf(d.Missing)})
	}
	for _, t := range p.Open {
		out.Open = append(out.Open, openJSON{t.ID, t.Title, t.Why})
	}
	return writeJSON(w, out)
}

func recordOf(record []safety.RecordStatus) []recordJSON {
	out := []recordJSON{}
	for _, r := range record {
		j := recordJSON{Step: r.Step.ID, Phase: string(r.Step.Phase), Title: r.Step.Title, Applies: r.Applies, Settled: r.Settled, Due: instant(r.Due), Missing: missingOf(r.Missing)}
		if r.Last != nil {
			j.Result, j.At = orNull(r.Last.Result), instant(r.Last.At)
		}
		out = append(out, j)
	}
	return out
}

func outsideOf(c *measure.Case, readings []Outside) []outsideJSON {
	out := []outsideJSON{}
	for _, x := range readings {
		if x.Observation >= 0 && x.Observation < len(c.Observations) {
			out = append(out, outsideJSON{x.Observation, c.Observations[x.Observation].Test, missingOf(x.Missing)})
		}
	}
	return out
}

type outsideStepJSON struct {
	Entry   int           `json:"entry"`
	Step    string        `json:"step"`
	Missing []missingJSON `json:"missing"`
}

func outsideStepsOf(c *measure.Case, steps []OutsideStep) []outsideStepJSON {
	out := []outsideStepJSON{}
	for _, x := range steps {
		if x.Entry >= 0 && x.Entry < len(c.Steps) {
			out = append(out, outsideStepJSON{x.Entry, c.Steps[x.Entry].Step, missingOf(x.Missing)})
		}
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
