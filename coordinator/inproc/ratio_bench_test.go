package inproc_test

import (
	"context"
	"fmt"
	"testing"
	"time"

	"rowstead/coordinator/inproc"
	"rowstead/coordinator/method"
	"rowstead/partition"
	"rowstead/partition/samples/problems"
)

// BenchmarkSketchedAgainstOrthogonal times one whole cycle of each method in one
// run: steps, small problem and correction, five-point Poisson of 10⁵ unknowns,
// no preconditioner, one thread. ratio is the time of an orthogonal step over
// that of a sketched one, excess the sketched residual over the orthogonal one.
func BenchmarkSketchedAgainstOrthogonal(b *testing.B) {
	for _, steps := range []int{500, 1000} {
		b.Run(fmt.Sprintf("cycle=%d", steps), func(b *testing.B) {
			var sketched, orthogonal time.Duration
			var left [2]float64
			for range b.N {
				var d time.Duration
				d, left[0] = oneCycle(b, method.Sketched, steps)
				sketched += d
				d, left[1] = oneCycle(b, method.Orthogonal, steps)
				orthogonal += d
			}
			b.ReportMetric(float64(sketched.Microseconds())/float64(b.N*steps), "µs/sketched-step")
			b.ReportMetric(float64(orthogonal.Microseconds())/float64(b.N*steps), "µs/orthogonal-step")
			b.ReportMetric(float64(orthogonal)/float64(sketched), "ratio")
			b.ReportMetric(left[0]/left[1], "excess")
		})
	}
}

// oneCycle runs one cycle of so many steps and returns what it took and the
// true residual it left.
func oneCycle(b *testing.B, name string, steps int) (time.Duration, float64) {
	a := problems.Poisson2D(316)
	cuts, err := partition.CutByEntries(a.Start, 1)
	if err != nil {
		b.Fatal(err)
	}
	sp, err := inproc.New(inproc.Problem{Matrix: a, Cuts: cuts, Right: problems.NormalVector(a.Rows, 5), Threads: 1})
	if err != nil {
		b.Fatal(err)
	}
	defer sp.Close()
	// The room of the basis is touched beforehand: its page faults are no part of
	// a step.
	if _, err := sp.Start(context.Background(), method.Cycle{Capacity: steps + 1, Window: 4, Form: method.Double, SketchRows: 32 * ((4*(steps+4) + 31) / 32), Zeta: 4}); err != nil {
		b.Fatal(err)
	}
	start := time.Now()
	res, err := method.Solve(context.Background(), sp, method.Options{Method: name, Cycle: steps, Recycle: -1, Tolerance: 1e-15, MaxProducts: steps + 2})
	if err != nil || res.Steps != steps {
		b.Fatalf("%s: %d steps, %v", name, res.Steps, err)
	}
	return time.Since(start), res.Residuals.TrueResidual()
}
