package diagnose_test

import (
	"math"
	"sort"
	"strings"
	"testing"

	"drivemend/diagnose/belief"
	"drivemend/knowledge"
)

// TestShares holds the split of every mechanism against its share in the tables.
func TestShares(t *testing.T) {
	a := takeAlone(t)
	left := map[string]bool{}
	for _, c := range a.base.Causes {
		left[c.ID] = true
	}
	for _, m := range mechanisms(t) {
		for _, setting := range []string{"dc", "mains", "repeat"} {
			sum := 0.0
			for _, id := range m.causes {
				if id == "unlisted" {
					sum += a.base.Unlisted[setting].Mid
					continue
				}
				c, ok := a.causeAt[id]
				if !ok {
					t.Fatalf("%s names the cause %q, which the base does not have", sharesFile, id)
				}
				sum += a.base.Causes[c].Share[setting].Mid
			}
			if math.Abs(sum-m.shares[setting]) > 0.01 {
				t.Errorf("%s, %s: the causes add up to %.3f; the tables give %g", m.key, setting, sum, m.shares[setting])
			}
		}
		for _, id := range m.causes {
			delete(left, id)
		}
	}
	for _, c := range a.base.Causes {
		if left[c.ID] {
			t.Errorf("the cause %s belongs to no mechanism of %s", c.ID, sharesFile)
		}
	}
}

// shareOf gives the share of a cause for a mains supply, or for dc where it has none.
func shareOf(c knowledge.Cause) float64 {
	if c.Share["mains"].Mid > 0 {
		return c.Share["mains"].Mid
	}
	return c.Share["dc"].Mid
}

// TestDefaults checks that a mechanism without a row of its own shows an observation about as often as the tables
// say: the chance that a test of it comes out that way, as a mean over those mechanisms, within a factor of two.
func TestDefaults(t *testing.T) {
	a, all := takeAlone(t), mechanisms(t)
	own := map[string]bool{}
	for _, r := range readTable(t, bandsFile) {
		own[r[0]+" "+r[1]] = true
	}
	checked := 0
	for _, r := range readTable(t, defaultsFile) {
		if strings.HasPrefix(r[3], "none:") || r[0] == "s_cross_current" {
			continue // an open gate or a stuck driver does put both switches on, though the tables list no row
		}
		chances, sum, weight := a.chances(t, r[3]), 0.0, 0.0
		for _, m := range all {
			for _, id := range m.causes {
				if c, ok := a.causeAt[id]; ok && !own[m.key+" "+r[0]] {
					share := shareOf(a.base.Causes[c])
					sum += share * a.seen(r[3], chances[c])
					weight += share
				}
			}
		}
		checked++
		if mean, want := sum/weight, number(t, r[1]); mean < want/2 || mean > want*2 {
			t.Errorf("%s: %.3f in the mean over mechanisms without a row; the tables give %g", r[0], mean, want)
		}
	}
	if checked < 60 {
		t.Errorf("only %d defaults checked", checked)
	}
}

// seen is the chance that the most telling test of an event shows its first result, false alarms included; other
// observations are taken as they are.
func (a *alone) seen(seenAs string, chance float64) float64 {
	if strings.Contains(seenAs, " ") {
		return chance
	}
	p := chance
	for _, x := range a.base.Tests {
		if x.Observes != seenAs || x.Computed != "" {
			continue
		}
		r := telling(x)
		return chance*x.Present[r].Mid + (1-chance)*x.Absent[r].Mid
	}
	return p
}

// telling is the result that speaks most for the event.
func telling(x knowledge.Test) string {
	best, ratio := "", 0.0
	for _, r := range x.Results {
		if q := x.Present[r.ID].Mid / (x.Absent[r.ID].Mid + 1e-9); q > ratio {
			best, ratio = r.ID, q
		}
	}
	return best
}

// directProof are tests on the suspect part itself, which may speak 50 to 1; any other at most 20 to 1.
const directProof = "die-look gate-wiring-look freewheel-path-check supply-wiring-check terminal-check bus-short-check " +
	"bus-capacitor-lead-check brake-switch-check phase-wire-continuity command-wire-check interlock-check " +
	"sink-insulation gate-rail-height command-overlap control-rail-height foreign-metal-look crushed-part-look bearing-look"

// TestNoSingleTestDecides holds the cap of the tables on what one answer may say for or against a cause.
func TestNoSingleTestDecides(t *testing.T) {
	a := takeAlone(t)
	for _, x := range a.base.Tests {
		most := 20.0
		if containsWord(directProof, x.ID) {
			most = 50
		}
		for _, r := range x.Results {
			chances := a.answerChances(t, x, r.ID)
			for c, p := range chances {
				rest := a.rest(chances, c)
				if q := p / rest; q > most || q < 1/most {
					t.Errorf("%s = %s speaks %.1f to 1 for %s; at most %g to 1 either way", x.ID, r.ID, q, a.base.Causes[c].ID, most)
				}
			}
		}
	}
}

