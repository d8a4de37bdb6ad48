package method_test

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
	"rowstead/worker/precond"
)

// trial is a system of the suite; the products are those of the guide's table
// at four row blocks without sub-blocks, tolerance 1e-8, cycles of 300.
type trial struct {
	name         string
	make         func() *csr.Matrix
	precondition string
	products     int
}

func trials() []trial {
	return []trial{
		{"convection-diffusion 150², upwind", func() *csr.Matrix { return problems.ConvectionDiffusion2D(150, 100, 30, problems.Upwind) }, precond.None, 296},
		{"recirculating 150²", func() *csr.Matrix { return problems.Recirculating2D(150, 200, problems.Central) }, precond.None, 1755},
		{"recirculating 200², ILU(0)", func() *csr.Matrix { return problems.Recirculating2D(200, 200, problems.Central) }, precond.ILU0, 521},
		{"Poisson 200²", func() *csr.Matrix { return problems.Poisson2D(200) }, precond.None, 605},
		{"log-normal 180², 5 decades, ILU(0)", func() *csr.Matrix { return problems.LogNormal([]int{180, 180}, 5, 4, 0) }, precond.ILU0, 1315},
		{"log-normal 30³, 6 decades, diagonal", func() *csr.Matrix { return problems.LogNormal([]int{30, 30, 30}, 6, 4, 0) }, precond.Diagonal, 282},
		{"Helmholtz 120², ILU(0)", func() *csr.Matrix { return problems.Helmholtz2D(120, 0.05) }, precond.ILU0, 902},
		{"Grcar 20000", func() *csr.Matrix { return problems.Grcar(20000, 3) }, precond.None, 326},
		{"circuit 20000, ILU(0)", func() *csr.Matrix { return problems.Circuit(20000, 0) }, precond.ILU0, 1597},
	}
}

// blockPreconditioner is M of block Jacobi over the cuts, as workers make it.
func blockPreconditioner(t testing.TB, a *csr.Matrix, kind string, blocks int) func(dst, src []float64) {
	t.Helper()
	cuts, err := partition.CutByEntries(a.Start, blocks)
	if err != nil {
		t.Fatal(err)
	}
	var parts []precond.Preconditioner
	var lows []int
	for p := range cuts.Blocks() {
		lo, hi := cuts.Range(p)
		local := &csr.Triplets{}
		for i := lo; i < hi; i++ {
			cols, vals := a.Row(i)
			for k, c := range cols {
				if int(c) >= lo && int(c) < hi {
					local.Add(i-lo, int(c)-lo, vals[k])
				}
			}
		}
		m, _, err := precond.Build(kind, local.Matrix(hi-lo, hi-lo), precond.Options{SubBlocks: 1})
		if err != nil {
			t.Fatal(err)
		}
		parts, lows = append(parts, m), append(lows, lo)
	}
	lows = append(lows, a.Rows)
	return func(dst, src []float64) {
		for p, m := range parts {
			m.Apply(dst[lows[p]:lows[p+1]], src[lows[p]:lows[p+1]])
		}
	}
}

// rowExponents are those that divide every row by the power of two nearest its largest entry.
func rowExponents(a *csr.Matrix) []int {
	exponents := make([]int, a.Rows)
	for i := range a.Rows {
		_, vals := a.Row(i)
		largest := 0.0
		for _, v := range vals {
			largest = max(largest, math.Abs(v))
		}
		if largest > 0 {
			exponents[i] = -int(math.Round(math.Log2(largest)))
		}
	}
	return exponents
}

func scaledBy(a *csr.Matrix, exponents []int) *csr.Matrix {
	d := *a
	d.Val = append([]float64(nil), a.Val...)
	for i := range a.Rows {
		for k := a.Start[i]; k < a.Start[i+1]; k++ {
			d.Val[k] = math.Ldexp(d.Val[k], exponents[i])
		}
	}
	return &d
}

func solveTrial(t testing.TB, tr trial, blocks int, o method.Options) (method.Result, *spacetest.Simple) {
	t.Helper()
	a := tr.make()
	a = scaledBy(a, rowExponents(a)) // the table is in the scaled norm
	sp := spacetest.New(spacetest.Problem{
		Matrix: a, Right: problems.NormalVector(a.Rows, 5),
		Apply: blockPreconditioner(t, a, tr.precondition, blocks),
	})
	res, err := method.Solve(context.Background(), sp, o)
	if err != nil {
		t.Fatalf("%s: %v", tr.name, err)
	}
	return res, sp
}

func TestSuiteProducts(t *testing.T) {
	for _, tr := range trials() {
		t.Run(tr.name, func(t *testing.T) {
			res, _ := solveTrial(t, tr, 4, method.Options{Method: method.Sketched, MaxProducts: 4000})
			t.Logf("%d products (%d in the guide), %d steps, %d full, %d cycles, met %v %q, true %.1e, hint %.1e", res.Products, tr.products, res.Steps, res.FullSteps, res.Cycles, res.Met, res.Reason, res.Residuals.TrueResidual(), res.ConditionHint)
			if testing.Verbose() {
				for _, e := range res.Story {
					t.Log(e)
				}
			}
			if !res.Met {
				t.Errorf("not met: %s", res.Reason)
			}
			if float64(res.Products) > 1.1*float64(tr.products) {
				t.Errorf("%d products, want at most 1.1 times %d", res.Products, tr.products)
			}
		})
	}
}
