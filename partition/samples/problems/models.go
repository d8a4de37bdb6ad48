package problems

import (
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/samples/fixed"
)

// Cantilever is a clamped beam of unit length, bending stiffness and mass per
// length in Hermite elements, deflection and rotation at each free node:
// stiffness K and consistent mass M, K·v = λ·M·v, √λ = (βL)². The lowest three
// are 3.5160, 22.0345 and 61.6972 (Thomson, Theory of Vibration, appendix D).
func Cantilever(elements int) (stiffness, mass *csr.Matrix) {
	l := 1 / float64(elements)
	k := [4][4]float64{
		{12, 6 * l, -12, 6 * l},
		{6 * l, 4 * l * l, -6 * l, 2 * l * l},
		{-12, -6 * l, 12, -6 * l},
		{6 * l, 2 * l * l, -6 * l, 4 * l * l}}
	m := [4][4]float64{
		{156, 22 * l, 54, -13 * l},
		{22 * l, 4 * l * l, 13 * l, -3 * l * l},
		{54, 13 * l, 156, -22 * l},
		{-13 * l, -3 * l * l, -22 * l, 4 * l * l}}
	return beam(elements, k, 1/(l*l*l)), beam(elements, m, l/420)
}

// beam assembles scale·e over the elements; node 0 is clamped and left out.
func beam(elements int, e [4][4]float64, scale float64) *csr.Matrix {
	var t csr.Triplets
	for element := range elements {
		for r := range 4 {
			for c := range 4 {
				if i, j := 2*element-2+r, 2*element-2+c; i >= 0 && j >= 0 {
					t.Add(i, j, float64(scale*e[r][c]))
				}
			}
		}
	}
	return t.Matrix(2*elements, 2*elements)
}

// LinkGraph is (I − d·Gᵀ)·x = (1 − d)/11 for the 11-page link graph A: none, B: C,
// C: B, D: A B, E: B D F, F: B E, G H I: B E, J K: E, damping d = 0.85; the page
// without links links to all. Exact are rationals over 579662461, from the
// PageRank example of a public encyclopedia.
func LinkGraph() Known {
	const pages, damping = 11, 0.85
	links := [pages][]int{nil, {2}, {1}, {0, 1}, {1, 3, 5}, {1, 4}, {1, 4}, {1, 4}, {1, 4}, {4}, {4}}
	var t csr.Triplets
	for from, to := range links {
		t.Add(from, from, 1)
		if to == nil {
			for p := range pages {
				t.Add(p, from, -damping/pages)
			}
		}
		for _, p := range to {
			t.Add(p, from, -damping/float64(len(to)))
		}
	}
	x := []float64{19002201, 222822800, 198772220, 22657320, 46886400, 22657320, 9372840, 9372840, 9372840, 9372840, 9372840}
	for i := range x {
		x[i] /= 579662461
	}
	return Known{Matrix: t.Matrix(pages, pages), Right: constant(pages, (1-damping)/pages), Exact: x,
		Source: "PageRank example of a public encyclopedia"}
}

// Plate13 is the 13-point Δ² on m×m inner nodes of the unit square, times h⁴:
// a thin plate, edges clamped (ghost nodes mirrored) or simply supported (ghost
// nodes mirrored with the sign changed). Symmetric positive definite. With
// h = 1/(m+1), √λ/h² is ω·a²·√(ρh/D): 19.739 = 2π² supported, 35.99 clamped
// (plate handbooks, from memory; 35.985 the refined value).
func Plate13(m int, clamped bool) *csr.Matrix {
	ghost := -1.0
	if clamped {
		ghost = 1
	}
	n := m * m
	r := newRows(n, n, 13*n)
	weights := [3][5]float64{{1, -8, 20, -8, 1}, {0, 2, -8, 2, 0}, {0, 0, 1, 0, 0}}
	for k := range n {
		i, j := k/m, k%m
		for a := max(-2, -i); a <= min(2, m-1-i); a++ {
			for b := max(-2, -j); b <= min(2, m-1-j); b++ {
				v := weights[max(a, -a)][b+2]
				if a == 0 && b == 0 {
					for _, edge := range []bool{i == 0, j == 0, i == m-1, j == m-1} {
						if edge {
							v += ghost
						}
					}
				}
				if v != 0 {
					r.add(k+a*m+b, v)
				}
			}
		}
		r.end()
	}
	return r.m
}

