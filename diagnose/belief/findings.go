package belief

import "math"

// LeaveOut gives for each finding k ln P(all evidence but k | h) for every hypothesis ([k][h]), minus infinity where
// the rest is impossible. One pass backwards serves all: at the event of k the likelihoods of the other findings are
// multiplied anew, never divided out. Errors: malformed evidence.
func (m *Model) LeaveOut(ev []Evidence) ([][]float64, error) {
	if err := m.checkEvidence(ev); err != nil {
		return nil, err
	}
	like := m.gather(ev)
	q := request{likelihoods: like, scaled: true}
	var seen []int
	for e, l := range like {
		if l != nil {
			seen = append(seen, e)
		}
	}
	l := leaver{m: m, ev: ev, at: m.findingsAt(ev), run: m.eliminate(q).backwards(q, seen)}
	defer l.run.release()
	l.sums()
	out := make([][]float64, len(ev))
	for k, f := range ev {
		out[k] = make([]float64, len(m.hyps))
		if f.Event < 0 {
			l.withoutDirect(k, out[k])
			continue
		}
		l.withoutFinding(k, out[k])
	}
	return out, nil
}

// leaver holds what the answers of LeaveOut share.
type leaver struct {
	m      *Model
	ev     []Evidence
	at     [][]Evidence
	run    *run
	direct []float64   // findings at no event
	onEv   []float64   // findings at events
	beside [][]float64 // by root: everything but that root; filled on demand
}

func (l *leaver) sums() {
	l.direct = l.m.direct(l.ev)
	l.onEv = make([]float64, len(l.m.hyps))
	l.run.addTo(l.onEv, -1)
	l.m.addFree(l.onEv, l.ev)
	l.beside = make([][]float64, len(l.run.roots))
}

func (l *leaver) withoutDirect(k int, out []float64) {
	copy(out, l.onEv)
	for j, f := range l.ev {
		if j == k || f.Event >= 0 {
			continue
		}
		for h := range out {
			out[h] += math.Log(f.value(f.Present, h))
		}
	}
}

func (l *leaver) withoutFinding(k int, out []float64) {
	e := l.ev[k].Event
	others := l.othersAt(k)
	adj := l.run.lambda[e].adj
	if l.beside[adj.root] == nil {
		l.beside[adj.root] = append([]float64(nil), l.direct...)
		l.run.addTo(l.beside[adj.root], adj.root)
	}
	copy(out, l.beside[adj.root])
	like := l.m.likelihoodOf(others)
	met := l.m.meets.meet(like.part, adj.part)
	logs := make([]float64, met.p.n)
	for c := range logs {
		logs[c] = l.sum(like, adj, classAt(met.left, like.part.n, c), classAt(met.right, adj.part.n, c))
	}
	for lane, h := range l.m.lanes {
		out[h] += logs[met.p.at(lane)]
	}
	l.free(e, others, out)
}

// sum gives ln Σ over both states of the event of likelihood times derivative.
func (l *leaver) sum(like *likelihood, adj *table, cl, ca int) float64 {
	exp := int32(0)
	if adj.exp != nil {
		exp = adj.exp[ca]
	}
	absent := l.run.logAt(adj.val[ca], exp) + like.absent[cl].log()
	present := l.run.logAt(adj.val[adj.part.n+ca], exp) + like.present[cl].log()
	return logAdd(absent, present)
}

func classAt(way []int32, n, c int) int {
	switch {
	case n == 1:
		return 0
	case way == nil:
		return c
	default:
		return int(way[c])
	}
}

// othersAt lists the other findings at the event of finding k.
func (l *leaver) othersAt(k int) []Evidence {
	var others []Evidence
	for j, f := range l.ev {
		if j != k && f.Event == l.ev[k].Event {
			others = append(others, f)
		}
	}
	return others
}

// free overwrites the Free hypotheses: their events are independent, so only event e changes.
func (l *leaver) free(e int, others []Evidence, out []float64) {
	for h, hy := range l.m.hyps {
		if !hy.Free {
			continue
		}
		out[h] = l.direct[h]
		for x, findings := range l.at {
			if x == e {
				findings = others
			}
			if len(findings) > 0 {
				absent, present := l.m.freeSides(x, h, findings)
				out[h] += logAdd(absent.log(), present.log())
			}
		}
	}
}
