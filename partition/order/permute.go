package order

import (
	"slices"
	"sort"

	"rowstead/partition/csr"
)

// Inverse returns the new row of every old one. It panics when perm is no
// permutation of 0 … len(perm)−1.
func Inverse(perm []int32) []int32 {
	inverse := slices.Repeat([]int32{-1}, len(perm))
	for i, old := range perm {
		if old < 0 || int(old) >= len(perm) || inverse[old] >= 0 {
			panic("order: not a permutation")
		}
		inverse[old] = int32(i)
	}
	return inverse
}

// Permute returns P·A·Pᵀ: its entry (i, j) is A's (perm[i], perm[j]). Columns
// ascend in every row. m is square, perm of its order. O(entries·log of a row).
func Permute(m *csr.Matrix, perm []int32) *csr.Matrix {
	square(m)
	if len(perm) != m.Rows {
		panic("order: a permutation of another length than the matrix")
	}
	inverse := Inverse(perm)
	p := &csr.Matrix{Rows: m.Rows, Cols: m.Cols, Start: make([]int, m.Rows+1), Col: make([]int32, len(m.Col)), Val: make([]float64, len(m.Val))}
	at := 0
	for i, old := range perm {
		cols, vals := m.Row(int(old))
		row := byColumn{p.Col[at : at+len(cols)], p.Val[at : at+len(cols)]}
		for k, c := range cols {
			row.col[k], row.val[k] = inverse[c], vals[k]
		}
		row.sort()
		at += len(cols)
		p.Start[i+1] = at
	}
	return p
}

// byColumn is the entries of one row, each column once.
type byColumn struct {
	col []int32
	val []float64
}

func (r byColumn) Len() int           { return len(r.col) }
func (r byColumn) Less(i, j int) bool { return r.col[i] < r.col[j] }
func (r byColumn) Swap(i, j int) {
	r.col[i], r.col[j] = r.col[j], r.col[i]
	r.val[i], r.val[j] = r.val[j], r.val[i]
}

func (r byColumn) sort() {
	if len(r.col) > 32 {
		sort.Sort(r)
		return
	}
	for k := 1; k < len(r.col); k++ {
		c, v, at := r.col[k], r.val[k], k
		for at > 0 && r.col[at-1] > c {
			r.col[at], r.val[at] = r.col[at-1], r.val[at-1]
			at--
		}
		r.col[at], r.val[at] = c, v
	}
}

// PermuteVector sets y[i] = x[perm[i]], the vector in the new order. All three
// have one length; y is not x.
func PermuteVector(y, x []float64, perm []int32) {
	if len(x) != len(perm) || len(y) != len(perm) {
		panic("order: lengths disagree in PermuteVector")
	}
	for i, old := range perm {
		y[i] = x[old]
	}
}

// Unpermute sets x[perm[i]] = y[i], the vector back in the old order.
func Unpermute(x, y []float64, perm []int32) {
	if len(x) != len(perm) || len(y) != len(perm) {
		panic("order: lengths disagree in Unpermute")
	}
	for i, old := range perm {
		x[old] = y[i]
	}
}
