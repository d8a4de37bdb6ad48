package remote

import (
	"context"
	"fmt"

	"rowstead/coordinator/fleet"
	"rowstead/coordinator/method"
	"rowstead/proto"
)

var _ fleet.Member = (*Worker)(nil)

// Range returns the worker's rows [lo, hi).
func (w *Worker) Range() (lo, hi int) { return w.lo, w.hi }

// numbers is call for an order whose reply is that many numbers.
func (w *Worker) numbers(ctx context.Context, want int, o *proto.Order, floats ...[]float64) (answer, error) {
	a, err := w.call(ctx, o, nil, floats...)
	if err == nil && (a.GetNumbers() == nil || (want >= 0 && len(a.floats) != want)) {
		err = errAnswer
	}
	return a, err
}

func empty() *proto.Empty { return &proto.Empty{} }

func cycle(c method.Cycle) *proto.Cycle {
	return &proto.Cycle{
		Seed: c.Seed, SketchRows: int64(c.SketchRows), Zeta: int32(c.Zeta),
		Capacity: int64(c.Capacity), Window: int64(c.Window), Form: string(c.Form),
	}
}

// sketchWidth is the number of floats of both sketches of a vector.
func sketchWidth(c method.Cycle) int {
	if c.SketchRows == 0 {
		return 0
	}
	return c.SketchRows + method.HoldRows
}

// correction is c with its numbers.
func correction(c method.Correction) (*proto.Correction, [][]float64) {
	return &proto.Correction{
		Y: int64(len(c.Y)), Yu: int64(len(c.YU)), HasYu: c.YU != nil, HasT: c.T != nil, Directions: int64(c.Directions),
	}, [][]float64{c.Y, c.YU, c.T}
}

// residuals is call for an order whose reply is residuals.
func (w *Worker) residuals(ctx context.Context, o *proto.Order, floats ...[]float64) (fleet.ResidualSums, error) {
	a, err := w.call(ctx, o, nil, floats...)
	if err != nil {
		return fleet.ResidualSums{}, err
	}
	const fixed = 34
	told := a.GetResiduals()
	if told == nil || len(a.floats) != fixed+len(told.WorstRow) {
		return fleet.ResidualSums{}, errAnswer
	}
	r := fleet.ResidualSums{Finite: told.Finite, Products: int(told.Products), WorstError: a.floats[fixed:]}
	for k, sum := range []*fleet.Squares{
		&r.Inner, &r.InnerRight, &r.True, &r.Right, &r.Scaled, &r.ScaledRight, &r.TrueFloor, &r.ScaledFloor, &r.Solution, &r.InnerMatrix,
	} {
		*sum = fleet.Squares(a.floats[3*k : 3*k+3])
	}
	r.ResidualMax, r.RightMax, r.SolutionMax, r.MatrixMax = a.floats[30], a.floats[31], a.floats[32], a.floats[33]
	for _, row := range told.WorstRow {
		if int(row) < w.lo || int(row) >= w.hi {
			return fleet.ResidualSums{}, fmt.Errorf("row %d is not one of its own", row)
		}
		r.WorstRow = append(r.WorstRow, int(row))
	}
	return r, nil
}

// Start implements fleet.Member.
func (w *Worker) Start(ctx context.Context, c method.Cycle) (fleet.ResidualSums, error) {
	r, err := w.residuals(ctx, &proto.Order{What: &proto.Order_Start{Start: cycle(c)}})
	if err == nil {
		w.recent.reset(sketchWidth(c))
	}
	return r, err
}

// Advance implements fleet.Member. The few numbers come at once, the sketches of
// the new vector behind them.
func (w *Worker) Advance(ctx context.Context, s method.Step) (fleet.StepSums, error) {
	step := &proto.Step{Lo: int64(s.Lo), Product: s.Product, Dots: int64(s.Dots), SketchW: s.SketchW}
	a, err := w.call(ctx, &proto.Order{What: &proto.Order_Advance{Advance: step}}, nil, s.H, []float64{s.Norm})
	if err != nil {
		return fleet.StepSums{}, err
	}
	w.stepBytes.Add(int64(a.bytes))
	w.recent.made()
	return stepSums(a)
}

// stepSums takes the numbers of a Sums apart.
func stepSums(a answer) (fleet.StepSums, error) {
	told, rest := a.GetSums(), a.floats
	if told == nil {
		return fleet.StepSums{}, errAnswer
	}
	part := func(n int64) []float64 {
		if n < 0 || n > int64(len(rest)) {
			n, rest = 0, nil // the lengths below then disagree
		}
		var p []float64
		p, rest = rest[:n:n], rest[n:]
		return p
	}
	var r fleet.StepSums
	r.Gram, r.Dots = part(told.Gram), part(told.Dots)
	if ww := part(1); len(ww) == 1 {
		r.WW = ww[0]
	}
	r.SketchW, r.HoldW = part(told.SketchW), part(told.HoldW)
	if int64(len(a.floats)) != told.Gram+told.Dots+1+told.SketchW+told.HoldW || len(rest) != 0 {
		return fleet.StepSums{}, errAnswer
	}
	return r, nil
}

