// Package problems makes the test problems of the project from formulas: model
// systems of a known kind of difficulty, and systems whose answer is known in
// closed form or has been published. Tests of several packages and the
// benchmarks draw on it.
//
// Unknowns on a grid are numbered with the last axis running fastest: node
// (i, j) of an m×m grid is i·m + j. Random problems take a seed, and the same
// seed gives the same bits on every machine; deterministic ones do so because
// every product that is added to something is rounded first. Each call makes a
// new matrix, which is the caller's. A size that makes no sense (m < 1) panics.
package problems

import (
	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// NormalVector returns n independent standard normal numbers, the right side of
// most trials. Number i depends on (seed, i) alone.
func NormalVector(n int, seed uint64) []float64 {
	s := fixed.NewStream(seed, streamVector)
	v := make([]float64, n)
	for i := range v {
		v[i] = s.Normal(i)
	}
	return v
}

// Numbers of the streams drawn from one seed, so that no two uses share one.
const (
	streamVector = iota
	streamField
	streamSource
	streamTarget
	streamLocal
	streamReach
	streamConductance
	streamGround
	streamGroundValue
	streamGainRow
	streamGainReach
	streamGainValue
	streamRowScale
	streamBlocks
)

// rows grows a matrix row by row; entries of a row must come in ascending
// columns.
type rows struct{ m *csr.Matrix }

func newRows(n, cols, entries int) rows {
	if n < 1 || cols < 1 {
		panic("problems: a problem needs at least one unknown")
	}
	start := make([]int, 1, n+1)
	return rows{&csr.Matrix{Rows: n, Cols: cols, Start: start, Col: make([]int32, 0, entries), Val: make([]float64, 0, entries)}}
}

func (r rows) add(col int, v float64) {
	r.m.Col, r.m.Val = append(r.m.Col, int32(col)), append(r.m.Val, v)
}

func (r rows) end() { r.m.Start = append(r.m.Start, len(r.m.Col)) }

// shiftDiagonal subtracts c from the diagonal, which must be stored in full.
func shiftDiagonal(a *csr.Matrix, c float64) *csr.Matrix {
	for i := range a.Rows {
		cols, vals := a.Row(i)
		for k, col := range cols {
			if int(col) == i {
				vals[k] -= c
			}
		}
	}
	return a
}
