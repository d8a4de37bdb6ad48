package precond

import "math/bits"

// workRow is a sparse row that is read in ascending order while it fills up to
// the right of the reading position. A bit a column, and a bit for 64 of those,
// find the next column without a heap.
type workRow struct {
	val   []float64 // zero outside the row
	words []uint64  // bit j&63 of words[j>>6]: column j may be nonzero
	tops  []uint64  // bit k&63 of tops[k>>6]: words[k] is not zero
}

func newWorkRow(n int) *workRow {
	words := (n + 63) / 64
	return &workRow{val: make([]float64, n), words: make([]uint64, words), tops: make([]uint64, (words+63)/64)}
}

// load writes entries into an empty row.
func (w *workRow) load(cols []int32, vals []float64) {
	for k, c := range cols {
		w.val[c] = vals[k]
		w.mark(c)
	}
}

func (w *workRow) mark(c int32) {
	w.words[c>>6] |= 1 << (c & 63)
	w.tops[c>>12] |= 1 << (c >> 6 & 63)
}

// subtract takes v times the given entries out of the row.
func (w *workRow) subtract(v float64, cols []int32, vals []float64) {
	vals = vals[:len(cols)]
	for k, c := range cols {
		old := w.val[c]
		w.val[c] = old - float64(v*vals[k])
		if old == 0 {
			w.mark(c)
		}
	}
}

// next is the first marked column at or after from, or the number of columns.
func (w *workRow) next(from int) int {
	k := from >> 6
	if k >= len(w.words) {
		return len(w.val)
	}
	if m := w.words[k] >> (from & 63); m != 0 {
		return from + bits.TrailingZeros64(m)
	}
	k++
	mask := ^uint64(0) << (k & 63)
	for t := k >> 6; t < len(w.tops); t++ {
		if m := w.tops[t] & mask; m != 0 {
			k = t<<6 + bits.TrailingZeros64(m)
			return k<<6 + bits.TrailingZeros64(w.words[k])
		}
		mask = ^uint64(0)
	}
	return len(w.val)
}

// clear empties the row.
func (w *workRow) clear() {
	for c := w.next(0); c < len(w.val); c = w.next(c + 1) {
		w.val[c] = 0
	}
	for t, top := range w.tops {
		for ; top != 0; top &= top - 1 {
			w.words[t<<6+bits.TrailingZeros64(top)] = 0
		}
		w.tops[t] = 0
	}
}