// Sketches implements fleet.Member: it waits for what was sent behind the steps,
// or asks again for what has been collected before.
func (w *Worker) Sketches(ctx context.Context, from, to int) (fleet.SketchSums, error) {
	var out fleet.SketchSums
	if w.recent.knows(from, to) {
		err := w.recent.take(ctx, w.pipe, from, to, func(both []float64) {
			rows := len(both) - method.HoldRows
			out.Sketch, out.Hold = append(out.Sketch, both[:rows]...), append(out.Hold, both[rows:]...)
		})
		if err != nil && ctx.Err() == nil {
			err = w.broken(err)
		}
		return out, err
	}
	a, err := w.numbers(ctx, -1, &proto.Order{What: &proto.Order_Sketches{Sketches: &proto.Range{From: int64(from), To: int64(to)}}})
	hold := method.HoldRows * (to - from)
	if err == nil && len(a.floats) < hold {
		err = errAnswer
	}
	if err != nil {
		return out, err
	}
	w.stepBytes.Add(int64(a.bytes))
	rows := len(a.floats) - hold
	return fleet.SketchSums{Sketch: a.floats[:rows], Hold: a.floats[rows:]}, nil
}

// Reduce implements fleet.Member.
func (w *Worker) Reduce(ctx context.Context, h []float64) (fleet.DotSums, error) {
	a, err := w.call(ctx, &proto.Order{What: &proto.Order_Reduce{Reduce: empty()}}, nil, h)
	if err != nil {
		return fleet.DotSums{}, err
	}
	w.stepBytes.Add(int64(a.bytes))
	r, err := stepSums(a)
	return fleet.DotSums{Dots: r.Dots, WW: r.WW}, err
}

// Try implements fleet.Member.
func (w *Worker) Try(ctx context.Context, c method.Correction) (fleet.ResidualSums, error) {
	form, numbers := correction(c)
	return w.residuals(ctx, &proto.Order{What: &proto.Order_Try{Try: form}}, numbers...)
}

// Correct implements fleet.Member.
func (w *Worker) Correct(ctx context.Context, c method.Correction) (fleet.ResidualSums, error) {
	form, numbers := correction(c)
	return w.residuals(ctx, &proto.Order{What: &proto.Order_Correct{Correct: form}}, numbers...)
}

// Keep implements fleet.Member.
func (w *Worker) Keep(ctx context.Context) error {
	return w.ask(ctx, &proto.Order{What: &proto.Order_Keep{Keep: empty()}}, nil)
}

// Recycle implements fleet.Member.
func (w *Worker) Recycle(ctx context.Context, next method.Cycle) (fleet.RecycleSums, error) {
	a, err := w.numbers(ctx, -1, &proto.Order{What: &proto.Order_Recycle{Recycle: cycle(next)}})
	if err != nil {
		return fleet.RecycleSums{}, err
	}
	per := 2*next.SketchRows + method.HoldRows
	if len(a.floats)%per != 0 {
		return fleet.RecycleSums{}, errAnswer
	}
	sketch := next.SketchRows * (len(a.floats) / per)
	return fleet.RecycleSums{SU: a.floats[:sketch:sketch], SAZ: a.floats[sketch : 2*sketch : 2*sketch], HoldAZ: a.floats[2*sketch:]}, nil
}

// Forget implements fleet.Member.
func (w *Worker) Forget(ctx context.Context) error {
	return w.ask(ctx, &proto.Order{What: &proto.Order_Forget{Forget: empty()}}, nil)
}

// Check implements fleet.Member.
func (w *Worker) Check(ctx context.Context) (fleet.ResidualSums, error) {
	return w.residuals(ctx, &proto.Order{What: &proto.Order_Check{Check: empty()}})
}

// pair is call for an order whose reply is two norms.
func (w *Worker) pair(ctx context.Context, o *proto.Order, floats ...[]float64) (fleet.PairSums, error) {
	a, err := w.numbers(ctx, 6, o, floats...)
	if err != nil {
		return fleet.PairSums{}, err
	}
	return fleet.PairSums{First: fleet.Squares(a.floats[:3]), Second: fleet.Squares(a.floats[3:])}, nil
}

// Gradient implements fleet.Member.
func (w *Worker) Gradient(ctx context.Context) (fleet.PairSums, error) {
	return w.pair(ctx, &proto.Order{What: &proto.Order_Gradient{Gradient: empty()}})
}

// Probe implements fleet.Member.
func (w *Worker) Probe(ctx context.Context, c method.Correction) (fleet.PairSums, error) {
	form, numbers := correction(c)
	return w.pair(ctx, &proto.Order{What: &proto.Order_Probe{Probe: form}}, numbers...)
}
