package worker

import (
	"context"
	"fmt"

	"rowstead/worker/basis"
	"rowstead/worker/kernel"
)

// Try forms x_try = x + Z·YU + M⁻¹·B·Y and its residuals; x, w and the basis stay.
func (b *Block) Try(ctx context.Context, c Correction) (ResidualSums, error) {
	if err := b.mayCorrect(c); err != nil {
		return ResidualSums{}, err
	}
	if b.cycle.Form == basis.Replay {
		return ResidualSums{}, fmt.Errorf("%w: no Try", ErrReplay)
	}
	c.T, c.Directions = nil, 0
	b.combine(c)
	return b.tryUpdate(ctx, c)
}

// Correct is Try at the end of a cycle, and forms U_new when c has T. In replay
// form it takes the steps again, with a product each but the last, and w is lost.
func (b *Block) Correct(ctx context.Context, c Correction) (ResidualSums, error) {
	if err := b.mayCorrect(c); err != nil {
		return ResidualSums{}, err
	}
	b.space.makeRoom(b.rows, c.Directions)
	products := 0
	if b.cycle.Form == basis.Replay {
		var err error
		if products, err = b.replay(ctx, c); err != nil {
			return ResidualSums{}, err
		}
	} else {
		b.combine(c)
	}
	if c.T != nil {
		b.space.pending = c.Directions
	}
	sums, err := b.tryUpdate(ctx, c)
	sums.Products = products
	return sums, err
}

// mayCorrect returns an error unless c fits the basis and the recycled space.
func (b *Block) mayCorrect(c Correction) error {
	if err := b.ready(false); err != nil {
		return err
	}
	rows := len(c.YU) + len(c.Y)
	switch {
	case !b.started && len(c.Y) > 0, b.started && len(c.Y) > b.basis.Len():
		return refuse("%d coefficients do not fit the basis", len(c.Y))
	case len(c.YU) != 0 && len(c.YU) != b.space.directions:
		return refuse("%d coefficients for a recycled space of %d", len(c.YU), b.space.directions)
	case c.Directions < 0 || len(c.T) != rows*c.Directions:
		return refuse("T has %d entries, expected %d×%d", len(c.T), rows, c.Directions)
	}
	return nil
}

// targets returns where sums over the basis go, B·Y and then the columns of
// U_new, and their coefficients k×(1+Directions).
func (b *Block) targets(c Correction) (dst [][]float64, t []float64) {
	dst = append(dst, b.spare)
	t = append(t, c.Y...)
	rows := len(c.YU) + len(c.Y)
	for q := range c.Directions {
		dst = append(dst, b.space.next[q])
		t = append(t, c.T[q*rows+len(c.YU):(q+1)*rows]...)
	}
	return dst, t
}

// beginSums sets the sums over the basis to their start over r: zero, and U·T_U.
func (b *Block) beginSums(dst [][]float64, c Correction, r kernel.Range) {
	for _, d := range dst {
		clear(d[r.Lo:r.Hi])
	}
	if len(c.YU) > 0 && c.Directions > 0 {
		kernel.Combine(dst[1:], b.space.u[:len(c.YU)], c.T, len(c.YU)+len(c.Y), r)
	}
}

// combine forms spare = B·Y and U_new in one pass over the basis.
func (b *Block) combine(c Correction) {
	dst, t := b.targets(c)
	b.each(func(_ int, r kernel.Range) {
		b.beginSums(dst, c, r)
		if len(c.Y) > 0 {
			b.basis.Combine(dst, t, len(c.Y), len(c.Y), r)
		}
	})
}

