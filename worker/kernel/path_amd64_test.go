//go:build !noasm

package kernel

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"
)

// onEveryPath runs a property for each path of this processor but the plain one.
func onEveryPath(t *testing.T, property func(t *rapid.T, use func(p path), p path)) {
	was := chosen
	defer func() { chosen = was }()
	if was == plain {
		t.Skip("this processor has no other path")
	}
	for p := avx2; p <= was; p++ {
		rapid.Check(t, func(t *rapid.T) {
			property(t, func(p path) { chosen = p }, p)
		})
	}
}

// Every path that this processor can take gives the bits of the plain one, at
// any length and from any address.
func TestPathsAgree(t *testing.T) {
	t.Run("double", func(t *testing.T) { onEveryPath(t, pathsAgree[float64]) })
	t.Run("single", func(t *testing.T) { onEveryPath(t, pathsAgree[float32]) })
}

func pathsAgree[F Element](t *rapid.T, use func(p path), p path) {
	rng, n := drawRand(t), drawRows(t)
	skip := rapid.IntRange(0, 7).Draw(t, "offset") // of the first row from the start of its memory
	whole, cols, h := vector(rng, n+skip), columns[F](rng, n+skip, 4), vector(rng, 4)
	w := whole[skip:]
	for j := range cols {
		cols[j] = cols[j][skip:]
	}
	use(plain)
	want := allLoops(w, cols, h)
	use(p)
	got := allLoops(w, cols, h)
	for name := range want {
		if !sameBits(got[name], want[name]) {
			t.Fatalf("%s of %d rows at offset %d differs between path %d and plain Go", name, n, skip, p)
		}
	}
}

// allLoops is what the inner loops make of copies of w.
func allLoops[F Element](w []float64, cols [][]F, h []float64) map[string][]float64 {
	dots := dot4(w, cols[0], cols[1], cols[2], cols[3], Tile)
	four, one, tile := clone(w), make([]float64, len(w)), clone(w)
	update4(four, w, (*[4]float64)(h), cols[0], cols[1], cols[2], cols[3])
	update1(one, w, h[0], cols[2])
	b, stored := make([]F, len(w)), make([]float64, len(w))
	scaleInto(b, tile, h[1])
	Widen(stored, b)
	return map[string][]float64{
		"dot4": dots[:], "dot1": {dot1(w, cols[1], 0)}, "update4": four, "update1": one,
		"scale's tile": tile, "scale's vector": stored,
	}
}

// Masked loads and stores touch nothing beyond the last row.
func TestPathsKeepToTheirRows(t *testing.T) {
	was := chosen
	defer func() { chosen = was }()
	for chosen = plain; chosen <= was; chosen++ {
		for n := range 20 {
			t.Run(fmt.Sprintf("path %d, %d rows", chosen, n), func(t *testing.T) {
				keepsToRows[float64](t, newRand(1), n)
				keepsToRows[float32](t, newRand(1), n)
			})
		}
	}
}

func keepsToRows[F Element](t *testing.T, rng *rand.Rand, n int) {
	w, c := vector(rng, n+9), columns[F](rng, n+9, 5)
	beyond, beyondB := clone(w[n:]), append([]F(nil), c[4][n:]...)
	update4(w[:n], w[:n], &[4]float64{1, 2, 3, 4}, c[0], c[1], c[2], c[3])
	update1(w[:n], w[:n], 5, c[0])
	scaleInto(c[4], w[:n], 6)
	if !sameBits(w[n:], beyond) || fmt.Sprint(c[4][n:]) != fmt.Sprint(beyondB) {
		t.Errorf("rows beyond %d were written", n)
	}
}
