// Package partition cuts a sparse matrix into contiguous row blocks and works
// out, for every block, which entries of x it must receive before it can form
// its rows of y = A·x, and which it must send.
//
// Its nouns are RowCuts (who owns which rows), HaloPlan (who needs what of
// whom) and LocalRows (the rows of one block in local columns). Indices are
// global and zero-based unless a name starts with "local"; ranges are
// half-open. The rows of x, b and y are cut like the rows of A, so A is square
// here. A block begins at a multiple of Unit, because a sketch is made by
// aligned groups of so many rows and must not depend on the cuts.
//
// The package does no I/O beyond reading a list of cuts and starts no
// goroutine. It knows neither matrices nor machines: matrices come as slices,
// machines as speeds. A RowCuts is immutable and safe to share; a HaloPlan is
// so as long as nobody writes to its slices.
package partition

import (
	"errors"
	"fmt"
	"sort"
)

// Unit is the row number that every block start is a multiple of.
const Unit = 8

// RowCuts says which rows each block owns: block p has the rows
// [First(p), First(p+1)). The zero value has no blocks.
type RowCuts struct {
	first  []int // length blocks+1; first[0] = 0, last entry = rows
	wanted int
}

// FromStarts returns the cuts whose blocks begin at starts and end with row
// rows. starts ascends strictly from 0 in multiples of Unit; a last entry equal
// to rows is taken for the end and not for a block. The slice is copied.
func FromStarts(starts []int, rows int) (RowCuts, error) {
	if rows < 0 {
		return RowCuts{}, fmt.Errorf("cuts: %d rows", rows)
	}
	if n := len(starts); n > 1 && starts[n-1] == rows {
		starts = starts[:n-1]
	}
	if len(starts) == 0 {
		return RowCuts{}, errors.New("cuts: no block; the first block begins at row 0")
	}
	if starts[0] != 0 {
		return RowCuts{}, fmt.Errorf("cuts: the first block begins at row %d; want 0", starts[0])
	}
	for p, row := range starts[1:] {
		switch {
		case row <= starts[p]:
			return RowCuts{}, fmt.Errorf("cuts: block %d begins at row %d, not after block %d at row %d", p+1, row, p, starts[p])
		case row >= rows:
			return RowCuts{}, fmt.Errorf("cuts: block %d begins at row %d; the matrix has %d rows, counted from 0", p+1, row, rows)
		case row%Unit != 0:
			return RowCuts{}, fmt.Errorf("cuts: block %d begins at row %d; want a multiple of %d, such as %d", p+1, row, Unit, row/Unit*Unit)
		}
	}
	first := append(append(make([]int, 0, len(starts)+1), starts...), rows)
	return RowCuts{first: first, wanted: len(starts)}, nil
}

// Blocks is the number of row blocks.
func (c RowCuts) Blocks() int { return max(0, len(c.first)-1) }

// Wanted is the number of blocks that were asked for. It exceeds Blocks when
// there were too few rows to give each of them one.
func (c RowCuts) Wanted() int { return c.wanted }

// Rows is the number of rows of all blocks.
func (c RowCuts) Rows() int {
	if len(c.first) == 0 {
		return 0
	}
	return c.first[len(c.first)-1]
}

// First is the first row of block p; First(Blocks()) is the number of rows.
func (c RowCuts) First(p int) int { return c.first[p] }

// Range is the rows [lo, hi) of block p.
func (c RowCuts) Range(p int) (lo, hi int) { return c.first[p], c.first[p+1] }

// Starts returns a copy of the first rows of all blocks, without the end: what
// a record keeps and FromStarts reads.
func (c RowCuts) Starts() []int { return append([]int{}, c.first[:c.Blocks()]...) }

// Owner is the block that owns row. O(log blocks).
func (c RowCuts) Owner(row int) int {
	if row < 0 || row >= c.Rows() {
		panic("partition: Owner of a row outside")
	}
	return sort.Search(c.Blocks(), func(p int) bool { return c.first[p+1] > row })
}

// Splits returns the first cut that splits a group of so many consecutive rows
// (the unknowns of one node), and whether there is one.
func (c RowCuts) Splits(group int) (row int, splits bool) {
	if group < 2 || len(c.first) < 3 {
		return 0, false
	}
	for _, row := range c.first[1:c.Blocks()] {
		if row%group != 0 {
			return row, true
		}
	}
	return 0, false
}
