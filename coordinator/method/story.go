package method

import (
	"context"
	"fmt"
	"math"

	"rowstead/coordinator/small"
)

// progress tells the observer of an assessment.
func (r *run) progress(a assessment) {
	if r.o.Observe == nil {
		return
	}
	p := r.here()
	if r.residuals.Inner > 0 {
		p.Estimate = a.debiased / r.residuals.Inner * p.True
	}
	p.Condition = a.condition
	r.o.Observe(p)
}

func (r *run) here() Progress {
	return Progress{
		Products: r.res.Products, Steps: r.res.Steps, Cycles: r.res.Cycles,
		True: r.residuals.TrueResidual(), Scaled: r.residuals.ScaledResidual(),
	}
}

// tell records the end of a cycle.
func (r *run) tell(c *cycle, end string, res Residuals) {
	r.note(c, fmt.Sprintf("%s after %d %v, level %d: true residual %.2e, scaled %.2e, estimate %.2e, basis condition %.0e",
		end, c.steps, r.ladder.mode, c.level, res.TrueResidual(), res.ScaledResidual(),
		c.last.debiased/max(res.InnerRight, math.SmallestNonzeroFloat64), c.last.condition))
}

func (r *run) note(c *cycle, text string) {
	r.res.Story = append(r.res.Story, Event{Cycle: r.res.Cycles, Step: c.steps, Products: r.res.Products, Text: text})
	if r.o.Observe != nil {
		p := r.here()
		p.Note = text
		r.o.Observe(p)
	}
}

// probe bounds ‖(D·A)⁻¹‖ from below by one true product with the direction that
// the small problem finds hardest.
func (r *run) probe(ctx context.Context, c *cycle) error {
	if c.conf.Form == Replay || c.last.steps == 0 {
		return nil
	}
	y := smallestDirection(r.small.ls.Triangle())
	d := r.small.space.d
	if len(y) < d || !allFinite(y) {
		return nil
	}
	v, av, err := r.sp.Probe(ctx, Correction{Y: y[d:], YU: y[:d]})
	if err != nil {
		return err
	}
	r.res.Products++
	if finite(v) && av > 0 {
		r.inverse = max(r.inverse, v/av)
	}
	return nil
}

// hints turns a lower bound of ‖(D·A)⁻¹‖ and the residuals of x into a lower
// bound of the condition and an estimate of the forward error. ‖D·A‖₂ is at
// least ‖D·A‖_F/√n, and x itself bounds the inverse: ‖x‖/‖D·A·x‖.
func hints(r Residuals, inverse float64, rows int) (condition, forward float64) {
	if right := r.InnerRight + r.Inner; right > 0 {
		inverse = max(inverse, r.Solution/right)
	}
	if !finite(inverse) || rows == 0 {
		return 0, 0
	}
	return max(1, inverse*r.InnerMatrix/math.Sqrt(float64(rows))), forwardError(r, inverse)
}

// smallestDirection is the right singular vector of the smallest singular value
// of g, by inverse iteration; nil where g is singular.
func smallestDirection(g small.Triangle) []float64 {
	y := make([]float64, g.Size())
	for i := range y {
		y[i] = float64(splitmix(uint64(i))>>11)*0x1p-52 - 1
	}
	for range 3 {
		g.SolveTransposed(y)
		size := norm2(y)
		if !finite(size) || size == 0 {
			return nil
		}
		for i := range y {
			y[i] /= size
		}
		g.Solve(y)
	}
	return y
}

func allFinite(v []float64) bool {
	for _, x := range v {
		if !finite(x) {
			return false
		}
	}
	return true
}
