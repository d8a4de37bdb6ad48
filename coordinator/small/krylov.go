package small

import "math"

const (
	// denseSize is the order up to which forming the whole matrix and its Schur
	// form is cheaper than iterating.
	denseSize = 120
	// A Krylov space of extraVectors + vectorsEach·want, restarted at most
	// mostRestarts times, until residuals fall below ritzTol·|μ|: recycled
	// directions need few digits, and what is missing costs nothing but speed.
	extraVectors = 20
	vectorsEach  = 4
	mostRestarts = 6
	ritzTol      = 1e-8
)

// dominant returns orthonormal columns Z, n×len(mu), that span the invariant
// subspace of op for its eigenvalues of largest magnitude, and these magnitudes,
// largest first. A complex pair is taken whole or left out.
func dominant(n, want int, op func(dst, src []float64)) (z, mu []float64) {
	size := vectorsEach*want + extraVectors
	if n <= max(denseSize, size) {
		return denseDominant(n, want, op)
	}
	k := newKrylov(n, size, op)
	kept := 0
	for restart := 0; ; restart++ {
		used := k.extend(kept)
		f, ok := leadingSchur(k.projected(used), used)
		if !ok {
			return nil, nil
		}
		mu = f.magnitudes(want)
		if restart == mostRestarts || used < size || k.converged(f, mu) {
			k.rotate(f, len(mu))
			return k.basis[:len(mu)*n], mu
		}
		kept = f.whole(want + (size-want)/2)
		k.restart(f, kept)
	}
}

// denseDominant forms the matrix of op.
func denseDominant(n, want int, op func(dst, src []float64)) (z, mu []float64) {
	a, unit, column := make([]float64, n*n), make([]float64, n), make([]float64, n)
	for j := range n {
		unit[j] = 1
		op(column, unit)
		unit[j] = 0
		for i, x := range column {
			a[i*n+j] = x
		}
	}
	if !allFinite(a) {
		return nil, nil
	}
	f, ok := leadingSchur(a, n)
	if !ok {
		return nil, nil
	}
	mu = f.magnitudes(want)
	z = make([]float64, n*len(mu))
	for j := range mu {
		for i := range n {
			z[j*n+i] = f.q[i*n+j]
		}
	}
	return z, mu
}

// krylov is the decomposition op·V = V·H + v·bᵀ of Stewart, A Krylov-Schur
// algorithm for large eigenproblems (2001).
type krylov struct {
	n, size int
	op      func(dst, src []float64)
	basis   []float64 // size+1 vectors of length n
	next    []float64 // the same room, for the turned ones
	h       []float64 // (size+1)×size by columns; row size+1 holds bᵀ
}

func newKrylov(n, size int, op func(dst, src []float64)) *krylov {
	k := &krylov{n: n, size: size, op: op}
	k.basis, k.next = make([]float64, (size+1)*n), make([]float64, size*n)
	k.h = make([]float64, (size+1)*size)
	k.seed(0)
	return k
}

func (k *krylov) vector(j int) []float64 { return k.basis[j*k.n : (j+1)*k.n : (j+1)*k.n] }
func (k *krylov) column(j int) []float64 {
	return k.h[j*(k.size+1) : (j+1)*(k.size+1) : (j+1)*(k.size+1)]
}

// seed fills vector j with noise, orthogonal to those before it; it returns
// false when nothing is left.
func (k *krylov) seed(j int) bool {
	v := k.vector(j)
	for i := range v {
		v[i] = noise(uint64(j), uint64(i))
	}
	before := normalise(v)
	after := k.orthogonalise(v, j, nil)
	return before > 0 && after > 1e-8
}

// orthogonalise takes the parts along the first m vectors off v, twice, adds
// them to h and normalises v; it returns the norm left.
func (k *krylov) orthogonalise(v []float64, m int, h []float64) float64 {
	for range 2 {
		for i := range m {
			f := dot(k.vector(i), v)
			subtract(v, k.vector(i), f)
			if h != nil {
				h[i] += f
			}
		}
	}
	return normalise(v)
}

// extend builds vectors kept+1 … size and returns how many columns H has: size,
// or fewer when the space is invariant.
func (k *krylov) extend(kept int) int {
	for j := kept; j < k.size; j++ {
		c, v := k.column(j), k.vector(j+1)
		clear(c)
		k.op(v, k.vector(j))
		whole := norm(v)
		left := k.orthogonalise(v, j+1, c)
		c[j+1] = left
		if !(left > 0x1p-50*whole) { // invariant: go on with a new direction
			c[j+1] = 0
			if !k.seed(j + 1) {
				return j + 1
			}
		}
	}
	return k.size
}

// projected is the used×used leading block of H by rows.
func (k *krylov) projected(used int) []float64 {
	a := make([]float64, used*used)
	for j := range used {
		for i, x := range k.column(j)[:used] {
			a[i*used+j] = x
		}
	}
	return a
}

// residual is bᵀ·q_j for column j of the Schur vectors.
func (k *krylov) residual(f *schur, j int) float64 {
	last := f.n - 1
	return k.column(last)[f.n] * f.q[last*f.n+j]
}

func (k *krylov) converged(f *schur, mu []float64) bool {
	for j, size := range mu {
		if math.Abs(k.residual(f, j)) > ritzTol*size {
			return false
		}
	}
	return true
}

// rotate replaces the leading m vectors by V·Q[:, :m].
func (k *krylov) rotate(f *schur, m int) {
	for j := range m {
		v := k.next[j*k.n : (j+1)*k.n]
		clear(v)
		for i := range f.n {
			subtract(v, k.vector(i), -f.q[i*f.n+j])
		}
	}
	copy(k.basis, k.next[:m*k.n])
}

// restart keeps the leading Schur vectors, their block of the Schur form and bᵀ.
func (k *krylov) restart(f *schur, kept int) {
	last := k.vector(f.n)
	k.rotate(f, kept)
	copy(k.vector(kept), last)
	for j := range kept {
		b := k.residual(f, j)
		c := k.column(j)
		clear(c)
		for i := range kept {
			c[i] = f.t[i*f.n+j]
		}
		c[kept] = b
	}
}
