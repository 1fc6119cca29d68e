package diagnose

import (
	"bytes"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"testing"

	"gopkg.in/yaml.v3"

	"drivemend/diagnose/stress"
	"drivemend/knowledge"
	"drivemend/measure"
)

var update = flag.Bool("update", false, "write golden files")

const casesFolder = "../testdata/cases"

// label is one line of the map from a case's confirmed cause to the base, fixed before the first ranking.
type label struct {
	Case, File, Label, Confidence, Blown string
	Causes                               []string
}

// scored is one case with what each way of ranking made of it.
type scored struct {
	label
	votes   int
	outside bool           // the base has none of the true causes, or none applies to this board
	p       float64        // posterior of the true cause, any of several
	bits    float64        // log2 of posterior over prior
	none    float64        // P(unlisted)
	ranks   map[string]int // by way of ranking, 1 is first
	orders  map[string][]string
}

var ways = []string{"exact", "prior", "naive", "count"}

func loadLabels(t testing.TB) []label {
	t.Helper()
	raw, err := os.ReadFile(filepath.Join(casesFolder, "labels.yaml"))
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Labels []label }
	if err := yaml.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	return file.Labels
}

func scoreCase(t testing.TB, base *knowledge.Base, l label) scored {
	t.Helper()
	f, err := measure.Load(filepath.Join(casesFolder, l.File))
	if err != nil {
		t.Fatal(err)
	}
	c := WithoutCure(f.Case)
	spans, _, err := stress.Spans(c.Board)
	if err != nil {
		t.Fatal(err)
	}
	s, err := solve(base, c, spans, true)
	if err != nil {
		t.Fatal(err)
	}
	checkDecibans(t, s, l.Case)
	out := scored{label: l, votes: len(s.votes), none: s.unlistedChance(s.update.Posterior), ranks: map[string]int{}, orders: map[string][]string{}}
	truth := s.truth(l.Causes)
	prior := priors(s.hyps)
	out.p = s.mass(s.update.Posterior, truth)
	out.outside = s.mass(prior, truth) == 0
	if !out.outside {
		out.bits = math.Log2(out.p / s.mass(prior, truth))
	}
	for _, w := range ways {
		out.orders[w] = s.orderBy(w)
		out.ranks[w] = rankOf(out.orders[w], l.Causes)
	}
	return out
}

func (s *state) truth(causes []string) []bool {
	in := make([]bool, len(s.hyps))
	for i, h := range s.hyps {
		for _, c := range h.causes {
			in[i] = in[i] || slices.Contains(causes, s.causes[c].ID)
		}
	}
	return in
}

func (s *state) mass(p []float64, in []bool) float64 {
	sum := 0.0
	for i, yes := range in {
		if yes {
			sum += p[i]
		}
	}
	return sum
}

// orderBy ranks the causes: by the exact posterior; by the prior alone; by naive Bayes, each answer taken by itself
// given the cause; by the count of answers that the cause makes likelier than they are at large.
func (s *state) orderBy(way string) []string {
	scores := make([]float64, len(s.causes))
	for i, line := range s.causeLines(s.update.Posterior) {
		switch way {
		case "exact":
			scores[i] = line.Probability
		case "prior":
			scores[i] = s.shares[i]
		case "naive":
			scores[i] = math.Log(s.shares[i])
		}
	}
	for k := range s.ev {
		if way == "exact" || way == "prior" {
			break
		}
		u, err := s.model.Infer(s.ev[k : k+1])
		if err != nil {
			panic(err)
		}
		for i := range s.causes {
			gain := u.LogLikelihood[i] - s.atLarge(u.LogLikelihood)
			if way == "naive" {
				scores[i] += gain
			} else if gain > 0.01 {
				scores[i]++
			}
		}
	}
	at := make([]int, len(scores))
	for i := range at {
		at[i] = i
	}
	sort.SliceStable(at, func(a, b int) bool { return scores[at[a]] > scores[at[b]] })
	var ids []string
	for _, i := range at {
		ids = append(ids, s.causes[i].ID)
	}
	return ids
}

// atLarge is the log likelihood of an answer over all hypotheses by their prior weights.
func (s *state) atLarge(ll []float64) float64 {
	sum, total := 0.0, 0.0
	for i, h := range s.hyps {
		sum += h.weight * math.Exp(ll[i])
		total += h.weight
	}
	return math.Log(sum / total)
}

func rankOf(order, causes []string) int {
	for i, id := range order {
		if slices.Contains(causes, id) {
			return i + 1
		}
	}
	return 0
}

// checkDecibans proves on this case that the weights of the findings add up to posterior less prior log odds, for
// every cause that applies.
func checkDecibans(t testing.TB, s *state, name string) {
	t.Helper()
	for c, cause := range s.causes {
		in := make([]bool, len(s.hyps))
		for i, h := range s.hyps {
			in[i] = h.has(c)
		}
		weights, _, err := s.weights(cause.ID, in, s.sidesOf(in))
		if err != nil {
			t.Fatal(err)
		}
		sum := 0.0
		for _, w := range weights {
			sum += w
		}
		want := odds(s.update.Posterior, in) - odds(priors(s.hyps), in)
		if math.Abs(sum-want) > 1e-9*math.Max(1, math.Abs(want)) {
			t.Errorf("%s, %s: decibans add up to %.12g, the log odds moved by %.12g", name, cause.ID, sum, want)
		}
	}
}

