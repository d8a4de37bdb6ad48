package remote

import (
	"context"
	"fmt"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
)

// The software cost of a window step: a problem so small that the arithmetic is
// little, with the sketches of a usual cycle.
func BenchmarkStep(b *testing.B) {
	for _, blocks := range []int{1, 2, 4} {
		b.Run(fmt.Sprintf("%d workers", blocks), func(b *testing.B) {
			ctx := context.Background()
			p := spacetest.Definite(16, 16)
			p.Symmetric = false
			s := build(b, p, blocks, "none")
			c := method.Cycle{Seed: 1, SketchRows: 1344, Zeta: 4, Capacity: 300, Window: 4, Form: method.Double}
			step, j := method.Step{Norm: 1, Product: true, Dots: 4}, c.Capacity
			for b.Loop() {
				if j++; j >= c.Capacity {
					if _, err := s.Start(ctx, c); err != nil {
						b.Fatal(err)
					}
					j = 0
				}
				if _, err := s.Advance(ctx, step); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
