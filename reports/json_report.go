package reports

import (
	"io"

	"drivemend/diagnose"
	"drivemend/measure"
)

type shelfJSON struct {
	File    string       `json:"file"`
	Case    *string      `json:"case"`
	Opened  *string      `json:"opened"`
	Answers *int         `json:"answers"`
	Ranking *rankJSON    `json:"ranking"`
	Outcome *outcomeJSON `json:"outcome"`
	Problem *string      `json:"problem"`
}

// ShelfJSON writes the cases of a folder.
func ShelfJSON(w io.Writer, cases []ShelfCase) error {
	out := struct {
		Cases []shelfJSON `json:"cases"`
	}{[]shelfJSON{}}
	for _, c := range cases {
		j := shelfJSON{File: c.File, Problem: orNull(c.Problem), Ranking: rankOf(c.Ranking, nil, Beside{})}
		if c.Case != nil {
			n := answered(c.Case)
			j.Case, j.Opened, j.Answers, j.Outcome = orNull(c.Case.ID), dayOrNull(c.Case), &n, outcomeOf(c.Case.Outcome)
		}
		out.Cases = append(out.Cases, j)
	}
	return writeJSON(w, out)
}

func dayOrNull(c *measure.Case) *string {
	if c.Opened.IsZero() {
		return nil
	}
	return orNull(day(c.Opened))
}

type observationJSON struct {
	Test       string  `json:"test"`
	Part       *string `json:"part"`
	Position   *string `json:"position"`
	At         *string `json:"at"`
	Shown      string  `json:"shown"`
	Seen       *string `json:"seen"`
	LowerBound bool    `json:"lower_bound"` // a camera reading of a surface that reads too cold
	Superseded bool    `json:"superseded"`
}

type outsideJSON struct {
	Observation int           `json:"observation"`
	Test        string        `json:"test"`
	Missing     []missingJSON `json:"missing"`
}

type reportJSON struct {
	Case         string            `json:"case"`
	At           *string           `json:"at"`
	Private      bool              `json:"private"`
	Owner        *string           `json:"owner"`
	Technician   *string           `json:"technician"`
	Serial       *string           `json:"serial"`
	Firmware     *string           `json:"firmware"`
	Story        *string           `json:"story"`
	RuleBase     *string           `json:"rule_base"`
	Finding      string            `json:"finding"`
	Stated       *string           `json:"finding_stated"` // how the outcome says it was confirmed, judged by the dates on record
	Change       *changeJSON       `json:"change"`
	Rank         *rankJSON         `json:"rank"`
	Next         *nextJSON         `json:"next"`
	Margin       *marginJSON       `json:"margin"`
	Discharge    *dischargeJSON    `json:"discharge"`
	Safety       *statusJSON       `json:"safety"`
	Observations []observationJSON `json:"observations"`
	Outside      []outsideJSON     `json:"outside"`
	Outcome      *outcomeJSON      `json:"outcome"`
	jobJSON
}

type changeJSON struct {
	Cause  string  `json:"cause"`
	Repair *string `json:"repair"`
	Title  string  `json:"title"`
	Why    string  `json:"because"`
}

// ReportJSON writes the whole report as one object.
func ReportJSON(w io.Writer, r Report) error {
	if err := r.check(); err != nil {
		return err
	}
	c, known := r.Case, r.beside()
	out := reportJSON{Case: c.ID, At: instant(r.At), Private: r.Private, Story: orNull(c.Story), Finding: r.findingState(), Rank: rankOf(r.Ranking, nil, known), Next: nextOf(r.Next, known),
		Margin: marginOf(c, r.Margin), Discharge: dischargeOf(r.plan()), Safety: statusOf(c, r.Safety), Outcome: outcomeOf(c.Outcome), Observations: []observationJSON{}, Outside: []outsideJSON{}}
	out.jobJSON = jobOf(r)
	if !r.Private {
		out.Owner, out.Technician, out.Serial, out.Firmware = orNull(c.Owner), orNull(c.Technician), orNull(c.Serial), orNull(c.Firmware)
	}
	if r.Base != nil {
		out.RuleBase = orNull(r.Base.Hash)
	}
	if out.Rank != nil && r.Margin != nil {
		out.Rank.Needs = needsJSON(r.Margin.Needs)
	}
	if cause, repair := r.change(); cause != nil {
		out.Change = &changeJSON{Cause: cause.ID, Title: r.changeTitle(), Why: r.changeBecause()}
		if repair != nil {
			out.Change.Repair = orNull(repair.ID)
		}
	}
	if c.Outcome != nil {
		out.Stated = orNull(confirmedWords(c, r.At))
	}
	out.addObservations(r)
	return writeJSON(w, out)
}

func (out *reportJSON) addObservations(r Report) {
	for i, o := range r.Case.Observations {
		out.Observations = append(out.Observations, observationJSON{o.Test, orNull(o.Part), orNull(o.Position), instant(o.At), r.shown(o), orNull(o.Seen), diagnose.LowerBound(r.test(o.Test), o), r.Case.Superseded(i)})
	}
	out.Outside = outsideOf(r.Case, r.Outside)
}
