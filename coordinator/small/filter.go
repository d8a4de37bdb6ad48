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
	for c, j := range kept {
		copy(gp[c*p.m:], g.Column(j))
		p.column(xp[c*p.m:(c+1)*p.m], j)
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

// column sets out to column j of (Ω·X)[:m].
func (p *ritz) column(out []float64, j int) {
	r := p.scratch
	clear(r)
	if j < p.d {
		copy(r, p.recycled(j))
	} else {
		copy(r, p.q.R().Column(j))
	}
	p.h.turn(r)
	copy(out, r)
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

// independent lists the columns that a pivoted QR of S·W keeps, ascending.
func (p *ritz) independent() []int {
	outside := p.outside()
	inside := p.q.Columns()
	reach := inside + len(outside)/max(1, p.d)
	w := make([]float64, reach*p.m)
	for j := range p.m {
		c := w[j*reach : (j+1)*reach]
		if j < p.d {
			copy(c, p.recycled(j)[:inside])
			copy(c[inside:], outside[j*(reach-inside):(j+1)*(reach-inside)])
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

// outside is the part of S·U outside span Q up to a rotation from the left:
// at most d rows, d columns.
func (p *ritz) outside() []float64 {
	inside, s := p.q.Columns(), p.q.Rows()
	rows := s - inside
	if p.d == 0 || rows == 0 {
		return nil
	}
	part := make([]float64, 0, rows*p.d)
	for j := range p.d {
		part = append(part, p.recycled(j)[inside:]...)
	}
	if rows <= p.d {
		return part
	}
	q := NewQR(rows, p.d)
	q.Append(part)
	square := make([]float64, p.d*p.d)
	for j := range p.d {
		copy(square[j*p.d:], q.R().Column(j))
	}
	return square
}
