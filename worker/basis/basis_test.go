package basis

import (
	"math"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"

	"rowstead/worker/kernel"
)

func serial(rows int) func(task func(r kernel.Range)) {
	return func(task func(r kernel.Range)) { task(kernel.Range{Lo: 0, Hi: rows}) }
}

func drawn(rng *rand.Rand, n int) []float64 {
	v := make([]float64, n)
	for i := range v {
		v[i] = rng.NormFloat64()
	}
	return v
}

// run draws w's and steps, feeds them to a basis and returns everything it says.
// again makes the same w's.
func run(b Basis, seed uint64, rows, steps, window int) (said []float64) {
	rng := rand.New(rand.NewPCG(seed, 2))
	b.Reset(Room{Rows: rows, Capacity: steps, Window: window}, serial(rows))
	all := kernel.Range{Lo: 0, Hi: rows}
	scratch := make([]float64, rows)
	for j := range steps {
		lo := max(0, j-window)
		s := Step{Lo: lo, H: drawn(rng, j-lo), Norm: 1 + rng.Float64()}
		w := drawn(rng, rows)
		if err := b.Check(s, window); err != nil {
			panic(err)
		}
		b.Begin(w, s, window)
		gram := make([]float64, min(window, j+1))
		b.Form(gram, all)
		dots := make([]float64, min(window, j+1))
		b.Dots(dots, w, all)
		said = append(append(said, gram...), dots...)
		said = append(said, b.Newest(scratch, all)...)
	}
	return said
}

// A ring says what columns in 64 bits say, to the last bit.
func TestRingIsColumns(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		seed, rows := rapid.Uint64().Draw(t, "seed"), rapid.IntRange(0, 3000).Draw(t, "rows")
		steps, window := rapid.IntRange(1, 12).Draw(t, "steps"), rapid.IntRange(1, 5).Draw(t, "window")
		double, _ := New(Double)
		replay, _ := New(Replay)
		want, got := run(double, seed, rows, steps, window), run(replay, seed, rows, steps, window)
		for i, w := range want {
			if math.Float64bits(got[i]) != math.Float64bits(w) {
				t.Fatalf("number %d of %d: got %v, want %v", i, len(want), got[i], w)
			}
		}
	})
}

// In single form every dot is that of the rounded vector.
func TestSingleSpeaksOfWhatItKeeps(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		rows := rapid.IntRange(1, 2500).Draw(t, "rows")
		b, err := New(Single)
		if err != nil {
			t.Fatal(err)
		}
		b.Reset(Room{Rows: rows, Capacity: 1, Window: 1}, serial(rows))
		w, all := drawn(rng, rows), kernel.Range{Lo: 0, Hi: rows}
		b.Begin(w, Step{Norm: 3}, 1)
		gram := make([]float64, 1)
		b.Form(gram, all)
		kept := b.Newest(make([]float64, rows), all)
		want := 0.0
		for i, v := range kept {
			if v != float64(float32(v)) || math.Abs(v-w[i]/3) > 0x1p-24*math.Abs(w[i]) {
				t.Fatalf("row %d: kept %v of %v", i, v, w[i]/3)
			}
			want += v * v
		}
		if math.Abs(gram[0]-want) > 1e-13*want {
			t.Fatalf("Gram %v, of the kept vector %v", gram[0], want)
		}
	})
}

// Rewind and Again make the same vectors again, and Combine their sums.
func TestAgainMakesTheSameVectors(t *testing.T) {
	const rows, window, steps = 1500, 2, 9
	rng := rand.New(rand.NewPCG(1, 1))
	var b Ring
	b.Reset(Room{Rows: rows, Capacity: steps, Window: window}, serial(rows))
	all := kernel.Range{Lo: 0, Hi: rows}
	var ws, vectors [][]float64
	y, want := drawn(rng, steps), make([]float64, rows)
	for j := range steps {
		lo := max(0, j-window)
		ws = append(ws, drawn(rng, rows))
		b.Begin(ws[j], Step{Lo: lo, H: drawn(rng, j-lo), Norm: 2}, window)
		b.Form(make([]float64, window), all)
		vectors = append(vectors, append([]float64(nil), b.Newest(nil, all)...))
		kernel.Correct(want, vectors[j:], y[j:j+1], all)
	}
	got := make([]float64, rows)
	if n := b.Rewind(); n != steps {
		t.Fatalf("Rewind() = %d, want %d", n, steps)
	}
	for j := range steps {
		b.Again(ws[j])
		b.Form(make([]float64, 1), all)
		for i, v := range b.Newest(nil, all) {
			if v != vectors[j][i] {
				t.Fatalf("vector %d, row %d: %v again, %v before", j, i, v, vectors[j][i])
			}
		}
		b.Combine([][]float64{got}, y, steps, j+1, all)
	}
	for i := range got {
		if got[i] != want[i] {
			t.Fatalf("sum, row %d: %v, want %v", i, got[i], want[i])
		}
	}
}

func TestStepsThatCannotBeTaken(t *testing.T) {
	for _, form := range []string{Double, Single, Replay} {
		b, _ := New(form)
		b.Reset(Room{Rows: 10, Capacity: 3, Window: 1}, serial(10))
		for range 3 {
			b.Begin(make([]float64, 10), Step{Norm: 1}, 1)
		}
		for name, s := range map[string]Step{
			"no room":        {Norm: 1},
			"no norm":        {},
			"norm no number": {Norm: math.NaN()},
			"ahead":          {Lo: 2, H: []float64{1, 1}, Norm: 1},
			"before 0":       {Lo: -1, H: []float64{1}, Norm: 1},
		} {
			if err := b.Check(s, 1); err == nil {
				t.Errorf("%s, %s: no error", form, name)
			}
		}
	}
	if _, err := New("triple"); err == nil {
		t.Error("an unknown form: no error")
	}
}

// Memory is taken once: a further Reset within it changes nothing.
func TestMemoryIsTakenOnce(t *testing.T) {
	for form, bytes := range map[string]int64{Double: 8 * 1000 * 20, Single: 4 * 1000 * 20, Replay: 8 * 1000 * 7} {
		b, _ := New(form)
		b.Reset(Room{Rows: 1000, Capacity: 20, Window: 4}, serial(1000))
		held := b.Bytes()
		if held < bytes || float64(held) > 1.02*float64(bytes) {
			t.Errorf("%s: %d bytes, want about %d", form, held, bytes)
		}
		b.Reset(Room{Rows: 1000, Capacity: 10, Window: 4}, serial(1000))
		if again := b.Bytes(); again != held || b.Len() != 0 {
			t.Errorf("%s: %d bytes after a smaller cycle, %d before", form, again, held)
		}
	}
}
