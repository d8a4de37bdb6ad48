package small

import "math"

// rankTol is the relative size of a pivot that LeastSquares takes for zero.
const rankTol = 1e-13

// LeastSquares returns the y of smallest norm among those that minimise
// ‖c − M·y‖₂, and that minimum, rho.
//
//	m    s×k, column-major, column j at m[j*s:(j+1)*s]; destroyed
//	c    length s; destroyed
//	y    length k, new
//	rho  in the units of c
//
// rank is the number of pivots above 1e-13 of the largest; what lies below is
// taken for zero. A rank below k is a result, not an error. LeastSquares panics
// if the lengths disagree. Householder QR with column pivoting and, if rank < k,
// a second one of the transposed rest; about 4sk² flops. Golub and Van Loan,
// Matrix Computations, 4th ed., sections 5.4.2 and 5.5.
func LeastSquares(m, c []float64, s, k int) (y []float64, rho float64, rank int) {
	return LeastSquaresTo(rankTol, m, c, s, k)
}

// LeastSquaresTo is LeastSquares with another relative size of pivots to drop.
func LeastSquaresTo(tol float64, m, c []float64, s, k int) (y []float64, rho float64, rank int) {
	if s < 1 || k < 1 || len(m) != s*k || len(c) != s {
		panic("small: LeastSquares needs m of s×k and c of length s")
	}
	mScale, cScale := powerOfTwo(largestOf(m)), powerOfTwo(largestOf(c))
	scaleBy(m, 1/mScale)
	scaleBy(c, 1/cScale)
	p := factorPivoted(m, s, k, tol)
	p.transposeApply(c)
	rank = p.rank
	x := make([]float64, k)
	copy(x, c[:rank])
	if rank == k {
		p.solve(x)
	} else if rank > 0 {
		p.shortest(x)
	}
	y = make([]float64, k)
	for j, from := range p.order {
		y[from] = x[j] * cScale / mScale
	}
	return y, norm(c[rank:]) * cScale, rank
}

// pivoted is M·P = Q·R up to the first pivot below tolerance: R above the
// diagonal of m, the reflectors beneath it with a one understood.
type pivoted struct {
	m     []float64
	s, k  int
	order []int
	tau   []float64
	rank  int
}

// factorPivoted destroys m. order[j] is the column of M that became column j.
func factorPivoted(m []float64, s, k int, tol float64) *pivoted {
	p := &pivoted{m: m, s: s, k: k, order: make([]int, k), tau: make([]float64, min(s, k))}
	norms, exact := make([]float64, k), make([]float64, k)
	for j := range k {
		p.order[j] = j
		norms[j] = norm(p.column(j))
		exact[j] = norms[j]
	}
	for j := range p.tau {
		p.pivot(j, norms, exact)
		p.tau[j] = reflect(p.column(j)[j:])
		if math.Abs(p.column(j)[j]) <= tol*math.Abs(m[0]) || p.column(j)[j] == 0 {
			p.tau[j] = 0
			break
		}
		p.rank++
		p.eliminate(j, norms, exact)
	}
	return p
}

func (p *pivoted) column(j int) []float64 { return p.m[j*p.s : (j+1)*p.s : (j+1)*p.s] }

// pivot brings the column with the largest rest to place j.
func (p *pivoted) pivot(j int, norms, exact []float64) {
	best := j
	for i := j + 1; i < p.k; i++ {
		if norms[i] > norms[best] {
			best = i
		}
	}
	if best == j {
		return
	}
	a, b := p.column(j), p.column(best)
	for i := range a {
		a[i], b[i] = b[i], a[i]
	}
	p.order[j], p.order[best] = p.order[best], p.order[j]
	norms[best], exact[best] = norms[j], exact[j]
}

// eliminate applies reflector j to the columns behind it and takes its row off
// their norms; a norm that lost half its digits is formed anew, as LAPACK's
// working note 176 (Drmač and Bujanović) advises.
func (p *pivoted) eliminate(j int, norms, exact []float64) {
	v := p.column(j)[j+1:]
	for i := j + 1; i < p.k; i++ {
		c := p.column(i)
		applyReflector(p.tau[j], v, c[j:])
		if norms[i] == 0 {
			continue
		}
		ratio := math.Abs(c[j]) / norms[i]
		left := max(0, (1-ratio)*(1+ratio))
		lost := left * (norms[i] / exact[i]) * (norms[i] / exact[i])
		if lost <= 0x1p-26 {
			norms[i] = norm(c[j+1:])
			exact[i] = norms[i]
		} else {
			norms[i] *= math.Sqrt(left)
		}
	}
}

// transposeApply replaces c by Qᵀ·c.
func (p *pivoted) transposeApply(c []float64) {
	for j := range p.rank {
		applyReflector(p.tau[j], p.column(j)[j+1:], c[j:])
	}
}

// solve replaces x by R⁻¹·x for full rank.
func (p *pivoted) solve(x []float64) {
	for j := p.rank - 1; j >= 0; j-- {
		c := p.column(j)
		x[j] /= c[j]
		subtract(x[:j], c, x[j])
	}
}

// shortest replaces x by the shortest z with R[:rank, :]·z = x[:rank]: with
// Rᵀ = Z·L, z = Z·(L⁻ᵀ·x).
func (p *pivoted) shortest(x []float64) {
	r, k := p.rank, p.k
	rest := make([]float64, k*r)
	for j := range k {
		for i := 0; i < r && i <= j; i++ {
			rest[i*k+j] = p.column(j)[i]
		}
	}
	tau := make([]float64, r)
	for j := range r {
		c := rest[j*k : (j+1)*k]
		tau[j] = reflect(c[j:])
		for i := j + 1; i < r; i++ {
			applyReflector(tau[j], c[j+1:], rest[i*k+j:(i+1)*k])
		}
	}
	for j := range r { // L⁻ᵀ: forward, L's columns are those of rest
		c := rest[j*k:]
		x[j] = (x[j] - dot(c[:j], x[:j])) / c[j]
	}
	clear(x[r:])
	for j := r - 1; j >= 0; j-- {
		applyReflector(tau[j], rest[j*k+j+1:(j+1)*k], x[j:])
	}
}

// reflect makes H = I − tau·v·vᵀ with H·x = (beta, 0, …, 0), v[0] = 1, and
// leaves beta and v[1:] in x. The sign of beta is opposite to x[0].
func reflect(x []float64) (tau float64) {
	scale := powerOfTwo(largestOf(x))
	if scale != 1 {
		scaleBy(x, 1/scale)
		tau = reflect(x)
		x[0] *= scale
		return tau
	}
	alpha, squares := x[0], dot(x[1:], x[1:])
	if squares == 0 {
		return 0
	}
	beta := -math.Copysign(math.Sqrt(float64(alpha*alpha)+squares), alpha)
	scaleBy(x[1:], 1/(alpha-beta))
	x[0] = beta
	return (beta - alpha) / beta
}

// applyReflector replaces c by H·c; v is without its leading one.
func applyReflector(tau float64, v, c []float64) {
	if tau == 0 {
		return
	}
	w := float64(tau * (c[0] + dot(v, c[1:])))
	c[0] -= w
	subtract(c[1:], v, w)
}

func largestOf(x []float64) float64 {
	largest := 0.0
	for _, a := range x {
		largest = max(largest, math.Abs(a))
	}
	return largest
}
