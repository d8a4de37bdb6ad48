package fleet

import (
	"context"

	"rowstead/coordinator/method"
)

var (
	_ method.Space          = (*Space)(nil)
	_ method.ConjugateSpace = (*Space)(nil)
)

// residualVerb runs a verb that answers with residuals.
func (f *Space) residualVerb(ctx context.Context, op string, call func(context.Context, Member) (ResidualSums, error)) (method.Residuals, int, error) {
	parts, err := fanOut(ctx, f, op, call)
	if err != nil {
		return method.Residuals{}, 0, err
	}
	return residuals(parts), parts[0].Products, nil
}

// Start implements method.Space.
func (f *Space) Start(ctx context.Context, c method.Cycle) (method.Residuals, error) {
	r, _, err := f.residualVerb(ctx, "start", func(ctx context.Context, m Member) (ResidualSums, error) {
		return m.Start(ctx, c)
	})
	return r, err
}

// Advance implements method.Space. The slices of the answer stay valid until the
// next Advance.
func (f *Space) Advance(ctx context.Context, s method.Step) (method.Stepped, error) {
	parts, err := fanOut(ctx, f, "advance", func(ctx context.Context, m Member) (StepSums, error) {
		return m.Advance(ctx, s)
	})
	if err != nil {
		return method.Stepped{}, err
	}
	out := &f.stepped
	out.WW = 0
	for i, p := range parts {
		out.WW += p.WW
		if err := f.add("advance", i, sums{&out.Gram, p.Gram}, sums{&out.Dots, p.Dots},
			sums{&out.SketchW, p.SketchW}, sums{&out.HoldW, p.HoldW}); err != nil {
			return method.Stepped{}, err
		}
	}
	return *out, nil
}

// Sketches implements method.Space.
func (f *Space) Sketches(ctx context.Context, from, to int) (sb, hold []float64, err error) {
	parts, err := fanOut(ctx, f, "sketches", func(ctx context.Context, m Member) (SketchSums, error) {
		return m.Sketches(ctx, from, to)
	})
	if err != nil {
		return nil, nil, err
	}
	for i, p := range parts {
		if err := f.add("sketches", i, sums{&f.sb, p.Sketch}, sums{&f.sh, p.Hold}); err != nil {
			return nil, nil, err
		}
	}
	return f.sb, f.sh, nil
}

// Reduce implements method.Space. dots belongs to the caller.
func (f *Space) Reduce(ctx context.Context, h []float64) (dots []float64, ww float64, err error) {
	parts, err := fanOut(ctx, f, "reduce", func(ctx context.Context, m Member) (DotSums, error) {
		return m.Reduce(ctx, h)
	})
	if err != nil {
		return nil, 0, err
	}
	for i, p := range parts {
		ww += p.WW
		if err := f.add("reduce", i, sums{&dots, p.Dots}); err != nil {
			return nil, 0, err
		}
	}
	return dots, ww, nil
}

// Try implements method.Space.
func (f *Space) Try(ctx context.Context, c method.Correction) (method.Residuals, error) {
	r, _, err := f.residualVerb(ctx, "try", func(ctx context.Context, m Member) (ResidualSums, error) {
		return m.Try(ctx, c)
	})
	return r, err
}

// Correct implements method.Space.
func (f *Space) Correct(ctx context.Context, c method.Correction) (r method.Residuals, products int, err error) {
	return f.residualVerb(ctx, "correct", func(ctx context.Context, m Member) (ResidualSums, error) {
		return m.Correct(ctx, c)
	})
}

// Keep implements method.Space.
func (f *Space) Keep(ctx context.Context) error {
	return f.do(ctx, "keep", func(ctx context.Context, m Member) error { return m.Keep(ctx) })
}

// Recycle implements method.Space. The slices belong to the caller.
func (f *Space) Recycle(ctx context.Context, next method.Cycle) (method.Recycled, error) {
	parts, err := fanOut(ctx, f, "recycle", func(ctx context.Context, m Member) (RecycleSums, error) {
		return m.Recycle(ctx, next)
	})
	if err != nil {
		return method.Recycled{}, err
	}
	var out method.Recycled
	for i, p := range parts {
		if err := f.add("recycle", i, sums{&out.SU, p.SU}, sums{&out.SAZ, p.SAZ}, sums{&out.HoldAZ, p.HoldAZ}); err != nil {
			return method.Recycled{}, err
		}
	}
	return out, nil
}

// Forget implements method.Space.
func (f *Space) Forget(ctx context.Context) error {
	return f.do(ctx, "forget", func(ctx context.Context, m Member) error { return m.Forget(ctx) })
}

// Check implements method.Space and method.ConjugateSpace.
func (f *Space) Check(ctx context.Context) (method.Residuals, error) {
	r, _, err := f.residualVerb(ctx, "check", func(ctx context.Context, m Member) (ResidualSums, error) {
		return m.Check(ctx)
	})
	return r, err
}

// Gradient implements method.Space.
func (f *Space) Gradient(ctx context.Context) (gradient, residual float64, err error) {
	return f.pair(ctx, "gradient", func(ctx context.Context, m Member) (PairSums, error) {
		return m.Gradient(ctx)
	})
}

// Probe implements method.Space.
func (f *Space) Probe(ctx context.Context, c method.Correction) (v, av float64, err error) {
	return f.pair(ctx, "probe", func(ctx context.Context, m Member) (PairSums, error) {
		return m.Probe(ctx, c)
	})
}

func (f *Space) pair(ctx context.Context, op string, call func(context.Context, Member) (PairSums, error)) (first, second float64, err error) {
	parts, err := fanOut(ctx, f, op, call)
	if err != nil {
		return 0, 0, err
	}
	var sum PairSums
	for _, p := range parts {
		addSquares(&sum.First, p.First)
		addSquares(&sum.Second, p.Second)
	}
	return root(sum.First), root(sum.Second), nil
}

// StartConjugate implements method.ConjugateSpace.
func (f *Space) StartConjugate(ctx context.Context) (rr, rz float64, err error) {
	return f.conjugate(ctx, "start conjugate", func(ctx context.Context, m Member) (ConjugateSums, error) {
		return m.StartConjugate(ctx)
	})
}

// Direct implements method.ConjugateSpace.
func (f *Space) Direct(ctx context.Context, beta float64) (pq float64, err error) {
	_, pq, err = f.conjugate(ctx, "direct", func(ctx context.Context, m Member) (ConjugateSums, error) {
		return m.Direct(ctx, beta)
	})
	return pq, err
}

// Move implements method.ConjugateSpace.
func (f *Space) Move(ctx context.Context, alpha float64) (rr, rz float64, err error) {
	return f.conjugate(ctx, "move", func(ctx context.Context, m Member) (ConjugateSums, error) {
		return m.Move(ctx, alpha)
	})
}

func (f *Space) conjugate(ctx context.Context, op string, call func(context.Context, Member) (ConjugateSums, error)) (rr, rz float64, err error) {
	parts, err := fanOut(ctx, f, op, call)
	if err != nil {
		return 0, 0, err
	}
	for _, p := range parts {
		rr += p.RR
		rz += p.RZ
	}
	return rr, rz, nil
}
