package method_test

import (
	"context"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/partition/samples/problems"
	"rowstead/worker/precond"
)

// Every form of the basis meets the tolerance over real row blocks. Single
// precision may take up to twice the products, replay about twice.
func TestBasisForms(t *testing.T) {
	for _, c := range []struct {
		name string
		form method.BasisForm
		most float64
	}{
		{"single", method.Single, 2}, {"replay", method.Replay, 3.5},
	} {
		for _, kind := range []string{precond.None, precond.ILU0} {
			a := problems.ConvectionDiffusion2D(80, 60, 20, problems.Upwind)
			b := problems.NormalVector(a.Rows, 5)
			var products [2]int
			for i, form := range []method.BasisForm{method.Double, c.form} {
				sp := place(t, a, b, 3, kind)
				res, err := method.Solve(context.Background(), sp, method.Options{Method: method.Sketched, Form: form})
				if err != nil || !res.Met {
					t.Fatalf("%s, %s: met %v %q, %v", form, kind, res.Met, res.Reason, err)
				}
				products[i] = res.Products
			}
			t.Logf("%s, %s: %d products, %d in double", c.name, kind, products[1], products[0])
			if float64(products[1]) > c.most*float64(products[0]) {
				t.Errorf("%s, %s: %d products, want at most %.1f times the %d in double", c.name, kind, products[1], c.most, products[0])
			}
		}
	}
}
