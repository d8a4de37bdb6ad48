// Package inproc makes the members of a fleet in this process: the rows are cut
// into blocks, each a worker.Block with its own team of threads, and halos pass
// through channels. It is the only package that knows both sides.
//
// Its noun is the Space. Rows are global, zero-based, in the order of the given
// matrix; b and x are in the units of the file. A Space is used by one goroutine
// at a time and must be closed. After a verb has failed
// halfway the blocks have come apart: only Solution, Memory and Close make sense
// then, and verbs say so.
package inproc

import (
	"context"
	"errors"
	"fmt"
	"sync"

	"rowstead/coordinator/fleet"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/worker"
	"rowstead/worker/halo"
	"rowstead/worker/precond"
)

// Problem is a system A·x = b and how its rows are held.
type Problem struct {
	// Matrix is square, already permuted, in the units of the file. New takes it
	// over: the blocks hold parts of its own arrays, whose values and columns are
	// rewritten. Whoever needs A afterwards reads it again.
	Matrix *csr.Matrix
	// RowExponent has e of the row scaling D = 2^e; nil: none.
	RowExponent []int16
	Cuts        partition.RowCuts
	Right       []float64 // b; copied
	Guess       []float64 // x to begin with; copied; nil: zero

	Precondition string // a kind of package precond; "": none
	Options      precond.Options
	// Conjugate prepares the blocks for conjugate gradients instead; Prepare
	// changes it.
	Conjugate bool
	// Threads is how many threads the blocks share, each at least one; 0: one each.
	Threads int
}

// Space is a method.Space and a method.ConjugateSpace over blocks in this
// process; the verbs are the fleet's.
type Space struct {
	*fleet.Space
	blocks   []*worker.Block
	reports  []precond.Report
	received []int
	entries  []int
}

// New cuts the problem into blocks and prepares them. It panics when lengths
// disagree; an error says what cannot be prepared.
func New(p Problem) (*Space, error) {
	n := p.Matrix.Rows
	if p.Matrix.Cols != n || p.Cuts.Rows() != n || len(p.Right) != n ||
		(p.Guess != nil && len(p.Guess) != n) || (p.RowExponent != nil && len(p.RowExponent) != n) {
		panic("inproc: lengths disagree in Problem")
	}
	s := &Space{blocks: make([]*worker.Block, p.Cuts.Blocks())}
	plan := partition.PlanHalo(p.Cuts, needs(p))
	exchanges := halo.NewLocal(len(s.blocks))
	members := make([]fleet.Member, len(s.blocks))
	for k := range s.blocks {
		s.blocks[k] = worker.New(config(p, k, &plan.Blocks[k], exchanges[k]))
		members[k] = member{Block: s.blocks[k], name: fmt.Sprintf("block %d", k+1)}
		s.received = append(s.received, len(plan.Blocks[k].Columns))
		lo, hi := p.Cuts.Range(k)
		s.entries = append(s.entries, p.Matrix.Start[hi]-p.Matrix.Start[lo])
	}
	var err error
	if s.Space, err = fleet.New(members); err != nil {
		s.Close()
		return nil, fmt.Errorf("in this process: %w", err)
	}
	if err := s.Prepare(context.Background(), p.Precondition, p.Options, p.Conjugate); err != nil {
		s.Close()
		return nil, err
	}
	return s, nil
}

// needs returns the halo columns of every block.
func needs(p Problem) [][]int32 {
	all := make([][]int32, p.Cuts.Blocks())
	for k := range all {
		lo, hi := p.Cuts.Range(k)
		all[k] = partition.Needs(lo, p.Matrix.Start[lo:hi+1], p.Matrix.Col)
	}
	return all
}

