package worker

import (
	"context"

	"rowstead/sketch"
	"rowstead/worker/kernel"
)

// recycled is the space of directions kept between cycles: U, U_new and Z = M⁻¹·U.
// U is kept because the next U_new is made from it.
type recycled struct {
	slab       []float64
	u, next, z [][]float64 // columns of the slab, all three with the same room
	directions int         // of U and Z; 0: no recycled space
	pending    int         // of U_new, until Recycle takes it
}

// drop forgets the space; its memory is kept for the next.
func (s *recycled) drop() { s.directions, s.pending = 0, 0 }

// makeRoom lets U_new have that many directions. What is in U and Z stays.
func (s *recycled) makeRoom(rows, directions int) {
	if directions <= len(s.u) {
		return
	}
	old := *s
	s.slab = make([]float64, 3*directions*rows)
	third := func(k int) [][]float64 {
		v := make([][]float64, directions)
		for i := range v {
			at := (k*directions + i) * rows
			v[i] = s.slab[at : at+rows : at+rows]
		}
		return v
	}
	s.u, s.next, s.z = third(0), third(1), third(2)
	for i := range old.directions {
		copy(s.u[i], old.u[i])
		copy(s.z[i], old.z[i])
	}
}

// Recycle makes U_new of the last Correct the recycled space, Z = M⁻¹·U, and
// sketches U and C·U with the operators of the cycle to come. Without a U_new
// the present space is sketched again. It spends one product a direction.
func (b *Block) Recycle(ctx context.Context, next Cycle) (RecycleSums, error) {
	if err := b.ready(false); err != nil {
		return RecycleSums{}, err
	}
	if err := next.check(); err != nil {
		return RecycleSums{}, err
	}
	s := &b.space
	if s.pending > 0 {
		s.u, s.next = s.next, s.u
		s.directions, s.pending = s.pending, 0
	}
	rows := next.SketchRows
	out := RecycleSums{
		SU: make([]float64, rows*s.directions), SAZ: make([]float64, rows*s.directions),
		HoldAZ: make([]float64, HoldRows*s.directions),
	}
	if rows == 0 {
		out.HoldAZ = nil
	}
	parts := kernel.NewPartials(len(b.strips), 2*rows+HoldRows)
	sums := make([]float64, 2*rows+HoldRows)
	for q := range s.directions {
		b.precondition(b.z, s.u[q])
		if err := b.gather(ctx, b.z); err != nil {
			return RecycleSums{}, err
		}
		parts.Clear()
		b.each(func(strip int, r kernel.Range) { b.sketchDirection(parts.Strip(strip), q, next, r) })
		if rows == 0 {
			continue
		}
		clear(sums)
		parts.Total(sums)
		copy(out.SU[q*rows:], sums[:rows])
		copy(out.SAZ[q*rows:], sums[rows:2*rows])
		copy(out.HoldAZ[q*HoldRows:], sums[2*rows:])
	}
	return out, nil
}

// sketchDirection keeps z as Z_q over r and adds S·U_q, S·C·U_q and S'·C·U_q to
// sums, one after the other.
func (b *Block) sketchDirection(sums []float64, q int, next Cycle, r kernel.Range) {
	copy(b.space.z[q][r.Lo:r.Hi], b.z[r.Lo:r.Hi])
	rows := next.SketchRows
	if rows == 0 {
		return
	}
	op, hold := sketch.New(rows, next.Zeta, next.Seed), sketch.HoldOut(next.Seed)
	kernel.Mul(b.spare, b.matrix, b.z, r)
	op.Add(sums[:rows], b.space.u[q][r.Lo:r.Hi], b.firstRow+r.Lo)
	op.AddBoth(hold, sums[rows:2*rows], sums[2*rows:], b.spare[r.Lo:r.Hi], b.firstRow+r.Lo)
}

// Forget drops the recycled space and U_new.
func (b *Block) Forget(context.Context) error {
	b.space.drop()
	return nil
}
