package small

import (
	"math"
	"testing"
)

// Spaces that hold little or nothing give few directions, never NaN.
func TestHarmonicRitzOfPoorSpaces(t *testing.T) {
	ones := make([]complex128, 12)
	for i := range ones {
		ones[i] = complex(float64(i%3), 0) // eigenvalues 0, 1, 2
	}
	cases := []struct {
		name       string
		data       *cycleData
		want, most int
	}{
		{"nothing wanted", runCycle(operatorOf{realSpectrum(40, 4, 2), 0}, nil, 0, 10, 10), 0, 0},
		{"one column", runCycle(operatorOf{realSpectrum(40, 4, 2), 0}, nil, 0, 1, 1), 5, 1},
		{"more wanted than there is", runCycle(operatorOf{realSpectrum(40, 4, 2), 0}, nil, 0, 6, 6), 9, 6},
		{"singular, three eigenvalues", runCycle(operatorOf{ones, 0}, nil, 0, 8, 8), 4, 4},
		{"the whole space and beyond", runCycle(operatorOf{realSpectrum(10, 3, 1), 0}, nil, 0, 9, 9), 4, 4},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			tt, n := HarmonicRitz(c.data.q, c.data.h, c.data.su, c.want)
			if n > c.most || len(tt) != n*c.data.m || !allFinite(tt) {
				t.Errorf("directions = %d (at most %d), %d numbers, finite %v", n, c.most, len(tt), allFinite(tt))
			}
			t.Logf("%d directions", n)
		})
	}
}

// A recycled space that repeats b₀ makes S·W rank-deficient: the repeated
// direction is dropped and the rest is that of the dense answer.
func TestHarmonicRitzDropsARepeatedColumn(t *testing.T) {
	o := operatorOf{realSpectrum(300, 6, 2), 0.01}
	u := tall(91, 300, 3)
	copy(u[300:600], tall(77, 300, 1)) // what runCycle starts from
	c := runCycle(o, u, 3, 60, 60)
	_, n := HarmonicRitz(c.q, c.h, c.su, 6)
	if n == 0 {
		t.Fatal("no directions at all")
	}
	checkRitz(t, c, 6)
}

// After a breakdown the QR has no column for the next vector.
func TestHarmonicRitzAfterABreakdown(t *testing.T) {
	const n, k = 30, 12
	e := make([]complex128, n)
	for i := range e {
		e[i] = complex(float64(i%k)+0.5, 0)
	}
	whole := runCycle(operatorOf{e, 0}, nil, 0, k-1, k-1)
	c := &cycleData{s: n, m: k, q: NewQR(n, k), h: NewHessenberg(k)}
	b := whole.basis
	c.q.Append(b[:k*n])
	c.h.Reset(c.q.R().Leading(1), 0, 1)
	image := make([]float64, n)
	for j := range k {
		operatorOf{e, 0}.mul(image, b[j*n:(j+1)*n])
		column := make([]float64, k)
		c.q.TransposeApply(image, column)
		c.h.Append(column[:min(j+2, k)])
		c.scw = append(c.scw, image...)
	}
	c.sw = b[:k*n]
	if rho := c.h.Estimate(); rho > 1e-10 {
		t.Fatalf("the space is not invariant: estimate %g", rho)
	}
	checkRitz(t, c, 4)
}

// What is not finite shows in R and in the condition, and nothing panics.
func TestAppendOfNaN(t *testing.T) {
	for _, bad := range []float64{math.NaN(), math.Inf(1)} {
		a := tall(1, 40, 9)
		a[4*40+7] = bad
		q := appended(a, 40, 4)
		if allFinite(q.R().packed) {
			t.Errorf("R is finite though A holds %g", bad)
		}
		if got := q.R().Condition(nil); !math.IsInf(got, 1) {
			t.Errorf("Condition = %g with %g in A, want +Inf", got, bad)
		}
	}
}

func TestContractBreachesPanic(t *testing.T) {
	q := NewQR(10, 3)
	h := NewHessenberg(2)
	q.Append(tall(1, 10, 2))
	h.Reset(q.R(), 1, 1)
	for name, f := range map[string]func(){
		"capacity above rows":     func() { NewQR(3, 4) },
		"part of a column":        func() { q.Append(make([]float64, 15)) },
		"beyond the capacity":     func() { q.Append(make([]float64, 20)) },
		"short v":                 func() { q.TransposeApply(make([]float64, 9), nil) },
		"out too long":            func() { q.TransposeApply(make([]float64, 10), make([]float64, 3)) },
		"vector above triangle":   func() { q.R().Solve(make([]float64, 3)) },
		"column of wrong length":  func() { h.Append(make([]float64, 4)) },
		"more y than columns":     func() { h.Solve(make([]float64, 2)) },
		"lengths of LeastSquares": func() { LeastSquares(make([]float64, 5), make([]float64, 3), 3, 2) },
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%s: no panic", name)
				}
			}()
			f()
		}()
	}
}
