package method

import (
	"context"
	"fmt"
)

// Defaults of Options.
const (
	defaultTolerance = 1e-8
	defaultWindow    = 4
	defaultCycle     = 300
	defaultZeta      = 4
	defaultRecycle   = 16
	// Sketching is for long problems: below these sizes Auto takes the classical
	// orthogonal method, with a cycle long enough to need few restarts.
	smallProblem    = 5000
	orthogonalCycle = 1000
)

// Solve solves A·x = b in sp from the x that sp holds. The result is met only
// if residuals recomputed with the matrix of the workers are at or below the
// tolerance in both norms. An error means that the surroundings failed.
func Solve(ctx context.Context, sp Space, asked Options) (Result, error) {
	res := &Result{}
	o, why := asked.withDefaults(sp.Rows())
	res.Method = o.Method
	if why != "" {
		res.Story = append(res.Story, Event{Text: why})
	}
	var err error
	switch o.Method {
	case Sketched:
		err = solveSketched(ctx, sp, o, res)
	case Orthogonal:
		err = solveOrthogonal(ctx, sp, o, res)
		if err == nil && o.handOver && !res.Residuals.Met(o.Tolerance) && res.Reason == ReasonStagnated {
			res.Method, res.Reason = Sketched, ""
			res.Story = append(res.Story, Event{Cycle: res.Cycles, Step: res.Steps, Products: res.Products,
				Text: "restarts gain too little: on with the sketched method, which keeps directions between cycles"})
			asked.Method, asked.Cycle = Sketched, min(orDefault(asked.Cycle, defaultCycle), defaultCycle)
			o, _ = asked.withDefaults(sp.Rows())
			err = solveSketched(ctx, sp, o, res)
		}
	case CG:
		conjugate, ok := sp.(ConjugateSpace)
		if !ok {
			return *res, fmt.Errorf("method: this space has no conjugate gradients")
		}
		err = solveConjugate(ctx, conjugate, o, res)
	default:
		return *res, fmt.Errorf("method: %q is none of auto, sketched, orthogonal, cg", o.Method)
	}
	res.Met = err == nil && res.Residuals.Met(o.Tolerance)
	if res.Met {
		res.Reason = ""
	}
	return *res, err
}

// withDefaults fills in what is zero and says why a method was chosen.
func (o Options) withDefaults(rows int) (filled Options, why string) {
	o.Tolerance = orDefault(o.Tolerance, defaultTolerance)
	o.Window = min(maxWindow, orDefault(o.Window, defaultWindow))
	o.Zeta = orDefault(o.Zeta, defaultZeta)
	o.Recycle = max(0, orDefault(o.Recycle, defaultRecycle))
	if o.Form == "" {
		o.Form = Double
	}
	cycle := max(1, min(orDefault(o.Cycle, defaultCycle), max(1, rows)))
	sketchRows := o.SketchRows
	if sketchRows == 0 {
		sketchRows = 4 * (cycle + 2*o.Recycle + 4)
	}
	unit := 8 * o.Zeta
	o.SketchRows = (sketchRows + unit - 1) / unit * unit
	if room := o.SketchRows/2 - 2; cycle+o.Recycle > room {
		// A sketch shorter than twice its columns embeds nothing.
		o.Recycle = min(o.Recycle, room/4)
		cycle = min(cycle, room-o.Recycle)
	}
	if o.Method == "" || o.Method == Auto {
		o.Method = Sketched
		switch {
		case o.Symmetric && o.DefinitePreconditioner:
			o.Method, why = CG, "conjugate gradients: the matrix is symmetric and nothing contradicts that it is definite"
		case rows < smallProblem || rows < 8*o.SketchRows:
			o.handOver = o.Form == Double
			o.Method, why = Orthogonal, fmt.Sprintf("the orthogonal method: %d unknowns are too few for sketching to pay", rows)
			if o.Cycle == 0 {
				cycle = max(1, min(rows, orthogonalCycle))
			}
		default:
			why = "the sketched method: a long problem"
		}
	}
	o.Cycle = cycle
	return o, why
}

func orDefault[T int | float64](v, fallback T) T {
	if v == 0 {
		return fallback
	}
	return v
}
