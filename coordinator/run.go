package coordinator

import (
	"context"
	"fmt"
	"runtime"
	"time"

	"rowstead/coordinator/report"
	"rowstead/partition/matfile"
	"rowstead/partition/order"
)

// runner is a Run under way.
type runner struct {
	job    Job
	rim    Rim
	rec    *report.Record
	sys    *system
	plan   plan
	placed *keeper
	why    map[string]string // reasons of choices that are told later
	begun  time.Time
	pace   report.Pace
	column int         // the right side in work
	scale  []int16     // e of the row scaling 2^e, in the order of the file
	shift  int         // b and x of the workers are those of the file times 2^shift
	x      [][]float64 // answers, in the order and units of the file
	before int         // products of earlier right sides
	need   size        // of memory, as the header tells
	most   float64     // bytes that may be used
	harder bool        // the harder try is in work, or was
	// threads says that their number was asked for.
	threads bool
}

// Run carries out a job and fills in rec as it goes. An error says that there is
// no verdict; a run that falls short or is interrupted with an answer returns
// nil and says so in rec.
func Run(ctx context.Context, j Job, rim Rim, rec *report.Record) error {
	r := &runner{job: j, rim: rim, rec: rec, why: map[string]string{}, begun: rim.Now()}
	r.pace.Tolerance = j.Tolerance
	rec.Tolerance, rec.Seed, rec.Started = report.Number(j.Tolerance), j.Seed, r.begun
	r.threads = r.job.Threads > 0
	if !r.threads {
		r.job.Threads = runtime.GOMAXPROCS(0)
	}
	defer func() {
		rec.Seconds.Total = r.since(r.begun)
		rec.CoordinatorPeakBytes = rim.PeakMemory()
	}()
	if err := r.read(ctx); err != nil {
		return err
	}
	rim.Opened(rec)
	if err := r.prepare(ctx); err != nil {
		return err
	}
	defer r.placed.Close()
	rim.Phase(report.Stepping)
	if err := r.solve(ctx); err != nil {
		return err
	}
	rec.Seconds.Total = r.since(r.begun)
	return r.finish()
}

func (r *runner) since(t time.Time) report.Number {
	return report.Number(r.rim.Now().Sub(t).Seconds())
}

// timed adds the time of a phase.
func (r *runner) timed(into *report.Number, phase func() error) error {
	start := r.rim.Now()
	defer func() { *into += r.since(start) }()
	return phase()
}

// read looks at the header, compares the need of memory with what there is, and
// loads the inputs.
func (r *runner) read(ctx context.Context) error {
	r.rim.Phase(report.Placing)
	return r.timed(&r.rec.Seconds.Read, func() error {
		if err := unchanged(r.job); err != nil {
			return err
		}
		head, err := look(r.job)
		r.rec.Rows, r.rec.Columns, r.rec.Entries = head.Rows, head.Cols, int(head.Stored)
		if err != nil {
			return err
		}
		if err := r.budget(head); err != nil {
			return err
		}
		hashed := inputs(r.job)
		r.sys, err = load(ctx, r.job, head)
		list, failed := hashed()
		if err != nil {
			return err
		}
		if failed != nil {
			return failed
		}
		r.sys.findTrouble()
		r.rec.Inputs, r.rec.Entries = list, r.sys.matrix.Entries()
		return nil
	})
}

// budget finds how much memory may be used, refuses what cannot fit, and chooses
// the form of the basis.
func (r *runner) budget(head matfile.Header) error {
	entries, err := believable(head)
	if err != nil {
		return err
	}
	r.most = r.allowed()
	r.need = size{
		rows: float64(head.Rows), entries: entries, columns: 1, recycle: recycled,
		precondition: r.job.Precondition, method: r.job.Method, processes: float64(r.job.Here),
	}
	if err := absurd(head, r.need, r.most); err != nil {
		return err
	}
	r.plan.form, r.why["basis"], err = r.need.fit(r.job, r.most)
	return err
}

// recycled is how many directions a method keeps between cycles.
const recycled = 16

// unlimited stands for memory that is not checked.
const unlimited = 1e18

