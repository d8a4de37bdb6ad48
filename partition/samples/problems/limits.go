package problems

import (
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// Neumann2D is the five-point −Δ on m×m cells without any fixed value: symmetric,
// semidefinite, singular with the constants. With b orthogonal to them the
// equations agree, NeumannRight; with any other b they contradict each other.
func Neumann2D(m int) *csr.Matrix {
	n := m * m
	r := newRows(n, n, 5*n)
	for i := range m {
		for j := range m {
			k, degree := i*m+j, 4.0
			for _, edge := range []bool{i == 0, j == 0, i == m-1, j == m-1} {
				if edge {
					degree--
				}
			}
			gridRow(r, k, m, 1, degree, [4]bool{i > 0, j > 0, j < m-1, i < m-1})
		}
	}
	return r.m
}

// gridRow appends row k of a grid with m nodes a row: −g to the neighbours at
// k − m, k − 1, k + 1 and k + m, where they exist.
func gridRow(r rows, k, m int, g, middle float64, has [4]bool) {
	for side, step := range [4]int{-m, -1, 1, m} {
		if side == 2 {
			r.add(k, middle)
		}
		if has[side] {
			r.add(k+step, -g)
		}
	}
	r.end()
}

// NeumannRight is NormalVector(n, seed) less its mean: a right side that
// Neumann2D can meet up to rounding.
func NeumannRight(n int, seed uint64) []float64 {
	b := NormalVector(n, seed)
	mean := 0.0
	for _, v := range b {
		mean += v
	}
	mean /= float64(n)
	for i := range b {
		b[i] -= mean
	}
	return b
}

// FewEigenvalues is the n×n diagonal matrix with count eigenvalues from low to
// high, evenly spaced in their logarithm, in turn: GMRES needs count steps.
func FewEigenvalues(n, count int, low, high float64) *csr.Matrix {
	values, d := make([]float64, count), make([]float64, n)
	for k := range values {
		share := float64(k) / float64(count-1)
		values[k] = low * fixed.Exp(share*fixed.Log(high/low))
	}
	for i := range d {
		d[i] = values[i%count]
	}
	return Diagonal(d...)
}

// ProblemA is −Δu + (40, 20, 10)·∇u = 1 on the unit cube, u = 0 around, central
// differences on m³ inner nodes, times h²: a friendly problem of any size.
func ProblemA(m int) (a *csr.Matrix, b []float64) {
	h := 1 / float64(m+1)
	return ConvectionDiffusion3D(m, [3]float64{40, 20, 10}, Central), constant(m*m*m, h*h)
}

func constant(n int, v float64) []float64 {
	b := make([]float64, n)
	for i := range b {
		b[i] = v
	}
	return b
}

// ProblemB is −∇·(κ∇u) + v·∇u = 1 on the unit cube, u = 0 around, times h² on
// m³ inner nodes: κ = 10^U(−3, 3) on blocks of 8³ nodes, harmonic means between
// nodes, v = 200·(sin πx·cos πy, −cos πx·sin πy, 0), upwind. Rows differ by six
// decades: a small scaled residual need not be small in the units of b.
func ProblemB(m int, seed uint64) (a *csr.Matrix, b []float64) {
	h, n := 1/float64(m+1), m*m*m
	s, blocks := fixed.NewStream(seed, streamBlocks), (m+7)/8
	kappa := make([]float64, blocks*blocks*blocks)
	for k := range kappa {
		kappa[k] = s.PowerOfTen(k, -3, 3)
	}
	at := func(p [3]int) float64 { return kappa[(p[0]/8*blocks+p[1]/8)*blocks+p[2]/8] }
	stride := []int{m * m, m, 1}
	r := newRows(n, n, 7*n)
	for k := range n {
		p := [3]int{k / (m * m), k / m % m, k % m}
		x, y := float64(p[0]+1)*h, float64(p[1]+1)*h
		v := [3]float64{200 * fixed.SinPi(x) * fixed.CosPi(y), -200 * fixed.CosPi(x) * fixed.SinPi(y), 0}
		var low, up [3]float64
		middle := 0.0
		for d := range 3 {
			own := at(p)
			low[d], up[d] = own, own
			if q := p; p[d] > 0 {
				q[d]--
				low[d] = harmonic(own, at(q))
			}
			if q := p; p[d] < m-1 {
				q[d]++
				up[d] = harmonic(own, at(q))
			}
			low[d] += float64(math.Max(v[d], 0) * h)
			up[d] += float64(math.Max(-v[d], 0) * h)
			middle += low[d] + up[d]
			if p[d] == 0 {
				low[d] = 0
			}
			if p[d] == m-1 {
				up[d] = 0
			}
		}
		starRow(r, k, stride, low[:], middle, up[:])
	}
	return r.m, constant(n, h*h)
}

// FlowTrap is a confined flow grid of m×m nodes, unit cells: conductance g
// between nodes, head 50 along the west edge and 40 along the east edge, no flow
// elsewhere. penalty 0 writes the fixed heads as rows 1·h = 50 and 1·h = 40 of
// their own; a penalty P > 0 adds P and P·50, P·40 to the balances instead. With
// g = 1e-9 and identity rows, or with P = 1e12 and g = 1, the vector with every
// inner head zero has a plain relative residual of 1e-9 or 1e-12 and is as wrong
// as can be; the scaled residual sees it.
func FlowTrap(m int, g, penalty float64) (a *csr.Matrix, b []float64) {
	n := m * m
	r, b := newRows(n, n, 5*n), make([]float64, n)
	for i := range m {
		for j := range m {
			k := i*m + j
			head, held := 50-float64(10*(i/(m-1))), i == 0 || i == m-1
			if held && penalty == 0 {
				r.add(k, 1)
				r.end()
				b[k] = head
				continue
			}
			has := [4]bool{i > 0, j > 0, j < m-1, i < m-1}
			middle := 0.0
			for _, h := range has {
				if h {
					middle += g
				}
			}
			if held {
				middle += penalty
				b[k] = penalty * head
			}
			gridRow(r, k, m, g, middle, has)
		}
	}
	return r.m, b
}

// TrapExact is the true answer of FlowTrap: heads fall evenly from west to east.
func TrapExact(m int, g, penalty float64) []float64 {
	x := make([]float64, m*m)
	// flow a row: from 50 through 1/P, m − 1 links and 1/P again to 40
	ends := 0.0
	if penalty > 0 {
		ends = 1 / penalty
	}
	flow := 10 / (2*ends + float64(m-1)/g)
	for k := range x {
		x[k] = 50 - float64(flow*(ends+float64(k/m)/g))
	}
	return x
}
