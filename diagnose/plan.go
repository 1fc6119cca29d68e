package diagnose

// comeback is the price in minutes of a board that fails again because a cause was left in. Judgement; a shop may
// set its own.
const comeback = 300.0

const exhaustive = 12 // undecided repairs up to which every choice is tried

// planner finds the repairs worth doing at a given state of belief.
type planner struct {
	minutes []float64 // of each repair that removes a cause of this board
	ids     []string
	fix     []int // repair of each cause
	hyps    []hypothesis
	needs   [][2]int    // the repairs that remove each hypothesis, both the same for one; -1: nothing does
	single  []float64   // scratch: gain of a repair alone
	both    [][]float64 // scratch: further gain when two repairs are done together
	in, out []bool      // scratch: repairs decided on
}

func newPlanner(v *view) *planner {
	p := &planner{hyps: v.hyps}
	at := map[string]int{}
	for _, c := range v.causes {
		k, ok := at[c.Repair]
		if !ok {
			k = len(p.ids)
			at[c.Repair] = k
			p.ids = append(p.ids, c.Repair)
			minutes := 0.0
			if r := v.base.Repair(c.Repair); r != nil {
				minutes = r.Minutes
			}
			p.minutes = append(p.minutes, minutes)
		}
		p.fix = append(p.fix, k)
	}
	return p.ready()
}

// ready makes the scratch memory and looks up what removes each hypothesis.
func (p *planner) ready() *planner {
	n := len(p.ids)
	p.single, p.in, p.out = make([]float64, n), make([]bool, n), make([]bool, n)
	cells := make([]float64, n*n)
	for i := range n {
		p.both = append(p.both, cells[i*n:(i+1)*n])
	}
	for _, h := range p.hyps {
		switch len(h.causes) {
		case 0:
			p.needs = append(p.needs, [2]int{-1, -1})
		case 1:
			p.needs = append(p.needs, [2]int{p.fix[h.causes[0]], p.fix[h.causes[0]]})
		default:
			p.needs = append(p.needs, [2]int{p.fix[h.causes[0]], p.fix[h.causes[1]]})
		}
	}
	return p
}

// cost is the least expected price V over all sets of repairs: the minutes of the repairs done plus the price of a
// comeback for every cause left in. The beliefs must sum to one. A hypothesis is removed only if all of its causes are.
func (p *planner) cost(post []float64) (price float64, chosen []bool) {
	chosen, gain := p.best(post, 1)
	return comeback - gain, chosen
}

// expected is total·V for beliefs that sum to total.
func (p *planner) expected(post []float64, total float64) float64 {
	_, gain := p.best(post, total)
	return float64(comeback*total) - gain
}

// best gives the repairs that save most against doing none; it is overwritten by the next call.
func (p *planner) best(post []float64, total float64) (chosen []bool, gain float64) {
	p.gains(post, total)
	in, out := p.settle()
	return p.choose(in, out)
}

// gains fills the gain of each repair alone and of each two together, all on the scale of the beliefs.
func (p *planner) gains(post []float64, total float64) {
	for i := range p.single {
		p.single[i] = -float64(p.minutes[i] * total)
		clear(p.both[i])
	}
	for h, need := range p.needs {
		a, b := need[0], need[1]
		switch {
		case a < 0:
		case a == b:
			p.single[a] += float64(comeback * post[h])
		case a < b:
			p.both[a][b] += float64(comeback * post[h])
		default:
			p.both[b][a] += float64(comeback * post[h])
		}
	}
	for i := range p.both {
		for j := range i {
			p.both[i][j] = p.both[j][i]
		}
	}
}

// settle decides the repairs that belong to every best choice and those that belong to none. The gain of a repair
// only grows with the others done, so a repair that pays already is in, and one that would not pay with all others
// done is out.
func (p *planner) settle() (in, out []bool) {
	n := len(p.single)
	in, out = p.in, p.out
	clear(in)
	clear(out)
	for changed := true; changed; {
		changed = false
		for i := 0; i < n; i++ {
			if in[i] || out[i] {
				continue
			}
			sure, hope := p.single[i], p.single[i]
			for j := 0; j < n; j++ {
				if in[j] {
					sure += p.both[i][j]
				}
				if !out[j] {
					hope += p.both[i][j]
				}
			}
			if sure > 0 {
				in[i], changed = true, true
			} else if hope <= 0 {
				out[i], changed = true, true
			}
		}
	}
	return in, out
}

// choose tries every choice of the undecided repairs; beyond a dozen the rest is left undone.
func (p *planner) choose(in, out []bool) ([]bool, float64) {
	var open []int
	for i := range in {
		if !in[i] && !out[i] && len(open) < exhaustive {
			open = append(open, i)
		}
	}
	best, bestGain := in, p.gain(in)
	for mask := 1; mask < 1<<len(open); mask++ {
		trial := append([]bool(nil), in...)
		for k, i := range open {
			trial[i] = mask&(1<<k) != 0
		}
		if g := p.gain(trial); g > bestGain {
			best, bestGain = trial, g
		}
	}
	return best, bestGain
}

func (p *planner) gain(chosen []bool) float64 {
	g := 0.0
	for i := range chosen {
		if !chosen[i] {
			continue
		}
		g += p.single[i]
		for j := i + 1; j < len(chosen); j++ {
			if chosen[j] {
				g += p.both[i][j]
			}
		}
	}
	return g
}
