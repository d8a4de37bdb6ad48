package spacetest

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"rowstead/coordinator/method"
)

// Factory makes the Space under test for a problem. The matrix is the Space's to
// keep or change. Diagonal asks for the preconditioner that divides by the
// diagonal of D·A (of S·A·S when Symmetric); Apply is that very function, for
// spaces that can take one.
type Factory func(t *testing.T, p Problem, diagonal bool) method.Space

// Suite runs the laws of method.Space on the spaces that make builds. A case
// has rows rows at least, so that a caller may reach several strips or blocks.
func Suite(t *testing.T, rows int, make Factory) {
	s := suite{make: make, cases: cases(rows)}
	for _, form := range []method.BasisForm{method.Double, method.Single} {
		for name, c := range s.cases {
			t.Run(fmt.Sprintf("%s %s", name, form), func(t *testing.T) { s.agrees(t, c, form) })
		}
	}
	t.Run("replay has the bits of double", s.replayIsDouble)
	t.Run("try leaves everything alone", s.tryLeavesAlone)
	t.Run("keep makes check what try said", s.keepThenCheck)
	t.Run("extreme right sides", s.extremes)
	t.Run("the worst rows are named", s.worstRows)
	t.Run("what is not finite is said", s.notFinite)
	t.Run("the same bits every time", s.sameBits)
	t.Run("refusals", s.refusals)
}

type suite struct {
	make  Factory
	cases map[string]suiteCase
}

// suiteCase is a problem and whether it has the diagonal preconditioner.
type suiteCase struct {
	p        Problem
	diagonal bool
}

// cases are problems by what is special about them.
func cases(atLeast int) map[string]suiteCase {
	rng := rand.New(rand.NewPCG(7, 11))
	side := 41
	plain := Problem{Matrix: grid(side, atLeast/side+1, 3, rng)}
	n := plain.Matrix.Rows
	plain.RowExponent, plain.Right = rowScale(plain.Matrix), normal(n, rng)
	guessed := plain
	guessed.Guess = normal(n, rng)
	loose := Problem{Matrix: irregular(atLeast+3, true, rng)}
	loose.RowExponent, loose.Right = rowScale(loose.Matrix), normal(atLeast+3, rng)
	unscaled := Problem{Matrix: irregular(atLeast+3, false, rng), RowExponent: make([]int16, atLeast+3)}
	unscaled.Right = normal(atLeast+3, rng)
	return map[string]suiteCase{
		"grid with bad rows":          {plain, false},
		"with a guess, diagonal":      {guessed, true},
		"irregular with an empty row": {loose, false},
		"irregular, diagonal, plain":  {unscaled, true},
	}
}

// space builds the space under test on a copy of the case.
func (s suite) space(t *testing.T, c suiteCase) method.Space {
	t.Helper()
	p := c.p
	if c.diagonal {
		p.Apply = byDiagonal(p.Matrix, p.RowExponent, false)
	}
	p.Matrix = copyMatrix(p.Matrix)
	return s.make(t, p, c.diagonal)
}

// twin builds the obvious space on the case.
func (s suite) twin(c suiteCase) *Simple {
	p := c.p
	if c.diagonal {
		p.Apply = byDiagonal(p.Matrix, p.RowExponent, false)
	}
	return New(p)
}

func cycleOf(form method.BasisForm, seed uint64) method.Cycle {
	return method.Cycle{Seed: seed, SketchRows: 64, Zeta: 4, Capacity: 9, Window: 3, Form: form}
}

// windowStep makes the step that follows from the last answer: h from its dots,
// as if the window were orthonormal.
func windowStep(out method.Stepped, j int) method.Step {
	h := append([]float64(nil), out.Dots[max(0, len(out.Dots)-3):]...)
	norm := out.WW
	for _, hi := range h {
		norm -= hi * hi
	}
	return method.Step{
		Lo: j + 1 - len(h), H: h, Norm: math.Sqrt(math.Max(norm, 1e-2*out.WW)),
		Product: true, Dots: 3, SketchW: j%2 == 0,
	}
}

