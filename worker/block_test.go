package worker

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"go.uber.org/goleak"
	"pgregory.net/rapid"

	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
	"rowstead/worker/basis"
	"rowstead/worker/halo"
	"rowstead/worker/precond"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

var small = Cycle{Seed: 1, SketchRows: 64, Zeta: 4, Capacity: 6, Window: 3, Form: basis.Double}

func started(t *testing.T, c Cycle) *Block {
	t.Helper()
	b := singleBlock(t, problems.Poisson2D(20))
	if _, err := b.Start(context.Background(), c); err != nil {
		t.Fatal(err)
	}
	return b
}

// Every verb that is not allowed as things stand is refused, and the block goes on.
func TestRefusals(t *testing.T) {
	ctx := context.Background()
	fresh := New(Config{Matrix: problems.Poisson2D(4), Right: make([]float64, 16), Threads: 1})
	defer fresh.Close()
	if _, err := fresh.Check(ctx); err == nil {
		t.Error("Check before Prepare: no error")
	}
	if _, err := fresh.Start(ctx, small); err == nil {
		t.Error("Start before Prepare: no error")
	}
	b := singleBlock(t, problems.Poisson2D(20))
	if _, err := b.Advance(ctx, Step{Norm: 1}); err == nil {
		t.Error("Advance before Start: no error")
	}
	for name, c := range map[string]Cycle{
		"no vectors":           {Window: 1, Form: basis.Double},
		"no window":            {Capacity: 1, Form: basis.Double},
		"no such form":         {Capacity: 1, Window: 1, Form: "half"},
		"sketch rows by zeta":  {Capacity: 1, Window: 1, Form: basis.Double, SketchRows: 8, Zeta: 2},
		"zeta of 0":            {Capacity: 1, Window: 1, Form: basis.Double, SketchRows: 8},
		"negative sketch rows": {Capacity: 1, Window: 1, Form: basis.Double, SketchRows: -8, Zeta: 1},
	} {
		if _, err := b.Start(ctx, c); err == nil {
			t.Errorf("Start of a cycle with %s: no error", name)
		}
	}
	b = started(t, small)
	for name, verb := range map[string]func() error{
		"norm 0":               func() error { _, err := b.Advance(ctx, Step{}); return err },
		"vectors ahead":        func() error { _, err := b.Advance(ctx, Step{H: []float64{1}, Norm: 1}); return err },
		"negative dots":        func() error { _, err := b.Advance(ctx, Step{Norm: 1, Product: true, Dots: -1}); return err },
		"sketches ahead":       func() error { _, err := b.Sketches(ctx, 0, 1); return err },
		"Reduce by too many":   func() error { _, err := b.Reduce(ctx, []float64{1}); return err },
		"Y too long":           func() error { _, err := b.Try(ctx, Correction{Y: []float64{1}}); return err },
		"YU without U":         func() error { _, err := b.Probe(ctx, Correction{YU: []float64{1}}); return err },
		"T of a wrong size":    func() error { _, err := b.Correct(ctx, Correction{T: []float64{1}, Directions: 1}); return err },
		"Keep of nothing":      func() error { return b.Keep(ctx) },
		"Recycle, bad cycle":   func() error { _, err := b.Recycle(ctx, Cycle{}); return err },
		"Direct, not prepared": func() error { _, err := b.Direct(ctx, 0); return err },
		"unknown kind": func() error {
			_, err := b.Prepare(ctx, Preparation{Precondition: "magic"})
			return err
		},
	} {
		if err := verb(); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func TestReplayRefusesWhatItForgot(t *testing.T) {
	ctx := context.Background()
	c := small
	c.Form = basis.Replay
	c.Capacity = 20
	b := started(t, c)
	for range 10 {
		if _, err := b.Advance(ctx, Step{Norm: 1, Product: true, Dots: 3}); err != nil {
			t.Fatal(err)
		}
	}
	if _, err := b.Advance(ctx, Step{Norm: 1, Product: true, Dots: 9}); !errors.Is(err, ErrReplay) {
		t.Errorf("dots with 9 vectors: %v", err)
	}
	if _, err := b.Advance(ctx, Step{Lo: 2, H: []float64{1}, Norm: 1}); err == nil {
		t.Error("a step against vector 2 of 10: no error")
	}
	if _, err := b.Probe(ctx, Correction{Y: []float64{1}}); !errors.Is(err, ErrReplay) {
		t.Errorf("Probe: %v", err)
	}
}

// All long memory is taken in the first cycle, counted, and kept.
func TestMemoryIsCountedAndTakenOnce(t *testing.T) {
	ctx := context.Background()
	b := started(t, small)
	n, s := int64(400), int64(64+HoldRows)
	m := b.Memory()
	if want := 8 * n * 6; m.Basis < want || m.Basis > want*11/10 {
		t.Errorf("basis of 6 vectors: %d bytes, want about %d", m.Basis, want)
	}
	if want := 8 * s * 7; m.Sketches != want { // six vectors and one strip
		t.Errorf("sketches: %d bytes, want %d", m.Sketches, want)
	}
	if want := 8 * n * 7; m.Vectors < want || m.Vectors > want*11/10 {
		t.Errorf("vectors: %d bytes, want about %d", m.Vectors, want)
	}
	take := func() {
		for j := range 5 {
			if _, err := b.Advance(ctx, Step{Norm: 1, Product: j < 4, Dots: 2}); err != nil {
				t.Fatal(err)
			}
		}
		c := Correction{Y: make([]float64, 5), T: make([]float64, 10), Directions: 2}
		if _, err := b.Correct(ctx, c); err != nil {
			t.Fatal(err)
		}
		if _, err := b.Recycle(ctx, small); err != nil {
			t.Fatal(err)
		}
		if _, err := b.Start(ctx, small); err != nil {
			t.Fatal(err)
		}
	}
	take()
	held := b.Memory()
	if want := 3 * 2 * 8 * n; held.Recycled != want {
		t.Errorf("two recycled directions: %d bytes, want %d", held.Recycled, want)
	}
	take()
	if again := b.Memory(); again != held {
		t.Errorf("memory after two more cycles %+v, before %+v", again, held)
	}
}

// A block that scales back and forth returns to the bits it came from.
func TestScalingIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		a := problems.Poisson2D(12)
		for i := range a.Rows {
			size := math.Pow(10, float64(rng.IntN(200)-100))
			for k := a.Start[i]; k < a.Start[i+1]; k++ {
				a.Val[k] *= size
			}
		}
		exponents := make([]int16, a.Rows)
		for i := range exponents {
			exponents[i] = int16(rng.IntN(400) - 200)
		}
		guess := problems.NormalVector(a.Rows, 3)
		before := slices.Clone(a.Val)
		b := New(Config{Matrix: a, RowExponent: exponents, Right: make([]float64, a.Rows), Guess: guess, Threads: 1})
		defer b.Close()
		ctx := context.Background()
		for _, conjugate := range []bool{false, true, false, true} {
			if _, err := b.Prepare(ctx, Preparation{Precondition: precond.None, Conjugate: conjugate}); err != nil {
				t.Fatal(err)
			}
		}
		b.rescale(make([]int16, a.Rows), nil)
		x := make([]float64, a.Rows)
		b.Solution(x)
		if !slices.Equal(a.Val, before) || !slices.Equal(x, guess) {
			t.Fatal("A or x changed")
		}
	})
}

