package spacetest

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"rowstead/coordinator/method"
)

// seen is what a space answered, by name.
type seen struct {
	name string
	v    []float64
}

// watch collects a scenario.
func watch(t *testing.T, sp method.Space, form method.BasisForm) []seen {
	t.Helper()
	var all []seen
	scenario(t, sp, form, func(name string, v ...float64) {
		all = append(all, seen{name, slices.Clone(v)})
	})
	return all
}

// agrees: every number of a scenario is that of dense arithmetic, to rounding:
// 1e-9 of the largest number of the same answer. Sums of a few thousand terms are
// apart by some 1e-15, and each of the seven steps, which divide by what is left
// of w, may multiply that by ten. In single form a last bit of w may round b_j
// differently, by 2^-24.
func (s suite) agrees(t *testing.T, c suiteCase, form method.BasisForm) {
	tolerance := 1e-9
	if form == method.Single {
		tolerance = 1e-6
	}
	got := watch(t, s.space(t, c), form)
	want := watch(t, s.twin(c), form)
	if len(got) != len(want) {
		t.Fatalf("%d answers, want %d", len(got), len(want))
	}
	for i, w := range want {
		if got[i].name != w.name || len(got[i].v) != len(w.v) {
			t.Fatalf("answer %d: %s with %d numbers, want %s with %d", i, got[i].name, len(got[i].v), w.name, len(w.v))
		}
		if strings.HasPrefix(w.name, rowOf) {
			continue // errors that are equal but for rounding stand in any order
		}
		scale := maxAbs(w.v)
		for k, v := range w.v {
			if d := math.Abs(got[i].v[k] - v); !(d <= tolerance*scale) {
				t.Errorf("answer %d, %s[%d]: got %v, want %v, apart by %.1e of the largest", i, w.name, k, got[i].v[k], v, d/scale)
			}
		}
	}
}

// equalBits fails unless both scenarios have the same bits.
func equalBits(t *testing.T, got, want []seen) {
	t.Helper()
	if d := (&Trace{want}).Difference(&Trace{got}); d != "" {
		t.Fatalf("wanted first: %s", d)
	}
}

// sameBits: ten runs of a scenario give the same bits.
func (s suite) sameBits(t *testing.T) {
	for _, name := range []string{"grid with bad rows", "irregular, diagonal, plain"} {
		c := s.cases[name]
		t.Run(name, func(t *testing.T) {
			want := watch(t, s.space(t, c), method.Double)
			for range 9 {
				equalBits(t, watch(t, s.space(t, c), method.Double), want)
			}
		})
	}
}

// replayIsDouble: replay form has the bits of double form, to the last.
func (s suite) replayIsDouble(t *testing.T) {
	for name, c := range s.cases {
		t.Run(name, func(t *testing.T) {
			double := watch(t, s.space(t, c), method.Double)
			double = slices.DeleteFunc(double, func(a seen) bool {
				name := strings.TrimPrefix(a.name, rowOf)
				return name == "Try" || strings.HasPrefix(name, "Try.") || name == "Probe"
			})
			equalBits(t, watch(t, s.space(t, c), method.Replay), double)
		})
	}
}

// begin starts a cycle and takes two steps; next is the third.
func begin(t *testing.T, sp method.Space, form method.BasisForm) (next method.Step) {
	t.Helper()
	ctx := context.Background()
	res := must(sp.Start(ctx, cycleOf(form, 1)))(t)
	step := method.Step{Norm: res.Inner, Product: true, Dots: 3}
	for j := range 2 {
		step = windowStep(must(sp.Advance(ctx, step))(t), j)
	}
	return step
}

