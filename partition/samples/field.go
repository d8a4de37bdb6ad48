package samples

import (
	"math"

	"rowstead/partition/samples/fixed"
)

// field is a smooth random function of the plane: independent standard normal
// numbers on a lattice of the given spacing (metres), joined by quadratic
// B-splines and divided by √Σ weight², so that its value at every point is
// standard normal. Values two spacings apart are nearly independent. It depends
// on the place, never on a grid.
type field struct {
	spacing float64
	nx, ny  int
	at      []float64 // lattice value (i, j) at i·ny + j; the lattice starts one spacing before the origin
}

// newField covers [0, width]×[0, height].
func newField(width, height, spacing float64, s fixed.Stream) *field {
	f := &field{spacing: spacing, nx: int(width/spacing) + 4, ny: int(height/spacing) + 4}
	f.at = make([]float64, f.nx*f.ny)
	for k := range f.at {
		f.at[k] = s.Normal(k)
	}
	return f
}

// value is the function at (x, y), which must lie in the covered rectangle.
func (f *field) value(x, y float64) float64 {
	i, wx := spline(x / f.spacing)
	j, wy := spline(y / f.spacing)
	sum := 0.0
	for a := range 3 {
		row := f.at[(i+a)*f.ny+j:]
		part := float64(wy[0]*row[0]) + float64(wy[1]*row[1]) + float64(wy[2]*row[2])
		sum += float64(wx[a] * part)
	}
	return sum / math.Sqrt(float64(square(wx)*square(wy)))
}

// spline returns the cell of t ≥ 0 and the quadratic B-spline weights of the
// three lattice points around it; they sum to 1.
func spline(t float64) (cell int, w [3]float64) {
	whole := math.Floor(t)
	u := t - whole
	v := 1 - u
	return int(whole), [3]float64{0.5 * float64(v*v), 0.5 + float64(u*v), 0.5 * float64(u*u)}
}

func square(w [3]float64) float64 {
	return float64(w[0]*w[0]) + float64(w[1]*w[1]) + float64(w[2]*w[2])
}

// overlap is the length that the intervals [a, b] and [c, d] share.
func overlap(a, b, c, d float64) float64 { return max(0, min(b, d)-max(a, c)) }

// cube is the largest whole m with m³ ≤ n.
func cube(n int) int {
	m := 0
	for (m+1)*(m+1)*(m+1) <= n {
		m++
	}
	return m
}

// nearest is x rounded to a whole number, at least 1.
func nearest(x float64) int { return max(1, int(x+0.5)) }
