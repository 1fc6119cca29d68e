package belief

// widen gives a table with a third state, present or absent, for the variables of three digits.
func (r *run) widen(b *table, digits []int32) *table {
	size := wideSize(digits)
	if size == 1<<len(b.vars) {
		return b
	}
	n := b.part.n
	wide := &table{part: b.part, exp: b.exp, low: b.low, top: b.top, val: r.arena.take(int(size) * n), fixed: b.fixed, wanted: b.wanted}
	for e := range size {
		row := wide.row(e)
		if both, narrow := digitSplit(e, digits); both > 0 {
			r.sumRows(row, wide.row(e-2*both), wide.row(e-both))
		} else {
			copy(row, b.row(narrow))
		}
	}
	return wide
}

// narrow is the way back: from the derivative by the wide form to that by the table itself.
func (r *run) narrow(adj *table, vars []int, digits []int32) *table {
	size := wideSize(digits)
	if size == 1<<len(vars) {
		return adj
	}
	out := *adj
	out.vars, out.top = vars, adj.top+float64(len(digits))
	out.val = r.arena.take(adj.part.n << len(vars))
	for e := size - 1; e >= 0; e-- {
		row := adj.row(e)
		if both, narrow := digitSplit(e, digits); both > 0 {
			for _, to := range [2][]float64{adj.row(e - 2*both), adj.row(e - both)} {
				r.sumRows(to, to, row)
			}
		} else {
			copy(out.row(narrow), row)
		}
	}
	r.arena.back(adj.val)
	return &out
}

func (r *run) sumRows(dst, a, b []float64) {
	a, b = a[:len(dst)], b[:len(dst)]
	for c := range dst {
		if r.logs {
			dst[c] = logAdd(a[c], b[c])
		} else {
			dst[c] = a[c] + b[c]
		}
	}
}

func wideSize(digits []int32) int32 {
	size := int32(1)
	for _, d := range digits {
		size *= d
	}
	return size
}

// digitSplit gives the weight of the first variable of an entry in its third state, 0 if there is none, and else the
// entry of the table itself.
func digitSplit(e int32, digits []int32) (both, narrow int32) {
	weight := int32(1)
	for k, d := range digits {
		switch e / weight % d {
		case 1:
			narrow += 1 << k
		case 2:
			return weight, 0
		}
		weight *= d
	}
	return 0, narrow
}
