package worker

import (
	"context"
	"fmt"
	"math"
	"testing"

	"rowstead/partition/csr"
	"rowstead/partition/samples/problems"
	"rowstead/worker/basis"
	"rowstead/worker/kernel"
	"rowstead/worker/precond"
)

// sketchNanoseconds is what the sketch of a row may cost in the bound of a step.
const sketchNanoseconds = 1.2

// singleBlock is all of A in one block on one thread, b random, no preconditioner.
func singleBlock(b testing.TB, a *csr.Matrix) *Block {
	b.Helper()
	block := New(Config{Matrix: a, Right: problems.NormalVector(a.Rows, 5), Threads: 1})
	b.Cleanup(block.Close)
	if _, err := block.Prepare(context.Background(), Preparation{Precondition: precond.None}); err != nil {
		b.Fatal(err)
	}
	return block
}

// triad measures a[i] = b[i] + c·d[i] on one thread over three arrays of that many
// bytes in all, and returns the seconds a byte, each array counted once: the best
// of several passes.
func triad(bytes int) float64 {
	n := max(bytes/24, 1)
	a, b, d := make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range n {
		a[i], b[i], d[i] = 1, 2, 3
	}
	shortest := math.Inf(1)
	for range 20 {
		begin := cpuSeconds()
		for i, v := range b {
			a[i] = v + 3*d[i]
		}
		shortest = min(shortest, cpuSeconds()-begin)
	}
	return shortest / float64(24*n)
}

// best keeps the shortest processor time of a task, which on a busy
// machine says more than the mean, and is what triad takes too.
type best struct{ seconds float64 }

func (t *best) time(task func()) {
	begin := cpuSeconds()
	task()
	if s := cpuSeconds() - begin; t.seconds == 0 || s < t.seconds {
		t.seconds = s
	}
}

func ratioProblems() []struct {
	name string
	make func() *csr.Matrix
} {
	return []struct {
		name string
		make func() *csr.Matrix
	}{
		{"5-point,n=1e5", func() *csr.Matrix { return problems.Poisson2D(317) }},
		{"7-point,n=1e6", func() *csr.Matrix {
			return problems.ConvectionDiffusion3D(100, [3]float64{40, 20, 10}, problems.Central)
		}},
	}
}

// productBytes is what one product moves: matrix, x and y once each.
func productBytes(a *csr.Matrix) int {
	return 12*a.Entries() + 8*(a.Rows+1) + 16*a.Rows
}

// BenchmarkWindowStep is a whole step with window 4 and a sketch of 2144 rows. The
// metric of-bound is the time that product, window and new vector take when each
// moves once at the bandwidth of a triad of the same size, and 1.2 ns a row for the
// sketch, over the time taken.
func BenchmarkWindowStep(b *testing.B) {
	for _, p := range ratioProblems() {
		b.Run(p.name, func(b *testing.B) {
			const window, capacity = 4, 30
			a := p.make()
			n := a.Rows
			bytes := productBytes(a) + 8*n*window + 8*n
			block := singleBlock(b, a)
			c := Cycle{Seed: 3, SketchRows: 2144, Zeta: 4, Capacity: capacity, Window: window, Form: basis.Double}
			steps := newWindowSteps(b, block, c)
			b.SetBytes(int64(bytes))
			var shortest best
			for b.Loop() {
				if block.basis.Len() == capacity {
					b.StopTimer()
					steps.start()
					b.StartTimer()
				}
				shortest.time(steps.take)
			}
			b.StopTimer()
			bound := float64(bytes)*triad(bytes) + sketchNanoseconds*1e-9*float64(n)
			b.ReportMetric(bound/shortest.seconds, "of-bound")
			b.ReportMetric(shortest.seconds/float64(n)*1e9, "ns/row")
		})
	}
}

// windowSteps takes steps with the coefficients that follow from the answers.
type windowSteps struct {
	b     testing.TB
	block *Block
	cycle Cycle
	step  Step
}

