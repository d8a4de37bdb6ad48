package precond

import (
	"fmt"
	"math"
	"slices"
	"testing"
	"time"

	"rowstead/partition/csr"
)

// product forms rows [lo, hi) of y = A·x with bounds checked on x alone: the
// unit of a solve.
func product(a *csr.Matrix, y, x []float64, lo, hi int) {
	k, ends := a.Start[lo], a.Start[lo+1:hi+1]
	y = y[lo:hi]
	for i, e := range ends {
		cc, vv := a.Col[k:e], a.Val[k:e]
		vv = vv[:len(cc)]
		sum := 0.0
		for j, c := range cc {
			sum += float64(vv[j] * x[c])
		}
		y[i], k = sum, e
	}
}

// BenchmarkSolve gives the time of one application in units of one product, the
// two taken in turn.
func BenchmarkSolve(b *testing.B) {
	a := grid7(67)
	for _, kind := range []string{ILU0, ILUT} {
		for _, single := range []bool{false, true} {
			for _, width := range []int{1, 2, 4, 8} {
				b.Run(fmt.Sprintf("%s/single=%v/interleaved=%d", kind, single, width), func(b *testing.B) {
					p, report := build(b, kind, a, Options{SubBlocks: 8, Interleave: width, SingleFactors: single})
					benchInProducts(b, a, p)
					b.ReportMetric(report.Fill, "fill")
				})
			}
		}
	}
}

// benchInProducts times p.Apply part by part against the product, the two in
// turn, and reports the ratio of the sums of the shortest times: other programs
// only ever add to a time, and short stretches are sometimes left alone.
func benchInProducts(b *testing.B, a *csr.Matrix, p Preconditioner) {
	r, z := vector(a.Rows, 1), make([]float64, a.Rows)
	b.SetBytes(p.Bytes())
	solve, unit := newStopwatch(p.Parts()), newStopwatch(8)
	for b.Loop() {
		for part := range p.Parts() {
			solve.time(part, func() { p.ApplyPart(z, r, part) })
		}
		for part := range 8 {
			lo, hi := a.Rows*part/8, a.Rows*(part+1)/8
			unit.time(part, func() { product(a, z, r, lo, hi) })
		}
	}
	b.ReportMetric(solve.sum()/unit.sum(), "products")
}

// stopwatch keeps the shortest of several times of each piece of a job.
type stopwatch []time.Duration

func newStopwatch(pieces int) stopwatch {
	return slices.Repeat(stopwatch{math.MaxInt64}, pieces)
}

func (s stopwatch) time(piece int, do func()) {
	start := time.Now()
	do()
	s[piece] = min(s[piece], time.Since(start))
}

// sum is the time of the whole job in seconds.
func (s stopwatch) sum() float64 {
	total := 0.0
	for _, d := range s {
		total += d.Seconds()
	}
	return total
}

// BenchmarkSetUp times the factorisations.
func BenchmarkSetUp(b *testing.B) {
	a := grid7(67)
	for _, c := range []struct {
		name, kind string
		o          Options
	}{
		{"ilu0", ILU0, Options{}},
		{"ilut", ILUT, Options{}},
		{"ilut/one block", ILUT, Options{SubBlocks: 1}},
		{"ilut/3 entries", ILUT, Options{Drop: 1e-2, Fill: 3}},
	} {
		b.Run(c.name, func(b *testing.B) {
			b.SetBytes(int64(a.Entries()) * 12)
			for b.Loop() {
				build(b, c.kind, a, c.o)
			}
		})
	}
}
