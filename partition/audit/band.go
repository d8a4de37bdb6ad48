package audit

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

// rowRange is the rows [lo, hi) of a band.
type rowRange struct{ lo, hi int }

// A row of a band takes two positions, an entry a column and a value.
const (
	bytesPerRow   = 16
	bytesPerEntry = 12
)

// count returns the entries of every row, duplicates included.
func (s *system) count(ctx context.Context) ([]int, error) {
	counts := make([]int, s.rows)
	err := s.pass(ctx, func(t *csr.Triplets) error {
		for _, i := range t.I {
			counts[i]++
		}
		return nil
	})
	return counts, err
}

// cutBands cuts the rows into bands of at most memory bytes, each of one row at
// least.
func cutBands(counts []int, memory int64) []rowRange {
	var bands []rowRange
	lo, used := 0, int64(0)
	for i, n := range counts {
		need := int64(bytesPerRow) + bytesPerEntry*int64(n)
		if i > lo && used+need > memory {
			bands = append(bands, rowRange{lo, i})
			lo, used = i, 0
		}
		used += need
	}
	if lo < len(counts) {
		bands = append(bands, rowRange{lo, len(counts)})
	}
	return bands
}

// band is the entries of some rows, in file order until row sorts them. Row
// lo+i has room for col[start[i]:start[i+1]] and is filled up to next[i].
type band struct {
	rowRange
	start []int
	next  []int
	col   []int32
	val   []float64
	pairs []pair // scratch of row
}

type pair struct {
	col int32
	val float64
}

// newBand takes the memory of the largest band.
func newBand(bands []rowRange, counts []int) *band {
	rows, entries := 0, 0
	for _, r := range bands {
		n := 0
		for _, c := range counts[r.lo:r.hi] {
			n += c
		}
		rows, entries = max(rows, r.hi-r.lo), max(entries, n)
	}
	return &band{start: make([]int, 0, rows+1), next: make([]int, 0, rows), col: make([]int32, 0, entries), val: make([]float64, 0, entries)}
}

// fill reads the entries of the given rows in one pass.
func (s *system) fill(ctx context.Context, b *band, rows rowRange, counts []int) error {
	b.place(rows, counts)
	err := s.pass(ctx, func(t *csr.Triplets) error {
		if !b.take(t) {
			return s.changed()
		}
		return nil
	})
	if err == nil && !b.full() {
		return s.changed()
	}
	return err
}

// place empties the band and makes it that of the given rows.
func (b *band) place(rows rowRange, counts []int) {
	b.rowRange = rows
	b.start, b.next = append(b.start[:0], 0), b.next[:0]
	end := 0
	for _, n := range counts[rows.lo:rows.hi] {
		b.next = append(b.next, end)
		end += n
		b.start = append(b.start, end)
	}
	b.col, b.val = b.col[:end], b.val[:end]
}

// take stores the entries that belong to the band, and says whether there was
// room in their rows.
func (b *band) take(t *csr.Triplets) bool {
	for k, row := range t.I {
		i := int(row) - b.lo
		if i < 0 || int(row) >= b.hi {
			continue
		}
		at := b.next[i]
		if at == b.start[i+1] {
			return false
		}
		b.col[at], b.val[at] = t.J[k], t.V[k]
		b.next[i] = at + 1
	}
	return true
}

// full says whether every row has all of its entries.
func (b *band) full() bool {
	for i, at := range b.next {
		if at != b.start[i+1] {
			return false
		}
	}
	return true
}

// row returns row lo+i with ascending columns and duplicates summed in file
// order, as csr.Triplets.Matrix sums them, and how many of them there were. The
// slices alias the band. Once a row.
func (b *band) row(i int) (cols []int32, vals []float64, duplicates int) {
	lo, hi := b.start[i], b.start[i+1]
	cols, vals = b.col[lo:hi], b.val[lo:hi]
	if ascends(cols) {
		return cols, vals, 0
	}
	b.pairs = b.pairs[:0]
	for k, c := range cols {
		b.pairs = append(b.pairs, pair{c, vals[k]})
	}
	slices.SortStableFunc(b.pairs, func(p, q pair) int { return cmp.Compare(p.col, q.col) })
	n := 0
	for _, p := range b.pairs {
		if n > 0 && cols[n-1] == p.col {
			vals[n-1] += p.val
			continue
		}
		cols[n], vals[n] = p.col, p.val
		n++
	}
	return cols[:n], vals[:n], hi - lo - n
}

func ascends(cols []int32) bool {
	for k := 1; k < len(cols); k++ {
		if cols[k] <= cols[k-1] {
			return false
		}
	}
	return true
}

// checkFinite refuses sums of duplicates beyond the range of float64.
func (s *system) checkFinite(i int, cols []int32, vals []float64) error {
	for k, v := range vals {
		if math.IsInf(v, 0) || math.IsNaN(v) {
			row, _ := s.fileRow(i)
			column, _ := s.fileRow(int(cols[k]))
			return &matfile.FileError{Path: s.files.Matrix, Row: row + 1, Expected: "entries whose sum is finite", Found: fmt.Sprintf("%v in column %d", v, column+1)}
		}
	}
	return nil
}
