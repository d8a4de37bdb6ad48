package sketch

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// adder is what the operator and its oracle have in common.
type adder interface {
	Rows() int
	Add(dst, w []float64, firstRow int)
}

// untwisted is the operator without the turn of the lanes.
type untwisted struct{ o Operator }

func (u untwisted) Rows() int { return u.o.rows }
func (u untwisted) Add(dst, w []float64, firstRow int) {
	obviousAdd(u.o.rows, u.o.zeta, u.o.seed, false, dst, w, firstRow)
}

// sketchOf is S·B for the columns of B, as a dense rows×k matrix.
func sketchOf(s adder, cols [][]float64) *mat.Dense {
	m := mat.NewDense(s.Rows(), len(cols), nil)
	for j, c := range cols {
		sc := make([]float64, s.Rows())
		s.Add(sc, c, 0)
		m.SetCol(j, sc)
	}
	return m
}

// gaussianSketch is sketchOf the oracle, which is formed once as a dense matrix.
func gaussianSketch(g Gaussian, cols [][]float64) *mat.Dense {
	n := len(cols[0])
	s, b := mat.NewDense(g.Rows(), n, nil), mat.NewDense(n, len(cols), nil)
	for i := range n {
		c := make([]float64, g.Rows())
		g.Add(c, []float64{1}, i)
		s.SetCol(i, c)
	}
	for j, c := range cols {
		b.SetCol(j, c)
	}
	var m mat.Dense
	m.Mul(s, b)
	return &m
}

// condition is σ₁/σ_k from gonum's SVD, infinite for a singular matrix.
func condition(t *testing.T, m *mat.Dense) float64 {
	t.Helper()
	var svd mat.SVD
	if !svd.Factorize(m, mat.SVDNone) {
		t.Fatal("gonum's SVD failed")
	}
	v := svd.Values(nil)
	return v[0] / v[len(v)-1]
}

// marchenkoPastur is the limit of the condition of s×k sketches of an
// orthonormal basis, (√s + √k)/(√s − √k) (Marchenko and Pastur, 1967).
func marchenkoPastur(s, k int) float64 {
	a, b := math.Sqrt(float64(s)), math.Sqrt(float64(k))
	return (a + b) / (a - b)
}

// cosines are k orthonormal columns of n rows: vectors of the discrete cosine
// transform of every stride-th row, zero elsewhere; frequencies spread over all.
func cosines(n, k, stride, offset int) [][]float64 {
	m := n / stride
	cols := make([][]float64, k)
	for j := range cols {
		cols[j] = make([]float64, n)
		f := float64(1 + j*(m-1)/k)
		for i := range m {
			cols[j][i*stride+offset] = math.Sqrt(2/float64(m)) * math.Cos(math.Pi*f*(float64(i)+0.5)/float64(m))
		}
	}
	return cols
}

// coordinates are the unit vectors of every stride-th row.
func coordinates(k, stride int) [][]float64 {
	cols := make([][]float64, k)
	for j := range cols {
		cols[j] = make([]float64, k*stride)
		cols[j][j*stride] = 1
	}
	return cols
}

// krylov is an orthonormal Krylov basis of the 5-point Laplacian on an m×m
// grid, orthogonalised twice against all.
func krylov(m, k int, start []float64) [][]float64 {
	cols := [][]float64{scaled(start, 1/norm(start))}
	for len(cols) < k {
		w := laplacian(m, cols[len(cols)-1])
		for range 2 {
			for _, c := range cols {
				axpy(w, c, -dot(w, c))
			}
		}
		cols = append(cols, scaled(w, 1/norm(w)))
	}
	return cols
}

func laplacian(m int, x []float64) []float64 {
	y := make([]float64, len(x))
	for i := range m {
		for j := range m {
			p := i*m + j
			y[p] = 4 * x[p]
			if i > 0 {
				y[p] -= x[p-m]
			}
			if i < m-1 {
				y[p] -= x[p+m]
			}
			if j > 0 {
				y[p] -= x[p-1]
			}
			if j < m-1 {
				y[p] -= x[p+1]
			}
		}
	}
	return y
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, x := range a {
		sum += x * b[i]
	}
	return sum
}

func axpy(y, x []float64, a float64) {
	for i, v := range x {
		y[i] += a * v
	}
}

func scaled(x []float64, a float64) []float64 {
	y := make([]float64, len(x))
	axpy(y, x, a)
	return y
}

// unit is the first vector of the standard basis.
func unit(n int) []float64 {
	v := make([]float64, n)
	v[0] = 1
	return v
}

// The condition of a sketched orthonormal basis stays below the limit law plus
// 15 %, whatever rows the basis lives on. (Coordinates of one group never meet,
// so their sketches are better than the law.)
func TestEmbedding(t *testing.T) {
	type basis struct {
		name string
		cols [][]float64
		s    int
	}
	var cases []basis
	for _, stride := range []int{1, 2, 4, 8, 16} {
		cases = append(cases,
			basis{fmt.Sprintf("40 cosines on every row of %d", stride), cosines(8_000, 40, stride, stride-1), 160},
			basis{fmt.Sprintf("104 cosines on every row of %d", stride), cosines(8_000, 104, stride, stride/2), 416},
			basis{fmt.Sprintf("104 coordinates of stride %d", stride), coordinates(104, stride), 416})
	}
	rng := newRand(4)
	cases = append(cases,
		basis{"200 cosines on every row of 8 at 4:1", cosines(8_000, 200, 8, 3), 800},
		basis{"Krylov of 96 from noise", krylov(60, 96, normals(rng, 3600)), 384},
		basis{"Krylov of 96 from one corner", krylov(60, 96, unit(3600)), 384})
	for _, c := range cases {
		k := len(c.cols)
		law := marchenkoPastur(c.s, k)
		if got := condition(t, sketchOf(New(c.s, 4, 20), c.cols)); got > 1.15*law {
			t.Errorf("%s, s = %d: condition %.2f, law %.2f", c.name, c.s, got, law)
		}
	}
}

// At 2:1 the limit is (√2+1)/(√2−1) = 5.83; at 400 columns operator and oracle
// are within 15 % of it on both sides.
func TestConditionFollowsMarchenkoPastur(t *testing.T) {
	cols := cosines(3200, 400, 1, 0)
	law := marchenkoPastur(800, 400)
	if math.Abs(law-5.83) > 0.005 {
		t.Fatalf("limit %v, want 5.83", law)
	}
	for name, m := range map[string]*mat.Dense{
		"zeta 4":   sketchOf(New(800, 4, 1), cols),
		"Gaussian": gaussianSketch(NewGaussian(800, 1), cols),
	} {
		if got := condition(t, m); got > 1.15*law || got < law/1.15 {
			t.Errorf("%s: condition %.2f, limit %.2f", name, got, law)
		}
	}
}

// Without the turn of the lanes, vectors on every eighth row reach one sketch
// row in eight and the embedding is lost; the check above can fail.
func TestTurnOfLanesIsEssential(t *testing.T) {
	cols := cosines(16_000, 104, 8, 0)
	if got := condition(t, sketchOf(untwisted{New(416, 4, 20)}, cols)); got < 1e12 {
		t.Errorf("condition without the turn is %.3g, want beyond 1e12", got)
	}
	if got := condition(t, sketchOf(New(416, 4, 20), cols)); got > 1.15*marchenkoPastur(416, 104) {
		t.Errorf("condition with the turn is %.3g", got)
	}
}
