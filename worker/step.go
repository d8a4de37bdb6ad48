package worker

import (
	"context"
	"fmt"
	"math"

	"rowstead/sketch"
	"rowstead/worker/basis"
	"rowstead/worker/kernel"
)

// ErrReplay is wrapped by the errors of verbs that need vectors which replay form
// no longer has.
var ErrReplay = refuse("the basis is kept as replay")

// Start recomputes r = b − A·x, empties the basis and sets w ← D·r.
func (b *Block) Start(ctx context.Context, c Cycle) (ResidualSums, error) {
	if err := b.ready(false); err != nil {
		return ResidualSums{}, err
	}
	if err := b.makeRoom(c); err != nil {
		return ResidualSums{}, err
	}
	sums, err := b.residual(ctx, b.x, b.w)
	if err != nil {
		return ResidualSums{}, err
	}
	if c.Form == basis.Replay {
		copy(b.start, b.w)
	}
	b.started, b.tried = true, false
	return sums, nil
}

// makeRoom takes and touches what cycle c needs beyond what is held.
func (b *Block) makeRoom(c Cycle) error {
	if err := c.check(); err != nil {
		return err
	}
	if b.basis == nil || c.Form != b.cycle.Form {
		b.basis = nil
		form, err := basis.New(c.Form)
		if err != nil {
			return refuse("%v", err)
		}
		b.basis = form
	}
	old := b.cycle
	b.cycle = c
	b.basis.Reset(basis.Room{Rows: b.rows, Capacity: c.Capacity, Window: c.Window}, func(task func(kernel.Range)) {
		b.each(func(_ int, r kernel.Range) { task(r) })
	})
	if c.Form == basis.Replay && b.start == nil {
		b.start = make([]float64, b.rows)
	}
	if b.gram == nil || c.Window > old.Window || c.Capacity > old.Capacity {
		b.gram = kernel.NewPartials(len(b.strips), max(c.Window, old.Window))
		b.dots = kernel.NewPartials(len(b.strips), max(c.Capacity, old.Capacity)+1)
	}
	if c.SketchRows == 0 {
		return nil
	}
	b.op, b.hold = sketch.New(c.SketchRows, c.Zeta, c.Seed), sketch.HoldOut(c.Seed)
	if b.sketchParts == nil || c.SketchRows != old.SketchRows {
		b.sketchParts = kernel.NewPartials(len(b.strips), b.sketchRows())
		b.sketchW = make([]float64, b.sketchRows())
	}
	if room := c.Capacity * b.sketchRows(); cap(b.sketches) < room {
		b.sketches = make([]float64, room)
	}
	return nil
}

// check returns an error unless c can be carried out.
func (c Cycle) check() error {
	sketches := c.SketchRows == 0 || (c.SketchRows > 0 && c.SketchRows <= mostSketchRows &&
		c.Zeta >= 1 && c.Zeta <= 64 && c.SketchRows%(sketch.Lanes*c.Zeta) == 0)
	if c.Capacity < 1 || c.Window < 1 || !sketches {
		return refuse("a cycle of %d vectors, window %d, %d sketch rows with %d nonzeros", c.Capacity, c.Window, c.SketchRows, c.Zeta)
	}
	return nil
}

// mostSketchRows is what package sketch allows.
const mostSketchRows = 1 << 24

// sketchRows is the length of a sketch with its hold-out, 0 without sketches.
func (b *Block) sketchRows() int {
	if b.cycle.SketchRows == 0 {
		return 0
	}
	return b.cycle.SketchRows + HoldRows
}

// addSketch adds both sketches of rows t of a vector, given as v, to strip.
func (b *Block) addSketch(strip int, v []float64, t kernel.Range) {
	sums := b.sketchParts.Strip(strip)
	b.op.AddBoth(b.hold, sums[:b.cycle.SketchRows], sums[b.cycle.SketchRows:], v, b.firstRow+t.Lo)
}

// sketchOf is where the sketches of vector j stand.
func (b *Block) sketchOf(j int) []float64 {
	n := b.sketchRows()
	return b.sketches[j*n : (j+1)*n]
}

// Advance carries out a Step in two passes over the rows: one forms b_j with its
// dots and sketches, the other w = C·b_j with its dots.
func (b *Block) Advance(ctx context.Context, s Step) (StepSums, error) {
	if err := b.mayAdvance(s); err != nil {
		return StepSums{}, err
	}
	s.Norm = b.liftFirst(s.Norm)
	j := b.basis.Len()
	b.basis.Begin(b.w, basis.Step{Lo: s.Lo, H: s.H, Norm: s.Norm}, b.cycle.Window)
	b.sums.Gram = cleared(b.sums.Gram, min(b.cycle.Window, j+1))
	b.formNewest()
	b.gram.Total(b.sums.Gram)
	if b.cycle.SketchRows > 0 {
		clear(b.sketchOf(j))
		b.sketchParts.Total(b.sketchOf(j))
	}
	b.sums.Dots, b.sums.WW = nil, 0
	b.sums.SketchW, b.sums.HoldW = nil, nil
	if !s.Product {
		return b.sums, nil
	}
	z, err := b.bringNewest(ctx)
	if err != nil {
		return StepSums{}, err
	}
	b.product(z, min(s.Dots, j+1), s.SketchW && b.cycle.SketchRows > 0)
	return b.sums, nil
}

// cleared returns n zeros in the room of v.
func cleared(v []float64, n int) []float64 {
	if cap(v) < n {
		return make([]float64, n)
	}
	v = v[:n]
	clear(v)
	return v
}

