package small

// Triangle is an upper triangular matrix R of n×n, packed by columns: R_ij,
// i ≤ j, stands at j(j+1)/2 + i. So the leading block of any size is a prefix.
// Its methods work on the leading block of the length of the vector they get.
//
// Every method takes four columns at a time: the vector passes through the
// first cache and the triangle through memory once.
type Triangle struct {
	packed []float64
	n      int
}

// NewTriangle is the view of n(n+1)/2 packed numbers, which the caller keeps.
func NewTriangle(n int, packed []float64) Triangle {
	if len(packed) != n*(n+1)/2 {
		panic("small: NewTriangle needs n(n+1)/2 numbers")
	}
	return Triangle{packed, n}
}

// Size is n.
func (t Triangle) Size() int { return t.n }

// At is R_ij, zero beneath the diagonal.
func (t Triangle) At(i, j int) float64 {
	if i > j {
		return 0
	}
	return t.packed[j*(j+1)/2+i]
}

// Column is column j down to the diagonal, length j+1; a view.
func (t Triangle) Column(j int) []float64 {
	at := j * (j + 1) / 2
	return t.packed[at : at+j+1 : at+j+1]
}

// Leading is the leading n×n block, a view.
func (t Triangle) Leading(n int) Triangle { return Triangle{t.packed[:n*(n+1)/2], n} }

func (t Triangle) check(n int) {
	if n > t.n {
		panic("small: a vector longer than its triangle")
	}
}

// Solve replaces x by R⁻¹·x. A zero on the diagonal gives infinities or NaN.
func (t Triangle) Solve(x []float64) {
	t.check(len(x))
	j := len(x)
	for ; j%4 != 0; j-- { // columns above a multiple of four
		c := t.Column(j - 1)
		x[j-1] /= c[j-1]
		subtract(x[:j-1], c, x[j-1])
	}
	for ; j >= 4; j -= 4 {
		for k := j - 1; k >= j-4; k-- {
			c := t.Column(k)
			x[k] /= c[k]
			subtract(x[j-4:k], c[j-4:], x[k])
		}
		t.subtract4(x[:j-4], j-4, (*[4]float64)(x[j-4:j]))
	}
}

// subtract sets x −= f·c.
func subtract(x, c []float64, f float64) {
	c = c[:len(x)]
	for i := range x {
		x[i] -= float64(f * c[i])
	}
}

// subtract4 sets x −= R[:len(x), j:j+4]·f, the last column first.
func (t Triangle) subtract4(x []float64, j int, f *[4]float64) {
	n := len(x)
	c0, c1, c2, c3 := t.Column(j)[:n], t.Column(j + 1)[:n], t.Column(j + 2)[:n], t.Column(j + 3)[:n]
	f0, f1, f2, f3 := f[0], f[1], f[2], f[3]
	for i := range x {
		x[i] = x[i] - float64(f3*c3[i]) - float64(f2*c2[i]) - float64(f1*c1[i]) - float64(f0*c0[i])
	}
}

// SolveTransposed replaces x by R⁻ᵀ·x.
func (t Triangle) SolveTransposed(x []float64) {
	t.check(len(x))
	j := 0
	for ; j+4 <= len(x); j += 4 {
		s := t.dots4(x[:j], j)
		for k := j; k < j+4; k++ {
			c, sum := t.Column(k), x[k]-s[k-j]
			for i := j; i < k; i++ {
				sum -= float64(c[i] * x[i])
			}
			x[k] = sum / c[k]
		}
	}
	for ; j < len(x); j++ {
		c := t.Column(j)
		x[j] = (x[j] - dot(c[:j], x[:j])) / c[j]
	}
}

// dots4 is the products of x with R[:len(x), j:j+4]; even and odd rows are
// summed apart.
func (t Triangle) dots4(x []float64, j int) [4]float64 {
	n := len(x)
	c0, c1, c2, c3 := t.Column(j)[:n], t.Column(j + 1)[:n], t.Column(j + 2)[:n], t.Column(j + 3)[:n]
	var a0, a1, a2, a3, b0, b1, b2, b3 float64
	for len(x) >= 2 && len(c0) >= 2 && len(c1) >= 2 && len(c2) >= 2 && len(c3) >= 2 {
		x0, x1 := x[0], x[1]
		a0 += float64(x0 * c0[0])
		b0 += float64(x1 * c0[1])
		a1 += float64(x0 * c1[0])
		b1 += float64(x1 * c1[1])
		a2 += float64(x0 * c2[0])
		b2 += float64(x1 * c2[1])
		a3 += float64(x0 * c3[0])
		b3 += float64(x1 * c3[1])
		x, c0, c1, c2, c3 = x[2:], c0[2:], c1[2:], c2[2:], c3[2:]
	}
	if len(x) == 1 {
		a0 += float64(x[0] * c0[0])
		a1 += float64(x[0] * c1[0])
		a2 += float64(x[0] * c2[0])
		a3 += float64(x[0] * c3[0])
	}
	return [4]float64{a0 + b0, a1 + b1, a2 + b2, a3 + b3}
}

// dot is Σ x[i]·y[i] in four lanes.
func dot(x, y []float64) float64 {
	y = y[:len(x)]
	var s0, s1, s2, s3 float64
	for len(x) >= 4 && len(y) >= 4 {
		s0 += float64(x[0] * y[0])
		s1 += float64(x[1] * y[1])
		s2 += float64(x[2] * y[2])
		s3 += float64(x[3] * y[3])
		x, y = x[4:], y[4:]
	}
	for i := range x {
		s0 += float64(x[i] * y[i])
	}
	return (s0 + s1) + (s2 + s3)
}

// Mul sets out = R·x for the leading block of len(x); out has that length and
// does not overlap x.
func (t Triangle) Mul(out, x []float64) {
	t.check(len(x))
	out = out[:len(x)]
	clear(out)
	j := 0
	for ; j+4 <= len(x); j += 4 {
		f := [4]float64{-x[j], -x[j+1], -x[j+2], -x[j+3]}
		t.subtract4(out[:j], j, &f)
		for k := j; k < j+4; k++ {
			subtract(out[j:k+1], t.Column(k)[j:], -x[k])
		}
	}
	for ; j < len(x); j++ {
		subtract(out[:j+1], t.Column(j), -x[j])
	}
}

// MulTransposed sets out = Rᵀ·x for the leading block of len(x); out has that
// length and does not overlap x.
func (t Triangle) MulTransposed(out, x []float64) {
	t.check(len(x))
	out = out[:len(x)]
	j := 0
	for ; j+4 <= len(x); j += 4 {
		s := t.dots4(x[:j], j)
		for k := j; k < j+4; k++ {
			c, sum := t.Column(k), s[k-j]
			for i := j; i <= k; i++ {
				sum += float64(c[i] * x[i])
			}
			out[k] = sum
		}
	}
	for ; j < len(x); j++ {
		out[j] = dot(t.Column(j), x[:j+1])
	}
}

// Combine sets out to Σ f[i]·R[:, from+i], the columns as they stand: with
// S·B = Q·R the coordinates of S·B·h for an h that begins at from. out has
// length from+len(f) ≤ n.
func (t Triangle) Combine(out []float64, from int, f []float64) {
	t.check(from + len(f))
	out = out[:from+len(f)]
	clear(out)
	for i, fi := range f {
		subtract(out[:from+i+1], t.Column(from+i), -fi)
	}
}
