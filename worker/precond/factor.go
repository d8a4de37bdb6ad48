package precond

import (
	"math"

	"rowstead/partition/csr"
)

// ldu is the factor of one sub-block, (I + L)·D·(I + U): L strictly lower, U
// strictly upper, columns ascending and counted from the sub-block's first row.
// Dividing the rows of U by the pivots keeps the division out of the chain from
// one row of a solve to the next.
type ldu struct {
	lower, upper *csr.Matrix
	inverse      []float64 // D⁻¹
	pivots       []int     // rows of the sub-block whose pivot was replaced
	positive     bool      // every pivot is positive
	shift        float64   // α, if the diagonal was raised
	broken       bool      // a pivot is not a finite number with an inverse
}

// triangle holds the rows of a strict triangle in the order in which a solve
// takes them. Entry k of the t-th row taken lies in [end[t−1], end[t]); columns
// count from the part's first row. In a row the column solved last comes last,
// so that the other products are done before it is known.
type triangle[F float32 | float64] struct {
	end []int
	col []int32
	val []F
}

// part is a run of neighbouring sub-blocks that one thread solves row by row in
// turn: their rows i, i = 0, 1, …, one sub-block after the other.
type part[F float32 | float64] struct {
	lo, hi       int  // its rows in the row block
	long         bool // rows are long: sum them in two strands
	order        []int32
	lower, upper triangle[F] // upper in the reverse of order
	inverse      []float64   // D⁻¹, in the reverse of order too
}

// factored applies z = (I + U)⁻¹·D⁻¹·(I + L)⁻¹·r part by part.
type factored[F float32 | float64] struct {
	rows  int
	parts []part[F]
}

func (f *factored[F]) Apply(z, r []float64) {
	for p := range f.parts {
		f.ApplyPart(z, r, p)
	}
	checkLengths(f.rows, z, r)
}

func (f *factored[F]) ApplyPart(z, r []float64, p int) {
	checkLengths(f.rows, z, r)
	f.parts[p].solve(z, r)
}

func (f *factored[F]) ApplyTransposed(z, r []float64) {
	checkLengths(f.rows, z, r)
	for p := range f.parts {
		f.parts[p].solveTransposed(z, r)
	}
}

func (f *factored[F]) Parts() int { return len(f.parts) }

func (f *factored[F]) Bytes() int64 {
	var one F
	size := int64(4)
	if _, double := any(one).(float64); double {
		size = 8
	}
	n := int64(0)
	for _, p := range f.parts {
		n += int64(len(p.order))*4 + int64(len(p.inverse))*8
		for _, t := range []triangle[F]{p.lower, p.upper} {
			n += int64(len(t.end))*8 + int64(len(t.col))*4 + int64(len(t.val))*size
		}
	}
	return n
}

// pack lays the factors of neighbouring sub-blocks out as one part; lo is its
// first row. The factors are not kept.
func pack[F float32 | float64](lo int, blocks []ldu) part[F] {
	p := part[F]{lo: lo, hi: lo}
	offset := make([]int, len(blocks)) // of a sub-block's first row in the part
	longest, lower, upper := 0, 0, 0
	for b, f := range blocks {
		offset[b] = p.hi - lo
		p.hi += len(f.inverse)
		longest = max(longest, len(f.inverse))
		lower, upper = lower+f.lower.Entries(), upper+f.upper.Entries()
	}
	p.order = make([]int32, 0, p.hi-lo)
	p.inverse = make([]float64, 0, p.hi-lo)
	p.lower = newTriangle[F](p.hi-lo, lower)
	p.upper = newTriangle[F](p.hi-lo, upper)
	for i := range longest {
		for b, f := range blocks {
			if i < len(f.inverse) {
				p.order = append(p.order, int32(offset[b]+i))
				p.lower.take(f.lower, i, offset[b], false)
			}
		}
	}
	for i := longest - 1; i >= 0; i-- {
		for b := len(blocks) - 1; b >= 0; b-- {
			if i < len(blocks[b].inverse) {
				p.upper.take(blocks[b].upper, i, offset[b], true)
				p.inverse = append(p.inverse, blocks[b].inverse[i])
			}
		}
	}
	return p
}

// newTriangle has room for so many rows and entries.
func newTriangle[F float32 | float64](rows, entries int) triangle[F] {
	return triangle[F]{end: make([]int, 0, rows), col: make([]int32, 0, entries), val: make([]F, 0, entries)}
}

// take appends row i of m, its columns moved by offset, in reverse if descending.
func (t *triangle[F]) take(m *csr.Matrix, i, offset int, descending bool) {
	cols, vals := m.Row(i)
	for k := range cols {
		if descending {
			k = len(cols) - 1 - k
		}
		t.col = append(t.col, cols[k]+int32(offset))
		t.val = append(t.val, F(vals[k]))
	}
	t.end = append(t.end, len(t.col))
}

// invert stores the inverse of pivot d of row i, after replacing one below
// pivotFloor·scale by instead·scale with its sign, and returns the inverse.
// scale is the size of the row's entries; 0 makes the pivot 1.
func (f *ldu) invert(i int, d, scale, instead float64) float64 {
	if math.Abs(d) < pivotFloor*scale || d == 0 || scale == 0 {
		f.pivots = append(f.pivots, i)
		size := 1.0
		if scale > 0 {
			size = instead * scale
		}
		d = math.Copysign(size, d)
	}
	v := 1 / d
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		f.broken = true
	}
	f.positive = f.positive && d > 0
	f.inverse[i] = v
	return v
}
