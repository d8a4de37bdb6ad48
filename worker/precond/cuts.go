package precond

import (
	"sort"

	"rowstead/partition/csr"
)

// subBlocks is the number of row sub-blocks for a number of rows. Each one more
// leaves couplings out (more products), and gives a thread more to do while a
// row waits for the one before; small blocks are quick enough as they are.
func subBlocks(rows int) int {
	switch {
	case rows < 20_000:
		return 1
	case rows < 200_000:
		return 4
	case rows < 2_000_000:
		return 8
	default:
		return 16
	}
}

// blockCuts returns where the sub-blocks begin, and the number of rows at the
// end: ascending, cuts[0] = 0. It depends on the rows and the options alone. A
// cut is a multiple of the node, and of 8 nodes (a cache line) where that still
// leaves every sub-block 8 such pieces. Fewer sub-blocks come out when there are
// fewer nodes; no rows make one empty sub-block.
func blockCuts(rows int, o Options) []int {
	count := o.SubBlocks
	if count == 0 {
		count = subBlocks(rows)
	}
	unit := o.Node
	if rows >= count*8*8*unit {
		unit *= 8
	}
	pieces := rows / unit
	count = max(1, min(count, pieces))
	cuts := make([]int, count+1)
	for b := range count {
		cuts[b] = pieces * b / count * unit
	}
	cuts[count] = rows
	return cuts
}

// partCuts groups the sub-blocks: part p has the sub-blocks [q[p], q[p+1]).
func partCuts(blocks int, o Options) []int {
	width := o.Interleave
	switch {
	case width == 0 && o.Threads == 0:
		width = 2
	case width == 0:
		width = max(1, min(blocks/o.Threads, 4))
	}
	var q []int
	for b := 0; b < blocks; b += width {
		q = append(q, b)
	}
	return append(q, blocks)
}

// diagonalBlock copies rows and columns [lo, hi) of a, both counted from lo.
func diagonalBlock(a *csr.Matrix, lo, hi int) *csr.Matrix {
	d := &csr.Matrix{Rows: hi - lo, Cols: hi - lo, Start: make([]int, hi-lo+1)}
	entries := 0
	for i := lo; i < hi; i++ {
		from, to := columnRange(a, i, lo, hi)
		entries += to - from
		d.Start[i-lo+1] = entries
	}
	d.Col, d.Val = make([]int32, entries), make([]float64, entries)
	for i := lo; i < hi; i++ {
		from, to := columnRange(a, i, lo, hi)
		at := d.Start[i-lo]
		copy(d.Val[at:], a.Val[from:to])
		for k, c := range a.Col[from:to] {
			d.Col[at+k] = c - int32(lo)
		}
	}
	return d
}

// columnRange returns the positions of row i of a whose columns lie in [lo, hi).
func columnRange(a *csr.Matrix, i, lo, hi int) (from, to int) {
	cols, _ := a.Row(i)
	from = sort.Search(len(cols), func(k int) bool { return int(cols[k]) >= lo })
	to = from + sort.Search(len(cols)-from, func(k int) bool { return int(cols[from+k]) >= hi })
	return a.Start[i] + from, a.Start[i] + to
}

// localEntries counts the entries of a outside its halo columns.
func localEntries(a *csr.Matrix) int {
	if a.Cols == a.Rows {
		return a.Entries()
	}
	n := 0
	for i := range a.Rows {
		from, to := columnRange(a, i, 0, a.Rows)
		n += to - from
	}
	return n
}

// asymmetry returns a position where the block's own columns of a and their
// transpose differ, exactly; ok says that there is none.
func asymmetry(a *csr.Matrix) (row, col int, ok bool) {
	for i := range a.Rows {
		from, to := columnRange(a, i, 0, a.Rows)
		for k := from; k < to; k++ {
			j := int(a.Col[k])
			if a.At(j, i) != a.Val[k] {
				return i, j, false
			}
		}
	}
	return 0, 0, true
}
