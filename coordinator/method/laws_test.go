package method_test

import (
	"context"
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
)

// honest checks that a verdict of met is borne out by plain arithmetic.
func honest(t testing.TB, name string, a *csr.Matrix, b, x []float64, res method.Result, tolerance float64) {
	t.Helper()
	r := make([]float64, a.Rows)
	a.Mul(r, x)
	var true2, right2, scaled2, scaledRight2, floor float64
	for i := range r {
		_, vals := a.Row(i)
		largest, along := 0.0, math.Abs(b[i])
		for k, v := range vals {
			cols, _ := a.Row(i)
			largest = max(largest, math.Abs(v))
			along += math.Abs(v * x[cols[k]])
		}
		if largest == 0 {
			largest = 1
		}
		d := b[i] - r[i]
		true2 += d * d
		right2 += b[i] * b[i]
		scaled2 += d / largest * d / largest
		scaledRight2 += b[i] / largest * b[i] / largest
		floor = max(floor, along/largest)
	}
	// The plain residual above is itself good to a few roundings only.
	slack := 1e-13 * floor * float64(a.Rows)
	if res.Met && (math.Sqrt(true2) > tolerance*math.Sqrt(right2)*1.01+slack || math.Sqrt(scaled2) > tolerance*math.Sqrt(scaledRight2)*1.01+slack) {
		t.Errorf("%s: a false verdict of met: true %.2e of %.2e, scaled %.2e of %.2e", name, math.Sqrt(true2), math.Sqrt(right2), math.Sqrt(scaled2), math.Sqrt(scaledRight2))
	}
}

func product(a *csr.Matrix, x []float64) []float64 {
	y := make([]float64, a.Rows)
	a.Mul(y, x)
	return y
}

func ones(n int) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = 1
	}
	return x
}

// The small cases of the guide's section 10, by both methods.
func TestSmallCases(t *testing.T) {
	spread := make([]float64, 2000)
	for i := range spread {
		spread[i] = math.Pow(10, -8*float64(i%40)/39)
	}
	for _, c := range []struct {
		name   string
		a      *csr.Matrix
		b      []float64 // nil: random
		met    bool
		reason string // where it must fall short
		steps  int    // most, 0: any
	}{
		{name: "identity", a: problems.Identity(500), met: true, steps: 2},
		{name: "two values", a: problems.Diagonal(2, 3), met: true, steps: 3},
		{name: "40 eigenvalues from 1e-8 to 1", a: problems.Diagonal(spread...), met: true},
		{name: "b = 0", a: problems.Poisson2D(20), b: make([]float64, 400), met: true, steps: 1},
		{name: "tiny b", a: problems.Poisson2D(20), b: tiny(400), met: true},
		{name: "bidiagonal [1, 2]", a: problems.Bidiagonal(400, 1, 2), reason: "any"},
		{name: "zero row", a: zeroRow(300), b: ones(300), reason: "any"},
		{name: "zero row that fits", a: zeroRow(300), b: product(zeroRow(300), ones(300)), met: true},
	} {
		for _, kind := range []string{method.Sketched, method.Orthogonal} {
			b := c.b
			if b == nil {
				b = problems.NormalVector(c.a.Rows, 5)
			}
			sp := spacetest.New(spacetest.Problem{Matrix: c.a, Right: b, RowExponent: rowExponents(c.a)})
			res, err := method.Solve(context.Background(), sp, method.Options{Method: kind, MaxProducts: 3000, Cycle: 120})
			if err != nil {
				t.Fatalf("%s, %s: %v", c.name, kind, err)
			}
			t.Logf("%s, %s: met %v %q, %d products, true %.1e, scaled %.1e", c.name, kind, res.Met, res.Reason, res.Products, res.Residuals.TrueResidual(), res.Residuals.ScaledResidual())
			if testing.Verbose() {
				t.Log(res.Story)
			}
			honest(t, c.name, c.a, b, sp.Solution(), res, 1e-8)
			if res.Met != c.met {
				t.Errorf("%s, %s: met %v (%q), want %v", c.name, kind, res.Met, res.Reason, c.met)
			}
			if c.reason != "" && c.reason != "any" && res.Reason != c.reason {
				t.Errorf("%s, %s: reason %q, want %q", c.name, kind, res.Reason, c.reason)
			}
			if res.Met == (res.Reason != "") {
				t.Errorf("%s, %s: met %v with reason %q", c.name, kind, res.Met, res.Reason)
			}
			if c.steps > 0 && res.Steps > c.steps {
				t.Errorf("%s, %s: %d steps, want at most %d", c.name, kind, res.Steps, c.steps)
			}
		}
	}
}

func tiny(n int) []float64 {
	b := problems.NormalVector(n, 9)
	for i := range b {
		b[i] *= 1e-13
	}
	return b
}

// zeroRow is a Poisson matrix whose row 7 holds nothing.
func zeroRow(n int) *csr.Matrix {
	m := int(math.Sqrt(float64(n)))
	a := problems.Poisson2D(m)
	t := &csr.Triplets{}
	for i := range a.Rows {
		cols, vals := a.Row(i)
		for k, c := range cols {
			if i != 7 {
				t.Add(i, int(c), vals[k])
			}
		}
	}
	for i := a.Rows; i < n; i++ {
		t.Add(i, i, 1)
	}
	return t.Matrix(n, n)
}

