package precond

import (
	"math"
	"slices"

	"rowstead/partition/csr"
)

// ilutPivot is the size of a replaced pivot of ilut in units of the mean size of
// the row's entries.
const ilutPivot = 1e-2

// makeILUT is the recipe of incomplete LU with dropping.
func makeILUT(a *csr.Matrix, o Options, r *Report) (Preconditioner, string) {
	if o.Symmetric {
		return assemble(a, o, r, symmetricILUT)
	}
	return assemble(a, o, r, ilut)
}

// ilut factors a square block into (I + L)·D·(I + U) row by row. With s the mean
// size of the entries of row i of A, a multiplier is dropped when both it and
// what it eliminates are below o.Drop·s, an entry right of the diagonal when it
// is not above o.Drop·s before the division by the pivot; of the rest the o.Fill
// largest left and the o.Fill largest right of the diagonal stay, the first of
// equal ones. A pivot below pivotFloor·s is replaced by ±ilutPivot·s. Saad,
// Iterative Methods for Sparse Linear Systems, 2nd ed., algorithm 10.6. At most
// about 2·o.Fill² flops a row.
func ilut(a *csr.Matrix, o Options) ldu {
	f := ldu{inverse: make([]float64, a.Rows), positive: true}
	lower, upper := growing(a), growing(a)
	w, keep := newWorkRow(a.Rows), chooser{fill: o.Fill}
	for i := range a.Rows {
		cols, vals := a.Row(i)
		w.load(cols, vals)
		size := meanAbs(vals)
		floor := o.Drop * size
		for c := w.next(0); c < i; c = w.next(c + 1) {
			v := w.val[c]
			l := v * f.inverse[c]
			if v == 0 || math.Abs(l) < floor && math.Abs(v) < floor {
				w.val[c] = 0
				continue
			}
			w.subtract(v, upper.Col[upper.Start[c]:upper.Start[c+1]], upper.Val[upper.Start[c]:upper.Start[c+1]])
			w.val[c] = l
		}
		inverse := f.invert(i, w.val[i], size, ilutPivot)
		keep.take(w, 0, i, 0)
		keep.appendTo(lower, i, 1)
		keep.take(w, i+1, a.Rows, floor)
		keep.appendTo(upper, i, inverse)
		w.clear()
	}
	f.lower, f.upper = lower, upper
	return f
}

// growing is a matrix of a's shape whose rows are appended one by one.
func growing(a *csr.Matrix) *csr.Matrix {
	room := a.Entries()
	return &csr.Matrix{Rows: a.Rows, Cols: a.Cols, Start: make([]int, a.Rows+1), Col: make([]int32, 0, room), Val: make([]float64, 0, room)}
}

// meanAbs is the mean absolute value, 0 for none.
func meanAbs(v []float64) float64 {
	if len(v) == 0 {
		return 0
	}
	s := 0.0
	for _, x := range v {
		s += math.Abs(x)
	}
	return s / float64(len(v))
}

// chooser picks the entries of a work row that stay.
type chooser struct {
	fill  int
	cols  []int32
	vals  []float64
	sizes []float64
}

// take picks the largest entries of w in columns [lo, hi), at most fill of them,
// all larger in size than floor; of equal ones the first. Columns ascend.
func (c *chooser) take(w *workRow, lo, hi int, floor float64) {
	c.cols, c.vals, c.sizes = c.cols[:0], c.vals[:0], c.sizes[:0]
	for j := w.next(lo); j < hi; j = w.next(j + 1) {
		if v := w.val[j]; !(math.Abs(v) <= floor) { // NaN stays and shows
			c.cols, c.vals, c.sizes = append(c.cols, int32(j)), append(c.vals, v), append(c.sizes, math.Abs(v))
		}
	}
	if len(c.cols) <= c.fill {
		return
	}
	slices.Sort(c.sizes)
	least := c.sizes[len(c.sizes)-c.fill]
	first, _ := slices.BinarySearch(c.sizes, math.Nextafter(least, math.Inf(1)))
	equal := c.fill - (len(c.sizes) - first) // how many of size least stay
	n := 0
	for k, v := range c.vals {
		s := math.Abs(v)
		if s == least {
			equal--
		}
		if s > least || s == least && equal >= 0 {
			c.cols[n], c.vals[n] = c.cols[k], v
			n++
		}
	}
	c.cols, c.vals = c.cols[:n], c.vals[:n]
}

// appendTo appends what was picked, times scale, as row i of m.
func (c *chooser) appendTo(m *csr.Matrix, i int, scale float64) {
	if n := len(m.Col) + len(c.cols); n > cap(m.Col) {
		// Room for as many a row as so far, and a little more.
		room := max(n*(m.Rows-i)/(i+1)*9/8, n/4, len(c.cols))
		m.Col, m.Val = slices.Grow(m.Col, room), slices.Grow(m.Val, room)
	}
	m.Col = append(m.Col, c.cols...)
	for _, v := range c.vals {
		m.Val = append(m.Val, v*scale)
	}
	m.Start[i+1] = len(m.Col)
}
