package small

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// lowRank is an s×k product of s×r and r×k noise.
func lowRank(seed uint64, s, k, r int) []float64 {
	a, b, m := tall(seed, s, r), tall(seed+1, r, k), make([]float64, s*k)
	for j := range k {
		for i := range r {
			subtract(m[j*s:(j+1)*s], a[i*s:(i+1)*s], -b[j*r+i])
		}
	}
	return m
}

// Whatever the shape and the rank, y is the shortest minimiser: that of the
// pseudo-inverse from gonum's singular values.
func TestLeastSquaresIsThePseudoInverse(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s, k := rapid.IntRange(1, 25).Draw(t, "s"), rapid.IntRange(1, 25).Draw(t, "k")
		r := rapid.IntRange(1, min(s, k)).Draw(t, "r")
		scale := math.Ldexp(1, rapid.SampledFrom([]int{0, -900, 900}).Draw(t, "scale"))
		seed := rapid.Uint64().Draw(t, "seed")
		m, c := lowRank(seed, s, k, r), tall(seed+2, s, 1)
		var svd mat.SVD
		svd.Factorize(mat.NewDense(k, s, append([]float64(nil), m...)).T(), mat.SVDThin)
		values := svd.Values(nil)
		condition := values[0] / values[r-1]
		if condition > 1e6 {
			t.Skip("rank in doubt")
		}
		var want mat.Dense
		svd.SolveTo(&want, mat.NewDense(s, 1, append([]float64(nil), c...)), r)
		rest := append([]float64(nil), c...)
		for j := range k {
			subtract(rest, m[j*s:(j+1)*s], want.At(j, 0))
		}
		scaleBy(m, scale)
		y, rho, rank := LeastSquares(m, append([]float64(nil), c...), s, k)
		if rank != r {
			t.Fatalf("rank = %d, want %d", rank, r)
		}
		limit := 1e3 * eps * condition * condition * (1 + mat.Norm(&want, 2))
		for i := range y {
			if math.Abs(y[i]*scale-want.At(i, 0)) > limit {
				t.Fatalf("y[%d] = %g, want %g", i, y[i]*scale, want.At(i, 0))
			}
		}
		if math.Abs(rho-norm(rest)) > limit {
			t.Fatalf("rho = %g, want %g", rho, norm(rest))
		}
	})
}

func TestLeastSquaresEdges(t *testing.T) {
	if y, rho, rank := LeastSquares(make([]float64, 6), []float64{3, 0, 4}, 3, 2); rank != 0 || rho != 5 || y[0] != 0 || y[1] != 0 {
		t.Errorf("zero matrix: y %v, rho %g, rank %d; want 0, 5, 0", y, rho, rank)
	}
	if y, rho, rank := LeastSquares([]float64{2}, []float64{6}, 1, 1); rank != 1 || rho != 0 || y[0] != 3 {
		t.Errorf("1×1: y %v, rho %g, rank %d; want 3, 0, 1", y, rho, rank)
	}
	// Columns (1, δ, 0), (1, 0, δ) (Läuchli) with δ² below rounding: the normal
	// equations are singular, the answer for c = M·(1, 2) is not.
	const d = 1e-9
	m := []float64{1, d, 0, 1, 0, d}
	y, rho, rank := LeastSquares(m, []float64{3, d, 2 * d}, 3, 2)
	if rank != 2 || rho > 10*eps || math.Abs(y[0]-1) > 1e-6 || math.Abs(y[1]-2) > 1e-6 {
		t.Errorf("Läuchli: y %v, rho %g, rank %d; want 1, 2", y, rho, rank)
	}
}

func BenchmarkLeastSquares(b *testing.B) {
	m, c := tall(1, 1000, 300), tall(2, 1000, 1)
	n, d := make([]float64, len(m)), make([]float64, len(c))
	for b.Loop() {
		copy(n, m)
		copy(d, c)
		LeastSquares(n, d, 1000, 300)
	}
	flops := 2.0 * 300 * 300 * (1000 - 100)
	b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GFlop/s")
}
