package partition

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"sort"
)

// DefaultRowWeight is what a row costs beside its entries, counted in entries.
// Updating a basis vector against a window of four and sketching it takes 0.84
// of a product with a 7-point matrix, which moves 12 bytes an entry and 24 a
// row: 0.84·108/12, rounded up.
const DefaultRowWeight = 8

// Rule says how rows are weighed and where cuts may fall. Its zero value is
// what CutByEntries and CutBySpeed use.
type Rule struct {
	RowWeight int // cost of a row in entries; 0: DefaultRowWeight, negative: none
	Group     int // consecutive rows that stay together (unknowns of a node); 0: 1
}

// EvenCuts gives blocks nearly the same number of rows. There are fewer blocks
// than asked for when rows < Unit·blocks, and one empty block for no rows.
func EvenCuts(rows, blocks int) (RowCuts, error) {
	if rows < 0 {
		return RowCuts{}, fmt.Errorf("cuts: %d rows", rows)
	}
	if blocks < 1 {
		return RowCuts{}, fmt.Errorf("cuts: %d row blocks; want 1 or more", blocks)
	}
	return cut(rows, Unit, equal(min(blocks, units(rows, Unit))), func(row int) int { return row }).asked(blocks), nil
}

// CutByEntries gives blocks nearly the same work: entries plus DefaultRowWeight
// a row.
//
//	start   length rows+1, ascending: row i has start[i+1]−start[i] entries
//	blocks  1 or more
//
// A block exceeds its share by at most the work of the heaviest Unit rows,
// unless a block must be widened to have any row. There are fewer blocks than
// asked for when rows < Unit·blocks, which Wanted tells; no block is empty, but
// a matrix without rows has one empty block. O(rows + blocks·log rows).
func CutByEntries(start []int, blocks int) (RowCuts, error) {
	return Rule{}.CutByEntries(start, blocks)
}

// CutBySpeed gives block p work in proportion to speeds[p] > 0, in any unit.
// Where there are fewer rows than Unit·len(speeds) only the fastest machines
// get a block; kept[p] is the index in speeds of block p's, ascending.
func CutBySpeed(start []int, speeds []float64) (c RowCuts, kept []int, err error) {
	return Rule{}.CutBySpeed(start, speeds)
}

// CutByEntries is the function of that name under rule r.
func (r Rule) CutByEntries(start []int, blocks int) (RowCuts, error) {
	if blocks < 1 {
		return RowCuts{}, fmt.Errorf("cuts: %d row blocks; want 1 or more", blocks)
	}
	unit, err := r.check(start)
	if err != nil {
		return RowCuts{}, err
	}
	rows := len(start) - 1
	return cut(rows, unit, equal(min(blocks, units(rows, unit))), r.work(start)).asked(blocks), nil
}

// CutBySpeed is the function of that name under rule r.
func (r Rule) CutBySpeed(start []int, speeds []float64) (RowCuts, []int, error) {
	if len(speeds) == 0 {
		return RowCuts{}, nil, errors.New("cuts: no speeds; want one a row block")
	}
	for p, s := range speeds {
		if !(s > 0) || math.IsInf(s, 0) {
			return RowCuts{}, nil, fmt.Errorf("cuts: speed %d is %v; want a positive number", p, s)
		}
	}
	unit, err := r.check(start)
	if err != nil {
		return RowCuts{}, nil, err
	}
	rows := len(start) - 1
	kept := fastest(speeds, min(len(speeds), units(rows, unit)))
	top := slices.Max(speeds) // divided out, so that no sum of speeds overflows
	share := make([]float64, len(kept))
	for p, k := range kept {
		share[p] = speeds[k] / top
	}
	return cut(rows, unit, share, r.work(start)).asked(len(speeds)), kept, nil
}

// check returns the row number that cuts are multiples of: lcm(Unit, Group).
func (r Rule) check(start []int) (int, error) {
	if len(start) == 0 {
		return 0, errors.New("cuts: no row starts; want one more than rows")
	}
	if r.Group < 0 || r.Group > math.MaxInt32 {
		return 0, fmt.Errorf("cuts: groups of %d rows", r.Group)
	}
	for i := range len(start) - 1 {
		if start[i+1] < start[i] {
			return 0, fmt.Errorf("cuts: row %d has %d entries", i, start[i+1]-start[i])
		}
	}
	unit := max(1, r.Group)
	for unit%Unit != 0 {
		unit *= 2 // Unit is a power of two: doubling reaches the lcm
	}
	return unit, nil
}

// work returns the cost of all rows before row, in entries.
func (r Rule) work(start []int) func(row int) int {
	w := r.RowWeight
	switch {
	case w == 0:
		w = DefaultRowWeight
	case w < 0:
		w = 0
	}
	return func(row int) int { return start[row] - start[0] + w*row }
}

// asked returns c with the number of blocks that were wanted.
func (c RowCuts) asked(blocks int) RowCuts {
	c.wanted = blocks
	return c
}

// units is how many blocks can have a row when cuts are multiples of unit.
func units(rows, unit int) int { return max(1, (rows+unit-1)/unit) }

func equal(blocks int) []float64 {
	share := make([]float64, blocks)
	for p := range share {
		share[p] = 1
	}
	return share
}

// fastest returns the indices of the count largest speeds, ascending; among
// equal speeds the first.
func fastest(speeds []float64, count int) []int {
	order := make([]int, len(speeds))
	for p := range order {
		order[p] = p
	}
	sort.SliceStable(order, func(i, j int) bool { return speeds[order[i]] > speeds[order[j]] })
	order = order[:count]
	slices.Sort(order)
	return order
}

// cut places len(share) ≤ units(rows, unit) blocks so that the work before each
// cut is as near as possible to the share of the blocks before it.
func cut(rows, unit int, share []float64, work func(row int) int) RowCuts {
	blocks, all := len(share), units(rows, unit)
	sum := 0.0
	for _, s := range share {
		sum += s
	}
	first := make([]int, blocks+1)
	first[blocks] = rows
	total, before, last := float64(work(rows)), 0.0, 0
	for p := 1; p < blocks; p++ {
		before += share[p-1]
		target := total * (before / sum)
		// u: the first unit whose start has the work of the target behind it
		u := sort.Search(all, func(u int) bool { return float64(work(u*unit)) >= target })
		if u > 0 && target-float64(work((u-1)*unit)) <= float64(work(min(u*unit, rows)))-target {
			u--
		}
		// every block has a unit, and so have those still to come
		last = min(max(u, last+1), all-(blocks-p))
		first[p] = last * unit
	}
	return RowCuts{first: first}
}
