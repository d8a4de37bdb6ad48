package spacetest

import (
	"context"
	"math"
	"sort"

	"rowstead/coordinator/method"
)

// compensated is a double-double sum: value = hi + lo. Dekker's and Knuth's
// error-free transformations; Ogita, Rump and Oishi, "Accurate sum and dot
// product".
type compensated struct{ hi, lo float64 }

func (c *compensated) add(v float64) {
	s := c.hi + v
	t := s - c.hi
	c.lo += (c.hi - (s - t)) + (v - t)
	c.hi = s
}

func (c *compensated) addProduct(a, b float64) {
	p := a * b
	c.add(p)
	c.lo += math.FMA(a, b, -p)
}

// value rounds the sum; an overflow of hi leaves no meaning in lo.
func (c *compensated) value() float64 {
	if math.IsInf(c.hi, 0) {
		return c.hi
	}
	return c.hi + c.lo
}

// norm returns ‖v‖₂ without overflow or underflow.
func norm(v []float64) float64 {
	big := maxAbs(v)
	if big == 0 || math.IsInf(big, 0) || math.IsNaN(big) {
		return big
	}
	_, e := math.Frexp(big)
	sum := 0.0
	for _, vi := range v {
		q := math.Ldexp(vi, -e)
		sum += q * q
	}
	return math.Ldexp(math.Sqrt(sum), e)
}

// maxAbs returns ‖v‖∞, NaN when v holds one.
func maxAbs(v []float64) float64 {
	big := 0.0
	for _, vi := range v {
		big = math.Max(big, math.Abs(vi))
	}
	return big
}

// residuals returns what r = b − A·x says, and r in the units of the file.
func (s *Simple) residuals(x []float64) (method.Residuals, []float64) {
	s.Products++
	n := s.n
	r, floor := make([]float64, n), make([]float64, n)
	out := method.Residuals{Finite: true}
	for i := range n {
		r[i], floor[i] = s.residualRow(i, x)
		out.Finite = out.Finite && finite(r[i]) && finite(x[i])
	}
	var entry []float64
	entry, out.MatrixMax, out.InnerMatrix = s.matrixNorms()
	scale := func(v []float64, by func(i int) float64) float64 {
		w := make([]float64, n)
		for i := range w {
			w[i] = v[i] * by(i)
		}
		return norm(w)
	}
	inner := func(i int) float64 { return s.d[i] }
	rows := func(i int) float64 { return 1 / entry[i] }
	out.Inner, out.InnerRight = scale(r, inner), scale(s.p.Right, inner)
	out.True, out.Right = norm(r), norm(s.p.Right)
	out.Scaled, out.ScaledRight = scale(r, rows), scale(s.p.Right, rows)
	out.TrueFloor, out.ScaledFloor = epsilon*norm(floor), epsilon*scale(floor, rows)
	out.Worst = worstRows(r, floor)
	if len(out.Worst) > 0 {
		out.RowWise = out.Worst[0].Error
	}
	out.ResidualMax, out.RightMax = maxAbs(r), maxAbs(s.p.Right)
	out.SolutionMax, out.Solution = maxAbs(x), norm(x)
	return out, r
}

// residualRow returns rᵢ and (|A|·|x| + |b|)ᵢ.
func (s *Simple) residualRow(i int, x []float64) (r, floor float64) {
	cols, vals := s.p.Matrix.Row(i)
	acc := compensated{hi: s.p.Right[i]}
	floor = math.Abs(s.p.Right[i])
	for k, c := range cols {
		acc.addProduct(-vals[k], x[c])
		floor += math.Abs(vals[k]) * math.Abs(x[c])
	}
	return acc.value(), floor
}

// matrixNorms returns the largest |entry| of every row, 1 for an empty one, ‖A‖∞
// and ‖D·A‖_F.
func (s *Simple) matrixNorms() (entry []float64, largest, frobenius float64) {
	entry = make([]float64, s.n)
	var all []float64
	for i := range s.n {
		cols, vals := s.p.Matrix.Row(i)
		sum := 0.0
		for k, v := range vals {
			sum += math.Abs(v)
			v *= s.d[i]
			if s.p.Symmetric {
				v *= s.d[cols[k]]
			}
			all = append(all, v)
		}
		largest = math.Max(largest, sum)
		if entry[i] = maxAbs(vals); entry[i] == 0 {
			entry[i] = 1
		}
	}
	return entry, largest, norm(all)
}

const epsilon = 0x1p-52

// worstRows returns the at most 8 rows with the largest |r|ᵢ/floorᵢ above zero,
// worst first, equal ones by row; what is not a number counts as infinite.
func worstRows(r, floor []float64) []method.RowError {
	var all []method.RowError
	for i := range r {
		e := math.Abs(r[i]) / floor[i]
		switch {
		case r[i] == 0:
			continue
		case !finite(r[i]) || !finite(e):
			e = math.Inf(1)
		}
		all = append(all, method.RowError{Row: i, Error: e})
	}
	sort.SliceStable(all, func(a, b int) bool { return all[a].Error > all[b].Error })
	return all[:min(8, len(all))]
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// Check implements method.Space and method.ConjugateSpace.
func (s *Simple) Check(context.Context) (method.Residuals, error) {
	res, _ := s.residuals(s.x)
	return res, nil
}

// Gradient implements method.Space.
func (s *Simple) Gradient(context.Context) (gradient, residual float64, err error) {
	_, r := s.residuals(s.x)
	for i := range r {
		r[i] *= s.d[i]
	}
	residual = norm(r)
	for i := range r {
		r[i] *= s.d[i]
	}
	g := make([]float64, s.n)
	s.p.Matrix.MulT(g, r)
	return norm(g), residual, nil
}
