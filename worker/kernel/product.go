package kernel

import (
	"math"

	"rowstead/partition/csr"
)

// Mul forms y[r] = (A·x)[r]. len(x) = Cols, len(y) = Rows. Each row is summed
// in column order from zero, so it has the bits of csr's Mul. a has passed its
// Check: a column beyond Cols is read without one.
func Mul(y []float64, a *csr.Matrix, x []float64, r Range) {
	if len(x) != a.Cols || len(y) != a.Rows {
		panic("kernel: lengths disagree in Mul")
	}
	ends := a.Start[r.Lo+1 : r.Hi+1]
	out, first := y[r.Lo:r.Hi], a.Start[r.Lo]
	if len(ends) > 0 {
		last := ends[len(ends)-1]
		mul(out, ends, a.Col[:last], a.Val[:last], x, first)
	}
}

// mulGo is mul in plain Go: out[i] = row i of A·x, with entries from the end of
// the row before, from first for row 0, to ends[i].
func mulGo(out []float64, ends []int, col []int32, val, x []float64, first int) {
	// Cutting columns and values to the row leaves bounds checks on x alone.
	out = out[:len(ends)]
	k := first
	for i, e := range ends {
		cols, vals := col[k:e], val[k:e]
		vals = vals[:len(cols)]
		sum := 0.0
		for j, c := range cols {
			sum += float64(vals[j] * x[c])
		}
		out[i], k = sum, e
	}
}

// AddMulT adds (A[r, :])ᵀ·x[r] to y, row by row. len(x) = Rows, len(y) = Cols.
// It scatters over all of y: ranges that share a y go one after the other, in
// order, for the same bits.
func AddMulT(y []float64, a *csr.Matrix, x []float64, r Range) {
	if len(x) != a.Rows || len(y) != a.Cols {
		panic("kernel: lengths disagree in AddMulT")
	}
	k := a.Start[r.Lo]
	ends := a.Start[r.Lo+1 : r.Hi+1]
	xs := x[r.Lo:r.Hi]
	xs = xs[:len(ends)]
	for i, e := range ends {
		cols, vals := a.Col[k:e], a.Val[k:e]
		vals = vals[:len(cols)]
		xi := xs[i]
		for j, c := range cols {
			y[c] += float64(vals[j] * xi)
		}
		k = e
	}
}

// ResidualRow returns b − Σ vals[k]·x[cols[k]] as the unevaluated sum hi + lo,
// with about twice the digits of float64, and the size of its terms,
// |b| + Σ |vals[k]|·|x[cols[k]]|. The error of hi + lo is below
// (len(cols)+1)²·2⁻¹⁰⁴·size. Dot2 of Ogita, Rump and Oishi, "Accurate sum and
// dot product" (SIAM J. Sci. Comput. 26, 2005), products split by FMA.
func ResidualRow(cols []int32, vals, x []float64, b float64) (hi, lo, size float64) {
	vals = vals[:len(cols)]
	hi, size = b, math.Abs(b)
	for k, c := range cols {
		v, xc := -vals[k], x[c]
		product := float64(v * xc)
		rest := math.FMA(v, xc, -product)
		size += math.Abs(product)
		// hi + product = sum + slip exactly (Knuth's two-sum).
		sum := hi + product
		part := sum - hi
		slip := (hi - (sum - part)) + (product - part)
		hi = sum
		lo += slip + rest
	}
	sum := hi + lo
	return sum, lo - (sum - hi), size
}
