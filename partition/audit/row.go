package audit

import "math"

// Products of tame numbers and their rounding errors neither overflow nor
// become subnormal, even many of them.
const (
	tameLow  = 0x1p-400
	tameHigh = 0x1p+400
)

func tame(v float64) bool {
	a := math.Abs(v)
	return a == 0 || (a >= tameLow && a <= tameHigh)
}

func allTame(x []float64) bool {
	for _, v := range x {
		if !tame(v) {
			return false
		}
	}
	return true
}

// row is one row of A: ascending columns, duplicates summed.
type row struct {
	cols    []int32
	vals    []float64
	largest float64 // |entry|
	tame    bool
}

func newRow(cols []int32, vals []float64) row {
	r := row{cols: cols, vals: vals, tame: true}
	for _, v := range vals {
		r.largest = max(r.largest, math.Abs(v))
		r.tame = r.tame && tame(v)
	}
	return r
}

// divisor is what the scaled residual divides the row by.
func (r *row) divisor() wide {
	if r.largest == 0 {
		return widen(1, 0)
	}
	return widen(r.largest, 0)
}

// sum is Σ |a|.
func (r *row) sum() wide {
	total := 0.0
	if r.tame {
		for _, v := range r.vals {
			total += math.Abs(v)
		}
		return widen(total, 0)
	}
	_, e := math.Frexp(r.largest)
	for _, v := range r.vals {
		total += math.Abs(math.Ldexp(v, -e)) // at most 1 each
	}
	return widen(total, e)
}

// residual returns b − Σ a·x, rounded once from a double-double sum, and
// |b| + Σ |a·x|, both to be multiplied by 2^e. xTame says that all of x is tame.
//
// The error of the first is at most about 2⁻¹⁰⁴ a term of the second. TwoSum
// and TwoProduct after Dekker; see Ogita, Rump and Oishi, "Accurate sum and dot
// product", 2005.
func (r *row) residual(x []float64, xTame bool, b float64) (value, size float64, e int) {
	if !r.tame || !xTame || !tame(b) {
		return r.wildResidual(x, b)
	}
	sum := doubled64{hi: b}
	size = math.Abs(b)
	for k, c := range r.cols {
		size += sum.subtract(r.vals[k], x[c])
	}
	return sum.hi, size, 0
}

// wildResidual does the same with every term divided by 2^e, the size of the
// largest. What is lost of terms 300 decades below it is far less than the
// error that residual states.
func (r *row) wildResidual(x []float64, b float64) (value, size float64, e int) {
	e = math.MinInt32
	right, rightE := math.Frexp(b)
	if right != 0 {
		e = rightE
	}
	for k, c := range r.cols {
		if r.vals[k] != 0 && x[c] != 0 {
			_, ae := math.Frexp(r.vals[k])
			_, xe := math.Frexp(x[c])
			e = max(e, ae+xe)
		}
	}
	if e == math.MinInt32 {
		return 0, 0, 0 // every term is zero
	}
	sum := doubled64{hi: math.Ldexp(right, rightE-e)}
	size = math.Abs(sum.hi)
	for k, c := range r.cols {
		a, ae := math.Frexp(r.vals[k])
		v, xe := math.Frexp(x[c])
		if a == 0 || v == 0 {
			continue
		}
		size += sum.subtract(math.Ldexp(a, ae+xe-e), v)
	}
	return sum.hi, size, e
}

// doubled64 is hi + lo with hi = hi + lo in float64.
type doubled64 struct{ hi, lo float64 }

// subtract sets s ← s − a·x and returns |a·x|.
func (s *doubled64) subtract(a, x float64) float64 {
	p := float64(a * x)
	low := math.FMA(a, x, -p) // a·x = p + low
	// hi − p = t + u
	t := s.hi - p
	v := t - s.hi
	u := (s.hi - (t - v)) - (p + v)
	u += s.lo - low
	s.hi = t + u
	s.lo = u - (s.hi - t)
	return math.Abs(p)
}
