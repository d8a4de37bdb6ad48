package samples

import (
	"math"
	"testing"

	"rowstead/partition/csr"
)

// columnSums are the sums of the entries of each column, and of their sizes.
func columnSums(a *csr.Matrix) (sum, size []float64) {
	sum, size = make([]float64, a.Cols), make([]float64, a.Cols)
	for k, c := range a.Col {
		sum[c] += a.Val[k]
		size[c] += math.Abs(a.Val[k])
	}
	return sum, size
}

// Water is neither made nor lost inside the model: column sums times heads are
// what crosses to fixed heads, and equal what is given.
func TestAquiferBalances(t *testing.T) {
	j := made(t, "aquifer", 1100)
	a := newAquifer(1100).(*aquifer)
	sum, size := columnSums(j.Matrix)
	for k := range sum {
		outside, _ := a.outside(k/(3*a.ny), k/3%a.ny, k%3, a.conductivity(k/(3*a.ny), k/3%a.ny, k%3))
		if math.Abs(sum[k]-outside) > 1e-13*size[k] {
			t.Fatalf("cell %d exchanges %v m²/d with fixed heads, its column says %v", k, outside, sum[k])
		}
	}
}

func TestAquiferWellsDrawWhatTheyShould(t *testing.T) {
	for _, size := range []int{300, 1100, 36000} {
		a := newAquifer(size).(*aquifer)
		drawn := 0.0
		for k := 2; k < a.unknowns(); k += 3 {
			if i, j := k/(3*a.ny), k/3%a.ny; i > 0 && i < a.nx-1 {
				_, q := a.outside(i, j, 2, 1)
				drawn -= q
			}
		}
		if drawn != 4*wellRate {
			t.Errorf("%d unknowns: wells draw %v m³/d, want %v", size, drawn, 4*wellRate)
		}
	}
}

// ±2 standard deviations of log₁₀ K span five decades: the sample deviation over
// the valley is near 1.25. 1,900 patches make it uncertain by some 5 %.
func TestConductivitySpansFiveDecades(t *testing.T) {
	a := newAquifer(60000).(*aquifer)
	for l, layer := range a.layers {
		sum, square, n := 0.0, 0.0, float64(a.nx*a.ny)
		for i := range a.nx {
			for j := range a.ny {
				g := math.Log10(a.conductivity(i, j, l) / layer.median)
				sum, square = sum+g, square+g*g
			}
		}
		mean, deviation := sum/n, math.Sqrt(square/n-sum*sum/n/n)
		if math.Abs(mean) > 0.15 || math.Abs(deviation-1.25) > 0.1 {
			t.Errorf("%s: log K has mean %.3f and deviation %.3f, want 0 and 1.25", layer.name, mean, deviation)
		}
	}
}

// What the outfalls give leaves through the east edge or decays.
func TestPlumeBalances(t *testing.T) {
	j := made(t, "plume", 650)
	p := newPlume(650).(*plume)
	x := reference(t, j)
	given, left := 0.0, 0.0
	for k, c := range x {
		given += j.Right[k]
		left += decay * p.dx * p.dy * basinDepth * c
		if k/p.ny == p.nx-1 {
			_, _, _, east := p.fluxes(k/p.ny, k%p.ny)
			left += max(east, 0) * c
		}
	}
	if math.Abs(given-17) > 1e-12 || math.Abs(left-given) > 1e-9*given {
		t.Errorf("outfalls give %v g/s (want 17), %v g/s leaves or decays", given, left)
	}
}

func TestPlumeIsCarried(t *testing.T) {
	if n := newPlume(30000).(*plume).cellNumber(); n < 20 {
		t.Errorf("cell number %v, want at least 20", n)
	}
}

// The heat put into the steel leaves through films and the cooling water.
func TestCastingBalances(t *testing.T) {
	j := made(t, "casting", 650)
	c := newCasting(650).(*casting)
	x := reference(t, j)
	given, left := 0.0, 0.0
	for k, degrees := range x {
		own := c.cell([3]int{k / (c.n[1] * c.n[2]), k / c.n[2] % c.n[1], k % c.n[2]})
		if own.inSteel {
			given += heating * own.volume()
		}
		for d := range 3 {
			for _, step := range []int{-1, 1} {
				at := own.at
				at[d] += step
				if at[d] < 0 || at[d] == c.n[d] {
					if g, air := c.film(own, d, step); !own.water {
						left += g * (degrees - air)
					}
				} else if other := c.cell(at); other.water && !own.water {
					lower, upper := own, other
					if step < 0 {
						lower, upper = other, own
					}
					left += link(lower, upper, d) * (degrees - waterDegrees)
				}
			}
		}
	}
	if math.Abs(left-given) > 1e-9*given || given < 500 {
		t.Errorf("heating gives %v W, %v W leaves", given, left)
	}
}

