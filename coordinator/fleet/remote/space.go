package remote

import (
	"context"
	"errors"
	"fmt"
	"sync"

	"rowstead/coordinator/fleet"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/proto"
)

// Problem is a system A·x = b and how its rows are held.
type Problem struct {
	// Matrix is square, already permuted, in the units of the file. New only reads
	// it, and does not keep it.
	Matrix *csr.Matrix
	// RowExponent has e of the row scaling D = 2^e; nil: none.
	RowExponent []int16
	Cuts        partition.RowCuts
	Right       []float64 // b
	Guess       []float64 // x to begin with; nil: zero
	Threads     int       // shared by the workers, each has at least one
}

// Preparation says what system the verbs work on.
type Preparation struct {
	Precondition string // by the names of the worker's kinds
	Node         int    // unknowns interleaved at a node
	Conjugate    bool
}

// Space is a method.Space and a method.ConjugateSpace over placed workers; the
// verbs are the fleet's. The workers stay their Hub's.
type Space struct {
	*fleet.Space
	workers  []*Worker
	cuts     partition.RowCuts
	prepared []*proto.Prepared
	entries  []int
	received []int
	relayed  []Pair
}

// Pair are two blocks whose halos go through the coordinator.
type Pair struct{ First, Second int }

// New places block k of the problem with workers[k] and tells neighbours of each
// other. Prepare must come next. It panics when lengths disagree.
func New(ctx context.Context, workers []*Worker, p Problem) (*Space, error) {
	n := p.Matrix.Rows
	if p.Matrix.Cols != n || p.Cuts.Rows() != n || len(p.Right) != n || p.Cuts.Blocks() != len(workers) ||
		(p.Guess != nil && len(p.Guess) != n) || (p.RowExponent != nil && len(p.RowExponent) != n) {
		panic("remote: lengths disagree in Problem")
	}
	s := &Space{workers: workers, cuts: p.Cuts}
	needs := make([][]int32, len(workers))
	for k, w := range workers {
		w.block, w.peers = k, workers
		w.lo, w.hi = p.Cuts.Range(k)
		s.entries = append(s.entries, p.Matrix.Start[w.hi]-p.Matrix.Start[w.lo])
	}
	err := s.each(ctx, "place", func(ctx context.Context, k int, w *Worker) (err error) {
		needs[k], err = w.place(ctx, p)
		return err
	})
	if err != nil {
		return nil, err
	}
	if err := partition.CheckNeeds(p.Cuts, needs); err != nil {
		return nil, fmt.Errorf("place: %w", err)
	}
	plan := partition.PlanHalo(p.Cuts, needs)
	for k := range plan.Blocks {
		s.received = append(s.received, len(plan.Blocks[k].Columns))
	}
	if err := s.connect(ctx, plan); err != nil {
		return nil, err
	}
	members := make([]fleet.Member, len(workers))
	for k, w := range workers {
		members[k] = w
	}
	s.Space, err = fleet.New(members)
	return s, err
}

// each calls do for all workers at once and waits. The first failure cancels the
// others; the error is that of the first worker that did not merely see the
// cancellation.
func (s *Space) each(ctx context.Context, op string, do func(ctx context.Context, k int, w *Worker) error) error {
	inner, cancel := context.WithCancel(ctx)
	defer cancel()
	failures := make([]error, len(s.workers))
	var all sync.WaitGroup
	for k, w := range s.workers {
		all.Go(func() {
			if failures[k] = do(inner, k, w); failures[k] != nil {
				cancel()
			}
		})
	}
	all.Wait()
	var followed error
	for k, err := range failures {
		if err == nil {
			continue
		}
		w := s.workers[k]
		named := &fleet.MemberError{Member: w.name, Op: op, Lo: w.lo, Hi: w.hi, Err: err}
		if ctx.Err() != nil || !errors.Is(err, context.Canceled) {
			return named
		}
		followed = named
	}
	return followed
}