// tryLeavesAlone: after any number of Try and Probe, Check and the next step have
// the bits they would have had.
func (s suite) tryLeavesAlone(t *testing.T) {
	ctx := context.Background()
	for name, c := range s.cases {
		t.Run(name, func(t *testing.T) {
			quiet, tried := s.space(t, c), s.space(t, c)
			step := begin(t, quiet, method.Double)
			begin(t, tried, method.Double)
			must(tried.Try(ctx, method.Correction{Y: []float64{0.5}}))(t)
			must(tried.Try(ctx, method.Correction{Y: []float64{-3, 2}}))(t)
			if _, _, err := tried.Probe(ctx, method.Correction{Y: []float64{1, 1}}); err != nil {
				t.Fatal(err)
			}
			look := func(sp method.Space) (all []seen) {
				see := func(name string, v ...float64) { all = append(all, seen{name, slices.Clone(v)}) }
				out := must(sp.Advance(ctx, step))(t)
				see("step", append(slices.Concat(out.Gram, out.Dots, out.SketchW, out.HoldW), out.WW)...)
				dots, ww, err := sp.Reduce(ctx, []float64{0.1, -0.2, 0.3})
				if err != nil {
					t.Fatal(err)
				}
				see("reduce", append(slices.Clone(dots), ww)...)
				seeResiduals(see, "Check", must(sp.Check(ctx))(t))
				return all
			}
			equalBits(t, look(tried), look(quiet))
		})
	}
}

// keepThenCheck: after Keep, Check has the bits of the Try or Correct before.
func (s suite) keepThenCheck(t *testing.T) {
	ctx := context.Background()
	for name, c := range s.cases {
		t.Run(name, func(t *testing.T) {
			sp := s.space(t, c)
			begin(t, sp, method.Double)
			said := must(sp.Try(ctx, method.Correction{Y: []float64{2, -1}}))(t)
			if err := sp.Keep(ctx); err != nil {
				t.Fatal(err)
			}
			bits := func(r method.Residuals) (all []seen) {
				seeResiduals(func(name string, v ...float64) { all = append(all, seen{name, v}) }, "", r)
				return all
			}
			equalBits(t, bits(must(sp.Check(ctx))(t)), bits(said))
		})
	}
}

// extremes: with b times a power of two, as far as 1e±300, x grows by that power
// and every number of the basis keeps its bits.
func (s suite) extremes(t *testing.T) {
	ctx := context.Background()
	for _, e := range []int{-996, 996, -1020} {
		c := s.cases["grid with bad rows"]
		base := s.space(t, c)
		right := slices.Clone(c.p.Right)
		for i := range right {
			// 1/norm must not overflow, nor may a square
			right[i] = math.Ldexp(right[i], e)
		}
		c.p.Right = right
		far := s.space(t, c)
		r0, r1 := must(base.Start(ctx, cycleOf(method.Double, 1)))(t), must(far.Start(ctx, cycleOf(method.Double, 1)))(t)
		for _, pair := range [][2]float64{{r0.Inner, r1.Inner}, {r0.True, r1.True}, {r0.Scaled, r1.Scaled}, {r0.Right, r1.Right}} {
			if want := math.Ldexp(pair[0], e); !(math.Abs(pair[1]-want) <= 1e-14*want) {
				t.Errorf("b·2^%d: norm %g, want %g", e, pair[1], want)
			}
		}
		out0 := must(base.Advance(ctx, method.Step{Norm: r0.Inner, Product: true, Dots: 3}))(t)
		out1 := must(far.Advance(ctx, method.Step{Norm: math.Ldexp(r0.Inner, e), Product: true, Dots: 3}))(t)
		for i, d := range out0.Dots {
			if !(math.Abs(out1.Dots[i]-d) <= 1e-12*math.Abs(d)) || !(math.Abs(out1.Gram[i]-out0.Gram[i]) <= 1e-12) {
				t.Errorf("b·2^%d: dots %v, Gram %v, want %v, %v", e, out1.Dots, out1.Gram, out0.Dots, out0.Gram)
			}
		}
		y := 0.25 * r0.Inner
		t0 := must(base.Try(ctx, method.Correction{Y: []float64{y}}))(t)
		t1 := must(far.Try(ctx, method.Correction{Y: []float64{math.Ldexp(y, e)}}))(t)
		if want := math.Ldexp(t0.True, e); !t1.Finite || !(math.Abs(t1.True-want) <= 1e-12*want) {
			t.Errorf("b·2^%d: Try %g, want %g", e, t1.True, want)
		}
	}
}

