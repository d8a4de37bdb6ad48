package small

import (
	"fmt"
	"testing"

	"pgregory.net/rapid"
)

// gramPlain and updatePlain are the sums as their formulas stand.
func gramPlain(w *square, v, c []float64) {
	for i := 0; i < len(v); i += lanes {
		for j := range lanes {
			for k := range lanes {
				w[j*lanes+k] += float64(v[i+j] * c[i+k])
			}
		}
	}
}

func updatePlain(c, v []float64, w *square) {
	for i := 0; i < len(v); i += lanes {
		for k := range lanes {
			for j := range lanes {
				c[i+k] -= float64(v[i+j] * w[j*lanes+k])
			}
		}
	}
}

type kernels struct {
	name   string
	gram   func(w *square, v, c []float64)
	update func(c, v []float64, w *square)
}

// Every kernel gives the bits of the formula, whatever the number of rows.
func TestKernelsHaveTheBitsOfTheirTwins(t *testing.T) {
	all := append(nativeKernels(), kernels{"go", gramGo, updateGo}, kernels{"chosen", gram, update})
	for _, kernel := range all {
		t.Run(kernel.name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) { checkTwins(t, kernel) })
		})
	}
}

func checkTwins(t *rapid.T, kernel kernels) {
	rows := rapid.IntRange(0, 70).Draw(t, "rows")
	seed := rapid.Uint64().Draw(t, "seed")
	v, c := tall(seed, rows, lanes), tall(seed+1, rows, lanes)
	w := square(tall(seed+2, lanes, lanes))
	want, got := w, w
	gramPlain(&want, v, c)
	kernel.gram(&got, v, c)
	if !sameBits(got[:], want[:]) {
		t.Fatalf("gram of %d rows differs from its formula", rows)
	}
	wantC, gotC := append([]float64(nil), c...), append([]float64(nil), c...)
	updatePlain(wantC, v, &w)
	kernel.update(gotC, v, &w)
	if !sameBits(gotC, wantC) {
		t.Fatalf("update of %d rows differs from its formula", rows)
	}
	if rows == 0 {
		return
	}
	x, y := tall(seed+3, rows, 1), tall(seed+3, rows, 1)
	spread := make([]float64, rows*lanes) // x as column 2 of a strip
	for i, a := range x {
		spread[i*lanes+2] = a
	}
	var one [lanes]float64
	var eight square
	vectorGram(&one, v, x)
	gramPlain(&eight, v, spread)
	for j := range lanes {
		if one[j] != eight[j*lanes+2] {
			t.Fatalf("vectorGram differs from gram in row %d", j)
		}
	}
	vectorUpdate(y, v, &one)
	updatePlain(spread, v, &eight)
	for i := range y {
		if y[i] != spread[i*lanes+2] {
			t.Fatalf("vectorUpdate differs from update in row %d", i)
		}
	}
}

func BenchmarkKernels(b *testing.B) {
	for _, kernel := range append(nativeKernels(), kernels{"go", gramGo, updateGo}) {
		for _, rows := range []int{128, 4096} {
			v, c := tall(1, rows, lanes), tall(2, rows, lanes)
			var w square
			report := func(b *testing.B) {
				flops := 2 * lanes * lanes * float64(rows)
				b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GFlop/s")
			}
			b.Run(fmt.Sprintf("gram/%s/%d", kernel.name, rows), func(b *testing.B) {
				for b.Loop() {
					kernel.gram(&w, v, c)
				}
				report(b)
			})
			clear(w[:])
			b.Run(fmt.Sprintf("update/%s/%d", kernel.name, rows), func(b *testing.B) {
				for b.Loop() {
					kernel.update(c, v, &w)
				}
				report(b)
			})
		}
	}
}
