package small

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// triangle is a fixed triangle of noise whose diagonal keeps it well-conditioned.
func triangle(seed uint64, n int) Triangle {
	t := NewTriangle(n, tall(seed, n*(n+1)/2, 1))
	for j := range n {
		c := t.Column(j)
		scaleBy(c, 1/math.Sqrt(float64(n)))
		c[j] = 1 + 0.5*c[j]
	}
	return t
}

func (t Triangle) dense() *mat.Dense {
	d := mat.NewDense(t.n, t.n, nil)
	for j := range t.n {
		for i := range j + 1 {
			d.Set(i, j, t.At(i, j))
		}
	}
	return d
}

// Every product and solve is its plain formula to rounding, for every leading
// block; the solves undo the products.
func TestTriangleAgainstItsFormulas(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 40).Draw(t, "n")
		size := rapid.IntRange(n, 45).Draw(t, "size")
		seed := rapid.Uint64().Draw(t, "seed")
		r, x := triangle(seed, size), tall(seed+1, n, 1)
		got, want, transposed := make([]float64, n), make([]float64, n), make([]float64, n)
		for i := range n {
			for j := range n {
				want[i] += r.At(i, j) * x[j]
				transposed[i] += r.At(j, i) * x[j]
			}
		}
		near := func(what string, got, want []float64) {
			for i := range got {
				if math.Abs(got[i]-want[i]) > 1e4*eps {
					t.Fatalf("%s of %d: entry %d = %g, want %g", what, n, i, got[i], want[i])
				}
			}
		}
		r.Mul(got, x)
		near("Mul", got, want)
		r.Solve(got)
		near("Solve after Mul", got, x)
		r.MulTransposed(got, x)
		near("MulTransposed", got, transposed)
		r.SolveTransposed(got)
		near("SolveTransposed after MulTransposed", got, x)

		from := rapid.IntRange(0, n-1).Draw(t, "from")
		padded := make([]float64, n)
		copy(padded[from:], x[from:])
		r.Mul(want, padded)
		r.Combine(got, from, x[from:])
		near("Combine", got, want)
	})
}

// spectrum is R of a QR of D·V with singular values from 1 to 10^−decades, V a
// product of two reflections.
func spectrum(seed uint64, n int, decades float64) Triangle {
	a := make([]float64, n*n)
	for j := range n {
		a[j*n+j] = math.Pow(10, -decades*float64(j)/float64(max(1, n-1)))
	}
	for turn := range uint64(2) {
		v := tall(seed+turn, n, 1)
		normalise(v)
		for i := range n { // rows: D·(I − 2·v·vᵀ)
			sum := 0.0
			for j := range n {
				sum += a[j*n+i] * v[j]
			}
			for j := range n {
				a[j*n+i] -= 2 * sum * v[j]
			}
		}
	}
	q := NewQR(n, n)
	q.Append(a)
	return q.R()
}

func TestConditionWithinAFactorOfTwo(t *testing.T) {
	for _, n := range []int{1, 2, 5, 30, 100, 150} {
		for _, decades := range []float64{0, 1, 4, 8, 12, 14} {
			for seed := range uint64(3) {
				r := spectrum(seed*100+uint64(n), n, decades)
				checkCondition(t, fmt.Sprintf("n %d, decades %g, seed %d", n, decades, seed), r)
			}
		}
		checkCondition(t, fmt.Sprintf("diagonally strong, n %d", n), triangle(uint64(n), n))
	}
}

func checkCondition(t *testing.T, name string, r Triangle) {
	t.Helper()
	var svd mat.SVD
	svd.Factorize(r.dense(), mat.SVDNone)
	want := svd.Cond()
	got := r.Condition(nil)
	if !(got <= 1.05*want && got >= want/2) {
		t.Errorf("%s: Condition = %.3g, the singular values say %.3g", name, got, want)
	}
}

// A growing triangle, asked every eight columns as a cycle does, warm.
func TestConditionWarm(t *testing.T) {
	whole := spectrum(9, 160, 13)
	for _, step := range []int{8, 32} {
		growing(t, whole, step)
	}
	warm := NewWarm(160)
	whole.Condition(warm)
	if got, want := whole.Leading(8).Condition(warm), whole.Leading(8).Condition(nil); got != want {
		t.Errorf("a smaller triangle is not taken cold: %g, want %g", got, want)
	}
	if n := testing.AllocsPerRun(3, func() { whole.Condition(warm) }); n != 0 {
		t.Errorf("Condition allocates %v times, want 0", n)
	}
}

func growing(t *testing.T, whole Triangle, step int) {
	warm := NewWarm(whole.Size())
	for n := step; n <= whole.Size(); n += step {
		r := whole.Leading(n)
		var svd mat.SVD
		svd.Factorize(r.dense(), mat.SVDNone)
		got, want := r.Condition(warm), svd.Cond()
		if !(got <= 1.05*want && got >= want/2) {
			t.Errorf("n %d in steps of %d: Condition = %.3g, the singular values say %.3g", n, step, got, want)
		}
	}
}

func TestConditionOfSingularTriangles(t *testing.T) {
	zero := triangle(1, 20)
	zero.Column(11)[11] = 0
	nan := triangle(1, 20)
	nan.Column(11)[3] = math.NaN()
	tiny := triangle(1, 20)
	tiny.Column(11)[11] = 1e-320
	for name, r := range map[string]Triangle{"zero pivot": zero, "NaN": nan, "denormal pivot": tiny} {
		var warm Warm
		if got := r.Condition(&warm); !math.IsInf(got, 1) {
			t.Errorf("%s: Condition = %g, want +Inf", name, got)
		}
		if got := triangle(1, 20).Condition(&warm); !(got < 100) {
			t.Errorf("%s: the next Condition = %g, want that of a cold start", name, got)
		}
	}
	if got := (Triangle{}).Condition(nil); got != 1 {
		t.Errorf("empty: Condition = %g, want 1", got)
	}
}

func BenchmarkTriangle(b *testing.B) {
	for _, n := range []int{332, 1000} {
		r, x, out := triangle(1, n), tall(2, n, 1), make([]float64, n)
		warm := NewWarm(n)
		bytes := int64(n * (n + 1) / 2 * 8)
		for name, f := range map[string]func(){
			"Solve":           func() { copy(out, x); r.Solve(out) },
			"SolveTransposed": func() { copy(out, x); r.SolveTransposed(out) },
			"Mul":             func() { r.Mul(out, x) },
			"MulTransposed":   func() { r.MulTransposed(out, x) },
		} {
			b.Run(fmt.Sprintf("%s/%d", name, n), func(b *testing.B) {
				b.SetBytes(bytes)
				for b.Loop() {
					f()
				}
			})
		}
		b.Run(fmt.Sprintf("Condition/%d", n), func(b *testing.B) {
			b.SetBytes(bytes * (2*inverseSteps + 2*warmSteps))
			for b.Loop() {
				r.Condition(warm)
			}
		})
	}
}
