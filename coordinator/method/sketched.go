package method

import (
	"context"
	"fmt"

	"rowstead/coordinator/small"
)

// run is a sketched solve under way.
type run struct {
	sp        Space
	o         Options
	res       *Result
	ladder    ladder
	small     *projected
	space     recycled
	seed      uint64 // of the cycle's sketch
	residuals Residuals
	stage     []float64
	reason    string // given by Stop
	inverse   float64
}

// solveSketched is sketched GMRES with harmonic recycling and its safe ladder:
// truncated Arnoldi with an exact window, full steps by the condition of the
// sketched basis, and a verdict from recomputed residuals only. See "On the
// numerical stability of sketched GMRES" (arXiv:2503.19086) and "Fast and
// accurate randomized algorithms for linear systems and eigenvalue problems"
// (arXiv:2111.00113).
func solveSketched(ctx context.Context, sp Space, o Options, res *Result) error {
	r := &run{sp: sp, o: o, res: res, ladder: ladder{window: o.Window, fixed: o.Form == Replay}}
	res.SketchRows = o.SketchRows
	for {
		conf := r.configure()
		start, err := r.sp.Start(ctx, conf)
		if err != nil {
			return err
		}
		res.Products++
		r.residuals = start
		if done := r.finished(start); done {
			break
		}
		stagnated, err := r.cycle(ctx, conf)
		if err != nil {
			return err
		}
		if r.residuals.Met(o.Tolerance) || r.reason != "" {
			break
		}
		if stagnated {
			if r.reason, err = r.whyStagnated(ctx); err != nil {
				return err
			}
			break
		}
	}
	res.Residuals, res.Reason = r.residuals, r.reason
	res.ConditionHint, res.ForwardError = hints(r.residuals, r.inverse, sp.Rows())
	return nil
}

// configure fixes the sketch of the cycle to come.
func (r *run) configure() Cycle {
	r.seed = cycleSeed(r.o.Seed, r.res.Cycles)
	return Cycle{
		Seed: r.seed, SketchRows: r.o.SketchRows, Zeta: r.o.Zeta,
		Capacity: r.o.Cycle + 1, Window: r.ladder.window, Form: r.o.Form,
	}
}

// finished says whether the residuals of x end the run before a cycle.
func (r *run) finished(res Residuals) bool {
	switch {
	case res.Met(r.o.Tolerance):
	case !res.Finite:
		r.reason = ReasonNotFinite
	case res.atFloor(r.o.Tolerance, 2):
		r.reason = ReasonFloor
	case r.o.MaxProducts > 0 && r.res.Products >= r.o.MaxProducts:
		r.reason = ReasonProducts
	default:
		return r.stopped()
	}
	return true
}

// cycle runs one cycle and its correction, and climbs the ladder.
func (r *run) cycle(ctx context.Context, conf Cycle) (stagnated bool, err error) {
	before := r.residuals
	c := &cycle{run: r, conf: conf, beta: before.Inner, level: r.ladder.level}
	c.aim = 0.9 * c.beta / before.excess(r.o.Tolerance)
	if limit := 1e-5 * c.beta; conf.Form == Single && c.aim < limit {
		c.aim, c.own = limit, true
	}
	c.win.reset(conf.Window)
	if r.small == nil {
		r.small = newProjected(conf.SketchRows, conf.Capacity+r.o.Recycle)
	}
	r.small.begin(r.space, c.beta)
	end, err := c.build(ctx)
	if err != nil {
		return false, err
	}
	r.res.Cycles++
	if end == endMet {
		r.tell(c, end, r.residuals)
		return false, r.probe(ctx, c)
	}
	o, err := r.correct(ctx, c, end)
	if err != nil {
		return false, err
	}
	o.start, o.level, o.raisedAt = r.ladder.level, c.level, c.raisedAt
	o.steps, o.condEnded, o.condition = c.steps, end == endCondition, c.last.condition
	was := r.ladder
	stagnated = r.ladder.climb(o)
	if r.ladder.stagnation > 0 && !stagnated {
		// Another rung of the ladder cannot help against these.
		if stagnated, err = r.hopeless(ctx); err != nil {
			return false, err
		}
	}
	if was.mode != r.ladder.mode {
		r.note(c, fmt.Sprintf("from %v to %v", was.mode, r.ladder.mode))
	}
	return stagnated, nil
}

