package precond

import "rowstead/partition/csr"

// ilu0Pivot is the size of a replaced pivot of ilu0 in units of the row's
// largest entry: small enough to leave the row's couplings in charge, large
// enough that the solve grows by 10⁴ at most.
const ilu0Pivot = 1e-4

// makeILU0 is the recipe of incomplete LU on the pattern of A.
func makeILU0(a *csr.Matrix, o Options, r *Report) (Preconditioner, string) {
	if o.Symmetric {
		return assemble(a, o, r, symmetricILU0)
	}
	return assemble(a, o, r, func(block *csr.Matrix, _ Options) ldu { return ilu0(block, 0) })
}

// ilu0 factors a square block into (I + L)·D·(I + U) on its own pattern, the
// diagonal added where it is missing: the product equals A wherever A has an
// entry. The diagonal is taken as (1 + shift)·aᵢᵢ. A pivot below pivotFloor
// times the largest entry of its row of A is replaced by ±ilu0Pivot times it.
// Row by row, in place; Saad, Iterative Methods for Sparse Linear Systems, 2nd
// ed., algorithm 10.4. O(Σ over entries (i, k) below the diagonal of the entries
// of row k).
func ilu0(a *csr.Matrix, shift float64) ldu {
	w, diagonal := withDiagonal(a)
	f := ldu{inverse: make([]float64, w.Rows), positive: true, shift: shift}
	at := make([]int, w.Rows) // position+1 in row i of a column, 0 outside the row
	for i := range w.Rows {
		lo, hi, d := w.Start[i], w.Start[i+1], diagonal[i]
		scale := maxAbs(w.Val[lo:hi])
		w.Val[d] += float64(shift * w.Val[d])
		for k := lo; k < hi; k++ {
			at[w.Col[k]] = k + 1
		}
		for k := lo; k < d; k++ {
			c := w.Col[k]
			v := w.Val[k] // l·d
			from, to := diagonal[c]+1, w.Start[c+1]
			for q, j := range w.Col[from:to] {
				if m := at[j]; m > 0 {
					w.Val[m-1] -= float64(v * w.Val[from+q])
				}
			}
			w.Val[k] = v * f.inverse[c]
		}
		inverse := f.invert(i, w.Val[d], scale, ilu0Pivot)
		for k := d + 1; k < hi; k++ {
			w.Val[k] *= inverse
		}
		for _, c := range w.Col[lo:hi] {
			at[c] = 0
		}
	}
	f.lower, f.upper = split(w, diagonal)
	return f
}

// withDiagonal copies a, adding zeros on the diagonal where nothing is stored,
// and returns the positions of the diagonal.
func withDiagonal(a *csr.Matrix) (*csr.Matrix, []int) {
	room := a.Entries() + a.Rows
	w := &csr.Matrix{Rows: a.Rows, Cols: a.Cols, Start: make([]int, a.Rows+1), Col: make([]int32, 0, room), Val: make([]float64, 0, room)}
	diagonal := make([]int, a.Rows)
	for i := range a.Rows {
		cols, vals := a.Row(i)
		below := 0
		for below < len(cols) && int(cols[below]) < i {
			below++
		}
		w.Col, w.Val = append(w.Col, cols[:below]...), append(w.Val, vals[:below]...)
		diagonal[i] = len(w.Col)
		if below == len(cols) || int(cols[below]) != i {
			w.Col, w.Val = append(w.Col, int32(i)), append(w.Val, 0)
		}
		w.Col, w.Val = append(w.Col, cols[below:]...), append(w.Val, vals[below:]...)
		w.Start[i+1] = len(w.Col)
	}
	return w, diagonal
}

// split copies what lies left and right of the diagonal.
func split(w *csr.Matrix, diagonal []int) (lower, upper *csr.Matrix) {
	nl := 0
	for i, d := range diagonal {
		nl += d - w.Start[i]
	}
	take := func(entries int, from, to func(i int) int) *csr.Matrix {
		m := &csr.Matrix{Rows: w.Rows, Cols: w.Cols, Start: make([]int, w.Rows+1), Col: make([]int32, 0, entries), Val: make([]float64, 0, entries)}
		for i := range w.Rows {
			m.Col = append(m.Col, w.Col[from(i):to(i)]...)
			m.Val = append(m.Val, w.Val[from(i):to(i)]...)
			m.Start[i+1] = len(m.Col)
		}
		return m
	}
	start := func(i int) int { return w.Start[i] }
	end := func(i int) int { return w.Start[i+1] }
	lower = take(nl, start, func(i int) int { return diagonal[i] })
	upper = take(w.Entries()-w.Rows-nl, func(i int) int { return diagonal[i] + 1 }, end)
	return lower, upper
}
