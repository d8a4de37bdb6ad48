package small

import "slices"

// filtered is the search on those columns of W that a pivoted QR of S·W, its
// columns scaled to one, finds independent to filterPivot: with their parts
// M_P = Q'·R' and X_P it runs on Q'ᵀ·X_P·R'⁻¹. O(m³), for the rare degenerate
// basis.
func (p *ritz) filtered(g Triangle, want int) ([]float64, int) {
	kept := p.independent()
	n := len(kept)
	if n == 0 {
		return nil, 0
	}
	gp, xp := make([]float64, p.m*n), make([]float64, p.m*n)
	unit := make([]float64, p.m)
	for c, j := range kept {
		copy(gp[c*p.m:], g.Column(j))
		unit[j] = 1
		p.multiply(xp[c*p.m:(c+1)*p.m], unit)
		unit[j] = 0
	}
	factor := NewQR(p.m, n)
	factor.Append(gp)
	r := factor.R()
	if smallest, largest := r.diagonalRange(); !(smallest > pivotFloor*largest) {
		return nil, 0
	}
	factor.transposeApplyAll(xp)
	z, mu := dominant(n, min(want, n), denseOperator(xp, p.m, r))
	t := make([]float64, p.m*len(mu))
	for i := range mu {
		y := z[i*n : (i+1)*n]
		r.Solve(y)
		for c, j := range kept {
			t[i*p.m+j] = y[c]
		}
	}
	if len(mu) == 0 || !allFinite(t) {
		return nil, 0
	}
	return t, len(mu)
}

// denseOperator is z ↦ N·R⁻¹·z, N the leading rows of x.
func denseOperator(x []float64, rows int, r Triangle) func(dst, src []float64) {
	n := r.Size()
	y := make([]float64, n)
	return func(dst, src []float64) {
		copy(y, src)
		r.Solve(y)
		clear(dst)
		for j, f := range y {
			subtract(dst, x[j*rows:], -f)
		}
	}
}

// independent lists the columns that a pivoted QR keeps, ascending.
func (p *ritz) independent() []int {
	s, reach := p.q.Rows(), p.m
	if p.d > 0 {
		reach = s // the part of S·U outside Q counts
	}
	w := make([]float64, reach*p.m)
	for j := range p.m {
		c := w[j*reach : (j+1)*reach]
		if j < p.d {
			copy(c, p.recycled(j))
		} else {
			copy(c, p.q.R().Column(j))
		}
		if p.norms[j] > 0 {
			scaleBy(c, 1/p.norms[j])
		}
	}
	f := factorPivoted(w, reach, p.m, filterPivot)
	kept := slices.Clone(f.order[:f.rank])
	slices.Sort(kept)
	return kept
}
