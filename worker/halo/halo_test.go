package halo

import (
	"context"
	"errors"
	"math"
	"runtime"
	"sync"
	"testing"

	"go.uber.org/goleak"
	"pgregory.net/rapid"

	"rowstead/partition"
	"rowstead/partition/csr"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// cutMatrix is a matrix cut into blocks, each with its halo.
type cutMatrix struct {
	cuts  partition.RowCuts
	plan  *partition.HaloPlan
	local []partition.LocalRows
	halo  []*Halo
}

func newCutMatrix(m *csr.Matrix, blocks int, wrap func([]Exchange) []Exchange) (*cutMatrix, error) {
	cuts, err := partition.CutByEntries(m.Start, blocks)
	if err != nil {
		return nil, err
	}
	needs := make([][]int32, cuts.Blocks())
	for p := range needs {
		lo, hi := cuts.Range(p)
		needs[p] = partition.Needs(lo, m.Start[lo:hi+1], m.Col)
	}
	c := &cutMatrix{cuts: cuts, plan: partition.PlanHalo(cuts, needs)}
	exchanges := NewLocal(cuts.Blocks())
	if wrap != nil {
		exchanges = wrap(exchanges)
	}
	for p := range needs {
		lo, hi := cuts.Range(p)
		c.local = append(c.local, partition.Localize(lo, needs[p], m.Start[lo:hi+1], m.Col, m.Val))
		c.halo = append(c.halo, New(&c.plan.Blocks[p], exchanges[p]))
	}
	return c, nil
}

// each runs do for all blocks at once and joins their errors.
func (c *cutMatrix) each(do func(p int) error) error {
	errs := make([]error, len(c.local))
	var wait sync.WaitGroup
	for p := range c.local {
		wait.Go(func() { errs[p] = do(p) })
	}
	wait.Wait()
	return errors.Join(errs...)
}

// mul forms y = A·x, block by block.
func (c *cutMatrix) mul(ctx context.Context, y, x []float64) error {
	return c.each(func(p int) error {
		lo, hi := c.cuts.Range(p)
		a := &c.local[p]
		local := make([]float64, a.Rows+a.Halo)
		copy(local, x[lo:hi])
		if err := c.halo[p].Gather(ctx, local[:a.Rows], local[a.Rows:]); err != nil {
			return err
		}
		for i := range a.Rows {
			sum := 0.0
			for k := a.Start[i]; k < a.Start[i+1]; k++ {
				sum += float64(a.Val[k] * local[a.Col[k]])
			}
			y[lo+i] = sum
		}
		return nil
	})
}

// mulT forms y = Aᵀ·x, block by block.
func (c *cutMatrix) mulT(ctx context.Context, y, x []float64) error {
	return c.each(func(p int) error {
		lo, hi := c.cuts.Range(p)
		a := &c.local[p]
		local := make([]float64, a.Rows+a.Halo)
		for i := range a.Rows {
			for k := a.Start[i]; k < a.Start[i+1]; k++ {
				local[a.Col[k]] += float64(a.Val[k] * x[lo+i])
			}
		}
		if err := c.halo[p].Scatter(ctx, local[a.Rows:], local[:a.Rows]); err != nil {
			return err
		}
		copy(y[lo:hi], local[:a.Rows])
		return nil
	})
}

func drawMatrix(t *rapid.T, integers bool) *csr.Matrix {
	rows := rapid.IntRange(1, 150).Draw(t, "rows")
	var entries csr.Triplets
	for range rapid.IntRange(0, 6*rows).Draw(t, "entries") {
		v := float64(rapid.IntRange(-99, 99).Draw(t, "integer"))
		if !integers {
			v = rapid.Float64Range(-1e3, 1e3).Draw(t, "value")
		}
		entries.Add(rapid.IntRange(0, rows-1).Draw(t, "row"), rapid.IntRange(0, rows-1).Draw(t, "column"), v)
	}
	return entries.Matrix(rows, rows)
}

func sameBits(a, b []float64) bool {
	for i := range a {
		if math.Float64bits(a[i]) != math.Float64bits(b[i]) {
			return false
		}
	}
	return len(a) == len(b)
}

// mulInOrder is csr.Matrix.Mul with every product rounded on its own, as the
// blocks round it, on processors that would fuse it too.
func mulInOrder(m *csr.Matrix, y, x []float64) {
	for i := range m.Rows {
		cols, vals := m.Row(i)
		sum := 0.0
		for k, c := range cols {
			sum += float64(vals[k] * x[c])
		}
		y[i] = sum
	}
}

// A·x over any number of blocks has the bits of A·x with the whole matrix.
func TestProductHasTheSameBitsWhateverTheCuts(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := drawMatrix(t, false)
		x := rapid.SliceOfN(rapid.Float64Range(-1e3, 1e3), m.Rows, m.Rows).Draw(t, "x")
		want, got := make([]float64, m.Rows), make([]float64, m.Rows)
		mulInOrder(m, want, x)
		if runtime.GOARCH == "amd64" { // where nothing is fused
			m.Mul(got, x)
			if !sameBits(got, want) {
				t.Fatalf("csr product %v, want %v", got, want)
			}
		}
		for _, blocks := range []int{1, 2, 4, 8} {
			c, err := newCutMatrix(m, blocks, nil)
			if err != nil {
				t.Fatal(err)
			}
			for range 3 { // both buffers and one again
				clear(got)
				if err := c.mul(t.Context(), got, x); err != nil {
					t.Fatal(err)
				}
				if !sameBits(got, want) {
					t.Fatalf("%d blocks: A·x = %v, want %v", blocks, got, want)
				}
			}
		}
	})
}

