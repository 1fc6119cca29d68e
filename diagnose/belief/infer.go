package belief

import (
	"math"
)

// BaseRates gives P(event) over the hypotheses that are not Free, by their weights, before any evidence.
func (m *Model) BaseRates() []float64 {
	return append([]float64(nil), m.baseRates()...)
}

func (m *Model) baseRates() []float64 {
	m.baseRun.Do(func() {
		total := 0.0
		for _, h := range m.lanes {
			total += m.hyps[h].Weight
		}
		weights := make([]float64, len(m.lanes))
		for lane, h := range m.lanes {
			weights[lane] = m.hyps[h].Weight / total
		}
		r := m.eliminate(request{likelihoods: make([]*likelihood, len(m.events)), wanted: m.everyEvent()})
		present, _, _ := r.masses(weights) // plain numbers suffice: without evidence every root is 1
		m.base = present[0]
		r.release()
	})
	return m.base
}

func (m *Model) everyEvent() []bool {
	all := make([]bool, len(m.events))
	for e := range all {
		all[e] = true
	}
	return all
}

// Infer sums every event out exactly. Errors: malformed evidence, and ErrImpossible.
func (m *Model) Infer(ev []Evidence) (*Update, error) {
	if err := m.checkEvidence(ev); err != nil {
		return nil, err
	}
	return m.update(m.logLikelihoods(ev))
}

// logLikelihoods gives ln P(evidence | h) for evidence known to be well formed.
func (m *Model) logLikelihoods(ev []Evidence) []float64 {
	like := m.gather(ev)
	r := m.eliminate(request{likelihoods: like})
	out := m.direct(ev)
	r.addTo(out, -1)
	r.release()
	m.addFree(out, ev)
	return out
}

func (m *Model) update(logs []float64) (*Update, error) {
	weights := make([]float64, len(m.hyps))
	for h, hy := range m.hyps {
		weights[h] = hy.Weight
	}
	post, err := Posterior(weights, logs)
	if err != nil {
		return nil, err
	}
	return &Update{LogLikelihood: logs, Posterior: post}, nil
}

// direct is the part of ln P(evidence | h) that rests on no event. Products are taken as far as they go, since a
// logarithm costs more than all of them.
func (m *Model) direct(ev []Evidence) []float64 {
	out, product := make([]float64, len(m.hyps)), make([]float64, len(m.hyps))
	for h := range product {
		product[h] = 1
	}
	for _, f := range ev {
		if f.Event >= 0 {
			continue
		}
		for h := range product {
			v := f.value(f.Present, h)
			if v < 1e-100 || v > 1e100 || product[h] < 1e-150 || product[h] > 1e150 {
				out[h] += math.Log(product[h])
				product[h] = 1
			}
			product[h] *= v
		}
	}
	for h := range out {
		out[h] += math.Log(product[h])
	}
	return out
}

// addTo adds what the run found to ln P(evidence | h), all but root skip (−1: all).
func (r *run) addTo(out []float64, skip int) {
	for k, t := range r.roots {
		if k == skip {
			continue
		}
		logs := r.logsOf(t)
		for lane, h := range r.m.lanes {
			out[h] += logs[t.part.at(lane)]
		}
	}
}

// logsOf gives the logarithms of a table without variables.
func (r *run) logsOf(t *table) []float64 { return r.writeLogs(make([]float64, t.part.n), t) }

func (r *run) writeLogs(logs []float64, t *table) []float64 {
	for c := range logs {
		exp := int32(0)
		if t.exp != nil {
			exp = t.exp[c]
		}
		logs[c] = r.logAt(t.val[c], exp)
	}
	return logs
}

// logAt gives the logarithm of a value of a table.
func (r *run) logAt(val float64, exp int32) float64 {
	if r.logs {
		return val
	}
	return logOf(val, exp)
}

// addFree adds the findings at events for the Free hypotheses: every event stands alone at its base rate.
func (m *Model) addFree(out []float64, ev []Evidence) {
	for h, hy := range m.hyps {
		if !hy.Free {
			continue
		}
		for e, findings := range m.findingsAt(ev) {
			if len(findings) > 0 {
				absent, present := m.freeSides(e, h, findings)
				out[h] += logAdd(absent.log(), present.log())
			}
		}
	}
}

func (m *Model) findingsAt(ev []Evidence) [][]Evidence {
	byEvent := make([][]Evidence, len(m.events))
	for _, f := range ev {
		if f.Event >= 0 {
			byEvent[f.Event] = append(byEvent[f.Event], f)
		}
	}
	return byEvent
}

// freeSides gives P(event absent, findings) and P(event present, findings) under a Free hypothesis.
func (m *Model) freeSides(e, h int, findings []Evidence) (absent, present scaled) {
	base := m.baseRates()[e]
	absent, present = scaledOne.times(1-base), scaledOne.times(base)
	for _, f := range findings {
		absent, present = absent.times(f.value(f.Absent, h)), present.times(f.value(f.Present, h))
	}
	return absent, present
}

// share gives eʸ/(eˣ+eʸ), 0 if both are 0.
func share(x, y float64) float64 {
	if math.IsInf(y, -1) {
		return 0
	}
	return 1 / (1 + math.Exp(x-y))
}

// marginal gives P(event present | evidence) by lane, 0 where the evidence is impossible.
func (r *run) marginal(e int) []float64 {
	l := r.lambda[e]
	met := r.m.meets.meet(l.part, l.adj.part)
	n := met.p.n
	sides := r.blank([]int{0}, met.p)
	r.products(sides, []term{{0, 0, 0}, {1, 1, 1}}, forwards, l, l.adj, met)
	for c := 0; c < n; c++ {
		sides.val[c] = r.shareOf(sides.val[c], sides.val[n+c])
	}
	present := make([]float64, len(r.m.lanes))
	for lane := range present {
		present[lane] = sides.val[met.p.at(lane)]
	}
	return present
}

func (r *run) shareOf(absent, present float64) float64 {
	switch {
	case r.logs:
		return share(absent, present)
	case present == 0:
		return 0
	default:
		return present / (absent + present)
	}
}
