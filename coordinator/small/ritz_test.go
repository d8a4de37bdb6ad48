package small

import (
	"fmt"
	"math"
	"math/cmplx"
	"sort"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// cycleData is what one cycle of a made-up problem leaves: an orthogonal or
// truncated Arnoldi process on C = V·diag·V⁻¹-like data of n rows, sketched by
// the identity (s = n), with d recycled columns.
type cycleData struct {
	s, m, d int
	q       *QR
	h       *Hessenberg
	su      []float64
	sw, scw []float64 // s×m, for the dense answer
	basis   []float64 // s×(k+1)
}

// operatorOf is an upper bidiagonal-plus-blocks matrix with given eigenvalues:
// real ones on the diagonal, complex pairs as 2×2 blocks, coupled above by off.
type operatorOf struct {
	eigen []complex128
	off   float64
}

func (o operatorOf) mul(y, x []float64) {
	for i := 0; i < len(o.eigen); i++ {
		e := o.eigen[i]
		if imag(e) == 0 {
			y[i] = real(e) * x[i]
			continue
		}
		y[i] = real(e)*x[i] + imag(e)*x[i+1]
		y[i+1] = real(e)*x[i+1] - imag(e)*x[i]
		i++
	}
	for i := 0; i+2 < len(x); i++ {
		y[i] += o.off * x[i+2]
	}
}

// runCycle makes k steps of Arnoldi against the last window vectors.
func runCycle(o operatorOf, u []float64, d, k, window int) *cycleData {
	s := len(o.eigen)
	c := &cycleData{s: s, m: d + k, d: d, q: NewQR(s, d+k+1), h: NewHessenberg(d + k)}
	cu := make([]float64, s*d)
	for j := range d {
		o.mul(cu[j*s:(j+1)*s], u[j*s:(j+1)*s])
	}
	if d > 0 {
		orthonormalise(cu, u, s)
		c.q.Append(cu)
	}
	b := make([]float64, s*(k+1))
	copy(b, tall(77, s, 1))
	normalise(b[:s])
	c.q.Append(b[:s])
	c.h.Reset(c.q.R(), d, 1)
	for j := range k {
		w := b[(j+1)*s : (j+2)*s]
		o.mul(w, b[j*s:(j+1)*s])
		lo := max(0, j+1-window)
		h := make([]float64, j+2-lo)
		for range 2 {
			for i := lo; i <= j; i++ {
				f := dot(b[i*s:(i+1)*s], w)
				subtract(w, b[i*s:(i+1)*s], f)
				h[i-lo] += f
			}
		}
		h[j+1-lo] = normalise(w)
		c.q.Append(w)
		column := make([]float64, d+j+2)
		c.q.R().Combine(column, d+lo, h)
		c.h.Append(column)
	}
	c.basis = b
	c.su, c.sw = u, append(append([]float64(nil), u...), b[:k*s]...)
	c.scw = append(append([]float64(nil), cu...), make([]float64, k*s)...)
	for j := range k {
		o.mul(c.scw[(d+j)*s:(d+j+1)*s], b[j*s:(j+1)*s])
	}
	return c
}

// orthonormalise replaces CU by an orthonormal basis and U by its preimage.
func orthonormalise(cu, u []float64, s int) {
	for j := 0; j*s < len(cu); j++ {
		c, v := cu[j*s:(j+1)*s], u[j*s:(j+1)*s]
		for range 2 {
			for i := range j {
				f := dot(cu[i*s:(i+1)*s], c)
				subtract(c, cu[i*s:(i+1)*s], f)
				subtract(v, u[i*s:(i+1)*s], f)
			}
		}
		scaleBy(v, 1/norm(c))
		normalise(c)
	}
}

// denseRitz is the textbook answer: SVD filter of S·W, pencil of size m by a
// dense eigenvalue solver. It returns C·W·t for the wanted directions and |θ|.
func denseRitz(c *cycleData, want int) (image *mat.Dense, theta []float64) {
	sw := mat.DenseCopyOf(mat.NewDense(c.m, c.s, c.sw).T())
	scw := mat.DenseCopyOf(mat.NewDense(c.m, c.s, c.scw).T())
	var svd mat.SVD
	svd.Factorize(sw, mat.SVDThin)
	values := svd.Values(nil)
	keep := 0
	for keep < len(values) && values[keep] > filterTol*values[0] {
		keep++
	}
	var v, uu, n mat.Dense
	svd.VTo(&v)
	svd.UTo(&uu)
	t := mat.DenseCopyOf(v.Slice(0, c.m, 0, keep))
	for j := range keep {
		for i := range c.m {
			t.Set(i, j, t.At(i, j)/values[j])
		}
	}
	n.Mul(scw, t)
	var operator mat.Dense
	if err := operator.Solve(&n, uu.Slice(0, c.s, 0, keep)); err != nil {
		panic(err)
	}
	var eig mat.Eigen
	eig.Factorize(&operator, mat.EigenRight)
	mu := eig.Values(nil)
	var vectors mat.CDense
	eig.VectorsTo(&vectors)
	order := make([]int, keep)
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return cmplx.Abs(mu[order[a]]) > cmplx.Abs(mu[order[b]]) })
	g := mat.NewDense(keep, want, nil)
	at := 0
	for _, i := range order {
		z := mu[i]
		if imag(z) < 0 {
			continue
		}
		width := 1
		if imag(z) > 0 {
			width = 2
		}
		if at+width > want {
			break
		}
		for r := range keep {
			g.Set(r, at, real(vectors.At(r, i)))
			if width == 2 {
				g.Set(r, at+1, imag(vectors.At(r, i)))
			}
		}
		for range width {
			theta = append(theta, 1/cmplx.Abs(z))
		}
		at += width
	}
	image = new(mat.Dense)
	image.Mul(&n, g.Slice(0, keep, 0, at))
	return image, theta
}

