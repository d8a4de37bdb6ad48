package precond

import (
	"math"
	"slices"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"rowstead/partition/csr"
)

// drawSymmetric draws a symmetric matrix with a positive diagonal, definite or not.
func drawSymmetric(t *rapid.T) *csr.Matrix {
	b := sparse(rapid.IntRange(1, 60).Draw(t, "rows"), rapid.IntRange(0, 4).Draw(t, "row entries"), 0, rapid.Uint64().Draw(t, "seed"))
	diagonal := rapid.SampledFrom([]float64{0.1, 1, 10}).Draw(t, "diagonal")
	var tr csr.Triplets
	for i := range b.Rows {
		cols, vals := b.Row(i)
		for k, c := range cols {
			if int(c) < i {
				tr.Add(i, int(c), vals[k])
				tr.Add(int(c), i, vals[k])
			}
		}
		tr.Add(i, i, diagonal*(1+float64(i%3)))
	}
	return tr.Matrix(b.Rows, b.Rows)
}

// Whatever symmetric matrix with a positive diagonal comes, the factors are
// symmetric, ⟨M⁻¹r, s⟩ = ⟨r, M⁻¹s⟩, and positive definite, ⟨M⁻¹r, r⟩ > 0.
func TestSymmetricFactorsAreDefinite(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawSymmetric(t)
		kind := rapid.SampledFrom(Kinds()).Draw(t, "kind")
		o := drawOptions(t)
		o.Symmetric = true
		p, report := build2(t, kind, a, o)
		if report.Kind != kind || !report.Symmetric || !report.PositiveDefinite {
			t.Fatalf("%+v, want %s, symmetric and positive definite", report, kind)
		}
		if (report.Shift > 0) != (report.Reason != "") {
			t.Fatalf("shift %v, reason %q", report.Shift, report.Reason)
		}
		r, s := vector(a.Rows, 1), vector(a.Rows, 2)
		zr, zs := solved(p, r), solved(p, s)
		bound := dot(solved(majorant(p), absolute(r)), absolute(s))
		if d := math.Abs(dot(zr, s) - dot(r, zs)); !(d <= rounding*bound) {
			t.Fatalf("⟨M⁻¹r,s⟩ − ⟨r,M⁻¹s⟩ = %.2e, numbers up to %.2e", d, bound)
		}
		if dot(zr, r) <= 0 {
			t.Fatalf("⟨M⁻¹r,r⟩ = %v", dot(zr, r))
		}
	})
}

// Rows from right of the diagonal alone give what ilut gives when nothing is
// dropped.
func TestSymmetricILUTWithoutDroppingIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := drawSymmetric(t)
		p, report := build2(t, ILUT, a, Options{Symmetric: true, Drop: -1, Fill: a.Rows})
		if report.Shift > 0 {
			t.Skip("not positive definite")
		}
		x, b := vector(a.Rows, 1), make([]float64, a.Rows)
		a.Mul(b, x)
		z := solved(p, b)
		// Rounding of the factor is below n·max |A| (Cholesky never grows).
		carried := slices.Repeat([]float64{float64(a.Rows) * maxAbs(a.Val)}, a.Rows)
		bound := rounding * maxAbs(solved(majorant(p), carried)) * (1 + norm(x))
		for i := range z {
			if !(math.Abs(z[i]-x[i]) <= bound) {
				t.Fatalf("entry %d of M⁻¹·A·x is %v, want %v, growth %.1e", i, z[i], x[i], report.Growth)
			}
		}
	})
}

func TestSymmetricReports(t *testing.T) {
	indefinite := explicit(3, [3]float64{0, 0, 1}, [3]float64{1, 1, -1}, [3]float64{2, 2, 1}, [3]float64{0, 1, 0.5}, [3]float64{1, 0, 0.5})
	for _, kind := range []string{Diagonal, ILU0, ILUT} {
		_, report := build(t, kind, indefinite, Options{Symmetric: true})
		if !report.Symmetric || report.PositiveDefinite || report.Shift != 0 {
			t.Errorf("%s of an indefinite matrix: %+v", kind, report)
		}
		_, report = build(t, kind, plane5(8, 50, 0), Options{Symmetric: true})
		if report.Symmetric || report.PositiveDefinite || !strings.Contains(report.Reason, "not symmetric: entries (0, 1) and (1, 0)") {
			t.Errorf("%s of an unsymmetric matrix said to be symmetric: %+v", kind, report)
		}
		_, report = build(t, kind, plane5(8, 0, 0), Options{})
		if report.Symmetric || report.PositiveDefinite {
			t.Errorf("%s, not asked about symmetry: %+v", kind, report)
		}
	}
}
