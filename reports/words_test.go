package reports

import (
	"math"
	"testing"

	"drivemend/measure/quantity"
)

func TestPercentNeverClaimsCertainty(t *testing.T) {
	for p, want := range map[float64]string{0: "0 %", 1e-9: "<1 %", 0.005: "<1 %", 0.0051: "1 %", 0.58: "58 %", 0.994: "99 %", 0.995: ">99 %", 1 - 1e-12: ">99 %", 1: "100 %"} {
		if got := percent(p); got != want {
			t.Errorf("percent(%v) = %q, want %q", p, got, want)
		}
	}
	if got := percent(math.NaN()); got != "?" {
		t.Errorf("percent of no number is %q", got)
	}
}

func TestDecibans(t *testing.T) {
	for x, want := range map[float64]string{6.76: "+6.8", -0.04: "+0.0", -4.1: "-4.1", math.Inf(1): "> +999", math.Inf(-1): "< -999", 1000: "> +999"} {
		if got := decibans(x); got != want {
			t.Errorf("decibans(%v) = %q, want %q", x, got, want)
		}
	}
	if got := decibans(oddsOf(0.5)); got != "+0.0" {
		t.Errorf("even odds are %s dB", got)
	}
}

// TestWaitsAreRoundedUp: nobody is told to wait less than it takes.
func TestWaitsAreRoundedUp(t *testing.T) {
	for x, want := range map[float64]string{0: "0 s", 0.2: "1 s", 2.0001: "3 s", 5: "5 s"} {
		if got := seconds(x); got != want {
			t.Errorf("seconds(%v) = %q, want %q", x, got, want)
		}
	}
}

func TestBetween(t *testing.T) {
	q := quantity.Quantity{Low: 60e-9, Value: 120e-9, High: 200e-9, Unit: quantity.Henry}
	if got, want := between(q), "120 nH (60 nH to 200 nH)"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
	if got, want := between(quantity.Of(5, quantity.Volt)), "5 V"; got != want {
		t.Errorf("got %q, want %q", got, want)
	}
}

func TestFoldKeepsEveryWord(t *testing.T) {
	for _, c := range []struct {
		text string
		most int
		want []string
	}{
		{"one two three", 7, []string{"one two", "three"}},
		{"abcdefghij kl", 4, []string{"abcd", "efgh", "ij", "kl"}},
		{"漢字漢字", 4, []string{"漢字", "漢字"}},
		{"", 5, nil},
	} {
		got := fold(c.text, c.most)
		if len(got) != len(c.want) {
			t.Errorf("fold(%q, %d) = %q, want %q", c.text, c.most, got, c.want)
			continue
		}
		for i := range got {
			if got[i] != c.want[i] {
				t.Errorf("fold(%q, %d) = %q, want %q", c.text, c.most, got, c.want)
			}
		}
	}
}

func TestShortDropsTheDetail(t *testing.T) {
	title := "Current loop too long: stretched leads, long bars"
	for most, want := range map[int]string{80: title, 30: "Current loop too long", 10: "Current loop too long"} {
		if got := short(title, most); got != want {
			t.Errorf("short to %d = %q, want %q", most, got, want)
		}
	}
}
