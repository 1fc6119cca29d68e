package circuit

import (
	"errors"
	"sync"
)

// slab hands out zeroed pieces of larger blocks.
type slab[T any] struct {
	blocks [][]T
	block  int // the one in use
	used   int // of it
}

// slabBlock is how many entries a block has at least.
const slabBlock = 4096

func (s *slab[T]) take(n int) []T {
	for s.block < len(s.blocks) && s.used+n > len(s.blocks[s.block]) {
		s.block, s.used = s.block+1, 0
	}
	if s.block == len(s.blocks) {
		s.blocks = append(s.blocks, make([]T, max(n, slabBlock)))
	}
	own := s.blocks[s.block][s.used : s.used+n : s.used+n]
	s.used += n
	clear(own)
	return own
}

func (s *slab[T]) reset() { s.block, s.used = 0, 0 }

// room is the space of one run: what it makes lives as long as the run.
type room struct {
	floats  slab[float64]
	ints    slab[int]
	terms   slab[term]
	lists   slab[[]term]
	levels  slab[level]
	scratch []float64    // for the moment
	rates   []complex128 // for the moment
	list    []int        // scratch of the trees
	part    parts
	rise    []term
	fall    []term
}

// rooms are those of runs that were released.
var rooms = sync.Pool{New: func() any { return new(room) }}

func (r *room) take(n int) []float64 { return r.floats.take(n) }

// resize makes a slice n long and zero, in the space it has if that is enough.
func (r *room) resize(p *[]float64, n int) {
	if cap(*p) < n {
		*p = r.take(n)
		return
	}
	*p = (*p)[:n]
	clear(*p)
}

// moment gives space that holds until it is asked for again; what stands in it is left over.
func (r *room) moment(n int) []float64 {
	if cap(r.scratch) < n {
		r.scratch = make([]float64, max(n, slabBlock))
	}
	return r.scratch[:n]
}

// Release gives back the space of a run that is no longer needed, so that the next one need not make its own. Nothing may be
// asked of the run afterwards; answers are NaN or errors.
func (r *Run) Release() {
	if r.room == nil {
		return
	}
	r.room.floats.reset()
	r.room.ints.reset()
	r.room.terms.reset()
	r.room.lists.reset()
	r.room.levels.reset()
	rooms.Put(r.room)
	*r = Run{err: errReleased, c: r.c}
}

var errReleased = errors.New("circuit: the run was released; ask before Release")

// find gives the branch of a name, none of a run that was released.
func (r *Run) find(name string) (number int, ok bool) {
	if r.sys == nil {
		return 0, false
	}
	return r.c.find(name)
}
