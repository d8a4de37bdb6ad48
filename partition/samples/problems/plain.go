package problems

import "rowstead/partition/csr"

// Stencil27 is the 27-point operator on m³ nodes: 26 on the diagonal, −1 to
// every neighbour of the 3×3×3 cube. Symmetric positive definite.
func Stencil27(m int) *csr.Matrix {
	n := m * m * m
	r := newRows(n, n, 27*n)
	for i := range m {
		for j := range m {
			for l := range m {
				for a := max(i-1, 0); a <= min(i+1, m-1); a++ {
					for b := max(j-1, 0); b <= min(j+1, m-1); b++ {
						for c := max(l-1, 0); c <= min(l+1, m-1); c++ {
							v := -1.0
							if a == i && b == j && c == l {
								v = 26
							}
							r.add((a*m+b)*m+c, v)
						}
					}
				}
				r.end()
			}
		}
	}
	return r.m
}

// Grcar is the n×n matrix with −1 below the diagonal, 1 on it and on the k
// diagonals above: a standard matrix far from normal (k = 3).
func Grcar(n, k int) *csr.Matrix {
	r := newRows(n, n, (k+2)*n)
	for i := range n {
		if i > 0 {
			r.add(i-1, -1)
		}
		for j := i; j <= min(i+k, n-1); j++ {
			r.add(j, 1)
		}
		r.end()
	}
	return r.m
}

// CyclicShift is the permutation y[i] = x[(i+1) mod n]: a well-conditioned
// matrix on which GMRES stands still for n − 1 steps.
func CyclicShift(n int) *csr.Matrix {
	r := newRows(n, n, n)
	for i := range n {
		r.add((i+1)%n, 1)
		r.end()
	}
	return r.m
}

// Diagonal is the matrix with d on its diagonal.
func Diagonal(d ...float64) *csr.Matrix {
	r := newRows(len(d), len(d), len(d))
	for i, v := range d {
		r.add(i, v)
		r.end()
	}
	return r.m
}

// Identity is the n×n identity.
func Identity(n int) *csr.Matrix {
	d := make([]float64, n)
	for i := range d {
		d[i] = 1
	}
	return Diagonal(d...)
}

// Bidiagonal has main on the diagonal and upper above it. With main 1 and
// upper 2 its inverse grows like 2ⁿ: an honest solver falls short.
func Bidiagonal(n int, main, upper float64) *csr.Matrix {
	r := newRows(n, n, 2*n)
	for i := range n {
		r.add(i, main)
		if i < n-1 {
			r.add(i+1, upper)
		}
		r.end()
	}
	return r.m
}
