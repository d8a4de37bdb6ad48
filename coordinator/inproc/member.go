package inproc

import (
	"context"
	"errors"
	"fmt"

	"rowstead/coordinator/fleet"
	"rowstead/coordinator/method"
	"rowstead/worker"
)

// member is a block as a fleet.Member; the verbs only change the names of types.
type member struct {
	*worker.Block
	name string
}

var _ fleet.Member = member{}

func (m member) Name() string { return m.name }

// known turns a block's refusal into the fleet's.
func known(err error) error {
	var refusal *worker.Refusal
	if errors.As(err, &refusal) {
		return fmt.Errorf("%w: %w", fleet.ErrRefused, err)
	}
	return err
}

func (m member) Keep(ctx context.Context) error { return known(m.Block.Keep(ctx)) }

func cycle(c method.Cycle) worker.Cycle {
	return worker.Cycle{
		Seed: c.Seed, SketchRows: c.SketchRows, Zeta: c.Zeta,
		Capacity: c.Capacity, Window: c.Window, Form: string(c.Form),
	}
}

func (m member) Start(ctx context.Context, c method.Cycle) (fleet.ResidualSums, error) {
	r, err := m.Block.Start(ctx, cycle(c))
	return fleet.ResidualSums(r), known(err)
}

func (m member) Advance(ctx context.Context, s method.Step) (fleet.StepSums, error) {
	r, err := m.Block.Advance(ctx, worker.Step(s))
	return fleet.StepSums(r), known(err)
}

func (m member) Sketches(ctx context.Context, from, to int) (fleet.SketchSums, error) {
	r, err := m.Block.Sketches(ctx, from, to)
	return fleet.SketchSums(r), known(err)
}

func (m member) Reduce(ctx context.Context, h []float64) (fleet.DotSums, error) {
	r, err := m.Block.Reduce(ctx, h)
	return fleet.DotSums(r), known(err)
}

func (m member) Try(ctx context.Context, c method.Correction) (fleet.ResidualSums, error) {
	r, err := m.Block.Try(ctx, worker.Correction(c))
	return fleet.ResidualSums(r), known(err)
}

func (m member) Correct(ctx context.Context, c method.Correction) (fleet.ResidualSums, error) {
	r, err := m.Block.Correct(ctx, worker.Correction(c))
	return fleet.ResidualSums(r), known(err)
}

func (m member) Recycle(ctx context.Context, next method.Cycle) (fleet.RecycleSums, error) {
	r, err := m.Block.Recycle(ctx, cycle(next))
	return fleet.RecycleSums(r), known(err)
}

func (m member) Check(ctx context.Context) (fleet.ResidualSums, error) {
	r, err := m.Block.Check(ctx)
	return fleet.ResidualSums(r), known(err)
}

func (m member) Gradient(ctx context.Context) (fleet.PairSums, error) {
	r, err := m.Block.Gradient(ctx)
	return fleet.PairSums(r), known(err)
}

func (m member) Probe(ctx context.Context, c method.Correction) (fleet.PairSums, error) {
	r, err := m.Block.Probe(ctx, worker.Correction(c))
	return fleet.PairSums(r), known(err)
}

func (m member) StartConjugate(ctx context.Context) (fleet.ConjugateSums, error) {
	r, err := m.Block.StartConjugate(ctx)
	return fleet.ConjugateSums(r), known(err)
}

func (m member) Direct(ctx context.Context, beta float64) (fleet.ConjugateSums, error) {
	r, err := m.Block.Direct(ctx, beta)
	return fleet.ConjugateSums(r), known(err)
}

func (m member) Move(ctx context.Context, alpha float64) (fleet.ConjugateSums, error) {
	r, err := m.Block.Move(ctx, alpha)
	return fleet.ConjugateSums(r), known(err)
}