// replay is combine by the recurrence begun again from the w of Start.
func (b *Block) replay(ctx context.Context, c Correction) (products int, err error) {
	ring := b.basis.(*basis.Ring)
	dst, t := b.targets(c)
	k := len(c.Y)
	b.each(func(_ int, r kernel.Range) {
		copy(b.w[r.Lo:r.Hi], b.start[r.Lo:r.Hi])
		b.beginSums(dst, c, r)
	})
	ring.Rewind()
	toZ := b.needsCopy()
	for j := range k {
		ring.Again(b.w)
		b.each(func(_ int, r kernel.Range) {
			var unused [1]float64
			tiles(r, func(tile kernel.Range) {
				ring.Form(unused[:], tile)
				if toZ {
					copy(b.z[tile.Lo:tile.Hi], ring.Newest(nil, tile))
				}
				ring.Combine(dst, t, k, j+1, tile)
			})
		})
		if j == k-1 {
			break
		}
		z, err := b.bringNewest(ctx)
		if err != nil {
			return products, err
		}
		b.each(func(_ int, r kernel.Range) { kernel.Mul(b.w, b.matrix, z, r) })
		products++
	}
	return products, nil
}

// update turns spare = B·Y into z = Z·YU + M⁻¹·B·Y.
func (b *Block) update(c Correction) {
	b.precondition(b.z, b.spare)
	if len(c.YU) > 0 {
		b.each(func(_ int, r kernel.Range) { kernel.Correct(b.z, b.space.z[:len(c.YU)], c.YU, r) })
	}
}

// tryUpdate forms x_try from spare = B·Y and recomputes its residuals.
func (b *Block) tryUpdate(ctx context.Context, c Correction) (ResidualSums, error) {
	b.update(c)
	b.each(func(_ int, r kernel.Range) {
		try, x, z := b.try[r.Lo:r.Hi], b.x[r.Lo:r.Hi], b.z[r.Lo:r.Hi]
		for i := range try {
			try[i] = x[i] + z[i]
		}
	})
	sums, err := b.residual(ctx, b.try, nil)
	b.tried = err == nil
	return sums, err
}

// Keep sets x ← x_try of the last Try or Correct.
func (b *Block) Keep(context.Context) error {
	if !b.tried {
		return refuse("nothing tried to keep")
	}
	b.x, b.try = b.try, b.x
	b.tried = false
	return nil
}

// Probe returns the squares of v = Z·YU + M⁻¹·B·Y and of D·A·v. It spends one
// product; x_try stays.
func (b *Block) Probe(ctx context.Context, c Correction) (PairSums, error) {
	if err := b.mayCorrect(c); err != nil {
		return PairSums{}, err
	}
	if b.cycle.Form == basis.Replay && len(c.Y) > 0 {
		return PairSums{}, fmt.Errorf("%w: no Probe", ErrReplay)
	}
	c.T, c.Directions = nil, 0
	b.combine(c)
	b.update(c)
	if err := b.gather(ctx, b.z); err != nil {
		return PairSums{}, err
	}
	parts := make([]PairSums, len(b.strips))
	b.each(func(strip int, r kernel.Range) {
		kernel.Mul(b.spare, b.matrix, b.z, r)
		squares(&parts[strip].First, b.z[r.Lo:r.Hi])
		squares(&parts[strip].Second, b.spare[r.Lo:r.Hi])
	})
	return addPairs(parts), nil
}

func addPairs(parts []PairSums) (sum PairSums) {
	for _, p := range parts {
		addSquares(&sum.First, p.First)
		addSquares(&sum.Second, p.Second)
	}
	return sum
}

// Gradient returns the squares of (D·A)ᵀ·D·r and of D·r for x. It spends a
// product and one with the transpose, whose halo goes back to its owners.
func (b *Block) Gradient(ctx context.Context) (PairSums, error) {
	if err := b.ready(false); err != nil {
		return PairSums{}, err
	}
	sums, err := b.residual(ctx, b.x, b.spare)
	if err != nil {
		return PairSums{}, err
	}
	clear(b.z)
	kernel.AddMulT(b.z, b.matrix, b.spare, kernel.Range{Lo: 0, Hi: b.rows})
	if b.halo != nil {
		if err := b.halo.Scatter(ctx, b.z[b.rows:], b.z[:b.rows]); err != nil {
			return PairSums{}, err
		}
	}
	parts := make([]PairSums, len(b.strips))
	b.each(func(strip int, r kernel.Range) { squares(&parts[strip].First, b.z[r.Lo:r.Hi]) })
	out := addPairs(parts)
	out.Second = sums.Inner
	return out, nil
}
