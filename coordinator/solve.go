package coordinator

import (
	"context"
	"fmt"
	"strings"

	"rowstead/coordinator/method"
	"rowstead/coordinator/report"
)

// solve solves for every right side in turn.
func (r *runner) solve(ctx context.Context) error {
	r.x = make([][]float64, len(r.sys.right))
	for c := range r.sys.right {
		r.x[c] = make([]float64, len(r.sys.right[c]))
		if r.sys.guess != nil {
			copy(r.x[c], r.sys.guess[c])
		}
	}
	for c, b := range r.sys.right {
		r.column = c
		r.pace = report.Pace{Tolerance: r.job.Tolerance}
		side, err := r.solveSide(ctx, c, b)
		if err != nil {
			return err
		}
		r.rec.Sides = append(r.rec.Sides, side)
		r.before += side.Products
		if side.Reason == ReasonInterrupted || side.Reason == ReasonTime {
			break
		}
	}
	r.leaveRest()
	r.tellChoices()
	r.tellUnique()
	r.rec.Settle()
	r.tellWorkers(ctx)
	if r.placed.failed != nil {
		r.event(fmt.Sprintf("a snapshot could not be kept: %v", r.placed.failed))
	}
	return nil
}

// leaveRest gives the right sides that were not reached their verdict.
func (r *runner) leaveRest() {
	for c := len(r.rec.Sides); c < len(r.sys.right); c++ {
		last := r.rec.Sides[len(r.rec.Sides)-1]
		r.rec.Sides = append(r.rec.Sides, report.Side{Column: c, Verdict: report.Short, Reason: last.Reason, Method: last.Method, Residuals: report.Unmeasured()})
	}
}

// solveSide solves for one right side, changing the method where the first one
// cannot go on, and checks the answer.
func (r *runner) solveSide(ctx context.Context, c int, b []float64) (report.Side, error) {
	side := report.Side{Column: c}
	start := r.x[c]
	if !nonzero(b) {
		start = make([]float64, len(b)) // A·x = 0: x = 0 is the answer
	}
	r.shift = shiftOf(b, r.scale)
	if row := tooFarApart(b, r.scale, r.shift); row >= 0 {
		return side, r.apart(row)
	}
	// Where no x can meet b, the nearest right side that one can is solved for:
	// the best answer there is, at the price of a good-natured system.
	solvable := r.sys.solvable(b, r.job.Tolerance)
	start, err := r.setSide(ctx, solvable, start)
	if err != nil {
		return side, err
	}
	var last method.Result
	err = r.timed(&r.rec.Seconds.Solve, func() (err error) {
		if last, err = r.attempts(ctx, start, &side); err != nil {
			return err
		}
		return r.probe(ctx, &last, &side)
	})
	if err != nil {
		return side, err
	}
	if err := r.setRight(ctx, b); err != nil {
		return side, err
	}
	r.rim.Phase(report.Checking)
	err = r.timed(&r.rec.Seconds.Check, func() error { return r.check(ctx, last, &side) })
	r.rim.Phase(report.Stepping)
	return side, err
}

// keepBetter goes back to the x of the start where conjugate gradients, which
// lower no residual step by step, have left a worse one.
func (r *runner) keepBetter(ctx context.Context, start []float64) error {
	reached, err := r.placed.Check(ctx)
	if err != nil {
		return err
	}
	x, err := r.placed.Solution(ctx)
	if err != nil {
		return err
	}
	if err := r.setGuess(ctx, start); err != nil {
		return err
	}
	before, err := r.placed.Check(ctx)
	if err == nil && reached.Finite && reached.Inner < before.Inner {
		err = r.placed.SetGuess(ctx, x)
	}
	return err
}

// setSide places a right side and the x to begin with; a guess that is worse
// than x = 0 is dropped. It returns the x that stands.
func (r *runner) setSide(ctx context.Context, b, x []float64) ([]float64, error) {
	if err := r.setRight(ctx, b); err != nil {
		return x, err
	}
	if err := r.setGuess(ctx, x); err != nil || !nonzero(x) {
		return x, err
	}
	res, err := r.placed.Check(ctx)
	if err != nil || res.Finite && res.Inner <= res.InnerRight {
		return x, err
	}
	r.event("the guess is worse than x = 0 and was dropped")
	x = make([]float64, len(x))
	return x, r.setGuess(ctx, x)
}

