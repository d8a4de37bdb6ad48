// Package spacetest holds what tests of the iterative methods and of their
// spaces need: Simple, a slow and obvious method.Space on one global matrix,
// and Suite, the laws that every Space must keep.
//
// Rows are global and count from zero; dense matrices are column-major. Nothing
// here is fast, tiled or threaded, and nothing may be shared between goroutines.
package spacetest

import (
	"context"
	"errors"
	"math"

	"rowstead/coordinator/method"
	"rowstead/partition/csr"
)

// ErrReplay is what Try, Probe and Reduce answer in replay form, whose vectors
// are gone.
var ErrReplay = errors.New("spacetest: the basis is kept as replay")

// Problem is a system A·x = b with its scaling and preconditioner.
type Problem struct {
	Matrix      *csr.Matrix // square, in the units of the file; never written to
	RowExponent []int16     // D = 2^e by rows; nil: the identity
	Right       []float64
	Guess       []float64 // x to begin with; nil: zero
	// Apply sets dst = M⁻¹·src for the matrix D·A, or S·A·S when Symmetric; nil:
	// the identity. dst and src do not overlap.
	Apply func(dst, src []float64)
	// Symmetric selects conjugate gradients: D becomes S, by rows and columns.
	// Its exponents are RowExponent.
	Symmetric bool
}

// Simple is the obvious Space and ConjugateSpace over a Problem.
type Simple struct {
	p     Problem
	n     int
	d     []float64 // D or S, by rows
	x     []float64
	cycle method.Cycle
	basis [][]float64
	w     []float64 // D·r, then C·b_j
	try   []float64 // x_try of the last Try or Correct
	u, z  [][]float64
	uNew  [][]float64
	// conjugate gradients: t = S⁻¹·x, residual, M⁻¹·residual, direction, S·A·S·p
	t, cr, cz, cp, cq []float64
	// Products counts applications of A, residuals included.
	Products int
}

// New returns a Simple at x = Guess.
func New(p Problem) *Simple {
	n := p.Matrix.Rows
	s := &Simple{p: p, n: n, d: make([]float64, n), x: make([]float64, n)}
	for i := range s.d {
		s.d[i] = 1
		if p.RowExponent != nil {
			s.d[i] = math.Ldexp(1, int(p.RowExponent[i]))
		}
	}
	if p.Guess != nil {
		copy(s.x, p.Guess)
	}
	return s
}

// Rows is the number of unknowns.
func (s *Simple) Rows() int { return s.n }

// Solution is x; the slice is the space's own.
func (s *Simple) Solution() []float64 { return s.x }

// Basis returns b_j as it is kept; the slice is the space's own.
func (s *Simple) Basis(j int) []float64 { return s.basis[j] }

// product returns D·A·v.
func (s *Simple) product(v []float64) []float64 {
	s.Products++
	out := make([]float64, s.n)
	s.p.Matrix.Mul(out, v)
	for i := range out {
		out[i] *= s.d[i]
	}
	return out
}

// precondition returns M⁻¹·v in a slice of its own.
func (s *Simple) precondition(v []float64) []float64 {
	out := append([]float64(nil), v...)
	if s.p.Apply != nil {
		s.p.Apply(out, v)
	}
	return out
}

// Start implements method.Space.
func (s *Simple) Start(_ context.Context, c method.Cycle) (method.Residuals, error) {
	s.cycle, s.basis = c, nil
	res, r := s.residuals(s.x)
	s.w = r
	for i := range s.w {
		s.w[i] *= s.d[i]
	}
	return res, nil
}

// Advance implements method.Space. The loops follow the formulas of the Step.
func (s *Simple) Advance(_ context.Context, st method.Step) (method.Stepped, error) {
	b := append([]float64(nil), s.w...)
	for k, h := range st.H {
		axpy(b, -h, s.basis[st.Lo+k])
	}
	for i := range b {
		b[i] /= st.Norm
		if s.cycle.Form == method.Single {
			b[i] = float64(float32(b[i]))
		}
	}
	s.basis = append(s.basis, b)
	j := len(s.basis) - 1
	var out method.Stepped
	for i := max(0, j+1-s.cycle.Window); i <= j; i++ {
		out.Gram = append(out.Gram, dot(s.basis[i], b))
	}
	if !st.Product {
		return out, nil
	}
	s.w = s.product(s.precondition(b))
	for i := max(0, j+1-st.Dots); i <= j; i++ {
		out.Dots = append(out.Dots, dot(s.w, s.basis[i]))
	}
	out.WW = dot(s.w, s.w)
	if st.SketchW && s.cycle.SketchRows > 0 {
		out.SketchW, out.HoldW = s.sketch(s.cycle, s.w)
	}
	return out, nil
}

// Sketches implements method.Space.
func (s *Simple) Sketches(_ context.Context, from, to int) (sb, hold []float64, err error) {
	for i := from; i < to; i++ {
		c, h := s.sketch(s.cycle, s.basis[i])
		sb, hold = append(sb, c...), append(hold, h...)
	}
	return sb, hold, nil
}

// Reduce implements method.Space.
func (s *Simple) Reduce(_ context.Context, h []float64) ([]float64, float64, error) {
	if s.cycle.Form == method.Replay {
		return nil, 0, ErrReplay
	}
	for i, hi := range h {
		axpy(s.w, -hi, s.basis[i])
	}
	dots := make([]float64, len(s.basis))
	for i, b := range s.basis {
		dots[i] = dot(s.w, b)
	}
	return dots, dot(s.w, s.w), nil
}

// axpy sets y ← y + a·x.
func axpy(y []float64, a float64, x []float64) {
	for i := range y {
		y[i] += a * x[i]
	}
}

// dot returns x·y with the rounding errors of the sum carried along.
func dot(x, y []float64) float64 {
	var acc compensated
	for i := range x {
		acc.addProduct(x[i], y[i])
	}
	return acc.value()
}
