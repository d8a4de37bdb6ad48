package order

import (
	"math"

	"rowstead/partition/csr"
)

// named is how many places of a kind are listed; the others are counted.
const named = 8

// Places counts where something was found and lists the first few.
type Places struct {
	Count int
	First []int // ascending, at most 8
}

func (p *Places) add(i int) {
	p.Count++
	if len(p.First) < named {
		p.First = append(p.First, i)
	}
}

// Structure is what the entries alone say about the equations.
type Structure struct {
	EmptyRows    Places // nothing is stored: 0 = b_i
	ZeroRows     Places // something is stored, but only zeros
	EmptyColumns Places // the unknown appears in no equation
	ZeroColumns  Places // it appears only with zeros
	StoredZeros  int    // entries with value 0
	LongestRow   int    // entries of the longest row
	LongestAt    int    // which that is, the first of them; −1 without rows
}

// StructureOf looks for rows and columns that no solver can do anything with.
// Any shape. O(entries), a byte a column.
func StructureOf(m *csr.Matrix) Structure {
	s := Structure{LongestAt: -1}
	const stored, nonzero = 1, 2
	column := make([]uint8, m.Cols)
	for i := range m.Rows {
		cols, vals := m.Row(i)
		if s.LongestAt < 0 || len(cols) > s.LongestRow {
			s.LongestRow, s.LongestAt = len(cols), i
		}
		row := uint8(0)
		for k, c := range cols {
			state := uint8(stored)
			if vals[k] != 0 {
				state |= nonzero
			} else {
				s.StoredZeros++
			}
			column[c] |= state
			row |= state
		}
		classify(row, i, &s.EmptyRows, &s.ZeroRows)
	}
	for j, state := range column {
		classify(state, j, &s.EmptyColumns, &s.ZeroColumns)
	}
	return s
}

func classify(state uint8, i int, empty, zero *Places) {
	switch state {
	case 0:
		empty.add(i)
	case 1:
		zero.add(i)
	}
}

// tinyDiagonal is the part of a row's largest entry below which a diagonal is
// called tiny: as a pivot it would cost more than half of the digits.
const tinyDiagonal = 0x1p-26

// Diagonal says whether the diagonal can serve as pivots.
type Diagonal struct {
	Missing  Places  // not stored
	Zero     Places  // stored with value 0
	Tiny     Places  // nonzero, below 2⁻²⁶ of the largest entry of its row
	Negative Places  // below zero; with a positive one the matrix is not definite
	Positive int     // how many are above zero
	Weak     int     // rows with |a_ii| < Σ |a_ij|, j ≠ i
	Smallest float64 // least |a_ii| / max |row i| of the rows with a nonzero; 1 without one
}

// DiagonalReport looks at the diagonal of a square matrix. O(entries).
func DiagonalReport(m *csr.Matrix) Diagonal {
	square(m)
	d := Diagonal{Smallest: 1}
	for i := range m.Rows {
		d.look(m, i)
	}
	return d
}

func (d *Diagonal) look(m *csr.Matrix, i int) {
	cols, vals := m.Row(i)
	stored, pivot, largest := false, 0.0, 0.0
	for k, c := range cols {
		largest = max(largest, math.Abs(vals[k]))
		if int(c) == i {
			stored, pivot = true, vals[k]
		}
	}
	switch {
	case !stored:
		d.Missing.add(i)
	case pivot == 0:
		d.Zero.add(i)
	case math.Abs(pivot) < tinyDiagonal*largest:
		d.Tiny.add(i)
	}
	if pivot < 0 {
		d.Negative.add(i)
	}
	if pivot > 0 {
		d.Positive++
	}
	if largest == 0 {
		return
	}
	d.Smallest = min(d.Smallest, math.Abs(pivot)/largest)
	// The row times 2^e, largest entry in [1, 2): the sum cannot overflow, and
	// rows of whole numbers are compared exactly.
	e := int(unitExponent(largest))
	rest := 0.0
	for k, c := range cols {
		if int(c) != i {
			v, _ := shift(math.Abs(vals[k]), e)
			rest += v
		}
	}
	if v, _ := shift(math.Abs(pivot), e); v < rest {
		d.Weak++
	}
}
