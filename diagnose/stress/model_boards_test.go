package stress

import (
	"fmt"
	"os"
	"slices"
	"strconv"
	"sync"
	"testing"
)

// modelCount is how many boards of the reference a test solves: DRIVEMEND_BOARDS, or a few.
func modelCount() int {
	if n, err := strconv.Atoi(os.Getenv("DRIVEMEND_BOARDS")); err == nil && n > 0 {
		return n
	}
	if testing.Short() {
		return 6
	}
	return 12
}

// modelSolved is a board of the reference with its data sheets and its figures, or why it has none.
type modelSolved struct {
	board  modelBoard
	result modelResult
	err    error
}

// solveModels solves boards, two at a time, in their order.
func solveModels(t *testing.T, boards []modelBoard) []modelSolved {
	t.Helper()
	solved := make([]modelSolved, len(boards))
	work := make(chan int)
	var wait sync.WaitGroup
	for range 2 {
		wait.Go(func() {
			for k := range work {
				s := modelSolved{board: boards[k]}
				if s.board, s.err = boards[k].measured(t); s.err == nil {
					s.result, s.err = s.board.reference(t)
				}
				solved[k] = s
			}
		})
	}
	for k := range boards {
		work <- k
	}
	close(work)
	wait.Wait()
	return solved
}

// drawModels draws that many boards, and one of silicon carbide for every twelve beside them, from 1e6 on.
func drawModels(count int) []modelBoard {
	var boards []modelBoard
	for n := range uint64(count) {
		boards = append(boards, drawModel(n))
	}
	for n := range uint64(count / 12) {
		boards = append(boards, drawModelOf(1e6+n, "sic-mosfet", modelNetworks[n%5]))
	}
	return boards
}

// TestModelBoards solves boards of the reference and prints a line each. At most one in fifty may be lost.
func TestModelBoards(t *testing.T) {
	if !ngspiceThere(t) {
		return
	}
	boards := drawModels(modelCount())
	lost := 0
	var shares []float64
	for _, s := range solveModels(t, boards) {
		t.Log(s.line())
		if s.err != nil {
			lost++
			continue
		}
		shares = append(shares, s.result.worst()/s.board.device.rated)
	}
	if lost > (len(boards)+49)/50 {
		t.Errorf("%d of %d boards are lost", lost, len(boards))
	}
	slices.Sort(shares)
	if n := len(shares); n > 0 {
		good, _ := slices.BinarySearch(shares, 0.8)
		t.Logf("%d boards, %d lost; peak over rating %.0f %% (10 %%), %.0f %% (half), %.0f %% (90 %%); %d at 80 %% or less",
			n, lost, 100*shares[n/10], 100*shares[n/2], 100*shares[n*9/10], good)
	}
}

// line is a board's row in the table.
func (s modelSolved) line() string {
	b, o, c := s.board, s.result.Opening, s.result.Closing
	arrangement := map[bool]string{true: "leg", false: "chopper"}[b.leg]
	head := fmt.Sprintf("%7d %-13s %-13s %-7s %-9s x%d %4.0f V %5.1f A of %4.0f V", b.seed, b.device.family, b.build,
		arrangement, b.net.kind, b.bank, b.bus, b.amps, b.device.rated)
	if s.err != nil {
		return head + " lost: " + s.err.Error()
	}
	opening := fmt.Sprintf(" | opening %4.0f (terminals %4.0f) %5.2f A/ns %3.0f ns %5.1f V/ns", o.Chip, o.Terminal,
		o.SteepFall/1e9, o.FallTime*1e9, o.VoltSlope/1e9)
	closing := fmt.Sprintf(" | closing %4.0f %5.2f A/ns Irr %3.0f %%", c.Chip, c.RiseSlope/1e9, 100*c.Recovery/b.amps)
	return head + opening + closing + fmt.Sprintf(" | %3.0f %%", 100*s.result.worst()/b.device.rated)
}
