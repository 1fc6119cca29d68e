package safety

import (
	"math"
	"strings"
	"testing"
	"time"

	"drivemend/measure"
	"drivemend/measure/quantity"
)

// parse reads a case from the lines of its board and of what follows.
func parse(t testing.TB, board, rest string) *measure.Case {
	t.Helper()
	text := "drivemend: 1\ncase: bench-1\nopened: 2026-12-01\nboard:\n"
	for _, line := range strings.Split(strings.TrimSpace(board), "\n") {
		text += "  " + strings.TrimSpace(line) + "\n"
	}
	f, err := measure.Parse("bench-1.yaml", []byte(text+rest))
	if err != nil {
		t.Fatalf("%v\n%s", err, text+rest)
	}
	return f.Case
}

func boardOf(t testing.TB, board string) measure.Board {
	t.Helper()
	return parse(t, board, "").Board
}

// at gives a moment of the bench day, "10:07" or "10:07:30".
func at(t testing.TB, clock string) time.Time {
	t.Helper()
	if len(clock) == 5 {
		clock += ":00"
	}
	moment, err := time.Parse(time.RFC3339, "2026-12-01T"+clock+"+01:00")
	if err != nil {
		t.Fatal(err)
	}
	return moment
}

func volts(v float64) quantity.Quantity { return quantity.Of(v, quantity.Volt) }

// near fails when got is further from want than a relative tolerance.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s: got %.6g, want %.6g within %g", what, got, want, tolerance)
	}
}

func points(stores []Store) string {
	var names []string
	for _, s := range stores {
		name := s.Point
		if s.ToCheck {
			name += "?"
		}
		names = append(names, name)
	}
	return strings.Join(names, " ")
}
