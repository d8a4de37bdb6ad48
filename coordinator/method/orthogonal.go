package method

import (
	"context"
	"fmt"
	"math"
	"slices"

	"rowstead/coordinator/small"
)

// solveOrthogonal is GMRES with classical Gram-Schmidt repeated once, restarted
// every o.Cycle steps: the honest reference for the sketched method, and the
// method for short problems. Saad, Iterative Methods for Sparse Linear Systems,
// 2nd ed., section 6.5.
//
// With o.handOver a cycle that gains little ends it as stagnated: another method
// is waiting.
func solveOrthogonal(ctx context.Context, sp Space, o Options, res *Result) error {
	r := &run{sp: sp, o: o, res: res}
	still := 0
	for {
		conf := Cycle{Capacity: o.Cycle + 1, Window: 1, Form: Double}
		start, err := sp.Start(ctx, conf)
		if err != nil {
			return err
		}
		res.Products++
		r.residuals = start
		if r.finished(start) {
			break
		}
		if err := r.orthogonalCycle(ctx, conf); err != nil {
			return err
		}
		res.Cycles++
		if r.residuals.Met(o.Tolerance) || r.reason != "" {
			break
		}
		slow := 0.98
		if o.handOver {
			slow, still = handOverAbove, 2
		}
		if r.residuals.Inner > slow*start.Inner {
			still++
		} else {
			still = 0
		}
		if still == 0 {
			continue
		}
		reason, err := r.whyStagnated(ctx)
		if err != nil {
			return err
		}
		if still == 3 || reason != ReasonStagnated {
			r.reason = reason
			break
		}
	}
	res.Residuals, res.Reason = r.residuals, r.reason
	res.ConditionHint, res.ForwardError = hints(r.residuals, r.inverse, sp.Rows())
	return nil
}

// handOverAbove is the reduction of a whole cycle above which restarts cost so
// much that recycling between cycles is worth more than orthogonality.
const handOverAbove = 0.5

// orthogonalCycle builds one cycle and corrects x.
func (r *run) orthogonalCycle(ctx context.Context, conf Cycle) error {
	beta := r.residuals.Inner
	aim := 0.9 * beta / r.residuals.excess(r.o.Tolerance)
	ls := small.NewHessenberg(conf.Capacity)
	ls.Reset(small.NewTriangle(1, []float64{1}), 0, beta)
	next, tries := Step{Norm: beta}, 0
	for j := 0; ; j++ {
		if r.stopped() && j > 0 || j == conf.Capacity-1 {
			return r.orthogonalCorrect(ctx, ls, fmt.Sprintf("%d orthogonal steps", j))
		}
		next.Product, next.Dots = true, j+1
		reply, err := r.sp.Advance(ctx, next)
		if err != nil {
			return err
		}
		first := slices.Clone(reply.Dots) // the answer's slices last until the next verb
		again, ww, err := r.sp.Reduce(ctx, first)
		if err != nil {
			return err
		}
		r.res.Products++
		r.res.Steps++
		column, norm := orthogonalColumn(first, again, ww)
		if !finite(norm) {
			return r.orthogonalCorrect(ctx, ls, "not finite")
		}
		ls.Append(column)
		if !(norm > negligible*math.Sqrt(reply.WW)) {
			return r.orthogonalCorrect(ctx, ls, "invariant space")
		}
		r.observe(ls.Estimate())
		if ls.Estimate() <= aim && tries < maxTries {
			tries++
			got, err := r.sp.Try(ctx, Correction{Y: solved(ls)})
			if err != nil {
				return err
			}
			r.res.Products++
			if got.Met(r.o.Tolerance) {
				r.residuals = got
				r.res.Story = append(r.res.Story, Event{Cycle: r.res.Cycles, Step: j + 1, Products: r.res.Products, Text: "met"})
				if err := r.sp.Keep(ctx); err != nil {
					return err
				}
				return r.orthogonalProbe(ctx, ls)
			}
			if !got.Finite || got.Inner > 5*ls.Estimate() {
				return r.orthogonalCorrect(ctx, ls, endGap)
			}
			aim = min(0.7*aim, 0.8*ls.Estimate()/got.excess(r.o.Tolerance))
		}
		next = Step{H: slices.Clone(again), Norm: norm}
	}
}

// orthogonalColumn adds the two projections and the norm of what is left.
func orthogonalColumn(first, again []float64, ww float64) (column []float64, norm float64) {
	column = make([]float64, len(first)+1)
	left := ww
	for i, v := range again {
		column[i] = first[i] + v
		left -= float64(v * v)
	}
	norm = math.Sqrt(max(left, 0))
	if !finite(ww) {
		norm = math.NaN()
	}
	column[len(first)] = norm
	return column, norm
}

func (r *run) orthogonalCorrect(ctx context.Context, ls *small.Hessenberg, end string) error {
	y := solved(ls)
	if len(y) == 0 || !allFinite(y) {
		return nil
	}
	got, products, err := r.sp.Correct(ctx, Correction{Y: y})
	if err != nil {
		return err
	}
	r.res.Products += products + 1
	if !better(got, r.residuals.Inner) {
		if got, err = r.tryTruncated(ctx, ls, got); err != nil {
			return err
		}
	}
	r.res.Story = append(r.res.Story, Event{Cycle: r.res.Cycles, Step: len(y), Products: r.res.Products,
		Text: fmt.Sprintf("%s: true residual %.2e, scaled %.2e", end, got.TrueResidual(), got.ScaledResidual())})
	if !better(got, r.residuals.Inner) {
		return nil
	}
	r.residuals = got
	if err := r.sp.Keep(ctx); err != nil {
		return err
	}
	if got.Met(r.o.Tolerance) {
		return r.orthogonalProbe(ctx, ls)
	}
	return nil
}

// orthogonalProbe is probe for a cycle without a recycled space.
func (r *run) orthogonalProbe(ctx context.Context, ls *small.Hessenberg) error {
	y := smallestDirection(ls.Triangle())
	if len(y) == 0 || !allFinite(y) {
		return nil
	}
	v, av, err := r.sp.Probe(ctx, Correction{Y: y})
	if err != nil {
		return err
	}
	r.res.Products++
	if finite(v) && av > 0 {
		r.inverse = max(r.inverse, v/av)
	}
	return nil
}

func (r *run) observe(estimate float64) {
	if r.o.Observe == nil || r.res.Steps%smallPanel != 0 {
		return
	}
	r.progress(assessment{debiased: estimate, condition: 1})
}

func solved(ls *small.Hessenberg) []float64 {
	y := make([]float64, ls.Columns())
	ls.Solve(y)
	return y
}