// Whatever the sketch draws, whatever the matrix: met is never said falsely.
func TestVerdictIsNeverFalse(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 60).Draw(t, "n")
		entries := &csr.Triplets{}
		for range rapid.IntRange(0, 5*n).Draw(t, "entries") {
			size := math.Pow(10, rapid.Float64Range(-9, 9).Draw(t, "decades"))
			entries.Add(rapid.IntRange(0, n-1).Draw(t, "i"), rapid.IntRange(0, n-1).Draw(t, "j"), rapid.Float64Range(-1, 1).Draw(t, "v")*size)
		}
		if rapid.Bool().Draw(t, "diagonal") {
			for i := range n {
				entries.Add(i, i, rapid.Float64Range(-4, 4).Draw(t, "d"))
			}
		}
		a := entries.Matrix(n, n)
		b := rapid.SliceOfN(rapid.Float64Range(-1, 1), n, n).Draw(t, "b")
		kind := rapid.SampledFrom([]string{method.Sketched, method.Orthogonal}).Draw(t, "method")
		form := rapid.SampledFrom([]method.BasisForm{method.Double, method.Single, method.Replay}).Draw(t, "form")
		sp := spacetest.New(spacetest.Problem{Matrix: a, Right: b, RowExponent: rowExponents(a)})
		res, err := method.Solve(context.Background(), sp, method.Options{Method: kind, Form: form, MaxProducts: 600, Seed: rapid.Uint64().Draw(t, "seed"), Cycle: 40})
		if err != nil {
			t.Fatal(err)
		}
		if res.Met == (res.Reason != "") {
			t.Fatalf("met %v with reason %q", res.Met, res.Reason)
		}
		r := spacetest.New(spacetest.Problem{Matrix: a, Right: b, Guess: sp.Solution()})
		check, _ := r.Check(context.Background())
		if res.Met && !check.Met(1e-8) {
			t.Fatalf("a false verdict: true %g, scaled %g", check.TrueResidual(), check.ScaledResidual())
		}
	})
}

// A panel beside the recurrence changes no bit.
func TestBehindChangesNoBit(t *testing.T) {
	a := problems.ConvectionDiffusion2D(60, 100, 30, problems.Upwind)
	b := problems.NormalVector(a.Rows, 5)
	solve := func(behind func(func()) func()) (method.Result, []float64) {
		sp := spacetest.New(spacetest.Problem{Matrix: a, Right: b})
		res, err := method.Solve(context.Background(), sp, method.Options{Method: method.Sketched, Tolerance: 1e-12, Behind: behind})
		if err != nil {
			t.Fatal(err)
		}
		return res, sp.Solution()
	}
	res, x := solve(nil)
	other, y := solve(func(task func()) func() {
		done := make(chan struct{})
		go func() { task(); close(done) }()
		return func() { <-done }
	})
	if !res.Met || res.Products != other.Products {
		t.Fatalf("met %v with %d products, %d behind", res.Met, res.Products, other.Products)
	}
	for i := range x {
		if x[i] != y[i] {
			t.Fatalf("x[%d] = %v, behind %v", i, x[i], y[i])
		}
	}
}

// Stop ends the run with the best x so far and its own words.
func TestStopKeepsTheBest(t *testing.T) {
	a := problems.Poisson2D(80)
	b := problems.NormalVector(a.Rows, 5)
	for _, kind := range []string{method.Sketched, method.Orthogonal, method.CG} {
		asked := 0
		sp := spacetest.New(spacetest.Problem{Matrix: a, Right: b, Symmetric: kind == method.CG})
		res, err := method.Solve(context.Background(), sp, method.Options{Method: kind, Stop: func() string {
			asked++
			if asked > 60 {
				return "interrupted"
			}
			return ""
		}})
		if err != nil {
			t.Fatal(err)
		}
		if res.Met || res.Reason != "interrupted" {
			t.Errorf("%s: met %v, reason %q", kind, res.Met, res.Reason)
		}
		check, _ := sp.Check(context.Background())
		if r := check.TrueResidual(); r > 0.7 || math.Abs(r-res.Residuals.TrueResidual()) > 1e-10 {
			t.Errorf("%s: residual %g left, %g reported", kind, r, res.Residuals.TrueResidual())
		}
	}
}

func TestAutoChoosesAndSays(t *testing.T) {
	for _, c := range []struct {
		n                   int
		symmetric, definite bool
		want                string
	}{
		{400, false, false, method.Orthogonal},
		{400, true, false, method.Orthogonal},
		{400, true, true, method.CG},
		{40000, false, false, method.Sketched},
	} {
		a := problems.Poisson2D(int(math.Sqrt(float64(c.n))))
		sp := spacetest.New(spacetest.Problem{Matrix: a, Right: ones(a.Rows), Symmetric: c.definite})
		res, err := method.Solve(context.Background(), sp, method.Options{Symmetric: c.symmetric, DefinitePreconditioner: c.definite, Tolerance: 1e-2})
		if err != nil {
			t.Fatal(err)
		}
		if res.Method != c.want || len(res.Story) == 0 || !strings.Contains(res.Story[0].Text, "method") && !strings.Contains(res.Story[0].Text, "gradients") {
			t.Errorf("n = %d, symmetric %v, definite %v: %s, said %v; want %s", c.n, c.symmetric, c.definite, res.Method, res.Story, c.want)
		}
	}
}
