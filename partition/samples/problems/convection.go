package problems

import (
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// Scheme is the way in which a convective term is made discrete.
type Scheme int

const (
	// Upwind takes the one-sided difference against the flow: M-matrices.
	Upwind Scheme = iota
	// Central takes the central difference, which at large cell numbers v·h/2
	// leaves the diagonal weak: far from symmetric, far from normal.
	Central
)

// ConvectionDiffusion2D is −Δu + (vx, vy)·∇u on the unit square, u = 0 around,
// on m×m inner nodes with h = 1/(m+1); rows multiplied by h². The first axis is
// x. Five entries a row.
func ConvectionDiffusion2D(m int, vx, vy float64, s Scheme) *csr.Matrix {
	return flow2D(m, s, func(_, _ float64) (float64, float64) { return vx, vy })
}

// Recirculating2D is ConvectionDiffusion2D with the closed flow
// v·(sin πx·cos πy, −cos πx·sin πy).
func Recirculating2D(m int, v float64, s Scheme) *csr.Matrix {
	return flow2D(m, s, func(x, y float64) (float64, float64) {
		return v * fixed.SinPi(x) * fixed.CosPi(y), -v * fixed.CosPi(x) * fixed.SinPi(y)
	})
}

// Poisson2D is the five-point −Δ on m×m inner nodes of the unit square, times
// h²: 4 on the diagonal up to rounding. Symmetric positive definite.
func Poisson2D(m int) *csr.Matrix { return ConvectionDiffusion2D(m, 0, 0, Upwind) }

// Helmholtz2D is Poisson2D less shift on the diagonal: shift = (k·h)² for the
// wave number k. Symmetric, indefinite for shift above 2·(π·h)².
func Helmholtz2D(m int, shift float64) *csr.Matrix { return shiftDiagonal(Poisson2D(m), shift) }

// arm returns the entries to the lower neighbour, the node itself and the upper
// neighbour of −u″ + v·u′ at spacing h.
func arm(v, h float64, s Scheme) (lower, middle, upper float64) {
	q := h * h
	if s == Central {
		c := v / (2 * h)
		return -1/q - c, 2 / q, -1/q + c
	}
	return -1/q - math.Max(v, 0)/h, 2/q + math.Abs(v)/h, -1/q + math.Min(v, 0)/h
}

func flow2D(m int, s Scheme, flow func(x, y float64) (vx, vy float64)) *csr.Matrix {
	h, n := 1/float64(m+1), m*m
	r := newRows(n, n, 5*n)
	for i := range m {
		for j := range m {
			vx, vy := flow(float64(i+1)*h, float64(j+1)*h)
			west, _, east := arm(vx, h, s)
			south, _, north := arm(vy, h, s)
			middle := 4 / (h * h)
			if s == Upwind {
				middle += (math.Abs(vx) + math.Abs(vy)) / h
			}
			k := i*m + j
			if i > 0 {
				r.add(k-m, west*h*h)
			}
			if j > 0 {
				r.add(k-1, south*h*h)
			}
			r.add(k, middle*h*h)
			if j < m-1 {
				r.add(k+1, north*h*h)
			}
			if i < m-1 {
				r.add(k+m, east*h*h)
			}
			r.end()
		}
	}
	return r.m
}

// ConvectionDiffusion3D is −Δu + v·∇u on the unit cube, u = 0 around, on m³
// inner nodes with h = 1/(m+1); rows multiplied by h². Seven entries a row.
func ConvectionDiffusion3D(m int, v [3]float64, s Scheme) *csr.Matrix {
	h, n := 1/float64(m+1), m*m*m
	var low, mid, up [3]float64
	for d := range 3 {
		low[d], mid[d], up[d] = arm(v[d], h, s)
	}
	middle := (mid[0] + mid[1] + mid[2]) * h * h
	r := newRows(n, n, 7*n)
	stride := [3]int{m * m, m, 1}
	for k := range n {
		at := [3]int{k / (m * m), k / m % m, k % m}
		for d := range 3 {
			if at[d] > 0 {
				r.add(k-stride[d], low[d]*h*h)
			}
		}
		r.add(k, middle)
		for d := 2; d >= 0; d-- {
			if at[d] < m-1 {
				r.add(k+stride[d], up[d]*h*h)
			}
		}
		r.end()
	}
	return r.m
}