// config turns the rows of block k, where they stand, into local columns.
func config(p Problem, k int, plan *partition.BlockHalo, x halo.Exchange) worker.Config {
	lo, hi := p.Cuts.Range(k)
	m := p.Matrix
	from, to := m.Start[lo], m.Start[hi]
	rows := &csr.Matrix{Rows: hi - lo, Cols: hi - lo + len(plan.Columns), Start: m.Start, Col: m.Col[from:to:to], Val: m.Val[from:to:to]}
	if p.Cuts.Blocks() > 1 {
		rows.Start = make([]int, hi-lo+1)
		for i := range rows.Start {
			rows.Start[i] = m.Start[lo+i] - from
		}
		partition.LocalColumns(lo, hi-lo, plan.Columns, rows.Col, rows.Col)
	}
	c := worker.Config{
		Matrix: rows, FirstRow: lo, Plan: plan, Exchange: x,
		Right: p.Right[lo:hi], Threads: share(p.Threads, p.Cuts.Blocks(), k),
	}
	if p.RowExponent != nil {
		c.RowExponent = p.RowExponent[lo:hi]
	}
	if p.Guess != nil {
		c.Guess = p.Guess[lo:hi]
	}
	return c
}

// share is the part of so many threads that block k of blocks gets, at least 1.
func share(threads, blocks, k int) int {
	n := threads / blocks
	if k < threads%blocks {
		n++
	}
	return max(n, 1)
}

// Prepare scales the blocks for conjugate gradients or for the other methods and
// builds their preconditioners anew; x and b stay, basis and recycled space are
// dropped. The error names a kind or options that make no sense.
func (s *Space) Prepare(ctx context.Context, precondition string, o precond.Options, conjugate bool) error {
	if precondition == "" {
		precondition = precond.None
	}
	inner, cancel := context.WithCancel(ctx)
	defer cancel()
	reports := make([]precond.Report, len(s.blocks))
	failures := make([]error, len(s.blocks))
	var all sync.WaitGroup
	for k, b := range s.blocks {
		all.Go(func() {
			p := worker.Preparation{Precondition: precondition, Options: o, Conjugate: conjugate}
			if reports[k], failures[k] = b.Prepare(inner, p); failures[k] != nil {
				cancel()
			}
		})
	}
	all.Wait()
	s.reports = reports
	for _, err := range failures {
		if err != nil && (ctx.Err() != nil || !errors.Is(err, context.Canceled)) {
			return err
		}
	}
	return nil
}

// Preconditioners returns what was built, block by block.
func (s *Space) Preconditioners() []precond.Report { return s.reports }

// Memory returns what the blocks hold now, block by block.
func (s *Space) Memory() []worker.Memory {
	all := make([]worker.Memory, len(s.blocks))
	for k, b := range s.blocks {
		all[k] = b.Memory()
	}
	return all
}

// HaloEntries returns how many entries of x each block receives a product.
func (s *Space) HaloEntries() []int { return s.received }

// Entries returns how many entries of A each block holds.
func (s *Space) Entries() []int { return s.entries }

// Solution returns x in a slice of its own.
func (s *Space) Solution() []float64 {
	x := make([]float64, s.Rows())
	for _, b := range s.blocks {
		lo, hi := b.Range()
		b.Solution(x[lo:hi])
	}
	return x
}

// SetRight replaces b, for a further right side; x stays. It panics when the
// length is wrong.
func (s *Space) SetRight(right []float64) {
	s.eachRange(right, (*worker.Block).SetRight)
}

// SetGuess replaces x. It panics when the length is wrong.
func (s *Space) SetGuess(x []float64) {
	s.eachRange(x, (*worker.Block).SetGuess)
}

func (s *Space) eachRange(v []float64, set func(*worker.Block, []float64)) {
	if len(v) != s.Rows() {
		panic("inproc: a vector of the wrong length")
	}
	for _, b := range s.blocks {
		lo, hi := b.Range()
		set(b, v[lo:hi])
	}
}

// Close ends the threads of all blocks.
func (s *Space) Close() {
	for _, b := range s.blocks {
		b.Close()
	}
}
