package fleet

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"go.uber.org/goleak"
	"pgregory.net/rapid"

	"rowstead/coordinator/method"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// stub answers every verb with its own numbers. It returns only after the stub
// behind it has returned, so that answers arrive in reverse order.
type stub struct {
	name         string
	lo, hi       int
	value        float64
	fail         error           // of the next call
	hang         bool            // wait for the end of ctx instead
	after, ended chan struct{}   // the stub behind, this one; per call
	verbs        map[string]bool // called so far
	extra        int             // numbers more than asked for
}

func (s *stub) Name() string        { return s.name }
func (s *stub) Range() (lo, hi int) { return s.lo, s.hi }
func (s *stub) numbers(n int) []float64 {
	v := make([]float64, n+s.extra)
	for i := range v {
		v[i] = s.value * float64(i+1)
	}
	return v
}

func (s *stub) call(ctx context.Context, verb string) error {
	s.verbs[verb] = true
	if s.hang {
		<-ctx.Done()
		return ctx.Err()
	}
	if s.after != nil {
		select {
		case <-s.after:
		case <-ctx.Done():
			return ctx.Err()
		}
	}
	if s.ended != nil {
		s.ended <- struct{}{}
	}
	return s.fail
}

func (s *stub) residuals(ctx context.Context, verb string) (ResidualSums, error) {
	r := ResidualSums{
		Inner: Squares{0, s.value * s.value, 0}, WorstRow: []int{s.lo, s.lo + 1}, WorstError: []float64{s.value, 0.5},
		ResidualMax: s.value, Finite: true, Products: 3,
	}
	return r, s.call(ctx, verb)
}

func (s *stub) Start(ctx context.Context, _ method.Cycle) (ResidualSums, error) {
	return s.residuals(ctx, "start")
}
func (s *stub) Advance(ctx context.Context, _ method.Step) (StepSums, error) {
	return StepSums{Gram: s.numbers(2), Dots: s.numbers(2), SketchW: s.numbers(3), HoldW: s.numbers(1), WW: s.value}, s.call(ctx, "advance")
}
func (s *stub) Sketches(ctx context.Context, from, to int) (SketchSums, error) {
	return SketchSums{Sketch: s.numbers(to - from), Hold: s.numbers(1)}, s.call(ctx, "sketches")
}
func (s *stub) Reduce(ctx context.Context, h []float64) (DotSums, error) {
	return DotSums{Dots: s.numbers(len(h)), WW: s.value}, s.call(ctx, "reduce")
}
func (s *stub) Try(ctx context.Context, _ method.Correction) (ResidualSums, error) {
	return s.residuals(ctx, "try")
}
func (s *stub) Correct(ctx context.Context, _ method.Correction) (ResidualSums, error) {
	return s.residuals(ctx, "correct")
}
func (s *stub) Keep(ctx context.Context) error { return s.call(ctx, "keep") }
func (s *stub) Recycle(ctx context.Context, _ method.Cycle) (RecycleSums, error) {
	return RecycleSums{SU: s.numbers(2), SAZ: s.numbers(2), HoldAZ: s.numbers(1)}, s.call(ctx, "recycle")
}
func (s *stub) Forget(ctx context.Context) error { return s.call(ctx, "forget") }
func (s *stub) Check(ctx context.Context) (ResidualSums, error) {
	return s.residuals(ctx, "check")
}
func (s *stub) Gradient(ctx context.Context) (PairSums, error) {
	return PairSums{First: Squares{0, s.value * s.value, 0}}, s.call(ctx, "gradient")
}
func (s *stub) Probe(ctx context.Context, _ method.Correction) (PairSums, error) {
	return PairSums{Second: Squares{0, s.value * s.value, 0}}, s.call(ctx, "probe")
}
func (s *stub) StartConjugate(ctx context.Context) (ConjugateSums, error) {
	return ConjugateSums{RR: s.value, RZ: s.value}, s.call(ctx, "start conjugate")
}
func (s *stub) Direct(ctx context.Context, _ float64) (ConjugateSums, error) {
	return ConjugateSums{RZ: s.value}, s.call(ctx, "direct")
}
func (s *stub) Move(ctx context.Context, _ float64) (ConjugateSums, error) {
	return ConjugateSums{RR: s.value, RZ: s.value}, s.call(ctx, "move")
}