// allowed is how many bytes may be used.
func (r *runner) allowed() float64 {
	if asked := float64(r.job.Memory); asked > 0 {
		r.choose("memory", bytesText(asked), "", true)
		return asked
	}
	free, err := r.rim.FreeMemory()
	if err != nil {
		r.choose("memory", "unlimited", err.Error(), false)
		return unlimited
	}
	allowed := shareOfFree * float64(free)
	r.choose("memory", bytesText(allowed), fmt.Sprintf("%.0f %% of the %s that are free", 100*shareOfFree, bytesText(float64(free))), false)
	return allowed
}

// prepare orders, scales, cuts, places and factors.
func (r *runner) prepare(ctx context.Context) error {
	var scale []int16
	err := r.timed(&r.rec.Seconds.Place, func() error {
		diagonal := order.DiagonalReport(r.sys.matrix)
		r.choosePreconditioner(&r.plan, diagonal)
		if err := r.chooseConjugate(&r.plan, diagonal); err != nil {
			return err
		}
		if err := r.chooseOrder(&r.plan); err != nil {
			return err
		}
		scale = order.RowScale(r.sys.matrix)
		r.scale = scale
		if r.plan.perm != nil {
			r.scale = make([]int16, len(scale))
			for i, at := range r.plan.perm {
				r.scale[at] = scale[i]
			}
		}
		r.rec.Cuts = r.plan.cuts.Starts()
		return ctx.Err()
	})
	if err != nil {
		return err
	}
	r.rim.Phase(report.Preparing)
	return r.timed(&r.rec.Seconds.Prepare, func() error { return r.place(ctx, scale) })
}

// place hands the rows to the workers.
func (r *runner) place(ctx context.Context, scale []int16) error {
	blocks := r.plan.cuts.Blocks()
	r.chooseBlocks(blocks)
	if err := r.chooseWorkers(blocks); err != nil {
		return err
	}
	node := 1
	if r.sys.complex && r.plan.perm == nil {
		node = 2
	}
	placed, err := r.rim.Place(ctx, Placement{
		Matrix: r.sys.matrix, RowExponent: scale, Cuts: r.plan.cuts,
		Right: r.forward(r.sys.right[0]), Precondition: r.plan.precondition,
		Threads: r.job.Threads, Conjugate: r.plan.conjugate, Node: node,
	})
	if err != nil {
		return err
	}
	r.sys.matrix = nil // handed over
	r.placed = &keeper{Placed: placed, blocks: blocks, every: r.job.SnapshotEvery, now: r.rim.Now, last: r.begun, save: r.snapshot}
	return nil
}

// chooseBlocks records how the rows are cut and shared among threads.
func (r *runner) chooseBlocks(blocks int) {
	switch {
	case r.job.Cuts != "":
		r.choose("blocks", fmt.Sprint(blocks), "from the file of cuts", true)
	case r.job.Blocks == 0:
		r.choose("blocks", fmt.Sprint(blocks), "one process needs no more, and one block couples best", false)
	case blocks < r.job.Blocks:
		r.choose("blocks", fmt.Sprint(blocks), fmt.Sprintf("%d were asked for, but a block has at least 8 rows", r.job.Blocks), true)
	default:
		r.choose("blocks", fmt.Sprint(blocks), "", true)
	}
	r.choose("scaling", "rows", "every row is multiplied by a power of two so that its largest entry is about 1", false)
}

// choose records a setting.
func (r *runner) choose(name, value, reason string, asked bool) {
	r.rec.Choices = append(r.rec.Choices, report.Choice{Name: name, Value: value, Reason: reason, Asked: asked})
}

// event adds a line to the story.
func (r *runner) event(text string) {
	r.rec.Story = append(r.rec.Story, report.Event{Second: r.since(r.begun), Column: r.column, Products: r.before, Text: text})
}

// forward brings a vector into the order of the blocks.
func (r *runner) forward(v []float64) []float64 {
	if r.plan.perm == nil {
		return v
	}
	out := make([]float64, len(v))
	order.PermuteVector(out, v, r.plan.perm)
	return out
}

// backward brings a vector into the order of the file.
func (r *runner) backward(v []float64) []float64 {
	if r.plan.perm == nil {
		return v
	}
	out := make([]float64, len(v))
	order.Unpermute(out, v, r.plan.perm)
	return out
}
