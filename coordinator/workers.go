package coordinator

import (
	"context"
	"fmt"
	"strings"

	"rowstead/coordinator/report"
)

// tellWorkers records who held what and what a step moved: measured where
// something crosses between processes, counted from the numbers otherwise. The
// answer is there already: a failure is told and ends nothing.
func (r *runner) tellWorkers(ctx context.Context) {
	var err error
	if r.rec.Workers, err = r.placed.Workers(ctx); err != nil {
		r.event(fmt.Sprintf("the workers could not be asked what they held: %v", err))
	}
	if r.placed.steps == 0 {
		return
	}
	steps := float64(r.placed.steps)
	traffic := &r.rec.Traffic
	meter, measured := r.placed.Placed.(Meter)
	if !measured {
		traffic.CoordinatorBytesPerStep = report.Number(float64(r.placed.bytes) / steps)
		traffic.HaloBytesPerStep = report.Number(8 * r.placed.HaloEntries())
		return
	}
	moved, err := meter.Moved(ctx)
	if err != nil {
		r.event(fmt.Sprintf("the workers could not be asked what they moved: %v", err))
		return
	}
	traffic.CoordinatorBytesPerStep = report.Number(float64(moved.Coordinator) / steps)
	traffic.HaloBytesPerStep = report.Number(float64(moved.Halo) / steps)
	if len(moved.Relayed) > 0 {
		r.choose("halos", "relayed", "through the coordinator between "+strings.Join(moved.Relayed, ", ")+", which do not reach each other", false)
		return
	}
	r.choose("halos", "direct", "every worker reaches its neighbours", false)
}

// chooseWorkers records where the blocks are held, and refuses cuts for another
// number of workers.
func (r *runner) chooseWorkers(blocks int) error {
	if r.job.Here == 0 {
		return nil
	}
	if r.job.Cuts != "" && blocks != r.job.Here {
		return &InputError{fmt.Sprintf("%s: it makes %d blocks, but --here asks for %d workers", r.job.Cuts, blocks, r.job.Here)}
	}
	r.choose("workers", fmt.Sprint(blocks), "processes on this machine, a row block each", true)
	return nil
}
