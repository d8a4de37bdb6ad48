package method

import (
	"context"
	"math"
)

// panel ends a panel of steps: it draws the conclusions from the panel before,
// if that ran behind, and assesses this one, at once or behind. A text that is
// not empty ends the cycle.
func (c *cycle) panel(ctx context.Context, final bool) (end string, err error) {
	if c.wait != nil {
		c.await()
		if end, err = c.conclude(ctx, c.pending); end != "" || err != nil {
			return end, err
		}
	}
	if !final && c.behind() {
		return "", c.post(ctx)
	}
	if err := c.settle(ctx); err != nil {
		return "", err
	}
	if end, err = c.conclude(ctx, c.last); end == "" && final {
		end = endFull
	}
	return end, err
}

// behind says whether this panel may be assessed beside the recurrence.
func (c *cycle) behind() bool {
	return c.size() == largePanel && c.run.ladder.mode == windowMode && c.level == 0
}

// post starts the assessment of everything built so far beside the recurrence.
func (c *cycle) post(ctx context.Context) error {
	sb, hold, err := c.run.sp.Sketches(ctx, c.posted, c.vectors)
	if err != nil {
		return err
	}
	own := append(c.run.stage[:0], sb...)
	c.run.stage = own
	ownHold := append([]float64(nil), hold...)
	columns := append([]column(nil), c.fresh...)
	c.fresh, c.posted = c.fresh[:0], c.vectors
	c.next = min(c.steps+largePanel, c.conf.Capacity-1)
	c.wait = c.run.behind(func() {
		c.run.small.take(columns, own, ownHold)
		c.pending = c.run.small.assess()
	})
	return nil
}

// conclude acts on an assessment: it raises the level, ends the cycle, tries
// the x it stands for, or sets the end of the next panel.
func (c *cycle) conclude(ctx context.Context, a assessment) (end string, err error) {
	c.earlier, c.last = c.last, a
	c.run.progress(a)
	c.raise(a.condition)
	// The estimate of a solved system is rounding; a lie needs a size.
	lies := a.holdout > 2*a.debiased && a.holdout > 1e-12*c.beta
	switch {
	case !finite(a.estimate) || !finite(a.holdout):
		return endNotFinite, nil
	case a.condition > c.conditionLimit():
		return endCondition, nil
	case lies:
		return endLie, nil
	case a.debiased <= c.aim && (c.own || c.conf.Form == Replay):
		return endReached, nil
	case a.debiased <= c.aim && c.tries < maxTries:
		if end, err = c.try(ctx, a); end != "" || err != nil {
			return end, err
		}
	}
	c.next = min(c.steps+c.size(), c.conf.Capacity-1)
	return "", nil
}

// try recomputes the residual of the x that a stands for. When it falls short
// the aim is tightened and the same basis is built on: restarting here would
// make one-step cycles at the edge of convergence.
func (c *cycle) try(ctx context.Context, a assessment) (end string, err error) {
	c.tries++
	r, err := c.run.sp.Try(ctx, Correction{Y: a.y, YU: a.yu})
	if err != nil {
		return "", err
	}
	c.run.res.Products++
	if r.Met(c.run.o.Tolerance) {
		c.run.residuals = r
		return endMet, c.run.sp.Keep(ctx)
	}
	if !r.Finite || r.Inner > 5*a.debiased && r.Inner > 1e-12*c.beta {
		return endGap, nil
	}
	c.aim = min(0.7*c.aim, 0.8*a.debiased/r.excess(c.run.o.Tolerance))
	return "", nil
}

// raise lifts the level as the condition of the sketched basis asks.
func (c *cycle) raise(condition float64) {
	limits := levelConditions
	if c.conf.Form == Single {
		limits = singleLevelConditions
	}
	if c.run.ladder.mode != windowMode || c.conf.Form == Replay {
		return
	}
	for c.level < len(limits) && condition > limits[c.level] {
		c.level++
		c.base, c.raisedAt = c.steps, c.steps
	}
}

func (c *cycle) conditionLimit() float64 {
	if c.conf.Form == Replay {
		return replayCondition
	}
	return basisCondition
}

// size is the length of the next panel. Close to the aim it ends where the
// last two estimates, drawn on, meet the aim.
func (c *cycle) size() int {
	a, b := c.earlier, c.last
	rate := math.Log(a.debiased/b.debiased) / float64(b.steps-a.steps)
	if a.steps == 0 || a.steps == b.steps || b.debiased <= c.aim || !(rate > 0) {
		return smallPanel
	}
	left := math.Log(b.debiased/c.aim)/rate - float64(c.steps-b.steps)
	switch {
	case left < smallPanel:
		return max(2, int(math.Ceil(left)))
	case left > farPanels*largePanel && b.steps >= calmSteps && b.condition <= calmLimit:
		return largePanel
	}
	return smallPanel
}
