package place

import (
	"context"
	"errors"
	"fmt"
	"os/exec"
	"sync"
	"time"

	"rowstead/coordinator"
	"rowstead/coordinator/fleet/remote"
	"rowstead/coordinator/report"
)

// loopback is where processes of one machine meet; port 0 is any free one.
const loopback = "127.0.0.1:0"

// joining is how long worker processes may take to start and call.
const joining = 30 * time.Second

// Office starts worker processes on this machine for one run. Kill may be called
// at any time, by any goroutine.
type Office struct {
	// Command makes the command of a worker process, which reads its permit from
	// its standard input.
	Command func() (*exec.Cmd, error)

	mu       sync.Mutex
	children []*child // guarded by mu
	killed   bool     // guarded by mu
}

// Place starts a process for each block of p and places the blocks with them.
// Closing what it returns ends the processes.
func (o *Office) Place(ctx context.Context, p coordinator.Placement) (placed coordinator.Placed, err error) {
	hub, err := remote.Open(loopback, time.Now())
	if err != nil {
		return nil, err
	}
	h := &here{office: o, hub: hub, node: p.Node}
	defer func() {
		if err != nil {
			h.Close()
		}
	}()
	if err := h.gather(ctx, p.Cuts.Blocks()); err != nil {
		return nil, err
	}
	h.Space, err = remote.New(ctx, h.workers, remote.Problem{
		Matrix: p.Matrix, RowExponent: p.RowExponent, Cuts: p.Cuts, Right: p.Right, Guess: p.Guess, Threads: p.Threads,
	})
	if err != nil {
		return nil, err
	}
	if err := h.Prepare(ctx, p.Precondition, p.Conjugate); err != nil {
		return nil, err
	}
	return h, nil
}

var errKilled = errors.New("the run is being ended")

// Kill ends all worker processes at once and waits for them.
func (o *Office) Kill() {
	o.mu.Lock()
	o.killed = true
	children := o.children
	o.mu.Unlock()
	for _, c := range children {
		c.kill()
	}
	for _, c := range children {
		<-c.ended
	}
}

// here is a coordinator.Placed and a coordinator.Meter over worker processes.
type here struct {
	*remote.Space
	office *Office
	hub    *remote.Hub
	node   int

	children []*child         // by block
	workers  []*remote.Worker // by block, as far as they have called
}

var (
	_ coordinator.Placed = (*here)(nil)
	_ coordinator.Meter  = (*here)(nil)
)

// gather starts the processes and waits until all have called.
func (h *here) gather(ctx context.Context, count int) error {
	ctx, cancel := context.WithTimeoutCause(ctx, joining, fmt.Errorf("nothing was heard of it for %v", joining))
	defer cancel()
	for k := range count {
		name := fmt.Sprintf("worker-%d", k+1)
		permit, err := h.hub.Permit(name, loopback)
		if err != nil {
			return err
		}
		c, err := h.office.start(permit)
		if err != nil {
			return fmt.Errorf("start %s: %w", name, err)
		}
		h.children = append(h.children, c)
	}
	for _, c := range h.children {
		w, err := c.await(ctx, h.hub)
		if err != nil {
			return err
		}
		w.Explain(c.explain)
		h.workers = append(h.workers, w)
	}
	return nil
}

// Prepare scales and factors anew.
func (h *here) Prepare(ctx context.Context, precondition string, conjugate bool) error {
	return h.Space.Prepare(ctx, remote.Preparation{Precondition: precondition, Node: h.node, Conjugate: conjugate})
}

// Factors tells what became of the preconditioner, block by block.
func (h *here) Factors() []coordinator.Factor {
	var out []coordinator.Factor
	for _, r := range h.Prepared() {
		out = append(out, coordinator.Factor{Kind: r.Kind, Reason: r.Reason, Definite: r.Definite})
	}
	return out
}

// Workers tells who holds what, and how large each process has been; where the
// system does not tell, what its rows take.
func (h *here) Workers(ctx context.Context) ([]report.Worker, error) {
	held, err := h.Held(ctx)
	if err != nil {
		return nil, err
	}
	entries := h.Entries()
	out := make([]report.Worker, len(held))
	for k, w := range h.workers {
		lo, hi := w.Range()
		out[k] = report.Worker{Name: w.Name(), FirstRow: lo, Rows: hi - lo, Entries: entries[k], PeakBytes: held[k].PeakBytes}
		if out[k].PeakBytes == 0 {
			out[k].PeakBytes = held[k].BlockBytes
		}
	}
	return out, nil
}

// HaloEntries is how many entries of a vector cross borders in a product.
func (h *here) HaloEntries() int { return total(h.Space.HaloEntries()) }

// Moved is what steps have moved so far.
func (h *here) Moved(ctx context.Context) (coordinator.Moved, error) {
	held, err := h.Held(ctx)
	if err != nil {
		return coordinator.Moved{}, err
	}
	m := coordinator.Moved{Coordinator: h.StepBytes()}
	for _, w := range held {
		m.Halo += w.HaloBytes
	}
	workers := h.workers
	for _, p := range h.Relayed() {
		m.Relayed = append(m.Relayed, workers[p.First].Name()+" and "+workers[p.Second].Name())
	}
	return m, nil
}

// Close ends the connections and the processes, and those whose connection has
// ended before at once.
func (h *here) Close() {
	for k, w := range h.workers {
		select {
		case <-w.Ended():
			h.children[k].kill()
		default:
		}
	}
	h.hub.Close()
	h.office.finish()
}
