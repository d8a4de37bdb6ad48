// Package csr holds sparse matrices in compressed-row form, their checks and
// the slow, obvious products that every fast kernel is tested against.
//
// Indices are zero-based and local to the matrix; ranges are half-open. The
// package does no I/O and starts no goroutine. A Matrix may be read from many
// goroutines as long as nobody writes to it.
package csr

import (
	"fmt"
	"math"
)

// Matrix is a Rows×Cols sparse matrix. Row i has the entries k in
// [Start[i], Start[i+1]): column Col[k], value Val[k]. Inside a row the columns
// ascend strictly.
type Matrix struct {
	Rows, Cols int
	Start      []int     // length Rows+1, Start[0] = 0
	Col        []int32   // length Start[Rows]
	Val        []float64 // length Start[Rows]
}

// Entries is the number of stored entries.
func (m *Matrix) Entries() int { return len(m.Col) }

// Row returns the columns and values of row i; the slices alias the matrix.
func (m *Matrix) Row(i int) ([]int32, []float64) {
	lo, hi := m.Start[i], m.Start[i+1]
	return m.Col[lo:hi:hi], m.Val[lo:hi:hi]
}

// At returns the value at (i, j), zero where nothing is stored. Binary search.
func (m *Matrix) At(i, j int) float64 {
	cols, vals := m.Row(i)
	lo, hi := 0, len(cols)
	for lo < hi {
		mid := (lo + hi) / 2
		if int(cols[mid]) < j {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	if lo < len(cols) && int(cols[lo]) == j {
		return vals[lo]
	}
	return 0
}

// Check returns an error that names the first row which breaks the contract of
// Matrix: lengths, ascending columns in range, finite values.
func (m *Matrix) Check() error {
	if m.Rows < 0 || m.Cols < 0 || m.Cols > math.MaxInt32 || len(m.Start) != m.Rows+1 {
		return fmt.Errorf("csr: a %d×%d matrix with %d row starts", m.Rows, m.Cols, len(m.Start))
	}
	if m.Start[0] != 0 || m.Start[m.Rows] != len(m.Col) || len(m.Col) != len(m.Val) {
		return fmt.Errorf("csr: row starts end at %d, %d columns, %d values", m.Start[m.Rows], len(m.Col), len(m.Val))
	}
	for i := range m.Rows {
		if m.Start[i+1] < m.Start[i] || m.Start[i+1] > len(m.Col) {
			return fmt.Errorf("csr: row %d starts at %d and ends at %d", i, m.Start[i], m.Start[i+1])
		}
		cols, vals := m.Row(i)
		last := -1
		for k, c := range cols {
			if int(c) <= last || int(c) >= m.Cols {
				return fmt.Errorf("csr: row %d has column %d after %d of %d columns", i, c, last, m.Cols)
			}
			last = int(c)
			if math.IsNaN(vals[k]) || math.IsInf(vals[k], 0) {
				return fmt.Errorf("csr: row %d, column %d: value %v is not finite", i, c, vals[k])
			}
		}
	}
	return nil
}

// Mul forms y = A·x, row by row in column order. len(x) = Cols, len(y) = Rows.
func (m *Matrix) Mul(y, x []float64) {
	if len(x) != m.Cols || len(y) != m.Rows {
		panic("csr: lengths disagree in Mul")
	}
	for i := range m.Rows {
		cols, vals := m.Row(i)
		sum := 0.0
		for k, c := range cols {
			sum += vals[k] * x[c]
		}
		y[i] = sum
	}
}

// MulT forms y = Aᵀ·x. len(x) = Rows, len(y) = Cols.
func (m *Matrix) MulT(y, x []float64) {
	if len(x) != m.Rows || len(y) != m.Cols {
		panic("csr: lengths disagree in MulT")
	}
	clear(y)
	for i := range m.Rows {
		cols, vals := m.Row(i)
		for k, c := range cols {
			y[c] += vals[k] * x[i]
		}
	}
}

// Transpose returns Aᵀ with ascending columns, in O(Rows + Cols + entries).
func (m *Matrix) Transpose() *Matrix {
	t := &Matrix{Rows: m.Cols, Cols: m.Rows, Start: make([]int, m.Cols+1), Col: make([]int32, len(m.Col)), Val: make([]float64, len(m.Val))}
	for _, c := range m.Col {
		t.Start[c+1]++
	}
	for i := range t.Rows {
		t.Start[i+1] += t.Start[i]
	}
	next := append([]int(nil), t.Start[:t.Rows]...)
	for i := range m.Rows {
		cols, vals := m.Row(i)
		for k, c := range cols {
			t.Col[next[c]], t.Val[next[c]] = int32(i), vals[k]
			next[c]++
		}
	}
	return t
}
