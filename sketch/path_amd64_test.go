//go:build !noasm

package sketch

import (
	"testing"

	"pgregory.net/rapid"
)

// Every path that this processor can take gives the bits of the plain one.
func TestPathsAgree(t *testing.T) {
	was := chosen
	defer func() { chosen = was }()
	if was == plain {
		t.Skip("this processor has no other path")
	}
	for p := avx2; p <= was; p++ {
		rapid.Check(t, func(t *rapid.T) {
			zeta := rapid.SampledFrom([]int{4, 8, 2}).Draw(t, "zeta")
			rows := 8 * zeta * rapid.IntRange(1, 70).Draw(t, "places")
			n := rapid.OneOf(rapid.SampledFrom([]int{0, 1, 7, 8, 9, 15, 16, 17, 255, 256, 257, 264}), rapid.IntRange(0, 3000)).Draw(t, "n")
			first := 8 * rapid.IntRange(0, 1<<29).Draw(t, "group")
			o := New(rows, zeta, rapid.Uint64().Draw(t, "seed"))
			rng := newRand(uint64(n))
			w, want := normals(rng, n), normals(rng, rows)
			got := append([]float64(nil), want...)
			chosen = plain
			o.Add(want, w, first)
			chosen = p
			o.Add(got, w, first)
			if !sameBits(got, want) {
				t.Fatalf("path %d, %d×n operator, zeta %d: Add of %d rows from %d differs from plain", p, rows, zeta, n, first)
			}
		})
	}
}
