package coordinator

import (
	"fmt"
	"math"
)

// A right side of 1e-300 in rows of 1e300 would vanish when its rows are scaled,
// and pass for b = 0. So every right side is multiplied by a power of two that
// brings the largest entry of D·b near 1, and x by its inverse in the end.

// shiftOf is that power: the largest |b_i|·2^(e_i + shift) lies in [½, 1).
func shiftOf(b []float64, scale []int16) (shift int) {
	largest, found := 0, false
	for i, v := range b {
		if v == 0 {
			continue
		}
		if _, e := math.Frexp(v); !found || e+int(scale[i]) > largest {
			largest, found = e+int(scale[i]), true
		}
	}
	return -largest
}

// shifted is v·2^k and whether all of it that matters is exact.
func shifted(v []float64, k int) (out []float64, exact bool) {
	if k == 0 {
		return v, true
	}
	out, exact = make([]float64, len(v)), true
	top := math.MinInt
	for i, x := range v {
		out[i] = math.Ldexp(x, k)
		if _, e := math.Frexp(x); x != 0 {
			top = max(top, e)
		}
	}
	for i, x := range v {
		if _, e := math.Frexp(x); x != 0 && e-top >= immaterial && math.Ldexp(out[i], -k) != x {
			exact = false
		}
	}
	return out, exact
}

// immaterial is how small beside the largest a number must be, in the units of
// the file and in scaled rows, for its loss to change no residual.
const immaterial = -600 // as a power of two

// tooFarApart returns a row whose right side cannot be held beside the others
// in scaled rows, or -1.
func tooFarApart(b []float64, scale []int16, shift int) int {
	top := math.MinInt
	for _, v := range b {
		if _, e := math.Frexp(v); v != 0 {
			top = max(top, e)
		}
	}
	for i, v := range b {
		_, e := math.Frexp(v)
		if v == 0 || e-top < immaterial && e+int(scale[i])+shift < immaterial {
			continue
		}
		w := math.Ldexp(v, shift)
		if d := math.Ldexp(w, int(scale[i])); math.IsInf(w, 0) || math.Ldexp(d, -int(scale[i])) != w || math.Ldexp(w, -shift) != v {
			return i
		}
	}
	return -1
}

// apart refuses such a right side.
func (r *runner) apart(row int) error {
	return &InputError{fmt.Sprintf("%s, row %d: its coefficients and its right side lie too far from those of the other rows for 64-bit numbers; write the equations in units that are closer", r.job.Matrix, r.fileRow(row)+1)}
}

// reasonRange is why an answer can be right and yet not be written down.
const reasonRange = "the answer lies outside the range of 64-bit numbers"
