package small

import (
	"math"

	"gonum.org/v1/gonum/lapack"
	lapackgonum "gonum.org/v1/gonum/lapack/gonum"
)

// schur is A = Q·T·Qᵀ with T quasi-triangular, both n×n by rows, the
// eigenvalues in falling order of magnitude.
type schur struct {
	n    int
	q, t []float64
}

// leadingSchur destroys a, n×n by rows. It is false when the QR iteration does
// not converge. LAPACK's Dgehrd, Dorghr, Dhseqr and Dtrexc.
func leadingSchur(a []float64, n int) (*schur, bool) {
	var l lapackgonum.Implementation
	f := &schur{n: n, t: a, q: make([]float64, n*n)}
	if !allFinite(a) {
		return nil, false
	}
	if n == 1 {
		f.q[0] = 1
		return f, true
	}
	tau, work := make([]float64, n-1), make([]float64, 64*n)
	l.Dgehrd(n, 0, n-1, a, n, tau, work, len(work))
	copy(f.q, a)
	l.Dorghr(n, 0, n-1, f.q, n, tau, work, len(work))
	for i := 2; i < n; i++ {
		clear(a[i*n : i*n+i-1])
	}
	re, im := make([]float64, n), make([]float64, n)
	if l.Dhseqr(lapack.EigenvaluesAndSchur, lapack.SchurOrig, n, 0, n-1, a, n, re, im, f.q, n, work, len(work)) != 0 {
		return nil, false
	}
	f.sort(work[:n])
	return f, true
}

// pair tells whether row i begins a 2×2 block.
func (f *schur) pair(i int) bool { return i+1 < f.n && f.t[(i+1)*f.n+i] != 0 }

// width is the order of the block that begins at row i.
func (f *schur) width(i int) int {
	if f.pair(i) {
		return 2
	}
	return 1
}

// magnitude is |μ| of the block that begins at row i; the two of a pair are
// conjugate and their product is the determinant.
func (f *schur) magnitude(i int) float64 {
	a := f.t[i*f.n+i]
	if !f.pair(i) {
		return math.Abs(a)
	}
	b, c, d := f.t[i*f.n+i+1], f.t[(i+1)*f.n+i], f.t[(i+1)*f.n+i+1]
	return math.Sqrt(math.Abs(float64(a*d) - float64(b*c)))
}

// sort brings the blocks in falling order of magnitude by selection. A swap that
// LAPACK refuses, for blocks too close to part, leaves the order as it is.
func (f *schur) sort(work []float64) {
	var l lapackgonum.Implementation
	for to := 0; to < f.n; to += f.width(to) {
		best := to
		for i := to; i < f.n; i += f.width(i) {
			if f.magnitude(i) > f.magnitude(best) {
				best = i
			}
		}
		if best != to {
			l.Dtrexc(lapack.UpdateSchur, f.n, f.t, f.n, f.q, f.n, best, to, work)
		}
	}
}

// whole is the largest number ≤ n of leading columns that splits no pair.
func (f *schur) whole(n int) int {
	at := 0
	for at < f.n && at+f.width(at) <= n {
		at += f.width(at)
	}
	return at
}

// magnitudes are those of the leading whole(n) eigenvalues.
func (f *schur) magnitudes(n int) []float64 {
	mu := make([]float64, 0, n)
	for i := 0; i < f.whole(n); i += f.width(i) {
		for range f.width(i) {
			mu = append(mu, f.magnitude(i))
		}
	}
	return mu
}