// TestScores ranks all cited boards and compares with the golden table; the figures are reported as they fall.
func TestScores(t *testing.T) {
	base, err := knowledge.Load()
	if err != nil {
		t.Fatal(err)
	}
	var all []scored
	for _, l := range loadLabels(t) {
		all = append(all, scoreCase(t, base, l))
	}
	var b bytes.Buffer
	perCase(&b, all)
	for _, g := range []struct {
		name string
		in   func(scored) bool
	}{
		{"all", func(scored) bool { return true }},
		{"high and medium confidence", func(s scored) bool { return s.Confidence != "low" }},
		{"low confidence", func(s scored) bool { return s.Confidence == "low" }},
		{"blown power stage", func(s scored) bool { return s.Blown == "yes" }},
		{"the rest", func(s scored) bool { return s.Blown != "yes" }},
		{"with two or more answers that vote", func(s scored) bool { return s.votes >= 2 }},
	} {
		totals(&b, g.name, all, g.in)
	}
	permutations(&b, all)
	t.Log("\n" + b.String())
	golden(t, "../testdata/golden/scores.txt", b.Bytes())
}

func golden(t *testing.T, path string, got []byte) {
	t.Helper()
	if *update {
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatalf("%v; run the test with -update and read the new file", err)
	}
	if !bytes.Equal(got, want) {
		t.Errorf("%s differs; run with -update and read the difference. got:\n%s", path, got)
	}
}

func perCase(b *bytes.Buffer, all []scored) {
	fmt.Fprintf(b, "%-8s %-6s %-5s %5s %6s %5s %6s %8s  %s\n", "case", "conf.", "blown", "votes", "P true", "rank", "bits", "P unlst", "true cause")
	for _, s := range all {
		rank, p, bits := fmt.Sprint(s.ranks["exact"]), fmt.Sprintf("%.3f", s.p), fmt.Sprintf("%+.2f", s.bits)
		if s.outside {
			rank, p, bits = "-", "-", "-"
		}
		fmt.Fprintf(b, "%-8s %-6s %-5s %5d %6s %5s %6s %8.3f  %s%s\n", s.Case, s.Confidence, s.Blown, s.votes, p, rank, bits, s.none, join(s.Causes), map[bool]string{true: " (outside the base or not of this board)"}[s.outside])
	}
}

func join(ids []string) string {
	out := ""
	for i, id := range ids {
		if i > 0 {
			out += ", "
		}
		out += id
	}
	return out
}

func totals(b *bytes.Buffer, name string, all []scored, in func(scored) bool) {
	var group []scored
	bits, outside := 0.0, 0
	for _, s := range all {
		if in(s) {
			group = append(group, s)
			bits += s.bits
			if s.outside {
				outside++
			}
		}
	}
	if len(group) == 0 {
		return
	}
	fmt.Fprintf(b, "\n%s: %d boards, %d outside the base (counted as missed), mean %+.2f bits over the prior\n", name, len(group), outside, bits/float64(len(group)))
	for _, w := range ways {
		one, three := hits(group, w, 1), hits(group, w, 3)
		fmt.Fprintf(b, "  %-6s top 1 %s   top 3 %s\n", w, share(one, len(group)), share(three, len(group)))
	}
}

func hits(group []scored, way string, within int) int {
	n := 0
	for _, s := range group {
		if r := s.ranks[way]; r > 0 && r <= within {
			n++
		}
	}
	return n
}

// share prints k of n with the 95 % interval of Wilson (JASA 22, 1927).
func share(k, n int) string {
	const z = 1.959964
	p, m := float64(k)/float64(n), float64(n)
	mid := (p + z*z/2/m) / (1 + z*z/m)
	half := z / (1 + z*z/m) * math.Sqrt(p*(1-p)/m+z*z/4/m/m)
	return fmt.Sprintf("%2d of %2d, %3.0f %% (%.0f to %.0f)", k, n, 100*p, 100*math.Max(mid-half, 0), 100*math.Min(mid+half, 1))
}

// permutations is the control: the same rankings scored against the true causes of other boards.
func permutations(b *bytes.Buffer, all []scored) {
	const times = 2000
	random := rand.New(rand.NewPCG(1, 2))
	one, three, atLeast := 0, 0, 0
	found := hits(all, "exact", 3)
	for range times {
		order := random.Perm(len(all))
		threes := 0
		for i, s := range all {
			r := rankOf(s.orders["exact"], all[order[i]].Causes)
			if r == 1 {
				one++
			}
			if r > 0 && r <= 3 {
				threes++
			}
		}
		three += threes
		if threes >= found {
			atLeast++
		}
	}
	n := float64(times * len(all))
	fmt.Fprintf(b, "\npermutation control, %d shuffles of the true causes: top 1 %.1f %%, top 3 %.1f %%; %d shuffles did as well as the true map in the top 3 (p = %.3f)\n",
		times, 100*float64(one)/n, 100*float64(three)/n, atLeast, float64(atLeast+1)/float64(times+1))
}