// sine is the largest sine of an angle between the column spaces of a and b.
func sine(a, b *mat.Dense) float64 {
	qa, qb := orthonormal(a), orthonormal(b)
	var inner, rest mat.Dense
	inner.Mul(qa.T(), qb)
	rest.Mul(qa, &inner)
	rest.Sub(qb, &rest)
	return mat.Norm(&rest, 2)
}

func orthonormal(a *mat.Dense) *mat.Dense {
	rows, columns := a.Dims()
	var qr mat.QR
	qr.Factorize(a)
	var q mat.Dense
	qr.QTo(&q)
	return mat.DenseCopyOf(q.Slice(0, rows, 0, columns))
}

// realSpectrum are few small eigenvalues, 10^−decades and up, and a bulk in
// [0.5, 1.5].
func realSpectrum(n, few int, decades float64) []complex128 {
	e := make([]complex128, n)
	for i := range e {
		e[i] = complex(0.5+float64(i)/float64(n), 0)
		if i < few {
			e[i] = complex(math.Pow(10, -decades*(1-float64(i)/float64(few))), 0)
		}
	}
	return e
}

// complexSpectrum are few small pairs and a bulk on the circle |z − 1| = 0.5.
func complexSpectrum(n, few int) []complex128 {
	e := make([]complex128, n)
	for i := 0; i+1 < n; i += 2 {
		a := math.Pi * (float64(i) + 1) / float64(n+1)
		e[i] = complex(1+0.5*math.Cos(a), 0.5*math.Sin(a))
		if i < few {
			e[i] = complex(0.02, 0.01) * complex(float64(i/2+1), 0)
		}
		e[i+1] = cmplx.Conj(e[i])
	}
	if n%2 == 1 {
		e[n-1] = 1
	}
	return e
}

func TestHarmonicRitzFindsTheDenseSubspace(t *testing.T) {
	cases := []struct {
		name            string
		o               operatorOf
		d, k, want, win int
	}{
		{"real, dense", operatorOf{realSpectrum(200, 8, 3), 0}, 0, 60, 8, 60},
		{"real, by iteration", operatorOf{realSpectrum(400, 8, 3), 0}, 0, 160, 8, 160},
		{"real, nonnormal, window 4", operatorOf{realSpectrum(400, 6, 2), 0.01}, 0, 130, 6, 4},
		{"pairs", operatorOf{complexSpectrum(400, 8), 0}, 0, 150, 8, 150},
		{"pairs, odd room", operatorOf{complexSpectrum(400, 8), 0}, 0, 150, 7, 150},
		{"pairs, window", operatorOf{complexSpectrum(400, 8), 0.01}, 0, 140, 8, 4},
		{"pairs, nonnormal", operatorOf{complexSpectrum(400, 6), 0.1}, 0, 150, 6, 150},
		{"recycled", operatorOf{realSpectrum(400, 8, 4), 0.02}, 8, 150, 8, 150},
		{"recycled, window", operatorOf{complexSpectrum(400, 6), 0.02}, 6, 130, 6, 8},
		{"recycled, few steps", operatorOf{complexSpectrum(100, 6), 0.02}, 6, 12, 6, 8},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			data := runCycle(c.o, tall(91, len(c.o.eigen), c.d), c.d, c.k, c.win)
			checkRitz(t, data, c.want)
		})
	}
}

func checkRitz(t *testing.T, c *cycleData, want int) {
	t.Helper()
	tt, directions := HarmonicRitz(c.q, c.h, c.su, want)
	image, theta := denseRitz(c, want)
	if _, n := image.Dims(); directions != n {
		t.Fatalf("directions = %d, the dense answer has %d (θ %v)", directions, n, theta)
	}
	var got mat.Dense
	got.Mul(mat.NewDense(c.m, c.s, c.scw).T(), mat.NewDense(directions, c.m, tt).T())
	// The iteration stops at residuals of ritzTol; a gap of a percent in |μ| and
	// the condition of S·W leave two or three digits less.
	if angle := sine(&got, image); angle > 1e3*ritzTol {
		t.Errorf("sine of the angle to the dense answer = %.2e, want ≤ %.0e (θ %.3g)", angle, 1e3*ritzTol, theta)
	} else {
		t.Logf("angle %.1e, cond %.1e", angle, c.q.R().Condition(nil))
	}
	var gramian mat.Dense
	gramian.Mul(got.T(), &got)
	for i := range directions {
		gramian.Set(i, i, gramian.At(i, i)-1)
	}
	if defect := mat.Norm(&gramian, 2); defect > 1e-6 {
		t.Errorf("S·C·W·T is orthonormal to %.2e only", defect)
	}
	t.Logf("m = %d, %d directions, θ %.3g", c.m, directions, theta)
}

func BenchmarkHarmonicRitz(b *testing.B) {
	for _, c := range []struct{ m, d int }{{116, 16}, {332, 16}, {516, 16}, {1000, 16}} {
		for _, kind := range []string{"real", "complex", "degenerate"} {
			b.Run(fmt.Sprintf("m%d/d%d/%s", c.m, c.d, kind), func(b *testing.B) {
				n := 2 * c.m
				o := operatorOf{realSpectrum(n, 20, 4), 0}
				if kind == "complex" {
					o.eigen = complexSpectrum(n, 20)
				}
				window := c.m
				if kind == "degenerate" {
					window = 4
				}
				data := runCycle(o, tall(91, n, c.d), c.d, c.m-c.d, window)
				for b.Loop() {
					HarmonicRitz(data.q, data.h, data.su, c.d)
				}
			})
		}
	}
}
