package belief

import "math"

// Solution is what a body of evidence says of the hypotheses and, when asked, of the events. It is not safe for use by
// several goroutines at once.
type Solution struct {
	*Update
	m    *Model
	at   [][]Evidence // the findings by event
	like []*likelihood
	run  *run
}

// Solve sums every event out exactly and keeps what it needs to answer for the events too. Errors as of Infer.
func (m *Model) Solve(ev []Evidence) (*Solution, error) {
	if err := m.checkEvidence(ev); err != nil {
		return nil, err
	}
	s := &Solution{m: m, at: m.findingsAt(ev), like: m.gather(ev)}
	s.run = m.eliminate(s.request())
	logs := m.direct(ev)
	s.run.addTo(logs, -1)
	m.addFree(logs, ev)
	var err error
	if s.Update, err = m.update(logs); err != nil {
		s.Release()
		return nil, err
	}
	return s, nil
}

func (s *Solution) request() request {
	return request{likelihoods: s.like, wanted: s.m.everyEvent()}
}

// Release gives memory back for other solutions; nothing can be asked of this one afterwards but its Update.
func (s *Solution) Release() { s.run.release() }

// Present gives P(event present | evidence, h) for some events and every hypothesis ([event as listed][h]), 0 under a
// hypothesis that the evidence rules out.
func (s *Solution) Present(events []int) [][]float64 {
	s.run = s.run.backwards(s.request(), events)
	all, n := make([]float64, len(events)*len(s.m.hyps)), len(s.m.hyps)
	out := make([][]float64, len(events))
	for k, e := range events {
		out[k] = all[k*n : k*n+n : k*n+n]
		for lane, p := range s.run.marginal(e) {
			out[k][s.m.lanes[lane]] = p
		}
		s.free(e, out[k])
	}
	return out
}

// free fills in the Free hypotheses, and 0 where the evidence is impossible.
func (s *Solution) free(e int, out []float64) {
	for h, hy := range s.m.hyps {
		if hy.Free {
			absent, present := s.m.freeSides(e, h, s.at[e])
			out[h] = share(absent.log(), present.log())
		}
		if math.IsInf(s.LogLikelihood[h], -1) {
			out[h] = 0
		}
	}
}

// Masses gives Σ weight·P(event present | evidence, h) over the hypotheses, for every event, and the same of absent,
// for each list of weights. A list takes one pass backwards, whatever the number of hypotheses. Weights are finite
// and not negative, one a hypothesis, and 0 under a hypothesis that the evidence rules out.
func (s *Solution) Masses(weights ...[]float64) (present, absent [][]float64) {
	lanes := make([][]float64, len(weights))
	for k, w := range weights {
		lanes[k] = make([]float64, len(s.m.lanes))
		for lane, h := range s.m.lanes {
			lanes[k][lane] = w[h]
		}
	}
	present, absent, ok := s.run.masses(lanes...)
	if !ok {
		s.run.release()
		s.run = s.m.newRun(true)
		s.run.forward(s.request())
		present, absent, _ = s.run.masses(lanes...)
	}
	for k, w := range weights {
		s.addFreeMasses(w, present[k], absent[k])
	}
	return present, absent
}

func (s *Solution) addFreeMasses(weights, present, absent []float64) {
	for h, hy := range s.m.hyps {
		if !hy.Free || weights[h] == 0 {
			continue
		}
		for e, findings := range s.at {
			no, yes := s.m.freeSides(e, h, findings)
			present[e] += float64(weights[h] * share(no.log(), yes.log()))
			absent[e] += float64(weights[h] * share(yes.log(), no.log()))
		}
	}
}

// Joint gives P(event present | evidence, h) for every hypothesis and event ([h][event]), beside the update. Under a
// hypothesis that the evidence rules out the row is 0. Errors as of Infer.
func (m *Model) Joint(ev []Evidence) (*Update, [][]float64, error) {
	s, err := m.Solve(ev)
	if err != nil {
		return nil, nil, err
	}
	defer s.Release()
	events := make([]int, len(m.events))
	for e := range events {
		events[e] = e
	}
	joint := make([][]float64, len(m.hyps))
	for h := range joint {
		joint[h] = make([]float64, len(m.events))
	}
	for e, column := range s.Present(events) {
		for h, p := range column {
			joint[h][e] = p
		}
	}
	return s.Update, joint, nil
}
