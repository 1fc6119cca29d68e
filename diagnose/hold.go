package diagnose

import (
	"time"

	"drivemend/diagnose/safety"
	"drivemend/knowledge"
	"drivemend/measure"
)

// tools are the instruments with hold points of their own.
var tools = map[string]safety.Tool{"scope": safety.ToolScope, "double-pulse": safety.ToolDoublePulse,
	"insulation-tester": safety.ToolInsulation, "supply": safety.ToolInjection}

// WorkOf gives the work at the board that a test is: the state it needs, and the tool by its instrument.
func WorkOf(t *knowledge.Test) safety.Work {
	return safety.Work{Need: safety.Need(t.Needs), Tool: tools[t.Instrument]}
}

// EvidenceOf reads out of the observations of a case what the hold points need of them: when energy was put into the
// board, how the static tests of every position stand, and which other readings since the rebuild speak for a fault. It
// judges the rebuilt board once the rebuild is done, else the board as found, and knows no clock: that a reading has
// come to be is for the hold points to ask.
func EvidenceOf(base *knowledge.Base, c *measure.Case) safety.Evidence {
	if c == nil {
		return safety.Evidence{}
	}
	e, _ := evidenceOf(base, c)
	return e
}

// toRead is what still has to be read at the rebuilt board before power.
type toRead struct {
	statics []openStatic
	failing []openFailing
}

// evidenceOf is EvidenceOf, and what is left to be read.
func evidenceOf(base *knowledge.Base, c *measure.Case) (safety.Evidence, toRead) {
	e := safety.Evidence{Powered: poweredTimes(base, c)}
	var open toRead
	s := newStatics(base, c, e.Powered)
	e.Statics, open.statics = s.judge()
	e.Failing, e.Mended, open.failing = s.failing()
	return e, open
}

// poweredTimes gives the times at which a test of the case put energy into the board. What a test that this base does
// not know showed, a reading or a result with its time, is taken as powered: nobody here can tell that it was not. An
// insulation tester leaves its voltage behind, so that its readings count too (judgement).
func poweredTimes(base *knowledge.Base, c *measure.Case) []time.Time {
	powers := map[string]bool{}
	for i := range base.Tests {
		t := &base.Tests[i]
		powers[t.ID] = WorkOf(t).Energises()
	}
	var times []time.Time
	for i := range c.Observations {
		ob := &c.Observations[i]
		does, known := powers[ob.Test]
		if ob.Answer == "" && (does || !known && (ob.Reading != nil || ob.Result != "" && !ob.At.IsZero())) {
			times = append(times, ob.At)
		}
	}
	return times
}
