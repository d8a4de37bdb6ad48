package inproc

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"testing"

	"go.uber.org/goleak"

	"rowstead/coordinator/fleet"
	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/worker/precond"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

var (
	_ method.Space          = (*Space)(nil)
	_ method.ConjugateSpace = (*Space)(nil)
)

// build makes a Space of so many blocks on a suite's problem.
func build(t testing.TB, p spacetest.Problem, blocks, threads int, kind string) *Space {
	t.Helper()
	cuts, err := partition.CutByEntries(p.Matrix.Start, blocks)
	if err != nil {
		t.Fatal(err)
	}
	sp, err := New(Problem{
		Matrix: p.Matrix, RowExponent: p.RowExponent, Cuts: cuts, Right: p.Right, Guess: p.Guess,
		Precondition: kind, Conjugate: p.Symmetric, Threads: threads,
	})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(sp.Close)
	return sp
}

func kindOf(diagonal bool) string {
	if diagonal {
		return precond.Diagonal
	}
	return precond.None
}

func TestSuite(t *testing.T) {
	for _, blocks := range []int{1, 2, 4, 8} {
		t.Run(fmt.Sprintf("%d blocks", blocks), func(t *testing.T) {
			spacetest.Suite(t, 2500, func(t *testing.T, p spacetest.Problem, diagonal bool) method.Space {
				return build(t, p, blocks, 2, kindOf(diagonal))
			})
		})
	}
}

// The preconditioner of many blocks is that of every block's own square part,
// whatever halo columns its rows have: the suite holds with the twin's
// preconditioner put together from the blocks cut out by hand.
func TestBlocksHaveTheirOwnFactors(t *testing.T) {
	for _, kind := range []string{precond.ILU0, precond.ILUT} {
		for _, blocks := range []int{1, 3, 8} {
			p := spacetest.Definite(33, 40)
			p.Symmetric = false
			cuts, err := partition.CutByEntries(p.Matrix.Start, blocks)
			if err != nil {
				t.Fatal(err)
			}
			p.Apply = byBlocks(t, p, cuts, kind)
			twin := spacetest.New(p)
			want := corrected(t, twin)
			q := spacetest.Definite(33, 40)
			q.Symmetric = false
			if got := corrected(t, build(t, q, blocks, 1, kind)); math.Abs(got-want) > 1e-9*want {
				t.Errorf("%d blocks, %s: residual of a correction %v, want %v", blocks, kind, got, want)
			}
		}
	}
}

// byBlocks builds the factors of the diagonal blocks of D·A, cut out of it.
func byBlocks(t *testing.T, p spacetest.Problem, cuts partition.RowCuts, kind string) func(dst, src []float64) {
	t.Helper()
	factors := make([]precond.Preconditioner, cuts.Blocks())
	for k := range factors {
		lo, hi := cuts.Range(k)
		var own csr.Triplets
		for i := lo; i < hi; i++ {
			cols, vals := p.Matrix.Row(i)
			for e, c := range cols {
				if int(c) >= lo && int(c) < hi {
					own.Add(i-lo, int(c)-lo, math.Ldexp(vals[e], int(p.RowExponent[i])))
				}
			}
		}
		var err error
		if factors[k], _, err = precond.Build(kind, own.Matrix(hi-lo, hi-lo), precond.Options{}); err != nil {
			t.Fatal(err)
		}
	}
	return func(dst, src []float64) {
		for k, f := range factors {
			lo, hi := cuts.Range(k)
			f.Apply(dst[lo:hi], src[lo:hi])
		}
	}
}

// corrected returns the true residual after a fixed correction by two vectors.
func corrected(t *testing.T, sp method.Space) float64 {
	t.Helper()
	ctx := context.Background()
	if _, err := sp.Start(ctx, method.Cycle{Capacity: 3, Window: 2, Form: method.Double}); err != nil {
		t.Fatal(err)
	}
	for range 2 {
		if _, err := sp.Advance(ctx, method.Step{Norm: 10, Product: true}); err != nil {
			t.Fatal(err)
		}
	}
	r, err := sp.Try(ctx, method.Correction{Y: []float64{3, -1}})
	if err != nil {
		t.Fatal(err)
	}
	return r.True
}

func TestConjugateSuite(t *testing.T) {
	for _, blocks := range []int{1, 2, 4, 8} {
		t.Run(fmt.Sprintf("%d blocks", blocks), func(t *testing.T) {
			spacetest.ConjugateSuite(t, 2500, func(t *testing.T, p spacetest.Problem, diagonal bool) method.ConjugateSpace {
				return build(t, p, blocks, 2, kindOf(diagonal))
			})
		})
	}
}

