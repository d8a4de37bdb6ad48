package method

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// The window's projection is the least-squares one: what is left of w is
// orthogonal to every vector kept.
func TestWindowProjectsOrthogonally(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		const n = 40
		size := rapid.IntRange(1, maxWindow).Draw(t, "window")
		count := rapid.IntRange(1, 20).Draw(t, "vectors")
		number := rapid.Float64Range(-1, 1)
		draw := func() []float64 { return rapid.SliceOfN(number, n, n).Draw(t, "vector") }
		var win window
		win.reset(size)
		var basis [][]float64
		for range count {
			basis = append(basis, draw())
			if len(basis) > size {
				basis = basis[1:]
			}
			var gram []float64
			for _, b := range basis {
				gram = append(gram, dot(b, basis[len(basis)-1]))
			}
			win.push(gram)
		}
		w := draw()
		var dots []float64
		for _, b := range basis {
			dots = append(dots, dot(w, b))
		}
		h, norm := win.project(dots, dot(w, w))
		kept := basis[len(basis)-len(h):]
		left := append([]float64(nil), w...)
		for i, b := range kept {
			addScaled(left, b, -h[i])
		}
		// Pivots above 1e-14 leave a Gram matrix of condition up to 1e14.
		tolerance := 1e-5 * (norm2(w) + 1)
		for i, b := range kept {
			if d := math.Abs(dot(left, b)); d > tolerance*math.Max(1, norm2(b)) {
				t.Fatalf("vector %d of %d: what is left has inner product %g with it", i, len(kept), d)
			}
		}
		if want := norm2(left); norm < want-tolerance || norm > want+tolerance {
			t.Fatalf("norm %g, want %g", norm, want)
		}
	})
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

func TestWindowDropsDependentVectors(t *testing.T) {
	var win window
	win.reset(4)
	win.push([]float64{1})
	win.push([]float64{1, 1}) // the same vector again
	h, norm := win.project([]float64{0.6, 0.6}, 1)
	if len(h) != 1 || h[0] != 0.6 || math.Abs(norm-0.8) > 1e-15 {
		t.Errorf("project = %v, %v, want one coefficient 0.6 and norm 0.8", h, norm)
	}
}

func TestLadderClimbs(t *testing.T) {
	good := outcome{accepted: true, reduction: 0.5, gap: 1, steps: 100}
	slow := outcome{accepted: true, reduction: 0.99, gap: 1, steps: 100}
	lie := outcome{accepted: true, reduction: 0.5, gap: 20, steps: 100}
	refused := outcome{gap: 1, reduction: 1.5}
	for _, c := range []struct {
		name  string
		turns []outcome
		mode  mode
		ends  bool
	}{
		{"stays while all is well", []outcome{good, good}, windowMode, false},
		{"a lie costs a rung", []outcome{lie}, fullMode, false},
		{"a refused correction costs a rung", []outcome{refused}, fullMode, false},
		{"two slow cycles cost a rung", []outcome{slow, slow}, fullMode, false},
		{"progress forgives", []outcome{slow, good, slow}, windowMode, false},
		{"three slow cycles reach the classical rung", []outcome{slow, slow, slow}, classicalMode, false},
		{"five slow cycles end the run", []outcome{slow, slow, slow, slow, slow}, classicalMode, true},
	} {
		l := ladder{window: 4}
		ended := false
		for _, o := range c.turns {
			ended = l.climb(o)
		}
		if l.mode != c.mode || ended != c.ends {
			t.Errorf("%s: at %v, ended %v; want %v, %v", c.name, l.mode, ended, c.mode, c.ends)
		}
	}
}

func TestFullStepsByLevel(t *testing.T) {
	for _, c := range []struct {
		mode                   mode
		level, j, base, window int
		want                   bool
	}{
		{windowMode, 0, 16, 0, 4, false},
		{windowMode, 1, 16, 0, 4, true},
		{windowMode, 1, 17, 0, 4, false},
		{windowMode, 2, 24, 8, 4, true},
		{windowMode, 3, 5, 0, 4, true},
		{windowMode, 3, 4, 0, 4, false},
		{fullMode, 0, 1, 0, 4, true},
		{classicalMode, 3, 16, 0, 4, false},
	} {
		if got := wantsFull(c.mode, c.level, c.j, c.base, c.window); got != c.want {
			t.Errorf("wantsFull(%v, level %d, step %d from %d, window %d) = %v, want %v", c.mode, c.level, c.j, c.base, c.window, got, c.want)
		}
	}
}
