package diagnose

import (
	"testing"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

// Every figure that a rule may name under `computed:` is filled for a board that states what it takes, and no other.
func TestEveryComputedNameIsFilled(t *testing.T) {
	f, err := measure.Load("../testdata/cases/orchard-pump-3.yaml")
	if err != nil {
		t.Fatal(err)
	}
	spans, needs, err := stress.Spans(f.Case.Board)
	if err != nil {
		t.Fatal(err)
	}
	for _, figure := range knowledge.Computed() {
		span, ok := spans[figure.Name]
		if !ok {
			t.Errorf("%s is not filled; needs %v", figure.Name, needs)
		} else if !(span.Low <= span.High) {
			t.Errorf("%s runs from %g to %g", figure.Name, span.Low, span.High)
		}
		delete(spans, figure.Name)
	}
	for name := range spans {
		t.Errorf("%s is filled, but no rule may name it", name)
	}
}
