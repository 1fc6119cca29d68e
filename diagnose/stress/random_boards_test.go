package stress

import (
	"cmp"
	"fmt"
	"math"
	"os"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"drivemend/measure"
)

// walked is what a random board's edges came to.
type walked struct {
	drawnBoard
	edges, refused, cut, steps int    // cut short: not solved to the end within the steps that the board was given
	most                       int    // steps of the longest edge
	slowest                    string // which that is
	reasons, faults            []string
}

// fault notes something that no board may do.
func (w *walked) fault(format string, args ...any) {
	w.faults = append(w.faults, fmt.Sprintf(format, args...))
}

const (
	placesWalked = 2  // unlike places of a board whose edges are solved
	fullEvery    = 32 // boards, of which one is solved with energies and waveforms too
	patientEvery = 64 // boards, of which one may take as many steps as a margin's
)

// walk solves every edge of a board that a margin may ask for, at nominal and highest; a panic becomes a fault.
func walk(d drawnBoard) (w walked) {
	w.drawnBoard = d
	defer func() {
		if r := recover(); r != nil {
			w.fault("panic: %v", r)
		}
	}()
	problems, needs := prepareAll(d.board)
	if len(problems) == 0 && len(needs) == 0 {
		w.fault("neither a place nor a need")
	}
	for _, p := range problems[:min(len(problems), placesWalked)] {
		for k, s := range []scene{p.nominal(), p.highest()} {
			if s.most = d.far.most; d.seed%patientEvery == 0 {
				s.most = mostSteps
			}
			for _, g := range p.allEdges() {
				at := fmt.Sprintf("%s %s %s %s", p.position, g.name, g.shape, []string{"nominal", "highest"}[k])
				w.edge(at, p, g, s.quick())
				if d.seed%fullEvery == 0 {
					w.edge(at+" in full", p, g, s)
				}
			}
		}
	}
	return w
}

// allEdges are those graded, cut, and shown.
func (p *problem) allEdges() []graded {
	edges := p.corners()
	if p.base.free && !slices.ContainsFunc(edges, func(g graded) bool { return g.name == turnOn }) {
		edges = append(edges, closes)
	}
	return edges
}

// edge solves one edge and looks at its figures, or at what its refusal says.
func (w *walked) edge(at string, p *problem, g graded, s scene) {
	e, err := g.in(s)
	w.edges++
	if e != nil {
		if w.steps += e.steps; e.steps > w.most {
			w.most, w.slowest = e.steps, at
		}
	}
	switch {
	case err != nil && s.most < mostSteps && strings.Contains(err.Error(), "steps taken"):
		w.cut++
	case err != nil:
		w.refused++
		w.reasons = append(w.reasons, cmp.Or(p.base.net, "none")+", "+kindOfReason(err.Error()))
		if text := p.refusal(fmt.Errorf("%s: %w", g.name, err)); !tellsWhatToDo(text) {
			w.fault("%s: the refusal does not say what to change: %s", at, text)
		}
	default:
		for _, odd := range oddFigures(e) {
			w.fault("%s: %s", at, odd)
		}
	}
}

// keyInText finds a key of the key table in a sentence.
var keyInText = regexp.MustCompile(`[a-z_]+(\.[a-z_]+)+`)

// tellsWhatToDo tells whether a refusal names a key that there is, and something to do.
func tellsWhatToDo(text string) bool {
	names := slices.ContainsFunc(keyInText.FindAllString(text, -1), func(key string) bool { _, ok := measure.LookupKey("board." + key); return ok })
	return names && strings.Contains(text, "check the prefix")
}

// oddFigures names what is no number, or out of the range it can have.
func oddFigures(e *Edge) []string {
	var out []string
	check := func(what string, v, low, high float64) {
		if !(v >= low && v <= high) {
			out = append(out, fmt.Sprintf("%s %g", what, v))
		}
	}
	most := math.MaxFloat64
	check("bus", e.Bus, 0, most)
	check("current", e.Current, 0, most)
	check("peak", e.Peak, e.Bus, most)
	check("moment of the peak", e.PeakTime, 0, most)
	check("slope", e.Slope, 0, most)
	check("ring", e.Ring, 0, most)
	check("damping", e.Damping, 0, 1)
	check("discharge", e.Discharge, 0, most)
	check("surge", e.Surge, 0, most)
	check("charge of the clamp", e.charge, -most, most)
	check("gain of the reservoir", e.gained, -most, most)
	check("network's square", e.Network.Square, 0, most)
	check("network's peak", e.Network.Peak, 0, most)
	check("network's slope", e.Network.Slope, 0, most)
	for _, x := range e.Energies {
		check("energy of "+x.Element, x.Joule, -most, most)
	}
	last := 0.0
	for _, x := range e.Waveform {
		check("time of a sample", x.T, last, most)
		check("sample", x.V, -most, e.Peak*(1+1e-9))
		last = x.T
	}
	return out
}

