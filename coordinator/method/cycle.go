package method

import (
	"context"
	"math"
	"slices"
)

// Ends of a cycle.
const (
	endFull      = "cycle full"
	endMet       = "met"
	endCondition = "basis condition above its limit"
	endLie       = "the estimate and the hold-out disagree"
	endGap       = "the true residual is far above the estimate"
	endBreakdown = "invariant space"
	endReached   = "cycle's own aim reached"
	endStop      = "stopped"
	endNotFinite = "not finite"
)

// A panel is the group of steps whose sketches go through the QR together:
// small ones while looking is cheap and close to convergence, large ones for
// speed in between. The result of a large panel is used one panel later, so
// that its arithmetic runs beside the recurrence.
const (
	smallPanel = 8
	largePanel = 32
	calmSteps  = 64  // large panels only after so many steps,
	calmLimit  = 1e3 // below this condition,
	farPanels  = 2   // and so many large panels before the aim
)

const maxTries = 4 // true checks in one cycle

// cycle is one cycle in the building.
type cycle struct {
	run  *run
	conf Cycle
	beta float64 // ‖D·r‖ at its start
	aim  float64 // debiased estimate at which x is tried
	own  bool    // aim is the cycle's own, above what the verdict needs

	win     window
	steps   int // columns complete
	vectors int // basis vectors formed
	fresh   []column
	posted  int // vectors handed to the small problem

	level, base, raisedAt int

	wait    func()
	pending assessment
	last    assessment
	earlier assessment
	next    int // step at which the panel ends
	tries   int
}

// build runs the recurrence until the cycle ends and says why it did.
func (c *cycle) build(ctx context.Context) (end string, err error) {
	c.next = smallPanel
	reply, err := c.advance(ctx, column{norm: c.beta}, true)
	for err == nil {
		if !finite(reply.WW) {
			return endNotFinite, c.settle(ctx)
		}
		if c.run.stopped() {
			return endStop, c.settle(ctx)
		}
		var col column
		if col, err = c.coefficients(ctx, reply); err != nil {
			break
		}
		if !(col.norm > negligible*math.Sqrt(col.ww)) {
			return endBreakdown, c.breakDown(ctx, col)
		}
		full := c.steps+2 == c.conf.Capacity
		if reply, err = c.advance(ctx, col, !full); err != nil {
			break
		}
		if own := c.win.newest(); !(math.Sqrt(own)*col.norm > negligible*math.Sqrt(col.ww)) {
			c.vectors-- // what was formed is rounding alone
			return endBreakdown, c.breakDown(ctx, col)
		}
		c.fresh = append(c.fresh, col)
		c.steps++
		c.run.res.Steps++
		if c.steps == c.next || full {
			var end string
			if end, err = c.panel(ctx, full); end != "" {
				return end, err
			}
		}
	}
	c.await()
	return "", err
}

// negligible is how small, beside w, what is left of it must be for the space
// to count as invariant.
const negligible = 1e-13

// advance forms the next vector and, if product, w = C·b of it.
func (c *cycle) advance(ctx context.Context, col column, product bool) (Stepped, error) {
	step := Step{Lo: col.lo, H: col.h, Norm: col.norm, Product: product}
	if col.sent != nil {
		step.H = col.sent
	}
	if product {
		c.ask(&step)
	}
	reply, err := c.run.sp.Advance(ctx, step)
	if err == nil {
		c.win.push(reply.Gram)
		c.vectors++
	}
	return reply, err
}

// ask fills in what is wanted of the product.
func (c *cycle) ask(step *Step) {
	mode := c.run.ladder.mode
	switch {
	case wantsFull(mode, c.level, c.vectors, c.base, c.conf.Window):
		step.SketchW = true
		c.run.res.FullSteps++
	case mode == classicalMode:
		step.Dots = c.vectors + 1
	default:
		step.Dots = min(c.conf.Window, c.vectors+1)
	}
	step.SketchW = step.SketchW || c.conf.Form == Single
	c.run.res.Products++
}

// coefficients decides how b_{j+1} follows from w.
func (c *cycle) coefficients(ctx context.Context, reply Stepped) (column, error) {
	col := column{ww: reply.WW}
	if c.conf.Form == Single { // the answer's slices last until the next verb
		col.sketchW, col.holdW = slices.Clone(reply.SketchW), slices.Clone(reply.HoldW)
	}
	switch {
	case len(reply.Dots) == 0: // a full step
		if err := c.flush(ctx); err != nil {
			return col, err
		}
		col.h, col.norm = c.run.small.fullStep(reply.SketchW)
	case c.run.ladder.mode == classicalMode:
		first := slices.Clone(reply.Dots)
		again, ww, err := c.run.sp.Reduce(ctx, first)
		if err != nil {
			return col, err
		}
		col.sent, col.h, col.norm = slices.Clone(again), first, ww
		for i, v := range again {
			col.h[i] += v
			col.norm -= float64(v * v)
		}
		col.norm = math.Sqrt(max(col.norm, 0))
	default:
		col.h, col.norm = c.win.project(reply.Dots, reply.WW)
		col.lo = c.vectors - len(col.h)
	}
	return col, nil
}

// breakDown solves for y in the invariant space.
func (c *cycle) breakDown(ctx context.Context, col column) error {
	if err := c.flush(ctx); err != nil {
		return err
	}
	c.run.small.breakDown(col)
	c.steps++
	c.run.res.Steps++
	c.last = c.run.small.assess()
	return nil
}

// settle takes in everything that has been built and assesses it.
func (c *cycle) settle(ctx context.Context) error {
	if err := c.flush(ctx); err != nil {
		return err
	}
	c.last = c.run.small.assess()
	return nil
}

// flush waits for the panel behind and hands over all later vectors at once.
func (c *cycle) flush(ctx context.Context) error {
	c.await()
	if c.posted == c.vectors {
		return nil
	}
	sb, hold, err := c.run.sp.Sketches(ctx, c.posted, c.vectors)
	if err != nil {
		return err
	}
	c.run.small.take(c.fresh, sb, hold)
	c.fresh, c.posted = c.fresh[:0], c.vectors
	return nil
}

// await waits for the panel behind, if any.
func (c *cycle) await() {
	if c.wait != nil {
		c.wait()
		c.wait = nil
	}
}