// mayAdvance returns an error unless s can be carried out.
func (b *Block) mayAdvance(s Step) error {
	if err := b.ready(false); err != nil {
		return err
	}
	if !b.started {
		return refuse("no cycle is started")
	}
	if err := b.basis.Check(basis.Step{Lo: s.Lo, H: s.H, Norm: s.Norm}, b.cycle.Window); err != nil {
		return refuse("%v", err)
	}
	if s.Dots < 0 {
		return refuse("%d dots", s.Dots)
	}
	if ring, ok := b.basis.(*basis.Ring); ok && min(s.Dots, ring.Len()+1) > ring.Most() {
		return fmt.Errorf("%w: dots with %d vectors", ErrReplay, s.Dots)
	}
	return nil
}

// liftFirst keeps 1/norm within range when D·r, from which b₀ is made, is
// extremely small or large: w and the norm are both multiplied by a power of two.
func (b *Block) liftFirst(norm float64) float64 {
	e := math.Ilogb(norm)
	if b.basis.Len() > 0 || math.Abs(float64(e)) < 1000 || math.IsInf(norm, 0) {
		return norm
	}
	b.each(func(_ int, r kernel.Range) {
		for i := r.Lo; i < r.Hi; i++ {
			b.w[i] = scaled(b.w[i], -e)
		}
		if b.cycle.Form == basis.Replay {
			copy(b.start[r.Lo:r.Hi], b.w[r.Lo:r.Hi])
		}
	})
	return scaled(norm, -e)
}

// formNewest forms the rows of the newest vector, its Gram and sketch partial
// sums, and its copy in z where the product needs one.
func (b *Block) formNewest() {
	b.gram.Clear()
	if b.cycle.SketchRows > 0 {
		b.sketchParts.Clear()
	}
	toZ := b.needsCopy()
	b.each(func(strip int, r kernel.Range) {
		gram := b.gram.Strip(strip)
		var scratch [kernel.Tile]float64
		tiles(r, func(t kernel.Range) {
			b.basis.Form(gram, t)
			room := scratch[:t.Len()]
			if toZ {
				room = b.z[t.Lo:t.Hi]
			}
			v := b.basis.Newest(room, t)
			if toZ {
				copy(room, v)
			}
			if b.cycle.SketchRows > 0 {
				b.addSketch(strip, v, t)
			}
		})
	})
}

// needsCopy says that the newest vector must stand in z before M⁻¹ and the
// product: it is kept in 32 bits, or M is the identity and z has a halo.
func (b *Block) needsCopy() bool {
	return b.cycle.Form == basis.Single || (b.identity && b.halo != nil)
}

// bringNewest returns z = M⁻¹·b_j with its halo.
func (b *Block) bringNewest(ctx context.Context) ([]float64, error) {
	all := kernel.Range{Lo: 0, Hi: b.rows}
	newest := b.z[:b.rows]
	if !b.needsCopy() {
		newest = b.basis.Newest(nil, all)
	}
	if b.identity && b.halo == nil {
		return newest, ctx.Err()
	}
	if !b.identity {
		b.precondition(b.z, newest)
	}
	return b.z, b.gather(ctx, b.z)
}

// product sets w ← D·A·z and answers with w·w, the dots of w with the last
// vectors and the sketches of w.
func (b *Block) product(z []float64, dots int, sketched bool) {
	b.dots.Clear()
	if sketched {
		b.sketchParts.Clear()
	}
	b.each(func(strip int, r kernel.Range) {
		sums := b.dots.Strip(strip)
		tiles(r, func(t kernel.Range) {
			kernel.Mul(b.w, b.matrix, z, t)
			b.basis.Dots(sums[1:1+dots], b.w, t)
			sums[0] += kernel.SumSquares(b.w, t)
			if sketched {
				b.addSketch(strip, b.w[t.Lo:t.Hi], t)
			}
		})
	})
	b.totals = cleared(b.totals, 1+dots)
	b.dots.Total(b.totals)
	b.sums.WW, b.sums.Dots = b.totals[0], b.totals[1:]
	if sketched {
		clear(b.sketchW)
		b.sketchParts.Total(b.sketchW)
		b.sums.SketchW, b.sums.HoldW = b.sketchW[:b.cycle.SketchRows], b.sketchW[b.cycle.SketchRows:]
	}
}

// Sketches returns the block's part of S·b_i and S'·b_i, i in [from, to).
func (b *Block) Sketches(_ context.Context, from, to int) (SketchSums, error) {
	if !b.started || b.cycle.SketchRows == 0 || from < 0 || to < from || to > b.basis.Len() {
		return SketchSums{}, refuse("no sketches of vectors [%d, %d)", from, to)
	}
	out := &b.sketchOut
	out.Sketch, out.Hold = out.Sketch[:0], out.Hold[:0]
	for j := from; j < to; j++ {
		both := b.sketchOf(j)
		out.Sketch = append(out.Sketch, both[:b.cycle.SketchRows]...)
		out.Hold = append(out.Hold, both[b.cycle.SketchRows:]...)
	}
	return *out, nil
}

// Reduce sets w ← w − Σ h[i]·b_i over the whole basis and returns the new dots.
func (b *Block) Reduce(_ context.Context, h []float64) (DotSums, error) {
	if err := b.ready(false); err != nil {
		return DotSums{}, err
	}
	switch {
	case !b.started || len(h) != b.basis.Len():
		return DotSums{}, refuse("%d coefficients do not fit the basis", len(h))
	case b.cycle.Form == basis.Replay:
		return DotSums{}, fmt.Errorf("%w: no Reduce", ErrReplay)
	}
	b.dots.Clear()
	b.each(func(strip int, r kernel.Range) { b.basis.Reduce(b.dots.Strip(strip), b.w, h, r) })
	b.totals = cleared(b.totals, len(h)+1)
	b.dots.Total(b.totals)
	return DotSums{Dots: b.totals[:len(h)], WW: b.totals[len(h)]}, nil
}
