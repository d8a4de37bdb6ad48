package coordinator

import (
	"context"
	"math"

	"rowstead/coordinator/method"
	"rowstead/coordinator/report"
)

// probeShare of the products of a solve is spent on the probe, within
// probeLeast and probeMost steps.
const (
	probeShare = 50
	probeLeast = 3
	probeMost  = 20

	conjugateShare = 10
	conjugateMost  = 300
)

// probe looks for the directions in which A hides an error of x. The bound of
// ‖(D·A)⁻¹‖ that the solve leaves comes from directions near x, in which A may
// be harmless; a few steps towards A⁻¹·ξ for a random ξ find others, and
// ‖v‖/‖D·A·v‖ is a true lower bound whatever v is. x stays as it is.
func (r *runner) probe(ctx context.Context, last *method.Result, side *report.Side) error {
	if !last.Residuals.Finite || last.Residuals.Solution == 0 || last.Reason == ReasonInterrupted || last.Reason == ReasonTime {
		return nil
	}
	x, err := r.placed.Solution(ctx)
	if err != nil {
		return err
	}
	xi := make([]float64, len(x))
	for i := range xi {
		// ±1 in scaled rows, whatever the units.
		xi[i] = math.Ldexp(1-2*float64(bit(r.job.Seed, i)), -int(r.scale[i]))
	}
	placed := r.placed.Placed // what is spent here is no step of the solve
	if err := placed.SetRight(ctx, r.forward(xi)); err != nil {
		return err
	}
	if err := placed.SetGuess(ctx, make([]float64, len(x))); err != nil {
		return err
	}
	steps := min(probeMost, max(probeLeast, last.Products/probeShare))
	o := method.Options{Method: method.Orthogonal, Tolerance: 1e-12, Cycle: steps, Recycle: -1}
	if r.plan.conjugate { // its steps are cheap and see less each
		steps = min(conjugateMost, max(probeLeast, last.Products/conjugateShare))
		o.Method = method.CG
	}
	o.MaxProducts = steps + 1
	got, err := method.Solve(ctx, placed, o)
	if err != nil {
		return err
	}
	side.Products += got.Products
	weigh(last, got.Residuals, len(x))
	return placed.SetGuess(ctx, x)
}

// weigh takes the v that a probe has reached into the hints, in scaled rows and
// in the units of the file: ‖A⁻¹‖ ≥ ‖v‖/‖A·v‖ in either, and ‖A‖₂ is at least
// ‖D·A‖_F/√n or ‖A‖∞/√n. v holds ‖A·v − ξ‖ and ‖ξ‖, whose sum bounds ‖A·v‖.
func weigh(last *method.Result, v method.Residuals, rows int) {
	if !v.Finite || v.Solution == 0 {
		return
	}
	r, root := last.Residuals, math.Sqrt(float64(rows))
	for i, c := range [...]struct{ image, matrix, residual float64 }{
		{v.InnerRight + v.Inner, v.InnerMatrix, r.Inner},
		{v.Right + v.True, v.MatrixMax, r.True},
	} {
		inverse := v.Solution / c.image
		if i == 0 && last.Method == method.CG || math.IsInf(inverse, 0) || math.IsNaN(inverse) {
			continue // x is not in the units of the scaling that CG needs
		}
		last.ConditionHint = max(last.ConditionHint, inverse*c.matrix/root)
		if r.Solution > 0 {
			last.ForwardError = max(last.ForwardError, min(1, inverse*c.residual/r.Solution))
		}
	}
}

// bit is a random bit from (seed, row); splitmix64.
func bit(seed uint64, row int) uint64 {
	z := seed + uint64(row+1)*0x9E3779B97F4A7C15
	z = (z ^ z>>30) * 0xBF58476D1CE4E5B9
	z = (z ^ z>>27) * 0x94D049BB133111EB
	return (z ^ z>>31) & 1
}
