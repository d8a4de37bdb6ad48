package method_test

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/inproc"
	"rowstead/coordinator/method"

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
	}
}

// rowExponents are those that divide every row by the power of two nearest its largest entry.
func rowExponents(a *csr.Matrix) []int16 {
	exponents := make([]int16, a.Rows)
	for i := range a.Rows {
		_, vals := a.Row(i)
		largest := 0.0
		for _, v := range vals {
			largest = max(largest, math.Abs(v))
		}
		if largest > 0 {
			exponents[i] = -int16(math.Round(math.Log2(largest)))
		}
	}
	return exponents
}

func scaledBy(a *csr.Matrix, exponents []int16) *csr.Matrix {
	d := *a
	d.Val = append([]float64(nil), a.Val...)
	for i := range a.Rows {
		for k := a.Start[i]; k < a.Start[i+1]; k++ {
			d.Val[k] = math.Ldexp(d.Val[k], int(exponents[i]))
		}
	}
	return &d
}

// solveTrial solves a trial over row blocks of this process. The table is in
// the scaled norm: the system is equilibrated beforehand, its right side random.
func solveTrial(t testing.TB, tr trial, blocks int, o method.Options) method.Result {
	t.Helper()
	a := tr.make()
	a = scaledBy(a, rowExponents(a))
	cuts, err := partition.CutByEntries(a.Start, blocks)
	if err != nil {
		t.Fatal(err)
	}
	sp, err := inproc.New(inproc.Problem{
		Matrix: a, Cuts: cuts, Right: problems.NormalVector(a.Rows, 5), Threads: blocks,
		Precondition: tr.precondition, Options: precond.Options{SubBlocks: 1},
	})
	if err != nil {
		t.Fatal(err)
	}
	defer sp.Close()
	res, err := method.Solve(context.Background(), sp, o)
	if err != nil {
		t.Fatalf("%s: %v", tr.name, err)
	}
	check, err := sp.Check(context.Background())
	if err != nil || check.Met(1e-8) != res.Met {
		t.Errorf("%s: said met %v, another check %v, %v", tr.name, res.Met, check.Met(1e-8), err)
	}
	return res
}

func TestSuiteProducts(t *testing.T) {
	for _, tr := range trials() {
		t.Run(tr.name, func(t *testing.T) {
			res := solveTrial(t, tr, 4, method.Options{Method: method.Sketched, MaxProducts: 4000})
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
