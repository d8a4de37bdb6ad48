package remote

import (
	"context"

	"rowstead/coordinator/fleet"
	"rowstead/proto"
)

// scalars is call for a verb of conjugate gradients, which answers with two
// numbers.
func (w *Worker) scalars(ctx context.Context, o *proto.Order, floats ...[]float64) (fleet.ConjugateSums, error) {
	a, err := w.numbers(ctx, 2, o, floats...)
	if err != nil {
		return fleet.ConjugateSums{}, err
	}
	if len(floats) > 0 {
		w.stepBytes.Add(int64(a.bytes))
	}
	return fleet.ConjugateSums{RR: a.floats[0], RZ: a.floats[1]}, nil
}

// StartConjugate implements fleet.Member.
func (w *Worker) StartConjugate(ctx context.Context) (fleet.ConjugateSums, error) {
	return w.scalars(ctx, &proto.Order{What: &proto.Order_StartConjugate{StartConjugate: empty()}})
}

// Direct implements fleet.Member.
func (w *Worker) Direct(ctx context.Context, beta float64) (fleet.ConjugateSums, error) {
	return w.scalars(ctx, &proto.Order{What: &proto.Order_Direct{Direct: empty()}}, []float64{beta})
}

// Move implements fleet.Member.
func (w *Worker) Move(ctx context.Context, alpha float64) (fleet.ConjugateSums, error) {
	return w.scalars(ctx, &proto.Order{What: &proto.Order_Move{Move: empty()}}, []float64{alpha})
}