// setRight places b, shifted into the middle of the range of numbers.
func (r *runner) setRight(ctx context.Context, b []float64) error {
	b, _ = shifted(b, r.shift)
	return r.placed.SetRight(ctx, r.forward(b))
}

// setGuess places x, shifted as b is.
func (r *runner) setGuess(ctx context.Context, x []float64) error {
	x, _ = shifted(x, r.shift)
	return r.placed.SetGuess(ctx, r.forward(x))
}

// answer is the x of the workers in the order and the units of the file, and
// whether 64-bit numbers hold it.
func (r *runner) answer(ctx context.Context) (x []float64, exact bool, err error) {
	x, err = r.placed.Solution(ctx)
	if err != nil {
		return nil, false, err
	}
	x, exact = shifted(r.backward(x), -r.shift)
	return x, exact, nil
}

func nonzero(b []float64) bool {
	for _, v := range b {
		if v != 0 {
			return true
		}
	}
	return false
}

// attempts runs the method, another one where conjugate gradients cannot go on,
// and a last, harder try where a run that was getting somewhere stands still.
// Every try begins from the x of the one before.
func (r *runner) attempts(ctx context.Context, start []float64, side *report.Side) (method.Result, error) {
	last, err := r.attempt(ctx, side)
	if err == nil && !last.Met && last.Method == method.CG {
		err = r.keepBetter(ctx, start)
	}
	if err == nil && r.giveWay(last) {
		r.event("from conjugate gradients to another method: " + last.Reason)
		if err = r.placed.Prepare(ctx, r.plan.precondition, false); err == nil {
			r.plan.conjugate = false
			last, err = r.attempt(ctx, side)
		}
	}
	if err == nil && r.tryHarder(last) {
		r.event(fmt.Sprintf("stagnated: once more with %s and a cycle of %d", r.plan.precondition, r.plan.form.cycle))
		if err = r.placed.Prepare(ctx, r.plan.precondition, r.plan.conjugate); err == nil {
			last, err = r.attempt(ctx, side)
		}
	}
	return last, err
}

// giveWay says that conjugate gradients, chosen by the program, must give way.
func (r *runner) giveWay(last method.Result) bool {
	return automatic(r.job.Method) && r.plan.conjugate && !last.Met &&
		(last.Reason == method.ReasonIndefinite || last.Reason == method.ReasonStagnated || last.Reason == method.ReasonNotFinite || last.Reason == method.ReasonFloor)
}

// hopeful is the residual below which a stagnated run was getting somewhere, so
// that a harder try is worth its time.
const hopeful = 0.3

// tryHarder changes the plan for one more try, with a stronger preconditioner
// and the longest cycle, as far as they were left to the program and fit; false
// when there is nothing to change or little hope.
func (r *runner) tryHarder(last method.Result) bool {
	if r.harder || last.Met || last.Reason != method.ReasonStagnated || r.plan.conjugate ||
		!(last.Residuals.TrueResidual() < hopeful && last.Residuals.ScaledResidual() < hopeful) {
		return false
	}
	p, need := r.plan, r.need
	if automatic(r.job.Precondition) && p.precondition == "ilu0" {
		p.precondition, need.precondition = "ilut", "ilut"
	}
	if r.job.Cycle == 0 {
		p.form.cycle = longestCycle
	}
	changed := p.precondition != r.plan.precondition || r.job.Cycle == 0
	if !changed || need.total(p.form) > r.most {
		return false
	}
	if p.precondition != r.plan.precondition {
		r.why["precondition"] = r.plan.precondition + " stagnated; this one fills in"
	}
	r.plan, r.harder = p, true
	return true
}

