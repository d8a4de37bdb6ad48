package precond

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// On the pattern of A, (I + L)·D·(I + U) equals A wherever no pivot was replaced.
func TestILU0MatchesOnThePattern(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawMatrix(t)
		f := ilu0(a, 0)
		if len(f.pivots) > 0 {
			t.Skip("pivots were replaced")
		}
		product, sizes := multiplied(f)
		for i := range a.Rows {
			cols, vals := a.Row(i)
			for k, c := range cols {
				at := i*a.Rows + int(c)
				if d := math.Abs(product[at] - vals[k]); !(d <= 1e-13*sizes[at]) {
					t.Fatalf("(L·D·U)(%d, %d) = %v, want %v", i, c, product[at], vals[k])
				}
			}
		}
	})
}

// multiplied returns (I + L)·D·(I + U) as a dense row-major matrix, and the sums
// of the sizes of what was added.
func multiplied(f ldu) (product, sizes []float64) {
	n := len(f.inverse)
	product, sizes = make([]float64, n*n), make([]float64, n*n)
	addRow := func(i, k int, l float64) {
		v := l / f.inverse[k]
		product[i*n+k] += v
		sizes[i*n+k] += math.Abs(v)
		cols, vals := f.upper.Row(k)
		for q, c := range cols {
			product[i*n+int(c)] += v * vals[q]
			sizes[i*n+int(c)] += math.Abs(v * vals[q])
		}
	}
	for i := range n {
		cols, vals := f.lower.Row(i)
		for q, c := range cols {
			addRow(i, int(c), vals[q])
		}
		addRow(i, i, 1)
	}
	return product, sizes
}

// A tridiagonal matrix has no fill: ILU(0) is its LU, and M⁻¹ its inverse.
func TestILU0OfTridiagonalIsExact(t *testing.T) {
	const n = 200
	var tr csr.Triplets
	g := vector(3*n, 5)
	for i := range n {
		tr.Add(i, i, 4+g[3*i])
		if i > 0 {
			tr.Add(i, i-1, g[3*i+1])
		}
		if i < n-1 {
			tr.Add(i, i+1, g[3*i+2])
		}
	}
	a := tr.Matrix(n, n)
	p, report := build(t, ILU0, a, Options{})
	x, b := vector(n, 6), make([]float64, n)
	a.Mul(b, x)
	for i, v := range solved(p, b) {
		if math.Abs(v-x[i]) > 1e-12*report.Growth*norm(x) {
			t.Fatalf("entry %d of M⁻¹·A·x is %v, want %v", i, v, x[i])
		}
	}
	if report.Misfit > 1e-13*report.Growth {
		t.Errorf("misfit %.2e of an exact factor", report.Misfit)
	}
}