// A block whose neighbour's exchange fails returns that error from every verb
// that needs a halo.
func TestExchangeFailuresAreReturned(t *testing.T) {
	ctx := context.Background()
	broken := errors.New("cable pulled")
	for _, verb := range []func(b *Block) error{
		func(b *Block) error { _, err := b.Start(ctx, small); return err },
		func(b *Block) error { _, err := b.Check(ctx); return err },
		func(b *Block) error { _, err := b.Gradient(ctx); return err },
		func(b *Block) error {
			_, err := b.Prepare(ctx, Preparation{Precondition: precond.None, Conjugate: true})
			return err
		},
	} {
		b := upperHalf(t, failing{broken})
		if err := verb(b); !errors.Is(err, broken) {
			t.Errorf("a broken exchange: %v", err)
		}
	}
	// The halo of the k-th round fails, for k = 1, 2, … until the script passes.
	for k := 0; ; k++ {
		x := &failsLater{rounds: k, err: broken}
		b := upperHalf(t, x)
		err := script(ctx, b)
		if err == nil {
			if k < 6 {
				t.Errorf("the script passed with a failure in round %d", k)
			}
			break
		}
		if !errors.Is(err, broken) {
			t.Fatalf("round %d: %v", k, err)
		}
	}
}

// script uses every verb with a halo once.
func script(ctx context.Context, b *Block) error {
	c := Correction{Y: []float64{1}, T: []float64{1}, Directions: 1}
	for _, verb := range []func() error{
		func() error { _, err := b.Start(ctx, small); return err },
		func() error { _, err := b.Advance(ctx, Step{Norm: 1, Product: true}); return err },
		func() error { _, err := b.Try(ctx, Correction{Y: []float64{1}}); return err },
		func() error { _, err := b.Correct(ctx, c); return err },
		func() error { _, err := b.Recycle(ctx, small); return err },
		func() error { _, err := b.Probe(ctx, Correction{YU: []float64{1}}); return err },
		func() error { _, err := b.Gradient(ctx); return err },
		func() error { _, err := b.Check(ctx); return err },
	} {
		if err := verb(); err != nil {
			return err
		}
	}
	return nil
}

