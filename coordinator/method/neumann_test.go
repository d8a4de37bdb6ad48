package method_test

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
	"rowstead/worker/precond"
)

// neumann is the five-point graph Laplacian of an m×m grid: constants are its
// null space, so that A·x = b has answers only if b sums to zero.
func neumann(m int) *csr.Matrix {
	t := &csr.Triplets{}
	link := func(a, b int) {
		t.Add(a, a, 1)
		t.Add(b, b, 1)
		t.Add(a, b, -1)
		t.Add(b, a, -1)
	}
	for i := range m {
		for j := range m {
			if i+1 < m {
				link(i*m+j, (i+1)*m+j)
			}
			if j+1 < m {
				link(i*m+j, i*m+j+1)
			}
		}
	}
	return t.Matrix(m*m, m*m)
}

func TestNeumann(t *testing.T) {
	a := neumann(100)
	random := problems.NormalVector(a.Rows, 5)
	for _, c := range []struct {
		name string
		b    []float64
		met  bool
	}{
		{"consistent", product(a, random), true},
		{"inconsistent", random, false},
	} {
		for _, kind := range []string{method.Sketched, method.Orthogonal} {
			sp := place(t, a, c.b, 2, precond.None)
			res, err := method.Solve(context.Background(), sp, method.Options{Method: kind})
			if err != nil {
				t.Fatal(err)
			}
			t.Logf("%s, %s: met %v %q, %d products, true %.2e", c.name, kind, res.Met, res.Reason, res.Products, res.Residuals.TrueResidual())
			if testing.Verbose() {
				for _, e := range res.Story {
					t.Log(e)
				}
			}
			honest(t, c.name, a, c.b, sp.Solution(), res, 1e-8)
			if res.Met != c.met {
				t.Errorf("%s, %s: met %v (%q), want %v", c.name, kind, res.Met, res.Reason, c.met)
			}
			// No x lowers the part of b along the constants.
			if floor := math.Abs(mean(c.b)) / norm(c.b) * math.Sqrt(float64(a.Rows)); !c.met && res.Residuals.TrueResidual() > 1.25*floor {
				t.Errorf("%s, %s: residual %.3e left, the floor is %.3e", c.name, kind, res.Residuals.TrueResidual(), floor)
			}
		}
	}
}

func mean(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x
	}
	return sum / float64(len(v))
}

func norm(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x * x
	}
	return math.Sqrt(sum)
}
