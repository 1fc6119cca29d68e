package diagnose

import (
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// rebuiltBy tells whether the rebuild has come to be: what is read from then on is of the rebuilt board.
func rebuiltBy(c *measure.Case, now time.Time) bool {
	return c.Rebuild != nil && !c.Rebuild.Done.IsZero() && now.After(c.Rebuild.Done)
}

// afterRebuild parts the candidates once the board is rebuilt. Dead tests do not vote any more: of them only the checks
// that must be done are left, and they save nothing. The static tests are asked anew, of the board as it now stands, and
// so is whatever speaks for a fault since.
func afterRebuild(all []Candidate, statics []safety.Static, open toRead) (voting, serving []Candidate) {
	static := map[string]bool{}
	for _, st := range statics {
		static[st.Test] = true
	}
	serving = staticCandidates(open.statics)
	for _, f := range open.failing {
		serving = append(serving, f.candidate())
	}
	for _, c := range all {
		switch {
		case c.Test.Needs != "dead":
			voting = append(voting, c)
		case c.Must && !static[c.Test.ID]:
			c.Serves = true
			serving = append(serving, c)
		}
	}
	return voting, serving
}

// staticCandidates asks for the open static tests position by position: a bank in circuit by one reading, what is not
// read through leads part by part, what is of the whole board once.
func staticCandidates(open []openStatic) []Candidate {
	var out []Candidate
	asked := map[*knowledge.Test]bool{}
	for _, o := range open {
		c := Candidate{Test: o.test, Position: o.position, Must: true, Serves: true, Minutes: o.test.Minutes,
			Static: true, Deferred: o.worst.how == unsettled, Again: o.again()}
		for _, part := range o.lifted {
			lifted := c
			lifted.Part, lifted.Position, lifted.Lifted, lifted.Minutes = part, "", true, c.Minutes+liftMinutes
			out = append(out, lifted)
		}
		switch {
		case len(o.lifted) > 0 && len(o.lifted) == len(o.parts):
		case o.test.Per == "" && asked[o.test]:
		case o.test.Per == "":
			asked[o.test], c.Position = true, ""
			out = append(out, c)
		case o.test.Per == "part" && !atTerminals(o.test):
			for _, part := range o.parts {
				c.Part, c.Position = part, ""
				out = append(out, c)
			}
		default:
			out = append(out, c)
		}
	}
	return out
}

// again says what to do about a static test that was read and does not pass; "" when it was not read.
func (o *openStatic) again() string {
	switch o.worst.how {
	case unclear:
		return o.worst.because + ": read it again"
	case outside:
		return o.worst.because + ": prove the board dead, then read it again"
	case fails:
		return o.worst.because + ": find the part and put it right, enter the new rebuild.done, then read every position again"
	}
	return ""
}