// Same cuts, same bits: whatever the threads and GOMAXPROCS, over many strips.
func TestThreadsChangeNoBit(t *testing.T) {
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	for _, blocks := range []int{1, 3} {
		for _, kind := range []string{precond.None, precond.ILU0} {
			var want *spacetest.Trace
			for _, procs := range []int{1, 2, 8} {
				runtime.GOMAXPROCS(procs)
				for _, threads := range []int{1, 4} {
					got := spacetest.Record(t, 24_000, method.Double, func(t *testing.T, p spacetest.Problem, _ bool) method.Space {
						return build(t, p, blocks, threads, kind)
					})
					if want == nil {
						want = got
					}
					if d := want.Difference(got); d != "" {
						t.Errorf("%d blocks, %s, %d threads, GOMAXPROCS %d: %s", blocks, kind, threads, procs, d)
					}
				}
			}
		}
	}
}

// Prepare goes from one scaling to the other and back to the same bits of x and
// of the residuals.
func TestPrepareAndBack(t *testing.T) {
	ctx := context.Background()
	p := spacetest.Definite(30, 40)
	sp := build(t, p, 3, 1, precond.None)
	before, err := sp.Check(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if err := sp.Prepare(ctx, precond.Diagonal, precond.Options{}, !p.Symmetric); err != nil {
		t.Fatal(err)
	}
	other, err := sp.Check(ctx)
	if err != nil {
		t.Fatal(err)
	}
	// The file's units do not notice the scaling, beyond the order of sums.
	if math.Abs(other.True-before.True) > 1e-14*before.True || other.SolutionMax != before.SolutionMax || other.MatrixMax != before.MatrixMax {
		t.Errorf("other scaling: %+v, before %+v", other, before)
	}
	if err := sp.Prepare(ctx, precond.None, precond.Options{}, p.Symmetric); err != nil {
		t.Fatal(err)
	}
	after, err := sp.Check(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if after.Inner != before.Inner || after.True != before.True || after.RowWise != before.RowWise {
		t.Errorf("there and back: %+v, before %+v", after, before)
	}
	for i, x := range sp.Solution() {
		if x != p.Guess[i] {
			t.Fatalf("x[%d] = %v after two scalings, want %v", i, x, p.Guess[i])
		}
	}
}

func TestVerbsOfTheOtherKindAreRefused(t *testing.T) {
	ctx := context.Background()
	p := spacetest.Definite(8, 8)
	p.Symmetric = false
	sp := build(t, p, 2, 1, precond.None)
	if _, _, err := sp.StartConjugate(ctx); err == nil {
		t.Error("StartConjugate on blocks with D·A: no error")
	}
	if err := sp.Prepare(ctx, precond.None, precond.Options{}, true); err != nil {
		t.Fatal(err)
	}
	if _, err := sp.Start(ctx, method.Cycle{Capacity: 3, Window: 2, Form: method.Double}); err == nil {
		t.Error("Start on blocks with S·A·S: no error")
	}
	if _, err := sp.Direct(ctx, 0); err == nil {
		t.Error("Direct before StartConjugate: no error")
	}
	if err := sp.Prepare(ctx, "no such kind", precond.Options{}, false); err == nil {
		t.Error("an unknown preconditioner: no error")
	}
}

func TestFurtherRightSides(t *testing.T) {
	ctx := context.Background()
	p := spacetest.Definite(20, 20)
	p.Symmetric = false
	sp := build(t, p, 2, 1, precond.None)
	right := make([]float64, len(p.Right))
	for i := range right {
		right[i] = 2 * p.Right[i]
	}
	x := make([]float64, len(right))
	sp.SetRight(right)
	sp.SetGuess(x)
	r, err := sp.Check(ctx)
	if err != nil || r.True != r.Right || r.Solution != 0 {
		t.Errorf("x = 0: residual %g of %g, %v", r.True, r.Right, err)
	}
	if m := sp.Memory(); len(m) != 2 || m[0].Total() <= m[0].Matrix || m[0].Halo == 0 {
		t.Errorf("Memory() = %+v", m)
	}
}

// After a verb ended halfway no verb is sent any more, refused ones leave things
// as they were, and x stays readable.
func TestEndedHalfway(t *testing.T) {
	p := spacetest.Definite(20, 20)
	p.Symmetric = false
	sp := build(t, p, 4, 1, precond.None)
	ctx, cancel := context.WithCancel(context.Background())
	if err := sp.Keep(ctx); !errors.Is(err, fleet.ErrRefused) {
		t.Errorf("Keep of nothing: %v", err)
	}
	if _, err := sp.Check(ctx); err != nil {
		t.Errorf("Check after a refusal: %v", err)
	}
	cancel()
	if _, err := sp.Check(ctx); !errors.Is(err, context.Canceled) {
		t.Errorf("Check under a cancelled context: %v", err)
	}
	if _, err := sp.Check(context.Background()); !errors.Is(err, fleet.ErrApart) {
		t.Errorf("Check after one that ended halfway: %v", err)
	}
	for i, x := range sp.Solution() {
		if x != p.Guess[i] {
			t.Fatalf("x[%d] = %v, want %v", i, x, p.Guess[i])
		}
	}
}
