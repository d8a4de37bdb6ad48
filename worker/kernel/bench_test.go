package kernel

import (
	"fmt"
	"math"
	"testing"
	"time"

	"rowstead/partition/csr"
)

// The benchmarks set a routine against a triad a = b + s·c over as many bytes,
// the two taking turns in one run: of-triad is the fraction of the triad's
// bandwidth that the routine reaches. Bytes are those that must move: every
// array once, nothing for the lines a store fetches. Rows are walked in pieces of
// about a megabyte, and the time of a whole walk is the sum over pieces of the
// least time each ever took, so that a busy machine disturbs little.

// walk keeps the least seconds of every piece of rows.
type walk struct {
	rows, piece int
	least       []float64
	f           func(r Range)
}

func newWalk(rows, bytesPerRow int, f func(r Range)) *walk {
	w := &walk{rows: rows, piece: max(1<<20/bytesPerRow/Tile, 1) * Tile, f: f}
	w.least = make([]float64, (rows+w.piece-1)/w.piece)
	for i := range w.least {
		w.least[i] = math.Inf(1)
	}
	return w
}

func (w *walk) once() {
	for i := range w.least {
		r := Range{i * w.piece, min((i+1)*w.piece, w.rows)}
		start := time.Now()
		w.f(r)
		w.least[i] = min(w.least[i], time.Since(start).Seconds())
	}
}

func (w *walk) seconds() (total float64) {
	for _, s := range w.least {
		total += s
	}
	return total
}

// against reports what f, which moves so many bytes a row, reaches of the triad.
func against(b *testing.B, rows, bytesPerRow int, f func(r Range)) {
	n := rows * bytesPerRow / 24
	x, y, z := vector(newRand(1), n), vector(newRand(2), n), vector(newRand(3), n)
	limit := newWalk(n, 24, func(r Range) { triad(x[r.Lo:r.Hi], y[r.Lo:r.Hi], z[r.Lo:r.Hi], 0.5) })
	own := newWalk(rows, bytesPerRow, f)
	b.ReportAllocs()
	b.ResetTimer()
	for range max(b.N, 20) {
		b.StopTimer()
		limit.once()
		b.StartTimer()
		own.once()
	}
	rate := float64(rows*bytesPerRow) / own.seconds()
	b.ReportMetric(rate/1e9, "GB/s")
	b.ReportMetric(rate/(float64(24*n)/limit.seconds()), "of-triad")
}

func triad(a, b, c []float64, s float64) {
	b, c = b[:len(a)], c[:len(a)]
	for i := range a {
		a[i] = b[i] + s*c[i]
	}
}

// grid is the Laplacian on an nx×ny×nz grid: 5-point for nz = 1, else 7-point.
func grid(nx, ny, nz int) *csr.Matrix {
	n := nx * ny * nz
	a := &csr.Matrix{Rows: n, Cols: n, Start: make([]int, 1, n+1)}
	add := func(j int, v float64) { a.Col, a.Val = append(a.Col, int32(j)), append(a.Val, v) }
	for i := range n {
		x, y, z := i%nx, i/nx%ny, i/(nx*ny)
		neighbour := func(inside bool, j int) {
			if inside {
				add(j, -1)
			}
		}
		neighbour(z > 0, i-nx*ny)
		neighbour(y > 0, i-nx)
		neighbour(x > 0, i-1)
		add(i, 6)
		neighbour(x < nx-1, i+1)
		neighbour(y < ny-1, i+nx)
		neighbour(z < nz-1, i+nx*ny)
		a.Start = append(a.Start, len(a.Col))
	}
	return a
}

func BenchmarkMul(b *testing.B) {
	for _, c := range []struct {
		name string
		a    *csr.Matrix
	}{{"5-point,n=1e5", grid(316, 316, 1)}, {"7-point,n=1e6", grid(100, 100, 100)}} {
		b.Run(c.name, func(b *testing.B) {
			x, y := vector(newRand(1), c.a.Cols), make([]float64, c.a.Rows)
			bytes := 12*c.a.Entries() + 24*c.a.Rows
			against(b, c.a.Rows, bytes/c.a.Rows, func(r Range) { Mul(y, c.a, x, r) })
		})
	}
}

// BenchmarkWindow is the step's own vector work at window 4: the new vector with
// its Gram row, then the dots of the product. Bytes: w, four columns, b.
func BenchmarkWindow(b *testing.B) {
	for _, n := range []int{100_000, 1_000_000} {
		b.Run(fmt.Sprintf("form,n=%d", n), func(b *testing.B) { benchForm[float64](b, n, 8) })
		b.Run(fmt.Sprintf("form/single,n=%d", n), func(b *testing.B) { benchForm[float32](b, n, 4) })
		b.Run(fmt.Sprintf("dots,n=%d", n), func(b *testing.B) {
			w, cols, out := vector(newRand(1), n), columns[float64](newRand(2), n, 4), make([]float64, 4)
			against(b, n, 40, func(r Range) { Dots(out, w, cols, r) })
		})
	}
}

func benchForm[F Element](b *testing.B, n, size int) {
	cols := columns[F](newRand(2), n, 5)
	next := Next[F]{W: vector(newRand(1), n), Cols: cols[:4], H: []float64{.1, .2, .3, .4}, Norm: 2, B: cols[4], Window: cols[1:4]}
	gram := make([]float64, 4)
	against(b, n, 8+5*size, func(r Range) { next.Form(gram, r) })
}

// BenchmarkOrthogonal is one step of classical Gram-Schmidt done twice against
// 500 vectors: dots, reduce, form. Its bound reads the basis three times.
func BenchmarkOrthogonal(b *testing.B) {
	const n, k = 100_000, 500
	basis, row := make([]float64, n*k), vector(newRand(1), n)
	cols, h := make([][]float64, k), make([]float64, k+1)
	for j := range cols {
		cols[j] = basis[j*n : (j+1)*n]
		copy(cols[j], row)
	}
	w, zero := clone(row), make([]float64, k)
	form := Next[float64]{W: w, Cols: cols, H: zero, Norm: 2, B: make([]float64, n)}
	dots := func(r Range) { Dots(h, w, cols, r) }
	reduce := func(r Range) { Reduce(h, w, cols, zero, r) }
	next := func(r Range) { form.Form(h[k:], r) }
	b.Run("dots", func(b *testing.B) { against(b, n, 8*k+8, dots) })
	b.Run("reduce", func(b *testing.B) { against(b, n, 8*k+16, reduce) })
	b.Run("form", func(b *testing.B) { against(b, n, 8*k+16, next) })
	b.Run("correct", func(b *testing.B) { against(b, n, 8*k+16, func(r Range) { Correct(w, cols, zero, r) }) })
}

// BenchmarkCombine forms 16 combinations of 300 vectors.
func BenchmarkCombine(b *testing.B) {
	const n, k, d = 20_880, 300, 16
	cols, dst, t := columns[float64](newRand(1), n, k), columns[float64](newRand(2), n, d), vector(newRand(3), k*d)
	own := newWalk(n, 8*(k+2*d), func(r Range) { Combine(dst, cols, t, k, r) })
	b.ReportAllocs()
	b.ResetTimer()
	for range max(b.N, 20) {
		own.once()
	}
	b.ReportMetric(2*n*k*d/own.seconds()/1e9, "GFlop/s")
}
