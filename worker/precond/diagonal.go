package precond

import (
	"math"

	"rowstead/partition/csr"
)

// pivotFloor is the size below which a pivot counts as zero, in units of the
// largest entry of its row.
const pivotFloor = 1e-8

// pivotsNamed is how many replaced pivots a Report names.
const pivotsNamed = 8

// rowwise is z = inverse∘r, the diagonal preconditioner; with inverse nil z = r.
type rowwise struct {
	rows    int
	inverse []float64 // length rows, or nil
	cuts    []int     // first rows of the parts, and rows
}

// makeNone is the recipe of z = r.
func makeNone(a *csr.Matrix, o Options, r *Report) (Preconditioner, string) {
	r.PositiveDefinite = o.Symmetric
	r.Growth = 1
	return newRowwise(a.Rows, nil, o, r), ""
}

// makeDiagonal is the recipe of z = r/diag(A). A diagonal entry below
// pivotFloor times the largest entry of its row gives way to that largest
// entry, with the sign of the diagonal entry, or 1 in an empty row.
func makeDiagonal(a *csr.Matrix, o Options, r *Report) (Preconditioner, string) {
	inverse := make([]float64, a.Rows)
	r.PositiveDefinite = o.Symmetric
	for i := range inverse {
		from, to := columnRange(a, i, 0, a.Rows)
		largest := maxAbs(a.Val[from:to])
		d := a.At(i, i)
		if math.Abs(d) < pivotFloor*largest || largest == 0 {
			r.replaced(i)
			d = math.Copysign(orOne(largest), d)
		}
		r.PositiveDefinite = r.PositiveDefinite && d > 0
		r.Growth = max(r.Growth, orOne(largest)/math.Abs(d))
		inverse[i] = 1 / d
		if math.IsNaN(inverse[i]) || math.IsInf(inverse[i], 0) {
			return nil, "a diagonal entry has no inverse in 64 bits"
		}
	}
	r.Entries = a.Rows
	return newRowwise(a.Rows, inverse, o, r), ""
}

// newRowwise cuts the rows into the parts that a factor of them would have.
func newRowwise(rows int, inverse []float64, o Options, r *Report) *rowwise {
	blocks := blockCuts(rows, o)
	r.Blocks = len(blocks) - 1
	p := &rowwise{rows: rows, inverse: inverse}
	for _, b := range partCuts(r.Blocks, o) {
		p.cuts = append(p.cuts, blocks[b])
	}
	return p
}

func (p *rowwise) Apply(z, r []float64) {
	checkLengths(p.rows, z, r)
	p.rowsOf(z, r, 0, p.rows)
}

func (p *rowwise) ApplyTransposed(z, r []float64) { p.Apply(z, r) }

func (p *rowwise) Parts() int { return len(p.cuts) - 1 }

func (p *rowwise) ApplyPart(z, r []float64, part int) {
	checkLengths(p.rows, z, r)
	p.rowsOf(z, r, p.cuts[part], p.cuts[part+1])
}

func (p *rowwise) Bytes() int64 { return 8 * int64(len(p.inverse)+len(p.cuts)) }

// rowsOf forms the rows [lo, hi) of z.
func (p *rowwise) rowsOf(z, r []float64, lo, hi int) {
	z, r = z[lo:hi], r[lo:hi]
	if p.inverse == nil {
		copy(z, r)
		return
	}
	inverse := p.inverse[lo:hi]
	for i, v := range inverse {
		z[i] = v * r[i]
	}
}

// checkLengths panics unless both vectors have the length of the row block.
func checkLengths(rows int, z, r []float64) {
	if len(z) != rows || len(r) != rows {
		panic("precond: a vector has not the length of the row block")
	}
}

// replaced notes a replaced pivot.
func (r *Report) replaced(row int) {
	r.PivotCount++
	if len(r.Pivots) < pivotsNamed {
		r.Pivots = append(r.Pivots, row)
	}
}

// maxAbs is the largest absolute value, 0 for none.
func maxAbs(v []float64) float64 {
	m := 0.0
	for _, x := range v {
		m = max(m, math.Abs(x))
	}
	return m
}

// orOne is v, or 1 where v is zero.
func orOne(v float64) float64 {
	if v == 0 {
		return 1
	}
	return v
}