// stubs makes a fleet with those values, answers arriving last block first.
func stubs(t *testing.T, values ...float64) ([]*stub, *Space) {
	t.Helper()
	all := make([]*stub, len(values))
	members := make([]Member, len(values))
	for i, v := range values {
		all[i] = &stub{name: string(rune('a' + i)), lo: 8 * i, hi: 8*i + 8, value: v, verbs: map[string]bool{}}
		members[i] = all[i]
	}
	for i := range len(values) - 1 {
		link := make(chan struct{}, 1)
		all[i].after, all[i+1].ended = link, link
	}
	f, err := New(members)
	if err != nil {
		t.Fatal(err)
	}
	return all, f
}

// verbs are all verbs of a fleet by their names in errors.
func verbs() map[string]func(context.Context, *Space) error {
	return map[string]func(context.Context, *Space) error{
		"start":    func(ctx context.Context, f *Space) error { _, err := f.Start(ctx, method.Cycle{}); return err },
		"advance":  func(ctx context.Context, f *Space) error { _, err := f.Advance(ctx, method.Step{}); return err },
		"sketches": func(ctx context.Context, f *Space) error { _, _, err := f.Sketches(ctx, 0, 2); return err },
		"reduce":   func(ctx context.Context, f *Space) error { _, _, err := f.Reduce(ctx, []float64{1}); return err },
		"try":      func(ctx context.Context, f *Space) error { _, err := f.Try(ctx, method.Correction{}); return err },
		"correct": func(ctx context.Context, f *Space) error {
			_, _, err := f.Correct(ctx, method.Correction{})
			return err
		},
		"keep":            func(ctx context.Context, f *Space) error { return f.Keep(ctx) },
		"recycle":         func(ctx context.Context, f *Space) error { _, err := f.Recycle(ctx, method.Cycle{}); return err },
		"forget":          func(ctx context.Context, f *Space) error { return f.Forget(ctx) },
		"check":           func(ctx context.Context, f *Space) error { _, err := f.Check(ctx); return err },
		"gradient":        func(ctx context.Context, f *Space) error { _, _, err := f.Gradient(ctx); return err },
		"probe":           func(ctx context.Context, f *Space) error { _, _, err := f.Probe(ctx, method.Correction{}); return err },
		"start conjugate": func(ctx context.Context, f *Space) error { _, _, err := f.StartConjugate(ctx); return err },
		"direct":          func(ctx context.Context, f *Space) error { _, err := f.Direct(ctx, 0); return err },
		"move":            func(ctx context.Context, f *Space) error { _, _, err := f.Move(ctx, 0); return err },
	}
}

// Sums are taken in block order: (1e16 + 1) − 1e16 is 0 in that order and 1 in the
// order of arrival, which is the reverse.
func TestSumsInBlockOrder(t *testing.T) {
	ctx := context.Background()
	_, f := stubs(t, 1, 1e16, -1e16)
	out, err := f.Advance(ctx, method.Step{})
	if err != nil || out.WW != 0 || out.Gram[0] != 0 || len(out.SketchW) != 3 {
		t.Errorf("Advance = %+v, %v; want sums of 0", out, err)
	}
	dots, ww, err := f.Reduce(ctx, []float64{1, 1})
	if err != nil || ww != 0 || len(dots) != 2 || dots[0] != 0 {
		t.Errorf("Reduce = %v, %v, %v; want sums of 0", dots, ww, err)
	}
	if rr, rz, err := f.Move(ctx, 1); err != nil || rr != 0 || rz != 0 {
		t.Errorf("Move = %v, %v, %v; want 0, 0", rr, rz, err)
	}
}

func TestResidualsOfMembers(t *testing.T) {
	_, f := stubs(t, 3, 4, 0.5)
	r, products, err := f.Correct(context.Background(), method.Correction{})
	if err != nil || products != 3 || r.ResidualMax != 4 || math.Abs(r.Inner-math.Sqrt(25.25)) > 1e-15*5 {
		t.Errorf("Correct = %+v, %d, %v", r, products, err)
	}
	want := []int{8, 0, 1, 9, 16, 17} // errors 4, 3, then 0.5 by row
	for i, w := range r.Worst {
		if w.Row != want[i] {
			t.Errorf("worst rows %v, want the rows %v", r.Worst, want)
		}
	}
}

