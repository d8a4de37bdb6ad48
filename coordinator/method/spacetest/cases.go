package spacetest

import (
	"math"
	"math/rand/v2"

	"rowstead/partition/csr"
)

// grid is a convection-diffusion operator on an nx×ny grid, by 5 points. Rows are
// multiplied by numbers between 10^−decades and 10^decades.
func grid(nx, ny int, decades float64, rng *rand.Rand) *csr.Matrix {
	var t csr.Triplets
	for y := range ny {
		for x := range nx {
			i := y*nx + x
			scale := math.Pow(10, decades*(2*rng.Float64()-1))
			add := func(ok bool, j int, v float64) {
				if ok {
					t.Add(i, j, v*scale)
				}
			}
			add(true, i, 4+rng.Float64())
			add(x > 0, i-1, -1.4)
			add(x < nx-1, i+1, -0.6)
			add(y > 0, i-nx, -1.2)
			add(y < ny-1, i+nx, -0.8)
		}
	}
	return t.Matrix(nx*ny, nx*ny)
}

// irregular has a few entries anywhere in a row. With gaps one row has no diagonal
// and one no entry at all.
func irregular(n int, gaps bool, rng *rand.Rand) *csr.Matrix {
	var t csr.Triplets
	for i := range n {
		if gaps && i == n/3 {
			continue
		}
		if !gaps || i != n/2 {
			t.Add(i, i, 3+rng.Float64())
		}
		for range 1 + rng.IntN(4) {
			t.Add(i, rng.IntN(n), rng.NormFloat64())
		}
	}
	return t.Matrix(n, n)
}

// definite is symmetric positive definite with a diagonal over several decades.
func definite(nx, ny int, rng *rand.Rand) *csr.Matrix {
	n := nx * ny
	d := make([]float64, n)
	for i := range d {
		d[i] = math.Pow(10, 3*(2*rng.Float64()-1))
	}
	var t csr.Triplets
	couple := func(i, j int) {
		v := -math.Sqrt(d[i] * d[j])
		t.Add(i, j, v)
		t.Add(j, i, v)
	}
	for y := range ny {
		for x := range nx {
			i := y*nx + x
			t.Add(i, i, 4.5*d[i])
			if x > 0 {
				couple(i, i-1)
			}
			if y > 0 {
				couple(i, i-nx)
			}
		}
	}
	return t.Matrix(n, n)
}

// Definite is a symmetric positive definite problem with a diagonal over several
// decades, scaled for conjugate gradients, with a guess.
func Definite(nx, ny int) Problem {
	rng := rand.New(rand.NewPCG(3, 5))
	p := Problem{Matrix: definite(nx, ny, rng), Symmetric: true}
	p.RowExponent = symmetricScale(p.Matrix)
	p.Right, p.Guess = normal(nx*ny, rng), normal(nx*ny, rng)
	return p
}

// normal draws n numbers.
func normal(n int, rng *rand.Rand) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = rng.NormFloat64()
	}
	return v
}

// rowScale returns e such that the largest entry of row i times 2^e is in [1, 2).
func rowScale(m *csr.Matrix) []int16 {
	e := make([]int16, m.Rows)
	for i := range e {
		_, vals := m.Row(i)
		if big := maxAbs(vals); big != 0 {
			e[i] = int16(-math.Ilogb(big))
		}
	}
	return e
}

// symmetricScale returns e such that aᵢᵢ·2^(2e) is in [1/2, 2).
func symmetricScale(m *csr.Matrix) []int16 {
	e := make([]int16, m.Rows)
	for i := range e {
		e[i] = int16(-((math.Ilogb(m.At(i, i)) + 1) >> 1))
	}
	return e
}

// byDiagonal returns the preconditioner that divides by the diagonal of D·A, or
// of S·A·S, which has no zero.
func byDiagonal(m *csr.Matrix, exponent []int16, symmetric bool) func(dst, src []float64) {
	d := make([]float64, m.Rows)
	for i := range d {
		e := int(exponent[i])
		if symmetric {
			e *= 2
		}
		d[i] = math.Ldexp(m.At(i, i), e)
	}
	return func(dst, src []float64) {
		for i := range dst {
			dst[i] = src[i] / d[i]
		}
	}
}

func copyMatrix(m *csr.Matrix) *csr.Matrix {
	c := *m
	c.Start = append([]int(nil), m.Start...)
	c.Col = append([]int32(nil), m.Col...)
	c.Val = append([]float64(nil), m.Val...)
	return &c
}
