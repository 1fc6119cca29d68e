package reports

import (
	"drivemend/diagnose"
	"drivemend/knowledge"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// shownAs is an observation's answer as it was entered; a camera reading of a surface that reads too cold is shown as
// the lower bound that it is.
func shownAs(t *knowledge.Test, o measure.Observation) string {
	if !diagnose.LowerBound(t, o) {
		return shown(o)
	}
	why := "bare metal"
	if o.Surface == "" {
		why = "surface not stated"
	}
	if o.Reading.Kind == quantity.Below {
		return shown(o) + " (as it looked, no bound: " + why + ")"
	}
	o.Reading, o.Twin = atLeast(o.Reading), atLeast(o.Twin)
	return shown(o) + " (lower bound: " + why + ")"
}

// atLeast is a reading as a lower bound. One that is none carries its sign already, or says that it lies above a range.
func atLeast(r *quantity.Reading) *quantity.Reading {
	if r == nil || r.Kind != quantity.Point && r.Kind != quantity.Between {
		return r
	}
	out := *r
	out.Text = "> " + written(*r)
	if r.Kind == quantity.Between {
		out.Text = "> " + quantity.Format(r.Low, r.Unit)
	}
	return &out
}

// shown is a finding's answer, a lower bound where its observation is one.
func (b Beside) shown(f diagnose.Finding) string {
	if b.Case == nil || f.Observation < 0 || f.Observation >= len(b.Case.Observations) {
		return f.Shown
	}
	if o := b.Case.Observations[f.Observation]; diagnose.LowerBound(f.Test, o) {
		return shownAs(f.Test, o)
	}
	return f.Shown
}

// shown is an observation's answer as the report shows it.
func (r Report) shown(o measure.Observation) string { return shownAs(r.test(o.Test), o) }

// test gives a test of the rule base; nil where it is not known.
func (r Report) test(id string) *knowledge.Test {
	if r.Base == nil {
		return nil
	}
	return r.Base.Test(id)
}
