package method

import (
	"context"
	"fmt"
	"math"
)

// patience is how many steps conjugate gradients may take without a new
// smallest residual: they are not monotone, and plateaus of some hundred steps
// are common on stiff structures.
const patience = 2000

// solveConjugate is preconditioned conjugate gradients. It leaves with
// ReasonIndefinite at the first direction of negative curvature, in A or in the
// preconditioner, with the best x so far. Saad, Iterative Methods for Sparse
// Linear Systems, 2nd ed., algorithm 9.1.
func solveConjugate(ctx context.Context, sp ConjugateSpace, o Options, res *Result) error {
	r := &run{o: o, res: res}
	check, err := sp.Check(ctx)
	if err != nil {
		return err
	}
	res.Products++
	r.residuals = check
	for restarts := 0; !r.finished(r.residuals); restarts++ {
		before := r.residuals
		if err := r.conjugateCycle(ctx, sp); err != nil {
			return err
		}
		res.Cycles++
		if r.residuals, err = sp.Check(ctx); err != nil {
			return err
		}
		res.Products++
		res.Story = append(res.Story, Event{Cycle: res.Cycles, Step: res.Steps, Products: res.Products,
			Text: fmt.Sprintf("conjugate gradients: true residual %.2e, scaled %.2e", r.residuals.TrueResidual(), r.residuals.ScaledResidual())})
		// A restart that gains nothing has met the rounding of its recurrence.
		if r.reason == "" && (restarts > 20 || r.residuals.excess(o.Tolerance) > 0.9*before.excess(o.Tolerance)) {
			r.reason = ReasonStagnated
		}
	}
	res.Residuals, res.Reason = r.residuals, r.reason
	// x is not in the units of S·A·S, so the bound is in those of the file.
	file := r.residuals
	file.Inner, file.InnerRight, file.InnerMatrix = file.True, file.Right, file.MatrixMax
	res.ConditionHint, res.ForwardError = hints(file, 0, sp.Rows())
	return nil
}

// conjugateCycle iterates until its own residual promises the tolerance.
func (r *run) conjugateCycle(ctx context.Context, sp ConjugateSpace) error {
	rr, rz, err := sp.StartConjugate(ctx)
	if err != nil {
		return err
	}
	r.res.Products++
	aim := 0.9 * math.Sqrt(rr) / r.residuals.excess(r.o.Tolerance)
	start, best, bestStep := math.Sqrt(rr), rr, r.res.Steps
	for beta := 0.0; !r.stopped(); {
		if !(rz > 0) {
			r.reason = ReasonIndefinite
			return nil
		}
		pq, err := sp.Direct(ctx, beta)
		if err != nil {
			return err
		}
		r.res.Products++
		if !(pq > 0) {
			r.reason = ReasonIndefinite
			return nil
		}
		next, rzNext, err := sp.Move(ctx, rz/pq)
		if err != nil {
			return err
		}
		r.res.Steps++
		beta, rz, rr = rzNext/rz, rzNext, next
		if r.o.Observe != nil && r.res.Steps%smallPanel == 0 {
			p := r.here()
			p.Estimate, p.Condition = math.Sqrt(rr)/start*p.True, 1
			r.o.Observe(p)
		}
		if rr < best {
			best, bestStep = rr, r.res.Steps
		}
		if math.Sqrt(rr) <= aim || !finite(rr) {
			return nil
		}
		if r.res.Steps-bestStep > patience {
			r.reason = ReasonStagnated
		}
	}
	return nil
}