// PlateDeflection is Plate13 under an even load q on side a = 1, D = 1, m odd:
// Value is the deflection of the centre over q·a⁴/D, 0.00406 supported, 0.00126
// clamped.
func PlateDeflection(m int, clamped bool) Known {
	h := 1 / float64(m+1)
	value := 0.00406
	if clamped {
		value = 0.00126
	}
	return Known{Matrix: Plate13(m, clamped), Right: constant(m*m, h*h*h*h), Value: value,
		Read:   func(x []float64) float64 { return x[len(x)/2] },
		Source: "plate handbook tables, from memory"}
}

// Walk is the chance u_i that a walk on 0 … n, up with probability p, reaches n
// before 0: −q·u_{i−1} + u_i − p·u_{i+1} = 0, u_0 = 0, u_n = 1. Exact is
// (1 − (q/p)ⁱ)/(1 − (q/p)ⁿ), p ≠ ½; closed form, from memory. Unknown i − 1 is
// u_i.
func Walk(n int, p float64) Known {
	q := 1 - p
	a := walk(n, p)
	b, x := make([]float64, n-1), make([]float64, n-1)
	b[n-2] = p
	ratio := fixed.Log(q / p)
	power := func(i int) float64 { return 1 - fixed.Exp(float64(i)*ratio) }
	for i := range x {
		x[i] = power(i+1) / power(n)
	}
	return Known{Matrix: a, Right: b, Exact: x, Source: "gambler's ruin, closed form, from memory"}
}

// WalkLength is the mean number of steps of the walk with p = ½ until it leaves
// at 0 or n: b = 1, exactly i·(n − i).
func WalkLength(n int) Known {
	x := make([]float64, n-1)
	for i := range x {
		x[i] = float64((i + 1) * (n - i - 1))
	}
	return Known{Matrix: walk(n, 0.5), Right: constant(n-1, 1), Exact: x, Source: "closed form, from memory"}
}

func walk(n int, p float64) *csr.Matrix {
	r := newRows(n-1, n-1, 3*n)
	for i := range n - 1 {
		if i > 0 {
			r.add(i-1, p-1)
		}
		r.add(i, 1)
		if i < n-2 {
			r.add(i+1, -p)
		}
		r.end()
	}
	return r.m
}

// Well is a confined aquifer in rings around a pumped well, drawdown s in m:
// transmissivity m²/s, storage without unit, rate m³/s, from inner to outer
// radius (m) in rings equal in the logarithm; s = 0 at the outer radius.
type Well struct {
	Transmissivity, Storage, Rate, Inner, Outer float64
	Rings                                       int
}

// ratio of the radii of a ring.
func (w Well) ratio() float64 {
	return fixed.Exp(fixed.Log(w.Outer/w.Inner) / float64(w.Rings))
}

// Radius is the middle, √(r₁·r₂), of ring i.
func (w Well) Radius(i int) float64 {
	return w.Inner * fixed.Exp((float64(i)+0.5)*fixed.Log(w.ratio()))
}

// Steady is the balance without storage. Value is s at ring at:
// Q/(2πT)·ln(outer/r), Thiem.
func (w Well) Steady(at int) Known {
	a, _ := w.Step(math.Inf(1))
	value := w.Rate / (2 * math.Pi * w.Transmissivity) * fixed.Log(w.Outer/w.Radius(at))
	right := make([]float64, w.Rings)
	right[0] = w.Rate
	return Known{Matrix: a, Right: right, Value: value,
		Read:   func(x []float64) float64 { return x[at] },
		Source: "Thiem's equation"}
}

// Step is one implicit Euler step of dt seconds: A·s_new = stored·s_old + Q·e₀,
// m²/s. After Theis (1935), s(r, t) = Q/(4πT)·W(r²·S/(4T·t)) while the outer
// radius is out of reach: 0.6025 m for T = 1e-2, S = 1e-4, Q = 1e-2 at 100 m
// after a day.
func (w Well) Step(dt float64) (a *csr.Matrix, stored []float64) {
	g := w.ratio()
	between := 2 * math.Pi * w.Transmissivity / fixed.Log(g)
	stored = make([]float64, w.Rings)
	r := newRows(w.Rings, w.Rings, 3*w.Rings)
	radius := w.Inner
	for i := range w.Rings {
		area := math.Pi * radius * radius * (float64(g*g) - 1)
		stored[i] = w.Storage * area / dt
		middle := stored[i] + between
		if i > 0 {
			r.add(i-1, -between)
			middle += between
		}
		if i == w.Rings-1 { // half a ring to the outer radius
			middle += between
		}
		r.add(i, middle)
		if i < w.Rings-1 {
			r.add(i+1, -between)
		}
		r.end()
		radius *= g
	}
	return r.m, stored
}
