package spacetest

import "context"

// symmetricProduct returns S·A·S·v.
func (s *Simple) symmetricProduct(v []float64) []float64 {
	sv := append([]float64(nil), v...)
	for i := range sv {
		sv[i] *= s.d[i]
	}
	return s.product(sv)
}

// StartConjugate implements method.ConjugateSpace.
func (s *Simple) StartConjugate(context.Context) (rr, rz float64, err error) {
	_, s.cr = s.residuals(s.x)
	s.t = append([]float64(nil), s.x...)
	for i := range s.cr {
		s.cr[i] *= s.d[i]
		s.t[i] /= s.d[i]
	}
	s.cz = s.precondition(s.cr)
	s.cp = make([]float64, s.n)
	return dot(s.cr, s.cr), dot(s.cr, s.cz), nil
}

// Direct implements method.ConjugateSpace.
func (s *Simple) Direct(_ context.Context, beta float64) (float64, error) {
	for i := range s.cp {
		s.cp[i] = s.cz[i] + beta*s.cp[i]
	}
	s.cq = s.symmetricProduct(s.cp)
	return dot(s.cp, s.cq), nil
}

// Move implements method.ConjugateSpace.
func (s *Simple) Move(_ context.Context, alpha float64) (rr, rz float64, err error) {
	axpy(s.t, alpha, s.cp)
	axpy(s.cr, -alpha, s.cq)
	for i := range s.x {
		s.x[i] = s.t[i] * s.d[i]
	}
	s.cz = s.precondition(s.cr)
	return dot(s.cr, s.cr), dot(s.cr, s.cz), nil
}