// Prepare scales the blocks for conjugate gradients or for the other methods and
// builds their preconditioners anew; x and b stay, basis and recycled space are
// dropped.
func (s *Space) Prepare(ctx context.Context, p Preparation) error {
	prepared := make([]*proto.Prepared, len(s.workers))
	o := &proto.Prepare{Precondition: p.Precondition, Conjugate: p.Conjugate, Node: int32(p.Node)}
	err := s.each(ctx, "prepare", func(ctx context.Context, k int, w *Worker) error {
		w.recent.reset(0)
		a, err := w.call(ctx, &proto.Order{What: &proto.Order_Prepare{Prepare: o}}, nil)
		if err == nil && a.GetPrepared() == nil {
			err = errAnswer
		}
		prepared[k] = a.GetPrepared()
		return err
	})
	if err == nil {
		s.prepared = prepared
	}
	return err
}

// Prepared returns what the preconditioners became, block by block.
func (s *Space) Prepared() []*proto.Prepared { return s.prepared }

// Entries returns how many entries of A each worker holds.
func (s *Space) Entries() []int { return s.entries }

// HaloEntries returns how many entries of x each worker receives a product.
func (s *Space) HaloEntries() []int { return s.received }

// Relayed returns the neighbours whose halos go through the coordinator because
// neither could reach the other.
func (s *Space) Relayed() []Pair { return s.relayed }

// Held asks what the workers hold and have moved.
func (s *Space) Held(ctx context.Context) ([]*proto.Held, error) {
	held := make([]*proto.Held, len(s.workers))
	err := s.each(ctx, "status", func(ctx context.Context, k int, w *Worker) error {
		a, err := w.call(ctx, &proto.Order{What: &proto.Order_Status{Status: &proto.Status{}}}, nil)
		if held[k] = a.GetHeld(); err == nil && held[k] == nil {
			err = errAnswer
		}
		return err
	})
	return held, err
}

// StepBytes returns how many bytes steps have moved between the workers and the
// coordinator so far: the whole frames of Advance, Reduce, Sketches, Direct and
// Move, down and up.
func (s *Space) StepBytes() int64 {
	sum := int64(0)
	for _, w := range s.workers {
		sum += w.stepBytes.Load()
	}
	return sum
}

// Solution returns x in a slice of its own.
func (s *Space) Solution(ctx context.Context) ([]float64, error) {
	x := make([]float64, s.Rows())
	err := s.each(ctx, "fetch the answer", func(ctx context.Context, _ int, w *Worker) error {
		for lo := w.lo; lo < w.hi; lo += chunk {
			hi := min(lo+chunk, w.hi)
			fetch := &proto.Fetch{Lo: int64(lo - w.lo), Hi: int64(hi - w.lo)}
			a, err := w.numbers(ctx, hi-lo, &proto.Order{What: &proto.Order_Fetch{Fetch: fetch}})
			if err != nil {
				return err
			}
			copy(x[lo:hi], a.floats)
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	return x, nil
}

// SetRight replaces b, for a further right side; x stays. It panics when the
// length is wrong.
func (s *Space) SetRight(ctx context.Context, right []float64) error {
	return s.set(ctx, proto.Vector_RIGHT, right)
}

// SetGuess replaces x. It panics when the length is wrong.
func (s *Space) SetGuess(ctx context.Context, x []float64) error {
	return s.set(ctx, proto.Vector_GUESS, x)
}

func (s *Space) set(ctx context.Context, kind proto.Vector_Kind, v []float64) error {
	if len(v) != s.Rows() {
		panic("remote: a vector of the wrong length")
	}
	return s.each(ctx, "take a vector", func(ctx context.Context, _ int, w *Worker) error {
		w.recent.reset(0)
		if err := w.sendVector(ctx, kind, v[w.lo:w.hi]); err != nil {
			return err
		}
		return w.ask(ctx, &proto.Order{What: &proto.Order_Apply{Apply: &proto.Apply{Kind: kind}}}, nil)
	})
}
