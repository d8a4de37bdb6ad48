package kernel

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// lengths are the numbers of rows around which lanes, tiles and strips turn.
var lengths = []int{0, 1, 7, 8, 9, 15, 16, 17, 63, 64, 65, 100, 1000, Tile - 1, Tile, Tile + 1, 2*Tile + 13, 3 * Tile}

// drawRows draws a length: mostly an edge of some kind, at times any.
func drawRows(t *rapid.T) int {
	if rapid.Bool().Draw(t, "edge") {
		return rapid.SampledFrom(lengths).Draw(t, "rows")
	}
	return rapid.IntRange(0, 3*Tile).Draw(t, "rows")
}

// vector fills n numbers of mixed size and sign from a drawn seed.
func vector(rng *rand.Rand, n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = rng.NormFloat64() * math.Exp2(float64(rng.IntN(20)-10))
	}
	return v
}

func columns[F Element](rng *rand.Rand, n, k int) [][]F {
	cols := make([][]F, k)
	for j := range cols {
		cols[j] = make([]F, n)
		Narrow(cols[j], vector(rng, n))
	}
	return cols
}

func drawRand(t *rapid.T) *rand.Rand {
	return newRand(rapid.Uint64().Draw(t, "seed"))
}

func newRand(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 1)) }

// sameBits reports whether a and b agree in every bit.
func sameBits(a, b []float64) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if math.Float64bits(a[i]) != math.Float64bits(b[i]) {
			return false
		}
	}
	return true
}

func clone(v []float64) []float64 { return append([]float64(nil), v...) }

// A dot is the plain sum to rounding: |difference| ≤ n·ε·Σ|w·c|.
func TestDotsIsTheSum(t *testing.T) {
	t.Run("double", func(t *testing.T) { rapid.Check(t, dotsIsTheSum[float64]) })
	t.Run("single", func(t *testing.T) { rapid.Check(t, dotsIsTheSum[float32]) })
}

func dotsIsTheSum[F Element](t *rapid.T) {
	rng, n := drawRand(t), drawRows(t)
	k := rapid.IntRange(0, 9).Draw(t, "columns")
	w, cols := vector(rng, n), columns[F](rng, n, k)
	got := make([]float64, k)
	Dots(got, w, cols, Range{0, n})
	for j, c := range cols {
		want, size := 0.0, 0.0
		for i := range w {
			p := w[i] * float64(c[i])
			want += p
			size += math.Abs(p)
		}
		if bound := float64(n) * 0x1p-52 * size; math.Abs(got[j]-want) > bound {
			t.Fatalf("Dots over %d rows, column %d of %d: got %v, want %v ± %v", n, j, k, got[j], want, bound)
		}
	}
	self := make([]float64, 1)
	Dots(self, w, [][]float64{w}, Range{0, n})
	if s := SumSquares(w, Range{0, n}); math.Float64bits(s) != math.Float64bits(self[0]) {
		t.Fatalf("SumSquares over %d rows: got %v, w·w is %v", n, s, self[0])
	}
}

// Whether a strip is walked at once or tile by tile, the bits are the same.
func TestTilesOrStrip(t *testing.T) {
	t.Run("double", func(t *testing.T) { rapid.Check(t, tilesOrStrip[float64]) })
	t.Run("single", func(t *testing.T) { rapid.Check(t, tilesOrStrip[float32]) })
}

func tilesOrStrip[F Element](t *rapid.T) {
	rng, n := drawRand(t), drawRows(t)
	k := rapid.IntRange(0, 9).Draw(t, "columns")
	tiles := rapid.IntRange(1, 3).Draw(t, "tiles")
	w, cols, h := vector(rng, n), columns[F](rng, n, k), vector(rng, k)
	run := func(size int) []float64 {
		u, d, b := clone(w), clone(w), make([]F, n)
		dots, again, gram := make([]float64, k), make([]float64, k+1), make([]float64, k+1)
		next := Next[F]{W: w, Cols: cols, H: h, Norm: 3, B: b, Window: cols}
		for all := (Range{0, n}); all.Lo < all.Hi; {
			r := all.next(size)
			Dots(dots, w, cols, r)
			Reduce(again, u, cols, h, r)
			Correct(d, cols, h, r)
			next.Form(gram, r)
		}
		wide := make([]float64, n)
		Widen(wide, b)
		return slices.Concat(dots, again, gram, u, d, wide)
	}
	if whole, pieces := run(n+1), run(tiles*Tile); !sameBits(whole, pieces) {
		t.Fatalf("%d rows, %d columns: one call and pieces of %d tiles differ", n, k, tiles)
	}
}

// Reduce of up to 32 columns is Update, Dots and SumSquares; Form is Update, a scaling, and Dots of
// what was stored; Combine is Correct column by column. To the last bit.
func TestFusedAreTheirParts(t *testing.T) {
	t.Run("double", func(t *testing.T) { rapid.Check(t, fusedAreParts[float64]) })
	t.Run("single", func(t *testing.T) { rapid.Check(t, fusedAreParts[float32]) })
}

func fusedAreParts[F Element](t *rapid.T) {
	rng, n := drawRand(t), drawRows(t)
	k, d := rapid.IntRange(0, 40).Draw(t, "columns"), rapid.IntRange(0, 25).Draw(t, "combinations")
	p := rapid.IntRange(0, k).Draw(t, "window")
	w, cols, h := vector(rng, n), columns[F](rng, n, k), vector(rng, k)
	all := Range{0, n}

	u := clone(w)
	Update(u, cols, h, all)
	dots := make([]float64, k, k+1)
	Dots(dots, u, cols, all)
	dots = append(dots, SumSquares(u, all))
	v, got := clone(w), make([]float64, k+1)
	Reduce(got, v, cols, h, all)
	if !sameBits(u, v) || (k <= 32 && !sameBits(dots, got)) {
		t.Fatalf("Reduce of %d rows, %d columns is not Update, Dots and SumSquares", n, k)
	}

	for j := range got { // beyond 32 columns by smaller pieces: equal to rounding
		size := SumSquares(u, all)
		if j < k {
			size = math.Sqrt(size * SumSquares(cols[j], all))
		}
		if d := math.Abs(got[j] - dots[j]); d > float64(n)*0x1p-52*size {
			t.Fatalf("Reduce of %d rows, %d columns: sum %d is off by %g", n, k, j, d)
		}
	}

	b, wide := make([]F, n), make([]float64, n)
	for i := range u {
		b[i] = F(u[i] * (1 / 7.0))
	}
	Widen(wide, b)
	gram := make([]float64, p, p+1)
	Dots(gram, wide, cols[k-p:], all)
	gram = append(gram, SumSquares(b, all))
	formed, sums := make([]F, n), make([]float64, p+1)
	next := Next[F]{W: w, Cols: cols, H: h, Norm: 7, B: formed, Window: cols[k-p:]}
	next.Form(sums, all)
	if !slices.Equal(b, formed) || !sameBits(gram, sums) {
		t.Fatalf("Form of %d rows, %d columns, window %d is not its parts", n, k, p)
	}

	ldt := k + 2
	coefficients := vector(rng, ldt*max(d, 1))
	want, out := columns[float64](rng, n, d), make([][]float64, d)
	for c := range want {
		out[c] = clone(want[c])
		Correct(want[c], cols, coefficients[c*ldt:c*ldt+k], all)
	}
	Combine(out, cols, coefficients, ldt, all)
	for c := range want {
		if !sameBits(want[c], out[c]) {
			t.Fatalf("Combine of %d rows, %d columns: combination %d of %d is not Correct", n, k, c, d)
		}
	}
}
