package kernel

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// randomMatrix draws rows of zero to nine entries, some rows full of them.
func randomMatrix(rng *rand.Rand, rows, cols int) *csr.Matrix {
	var t csr.Triplets
	for i := range rows {
		if cols == 0 {
			break
		}
		for range rng.IntN(10) * rng.IntN(2) {
			t.Add(i, rng.IntN(cols), rng.NormFloat64()*math.Exp2(float64(rng.IntN(20)-10)))
		}
	}
	return t.Matrix(rows, cols)
}

// Mul has the bits of csr's Mul, whatever the ranges.
func TestMulIsTheObviousProduct(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng, n := drawRand(t), drawRows(t)
		m := rapid.IntRange(0, 3000).Draw(t, "columns")
		a := randomMatrix(rng, n, m)
		x, want, got := vector(rng, m), make([]float64, n), make([]float64, n)
		a.Mul(want, x)
		cut := rapid.IntRange(0, n).Draw(t, "cut")
		Mul(got, a, x, Range{cut, n})
		Mul(got, a, x, Range{0, cut})
		if !sameBits(got, want) {
			t.Fatalf("Mul of a %d×%d matrix cut at %d differs from csr", n, m, cut)
		}
	})
}

// AddMulT over ranges in order has the bits of csr's MulT.
func TestAddMulTIsTheObviousProduct(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng, n := drawRand(t), drawRows(t)
		m := rapid.IntRange(0, 3000).Draw(t, "columns")
		a := randomMatrix(rng, n, m)
		x, want, got := vector(rng, n), make([]float64, m), make([]float64, m)
		a.MulT(want, x)
		cut := rapid.IntRange(0, n).Draw(t, "cut")
		AddMulT(got, a, x, Range{0, cut})
		AddMulT(got, a, x, Range{cut, n})
		if !sameBits(got, want) {
			t.Fatalf("AddMulT of a %d×%d matrix cut at %d differs from csr", n, m, cut)
		}
	})
}

// ResidualRow keeps the bound of its comment, against exact arithmetic, also
// where nearly everything cancels.
func TestResidualRowIsDoublyExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng := drawRand(t)
		n := rapid.IntRange(0, 60).Draw(t, "entries")
		vals, x, cols := vector(rng, n), vector(rng, n), make([]int32, n)
		b := rng.NormFloat64()
		for k := range cols {
			cols[k] = int32(n - 1 - k)
			b += vals[k] * x[n-1-k]
		}
		exact, size := exactResidual(cols, vals, x, b)
		hi, lo, gotSize := ResidualRow(cols, vals, x, b)
		diff := new(big.Float).SetPrec(2000).Sub(exact, big.NewFloat(hi))
		diff.Sub(diff, big.NewFloat(lo))
		err, _ := diff.Float64()
		count := float64(n + 1)
		if bound := count * count * 0x1p-104 * size; math.Abs(err) > bound {
			t.Fatalf("ResidualRow of %d entries: %v + %v is off by %v, bound %v", n, hi, lo, err, bound)
		}
		if math.Abs(gotSize-size) > count*0x1p-52*size {
			t.Fatalf("ResidualRow of %d entries: size %v, want %v", n, gotSize, size)
		}
	})
}

// exactResidual is b − Σ vals·x without rounding, and the size of its terms.
func exactResidual(cols []int32, vals, x []float64, b float64) (*big.Float, float64) {
	sum, size := new(big.Float).SetPrec(2000).SetFloat64(b), math.Abs(b)
	for k, c := range cols {
		term := new(big.Float).SetPrec(2000).SetFloat64(vals[k])
		sum.Sub(sum, term.Mul(term, big.NewFloat(x[c])))
		size += math.Abs(vals[k] * x[c])
	}
	return sum, size
}