// A node away from the floor feels no force when the whole rack is moved or
// turned as a rigid body.
func TestFrameFeelsNoRigidMotion(t *testing.T) {
	j := made(t, "frame", 3000)
	f := newFrame(3000).(*frame)
	for motion := range 6 {
		x := make([]float64, j.Matrix.Rows)
		for node := range j.Matrix.Rows / 6 {
			p := f.place([3]int{node / (f.n[1] * f.n[2]), node / f.n[2] % f.n[1], node % f.n[2]})
			x[6*node+motion] = 1
			if motion >= 3 { // displacement ω × p of a turn about axis a
				b, c := (motion-2)%3, (motion-1)%3 // the other two in cyclic order
				x[6*node+b], x[6*node+c] = -p[c], p[b]
			}
		}
		for k := range j.Matrix.Rows {
			if k/6%f.n[2] == 0 {
				continue // held by the floor
			}
			cols, vals := j.Matrix.Row(k)
			force, size := 0.0, 0.0
			for e, c := range cols {
				force, size = force+vals[e]*x[c], size+math.Abs(vals[e]*x[c])
			}
			if math.Abs(force) > 1e-12*size {
				t.Fatalf("motion %d: row %d feels %v of %v", motion, k, force, size)
			}
		}
	}
}

// A cantilever of one upright of m steps under a tip force F leans
// F·L³/(3·E·I), exactly so in beam elements.
func TestFrameMemberBendsAsABeam(t *testing.T) {
	for axis := range 3 {
		for q := 1; q < 3; q++ { // local direction of the force
			m := member{axis, 1.7, section{6e-4, 3e-7, 8e-7, 2e-9}}
			r := (axis + q) % 3      // its global direction
			turn := 3 + (axis+3-q)%3 // the rotation that goes with it
			inertia := [3]float64{0, m.second, m.first}[q]
			a, b, d := m.stiffness(1, r, 1, r), m.stiffness(1, r, 1, turn), m.stiffness(1, turn, 1, turn)
			lean := d / (a*d - b*b)
			want := m.length * m.length * m.length / (3 * young * inertia)
			if math.Abs(lean-want) > 1e-12*want {
				t.Errorf("axis %d, force along %d: lean %v a newton, want %v", axis, r, lean, want)
			}
		}
	}
}

// Row sums of the network are the tanks' conductances; rows range from dead ends
// to hubs.
func TestPipesHaveHubsAndDeadEnds(t *testing.T) {
	j := made(t, "pipes", 40000)
	sum, size := columnSums(j.Matrix)
	least, most, ends := math.Inf(1), 0.0, 0
	hub := 0
	for k := range sum {
		want := 0.0
		if k%(works*side*side) == 0 {
			want = tankMain
		}
		if math.Abs(sum[k]-want) > 1e-13*size[k] {
			t.Fatalf("junction %d: row sum %v, want %v", k, sum[k], want)
		}
		cols, vals := j.Matrix.Row(k)
		hub = max(hub, len(cols))
		if len(cols) == 2 {
			ends++
		}
		for e, c := range cols {
			if int(c) != k {
				least, most = min(least, -vals[e]), max(most, -vals[e])
			}
		}
	}
	if hub < 80 || ends < 2000 || most/least < 9e4 {
		t.Errorf("largest row %d (want 80), %d dead ends (want 2000), conductances over %.1e (want 9e4)", hub, ends, most/least)
	}
}

// The complex matrix is symmetric, so its real form is [L −s; s L] with L
// symmetric and the loss s of one sign: energy is only lost.
func TestWaveHasTheRealForm(t *testing.T) {
	j := made(t, "wave", 3000)
	a, b := j.Matrix, j.Matrix.Transpose()
	for k := range a.Rows {
		cols, vals := a.Row(k)
		_, turned := b.Row(k)
		for e, c := range cols {
			want := turned[e]
			if int(c) == k^1 {
				want = -want
				if (vals[e] > 0) != (k%2 == 0) {
					t.Fatalf("loss of row %d has the wrong sign: %v", k, vals[e])
				}
			}
			if vals[e] != want {
				t.Fatalf("entries (%d, %d) are %v and %v", k, c, vals[e], turned[e])
			}
		}
	}
}

// The even pressure and the one that changes from cell to cell give quadratic
// forms of opposite sign: the real part is indefinite.
func TestWaveIsIndefinite(t *testing.T) {
	j := made(t, "wave", 3000)
	w := newWave(3000).(*wave)
	form := func(x func(i, j int) float64) float64 {
		v, y := make([]float64, j.Matrix.Rows), make([]float64, j.Matrix.Rows)
		for node := range w.nx * w.ny {
			v[2*node] = x(node/w.ny, node%w.ny)
		}
		j.Matrix.Mul(y, v)
		sum := 0.0
		for k := range v {
			sum += v[k] * y[k]
		}
		return sum
	}
	even := form(func(_, _ int) float64 { return 1 })
	odd := form(func(i, j int) float64 { return float64(1 - 2*((i+j)%2)) })
	if !(even < 0 && odd > 0) {
		t.Errorf("forms %v and %v, want one below and one above zero", even, odd)
	}
}
