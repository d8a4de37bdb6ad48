package worker

import (
	"context"

	"rowstead/worker/kernel"
)

// The verbs of conjugate gradients work on S·A·S·t = S·b. x holds t = S⁻¹·x, w
// holds r, x_try's memory holds p, spare holds S·A·S·p.

// StartConjugate sets r = S·(b − A·x), z = M⁻¹·r, p = 0 and returns r·r and r·z.
func (b *Block) StartConjugate(ctx context.Context) (ConjugateSums, error) {
	if err := b.ready(true); err != nil {
		return ConjugateSums{}, err
	}
	if _, err := b.residual(ctx, b.x, b.w); err != nil {
		return ConjugateSums{}, err
	}
	clear(b.try)
	clear(b.spare)
	b.tried, b.started = false, true
	return b.Move(ctx, 0)
}

// mayMove returns an error unless conjugate gradients are started.
func (b *Block) mayMove() error {
	if err := b.ready(true); err != nil {
		return err
	}
	if !b.started {
		return refuse("conjugate gradients are not started")
	}
	return nil
}

// Direct sets p ← z + beta·p and q = S·A·S·p and returns p·q.
func (b *Block) Direct(ctx context.Context, beta float64) (ConjugateSums, error) {
	if err := b.mayMove(); err != nil {
		return ConjugateSums{}, err
	}
	p := b.try
	b.each(func(_ int, r kernel.Range) {
		own, z := p[r.Lo:r.Hi], b.z[r.Lo:r.Hi]
		for i := range own {
			own[i] = z[i] + float64(beta*own[i])
		}
	})
	if err := b.gather(ctx, p); err != nil {
		return ConjugateSums{}, err
	}
	parts := make([]ConjugateSums, len(b.strips))
	b.each(func(strip int, r kernel.Range) {
		cols := [][]float64{b.spare}
		tiles(r, func(t kernel.Range) {
			kernel.Mul(b.spare, b.matrix, p, t)
			var pq [1]float64
			kernel.Dots(pq[:], p, cols, t)
			parts[strip].RZ += pq[0]
		})
	})
	return addConjugate(parts), nil
}

// Move sets t ← t + alpha·p, r ← r − alpha·q, z = M⁻¹·r and returns r·r and r·z.
func (b *Block) Move(_ context.Context, alpha float64) (ConjugateSums, error) {
	if err := b.mayMove(); err != nil {
		return ConjugateSums{}, err
	}
	parts := make([]ConjugateSums, len(b.strips))
	b.each(func(strip int, r kernel.Range) {
		p, q, a := [][]float64{b.try}, [][]float64{b.spare}, []float64{alpha}
		tiles(r, func(t kernel.Range) {
			kernel.Correct(b.x, p, a, t)
			kernel.Update(b.w, q, a, t)
			parts[strip].RR += kernel.SumSquares(b.w, t)
		})
	})
	b.precondition(b.z, b.w)
	b.each(func(strip int, r kernel.Range) {
		var rz [1]float64
		kernel.Dots(rz[:], b.w, [][]float64{b.z}, r)
		parts[strip].RZ = rz[0]
	})
	return addConjugate(parts), nil
}

func addConjugate(parts []ConjugateSums) (sum ConjugateSums) {
	for _, p := range parts {
		sum.RR += p.RR
		sum.RZ += p.RZ
	}
	return sum
}
