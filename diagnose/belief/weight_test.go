package belief

import (
	"errors"
	"math"
	"testing"

	"pgregory.net/rapid"
)

func TestDecibansByHand(t *testing.T) {
	ln := math.Log
	inf := math.Inf(1)
	prior := []float64{1, 1, 2}
	tests := []struct {
		name     string
		prefixes [][]float64
		in       []bool
		want     []float64
	}{
		// in: 1 of 4. First finding 0.8 under it, 0.08 under the rest: a factor of 10, so 10 dB.
		{"factor ten", [][]float64{{0, 0, 0}, {ln(0.8), ln(0.08), ln(0.08)}}, []bool{true, false, false}, []float64{10}},
		{"says nothing", [][]float64{{0, 0, 0}, {ln(0.3), ln(0.3), ln(0.3)}}, []bool{true, false, false}, []float64{0}},
		// rest: (0.2·1 + 0.05·2)/3 = 0.1
		{"rest is weighted", [][]float64{{0, 0, 0}, {0, ln(0.2), ln(0.05)}}, []bool{true, false, false}, []float64{10}},
		{"ruled out, then nothing more", [][]float64{{0, 0, 0}, {-inf, 0, 0}, {-inf, ln(0.1), 0}}, []bool{true, false, false}, []float64{-inf, 0}},
		{"proved", [][]float64{{0, 0, 0}, {0, -inf, -inf}}, []bool{true, false, false}, []float64{inf}},
		{"everything is in", [][]float64{{0, 0, 0}, {ln(0.5), 0, 0}}, []bool{true, true, true}, []float64{0}},
		{"no finding", [][]float64{{0, 0, 0}}, []bool{true, false, false}, []float64{}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got, err := Decibans(prior, tt.prefixes, tt.in)
			if err != nil || len(got) != len(tt.want) {
				t.Fatalf("got %v, %v", got, err)
			}
			for k := range got {
				if !near(got[k], tt.want[k]) {
					t.Errorf("finding %d weighs %v dB, should be %v", k, got[k], tt.want[k])
				}
			}
		})
	}
}

func TestDecibansRefuses(t *testing.T) {
	row := []float64{0, 0}
	for _, tt := range []struct {
		prior    []float64
		prefixes [][]float64
		in       []bool
	}{
		{[]float64{1, 1}, nil, []bool{true, false}},
		{[]float64{1}, [][]float64{row}, []bool{true}},
		{[]float64{1, 1}, [][]float64{row}, []bool{true}},
		{[]float64{1, -1}, [][]float64{row}, []bool{true, false}},
		{[]float64{1, 1}, [][]float64{{0, math.NaN()}}, []bool{true, false}},
		{[]float64{1, 1}, [][]float64{{0, math.Inf(1)}}, []bool{true, false}},
	} {
		if got, err := Decibans(tt.prior, tt.prefixes, tt.in); err == nil {
			t.Errorf("%+v gives %v and no error", tt, got)
		}
	}
}

// TestDecibansTelescope: the weights add up to the posterior minus the prior log odds.
func TestDecibansTelescope(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, k := rapid.IntRange(2, 8).Draw(t, "hypotheses"), rapid.IntRange(0, 12).Draw(t, "findings")
		prior, in := make([]float64, n), make([]bool, n)
		for h := range prior {
			prior[h] = rapid.Float64Range(0.001, 10).Draw(t, "weight")
			in[h] = h == 0 || (h > 1 && rapid.Bool().Draw(t, "in"))
		}
		prefixes := [][]float64{make([]float64, n)}
		for range k {
			row := make([]float64, n)
			for h := range row {
				row[h] = prefixes[len(prefixes)-1][h] + math.Log(rapid.Float64Range(1e-6, 1).Draw(t, "likelihood"))
			}
			prefixes = append(prefixes, row)
		}
		got, err := Decibans(prior, prefixes, in)
		if err != nil {
			t.Fatal(err)
		}
		sum := 0.0
		for _, w := range got {
			sum += w
		}
		want := 10 * (odds(t, prior, prefixes[k], in) - odds(t, prior, prefixes[0], in))
		if math.Abs(sum-want) > 1e-9 {
			t.Fatalf("weights add up to %v dB, log odds moved by %v dB", sum, want)
		}
	})
}

// odds gives log10 of the odds of the statement, the plain way.
func odds(t *rapid.T, prior, logs []float64, in []bool) float64 {
	post, err := Posterior(prior, logs)
	if err != nil {
		t.Fatal(err)
	}
	yes, no := 0.0, 0.0
	for h, p := range post {
		if in[h] {
			yes += p
		} else {
			no += p
		}
	}
	return math.Log10(yes) - math.Log10(no)
}

func TestPosterior(t *testing.T) {
	post, err := Posterior([]float64{1, 3, 0, 1}, []float64{-1000, -1000 + math.Log(2), 5, math.Inf(-1)})
	if err != nil {
		t.Fatal(err)
	}
	for h, want := range []float64{1. / 7, 6. / 7, 0, 0} {
		if !near(post[h], want) {
			t.Errorf("posterior of %d is %v, should be %v", h, post[h], want)
		}
	}
	if _, err := Posterior([]float64{1, 0}, []float64{math.Inf(-1), 0}); !errors.Is(err, ErrImpossible) {
		t.Errorf("nothing left gives %v", err)
	}
	for _, bad := range [][2][]float64{{{1}, {0, 0}}, {{-1}, {0}}, {{1}, {math.NaN()}}, {{1}, {math.Inf(1)}}} {
		if _, err := Posterior(bad[0], bad[1]); err == nil {
			t.Errorf("%v is accepted", bad)
		}
	}
}
