package method

import (
	"math"
	"testing"

	"rowstead/partition/samples/problems"
	"rowstead/sketch"
)

// A basis that is degenerate on purpose: raw Newton polynomials over a whole
// cycle of 600 on Poisson's equation. The sketched estimate becomes a lie, and
// the hold-out, which nothing minimises, must say so.
func TestHoldOutFlagsALie(t *testing.T) {
	const k, zeta, seed = 600, 4, 3
	a := problems.Poisson2D(60)
	n := a.Rows
	rows := sketch.RowsFor(k+4, zeta)
	s, out := sketch.New(rows, zeta, seed), sketch.HoldOut(seed)
	p := newProjected(rows, k+1)
	p.begin(recycled{}, 1)

	shifts := leja(40, 0, 8)
	basis := [][]float64{unit(problems.NormalVector(n, 5))}
	take := func(b []float64, c []column) {
		sb, hold := make([]float64, rows), make([]float64, HoldRows)
		s.Add(sb, b, 0)
		out.Add(hold, b, 0)
		p.take(c, sb, hold)
	}
	take(basis[0], nil)
	flagged := 0
	for j := range k {
		w := make([]float64, n)
		a.Mul(w, basis[j])
		theta := shifts[j%len(shifts)]
		addScaled(w, basis[j], -theta)
		c := column{lo: j, h: []float64{theta}, norm: norm2(w)}
		basis = append(basis, unit(w))
		take(basis[j+1], []column{c})
		if (j+1)%smallPanel == 0 {
			if r := p.assess(); flagged == 0 && r.holdout > 2*r.debiased {
				flagged = j + 1
			}
		}
	}
	last := p.assess()
	true2 := trueNorm(a.Mul, basis, last.y)
	t.Logf("after %d steps: estimate %.1e, hold-out %.1e, truth %.1e, condition %.0e; first flagged at step %d", k, last.debiased, last.holdout, true2, last.condition, flagged)
	if true2 < 10*last.debiased {
		t.Fatalf("the basis is not degenerate enough for a test: truth %.1e, estimate %.1e", true2, last.debiased)
	}
	if flagged == 0 || last.holdout <= 2*last.debiased {
		t.Errorf("hold-out %.1e beside an estimate of %.1e: not flagged", last.holdout, last.debiased)
	}
}

// trueNorm is ‖b₀ − A·B·y‖.
func trueNorm(mul func(y, x []float64), basis [][]float64, y []float64) float64 {
	z := make([]float64, len(basis[0]))
	for j, v := range y {
		addScaled(z, basis[j], v)
	}
	r := make([]float64, len(z))
	mul(r, z)
	for i := range r {
		r[i] = basis[0][i] - r[i]
	}
	return norm2(r)
}

func unit(v []float64) []float64 {
	size := norm2(v)
	out := make([]float64, len(v))
	for i, x := range v {
		out[i] = x / size
	}
	return out
}

// leja orders count Chebyshev points of (lo, hi) so that each is farthest, in
// the product of distances, from those before it.
func leja(count int, lo, hi float64) []float64 {
	points := make([]float64, count)
	for i := range points {
		points[i] = (lo+hi)/2 + (hi-lo)/2*math.Cos(math.Pi*(float64(i)+0.5)/float64(count))
	}
	for i := 1; i < count; i++ {
		best, far := i, math.Inf(-1)
		for j := i; j < count; j++ {
			sum := 0.0
			for _, q := range points[:i] {
				sum += math.Log(math.Abs(points[j] - q))
			}
			if sum > far {
				best, far = j, sum
			}
		}
		points[i], points[best] = points[best], points[i]
	}
	return points
}
