package belief

import (
	"math"
	"slices"
)

// roles says which tables of an op a list of products reads and writes.
type roles int

const (
	forwards roles = iota // out = a·b
	byFirst               // derivative by a = derivative by out · b
	bySecond              // derivative by b = derivative by out · a
)

// entries gives the entry a term writes and the two it reads.
func (t term) entries(as roles) (to, x, y int32) {
	switch as {
	case byFirst:
		return t.a, t.out, t.b
	case bySecond:
		return t.b, t.out, t.a
	default:
		return t.out, t.a, t.b
	}
}

// grouped sorts terms by the entry they write, otherwise keeping their order; the terms of entry k end at ends[k]. Both
// lists last until the next call.
func (r *run) grouped(terms []term, as roles, entries int) (sorted []term, ends []int32) {
	r.sorted = slices.Grow(r.sorted[:0], len(terms))
	r.ends = slices.Grow(r.ends[:0], entries+1)
	sorted, ends = r.sorted[:len(terms)], r.ends[:entries+1]
	clear(ends)
	for _, t := range terms {
		to, _, _ := t.entries(as)
		ends[to+1]++
	}
	for k := range entries {
		ends[k+1] += ends[k]
	}
	for _, t := range terms { // ends[k] starts as the end of entry k-1 and moves on to that of k
		to, _, _ := t.entries(as)
		sorted[ends[to]] = t
		ends[to]++
	}
	return sorted, ends[:entries]
}

// products fills dst with sums of products of entries of x and y; met leads from the classes of dst to theirs.
func (r *run) products(dst *table, terms []term, as roles, x, y *table, met meet) {
	x, y, left, right := r.lined(x, y, dst.part.n, met, len(terms))
	sorted, ends := r.grouped(terms, as, dst.entries())
	start := int32(0)
	for to, end := range ends {
		r.sum(dst.row(int32(to)), sorted[start:end], as, x, y, left, right)
		start = end
	}
}

// lined sees to it that at most one of two factors needs a way from the n classes of the result, if its rows are read
// often enough.
func (r *run) lined(x, y *table, n int, met meet, terms int) (*table, *table, []int32, []int32) {
	left, right := met.left, met.right
	if left != nil && right != nil {
		if x.entries() <= y.entries() {
			x, left = r.expanded(x, n, left, terms)
		} else {
			y, right = r.expanded(y, n, right, terms)
		}
	}
	return x, y, left, right
}

// sum fills a row with the products of some entries of x and y, two at a time.
func (r *run) sum(dst []float64, terms []term, as roles, x, y *table, left, right []int32) {
	r.wipe(dst)
	for len(terms) > 0 {
		_, ex, ey := terms[0].entries(as)
		if r.logs {
			addLogs(dst, x.row(ex), y.row(ey), left, right)
			terms = terms[1:]
			continue
		}
		if len(terms) == 1 {
			addProduct(dst, x.row(ex), y.row(ey), left, right)
			return
		}
		_, fx, fy := terms[1].entries(as)
		addProducts(dst, x.row(ex), y.row(ey), x.row(fx), y.row(fy), left, right)
		terms = terms[2:]
	}
}

// expanded writes a table out in the classes of the result, if its rows are read so often that it pays.
func (r *run) expanded(t *table, n int, way []int32, terms int) (*table, []int32) {
	entries := t.entries()
	if terms < 3*entries {
		return t, way
	}
	if cap(r.arena.wide) < entries*n {
		r.arena.wide = make([]float64, 2*entries*n)
	}
	wide := &table{part: &partition{n: n}, val: r.arena.wide[:entries*n]}
	for e := range entries {
		from, to := t.row(int32(e)), wide.row(int32(e))
		for c, w := range way[:len(to)] {
			to[c] = from[w]
		}
	}
	return wide, nil
}

// addProduct adds the products a·b to dst, class by class. wa and wb lead from the classes of dst to those of a and b
// (nil: the same classes); a list of length 1 stands for every class.
func addProduct(dst, a, b []float64, wa, wb []int32) {
	if swapped(a, b, wa, wb) {
		a, b, wa, wb = b, a, wb, wa
	}
	switch {
	case len(b) == 1:
		s := b[0]
		a = a[:len(dst)]
		for i := range dst {
			dst[i] += float64(a[i] * s)
		}
	case wb == nil:
		a, b = a[:len(dst)], b[:len(dst)]
		for i := range dst {
			dst[i] += float64(a[i] * b[i])
		}
	case wa == nil:
		a, wb = a[:len(dst)], wb[:len(dst)]
		for i := range dst {
			dst[i] += float64(a[i] * b[wb[i]])
		}
	default:
		wa, wb = wa[:len(dst)], wb[:len(dst)]
		for i := range dst {
			dst[i] += float64(a[wa[i]] * b[wb[i]])
		}
	}
}

// addProducts is addProduct for a·b and c·d, where c is like a and d like b, in one go.
func addProducts(dst, a, b, c, d []float64, wa, wb []int32) {
	if swapped(a, b, wa, wb) {
		a, b, c, d, wa, wb = b, a, d, c, wb, wa
	}
	switch {
	case len(b) == 1:
		s, t := b[0], d[0]
		a, c = a[:len(dst)], c[:len(dst)]
		for i := range dst {
			dst[i] = dst[i] + float64(a[i]*s) + float64(c[i]*t)
		}
	case wb == nil:
		a, b, c, d = a[:len(dst)], b[:len(dst)], c[:len(dst)], d[:len(dst)]
		for i := range dst {
			dst[i] = dst[i] + float64(a[i]*b[i]) + float64(c[i]*d[i])
		}
	case wa == nil:
		a, c, wb, d = a[:len(dst)], c[:len(dst)], wb[:len(dst)], d[:len(b)]
		for i := range dst {
			k := wb[i]
			dst[i] = dst[i] + float64(a[i]*b[k]) + float64(c[i]*d[k])
		}
	default:
		addProduct(dst, a, b, wa, wb)
		addProduct(dst, c, d, wa, wb)
	}
}

// swapped tells whether to swap two factors, to put one that is the same for every class second, and one that needs
// no way first.
func swapped(a, b []float64, wa, wb []int32) bool {
	return len(a) == 1 || (wa != nil && wb == nil && len(b) != 1)
}

// addLogs does the same on logarithms.
func addLogs(dst, a, b []float64, wa, wb []int32) {
	for i := range dst {
		dst[i] = logAdd(dst[i], valueAt(a, wa, i)+valueAt(b, wb, i))
	}
}

func valueAt(a []float64, way []int32, i int) float64 {
	switch {
	case len(a) == 1:
		return a[0]
	case way == nil:
		return a[i]
	default:
		return a[way[i]]
	}
}

// logAdd gives ln(eˣ + eʸ).
func logAdd(x, y float64) float64 {
	if x < y {
		x, y = y, x
	}
	if math.IsInf(y, -1) {
		return x
	}
	return x + math.Log1p(math.Exp(y-x))
}