func newWindowSteps(b testing.TB, block *Block, c Cycle) *windowSteps {
	s := &windowSteps{b: b, block: block, cycle: c}
	s.start()
	s.take() // pages and buffers are touched
	return s
}

func (s *windowSteps) start() {
	r, err := s.block.Start(context.Background(), s.cycle)
	if err != nil {
		s.b.Fatal(err)
	}
	s.step = Step{Norm: math.Sqrt(r.Inner[1]), Product: true, Dots: s.cycle.Window}
}

func (s *windowSteps) take() {
	out, err := s.block.Advance(context.Background(), s.step)
	if err != nil {
		s.b.Fatal(err)
	}
	rest := out.WW
	for _, d := range out.Dots {
		rest -= d * d
	}
	s.step.H = append(s.step.H[:0], out.Dots...)
	s.step.Lo = s.block.basis.Len() - len(out.Dots)
	s.step.Norm = math.Sqrt(math.Max(rest, 1e-6*out.WW))
}

// BenchmarkOrthogonalStep is a step of the orthogonal method near the end of a
// cycle: w is reduced by the whole basis, Reduce, and once more as the next vector
// is formed. of-bound counts the basis three times at the bandwidth of a triad,
// and one product.
func BenchmarkOrthogonalStep(b *testing.B) {
	for _, k := range []int{100, 500} {
		b.Run(fmt.Sprintf("5-point,n=1e5,k=%d", k), func(b *testing.B) {
			a := problems.Poisson2D(317)
			n := a.Rows
			block := singleBlock(b, a)
			ctx := context.Background()
			c := Cycle{Capacity: k + 3, Window: 1, Form: basis.Double}
			s := newWindowSteps(b, block, c)
			for block.basis.Len() < k {
				s.take()
			}
			bytes := 3*8*n*k + productBytes(a)
			small := make([]float64, k+3)
			for i := range small {
				small[i] = 1e-9
			}
			b.SetBytes(int64(bytes))
			var shortest best
			for b.Loop() {
				shortest.time(func() {
					if _, err := block.Reduce(ctx, small[:k]); err != nil {
						b.Fatal(err)
					}
					if _, err := block.Advance(ctx, Step{H: small[:k], Norm: 1, Product: true, Dots: k + 1}); err != nil {
						b.Fatal(err)
					}
				})
				block.basis.(interface{ Truncate(int) }).Truncate(k)
			}
			b.StopTimer()
			bound := float64(bytes) * triad(1<<29)
			b.ReportMetric(bound/shortest.seconds, "of-bound")
		})
	}
}

// BenchmarkParts times the passes of a step one by one, in nanoseconds a row.
func BenchmarkParts(b *testing.B) {
	for _, p := range ratioProblems() {
		a := p.make()
		block := singleBlock(b, a)
		s := newWindowSteps(b, block, Cycle{Seed: 3, SketchRows: 2144, Zeta: 4, Capacity: 10, Window: 4, Form: basis.Double})
		for block.basis.Len() < 8 {
			s.take()
		}
		z := block.basis.Newest(nil, kernel.Range{Lo: 0, Hi: a.Rows})
		each := func(name string, task func()) {
			b.Run(p.name+","+name, func(b *testing.B) {
				var shortest best
				for b.Loop() {
					shortest.time(task)
				}
				b.ReportMetric(shortest.seconds/float64(a.Rows)*1e9, "ns/row")
			})
		}
		each("form and sketch", block.formNewest)
		each("product and dots", func() { block.product(z, 4, false) })
		each("product", func() { block.each(func(_ int, r kernel.Range) { kernel.Mul(block.w, block.matrix, z, r) }) })
		each("sketch", func() {
			block.sketchParts.Clear()
			block.each(func(strip int, r kernel.Range) {
				tiles(r, func(t kernel.Range) { block.addSketch(strip, z[t.Lo:t.Hi], t) })
			})
		})
		each("residuals", func() {
			if _, err := block.Check(context.Background()); err != nil {
				b.Fatal(err)
			}
		})
	}
}