// Whichever member fails at whichever verb, the error names it, the others are
// let go and no goroutine is left.
func TestEveryFailureIsNamed(t *testing.T) {
	broken := errors.New("cable pulled")
	for verb, call := range verbs() {
		for bad := range 3 {
			all, f := stubs(t, 1, 2, 3)
			for i, s := range all {
				s.after, s.ended = nil, nil
				s.hang = i != bad
			}
			all[bad].fail = broken
			err := call(context.Background(), f)
			var named *MemberError
			if !errors.As(err, &named) || !errors.Is(err, broken) {
				t.Errorf("%s, member %d fails: %v", verb, bad, err)
				continue
			}
			if named.Member != all[bad].name || named.Op != verb || named.Lo != 8*bad || named.Hi != 8*bad+8 {
				t.Errorf("%s, member %d fails: %+v", verb, bad, named)
			}
			if err := f.Keep(context.Background()); !errors.Is(err, ErrApart) || !errors.Is(err, broken) {
				t.Errorf("keep after a failed %s: %v", verb, err)
			}
			for _, s := range all {
				if !s.verbs[verb] {
					t.Errorf("%s did not reach member %s", verb, s.name)
				}
			}
		}
	}
}

// A verb that every member refuses leaves the fleet as it was; one that only some
// refuse does not.
func TestRefusals(t *testing.T) {
	for _, some := range []bool{false, true} {
		all, f := stubs(t, 1, 2)
		for i, s := range all {
			s.after, s.ended = nil, nil
			if i == 0 || !some {
				s.fail = fmt.Errorf("%w: not now", ErrRefused)
			}
		}
		if err := f.Keep(context.Background()); !errors.Is(err, ErrRefused) {
			t.Errorf("Keep refused: %v", err)
		}
		for _, s := range all {
			s.fail = nil
		}
		if err := f.Keep(context.Background()); errors.Is(err, ErrApart) != some {
			t.Errorf("Keep again, refused by some before %v: %v", some, err)
		}
	}
}

func TestCallersContextEndsVerbs(t *testing.T) {
	for _, members := range []int{1, 3} {
		all, f := stubs(t, make([]float64, members)...)
		for _, s := range all {
			s.hang = true
		}
		ctx, cancel := context.WithCancel(context.Background())
		cancel()
		if err := f.Keep(ctx); !errors.Is(err, context.Canceled) {
			t.Errorf("%d members: Keep under a cancelled context: %v", members, err)
		}
	}
}

func TestPartsOfOtherLengthsAreRefused(t *testing.T) {
	all, f := stubs(t, 1, 2)
	all[1].extra = 1
	for _, verb := range []string{"advance", "sketches", "reduce", "recycle"} {
		if err := verbs()[verb](context.Background(), f); err == nil || !strings.Contains(err.Error(), "b: "+verb) {
			t.Errorf("%s with sums of different lengths: %v", verb, err)
		}
	}
}

func TestNewWantsContiguousRows(t *testing.T) {
	a, b := &stub{name: "a", hi: 8}, &stub{name: "b", lo: 16, hi: 24}
	for name, members := range map[string][]Member{"none": nil, "a gap": {a, b}, "not from 0": {b}} {
		if _, err := New(members); err == nil {
			t.Errorf("New with %s: no error", name)
		}
	}
}

// The root of Squares is the norm, to a few roundings, whatever the sizes.
func TestRootIsTheNorm(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		base := rapid.IntRange(-1060, 1010).Draw(t, "exponent")
		spread := rapid.IntRange(1, 400).Draw(t, "spread")
		n := rapid.IntRange(1, 30).Draw(t, "numbers")
		var s Squares
		scaled := 0.0
		for range n {
			e := max(-1070, min(1015, base+rng.IntN(spread)-spread/2))
			v := math.Ldexp(1+rng.Float64(), e)
			q := math.Ldexp(v, -base)
			scaled += q * q
			addSquares(&s, squareOf(v))
		}
		want := math.Ldexp(math.Sqrt(scaled), base)
		if math.IsInf(scaled, 0) || scaled == 0 {
			t.Skip("out of the range of the check itself")
		}
		if got := root(s); math.Abs(got-want) > 1e-14*want+0x1p-1074 {
			t.Fatalf("root = %g, want %g", got, want)
		}
	})
	if got := root(Squares{0, math.NaN(), 0}); !math.IsNaN(got) {
		t.Errorf("root of NaN = %g", got)
	}
	if got := root(Squares{1, 2, math.Inf(1)}); !math.IsInf(got, 1) {
		t.Errorf("root of an infinity = %g", got)
	}
}

// squareOf is one number's Squares, as members make them.
func squareOf(v float64) (s Squares) {
	switch {
	case math.Abs(v) < 0x1p-511:
		s[0] = (v * 0x1p537) * (v * 0x1p537)
	case math.Abs(v) > 0x1p486:
		s[2] = (v * 0x1p-538) * (v * 0x1p-538)
	default:
		s[1] = v * v
	}
	return s
}
