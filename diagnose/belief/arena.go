package belief

import (
	"math/bits"
	"sync"
)

// arena lends the memory of the tables of one run. What is given back early is lent again at once, while it is still
// in the processor's cache.
type arena struct {
	chunks [][]float64
	chunk  int // the one in use
	taken  int // of it
	free   [24][][]float64
	wide   []float64 // scratch
}

const chunkValues = 1 << 17

var arenas = sync.Pool{New: func() any { return new(arena) }}

// take lends room for n values, of no particular content.
func (a *arena) take(n int) []float64 {
	class := bits.Len(uint(n - 1))
	if class >= len(a.free) || 1<<class > chunkValues {
		return make([]float64, n)
	}
	if list := a.free[class]; len(list) > 0 {
		a.free[class] = list[:len(list)-1]
		return list[len(list)-1][:n]
	}
	if len(a.chunks) == 0 || a.taken+n > chunkValues {
		if len(a.chunks) > 0 {
			a.chunk++
		}
		if a.chunk == len(a.chunks) {
			a.chunks = append(a.chunks, make([]float64, chunkValues))
		}
		a.taken = 0
	}
	room := min(1<<class, chunkValues-a.taken)
	out := a.chunks[a.chunk][a.taken : a.taken+n : a.taken+room]
	a.taken += room
	return out
}

// back returns what was lent before the end of the run.
func (a *arena) back(values []float64) {
	if class := bits.Len(uint(cap(values))) - 1; class >= 0 && class < len(a.free) && 1<<class <= chunkValues {
		a.free[class] = append(a.free[class], values)
	}
}

// release gives the arena back; nothing lent may be used after it.
func (a *arena) release() {
	a.chunk, a.taken = 0, 0
	for class := range a.free {
		a.free[class] = a.free[class][:0]
	}
	arenas.Put(a)
}
