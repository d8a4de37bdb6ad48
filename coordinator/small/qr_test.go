package small

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

const eps = 0x1p-52

// tall is a fixed s×k matrix of noise, column-major.
func tall(seed uint64, s, k int) []float64 {
	a := make([]float64, s*k)
	for i := range a {
		a[i] = noise(seed, uint64(i))
	}
	return a
}

// graded makes A = G·R₀ with the condition of R₀ about 10^decades: columns fall
// toward dependence on the earlier ones.
func graded(seed uint64, s, k int, decades float64) []float64 {
	a := tall(seed, s, k)
	for j := 1; j < k; j++ {
		f := math.Pow(10, -decades*float64(j)/float64(k))
		c, before := a[j*s:(j+1)*s], a[(j-1)*s:j*s]
		scaleBy(c, f)
		subtract(c, before, -1)
	}
	return a
}

// appended factors a in panels of m.
func appended(a []float64, s, m int) *QR {
	q := NewQR(s, len(a)/s)
	for len(a) > 0 {
		n := min(m*s, len(a))
		q.Append(a[:n])
		a = a[n:]
	}
	return q
}

// residuals returns max_j ‖A_j − Q·R_j‖/‖A_j‖ through Qᵀ·A_j, and max |QᵀQ − I|.
func residuals(q *QR, a []float64) (fit, orthogonality float64) {
	s, k := q.Rows(), q.Columns()
	turned := append([]float64(nil), a...)
	q.transposeApplyAll(turned)
	for j := range k {
		c, size := turned[j*s:(j+1)*s], norm(a[j*s:(j+1)*s])
		subtract(c[:j+1], q.R().Column(j), 1)
		fit = max(fit, norm(c)/max(size, math.SmallestNonzeroFloat64))
	}
	return fit, q.defect()
}

// defect is max |Q·Qᵀ − I| over entries, Qᵀ formed from all s unit vectors.
func (q *QR) defect() float64 {
	s := q.Rows()
	unit := make([]float64, s*s)
	for i := range s {
		unit[i*s+i] = 1
	}
	q.transposeApplyAll(unit) // column i is row i of Q
	worst := 0.0
	for i := range s {
		for j := range i + 1 {
			d := dot(unit[i*s:(i+1)*s], unit[j*s:(j+1)*s])
			if i == j {
				d--
			}
			worst = max(worst, math.Abs(d))
		}
	}
	return worst
}

func TestQRFactorsWhateverThePanels(t *testing.T) {
	cases := []struct {
		name string
		s, k int
		a    []float64
	}{
		{"noise", 150, 100, tall(1, 150, 100)},
		{"square", 70, 70, tall(2, 70, 70)},
		{"one column", 40, 1, tall(3, 40, 1)},
		{"one row", 1, 1, []float64{-3}},
		{"condition 1e12", 200, 90, graded(4, 200, 90, 12)},
		{"condition 1e16", 130, 64, graded(5, 130, 64, 16)},
		{"zero columns", 60, 10, zeroed(tall(6, 60, 10), 60, 0, 3, 9)},
		{"all zero", 20, 5, make([]float64, 100)},
		{"tiny", 50, 20, scaledBy(tall(7, 50, 20), 1e-300)},
		{"denormal", 50, 20, scaledBy(tall(7, 50, 20), 0x1p-1040)},
		{"huge", 50, 20, scaledBy(tall(8, 50, 20), 1e300)},
		{"doubled columns", 80, 40, append(tall(9, 80, 20), tall(9, 80, 20)...)},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) { checkPanels(t, c.a, c.s, c.k) })
	}
}

func checkPanels(t *testing.T, a []float64, s, k int) {
	// ‖A_j − QR_j‖ ≤ c·ε·√k·‖A_j‖ and |QᵀQ − I| ≤ c·ε·√k: Higham, Accuracy and
	// Stability of Numerical Algorithms, 2nd ed., theorem 19.4 in its statistical
	// form; c = 20 covers the denormal case too, where ε is absolute.
	limit := 20 * eps * math.Sqrt(float64(k))
	if largestOf(a) < 0x1p-1000 {
		limit = 1e-8
	}
	for _, m := range []int{1, 3, 8, 32, 33} {
		q := appended(a, s, m)
		fit, defect := residuals(q, a)
		if fit > limit || defect > 20*eps*math.Sqrt(float64(k)) {
			t.Errorf("panels of %d: ‖A−QR‖/‖A‖ = %.2e, |QᵀQ−I| = %.2e, want ≤ %.2e", m, fit, defect, limit)
		}
		for j := range k {
			if d := q.R().At(j, j); d < 0 || math.Signbit(d) {
				t.Errorf("panels of %d: R[%d,%d] = %g, want it non-negative", m, j, j, d)
			}
		}
		if again := appended(a, s, m); !sameBits(again.r, q.r) {
			t.Errorf("panels of %d: two runs differ in R", m)
		}
	}
}

func sameBits(a, b []float64) bool {
	for i := range a {
		if math.Float64bits(a[i]) != math.Float64bits(b[i]) {
			return false
		}
	}
	return len(a) == len(b)
}

func scaledBy(a []float64, f float64) []float64 { scaleBy(a, f); return a }

func zeroed(a []float64, s int, columns ...int) []float64 {
	for _, j := range columns {
		clear(a[j*s : (j+1)*s])
	}
	return a
}

