package remote

import (
	"context"
	"math"
	"testing"

	"rowstead/coordinator/method"
	"rowstead/coordinator/method/spacetest"
)

// What a step moves between the coordinator and one worker is 8·(2·window + 1)
// and 8·(s + 64) up and 8·(window + 1) down for a window step; twice 8·(s + 64) up
// and 8·(k + 2) down for a full step of k vectors: to 2 % with all headers, which
// are at most 256 bytes a frame, whatever the number of rows.
func TestBytesAStep(t *testing.T) {
	const window, rows, steps, blocks = 4, 1344, 30, 2
	for name, full := range map[string]bool{"window": false, "full": true} {
		for _, side := range []int{40, 160} {
			ctx := context.Background()
			p := spacetest.Definite(side, side)
			p.Symmetric = false
			s := build(t, p, blocks, "none")
			r, err := s.Start(ctx, method.Cycle{Seed: 1, SketchRows: rows, Zeta: 4, Capacity: steps + 10, Window: window, Form: method.Double})
			if err != nil {
				t.Fatal(err)
			}
			step := method.Step{Norm: r.Inner, Product: true, Dots: window, SketchW: full}
			for j := range window { // until the window is full
				if _, err := s.Advance(ctx, step); err != nil {
					t.Fatal(err)
				}
				step.H = make([]float64, j+1)
			}
			if _, _, err := s.Sketches(ctx, 0, window); err != nil {
				t.Fatal(err)
			}
			before, want := s.StepBytes(), 0
			for j := range steps {
				k := window + j
				step.H, step.Lo = make([]float64, window), k-window
				want += 8*(2*window+1) + 8*(rows+64) + 8*(window+1)
				if full {
					step.H, step.Lo = make([]float64, k), 0
					want += 8*(rows+64) - 8*(2*window+1) - 8*(window+1) + 8*(k+2)
				}
				if _, err := s.Advance(ctx, step); err != nil {
					t.Fatal(err)
				}
			}
			if _, _, err := s.Sketches(ctx, window, window+steps); err != nil {
				t.Fatal(err)
			}
			got, frames := float64(s.StepBytes()-before)/blocks, 3*steps
			t.Logf("%s steps on %d rows: %.0f bytes a step and worker, the table says %d", name, side*side, got/steps, want/steps)
			if math.Abs(got-float64(want)) > 0.02*float64(want) || got-float64(want) > float64(256*frames) {
				t.Errorf("%s steps on %d rows: %v bytes, want %d", name, side*side, got, want)
			}
		}
	}
}

// Sketches that have been collected are sent again when they are asked for again.
func TestSketchesAskedForAgain(t *testing.T) {
	ctx := context.Background()
	p := spacetest.Definite(20, 20)
	p.Symmetric = false
	s := build(t, p, 2, "none")
	r, err := s.Start(ctx, method.Cycle{Seed: 1, SketchRows: 64, Zeta: 4, Capacity: 5, Window: 2, Form: method.Double})
	if err != nil {
		t.Fatal(err)
	}
	for range 2 {
		if _, err := s.Advance(ctx, method.Step{Norm: r.Inner, Product: true}); err != nil {
			t.Fatal(err)
		}
	}
	first, hold, err := s.Sketches(ctx, 0, 2)
	if err != nil {
		t.Fatal(err)
	}
	first, hold = append([]float64(nil), first...), append([]float64(nil), hold...)
	again, holdAgain, err := s.Sketches(ctx, 0, 2)
	if err != nil || len(again) != 128 || len(holdAgain) != 128 {
		t.Fatalf("again: %d and %d numbers, %v", len(again), len(holdAgain), err)
	}
	for i := range first {
		if first[i] != again[i] || hold[i] != holdAgain[i] {
			t.Fatalf("sketches differ at %d", i)
		}
	}
	if _, _, err := s.Sketches(ctx, 1, 3); err == nil {
		t.Error("a sketch of a vector that is not there: no error")
	}
}
