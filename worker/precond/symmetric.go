package precond

import "rowstead/partition/csr"

// shiftFirst and shiftGrowth make the sequence of α: 0, 1e-3, 4e-3, 1.6e-2, …
// The first is too small to cost products; common practice, no source.
const (
	shiftFirst  = 1e-3
	shiftGrowth = 4
)

// symmetricILU0 factors a symmetric block into (I + L)·D·(I + L)ᵀ on its
// pattern, the incomplete Cholesky factor without roots.
func symmetricILU0(a *csr.Matrix, _ Options) ldu {
	f := raised(a, func(shift float64) ldu { return ilu0(a, shift) })
	f.upper = f.lower.Transpose()
	return f
}

// symmetricILUT is the same with the dropping of ilut, applied to the rows of
// (I + L)ᵀ; rows of L may become longer.
func symmetricILUT(a *csr.Matrix, o Options) ldu {
	f := raised(a, func(shift float64) ldu { return upperILUT(a, o, shift) })
	f.lower = f.upper.Transpose()
	return f
}

// raised returns factor(0). Where a pivot of that is not positive although every
// diagonal entry of A is, it returns the first factor(α) with positive pivots,
// the diagonal raised to (1+α)·aᵢᵢ; one exists once the raised block is
// diagonally dominant. Manteuffel, An incomplete factorization technique for
// positive definite linear systems.
func raised(a *csr.Matrix, factor func(shift float64) ldu) ldu {
	f := factor(0)
	if f.definite() {
		return f
	}
	dominant := 0.0 // an α at which every row is dominant
	for i := range a.Rows {
		_, vals := a.Row(i)
		d, sum := a.At(i, i), meanAbs(vals)*float64(len(vals))
		if !(d > pivotFloor*sum) {
			return f
		}
		dominant = max(dominant, sum/d)
	}
	for shift := shiftFirst; shift <= shiftGrowth*dominant; shift *= shiftGrowth {
		if g := factor(shift); g.definite() {
			return g
		}
	}
	return f
}

// definite says that every pivot is positive as it came out.
func (f *ldu) definite() bool { return f.positive && len(f.pivots) == 0 && !f.broken }

// upperILUT makes D and U of (I + U)ᵀ·D·(I + U) for a symmetric block, row by
// row from the entries right of the diagonal alone: row i is taken out of by
// every earlier row k with an entry in column i. Dropping and pivots as in ilut.
// A row waits in the list of the column of its next entry, as in Jones and
// Plassmann, An improved incomplete Cholesky factorization.
func upperILUT(a *csr.Matrix, o Options, shift float64) ldu {
	f := ldu{inverse: make([]float64, a.Rows), positive: true, shift: shift}
	u := growing(a)
	w, keep := newWorkRow(a.Rows), chooser{fill: o.Fill}
	waiting := newWaiting(a.Rows)
	for i := range a.Rows {
		cols, vals := a.Row(i)
		size := meanAbs(vals)
		floor := o.Drop * size
		right := 0
		for right < len(cols) && int(cols[right]) < i {
			right++
		}
		w.load(cols[right:], vals[right:])
		w.val[i] += float64(shift * w.val[i])
		for k := waiting.first[i]; k >= 0; {
			after, at := waiting.after[k], waiting.at[k]
			end := u.Start[k+1]
			v := u.Val[at] / f.inverse[k] // u_ki·d_k
			w.subtract(v, u.Col[at:end], u.Val[at:end])
			if at+1 < end {
				waiting.add(k, at+1, u.Col[at+1])
			}
			k = after
		}
		inverse := f.invert(i, w.val[i], size, ilutPivot)
		keep.take(w, i+1, a.Rows, floor)
		keep.appendTo(u, i, inverse)
		w.clear()
		if u.Start[i] < u.Start[i+1] {
			waiting.add(int32(i), u.Start[i], u.Col[u.Start[i]])
		}
	}
	f.upper = u
	return f
}

// waiting lists, for every column, the rows whose next entry is in it.
type waiting struct {
	first []int32 // a column's first row, −1: none
	after []int32 // the row after a row in its list, −1: none
	at    []int   // position of a row's next entry
}

func newWaiting(n int) waiting {
	w := waiting{first: make([]int32, n), after: make([]int32, n), at: make([]int, n)}
	for i := range n {
		w.first[i], w.after[i] = -1, -1
	}
	return w
}

// add puts row k, whose next entry is at position at, in front of a column's list.
func (w *waiting) add(k int32, at int, column int32) {
	w.after[k], w.at[k] = w.first[column], at
	w.first[column] = k
}
