package belief

import (
	"math"
	"sync"
)

// Prefixes gives ln P(first k findings | h) for k = 0 … n ([k][h]), minus infinity where they are impossible. The
// elimination is set up once for many findings; each one then renews only what depends on its event. The findings are
// dealt to two such runs, which go side by side. Errors: malformed evidence.
func (m *Model) Prefixes(ev []Evidence) ([][]float64, error) {
	if err := m.checkEvidence(ev); err != nil {
		return nil, err
	}
	like, n := m.gather(ev), len(m.hyps)
	all, out := make([]float64, (len(ev)+1)*n), make([][]float64, len(ev)+1)
	for k := range out {
		out[k] = all[k*n : k*n+n : k*n+n]
	}
	half := m.halfOf(ev)
	var wait sync.WaitGroup
	wait.Go(func() { m.prefixes(ev, like, half, out[half+1:]) })
	m.prefixes(ev[:half], like, 0, out[1:half+1])
	wait.Wait()
	return out, nil
}

// halfOf gives how many findings hold half of those at events.
func (m *Model) halfOf(ev []Evidence) int {
	atEvents, seen := 0, 0
	for _, f := range ev {
		if f.Event >= 0 {
			atEvents++
		}
	}
	for k, f := range ev {
		if f.Event >= 0 {
			seen++
		}
		if 2*seen >= atEvents {
			return k
		}
	}
	return 0
}

// prefixes fills in out for the findings from one on, given the likelihoods of all by event.
func (m *Model) prefixes(ev []Evidence, like []*likelihood, from int, out [][]float64) {
	for _, logs := range []bool{false, true} {
		p := m.newPrefixer(ev[:from], like, logs)
		for k := from; k < len(ev) && !p.run.squeezed; k++ {
			p.see(&ev[k])
			p.write(out[k-from])
		}
		p.run.release()
		if !p.run.squeezed { // a run on logarithms never is
			return
		}
	}
}

// prefixer takes in one finding after the other.
type prefixer struct {
	m      *Model
	run    *run
	like   []*likelihood // by event: what was found so far, in the classes of all findings
	reps   [][]int       // by event: a lane of each class
	direct []float64     // ln of the findings at no event
	logs   [][]float64   // by root
	active int           // the root that changed last
	rest   []float64     // by lane: all roots but the active one
	free   []freeSide
}

// freeSide is what a Free hypothesis makes of the findings, by event.
type freeSide struct {
	h               int
	absent, present []scaled
}

func (m *Model) newPrefixer(seen []Evidence, like []*likelihood, logs bool) *prefixer {
	p := &prefixer{m: m, like: make([]*likelihood, len(like)), reps: make([][]int, len(like)),
		direct: make([]float64, len(m.hyps)), rest: make([]float64, len(m.lanes))}
	for e, l := range like {
		if l != nil {
			p.like[e], p.reps[e] = newLikelihood(l.part), representatives(l.part, len(m.lanes))
		}
	}
	p.addFree()
	for k := range seen {
		p.multiply(&seen[k])
	}
	p.run = m.newRun(logs)
	p.run.forward(request{likelihoods: p.like})
	for _, t := range p.run.roots {
		p.logs = append(p.logs, p.run.logsOf(t))
	}
	p.activate(0)
	return p
}

func (p *prefixer) addFree() {
	base := p.m.baseRates()
	for h, hy := range p.m.hyps {
		if !hy.Free {
			continue
		}
		f := freeSide{h, make([]scaled, len(base)), make([]scaled, len(base))}
		for e, b := range base {
			f.absent[e], f.present[e] = scaledOne.times(1-b), scaledOne.times(b)
		}
		p.free = append(p.free, f)
	}
}

// multiply takes a finding into the likelihoods.
func (p *prefixer) multiply(f *Evidence) {
	if f.Event < 0 {
		p.addDirect(f)
		return
	}
	p.m.multiply(p.like[f.Event], f, p.reps[f.Event])
	for _, x := range p.free {
		x.absent[f.Event] = x.absent[f.Event].times(f.value(f.Absent, x.h))
		x.present[f.Event] = x.present[f.Event].times(f.value(f.Present, x.h))
	}
}

func (p *prefixer) addDirect(f *Evidence) {
	logs := make([]float64, len(f.Present))
	for c, v := range f.Present {
		logs[c] = math.Log(v)
	}
	for h := range p.direct {
		p.direct[h] += f.value(logs, h)
	}
}

// see takes a finding in and renews what depends on it.
func (p *prefixer) see(f *Evidence) {
	p.multiply(f)
	if f.Event < 0 {
		return
	}
	p.run.setLikelihood(p.run.lambda[f.Event], p.like[f.Event])
	p.run.redo(p.run.lambda[f.Event])
	for k, t := range p.run.roots {
		if !t.dirty {
			continue
		}
		p.run.writeLogs(p.logs[k], t)
		if k != p.active {
			p.activate(k)
		}
	}
}

// activate adds up all roots but one, which is about to change.
func (p *prefixer) activate(root int) {
	p.active = root
	clear(p.rest)
	for k, t := range p.run.roots {
		if k == root {
			continue
		}
		logs := p.logs[k]
		if t.part.of == nil {
			for lane := range p.rest {
				p.rest[lane] += logs[0]
			}
			continue
		}
		for lane, c := range t.part.of {
			p.rest[lane] += logs[c]
		}
	}
}

// write gives ln P(findings so far | h).
func (p *prefixer) write(out []float64) {
	copy(out, p.direct)
	for lane, h := range p.m.lanes {
		sum := p.rest[lane]
		if len(p.logs) > 0 {
			sum += p.logs[p.active][p.run.roots[p.active].part.at(lane)]
		}
		out[h] += sum
	}
	for _, x := range p.free {
		for e, l := range p.like {
			if l != nil {
				out[x.h] += logAdd(x.absent[e].log(), x.present[e].log())
			}
		}
	}
}
