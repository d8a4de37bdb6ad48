package spacetest

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/partition/csr"
)

var (
	_ method.Space          = (*Simple)(nil)
	_ method.ConjugateSpace = (*Simple)(nil)
)

// line is the n×n matrix of −u″ with the given off-diagonals.
func line(n int, below, above float64) *csr.Matrix {
	var t csr.Triplets
	for i := range n {
		if i > 0 {
			t.Add(i, i-1, below)
		}
		t.Add(i, i, 2)
		if i < n-1 {
			t.Add(i, i+1, above)
		}
	}
	return t.Matrix(n, n)
}

func ones(n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = 1
	}
	return v
}

// Arnoldi by hand on a small system: full window, exact least squares on a
// square Hessenberg matrix, gives the solution after n steps.
func TestSimpleSolvesByFullArnoldi(t *testing.T) {
	const n = 12
	ctx := context.Background()
	s := New(Problem{Matrix: line(n, -1.5, -0.5), Right: ones(n), RowExponent: make([]int16, n)})
	res, err := s.Start(ctx, method.Cycle{Seed: 1, SketchRows: 64, Zeta: 4, Capacity: n + 1, Window: n, Form: method.Double})
	if err != nil {
		t.Fatal(err)
	}
	beta := res.Inner
	step := method.Step{Norm: beta, Product: true, Dots: n}
	hess := make([][]float64, n+1)
	for i := range hess {
		hess[i] = make([]float64, n)
	}
	for j := range n {
		out, err := s.Advance(ctx, step)
		if err != nil {
			t.Fatal(err)
		}
		again, ww, err := s.Reduce(ctx, out.Dots)
		if err != nil {
			t.Fatal(err)
		}
		for i, h := range out.Dots {
			hess[i][j] = h + again[i]
		}
		hess[j+1][j] = math.Sqrt(ww)
		step = method.Step{Lo: 0, H: again, Norm: math.Sqrt(ww), Product: true, Dots: n}
	}
	y := solveSquare(hess[:n], beta)
	got, _, err := s.Correct(ctx, method.Correction{Y: y})
	if err != nil || got.True > 1e-12*got.Right {
		t.Fatalf("Correct: true residual %g of %g, %v", got.True, got.Right, err)
	}
}

// solveSquare solves H·y = beta·e₁ by Gaussian elimination with row exchanges.
func solveSquare(h [][]float64, beta float64) []float64 {
	n := len(h)
	y := make([]float64, n)
	y[0] = beta
	for k := range n {
		p := k
		for i := k; i < n; i++ {
			if math.Abs(h[i][k]) > math.Abs(h[p][k]) {
				p = i
			}
		}
		h[k], h[p], y[k], y[p] = h[p], h[k], y[p], y[k]
		for i := k + 1; i < n; i++ {
			f := h[i][k] / h[k][k]
			for j := k; j < n; j++ {
				h[i][j] -= f * h[k][j]
			}
			y[i] -= f * y[k]
		}
	}
	for k := n - 1; k >= 0; k-- {
		for j := k + 1; j < n; j++ {
			y[k] -= h[k][j] * y[j]
		}
		y[k] /= h[k][k]
	}
	return y
}

func TestSimpleConjugateGradients(t *testing.T) {
	const n = 40
	ctx := context.Background()
	exps := make([]int16, n)
	for i := range exps {
		exps[i] = int16(i % 3)
	}
	s := New(Problem{Matrix: line(n, -1, -1), Right: ones(n), RowExponent: exps, Symmetric: true})
	_, rz, _ := s.StartConjugate(ctx)
	beta := 0.0
	for range 3 * n {
		pq, _ := s.Direct(ctx, beta)
		rr, next, _ := s.Move(ctx, rz/pq)
		if rr < 1e-28 {
			break
		}
		beta, rz = next/rz, next
	}
	if got, _ := s.Check(ctx); got.True > 1e-12*got.Right {
		t.Errorf("true residual %g of %g", got.True, got.Right)
	}
}

func TestSimpleSuite(t *testing.T) {
	Suite(t, 600, func(_ *testing.T, p Problem, _ bool) method.Space { return New(p) })
}

func TestSimpleConjugateSuite(t *testing.T) {
	ConjugateSuite(t, 400, func(_ *testing.T, p Problem, _ bool) method.ConjugateSpace { return New(p) })
}
