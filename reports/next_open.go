package reports

import (
	"strconv"
	"strings"

	"drivemend/diagnose"
	"drivemend/diagnose/safety"
	"drivemend/measure"
)

// writeMayBeDone names what the hold points allow now although nothing asks for it before all else: powered tests that
// save no minutes by themselves, and steps of the record that stand open.
func writeMayBeDone(s *screen, n *diagnose.Suggestion, plan *safety.Plan, known Beside) {
	if tests := poweredAllowed(n); len(tests) > 0 {
		s.head("MAY BE DONE", underWhat(tests, n, known))
		for _, c := range tests[:min(len(tests), shownOthers)] {
			s.add(mayColumns, []entry{{}, {Text: c.Test.ID}, {Text: c.Test.Title}, {Text: fit(plain(placeShort(c)), mayColumns[3].width)}, {Text: mins(c.Minutes)}})
		}
		if more := len(tests) - shownOthers; more > 0 {
			s.line(neutral, "   and "+strconv.Itoa(more)+" more (drivemend next --json lists all)")
		}
		writeCarried(s, tests, plan)
		s.item(neutral, "", "they save no minutes by themselves; how one is done: drivemend rules show TEST")
	}
	if steps := openSteps(known.Record); len(steps) > 0 {
		s.hang(strong, "RECORD  ", "open, and may be done now: "+strings.Join(steps, ", "))
		s.item(neutral, "", "entered by drivemend record step CASE STEP done")
	}
}

// writeCarried writes the cautions that stand beside some tests whatever the case, each once.
func writeCarried(s *screen, tests []diagnose.Candidate, plan *safety.Plan) {
	if plan != nil {
		s.item(caution, "caution", storedWords(plan, safety.Need(tests[0].Test.Needs)))
	}
	named := map[string]bool{}
	for _, c := range tests {
		for _, text := range safety.Carries(diagnose.WorkOf(c.Test)) {
			if !named[text] {
				named[text] = true
				s.item(caution, "caution", text)
			}
		}
	}
}

var mayColumns = []column{{width: 2}, {width: 28}, {}, {width: 12}, {width: 7, right: true}}

// poweredAllowed gives the powered tests that are allowed at this moment and named nowhere else.
func poweredAllowed(n *diagnose.Suggestion) []diagnose.Candidate {
	var out []diagnose.Candidate
	for _, c := range n.Tests {
		if c.Allowed && safety.Need(c.Test.Needs).Powered() && !(c.Value > 0 || c.Must) {
			out = append(out, c)
		}
	}
	return out
}

// underWhat names the statements that the permission for some tests stands on, each once.
func underWhat(tests []diagnose.Candidate, n *diagnose.Suggestion, known Beside) string {
	var out []string
	named := map[string]bool{}
	for _, c := range tests {
		for _, b := range safety.StandsOn(known.Case, diagnose.WorkOf(c.Test), n.At) {
			if !named[b.Step] {
				named[b.Step] = true
				out = append(out, clockAt(b.At, n.At)+" for "+beforeName(b.Step))
			}
		}
	}
	if len(out) == 0 {
		return "under the conditions stated in the case"
	}
	return "under the conditions stated at " + strings.Join(out, ", ")
}

// openSteps names the steps of the record that stand open and may be done now, as they are entered.
func openSteps(record []safety.RecordStatus) []string {
	var out []string
	for _, r := range record {
		if r.Applies && !r.Settled && len(r.Missing) == 0 && r.Step.ID != measure.StepFollowedUp {
			out = append(out, r.Step.ID)
		}
	}
	return out
}