// attempt runs one method and adds its counts to the side's.
func (r *runner) attempt(ctx context.Context, side *report.Side) (method.Result, error) {
	if r.plan.conjugate && automatic(r.job.Method) && !r.definite() {
		if err := r.placed.Prepare(ctx, r.plan.precondition, false); err != nil {
			return method.Result{}, err
		}
		r.plan.conjugate = false
	}
	base := r.before + side.Products
	result, err := method.Solve(ctx, r.placed, r.options(base))
	side.Method = result.Method
	side.Steps, side.FullSteps = side.Steps+result.Steps, side.FullSteps+result.FullSteps
	side.Cycles, side.Products = side.Cycles+result.Cycles, side.Products+result.Products
	for _, e := range result.Story {
		r.rec.Story = append(r.rec.Story, report.Event{Second: r.since(r.begun), Column: r.column, Cycle: e.Cycle, Step: e.Step, Products: base + e.Products, Text: e.Text})
		if why, found := strings.CutPrefix(e.Text, "the "+result.Method+" method: "); found {
			r.why["method"] = why
		}
	}
	return result, err
}

// definite says that every block's preconditioner is symmetric positive
// definite.
func (r *runner) definite() bool {
	for _, f := range r.placed.Factors() {
		if !f.Definite {
			return false
		}
	}
	return true
}

// options are those of the method.
func (r *runner) options(base int) method.Options {
	o := method.Options{
		Method: r.job.Method, Tolerance: r.job.Tolerance, Window: r.job.Window, Cycle: r.job.Cycle,
		SketchRows: r.job.SketchRows, Seed: r.job.Seed, Form: r.plan.form.basis,
		Symmetric: r.plan.conjugate, DefinitePreconditioner: r.plan.conjugate,
		Stop: r.rim.Stop, Observe: func(p method.Progress) { r.observe(base, p) },
	}
	if o.Cycle == 0 && (r.harder || r.plan.form.cycle != longestCycle) {
		o.Cycle = r.plan.form.cycle
	}
	if r.job.Threads > 1 {
		o.Behind = behind
	}
	if limit := r.job.TimeLimit; limit > 0 {
		o.Stop = func() string {
			if reason := r.rim.Stop(); reason != "" {
				return reason
			}
			if r.rim.Now().Sub(r.begun) >= limit {
				return ReasonTime
			}
			return ""
		}
	}
	return o
}

// behind runs a task beside the recurrence. A panic of the task is raised again
// in the goroutine that waits, where the program can end in order.
func behind(task func()) (wait func()) {
	done := make(chan struct{})
	var fault any
	go func() {
		defer close(done)
		defer func() { fault = recover() }()
		task()
	}()
	return func() {
		<-done
		if fault != nil {
			panic(fault)
		}
	}
}

// curvePoints is how many points of the convergence are kept at most.
const curvePoints = 2000

// observe tells of progress and keeps a point of the picture.
func (r *runner) observe(base int, p method.Progress) {
	second := r.since(r.begun)
	estimate := report.Number(p.Estimate)
	if p.Estimate <= 0 {
		estimate = report.Unknown()
	}
	left := report.Number(max(p.True, p.Scaled))
	if len(r.rec.Curve) == curvePoints {
		for i := range curvePoints / 2 {
			r.rec.Curve[i] = r.rec.Curve[2*i+1]
		}
		r.rec.Curve = r.rec.Curve[:curvePoints/2]
	}
	r.rec.Curve = append(r.rec.Curve, report.Point{Products: base + p.Products, Second: second, True: left, Estimate: estimate})
	now := left
	if estimate.Finite() {
		now = min(left, estimate)
	}
	r.pace.Add(float64(second), now)
	r.rim.Progress(report.Progress{
		Products: base + p.Products, Left: report.Number(p.True), Estimated: estimate,
		Remaining: r.pace.Remaining(), Column: r.column, Columns: len(r.sys.right),
	})
}

// snapshot keeps all answers so far.
func (r *runner) snapshot(ctx context.Context) error {
	x, _, err := r.answer(ctx)
	if err != nil {
		return err
	}
	all := append([][]float64(nil), r.x...)
	all[r.column] = x
	return r.rim.Snapshot(r.column, all)
}
