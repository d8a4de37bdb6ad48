package partition

import (
	"math/bits"
	"slices"
)

// Needs returns the columns outside the block's own rows that its rows touch,
// ascending, each once.
//
//	lo     first row of the block
//	start  length rows+1 of the block: its row i has the entries
//	       [start[i], start[i+1]) of col. A part Start[lo:hi+1] of the row
//	       starts of the whole matrix will do, with all its columns
//	col    global columns
//
// O(entries + columns/64), with a bit a column of scratch memory.
func Needs(lo int, start []int, col []int32) []int32 {
	hi := lo + len(start) - 1
	entries := col[start[0]:start[len(start)-1]]
	top := -1
	for _, c := range entries {
		top = max(top, int(c))
	}
	seen := make([]uint64, top/64+1)
	count := 0
	for _, c := range entries {
		if int(c) >= lo && int(c) < hi {
			continue
		}
		bit := uint64(1) << (c & 63)
		if seen[c>>6]&bit == 0 {
			seen[c>>6] |= bit
			count++
		}
	}
	needs := make([]int32, 0, count)
	for w, word := range seen {
		for ; word != 0; word &= word - 1 {
			needs = append(needs, int32(64*w+bits.TrailingZeros64(word)))
		}
	}
	return needs
}

// LocalRows is the rows of one block in local columns: column c in [0, Rows) is
// own row c of x, and Rows+h is halo entry h in the order of the plan.
//
// Inside a row the entries stand in the order of their global columns, not of
// their local ones. So a row's sum is formed in the same order whatever the
// cuts, and a product over any number of blocks has the bits of the product
// with the whole matrix. The local columns of a row do not ascend, but those
// below Rows, the block's own square part, do among themselves, and so do the
// others.
type LocalRows struct {
	Rows, Halo int
	Start      []int     // length Rows+1, Start[0] = 0
	Col        []int32   // local
	Val        []float64 // aliases the values it was made from
}

// Localize returns the rows that begin with row lo in local columns.
//
//	lo     first row of the block
//	halo   global columns of the block's halo, ascending (BlockHalo.Columns)
//	start  length rows+1, as in Needs
//	col    global columns; not changed
//	val    values; the result's Val aliases val[start[0]:start[rows]]
//
// It panics when a column lies neither in the own rows nor in the halo.
// O(entries + halo entries·log halo).
func Localize(lo int, halo []int32, start []int, col []int32, val []float64) LocalRows {
	rows := len(start) - 1
	from, to := start[0], start[rows]
	local := LocalRows{Rows: rows, Halo: len(halo), Start: make([]int, rows+1), Col: make([]int32, to-from), Val: val[from:to:to]}
	for i, s := range start {
		local.Start[i] = s - from
	}
	LocalColumns(lo, rows, halo, col[from:to], local.Col)
	return local
}

// LocalColumns turns global columns into local ones of the block that owns the
// rows [lo, lo+rows) and has the given halo; local may be global itself.
func LocalColumns(lo, rows int, halo, global, local []int32) {
	if len(global) != len(local) {
		panic("partition: lengths disagree in LocalColumns")
	}
	for k, c := range global {
		if own := int(c) - lo; own >= 0 && own < rows {
			local[k] = int32(own)
			continue
		}
		h, found := slices.BinarySearch(halo, c)
		if !found {
			panic("partition: a column that is neither own nor halo")
		}
		local[k] = int32(rows + h)
	}
}
