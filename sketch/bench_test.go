package sketch

import (
	"fmt"
	"math"
	"testing"
	"time"
)

// BenchmarkAdd measures the sketch at s = 2016, zeta 4, alone and with the
// hold-out beside it. best-ns/row is the fastest of the calls, which says most
// on a machine that others use too.
func BenchmarkAdd(b *testing.B) {
	for _, n := range []int{100_000, 1_000_000} {
		w := normals(newRand(1), n)
		o, h := New(2016, 4, 3), HoldOut(3)
		dst, hold := make([]float64, o.Rows()), make([]float64, HoldRows)
		run := func(name string, f func()) {
			b.Run(name, func(b *testing.B) {
				b.ReportAllocs()
				least := math.Inf(1)
				for range b.N {
					start := time.Now()
					f()
					least = min(least, float64(time.Since(start).Nanoseconds()))
				}
				b.ReportMetric(least/float64(n), "best-ns/row")
			})
		}
		run(fmt.Sprintf("n=%d", n), func() { o.Add(dst, w, 0) })
		run(fmt.Sprintf("n=%d/both", n), func() { o.AddBoth(h, dst, hold, w, 0) })
	}
}