var (
	numberInReason = regexp.MustCompile(`[-+]?[0-9]+(\.[0-9]+)?(e[-+]?[0-9]+)?`)
	namesInReason  = regexp.MustCompile(`\(("[^)]*") contradict`)
)

// kindOfReason takes the numbers out of a refusal.
func kindOfReason(text string) string {
	return numberInReason.ReplaceAllString(namesInReason.ReplaceAllString(text, "(diodes contradict"), "#")
}

// boardsToWalk is how many random boards are solved, and from which number on: DRIVEMEND_RANDOM_BOARDS, as 1000000 or
// 5000+1000 for a thousand from number 5000.
func boardsToWalk(usual int) (first, count int) {
	asked := os.Getenv("DRIVEMEND_RANDOM_BOARDS")
	from, n, two := strings.Cut(asked, "+")
	if !two {
		from, n = "0", asked
	}
	count, err := strconv.Atoi(n)
	if err != nil || count < 1 {
		return 0, usual
	}
	first, _ = strconv.Atoi(from)
	return first, count
}

// tally sums up the walks.
type tally struct {
	sync.Mutex
	boards, solvable, edges, refused, cut, steps int
	reasons                                      map[string]int
	example                                      map[string]uint64
	slow                                         []walked // the slowest hundred
	faulty                                       []walked
}

const slowest = 100

func (n *tally) add(w walked) {
	n.Lock()
	defer n.Unlock()
	n.boards++
	if w.edges > 0 {
		n.solvable++
	}
	n.edges, n.refused, n.cut, n.steps = n.edges+w.edges, n.refused+w.refused, n.cut+w.cut, n.steps+w.steps
	for _, r := range w.reasons {
		if seed, ok := n.example[r]; !ok || w.seed < seed {
			n.example[r] = w.seed
		}
		n.reasons[r]++
	}
	if len(w.faults) > 0 {
		n.faulty = append(n.faulty, w)
	}
	w.board = measure.Board{}
	n.slow = append(n.slow, w)
	if len(n.slow) > 2*slowest {
		n.keepSlowest()
	}
}

// keepSlowest keeps the slowest, by the solver's steps, so that every machine names the same.
func (n *tally) keepSlowest() {
	slices.SortFunc(n.slow, func(a, b walked) int { return cmp.Or(cmp.Compare(b.steps, a.steps), cmp.Compare(a.seed, b.seed)) })
	n.slow = n.slow[:min(slowest, len(n.slow))]
}

func (n *tally) log(t *testing.T) {
	t.Logf("%d boards, %d of them with all that is needed; %d edges, %d refused, %d cut short, %d steps",
		n.boards, n.solvable, n.edges, n.refused, n.cut, n.steps)
	reasons := make([]string, 0, len(n.reasons))
	for r := range n.reasons {
		reasons = append(reasons, r)
	}
	slices.SortFunc(reasons, func(a, b string) int { return cmp.Or(cmp.Compare(n.reasons[b], n.reasons[a]), cmp.Compare(a, b)) })
	for _, r := range reasons {
		t.Logf("refused %6d times, first by board %d: %s", n.reasons[r], n.example[r], r)
	}
	n.keepSlowest()
	for _, w := range n.slow[:min(len(n.slow), max(5, n.boards/1000))] {
		t.Logf("slow: board %d (%s): %d steps in %d edges, %d of them in %s", w.seed, w.far.name, w.steps, w.edges, w.most, w.slowest)
	}
}

// Random boards over all topologies, networks and kinds of switch, over usual and absurd values: nothing panics, no
// figure is no number, and what is refused says why. DRIVEMEND_RANDOM_BOARDS asks for more of them.
func TestRandomBoards(t *testing.T) {
	first, count := boardsToWalk(100)
	n := &tally{reasons: map[string]int{}, example: map[string]uint64{}}
	var next atomic.Int64
	var wait sync.WaitGroup
	began := time.Now()
	for range 2 {
		wait.Go(func() {
			for k := next.Add(1) - 1; k < int64(count); k = next.Add(1) - 1 {
				seed := uint64(first) + uint64(k)
				n.add(walk(drawAnyBoard(seed)))
			}
		})
	}
	wait.Wait()
	n.log(t)
	t.Logf("%.2f ms a board", time.Since(began).Seconds()*1e3/float64(count))
	slices.SortFunc(n.faulty, func(a, b walked) int { return cmp.Compare(a.seed, b.seed) })
	for _, w := range n.faulty[:min(20, len(n.faulty))] {
		t.Errorf("board %d (%s): %s", w.seed, w.far.name, strings.Join(w.faults[:min(4, len(w.faults))], "; "))
	}
	if len(n.faulty) > 20 {
		t.Errorf("and %d more boards", len(n.faulty)-20)
	}
}
