package reports

import (
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// steps are the steps that leave no reading, with every entry made for them, and those that stand open.
func (r Report) steps() section {
	s := section{ID: "steps", Title: "Steps before touching and after the repair"}
	t := table{Caption: "Steps that leave no reading; of several entries for one step the last counts", Heads: []string{"Step", "When in the job", "Result", "Time", "By", "Note"}, Numeric: make([]bool, 6)}
	record := r.record()
	for _, x := range record {
		t.Rows = append(t.Rows, r.stepRows(x)...)
	}
	s.tabulateAny(t)
	if outside := r.outsideSteps(); len(outside) > 0 {
		s.say(caution, "* OUTSIDE A HOLD POINT.", "Kept, but not done as the safety rules ask. What was missing:")
		var items []string
		for _, x := range outside {
			items = append(items, joined(", ", x.what, x.shown, moment(x.at))+": "+allMissing(x.missing))
		}
		s.enumerate(false, items...)
	}
	for _, x := range record {
		if x.Because != "" {
			s.say(caution, "OPEN.", capital(x.Step.Title)+": "+x.Because+".")
		}
	}
	if tone, text := followUpWords(record, r.At); text != "" {
		s.say(tone, "FOLLOW-UP.", capital(text)+".")
	}
	return s
}

// record is how the steps stand, also where that was not worked out beforehand: no entry is left out for want of it.
func (r Report) record() []safety.RecordStatus {
	if r.Record != nil {
		return r.Record
	}
	return safety.Record(r.Case, r.At, safety.Evidence{})
}

func (r Report) stepRows(x safety.RecordStatus) [][]entry {
	var rows [][]entry
	for i, e := range r.Case.Steps {
		if e.Step != x.Step.ID {
			continue
		}
		mark := ""
		if r.outsideStep(i) != nil {
			mark = "*"
		}
		row := cells(capital(x.Step.Title)+mark, string(x.Step.Phase), r.resultWords(i), moment(e.At), r.who(e.By), e.Note)
		if notCounting(e, x, r.At) == "" {
			row[2].Tone = resultTone(e.Result)
		}
		rows = append(rows, row)
	}
	if len(rows) == 0 && x.Applies {
		row := cells(capital(x.Step.Title), string(x.Step.Phase), "open", "", "", "")
		row[2].Tone = caution
		rows = append(rows, row)
	}
	return rows
}

// outsideStep gives the mark of an entry that was made outside its hold point; nil for one without.
func (r Report) outsideStep(entry int) *OutsideStep {
	for k := range r.OutsideSteps {
		if r.OutsideSteps[k].Entry == entry {
			return &r.OutsideSteps[k]
		}
	}
	return nil
}

// resultWords is how an entry ended, and why it does not count where it does not: "failed (superseded)".
func (r Report) resultWords(entry int) string {
	e := r.Case.Steps[entry]
	text := stepName(e.Result)
	for _, x := range r.record() {
		if why := notCounting(e, x, r.At); x.Step.ID == e.Step && why != "" {
			return text + " (" + why + ")"
		}
	}
	return text
}

// notCounting says why an entry of a step is not the one that counts; "" for the one that is.
func notCounting(e measure.StepEntry, x safety.RecordStatus, at time.Time) string {
	last := x.Last
	switch {
	case last != nil && e.At.Equal(last.At) && e.Result == last.Result && e.Note == last.Note && e.By == last.By:
		return ""
	case e.At.IsZero():
		return "no time stated: does not count"
	case e.At.After(at):
		return "dated later than this report: does not count"
	case last != nil:
		return "superseded"
	}
	return ""
}

// stepTitle is a step of the record in plain words.
func (r Report) stepTitle(id string) string {
	for _, x := range r.record() {
		if x.Step.ID == id {
			return x.Step.Title
		}
	}
	return stepName(id)
}

func resultTone(result string) tone {
	switch result {
	case "done":
		return normal
	case "failed":
		return danger
	}
	return caution
}