// For a well-conditioned matrix R is unique, so all panels and gonum agree.
func TestRAgreesWithGonumAndAcrossPanels(t *testing.T) {
	const s, k = 160, 100
	a := tall(11, s, k)
	var qr mat.QR
	qr.Factorize(mat.NewDense(k, s, append([]float64(nil), a...)).T())
	var want mat.Dense
	qr.RTo(&want)
	for _, m := range []int{1, 3, 5, 8, 17, 32, 100} {
		r := appended(a, s, m).R()
		worst := 0.0
		for j := range k {
			for i := range j + 1 {
				w := want.At(i, j) * math.Copysign(1, want.At(i, i))
				worst = max(worst, math.Abs(r.At(i, j)-w))
			}
		}
		// cond(A) < 10, ‖A_j‖ < 13
		if limit := 1e3 * eps; worst > limit {
			t.Errorf("panels of %d: R differs from gonum's by %.2e, want ≤ %.2e", m, worst, limit)
		}
	}
}

// Whatever the panels, RᵀR is AᵀA to rounding, and Reset forgets everything.
func TestPanelsOfAnySize(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := rapid.IntRange(1, 90).Draw(t, "s")
		k := rapid.IntRange(1, s).Draw(t, "k")
		seed := rapid.Uint64().Draw(t, "seed")
		a := tall(seed, s, k)
		q := NewQR(s, k)
		if rapid.Bool().Draw(t, "used before") {
			q.Append(tall(seed+1, s, k))
			q.Reset()
		}
		for at := 0; at < k; {
			m := rapid.IntRange(1, k-at).Draw(t, "m")
			q.Append(a[at*s : (at+m)*s])
			at += m
		}
		r := q.R()
		for j := range k {
			for i := range j + 1 {
				want := dot(a[i*s:(i+1)*s], a[j*s:(j+1)*s])
				got := dot(r.Column(i), r.Column(j)[:i+1])
				size := norm(a[i*s:(i+1)*s]) * norm(a[j*s:(j+1)*s])
				if limit := 100 * eps * size; math.Abs(got-want) > limit {
					t.Fatalf("(RᵀR)[%d,%d] = %g, want %g within %.1e", i, j, got, want, limit)
				}
			}
		}
	})
}

func TestTransposeApply(t *testing.T) {
	const s, k = 140, 77
	a, v := tall(21, s, k), tall(22, s, 1)
	q := appended(a, s, 9)
	all := append([]float64(nil), v...)
	q.transposeApplyAll(all)
	for _, n := range []int{0, 1, 8, 31, 32, 33, 77} {
		out := make([]float64, n)
		q.TransposeApply(v, out)
		if !sameBits(out, all[:n]) {
			t.Errorf("TransposeApply of %d differs from the panel's", n)
		}
	}
	if !sameBits(v, tall(22, s, 1)) {
		t.Error("TransposeApply changed v")
	}
	out := make([]float64, k)
	outside := q.Project(v, out)
	if got, want := math.Hypot(outside, norm(out)), norm(v); math.Abs(got-want) > 10*eps*want {
		t.Errorf("Project: parts inside and outside give %g, want %g", got, want)
	}
	if want := norm(all[k:]); outside != want {
		t.Errorf("Project outside = %g, want %g", outside, want)
	}
}

// R⁻¹·Qᵀ·v is the least-squares solution that gonum finds.
func TestFullStepCoefficients(t *testing.T) {
	const s, k = 120, 50
	a, v := tall(31, s, k), tall(32, s, 1)
	q := appended(a, s, 8)
	h := make([]float64, k)
	q.TransposeApply(v, h)
	q.R().Solve(h)
	var want mat.VecDense
	if err := want.SolveVec(mat.NewDense(k, s, a).T(), mat.NewVecDense(s, v)); err != nil {
		t.Fatal(err)
	}
	for i := range h {
		if d := math.Abs(h[i] - want.AtVec(i)); d > 1e3*eps {
			t.Errorf("h[%d] = %g, want %g", i, h[i], want.AtVec(i))
		}
	}
}

func TestAppendAllocatesNothing(t *testing.T) {
	const s, k = 200, 40
	a, v, out := tall(41, s, k), tall(42, s, 1), make([]float64, k)
	q := NewQR(s, k)
	if n := testing.AllocsPerRun(5, func() {
		q.Reset()
		q.Append(a[:7*s])
		q.Append(a[7*s:])
		q.TransposeApply(v, out)
	}); n != 0 {
		t.Errorf("Append and TransposeApply allocate %v times a run, want 0", n)
	}
}

func BenchmarkAppend(b *testing.B) {
	for _, c := range []struct{ s, k, m int }{
		{4144, 1000, 32}, {2144, 500, 32}, {2144, 500, 8}, {1344, 300, 8}, {2144, 500, 1},
	} {
		b.Run(fmt.Sprintf("%dx%d/%d", c.s, c.k, c.m), func(b *testing.B) {
			a := tall(1, c.s, c.k)
			q := NewQR(c.s, c.k)
			for b.Loop() {
				q.Reset()
				for at := 0; at < c.k; at += c.m {
					q.Append(a[at*c.s : min(at+c.m, c.k)*c.s])
				}
			}
			s, k := float64(c.s), float64(c.k)
			flops := 2 * k * k * (s - k/3)
			b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GFlop/s")
			b.ReportMetric(b.Elapsed().Seconds()*1e3/float64(b.N), "ms")
		})
	}
}

func BenchmarkTransposeApply(b *testing.B) {
	const s, k = 4144, 1000
	q, v, out := NewQR(s, k), tall(2, s, 1), make([]float64, k)
	q.Append(tall(1, s, k))
	b.SetBytes(s * k * 8)
	for b.Loop() {
		q.TransposeApply(v, out)
	}
}
