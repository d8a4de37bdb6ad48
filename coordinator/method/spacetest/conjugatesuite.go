package spacetest

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/method"
)

// ConjugateFactory makes the space under test, as Factory does; p.Symmetric is
// true and p.RowExponent has S with a diagonal of S·A·S in [1/2, 2).
type ConjugateFactory func(t *testing.T, p Problem, diagonal bool) method.ConjugateSpace

// ConjugateSuite runs the laws of method.ConjugateSpace: conjugate gradients take
// the steps of the twin to rounding, and their answer has the residual that they
// say.
func ConjugateSuite(t *testing.T, rows int, make ConjugateFactory) {
	const side = 37
	p := Definite(side, rows/side+1)
	for _, diagonal := range []bool{false, true} {
		name := "plain"
		if diagonal {
			name = "diagonal"
			p.Apply = byDiagonal(p.Matrix, p.RowExponent, true)
		}
		t.Run(name, func(t *testing.T) {
			mine := p
			mine.Matrix = copyMatrix(p.Matrix)
			want := conjugateSteps(t, New(p), 12)
			got := conjugateSteps(t, make(t, mine, diagonal), 12)
			for i, w := range want {
				if !(math.Abs(got[i]-w) <= 1e-9*math.Abs(w)) {
					t.Errorf("number %d of the steps: got %v, want %v", i, got[i], w)
				}
			}
			mine.Matrix = copyMatrix(p.Matrix)
			sp := make(t, mine, diagonal)
			conjugateSteps(t, sp, 200)
			if r := must(sp.Check(context.Background()))(t); !(r.True <= 1e-10*r.Right) {
				t.Errorf("200 steps leave %g of %g", r.True, r.Right)
			}
		})
	}
}

// conjugateSteps takes steps of conjugate gradients and returns all scalars and
// the norms of the residual in the end.
func conjugateSteps(t *testing.T, sp method.ConjugateSpace, steps int) (all []float64) {
	t.Helper()
	ctx := context.Background()
	rr, rz, err := sp.StartConjugate(ctx)
	all = append(all, rr, rz)
	beta := 0.0
	for range steps {
		if err != nil {
			t.Fatal(err)
		}
		if rr == 0 {
			break
		}
		pq := must(sp.Direct(ctx, beta))(t)
		old := rz
		rr, rz, err = sp.Move(ctx, rz/pq)
		beta = rz / old
		all = append(all, pq, rr, rz)
	}
	r := must(sp.Check(ctx))(t)
	return append(all, r.Inner, r.True, r.Scaled, r.Solution, r.SolutionMax, r.MatrixMax, r.InnerMatrix, r.TrueFloor, r.ScaledRight)
}
