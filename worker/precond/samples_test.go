package precond

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// grid7 is −Δu + (40, 20, 10)·∇u by central differences on an m³ grid, rows
// divided by their largest entry.
func grid7(m int) *csr.Matrix {
	h := 1 / float64(m+1)
	var t csr.Triplets
	at := func(x, y, z int) int { return (z*m+y)*m + x }
	wind := [3]float64{40, 20, 10}
	for z := range m {
		for y := range m {
			for x := range m {
				i, p := at(x, y, z), [3]int{x, y, z}
				t.Add(i, i, 1)
				for d, step := range [3]int{1, m, m * m} {
					if p[d] > 0 {
						t.Add(i, i-step, (-1-wind[d]*h/2)/6)
					}
					if p[d] < m-1 {
						t.Add(i, i+step, (-1+wind[d]*h/2)/6)
					}
				}
			}
		}
	}
	return t.Matrix(m*m*m, m*m*m)
}

// plane5 is −Δu + (vx, vy)·∇u on an m×m grid, upwind differences, rows divided
// by their diagonal.
func plane5(m int, vx, vy float64) *csr.Matrix {
	h := 1 / float64(m+1)
	diagonal := 4 + h*(math.Abs(vx)+math.Abs(vy))
	var t csr.Triplets
	for y := range m {
		for x := range m {
			i := y*m + x
			t.Add(i, i, 1)
			for _, n := range []struct {
				inside bool
				j      int
				wind   float64
			}{{x > 0, i - 1, vx}, {x < m-1, i + 1, -vx}, {y > 0, i - m, vy}, {y < m-1, i + m, -vy}} {
				if n.inside {
					t.Add(i, n.j, -(1+h*max(n.wind, 0))/diagonal)
				}
			}
		}
	}
	return t.Matrix(m*m, m*m)
}

// sparse draws an n×n matrix with a few entries a row. dominant is the size of
// the diagonal in units of the row's other entries; 0 draws it like them, and
// then it may be missing.
func sparse(n, row int, dominant float64, seed uint64) *csr.Matrix {
	g := rand.New(rand.NewPCG(seed, 1))
	var t csr.Triplets
	for i := range n {
		sum := 0.0
		for range row {
			if j := g.IntN(n); j != i {
				v := g.NormFloat64()
				sum += math.Abs(v)
				t.Add(i, j, v)
			}
		}
		switch {
		case dominant > 0:
			t.Add(i, i, math.Copysign(dominant*sum+1, g.NormFloat64()))
		case g.IntN(2) == 0:
			t.Add(i, i, g.NormFloat64())
		}
	}
	return t.Matrix(n, n)
}

// drawMatrix draws a small matrix of any kind, dominant or not.
func drawMatrix(t *rapid.T) *csr.Matrix {
	return sparse(rapid.IntRange(0, 60).Draw(t, "rows"), rapid.IntRange(0, 6).Draw(t, "row entries"),
		rapid.SampledFrom([]float64{0, 0, 0.5, 1.5}).Draw(t, "dominance"), rapid.Uint64().Draw(t, "seed"))
}

// vector draws a vector of n normal numbers.
func vector(n int, seed uint64) []float64 {
	g := rand.New(rand.NewPCG(seed, 2))
	v := make([]float64, n)
	for i := range v {
		v[i] = g.NormFloat64()
	}
	return v
}

func dot(x, y []float64) float64 {
	s := 0.0
	for i, v := range x {
		s += v * y[i]
	}
	return s
}

func norm(x []float64) float64 { return math.Sqrt(dot(x, x)) }

// build is Build for cases that must not fail.
func build(t testing.TB, kind string, a *csr.Matrix, o Options) (Preconditioner, Report) {
	t.Helper()
	p, r, err := Build(kind, a, o)
	if err != nil {
		t.Fatalf("Build(%q, %d rows, %+v): %v", kind, a.Rows, o, err)
	}
	return p, r
}

// sameBits says where two vectors differ, or nothing.
func sameBits(got, want []float64) string {
	for i := range want {
		if math.Float64bits(got[i]) != math.Float64bits(want[i]) {
			return fmt.Sprintf("entry %d is %v, want %v to the bit", i, got[i], want[i])
		}
	}
	return ""
}

// explicit is an n×n matrix of (row, column, value).
func explicit(n int, entries ...[3]float64) *csr.Matrix {
	var t csr.Triplets
	for _, e := range entries {
		t.Add(int(e[0]), int(e[1]), e[2])
	}
	return t.Matrix(n, n)
}
