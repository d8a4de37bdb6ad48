package coordinator

import (
	"fmt"
	"math"

	"rowstead/partition/csr"
)

// contradiction says which evidence, if any, shows that no x can bring the
// residual of b to the tolerance: a row without entries against something on
// the right, or columns that all sum to zero against a right side that does
// not, for then 1ᵀ·(b − A·x) = 1ᵀ·b whatever x is, and ‖b − A·x‖ ≥ |1ᵀ·b|/√n.
func (s *system) contradiction(b []float64, tolerance float64) string {
	if rows := s.emptyAgainst(b); len(rows) > 0 {
		return fmt.Sprintf("%s: no entry on the left, but something on the right; look at what was meant to be there", rowsText(rows))
	}
	if !s.balanced {
		return ""
	}
	sum, size := 0.0, 0.0
	for _, v := range b {
		sum += v
		size = math.Hypot(size, v)
	}
	if math.Abs(sum) <= tolerance*size*math.Sqrt(float64(len(b))) {
		return ""
	}
	return fmt.Sprintf("every column sums to zero, so the right side must too, but it sums to %.3g; a fixed value (a head, a temperature, a support) is missing, or the sources do not balance", sum)
}

// solvable is b itself, or where a contradiction is certain the part of b that
// some x can meet: nothing in the empty rows, or b less its mean.
func (s *system) solvable(b []float64, tolerance float64) []float64 {
	if s.contradiction(b, tolerance) == "" {
		return b
	}
	out := append([]float64(nil), b...)
	if rows := s.emptyAgainst(b); len(rows) > 0 {
		for _, i := range s.empty {
			out[i] = 0
		}
		return out
	}
	mean := 0.0
	for _, v := range b {
		mean += v / float64(len(b))
	}
	for i := range out {
		out[i] -= mean
	}
	return out
}

// tellUnique records where x is not the only answer: when rows and columns sum
// to zero, constants can be added to it, as to heads without a fixed one.
func (r *runner) tellUnique() {
	if r.sys.balanced && r.sys.free {
		r.choose("answer", "one of many", "every row and every column sums to zero: x is fixed only up to a constant; fix one value to make it the only one", false)
	}
}

// columnsBalance says whether every column of a sums to zero up to rounding,
// as the balances of a closed system do.
func columnsBalance(a *csr.Matrix) bool {
	sum, size := make([]float64, a.Cols), make([]float64, a.Cols)
	for k, c := range a.Col {
		sum[c] += a.Val[k]
		size[c] += math.Abs(a.Val[k])
	}
	// Entries carry an ulp of rounding each, and the sum one an addition.
	const ulps = 64 * 0x1p-53
	for j, s := range sum {
		if math.Abs(s) > ulps*size[j] {
			return false
		}
	}
	return len(a.Col) > 0
}