// scenario runs two cycles with a recycled space between them and hands every
// number that the space answers to see, in order.
func scenario(t *testing.T, sp method.Space, form method.BasisForm, see func(name string, v ...float64)) {
	t.Helper()
	ctx := context.Background()
	var yu []float64
	for round := range uint64(2) {
		steps(t, sp, cycleOf(form, round+5), see)
		endCycle(t, sp, form, yu, see)
		rec := must(sp.Recycle(ctx, cycleOf(form, round+6)))(t)
		see("SU", rec.SU...)
		see("SAZ", rec.SAZ...)
		see("HoldAZ", rec.HoldAZ...)
		yu = []float64{0.25, -0.5, 1, 0.125}
	}
	seeResiduals(see, "Check", must(sp.Check(ctx))(t))
	g, r, err := sp.Gradient(ctx)
	if err != nil {
		t.Fatal(err)
	}
	see("Gradient", g, r)
	if err := sp.Forget(ctx); err != nil {
		t.Fatal(err)
	}
}

// steps starts a cycle and takes seven steps, the last without a product.
func steps(t *testing.T, sp method.Space, c method.Cycle, see func(name string, v ...float64)) {
	t.Helper()
	ctx := context.Background()
	res := must(sp.Start(ctx, c))(t)
	seeResiduals(see, "Start", res)
	step := method.Step{Norm: res.Inner, Product: true, Dots: 3}
	for j := range 7 {
		step.Product = j < 6
		out := must(sp.Advance(ctx, step))(t)
		see("Gram", out.Gram...)
		see("Dots", out.Dots...)
		see("WW", out.WW)
		see("SketchW", out.SketchW...)
		see("HoldW", out.HoldW...)
		if step.Product {
			step = windowStep(out, j)
		}
	}
	sb, hold, err := sp.Sketches(ctx, 1, 7)
	if err != nil {
		t.Fatal(err)
	}
	see("Sketches", sb...)
	see("Sketches hold", hold...)
}

// endCycle tries, probes, corrects and keeps.
func endCycle(t *testing.T, sp method.Space, form method.BasisForm, yu []float64, see func(name string, v ...float64)) {
	t.Helper()
	ctx := context.Background()
	cor := correction(7, yu, 4)
	if form != method.Replay {
		seeResiduals(see, "Try", must(sp.Try(ctx, method.Correction{Y: cor.Y[:5], YU: cor.YU}))(t))
		v, av, err := sp.Probe(ctx, cor)
		if err != nil {
			t.Fatal(err)
		}
		see("Probe", v, av)
	}
	res, products, err := sp.Correct(ctx, cor)
	if err != nil {
		t.Fatal(err)
	}
	if want := map[bool]int{true: 6}[form == method.Replay]; products != want {
		t.Errorf("Correct in %s form spent %d products, want %d", form, products, want)
	}
	seeResiduals(see, "Correct", res)
	if err := sp.Keep(ctx); err != nil {
		t.Fatal(err)
	}
}

// correction has small fixed numbers, different everywhere.
func correction(k int, yu []float64, directions int) method.Correction {
	c := method.Correction{YU: yu, Directions: directions}
	for i := range k {
		c.Y = append(c.Y, 1/float64(i+2))
	}
	for i := range (k + len(yu)) * directions {
		c.T = append(c.T, math.Cos(float64(3*i+1)))
	}
	return c
}

// must unwraps an answer.
func must[T any](v T, err error) func(t *testing.T) T {
	return func(t *testing.T) T {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
}

// rowOf begins the names of answers that are row numbers.
const rowOf = "row of "

func seeResiduals(see func(string, ...float64), verb string, r method.Residuals) {
	see(verb+".Inner", r.Inner, r.InnerRight)
	see(verb+".True", r.True, r.Right)
	see(verb+".Scaled", r.Scaled, r.ScaledRight)
	see(verb+".Floors", r.TrueFloor, r.ScaledFloor)
	see(verb+".RowWise", r.RowWise)
	see(verb+".Max", r.ResidualMax, r.RightMax, r.SolutionMax, r.MatrixMax)
	see(verb+".Solution", r.Solution, r.InnerMatrix)
	for _, w := range r.Worst {
		see(verb+".Worst", w.Error)
		see(rowOf+verb, float64(w.Row))
	}
	finite := 0.0
	if r.Finite {
		finite = 1
	}
	see(verb+".Finite", finite)
}
