// Package place joins the coordinator to workers, in this process or in others of
// this machine: it turns a coordinator.Placement into blocks and back.
//
// Its nouns are the two makers of a coordinator.Placed, InProcess and an Office
// of worker processes, which it starts, watches and ends. A Placed is used by one
// goroutine and must be closed.
package place

import (
	"context"
	"fmt"

	"rowstead/coordinator"
	"rowstead/coordinator/inproc"
	"rowstead/coordinator/report"
	"rowstead/worker/precond"
)

// inProcess is a coordinator.Placed over an inproc.Space.
type inProcess struct {
	*inproc.Space
	cuts    []int
	options precond.Options
}

var _ coordinator.Placed = (*inProcess)(nil)

// InProcess holds the rows of p in this process.
func InProcess(_ context.Context, p coordinator.Placement) (coordinator.Placed, error) {
	options := precond.Options{Node: p.Node}
	space, err := inproc.New(inproc.Problem{
		Matrix: p.Matrix, RowExponent: p.RowExponent, Cuts: p.Cuts, Right: p.Right, Guess: p.Guess,
		Precondition: p.Precondition, Options: options, Conjugate: p.Conjugate, Threads: p.Threads,
	})
	if err != nil {
		return nil, err
	}
	return &inProcess{Space: space, cuts: append(p.Cuts.Starts(), p.Cuts.Rows()), options: options}, nil
}

// Prepare scales and factors anew.
func (s *inProcess) Prepare(ctx context.Context, precondition string, conjugate bool) error {
	return s.Space.Prepare(ctx, precondition, s.options, conjugate)
}

// Factors tells what became of the preconditioner, block by block.
func (s *inProcess) Factors() []coordinator.Factor {
	var out []coordinator.Factor
	for _, r := range s.Preconditioners() {
		out = append(out, coordinator.Factor{Kind: r.Kind, Reason: r.Reason, Definite: r.Symmetric && r.PositiveDefinite})
	}
	return out
}

// SetRight replaces b.
func (s *inProcess) SetRight(_ context.Context, b []float64) error {
	s.Space.SetRight(b)
	return nil
}

// SetGuess replaces x.
func (s *inProcess) SetGuess(_ context.Context, x []float64) error {
	s.Space.SetGuess(x)
	return nil
}

// Solution returns x.
func (s *inProcess) Solution(context.Context) ([]float64, error) {
	return s.Space.Solution(), nil
}

// Workers tells who holds what.
func (s *inProcess) Workers(context.Context) ([]report.Worker, error) {
	memory, entries := s.Memory(), s.Entries()
	out := make([]report.Worker, len(memory))
	for k := range out {
		out[k] = report.Worker{
			Name: fmt.Sprintf("block %d", k+1), FirstRow: s.cuts[k], Rows: s.cuts[k+1] - s.cuts[k],
			Entries: entries[k], PeakBytes: memory[k].Total(),
		}
	}
	return out, nil
}

// HaloEntries is how many entries of a vector cross borders in a product.
func (s *inProcess) HaloEntries() int { return total(s.Space.HaloEntries()) }

func total(counts []int) int {
	sum := 0
	for _, n := range counts {
		sum += n
	}
	return sum
}
