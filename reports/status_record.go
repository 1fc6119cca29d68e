package reports

import (
	"strconv"
	"strings"
	"time"

	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// phaseLabels are the phases of the record, shortened to the label of a line.
var phaseLabels = []struct {
	phase safety.Phase
	label string
}{{safety.BeforeTouching, "before"}, {safety.WhileRepairing, "repair"}, {safety.AfterRepair, "after"}}

// writeRecord tells for each phase of the job what is done, what failed and what stands open, and when to follow up.
func writeRecord(s *screen, p StatusPage) {
	mark := "RECORD  "
	for _, x := range phaseLabels {
		if text := phaseWords(p.Record, x.phase); text != "" {
			s.hang(strong, mark, x.label+": "+text)
			mark = strings.Repeat(" ", len(mark))
		}
	}
	if t, text := followUpWords(p.Record, p.At); text != "" {
		s.hang(t, "FOLLOW-UP  ", text)
	}
}

// phaseWords lists the steps of one phase, those that ended alike on one day together; last what failed and what
// stands open.
func phaseWords(record []safety.RecordStatus, phase safety.Phase) string {
	var ends, open []string
	steps := map[string][]string{}
	for _, r := range record {
		switch {
		case r.Step.Phase != phase:
		case r.Last != nil && (r.Settled || r.Last.Result == "failed"):
			end := endWords(r.Last)
			if steps[end] == nil {
				ends = append(ends, end)
			}
			steps[end] = append(steps[end], stepName(r.Step.ID))
		case r.Applies:
			open = append(open, stepName(r.Step.ID))
		}
	}
	var parts []string
	for _, end := range ends {
		names := strings.Join(steps[end], ", ")
		if len(ends) == 1 && len(open) == 0 && len(steps[end]) > 1 {
			names = "all " + strconv.Itoa(len(steps[end]))
		}
		parts = append(parts, names+" "+end)
	}
	if len(open) > 0 {
		parts = append(parts, "OPEN "+strings.Join(open, ", "))
	}
	return strings.Join(parts, "; ")
}

// endWords says how a step ended, and on which day.
func endWords(e *measure.StepEntry) string {
	result := stepName(e.Result)
	if e.Result == "failed" {
		result = "FAILED"
	}
	return result + " " + day(e.At)
}

// stepName is a step of the record as it is entered, readable.
func stepName(id string) string { return strings.ReplaceAll(id, "-", " ") }

// followUpWords says when the repair is to be asked after, or what came of it; "" before it was handed over.
func followUpWords(record []safety.RecordStatus, at time.Time) (tone, string) {
	f := followUpOf(record)
	switch {
	case f == nil:
		return neutral, ""
	case f.Last != nil && f.Last.Result == "failed":
		return danger, "FAILED " + day(f.Last.At) + ": the repair did not hold"
	case f.Settled && f.Last != nil && f.Last.Result == "done":
		return normal, "done " + day(f.Last.At) + ": the repair held"
	case f.Settled && f.Last != nil:
		return neutral, stepName(f.Last.Result) + " " + day(f.Last.At)
	case f.Due.IsZero():
		return neutral, ""
	case at.Before(f.Due):
		return neutral, "due " + day(f.Due)
	}
	return mandatory, "DUE since " + day(f.Due) + ": ask whether the repair holds"
}
