package method

import "math"

// TrueResidual is ‖b − A·x‖/‖b‖ in the file's own units; with b = 0 it is
// ‖A·x‖ itself, so that only an exact x = 0 meets a tolerance.
func (r Residuals) TrueResidual() float64 { return relative(r.True, r.Right) }

// ScaledResidual is the same after every row is divided by its largest entry.
func (r Residuals) ScaledResidual() float64 { return relative(r.Scaled, r.ScaledRight) }

// BackwardError is ‖b − A·x‖∞ / (‖A‖∞·‖x‖∞ + ‖b‖∞), 0 for 0/0.
func (r Residuals) BackwardError() float64 {
	if r.ResidualMax == 0 {
		return 0
	}
	return r.ResidualMax / (r.MatrixMax*r.SolutionMax + r.RightMax)
}

func relative(residual, right float64) float64 {
	if right == 0 {
		return residual
	}
	return residual / right
}

// Met is the verdict: both recomputed residuals at or below the tolerance.
func (r Residuals) Met(tolerance float64) bool {
	return r.Finite && r.TrueResidual() <= tolerance && r.ScaledResidual() <= tolerance
}

// excess is how many times the worse of the two residuals exceeds the tolerance.
func (r Residuals) excess(tolerance float64) float64 {
	return max(r.TrueResidual(), r.ScaledResidual()) / tolerance
}

// atFloor says that every residual still above the tolerance is within factor
// of what rounding alone leaves.
func (r Residuals) atFloor(tolerance, factor float64) bool {
	failing := false
	for _, c := range [...]struct{ value, floor float64 }{
		{r.TrueResidual(), relative(r.TrueFloor, r.Right)},
		{r.ScaledResidual(), relative(r.ScaledFloor, r.ScaledRight)},
	} {
		if c.value <= tolerance {
			continue
		}
		failing = true
		if c.value > factor*c.floor {
			return false
		}
	}
	return failing
}

// forwardError turns ‖D·r‖, ‖x‖ and a lower bound of ‖(D·A)⁻¹‖ into an estimate
// of ‖x − x̂‖/‖x‖: at least the rounding of x itself.
func forwardError(r Residuals, inverseNorm float64) float64 {
	if r.Solution == 0 || inverseNorm == 0 {
		return 0
	}
	const epsilon = 0x1p-52
	return min(1, max(inverseNorm*r.Inner/r.Solution, epsilon))
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
