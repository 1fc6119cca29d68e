package diagnose

import (
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// WorkOf gives the work at the board that a test is.
func WorkOf(t *knowledge.Test) safety.Work {
	return safety.Work{Need: safety.Need(t.Needs)}
}

// EvidenceOf reads out of the observations of a case what the hold points need of them.
func EvidenceOf(base *knowledge.Base, c *measure.Case) safety.Evidence {
	return safety.Evidence{Powered: poweredTimes(base, c)}
}

// poweredTimes gives the times at which a test of the case put energy into the board. A reading of a test that this
// base does not know is taken as powered: nobody here can tell that it was not.
func poweredTimes(base *knowledge.Base, c *measure.Case) []time.Time {
	var times []time.Time
	for _, ob := range c.Observations {
		t := base.Test(ob.Test)
		switch {
		case ob.Answer != "":
		case t == nil && ob.Reading != nil, t != nil && safety.Need(t.Needs).Powered():
			times = append(times, ob.At)
		}
	}
	return times
}
