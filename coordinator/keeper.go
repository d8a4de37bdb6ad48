package coordinator

import (
	"context"
	"time"

	"rowstead/coordinator/method"
)

// keeper stands between a method and the placed system: it notes how long the
// cycles are, counts what would cross to the coordinator, and keeps a snapshot
// when one is due.
type keeper struct {
	Placed
	blocks  int
	every   time.Duration // 0: no snapshots
	now     func() time.Time
	last    time.Time
	save    func(ctx context.Context) error
	failed  error // of the last snapshot
	longest method.Cycle
	bytes   int64 // of numbers up and down, all blocks
	steps   int
}

// count adds floats that go to, or come from, every block.
func (k *keeper) count(floats int) { k.bytes += 8 * int64(floats) * int64(k.blocks) }

// Start notes the shape of the cycle.
func (k *keeper) Start(ctx context.Context, c method.Cycle) (method.Residuals, error) {
	if c.Capacity > k.longest.Capacity {
		k.longest = c
	}
	return k.Placed.Start(ctx, c)
}

// Advance counts the numbers of a step.
func (k *keeper) Advance(ctx context.Context, s method.Step) (method.Stepped, error) {
	r, err := k.Placed.Advance(ctx, s)
	k.steps++
	k.count(len(s.H) + 1 + len(r.Gram) + len(r.Dots) + 1 + len(r.SketchW) + len(r.HoldW))
	return r, err
}

// Sketches counts the numbers of sketches.
func (k *keeper) Sketches(ctx context.Context, from, to int) (sb, hold []float64, err error) {
	sb, hold, err = k.Placed.Sketches(ctx, from, to)
	k.count(len(sb) + len(hold))
	return sb, hold, err
}

// Reduce counts the numbers of a full orthogonalisation.
func (k *keeper) Reduce(ctx context.Context, h []float64) (dots []float64, ww float64, err error) {
	dots, ww, err = k.Placed.Reduce(ctx, h)
	k.count(len(h) + len(dots) + 1)
	return dots, ww, err
}

// Direct counts the numbers of half a step of conjugate gradients.
func (k *keeper) Direct(ctx context.Context, beta float64) (pq float64, err error) {
	k.steps++
	k.count(2)
	return k.Placed.Direct(ctx, beta)
}

// Move counts the other half.
func (k *keeper) Move(ctx context.Context, alpha float64) (rr, rz float64, err error) {
	k.count(3)
	return k.Placed.Move(ctx, alpha)
}

// Keep sets x and keeps a snapshot of it when one is due. A snapshot that fails
// is remembered and does not end the run.
func (k *keeper) Keep(ctx context.Context) error {
	if err := k.Placed.Keep(ctx); err != nil {
		return err
	}
	if now := k.now(); k.every > 0 && now.Sub(k.last) >= k.every {
		k.failed = k.save(ctx)
		k.last = k.now()
	}
	return nil
}