// upperHalf is the first of two blocks of a line, over an exchange.
func upperHalf(t *testing.T, x halo.Exchange) *Block {
	t.Helper()
	a := problems.Bidiagonal(32, 2, -1)
	cuts, err := partition.EvenCuts(32, 2)
	if err != nil {
		t.Fatal(err)
	}
	needs := [][]int32{partition.Needs(0, a.Start[:17], a.Col), partition.Needs(16, a.Start[16:], a.Col)}
	plan := partition.PlanHalo(cuts, needs)
	local := partition.Localize(0, needs[0], a.Start[:17], a.Col, a.Val)
	m := &csr.Matrix{Rows: 16, Cols: 16 + local.Halo, Start: local.Start, Col: local.Col, Val: local.Val}
	b := New(Config{Matrix: m, Plan: &plan.Blocks[0], Exchange: x, Right: make([]float64, 16), Threads: 1})
	t.Cleanup(b.Close)
	if _, err := b.Prepare(context.Background(), Preparation{Precondition: precond.None}); err != nil {
		t.Fatal(err)
	}
	return b
}

type failing struct{ err error }

func (f failing) Post(context.Context, int, []float64) error    { return f.err }
func (f failing) Collect(context.Context, int, []float64) error { return f.err }

// failsLater delivers zeros for some rounds and then fails.
type failsLater struct {
	rounds int
	err    error
}

func (f *failsLater) Post(context.Context, int, []float64) error { return nil }
func (f *failsLater) Collect(_ context.Context, _ int, into []float64) error {
	if f.rounds == 0 {
		return f.err
	}
	f.rounds--
	clear(into)
	return nil
}

// Whatever the numbers, Squares holds their squares and no infinity.
func TestSquaresStayInRange(t *testing.T) {
	var s Squares
	squares(&s, []float64{math.MaxFloat64, -math.MaxFloat64, 1, math.SmallestNonzeroFloat64, 0})
	if s[0] <= 0 || s[1] != 1 || math.IsInf(s[2], 0) || s[2] == 0 {
		t.Errorf("squares = %v", s)
	}
}

// The worst rows are kept worst first, equal ones by row, at most eight.
func TestAddWorst(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		errs := rapid.SliceOfN(rapid.Float64Range(0, 4), 0, 40).Draw(t, "errors")
		var s ResidualSums
		rows := make([]int, len(errs))
		for i := range errs {
			errs[i] = math.Floor(errs[i]) // so that some are equal
			rows[i] = i
			s.addWorst(i, errs[i])
		}
		slices.SortStableFunc(rows, func(a, b int) int { return -compare(errs[a], errs[b]) })
		if want := rows[:min(8, len(rows))]; !slices.Equal(s.WorstRow, want) {
			t.Fatalf("worst rows %v, want %v of %v", s.WorstRow, want, errs)
		}
	})
}

func compare(a, b float64) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}
