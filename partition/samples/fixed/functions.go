package fixed

import "math"

const (
	ln2Hi = 6.93147180369123816490e-01 // ln 2 with 33 bits: k·ln2Hi is exact for |k| < 2²⁰
	ln2Lo = 1.90821492927058770002e-10 // ln 2 − ln2Hi
)

// Exp is eˣ. Below about −745 it is 0, above about 709 +Inf; NaN gives NaN.
// eˣ = 2ᵏ·eʳ with |r| ≤ ln 2/2 and the Taylor polynomial of degree 14.
func Exp(x float64) float64 {
	switch {
	case x != x:
		return x
	case x > 710:
		return math.Inf(1)
	case x < -746:
		return 0
	}
	k := math.Floor(float64(x*math.Log2E) + 0.5)
	r := x - float64(k*ln2Hi)
	r -= float64(k * ln2Lo)
	p := 1.0
	for n := 14; n >= 1; n-- { // Horner: 1 + r/n·(…)
		p = 1 + float64(r*p)/float64(n)
	}
	return math.Ldexp(p, int(k))
}

// Exp10 is 10ˣ, within x·2⁻⁵² relatively of the true power.
func Exp10(x float64) float64 { return Exp(float64(x * math.Ln10)) }

// Log is ln x; x > 0 and finite, anything else gives NaN.
// x = 2ᵉ·m, √½ ≤ m < √2, ln m = 2·(s + s³/3 + s⁵/5 + …), s = (m − 1)/(m + 1).
func Log(x float64) float64 {
	if !(x > 0) || math.IsInf(x, 1) {
		return math.NaN()
	}
	m, e := math.Frexp(x)
	if m < math.Sqrt2/2 {
		m, e = 2*m, e-1
	}
	s := (m - 1) / (m + 1)
	q := float64(s * s)
	p := 0.0
	for n := 25; n >= 3; n -= 2 { // s² ≤ 0.0295: the next term is below 2⁻⁵⁸
		p = float64(q * (1/float64(n) + p))
	}
	ln := 2 * (s + float64(s*p))
	return float64(float64(e)*ln2Hi) + (float64(float64(e)*ln2Lo) + ln)
}

// SinPi is sin(π·x) for |x| < 2⁵¹, exact at the multiples of ½.
func SinPi(x float64) float64 { return turn(x, 0) }

// CosPi is cos(π·x) for |x| < 2⁵¹, exact at the multiples of ½.
func CosPi(x float64) float64 { return turn(x, 1) }

// turn is sin(π·(x + quarter/2)): x = k/2 + f with |f| ≤ ¼, exactly.
func turn(x float64, quarter int) float64 {
	k := math.Floor(float64(2*x) + 0.5)
	f := x - k/2
	switch (int(math.Mod(k, 4)) + quarter + 8) % 4 {
	case 0:
		return sinSmall(f)
	case 1:
		return cosSmall(f)
	case 2:
		return -sinSmall(f)
	}
	return -cosSmall(f)
}

// sinSmall is sin(π·f), |f| ≤ ¼, by the Taylor polynomial of degree 19.
func sinSmall(f float64) float64 {
	a := float64(math.Pi * f)
	q := float64(a * a)
	p := 1.0
	for n := 18; n >= 2; n -= 2 {
		p = 1 - float64(q*p)/float64(n*(n+1))
	}
	return float64(a * p)
}

// cosSmall is cos(π·f), |f| ≤ ¼, by the Taylor polynomial of degree 18.
func cosSmall(f float64) float64 {
	a := float64(math.Pi * f)
	q := float64(a * a)
	p := 1.0
	for n := 17; n >= 1; n -= 2 {
		p = 1 - float64(q*p)/float64(n*(n+1))
	}
	return p
}

// Normal is number i of a stream of independent standard normal numbers, by the
// transform of Box and Muller (1958) from the words 2i and 2i + 1 of s.
func (s Stream) Normal(i int) float64 {
	radius := math.Sqrt(-2 * Log(s.Uniform(2*i)))
	return float64(radius * CosPi(2*s.Uniform(2*i+1)))
}