// worstRows: b = A·x but for ten rows; the eight with the largest row-wise errors
// come first, worst first.
func (s suite) worstRows(t *testing.T) {
	c := s.cases["with a guess, diagonal"]
	n := c.p.Matrix.Rows
	right := make([]float64, n)
	c.p.Matrix.Mul(right, c.p.Guess)
	size := make([]float64, n) // about |A|·|x| + |b|
	for i := range size {
		cols, vals := c.p.Matrix.Row(i)
		size[i] = math.Abs(right[i])
		for k, j := range cols {
			size[i] += math.Abs(vals[k] * c.p.Guess[j])
		}
	}
	var want []int
	for k := range 10 {
		row := (k*7*n/10 + 3*k) % n
		right[row] += size[row] * math.Ldexp(1, -4-3*k)
		want = append(want, row)
	}
	c.p.Right = right
	r := must(s.space(t, c).Check(context.Background()))(t)
	var got []int
	for k, w := range r.Worst {
		got = append(got, w.Row)
		if e := math.Ldexp(1, -4-3*k); !(math.Abs(w.Error-e) <= 0.1*e) {
			t.Errorf("worst row %d: error %g, want about %g", w.Row, w.Error, e)
		}
	}
	if !slices.Equal(got, want[:8]) || r.RowWise != r.Worst[0].Error {
		t.Errorf("worst rows %v, want %v", got, want[:8])
	}
}

// notFinite: an x with a NaN or an infinity is told by Finite, and nothing fails.
func (s suite) notFinite(t *testing.T) {
	for _, bad := range []float64{math.NaN(), math.Inf(-1)} {
		c := s.cases["with a guess, diagonal"]
		guess := slices.Clone(c.p.Guess)
		guess[len(guess)/2] = bad
		c.p.Guess = guess
		if r := must(s.space(t, c).Check(context.Background()))(t); r.Finite {
			t.Errorf("x with %v: Finite is true", bad)
		}
		if r := must(s.twin(c).Check(context.Background()))(t); r.Finite {
			t.Errorf("x with %v: Finite is true in the twin", bad)
		}
	}
}

// refusals: what cannot be done is an error, not a panic and not a number.
func (s suite) refusals(t *testing.T) {
	ctx := context.Background()
	sp := s.space(t, s.cases["grid with bad rows"])
	begin(t, sp, method.Replay)
	if _, err := sp.Try(ctx, method.Correction{Y: []float64{1}}); err == nil {
		t.Error("Try in replay form: no error")
	}
	if _, _, err := sp.Reduce(ctx, []float64{1, 1}); err == nil {
		t.Error("Reduce in replay form: no error")
	}
}

// Trace is all that a space answered in a scenario.
type Trace struct{ answers []seen }

// Record runs a scenario on a grid of at least so many rows.
func Record(t *testing.T, rows int, form method.BasisForm, make Factory) *Trace {
	t.Helper()
	rng := rand.New(rand.NewPCG(7, 11))
	p := Problem{Matrix: grid(100, rows/100+1, 3, rng)}
	p.RowExponent, p.Right = rowScale(p.Matrix), normal(p.Matrix.Rows, rng)
	return &Trace{watch(t, make(t, p, false), form)}
}

// Difference says where two traces differ in a bit, "" where they do not.
func (a *Trace) Difference(b *Trace) string {
	if len(a.answers) != len(b.answers) {
		return fmt.Sprintf("%d answers and %d", len(a.answers), len(b.answers))
	}
	for i, x := range a.answers {
		y := b.answers[i]
		if x.name != y.name || len(x.v) != len(y.v) {
			return fmt.Sprintf("answer %d: %s with %d numbers and %s with %d", i, x.name, len(x.v), y.name, len(y.v))
		}
		for k, v := range x.v {
			if math.Float64bits(v) != math.Float64bits(y.v[k]) {
				return fmt.Sprintf("answer %d, %s[%d]: %v and %v", i, x.name, k, v, y.v[k])
			}
		}
	}
	return ""
}
