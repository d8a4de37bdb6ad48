package problems

import (
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// Known is a system whose answer is known from outside.
type Known struct {
	Matrix *csr.Matrix
	Right  []float64
	// Exact is the answer of the discrete system, where a formula gives it.
	Exact []float64
	// Value is a published number, and Read takes it out of x.
	Value  float64
	Read   func(x []float64) float64
	Source string // of Exact or Value
}

// PlateT4 is steady conduction in a plate of 0.6 m × 1.0 m, k = 52 W/(m·K):
// bottom at 100 °C, left edge insulated, right edge and top losing 750 W/(m²·K)
// to 0 °C. Balances around the nodes of an nx×ny grid of cells, ny divisible by 5
// so that (0.6, 0.2) is a node. Value is the temperature there. Symmetric positive definite; unknown (j−1)·(nx+1) + i,
// W/K per metre of depth.
func PlateT4(nx, ny int) Known {
	const conductivity, film = 52, 750
	dx, dy := 0.6/float64(nx), 1.0/float64(ny)
	columns := nx + 1
	n := columns * ny
	r, b := newRows(n, n, 5*n), make([]float64, n)
	for j := 1; j <= ny; j++ {
		tall := dy // height of the node's box
		if j == ny {
			tall = dy / 2
		}
		for i := 0; i <= nx; i++ {
			wide := dx
			if i == 0 || i == nx {
				wide = dx / 2
			}
			across, along := conductivity*tall/dx, conductivity*wide/dy
			k, middle := (j-1)*columns+i, along
			if j > 1 {
				r.add(k-columns, -along)
			} else {
				b[k] = along * 100
			}
			if i > 0 {
				r.add(k-1, -across)
				middle += across
			}
			place := len(r.m.Col)
			r.add(k, 0)
			if i < nx {
				r.add(k+1, -across)
				middle += across
			} else {
				middle += float64(film * tall)
			}
			if j < ny {
				r.add(k+columns, -along)
				middle += along
			} else {
				middle += float64(film * wide)
			}
			r.m.Val[place] = middle
			r.end()
		}
	}
	return Known{Matrix: r.m, Right: b, Value: 18.2538,
		Read:   func(x []float64) float64 { return x[(ny/5-1)*columns+nx] },
		Source: "standard thermal benchmark test T4, 18.3 °C (figure from memory); refined limit 18.2538, computed"}
}

// SquareBar is Prandtl's stress function of a square bar of side 1 in torsion,
// −Δφ = 2, φ = 0 around, times h² on m×m inner nodes. Value is J/a⁴ = 2·∫φ.
// The same system gives duct flow: f·Re = 8/J.
func SquareBar(m int) Known {
	h := 1 / float64(m+1)
	return Known{Matrix: Poisson2D(m), Right: constant(m*m, 2*h*h), Value: 0.140577015,
		Read: func(x []float64) float64 {
			sum := 0.0
			for _, v := range x {
				sum += v
			}
			return 2 * h * h * sum
		},
		Source: "handbook table of torsion constants, 0.141; series 0.140577015, computed"}
}

// DuctFriction is f·Re of a square duct from the torsion constant of the same
// section: 56.908; 56.91 in handbooks (from memory).
func DuctFriction(torsion float64) float64 { return 8 / torsion }

// Layer1D is −ε·u″ + u′ = 0 on (0, 1), u(0) = 0, u(1) = 1, central differences
// on cells cells: a boundary layer. Exact is the discrete solution
// (rⁱ − 1)/(rᴺ − 1), r = (1 + q)/(1 − q), q = h/(2ε), from memory; far from the
// layer it underflows to 0. ε must exceed h/2.
func Layer1D(cells int, epsilon float64) Known {
	n, q := cells-1, 1/(2*epsilon*float64(cells))
	if !(q < 1) {
		panic("problems: the layer needs epsilon above half a cell")
	}
	// times h²/ε: (−1 − q)·u_{i−1} + 2·u_i + (−1 + q)·u_{i+1} = 0
	r, b := newRows(n, n, 3*n), make([]float64, n)
	for i := range n {
		if i > 0 {
			r.add(i-1, -1-q)
		}
		r.add(i, 2)
		if i < n-1 {
			r.add(i+1, q-1)
		}
		r.end()
	}
	b[n-1] = 1 - q
	down := (1 - q) / (1 + q) // 1/r
	power := make([]float64, cells+1)
	power[0] = 1
	for i := range cells {
		power[i+1] = power[i] * down
	}
	x := make([]float64, n)
	for i := range x {
		x[i] = (power[cells-1-i] - power[cells]) / (1 - power[cells])
	}
	return Known{Matrix: r.m, Right: b, Exact: x, Source: "closed form of the discrete equation, from memory"}
}

// Mode3D is ConvectionDiffusion3D(m, v, Central) with b = λ·x for one of its
// eigenvectors x, which Exact holds: λ = 2·Σ (1 − √(1 − p²)·cos(j·π·h)),
// p = v·h/2, x = ∏ ((1+p)/(1−p))^{i/2}·sin(i·j·π·h) with i = 1 … m along each
// axis, scaled to 1 at the largest power. mode holds j ≥ 1 for each axis; |p|
// must be below 1.
func Mode3D(m int, v [3]float64, mode [3]int) Known {
	h := 1 / float64(m+1)
	var factor [3][]float64
	lambda := 0.0
	for d := range 3 {
		p := v[d] * h / 2
		if !(math.Abs(p) < 1) {
			panic("problems: cell numbers must be below 1")
		}
		factor[d] = modeAxis(m, p, mode[d])
		cosine := math.Sqrt(1-float64(p*p)) * fixed.CosPi(float64(mode[d])*h)
		lambda += 2 * (1 - float64(cosine))
	}
	x, b := make([]float64, m*m*m), make([]float64, m*m*m)
	for k := range x {
		x[k] = factor[0][k/(m*m)] * factor[1][k/m%m] * factor[2][k%m]
		b[k] = lambda * x[k]
	}
	return Known{Matrix: ConvectionDiffusion3D(m, v, Central), Right: b, Exact: x,
		Source: "eigenvectors of tridiagonal Toeplitz matrices, from memory"}
}

// modeAxis is g^{(i−m)/2}·sin(i·j·π/(m+1)) for i = 1 … m and g = (1+p)/(1−p), or
// g^{(i−1)/2} where g < 1.
func modeAxis(m int, p float64, j int) []float64 {
	g := math.Sqrt((1 + p) / (1 - p))
	power, f := 1.0, make([]float64, m)
	for s := range m {
		i := s + 1
		if g >= 1 {
			i = m - s
		}
		f[i-1] = power * fixed.SinPi(float64(i)*float64(j)/float64(m+1))
		if g >= 1 {
			power /= g
		} else {
			power *= g
		}
	}
	return f
}

// UnitCube is −Δu = 1 on the unit cube, u = 0 around, times h² on m³ inner
// nodes, m odd. Value is u at the centre.
func UnitCube(m int) Known {
	h := 1 / float64(m+1)
	return Known{Matrix: ConvectionDiffusion3D(m, [3]float64{}, Upwind), Right: constant(m*m*m, h*h), Value: 0.05621282983,
		Read:   func(x []float64) float64 { return x[len(x)/2] },
		Source: "Fourier series, computed"}
}