// With whole numbers, whose sums are exact in any order, Aᵀ·x is csr's to the
// last bit; with others it is the same each time.
func TestTransposeProduct(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := drawMatrix(t, true)
		whole := rapid.SliceOfN(rapid.IntRange(-99, 99), m.Rows, m.Rows).Draw(t, "x")
		x := make([]float64, m.Rows)
		for i, v := range whole {
			x[i] = float64(v)
		}
		want, got, again := make([]float64, m.Rows), make([]float64, m.Rows), make([]float64, m.Rows)
		m.MulT(want, x)
		for _, blocks := range []int{1, 2, 4, 8} {
			c, err := newCutMatrix(m, blocks, nil)
			if err != nil {
				t.Fatal(err)
			}
			if err := c.mulT(t.Context(), got, x); err != nil {
				t.Fatal(err)
			}
			for i := range want {
				if got[i] != want[i] {
					t.Fatalf("%d blocks: Aᵀ·x = %v, want %v", blocks, got, want)
				}
			}
			odd := rapid.SliceOfN(rapid.Float64Range(-1, 1), m.Rows, m.Rows).Draw(t, "odd")
			if err := errors.Join(c.mulT(t.Context(), got, odd), c.mulT(t.Context(), again, odd)); err != nil {
				t.Fatal(err)
			}
			if !sameBits(got, again) {
				t.Fatalf("%d blocks: Aᵀ·x = %v, then %v", blocks, got, again)
			}
		}
	})
}

// Rounds of both directions in any order, with blocks that run ahead of each
// other, never mix: every round brings the values of its own number.
func TestRoundsNeverMix(t *testing.T) {
	const rows, blocks, rounds = 64, 4, 500
	var entries csr.Triplets
	for i := range rows {
		for _, j := range []int{i, (i + 9) % rows, (i * 7) % rows} {
			entries.Add(i, j, 1)
		}
	}
	c, err := newCutMatrix(entries.Matrix(rows, rows), blocks, nil)
	if err != nil {
		t.Fatal(err)
	}
	err = c.each(func(p int) error {
		b := &c.plan.Blocks[p]
		own, halo := make([]float64, b.Rows), make([]float64, len(b.Columns))
		for round := range rounds {
			if (round+p)%3 == 0 {
				runtime.Gosched()
			}
			if round%5 == 4 {
				fill(halo, float64(round))
				clear(own)
				if err := c.halo[p].Scatter(t.Context(), halo, own); err != nil {
					return err
				}
				for _, v := range own {
					if v != 0 && math.Mod(v, float64(round)) != 0 {
						return errors.New("contributions of another round")
					}
				}
				continue
			}
			fill(own, float64(round))
			if err := c.halo[p].Gather(t.Context(), own, halo); err != nil {
				return err
			}
			fill(own, -1) // the caller may write at once
			for _, v := range halo {
				if v != float64(round) {
					return errors.New("a halo of another round")
				}
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
}

func fill(x []float64, v float64) {
	for i := range x {
		x[i] = v
	}
}

// One goroutine can serve all blocks: the Post halves never wait in it.
func TestOneGoroutineServesAllBlocks(t *testing.T) {
	var entries csr.Triplets
	for i := range 40 {
		entries.Add(i, 39-i, 1)
	}
	c, err := newCutMatrix(entries.Matrix(40, 40), 5, nil)
	if err != nil {
		t.Fatal(err)
	}
	for round := range 3 {
		for p, h := range c.halo {
			own := make([]float64, c.local[p].Rows)
			fill(own, float64(10*round+p))
			if err := h.PostOwn(t.Context(), own); err != nil {
				t.Fatal(err)
			}
		}
		for p, h := range c.halo {
			halo := make([]float64, c.local[p].Halo)
			if err := h.CollectHalo(t.Context(), halo); err != nil {
				t.Fatal(err)
			}
			for _, v := range halo {
				if want := float64(10*round + 4 - p); v != want {
					t.Fatalf("round %d, block %d: halo %v, want %v", round, p, halo, want)
				}
			}
		}
	}
}

func BenchmarkGather(b *testing.B) {
	const rows, wide = 1 << 16, 4096 // 32 KiB from each neighbour
	cuts, err := partition.EvenCuts(2*rows, 2)
	if err != nil {
		b.Fatal(err)
	}
	needs := [][]int32{make([]int32, wide), make([]int32, wide)}
	for k := range wide {
		needs[0][k], needs[1][k] = int32(rows+k), int32(rows-wide+k)
	}
	plan := partition.PlanHalo(cuts, needs)
	exchanges := NewLocal(2)
	b.SetBytes(2 * 8 * wide)
	var wait sync.WaitGroup
	for p := range 2 {
		h := New(&plan.Blocks[p], exchanges[p])
		own, halo := make([]float64, rows), make([]float64, wide)
		wait.Go(func() {
			for range b.N {
				if err := h.Gather(b.Context(), own, halo); err != nil {
					b.Error(err)
					return
				}
			}
		})
	}
	wait.Wait()
}
