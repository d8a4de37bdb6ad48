package precond

import (
	"slices"
	"strings"
	"testing"

	"rowstead/partition/csr"
)

// products counts the products that right-preconditioned BiCGSTAB takes from
// x = 0 until its residual norm is below 1e-8 of b's, or limit. Saad, Iterative
// Methods for Sparse Linear Systems, 2nd ed., algorithm 7.7. It checks the true
// residual at the end.
func products(t *testing.T, a *csr.Matrix, m Preconditioner, b []float64, limit int) int {
	t.Helper()
	n := a.Rows
	x, r, shadow, p := make([]float64, n), slices.Clone(b), slices.Clone(b), slices.Clone(b)
	z, v, w := make([]float64, n), make([]float64, n), make([]float64, n)
	count, rho := 0, dot(r, shadow)
	for ; count < limit && norm(r) > 1e-8*norm(b); count += 2 {
		m.Apply(z, p)
		a.Mul(v, z)
		alpha := rho / dot(v, shadow)
		subtract(x, -alpha, z)
		subtract(r, alpha, v)
		m.Apply(z, r)
		a.Mul(w, z)
		omega := dot(w, r) / dot(w, w)
		subtract(x, -omega, z)
		subtract(r, omega, w)
		next := dot(r, shadow)
		beta := next / rho * alpha / omega
		rho = next
		for i := range p {
			p[i] = r[i] + beta*(p[i]-omega*v[i])
		}
	}
	a.Mul(v, x)
	subtract(v, 1, b)
	if count < limit && !(norm(v) <= 1e-7*norm(b)) {
		t.Errorf("the true residual after %d products is %.1e of b", count, norm(v)/norm(b))
	}
	return count
}

// subtract sets w ← w − s·v.
func subtract(w []float64, s float64, v []float64) {
	for i := range w {
		w[i] -= s * v[i]
	}
}

func TestFactorsSaveProducts(t *testing.T) {
	m := 150
	if testing.Short() {
		m = 50
	}
	for _, c := range []struct {
		name      string
		a         *csr.Matrix
		symmetric bool
	}{
		{"convection and diffusion", plane5(m, 100, 50), false},
		{"Poisson", plane5(80*m/150, 0, 0), true},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := vector(c.a.Rows, 7)
			const limit = 2000
			counts := map[string]int{}
			for _, kind := range []string{None, ILU0, ILUT} {
				p, report := build(t, kind, c.a, Options{SubBlocks: 4, Symmetric: c.symmetric})
				if report.Kind != kind || report.PivotCount > 0 || report.PositiveDefinite != c.symmetric {
					t.Fatalf("%s: %+v", kind, report)
				}
				counts[kind] = products(t, c.a, p, b, limit)
			}
			t.Logf("products with 4 sub-blocks: %v", counts)
			// A loose form of what is measured: 462, 118, 48 and 348, 130, 62.
			if counts[None] == limit || counts[ILU0]*2 > counts[None] || counts[ILUT]*4 > counts[ILU0]*3 {
				t.Errorf("products %v: ilu0 must halve those of none, ilut take a quarter off those of ilu0", counts)
			}
			single, _ := build(t, ILU0, c.a, Options{SubBlocks: 4, Symmetric: c.symmetric, SingleFactors: true})
			if got := products(t, c.a, single, b, limit); got > counts[ILU0]*5/4 {
				t.Errorf("%d products with factors in 32 bits, %d in 64", got, counts[ILU0])
			}
		})
	}
}

// skewed has the stencil d, −1∓p: central differences at a cell Péclet number
// of 2p, indefinite for small d.
func skewed(m int, p, d float64) *csr.Matrix {
	var t csr.Triplets
	for y := range m {
		for x := range m {
			i := y*m + x
			t.Add(i, i, d)
			for _, n := range []struct {
				inside bool
				j      int
				v      float64
			}{{x > 0, i - 1, -1 - p}, {x < m-1, i + 1, -1 + p}, {y > 0, i - m, -1 - p}, {y < m-1, i + m, -1 + p}} {
				if n.inside {
					t.Add(i, n.j, n.v)
				}
			}
		}
	}
	return t.Matrix(m*m, m*m)
}

// bidiagonal has 1 on the diagonal and 2 below it: its inverse grows as 2ⁿ.
func bidiagonal(n int) *csr.Matrix {
	var t csr.Triplets
	for i := range n {
		t.Add(i, i, 1)
		if i > 0 {
			t.Add(i, i-1, 2)
		}
	}
	return t.Matrix(n, n)
}

func TestUnstableFactorsGiveWay(t *testing.T) {
	// A multiplier of 1e40.
	steep := explicit(2, [3]float64{0, 0, 1e-20}, [3]float64{1, 0, 1e20}, [3]float64{1, 1, 1e20})
	cases := []struct {
		name        string
		a           *csr.Matrix
		asked, want string
		says        []string // the kinds whose fault is told
		single      bool
	}{
		{"indefinite, no small pivot", skewed(40, 0, 0.1), ILUT, Diagonal, []string{ILUT, ILU0}, false},
		{"indefinite, ilut is close enough", skewed(20, 0, 0.1), ILUT, ILUT, nil, false},
		{"the same, ilu0 is not", skewed(20, 0, 0.1), ILU0, Diagonal, []string{ILU0}, false},
		{"skew, definite", skewed(40, 10, 4), ILU0, Diagonal, []string{ILU0}, false},
		{"exact but growing factor, kept", bidiagonal(40), ILU0, ILU0, nil, false},
		{"exact factor beyond use", bidiagonal(100), ILUT, Diagonal, []string{ILUT, ILU0}, false},
		{"overflow", bidiagonal(2000), ILUT, Diagonal, []string{ILUT, ILU0}, false},
		{"overflow in 32 bits", steep, ILU0, Diagonal, []string{ILU0}, true},
		{"the same fits 64 bits", steep, ILU0, ILU0, nil, false},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			_, report := build(t, c.asked, c.a, Options{SingleFactors: c.single})
			if report.Asked != c.asked || report.Kind != c.want {
				t.Errorf("%s became %s, want %s: %+v", c.asked, report.Kind, c.want, report)
			}
			for _, kind := range c.says {
				if !strings.Contains(report.Reason, kind+" is of no use here: ") {
					t.Errorf("the reason %q does not tell about %s", report.Reason, kind)
				}
			}
			if (len(c.says) > 0) != (report.Reason != "") {
				t.Errorf("reason %q, want one about %v", report.Reason, c.says)
			}
		})
	}
}
