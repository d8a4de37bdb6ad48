package sketch

import (
	"math"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"
)

func newRand(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 7)) }

func normals(rng *rand.Rand, n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = rng.NormFloat64()
	}
	return v
}

func norm(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x * x
	}
	return math.Sqrt(sum)
}

func sameBits(a, b []float64) bool {
	for i := range a {
		if math.Float64bits(a[i]) != math.Float64bits(b[i]) {
			return false
		}
	}
	return len(a) == len(b)
}

// obviousAdd is Add entry by entry from the formula of Operator. turned false
// leaves out the turn of the lanes.
func obviousAdd(rows, zeta int, seed uint64, turned bool, dst, w []float64, firstRow int) {
	scale := 1 / math.Sqrt(float64(zeta))
	segment := rows / zeta
	for i, x := range w {
		g := uint64(firstRow + i)
		lane := g % 8
		for t := range zeta {
			h := mix(seed ^ mix(64*(g/8)+uint64(t)))
			r := h >> 8 & 7
			if !turned {
				r = 0
			}
			row := t*segment + 8*int((h>>32)*uint64(segment/8)>>32) + int(lane^r)
			value := float64(x * scale)
			if h>>lane&1 == 1 {
				value = -value
			}
			dst[row] += value
		}
	}
}

// The finalizer is the published splitmix64: its first outputs from state
// 1234567, as the public-domain reference prints them (values from memory).
func TestMixIsSplitmix64(t *testing.T) {
	state := uint64(1234567)
	for i, want := range []uint64{6457827717110365317, 3203168211198807973, 9817491932198370423} {
		if got := mix(state); got != want {
			t.Errorf("output %d: got %d, want %d", i, got, want)
		}
		state += golden
	}
}

// Add has the bits of the formula, for any shape and any length.
func TestAddIsTheFormula(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		zeta := rapid.SampledFrom([]int{1, 2, 3, 4, 5, 8, 16, 64}).Draw(t, "zeta")
		rows := 8 * zeta * rapid.IntRange(1, 70).Draw(t, "places")
		seed := rapid.Uint64().Draw(t, "seed")
		n := rapid.SampledFrom([]int{0, 1, 7, 8, 9, 15, 16, 17, 31, 64, 200, 1023, 1024, 1033}).Draw(t, "n")
		first := 8 * rapid.OneOf(rapid.IntRange(0, 99), rapid.IntRange(1<<28, 1<<29)).Draw(t, "group")
		rng := newRand(seed)
		w, got := normals(rng, n), normals(rng, rows)
		want := append([]float64(nil), got...)
		obviousAdd(rows, zeta, seed, true, want, w, first)
		New(rows, zeta, seed).Add(got, w, first)
		if !sameBits(got, want) {
			t.Fatalf("New(%d, %d, %d).Add of %d rows from %d differs from the formula", rows, zeta, seed, n, first)
		}
	})
}

// AddBoth has the bits of two Adds.
func TestAddBothIsTwoAdds(t *testing.T) {
	for _, n := range []int{0, 5, 1024, 5000} {
		o, h := New(256, 4, 11), HoldOut(11)
		w := normals(newRand(1), n)
		dst, hold := make([]float64, 256), make([]float64, HoldRows)
		o.Add(dst, w, 80)
		h.Add(hold, w, 80)
		both, bothHold := make([]float64, 256), make([]float64, HoldRows)
		o.AddBoth(h, both, bothHold, w, 80)
		if !sameBits(dst, both) || !sameBits(hold, bothHold) {
			t.Errorf("AddBoth of %d rows differs from two Adds", n)
		}
	}
}

// Whatever the cuts, the parts add up to the sketch of the whole, to rounding:
// every entry sums about n·zeta/s terms.
func TestBlocksAddUp(t *testing.T) {
	const n, rows = 50_000, 832
	w := normals(newRand(2), n)
	o := New(rows, 4, 5)
	whole := make([]float64, rows)
	o.Add(whole, w, 0)
	for _, blocks := range []int{1, 2, 4, 8} {
		total := make([]float64, rows)
		for b := range blocks {
			lo, hi := b*n/blocks&^7, (b+1)*n/blocks&^7
			if b == blocks-1 {
				hi = n
			}
			part := make([]float64, rows)
			o.Add(part, w[lo:hi], lo)
			for i := range total {
				total[i] += part[i]
			}
		}
		for i := range total {
			if d := math.Abs(total[i] - whole[i]); d > 1e-15*norm(w) {
				t.Fatalf("%d blocks: entry %d is off by %g", blocks, i, d)
			}
		}
		if blocks == 1 && !sameBits(total, whole) {
			t.Errorf("one block differs in bits from the whole")
		}
	}
}

func TestNewRefusesBadShapes(t *testing.T) {
	for _, c := range []struct{ rows, zeta int }{{0, 4}, {-32, 4}, {33, 4}, {8, 4}, {32, 0}, {8 * 65, 65}} {
		if !panics(func() { New(c.rows, c.zeta, 1) }) {
			t.Errorf("New(%d, %d, 1) did not panic", c.rows, c.zeta)
		}
	}
	o := New(64, 4, 1)
	if !panics(func() { o.Add(make([]float64, 63), nil, 0) }) || !panics(func() { o.Add(make([]float64, 64), nil, 4) }) {
		t.Error("Add took a short dst or an odd first row")
	}
}

func panics(f func()) (did bool) {
	defer func() { did = recover() != nil }()
	f()
	return false
}

func TestRowsForRoundsUp(t *testing.T) {
	for _, c := range []struct{ columns, zeta, want int }{{0, 4, 32}, {8, 4, 32}, {9, 4, 64}, {336, 4, 1344}, {300, 8, 1216}, {500, 1, 2000}} {
		if got := RowsFor(c.columns, c.zeta); got != c.want {
			t.Errorf("RowsFor(%d, %d) = %d, want %d", c.columns, c.zeta, got, c.want)
		}
	}
}

// Seeds of cycles and of hold-outs do not meet: 10,000 runs and cycles give
// 20,000 different seeds.
func TestSeedsDiffer(t *testing.T) {
	seen := map[uint64]bool{}
	for run := range uint64(100) {
		for cycle := range 100 {
			seed := CycleSeed(run, cycle)
			seen[seed], seen[HoldOut(seed).seed] = true, true
		}
	}
	if len(seen) != 20_000 {
		t.Errorf("%d different seeds, want 20000", len(seen))
	}
}

func TestAddAllocatesNothing(t *testing.T) {
	o, h := New(832, 4, 5), HoldOut(5)
	w, dst, hold := normals(newRand(1), 3001), make([]float64, 832), make([]float64, HoldRows)
	if a := testing.AllocsPerRun(20, func() { o.AddBoth(h, dst, hold, w, 8) }); a != 0 {
		t.Errorf("AddBoth allocates %v times a call", a)
	}
}
