package quantity

import (
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

var seriesNumbers = []int{3, 6, 12, 24, 48, 96}

// geometric gives member i of n in a decade, rounded to a step of the given size.
func geometric(i, n, size int) int {
	return int(math.Round(100*math.Pow(10, float64(i)/float64(n))/float64(size))) * size
}

func TestSeriesAreWhole(t *testing.T) {
	for _, n := range seriesNumbers {
		if len(series[n]) != n || !slices.IsSorted(series[n]) {
			t.Errorf("E%d has %d members: %v", n, len(series[n]), series[n])
		}
	}
}

func TestFineSeriesAreGeometric(t *testing.T) {
	for _, n := range []int{48, 96} {
		for i, m := range series[n] {
			if want := geometric(i, n, 1); m != want {
				t.Errorf("E%d member %d is %d, the rounded geometric series has %d", n, i, m, want)
			}
		}
	}
}

// Eight members of E24 leave the rounded geometric series: seven lie 0.1 above it and 8.2 lies 0.1 below.
func TestIrregularMembersOfE24(t *testing.T) {
	off := map[int]int{}
	for i, m := range series[24] {
		if want := geometric(i, 24, 10); m != want {
			off[m] = m - want
		}
	}
	listed := map[int]int{270: 10, 300: 10, 330: 10, 360: 10, 390: 10, 430: 10, 470: 10, 820: -10}
	if len(off) != len(listed) {
		t.Errorf("irregular members %v, listed %v", off, listed)
	}
	for m, d := range listed {
		if off[m] != d {
			t.Errorf("%d is off by %d, listed %d", m, off[m], d)
		}
	}
}

func TestCoarseSeriesAreEveryOtherMember(t *testing.T) {
	for _, n := range []int{3, 6, 12, 48} {
		for i, m := range series[n] {
			if series[2*n][2*i] != m {
				t.Errorf("E%d member %d is %d, E%d has %d there", n, i, m, 2*n, series[2*n][2*i])
			}
		}
	}
}

func TestPreferred(t *testing.T) {
	for _, c := range []struct {
		series int
		v      float64
		r      Rounding
		want   float64
	}{
		{12, 4.7e-9, Nearest, 4.7e-9}, {12, 4.7 * 1e-9, Up, 4.7e-9}, {12, 4.7 * 1e-9, Down, 4.7e-9}, {24, 5000, Nearest, 5100}, {24, 5000, Down, 4700},
		{6, 5000, Nearest, 4700}, {6, 5000, Up, 6800}, {3, 5000, Up, 10000}, {3, 5000, Down, 4700}, {12, 9.5, Nearest, 10}, {12, 9.5, Up, 10}, {12, 9.5, Down, 8.2},
		{96, 1, Up, 1}, {96, 0.99, Nearest, 1}, {96, 0.99, Down, 0.976}, {48, 1e6, Down, 1e6}, {24, 999.9999, Up, 1000}, {3, 1e-12, Nearest, 1e-12},
		{12, 99, Nearest, 100}, {3, 1.4, Nearest, 1}, {3, 1.5, Nearest, 2.2}, // the border lies at √2.2 = 1.483
	} {
		if got, err := Preferred(c.series, c.v, c.r); err != nil || got != c.want {
			t.Errorf("Preferred(%d, %v, %d) = %v, %v; want %v", c.series, c.v, c.r, got, err, c.want)
		}
	}
}

func TestPreferredErrors(t *testing.T) {
	for _, c := range []struct {
		series int
		v      float64
		r      Rounding
		says   string
	}{
		{10, 1, Nearest, "there are E3"}, {192, 1, Nearest, "there are E3"}, {24, 0, Nearest, "above zero"}, {24, -1, Up, "above zero"},
		{24, math.NaN(), Up, "above zero"}, {24, math.Inf(1), Down, "above zero"}, {24, math.MaxFloat64, Up, "end of the computable"},
	} {
		if got, err := Preferred(c.series, c.v, c.r); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("Preferred(%d, %v) = %v, %v", c.series, c.v, got, err)
		}
	}
}

func TestPreferredBrackets(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.SampledFrom(seriesNumbers).Draw(t, "series")
		v := math.Pow(10, rapid.Float64Range(-300, 300).Draw(t, "log"))
		down, errDown := Preferred(n, v, Down)
		up, errUp := Preferred(n, v, Up)
		near, errNear := Preferred(n, v, Nearest)
		if errDown != nil || errUp != nil || errNear != nil {
			t.Fatal(errDown, errUp, errNear)
		}
		if down > v*(1+1e-8) || up < v*(1-1e-8) || near != down && near != up {
			t.Fatalf("E%d of %v: %v %v %v", n, v, down, near, up)
		}
		if again, _ := Preferred(n, near, Up); again != near {
			t.Fatalf("E%d: %v does not stay but becomes %v", n, near, again)
		}
		if math.Abs(math.Log(near/v)) > math.Min(math.Log(v/down), math.Log(up/v))+1e-8 {
			t.Fatalf("E%d: %v is not the nearer of %v and %v to %v", n, near, down, up, v)
		}
	})
}
