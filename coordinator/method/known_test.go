package method_test

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/inproc"
	"rowstead/coordinator/method"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/partition/order"
	"rowstead/partition/samples/problems"
	"rowstead/worker/precond"
)

// place holds a system in row blocks of this process as the main job does: rows
// scaled, block ILU(0).
func place(t testing.TB, a *csr.Matrix, b []float64, blocks int, kind string) *inproc.Space {
	t.Helper()
	cuts, err := partition.CutByEntries(a.Start, blocks)
	if err != nil {
		t.Fatal(err)
	}
	own := *a
	own.Col, own.Val = append([]int32(nil), a.Col...), append([]float64(nil), a.Val...)
	sp, err := inproc.New(inproc.Problem{
		Matrix: &own, RowExponent: order.RowScale(a), Cuts: cuts, Right: b, Threads: blocks,
		Precondition: kind, Options: precond.Options{SubBlocks: 1},
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(sp.Close)
	return sp
}

// Published and closed-form values by generating the model and solving it; the
// source of each stands in its Known.
func TestKnownAnswers(t *testing.T) {
	for _, c := range []struct {
		name    string
		known   problems.Known
		within  float64 // of the value, or of the exact x by its largest entry
		factors string
	}{
		{"plate of the thermal benchmark, 24×40", problems.PlateT4(24, 40), 0.05, precond.ILU0},
		{"plate of the thermal benchmark, 96×160", problems.PlateT4(96, 160), 0.05, precond.ILU0},
		{"square bar, 64²", problems.SquareBar(64), 1e-3 * 0.1406, precond.None},
		{"square bar, 256²", problems.SquareBar(256), 1e-4 * 0.1406, precond.ILU0},
		{"boundary layer", problems.Layer1D(2000, 1e-3), 1e-6, precond.ILU0},
		{"eigenvector in three dimensions", problems.Mode3D(24, [3]float64{20, 10, 5}, [3]int{2, 1, 3}), 1e-6, precond.None},
		{"cube, 63³", problems.UnitCube(63), 5e-4 * 0.05621282983, precond.ILU0},
		{"link graph", problems.LinkGraph(), 1e-12, precond.ILU0},
		{"walk", problems.Walk(2000, 0.502), 1e-9, precond.ILU0},
	} {
		for _, kind := range []string{method.Sketched, method.Auto} {
			t.Run(c.name+", "+kind, func(t *testing.T) {
				k := c.known
				tolerance := 1e-8
				if c.within < 1e-8 {
					tolerance = 1e-15 * float64(k.Matrix.Rows) / 11
				}
				sp := place(t, k.Matrix, k.Right, 2, c.factors)
				res, err := method.Solve(context.Background(), sp, method.Options{Method: kind, Tolerance: tolerance})
				if err != nil || !res.Met && tolerance == 1e-8 {
					t.Fatalf("met %v %q, %v", res.Met, res.Reason, err)
				}
				x := sp.Solution()
				if k.Exact != nil {
					if d := distance(x, k.Exact); d > c.within {
						t.Errorf("x is %.2e from the exact answer, want %.0e (%s)", d, c.within, k.Source)
					}
				}
				if k.Read != nil {
					got := k.Read(x)
					t.Logf("%.10g, published %.10g, %d products", got, k.Value, res.Products)
					if d := math.Abs(got - k.Value); d > c.within {
						t.Errorf("%.8g, want %.8g ± %.0e (%s)", got, k.Value, c.within, k.Source)
					}
				}
			})
		}
	}
}

// The refined limit of the plate, 18.2538, was computed; 18.254 ± 0.005.
func TestPlateConverges(t *testing.T) {
	k := problems.PlateT4(96, 160)
	sp := place(t, k.Matrix, k.Right, 4, precond.ILU0)
	if res, err := method.Solve(context.Background(), sp, method.Options{}); err != nil || !res.Met {
		t.Fatal(res.Reason, err)
	}
	if got := k.Read(sp.Solution()); math.Abs(got-18.254) > 0.005 {
		t.Errorf("%.4f °C, want 18.254 ± 0.005", got)
	}
}

func distance(x, want []float64) float64 {
	far, size := 0.0, 0.0
	for i, v := range want {
		far, size = max(far, math.Abs(x[i]-v)), max(size, math.Abs(v))
	}
	return far / size
}

// Two grids whose plain residual is tiny with every inner unknown left at zero:
// the verdict on that vector is short, and the solver is not taken in.
func TestFlowTraps(t *testing.T) {
	for _, c := range []struct {
		name       string
		g, penalty float64
		plain      float64 // true residual of the wrong answer, about
	}{
		{"conductance 1e-9 beside identity rows", 1e-9, 0, 1e-8},
		{"penalty rows of 1e12", 1, 1e12, 1e-11},
	} {
		a, b := problems.FlowTrap(100, c.g, c.penalty)
		exact := problems.TrapExact(100, c.g, c.penalty)
		wrong := make([]float64, a.Rows)
		for i := range a.Rows {
			if b[i] != 0 {
				wrong[i] = exact[i]
			}
		}
		sp := place(t, a, b, 2, precond.ILU0)
		sp.SetGuess(wrong)
		check, err := sp.Check(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		if check.TrueResidual() > c.plain || check.Met(1e-8) || check.ScaledResidual() < 1e-3 {
			t.Errorf("%s: the wrong answer has true residual %.1e, scaled %.1e, met %v", c.name, check.TrueResidual(), check.ScaledResidual(), check.Met(1e-8))
		}
		for _, kind := range []string{method.Sketched, method.Orthogonal} {
			sp.SetGuess(make([]float64, a.Rows))
			res, err := method.Solve(context.Background(), sp, method.Options{Method: kind})
			if err != nil {
				t.Fatal(err)
			}
			far := distance(sp.Solution(), exact)
			t.Logf("%s, %s: met %v %q, %d products, %.1e from the exact heads", c.name, kind, res.Met, res.Reason, res.Products, far)
			if !res.Met || far > 1e-4 {
				t.Errorf("%s, %s: met %v %q, %.1e from the exact heads", c.name, kind, res.Met, res.Reason, far)
			}
		}
	}
}
