package diagnose

import (
	"testing"
	"time"

	"pgregory.net/rapid"

	"drivemend/diagnose/safety"
	"drivemend/measure"
	"drivemend/measure/quantity"
)

// minute draws a moment of three hours.
func minute(t *rapid.T, what string) time.Time {
	return rebuildTime.Add(time.Duration(rapid.IntRange(0, 180).Draw(t, what)) * time.Minute)
}

// drawRecord draws a safety record of a board with a single store; many of them let nothing through.
func drawRecord(t *rapid.T) measure.Safety {
	var s measure.Safety
	for range rapid.IntRange(1, 3).Draw(t, "isolations") {
		s.Isolation = append(s.Isolation, measure.Isolation{Locked: rapid.IntRange(0, 9).Draw(t, "locked") > 0, Motor: "unplugged", OtherSources: "none", At: minute(t, "isolated")})
	}
	for range rapid.IntRange(1, 6).Draw(t, "checks") {
		s.DeadChecks = append(s.DeadChecks, measure.DeadCheck{Point: safety.PointBus, DC: quantity.Of(rapid.SampledFrom([]float64{0.2, 0.3, 7}).Draw(t, "volts"), quantity.Volt),
			AC: quantity.Of(0, quantity.Volt), MeterProved: true, At: minute(t, "checked")})
	}
	for range rapid.IntRange(0, 1).Draw(t, "links") {
		s.Links = append(s.Links, measure.Link{Fitted: minute(t, "fitted"), Removed: minute(t, "removed")})
	}
	for range rapid.IntRange(0, 1).Draw(t, "energised") {
		s.Energised = append(s.Energised, measure.Energised{What: "source", At: minute(t, "source")})
	}
	return s
}

// TestOneQuestionServesAStretch: what is worked out for a whole stretch is what the hold points say of each reading.
func TestOneQuestionServesAStretch(t *testing.T) {
	board := caseOf(t, "topology: low-side-chopper\nsupply: battery\nbus: {nominal: 48 V, halves: no, fuse: none}\nstages: {brake: {fitted: no}}\nload: {kind: resistive}", "").Board
	within, all := 0, 0
	rapid.Check(t, func(t *rapid.T) {
		c := &measure.Case{ID: "drawn", Board: board, Safety: drawRecord(t)}
		for range rapid.IntRange(0, 1).Draw(t, "captures") {
			c.Captures = append(c.Captures, measure.Capture{Kind: "scope", At: minute(t, "captured")})
		}
		var powered []time.Time
		for range rapid.IntRange(0, 1).Draw(t, "powered") {
			powered = append(powered, minute(t, "power"))
		}
		work := safety.Work{Need: safety.NeedDead, Tool: rapid.SampledFrom([]safety.Tool{safety.NoTool, safety.NoTool, safety.ToolInsulation}).Draw(t, "tool")}
		h := newHeld(c, powered)
		// Half of the readings follow a dead check closely, so that some are within.
		readings := rapid.SliceOfN(rapid.Custom(func(t *rapid.T) time.Time {
			if rapid.Bool().Draw(t, "anywhere") {
				return minute(t, "read")
			}
			return rapid.SampledFrom(c.Safety.DeadChecks).Draw(t, "check").At.Add(time.Duration(rapid.IntRange(0, 11).Draw(t, "after")) * time.Minute)
		}), 1, 12).Draw(t, "readings")
		for _, at := range readings {
			h.note(work, at)
		}
		for _, at := range readings {
			ob := measure.Observation{At: at}
			want, missing := safety.OutsideHoldPoint(c, ob, work, safety.Evidence{Powered: powered})
			if got := h.outside(work, ob); got != want {
				t.Fatalf("at %v: outside %v, the hold points say %v: %v", at, got, want, missing)
			}
			if all++; !want {
				within++
			}
		}
	})
	if within == 0 || within == all {
		t.Errorf("%d of %d readings were within: the draw tells nothing apart", within, all)
	}
}
