package small

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// projectedData is a made-up projected problem: R of a QR with d+k+1 columns,
// and the columns of M.
type projectedData struct {
	r       Triangle
	d, k    int
	columns [][]float64
	beta    float64
}

func makeProjected(seed uint64, d, k int) projectedData {
	p := projectedData{r: triangle(seed, d+k+1), d: d, k: k, beta: 3}
	for j := range d {
		p.columns = append(p.columns, p.r.Column(j))
	}
	for j := range k {
		p.columns = append(p.columns, tall(seed+uint64(j)+1, d+j+2, 1))
	}
	return p
}

// dense is M, leading n columns, with g.
func (p projectedData) dense(n int) (m, g *mat.Dense) {
	rows := p.d + p.k + 1
	m, g = mat.NewDense(rows, n, nil), mat.NewDense(rows, 1, nil)
	for j, c := range p.columns[:n] {
		for i, x := range c {
			m.Set(i, j, x)
		}
	}
	for i, x := range p.r.Column(p.d) {
		g.Set(i, 0, p.beta*x)
	}
	return m, g
}

// Column by column, the estimate and y are those of a dense least-squares solve,
// for every leading block.
func TestHessenbergAgainstDenseLeastSquares(t *testing.T) {
	h := NewHessenberg(40)
	rapid.Check(t, func(t *rapid.T) {
		d, k := rapid.IntRange(0, 8).Draw(t, "d"), rapid.IntRange(1, 25).Draw(t, "k")
		p := makeProjected(rapid.Uint64().Draw(t, "seed"), d, k)
		h.Reset(p.r, d, p.beta)
		if want := math.Abs(p.beta * p.r.At(d, d)); math.Abs(h.Estimate()-want) > 10*eps*want {
			t.Fatalf("estimate before the first step = %g, want %g", h.Estimate(), want)
		}
		for _, c := range p.columns[d:] {
			h.Append(c)
		}
		m, g := p.dense(d + k)
		var want, rest mat.Dense
		if err := want.Solve(m, g); err != nil {
			t.Skip("ill-conditioned draw")
		}
		rest.Mul(m, &want)
		rest.Sub(g, &rest)
		if got, want := h.Estimate(), mat.Norm(&rest, 2); math.Abs(got-want) > 1e-10*p.beta {
			t.Fatalf("Estimate = %g, want %g", got, want)
		}
		n := rapid.IntRange(1, d+k).Draw(t, "leading")
		y := make([]float64, n)
		h.Solve(y)
		want.Reset()
		m, g = p.dense(n)
		if err := want.Solve(m, g); err != nil {
			t.Skip("ill-conditioned draw")
		}
		condition := mat.Cond(m, 2)
		for i := range y {
			if math.Abs(y[i]-want.At(i, 0)) > 100*eps*condition*condition*(1+mat.Norm(&want, 2)) {
				t.Fatalf("y[%d] of %d = %g, want %g", i, n, y[i], want.At(i, 0))
			}
		}
	})
}

func TestHessenbergBreakdown(t *testing.T) {
	p := makeProjected(5, 2, 4)
	h := NewHessenberg(6)
	h.Reset(p.r, 2, 1)
	for _, c := range p.columns[2:5] {
		h.Append(c)
	}
	last := p.columns[5]
	h.Append(last[:len(last)-1])
	if got := h.Estimate(); got > 10*eps {
		t.Errorf("Estimate after a breakdown = %g, want 0 to rounding", got)
	}
	y := make([]float64, 6)
	if direct := h.Solve(y); !direct || !allFinite(y) {
		t.Errorf("Solve after a breakdown: direct %v, y %v", direct, y)
	}
}

// A zero column makes G singular: the answer is finite, shortest and minimises.
func TestHessenbergFallsBackWhenSingular(t *testing.T) {
	p := makeProjected(6, 0, 8)
	clear(p.columns[5])
	copy(p.columns[7], p.columns[4]) // dependent too
	clear(p.columns[7][len(p.columns[4]):])
	h := NewHessenberg(8)
	h.Reset(p.r, 0, 1)
	for _, c := range p.columns {
		h.Append(c)
	}
	y := make([]float64, 8)
	if h.Solve(y) {
		t.Fatal("Solve took a singular triangle for regular")
	}
	if !allFinite(y) || math.Abs(y[5]) > 1e-12 || math.Abs(y[4]-y[7]) > 1e-12 {
		t.Errorf("y = %v, want the shortest: y[5] = 0, y[4] = y[7]", y)
	}
}

func TestHessenbergAppendAllocatesNothing(t *testing.T) {
	p := makeProjected(7, 3, 20)
	h := NewHessenberg(23)
	y := make([]float64, 23)
	if n := testing.AllocsPerRun(5, func() {
		h.Reset(p.r, 3, 1)
		for _, c := range p.columns[3:] {
			h.Append(c)
		}
		h.Solve(y)
	}); n != 0 {
		t.Errorf("Append and Solve allocate %v times, want 0", n)
	}
}
