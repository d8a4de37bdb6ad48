package small

import "math"

const (
	// filterTol: a direction in which S·W·t is this small against the summands
	// W_j·t_j is made of rounding and must not be recycled.
	filterTol = 1e-11
	// filterPivot is the pivot of a QR of S·W that counts as zero: a pivot
	// overestimates the singular value, by ten and more.
	filterPivot = 1e-10
	// pivotFloor is the ratio of diagonal entries of G below which S·C·W counts as
	// rank-deficient.
	pivotFloor = 1e-14
)

// HarmonicRitz returns T, m×directions column-major with the rows of the d
// recycled columns first: a basis of the harmonic Ritz directions of smallest
// magnitude of C on W = [U, b₀ … b_{k−1}], m = d+k, so that S·C·W·T has
// orthonormal columns.
//
//	q    the factorisation of [S·C·U, S·b₀, …], at least m columns
//	h    the projected problem with its m columns
//	su   S·U, s×d column-major, untouched; nil when d = 0
//	want most directions; a complex pair is taken whole or not at all, so
//	     directions may be want−1, and fewer when W holds no more
//
// With S·C·W = Q·M, Ω·M = [G; 0] and X = Qᵀ·S·W, the directions t solve
// X-projected K·t = μ·t, K = M⁺·X, for the largest |μ| = 1/|θ|; in z = G·t that
// is (Ω·X)[:m]·G⁻¹·z = μ·z, whose dominant invariant subspace Z comes from
// Krylov-Schur iteration (Stewart 2001) with a fixed start, and T = G⁻¹·Z. For
// m up to denseSize the whole spectrum is formed instead.
//
// When a direction is found to lie in the numerical null space of S·W
// (filterTol), columns of W that depend on others are dropped by a pivoted QR
// and the search runs again on the rest. directions is zero, T nil, when nothing
// trustworthy is found; that is a result, not an error. Allocates; once a cycle.
func HarmonicRitz(q *QR, h *Hessenberg, su []float64, want int) (t []float64, directions int) {
	p := newRitz(q, h, su)
	if want = min(want, p.m); want < 1 {
		return nil, 0
	}
	g := h.Triangle()
	smallest, largest := g.diagonalRange()
	if smallest > pivotFloor*largest {
		z, mu := dominant(p.m, want, p.operator(g))
		t = p.back(g, z, len(mu))
		if p.trusted(t, mu) {
			return t, len(mu)
		}
	}
	return p.filtered(g, want)
}

// ritz is the pencil of the harmonic Ritz problem in triangles and d columns.
type ritz struct {
	q       *QR
	h       *Hessenberg
	m, d    int
	rows    int       // rows of X: m+1, or m after a breakdown
	turned  []float64 // all of the turned S·U, s×d: [QᵀS·U; the part outside Q]
	norms   []float64 // of the columns of S·W
	scratch []float64 // rows
	padded  []float64 // m
}

func newRitz(q *QR, h *Hessenberg, su []float64) *ritz {
	p := &ritz{q: q, h: h, m: h.Columns(), d: h.Recycled()}
	if p.m > q.Columns() || len(su) != p.d*q.Rows() {
		panic("small: HarmonicRitz needs a QR of m columns and S·U of s×d")
	}
	p.rows = min(p.m+1, q.Columns())
	p.scratch, p.padded = make([]float64, p.rows), make([]float64, p.m)
	p.turned = append([]float64(nil), su...)
	q.transposeApplyAll(p.turned)
	p.norms = make([]float64, p.m)
	for j := range p.m {
		if j < p.d {
			p.norms[j] = norm(p.recycled(j))
		} else {
			p.norms[j] = norm(q.R().Column(j))
		}
	}
	return p
}

// recycled is column j of the turned S·U, s entries.
func (p *ritz) recycled(j int) []float64 {
	s := p.q.Rows()
	return p.turned[j*s : (j+1)*s : (j+1)*s]
}

// multiply sets out = (Ω·X·y)[:m].
func (p *ritz) multiply(out, y []float64) {
	r := p.scratch
	clear(r)
	copy(p.padded, y)
	clear(p.padded[:p.d])
	p.q.R().Leading(p.m).Mul(r[:p.m], p.padded)
	for j := range p.d {
		subtract(r, p.recycled(j), -y[j])
	}
	p.h.turn(r)
	copy(out, r)
}

// turn applies Ω, without a last rotation that would leave r.
func (h *Hessenberg) turn(r []float64) {
	h.rotate(r, min(h.columns, len(r)-1))
}

// operator is z ↦ (Ω·X)[:m]·G⁻¹·z.
func (p *ritz) operator(g Triangle) func(dst, src []float64) {
	y := make([]float64, p.m)
	return func(dst, src []float64) {
		copy(y, src)
		g.Solve(y)
		p.multiply(dst, y)
	}
}

// back is T = G⁻¹·Z.
func (p *ritz) back(g Triangle, z []float64, directions int) []float64 {
	t := append([]float64(nil), z[:directions*p.m]...)
	for j := range directions {
		g.Solve(t[j*p.m : (j+1)*p.m])
	}
	return t
}

// trusted tests |μ| ≤ ‖S·W·t‖ against filterTol times the summands.
func (p *ritz) trusted(t, mu []float64) bool {
	for i, size := range mu {
		squares := 0.0
		for j, a := range t[i*p.m : (i+1)*p.m] {
			part := a * p.norms[j]
			squares += float64(part * part)
		}
		if !isFinite(squares) || !isFinite(size) || size < filterTol*math.Sqrt(squares) {
			return false
		}
	}
	return len(mu) > 0
}
