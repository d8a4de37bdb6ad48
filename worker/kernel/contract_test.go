package kernel

import "testing"

// No routine allocates, in either form of the basis, nor does a team's Run.
func TestNothingAllocates(t *testing.T) {
	t.Run("double", allocatesNothing[float64])
	t.Run("single", allocatesNothing[float32])
	a := grid(20, 20, 1)
	x, y := vector(newRand(1), a.Cols), make([]float64, a.Rows)
	all := Range{0, a.Rows}
	team := NewTeam(2)
	defer team.Close()
	f := func(int) {}
	for name, run := range map[string]func(){
		"Mul":     func() { Mul(y, a, x, all) },
		"AddMulT": func() { AddMulT(x, a, y, all) },
		"Run":     func() { team.Run(4, f) },
	} {
		if got := testing.AllocsPerRun(20, run); got != 0 {
			t.Errorf("%s allocates %v times a call", name, got)
		}
	}
}

func allocatesNothing[F Element](t *testing.T) {
	const n, k = 2*Tile + 5, 6
	rng := newRand(1)
	w, cols, h, out := vector(rng, n), columns[F](rng, n, k), vector(rng, k), make([]float64, k+1)
	dst, coefficients := columns[float64](rng, n, 3), vector(rng, 3*k)
	next := Next[F]{W: w, Cols: cols[:5], H: h[:5], Norm: 2, B: cols[5], Window: cols[1:5]}
	all := Range{0, n}
	for name, run := range map[string]func(){
		"Dots":       func() { Dots(out, w, cols, all) },
		"SumSquares": func() { out[0] = SumSquares(cols[0], all) },
		"Update":     func() { Update(w, cols, h, all) },
		"Correct":    func() { Correct(w, cols, h, all) },
		"Reduce":     func() { Reduce(out, w, cols, h, all) },
		"Form":       func() { next.Form(out, all) },
		"Combine":    func() { Combine(dst, cols, coefficients, k, all) },
		"Widen":      func() { Widen(w, cols[0]) },
		"Narrow":     func() { Narrow(cols[0], w) },
	} {
		if got := testing.AllocsPerRun(20, run); got != 0 {
			t.Errorf("%s allocates %v times a call", name, got)
		}
	}
}

func TestLengthsThatDisagreePanic(t *testing.T) {
	v, two, r := make([]float64, 8), [][]float64{make([]float64, 8), make([]float64, 8)}, Range{0, 8}
	a := grid(4, 2, 1)
	next := Next[float64]{W: v, Cols: two, H: v[:1], Norm: 1, B: v}
	for name, run := range map[string]func(){
		"Dots, few sums":            func() { Dots(v[:1], v, two, r) },
		"Dots, a short column":      func() { Dots(v, v, [][]float64{make([]float64, 4)}, r) },
		"Update, few coefficients":  func() { Update(v, two, v[:1], r) },
		"Correct, few coefficients": func() { Correct(v, two, v[:1], r) },
		"Reduce, few sums":          func() { Reduce(v[:2], v, two, v[:2], r) },
		"Form, few coefficients":    func() { next.Form(v, r) },
		"Combine, few coefficients": func() { Combine(two, two, v[:3], 2, r) },
		"Mul, short x":              func() { Mul(v, a, v[:7], r) },
		"Mul, rows beyond":          func() { Mul(v, a, v, Range{0, 9}) },
		"AddMulT, short y":          func() { AddMulT(v[:7], a, v, r) },
		"Widen":                     func() { Widen(v, v[:7]) },
		"Narrow":                    func() { Narrow(v, v[:7]) },
		"Total":                     func() { NewPartials(2, 3).Total(v) },
	} {
		if caught(run) == nil {
			t.Errorf("%s did not panic", name)
		}
	}
}
