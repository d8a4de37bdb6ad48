package audit

import "math"

// wide is f·2^e, not negative, with f in [½, 1) or 0: a float64 that cannot
// leave its range.
type wide struct {
	f float64
	e int
}

// widen returns |v|·2^e for a finite v.
func widen(v float64, e int) wide {
	f, k := math.Frexp(math.Abs(v))
	if f == 0 {
		return wide{}
	}
	return wide{f, k + e}
}

// float returns a as a float64, the largest where it is beyond.
func (a wide) float() float64 {
	if a.e > 2000 {
		return math.MaxFloat64
	}
	return min(math.Ldexp(a.f, a.e), math.MaxFloat64)
}

func (a wide) times(b wide) wide { return widen(a.f*b.f, a.e+b.e) }

// over returns a/b, b ≠ 0.
func (a wide) over(b wide) wide { return widen(a.f/b.f, a.e-b.e) }

func (a wide) plus(b wide) wide {
	switch {
	case a.f == 0:
		return b
	case b.f == 0:
		return a
	case a.e < b.e:
		a, b = b, a
	}
	return widen(a.f+math.Ldexp(b.f, b.e-a.e), a.e)
}

func (a wide) larger(b wide) wide {
	if a.f == 0 || (b.f != 0 && (b.e > a.e || (b.e == a.e && b.f > a.f))) {
		return b
	}
	return a
}

// squares is (sum + low)·2^(2e), a sum of squares with the rounding of its
// additions carried along (Neumaier, 1974), so that millions of terms keep 15
// digits.
type squares struct {
	sum, low float64
	e        int
}

func (q *squares) add(v wide) {
	if v.f == 0 {
		return
	}
	if q.sum == 0 || v.e > q.e {
		q.sum = math.Ldexp(q.sum, 2*(q.e-v.e))
		q.low = math.Ldexp(q.low, 2*(q.e-v.e))
		q.e = v.e
	}
	d := math.Ldexp(v.f, v.e-q.e)
	d = float64(d * d)
	t := q.sum + d
	if q.sum >= d {
		q.low += (q.sum - t) + d
	} else {
		q.low += (d - t) + q.sum
	}
	q.sum = t
}

// norm returns the root of the sum.
func (q *squares) norm() wide { return widen(math.Sqrt(q.sum+q.low), q.e) }

func normOf(x []float64) wide {
	var q squares
	for _, v := range x {
		q.add(widen(v, 0))
	}
	return q.norm()
}

func maxOf(x []float64) float64 {
	largest := 0.0
	for _, v := range x {
		largest = max(largest, math.Abs(v))
	}
	return largest
}
