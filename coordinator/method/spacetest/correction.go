package spacetest

import (
	"context"

	"rowstead/coordinator/method"
)

// update returns Z·YU + M⁻¹·B·Y.
func (s *Simple) update(c method.Correction) []float64 {
	by := make([]float64, s.n)
	for i, y := range c.Y {
		axpy(by, y, s.basis[i])
	}
	v := s.precondition(by)
	for i, y := range c.YU {
		axpy(v, y, s.z[i])
	}
	return v
}

// Try implements method.Space.
func (s *Simple) Try(_ context.Context, c method.Correction) (method.Residuals, error) {
	if s.cycle.Form == method.Replay {
		return method.Residuals{}, ErrReplay
	}
	return s.tryCorrection(c), nil
}

func (s *Simple) tryCorrection(c method.Correction) method.Residuals {
	s.try = append([]float64(nil), s.x...)
	axpy(s.try, 1, s.update(c))
	res, _ := s.residuals(s.try)
	return res
}

// Correct implements method.Space. In replay form it counts the products that
// the recurrence would spend, though it kept the vectors.
func (s *Simple) Correct(_ context.Context, c method.Correction) (method.Residuals, int, error) {
	res := s.tryCorrection(c)
	rows := len(c.YU) + len(c.Y)
	if c.T != nil {
		s.uNew = nil
		for q := range c.Directions {
			col := c.T[q*rows : (q+1)*rows]
			v := make([]float64, s.n)
			for i := range c.YU {
				axpy(v, col[i], s.u[i])
			}
			for i := range c.Y {
				axpy(v, col[len(c.YU)+i], s.basis[i])
			}
			s.uNew = append(s.uNew, v)
		}
	}
	products := 0
	if s.cycle.Form == method.Replay {
		products = max(0, len(c.Y)-1)
	}
	return res, products, nil
}

// Keep implements method.Space.
func (s *Simple) Keep(context.Context) error {
	copy(s.x, s.try)
	return nil
}

// Recycle implements method.Space. Without a new U it sketches the present one
// again.
func (s *Simple) Recycle(_ context.Context, next method.Cycle) (method.Recycled, error) {
	if s.uNew != nil {
		s.u, s.uNew = s.uNew, nil
	}
	s.z = nil
	var out method.Recycled
	for _, u := range s.u {
		z := s.precondition(u)
		s.z = append(s.z, z)
		su, _ := s.sketch(next, u)
		saz, hold := s.sketch(next, s.product(z))
		out.SU = append(out.SU, su...)
		out.SAZ = append(out.SAZ, saz...)
		out.HoldAZ = append(out.HoldAZ, hold...)
	}
	return out, nil
}

// Forget implements method.Space.
func (s *Simple) Forget(context.Context) error {
	s.u, s.uNew, s.z = nil, nil, nil
	return nil
}

// Probe implements method.Space.
func (s *Simple) Probe(_ context.Context, c method.Correction) (v, av float64, err error) {
	if s.cycle.Form == method.Replay && len(c.Y) > 0 {
		return 0, 0, ErrReplay
	}
	u := s.update(c)
	return norm(u), norm(s.product(u)), nil
}