// correct ends a cycle: x_try, its true residual, and the next recycled space.
func (r *run) correct(ctx context.Context, c *cycle, end string) (outcome, error) {
	a := c.last
	if a.steps == 0 || !allFinite(a.y) || !allFinite(a.yu) {
		r.tell(c, end, r.residuals)
		return outcome{gap: 1}, r.forget(ctx)
	}
	order := Correction{Y: a.y, YU: a.yu}
	if end != endBreakdown && end != endStop && a.debiased > c.aim {
		order.T, order.Directions = r.directions(a)
	}
	res, products, err := r.sp.Correct(ctx, order)
	if err != nil {
		return outcome{}, err
	}
	r.res.Products += products + 1
	if !better(res, c.beta) && c.conf.Form != Replay {
		if res, err = r.tryTruncated(ctx, r.small.ls, res); err != nil {
			return outcome{}, err
		}
	}
	o := outcome{accepted: better(res, c.beta), reduction: res.Inner / c.beta, gap: 1}
	if a.debiased > 1e-12*c.beta {
		o.gap = res.Inner / a.debiased
	}
	r.tell(c, end, res)
	if !o.accepted {
		return o, r.forget(ctx)
	}
	r.residuals = res
	if err := r.sp.Keep(ctx); err != nil {
		return o, err
	}
	if res.Met(r.o.Tolerance) {
		return o, r.probe(ctx, c)
	}
	return o, r.recycle(ctx, order)
}

func better(res Residuals, than float64) bool { return res.Finite && res.Inner < than }

// tryTruncated takes another y when that of the cycle made x worse: where the
// equations contradict each other the projected problem becomes singular at the
// floor of the residual, and y without its smallest singular directions is
// still good. It returns the residuals of the x_try that stands.
func (r *run) tryTruncated(ctx context.Context, ls *small.Hessenberg, res Residuals) (Residuals, error) {
	y := truncated(ls)
	if !allFinite(y) {
		return res, nil
	}
	r.res.Products++
	d := ls.Recycled()
	return r.sp.Try(ctx, Correction{Y: y[d:], YU: y[:d]})
}

// truncation is the relative size of pivots that truncated drops.
const truncation = 1e-8

func truncated(ls *small.Hessenberg) []float64 {
	n := ls.Columns()
	full := make([]float64, n*n)
	for j := range n {
		copy(full[j*n:], ls.Triangle().Column(j))
	}
	y, _, _ := small.LeastSquaresTo(truncation, full, ls.RightSide(), n, n)
	return y
}

// directions selects the recycled space of the next cycle from the sketched
// data of this one: harmonic Ritz vectors of smallest magnitude.
func (r *run) directions(a assessment) (t []float64, d int) {
	d = min(r.o.Recycle, a.steps/3)
	if d <= 0 || a.steps <= r.o.Recycle+2 {
		return nil, 0
	}
	return r.small.harmonic(d)
}

// recycle turns the directions formed by Correct into the recycled space.
func (r *run) recycle(ctx context.Context, order Correction) error {
	if order.Directions == 0 {
		return r.forget(ctx)
	}
	next := r.configure()
	got, err := r.sp.Recycle(ctx, next)
	if err != nil {
		return err
	}
	r.res.Products += order.Directions
	r.space = recycled{d: order.Directions, su: got.SU, sazs: got.SAZ, hold: got.HoldAZ}
	if !r.space.usable(next.SketchRows) {
		return r.forget(ctx)
	}
	return nil
}

// usable refuses a recycled space whose images are all but dependent.
func (s recycled) usable(rows int) bool {
	if !allFinite(s.sazs) || !allFinite(s.su) {
		return false
	}
	qr := small.NewQR(rows, s.d)
	qr.Append(append([]float64(nil), s.sazs...))
	var warm small.Warm
	return qr.R().Condition(&warm) <= 1e8
}

func (r *run) forget(ctx context.Context) error {
	if r.space.d == 0 {
		return nil
	}
	r.space = recycled{}
	return r.sp.Forget(ctx)
}

// whyStagnated names the reason from evidence: contradiction where Aᵀ·r all but
// vanishes beside r, the floor of rounding where it is near.
func (r *run) whyStagnated(ctx context.Context) (string, error) {
	gradient, residual, err := r.sp.Gradient(ctx)
	if err != nil {
		return "", err
	}
	r.res.Products++
	return stagnationReason(r.residuals, gradient, residual, r.o.Tolerance), nil
}

// hopeless says whether a cycle without gain has met a floor.
func (r *run) hopeless(ctx context.Context) (bool, error) {
	reason, err := r.whyStagnated(ctx)
	return reason != ReasonStagnated, err
}

func stagnationReason(res Residuals, gradient, residual, tolerance float64) string {
	switch {
	case res.atFloor(tolerance, 100):
		return ReasonFloor
	case gradient <= contradiction*res.InnerMatrix*residual:
		return ReasonContradictory
	}
	return ReasonStagnated
}

// contradiction bounds ‖Aᵀ·r‖/(‖A‖_F·‖r‖) below which r counts as orthogonal to
// the range of A, so that no x can lower it. It must lie below the inverse
// condition of any system that can be solved at all.
const contradiction = 1e-12

func (r *run) stopped() bool {
	if r.reason == "" && r.o.Stop != nil {
		r.reason = r.o.Stop()
	}
	if r.reason == "" && r.o.MaxProducts > 0 && r.res.Products >= r.o.MaxProducts {
		r.reason = ReasonProducts
	}
	return r.reason != ""
}

func (r *run) behind(task func()) (wait func()) {
	if r.o.Behind != nil {
		return r.o.Behind(task)
	}
	task()
	return func() {}
}