// answerChances gives P(result | cause) of a test with the answering error of its instrument.
func (a *alone) answerChances(t *testing.T, x knowledge.Test, result string) []float64 {
	t.Helper()
	wrong := map[string]float64{"meter": 0.02, "scope": 0.02, "camera": 0.02, "insulation-tester": 0.02, "supply": 0.02, "eye": 0.05, "question": 0.05}[x.Instrument]
	out := make([]float64, len(a.base.Causes))
	sum, weight := 0.0, 0.0
	for c, cause := range a.base.Causes {
		if x.Observes != "" {
			p := a.present[c][a.eventAt[x.Observes]]
			out[c] = p*x.Present[result].Mid + (1-p)*x.Absent[result].Mid
		} else {
			out[c] = a.nominal(t, x.ID, result, cause.Answers[x.ID])
		}
		sum += shareOf(cause) * out[c]
		weight += shareOf(cause)
	}
	for c := range out {
		out[c] = (1-wrong)*out[c] + wrong*sum/weight
	}
	return out
}

// rest is the mean chance over all other causes by their shares.
func (a *alone) rest(chances []float64, but int) float64 {
	sum, weight := 0.0, 0.0
	for c, cause := range a.base.Causes {
		if c != but {
			sum += shareOf(cause) * chances[c]
			weight += shareOf(cause)
		}
	}
	return sum / weight
}

// TestNetworkIsSparse keeps exact inference fast.
func TestNetworkIsSparse(t *testing.T) {
	a := takeAlone(t)
	parents := map[string]int{}
	for _, e := range a.base.Events {
		for _, l := range e.LeadsTo {
			parents[l.To]++
		}
	}
	for _, e := range a.base.Events {
		if parents[e.ID] > 8 {
			t.Errorf("%s has %d events as parents; at most 8", e.ID, parents[e.ID])
		}
	}
}

// TestRankingOfTables repeats the check of the tables: these findings, taken as certain, put this mechanism first.
func TestRankingOfTables(t *testing.T) {
	a := takeAlone(t)
	for _, c := range []struct{ setting, seen, not, first string }{
		{"dc", "ce_short one_of_parallel t_turn_off snub_missing", "", "spike_no_clamp avalanche_energy"},
		{"repeat", "ce_short one_of_parallel s_share_bad", "s_overshoot", "imbalance_parallel"},
		{"mains", "both_of_leg fuse_violent s_miller_bump", "", "shoot_through_dvdt"},
		{"mains", "ce_short t_decel cap_vent", "", "bus_ov_regen"},
		{"mains", "ce_short t_decel s_bus_rise_decel brake_r_open", "brake_tr_short", "bus_ov_regen"},
		{"dc", "ce_short t_hot_long one_of_parallel tim_bad s_case_sink_drop", "", "cooling_fault"},
		{"dc", "ce_short t_stall die_bond_melt", "s_overshoot", "load_short_stall"},
		{"dc", "ce_short s_vge_low supply_below_uvlo", "boot_parts_bad", "gate_uv"},
		{"mains", "cap_esr_high s_bus_ripple", "", "bus_cap_aged"},
		{"dc", "gate_only", "", "gate_ov_esd"},
	} {
		ranked := a.rank(t, c.setting, strings.Fields(c.seen), strings.Fields(c.not))
		if !containsWord(c.first, ranked[0].key) {
			t.Errorf("%s: %s without %q puts %v first; expected %s", c.setting, c.seen, c.not, ranked[:3], c.first)
		}
	}
}

// ranked is a mechanism with its chance after the findings.
type ranked struct {
	key string
	p   float64
}

func (a *alone) rank(t *testing.T, setting string, seen, not []string) []ranked {
	t.Helper()
	seenAs := map[string]string{}
	for _, r := range readTable(t, defaultsFile) {
		seenAs[r[0]] = r[3]
	}
	var findings []belief.Evidence
	weights := make([]float64, len(a.base.Causes))
	for c, cause := range a.base.Causes {
		weights[c] = cause.Share[setting].Mid
	}
	add := func(obs string, yes, no float64) {
		if strings.Contains(seenAs[obs], " = ") {
			for c, p := range a.chances(t, seenAs[obs]) {
				weights[c] *= yes*p + no*(1-p)
			}
			return
		}
		if with, without, ok := strings.Cut(seenAs[obs], " without "); ok {
			findings = append(findings, belief.Evidence{Event: a.event(t, with), Absent: []float64{no}, Present: []float64{yes}},
				belief.Evidence{Event: a.event(t, without), Absent: []float64{yes}, Present: []float64{no}})
			return
		}
		findings = append(findings, belief.Evidence{Event: a.event(t, seenAs[obs]), Absent: []float64{no}, Present: []float64{yes}})
	}
	for _, o := range seen {
		add(o, 1, 0)
	}
	for _, o := range not {
		add(o, 0, 1)
	}
	u, err := a.model.Infer(findings)
	if err != nil {
		t.Fatal(err)
	}
	var out []ranked
	total := 0.0
	for _, m := range mechanisms(t) {
		p := 0.0
		for _, id := range m.causes {
			if c, ok := a.causeAt[id]; ok {
				p += weights[c] * math.Exp(u.LogLikelihood[c])
			}
		}
		total += p
		out = append(out, ranked{m.key, p})
	}
	for i := range out {
		out[i].p /= total
	}
	sort.Slice(out, func(i, j int) bool { return out[i].p > out[j].p || out[i].p == out[j].p && out[i].key < out[j].key })
	return out
}
