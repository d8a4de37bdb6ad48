package problems

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"rowstead/partition/csr"
)

// conjugate solves A·x = b for a symmetric positive definite A from x = 0 to a
// recurrence of 1e-11, the textbook way.
func conjugate(t *testing.T, a *csr.Matrix, b []float64) []float64 {
	t.Helper()
	n := a.Rows
	x, r, p, q := make([]float64, n), append([]float64(nil), b...), append([]float64(nil), b...), make([]float64, n)
	rho := dot(r, r)
	goal := 1e-22 * rho
	for step := 0; rho > goal; step++ {
		if step > 20*n {
			t.Fatalf("no convergence: %v of %v", rho, goal)
		}
		a.Mul(q, p)
		alpha := rho / dot(p, q)
		for i := range x {
			x[i] += alpha * p[i]
			r[i] -= alpha * q[i]
		}
		next := dot(r, r)
		for i := range p {
			p[i] = r[i] + next/rho*p[i]
		}
		rho = next
	}
	return x
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += a[i] * b[i]
	}
	return sum
}

func dense(a *csr.Matrix) *mat.Dense {
	full := mat.NewDense(a.Rows, a.Cols, nil)
	for i := range a.Rows {
		cols, vals := a.Row(i)
		for k, c := range cols {
			full.Set(i, int(c), vals[k])
		}
	}
	return full
}

func TestPublishedValues(t *testing.T) {
	for _, c := range []struct {
		name string
		k    Known
		tol  float64 // of the value, absolute
		slow bool
	}{
		{"T4, 24×40 cells", PlateT4(24, 40), 0.05, false},
		{"T4, 96×160 cells", PlateT4(96, 160), 0.005, true},
		{"torsion, 64²", SquareBar(64), 1e-3 * 0.1406, false},
		{"torsion, 256²", SquareBar(256), 1e-4 * 0.1406, true},
		{"unit cube, 31³", UnitCube(31), 2e-3 * 0.0562, false},
		{"unit cube, 63³", UnitCube(63), 5e-4 * 0.0562, true},
		{"plate supported, 39²", PlateDeflection(39, false), 1e-5, false},
		{"plate clamped, 39²", PlateDeflection(39, true), 1.4e-5, false},
		{"Thiem, 200 rings", Well{Transmissivity: 1e-2, Storage: 1e-4, Rate: 1e-2, Inner: 0.1, Outer: 1000, Rings: 200}.Steady(150), 1e-9, false},
	} {
		if c.slow && testing.Short() {
			continue
		}
		if !symmetric(c.k.Matrix) {
			t.Errorf("%s: not symmetric", c.name)
		}
		if got := c.k.Read(conjugate(t, c.k.Matrix, c.k.Right)); math.Abs(got-c.k.Value) > c.tol {
			t.Errorf("%s: %v, want %v ± %.1e (%s)", c.name, got, c.k.Value, c.tol, c.k.Source)
		}
	}
	if f := DuctFriction(SquareBar(1).Value); math.Abs(f-56.908) > 5e-4 {
		t.Errorf("f·Re = %v, want 56.908", f)
	}
}

// The exact answers satisfy their equations to rounding: the row-wise error
// max |b − A·x| / (|A|·|x| + |b|) is a few ulp.
func TestExactAnswersSatisfyTheirEquations(t *testing.T) {
	for _, c := range []struct {
		name string
		k    Known
		tol  float64
	}{
		{"boundary layer", Layer1D(400, 0.002), 1e-14},
		{"boundary layer, wide", Layer1D(64, 1), 1e-14},
		{"mode 1, 1, 1", Mode3D(20, [3]float64{20, 10, 5}, [3]int{1, 1, 1}), 1e-14},
		{"mode 3, 1, 2 against the flow", Mode3D(17, [3]float64{-30, 0, 25}, [3]int{3, 1, 2}), 1e-14},
		{"link graph", LinkGraph(), 1e-14},
		{"walk", Walk(2000, 0.502), 1e-13},
		{"length of the walk", WalkLength(2000), 1e-14},
		{"flow trap, identity rows", trap(1e-9, 0), 1e-14},
		{"flow trap, penalty rows", trap(1, 1e12), 1e-13},
	} {
		if err := c.k.Matrix.Check(); err != nil {
			t.Errorf("%s: %v", c.name, err)
		}
		if worst := rowwise(c.k.Matrix, c.k.Exact, c.k.Right); !(worst <= c.tol) {
			t.Errorf("%s: row-wise error %v, want at most %v", c.name, worst, c.tol)
		}
	}
	if u := Walk(2000, 0.502).Exact[99]; math.Abs(u-0.550673014999) > 1e-11 {
		t.Errorf("walk from 100: %v, want 0.550673014999", u)
	}
	if u := WalkLength(2000).Exact[699]; u != 910000 {
		t.Errorf("walk length from 700: %v, want 910000", u)
	}
}

func trap(g, penalty float64) Known {
	a, b := FlowTrap(100, g, penalty)
	return Known{Matrix: a, Right: b, Exact: TrapExact(100, g, penalty)}
}

func rowwise(a *csr.Matrix, x, b []float64) float64 {
	worst := 0.0
	for i := range a.Rows {
		cols, vals := a.Row(i)
		left, size := b[i], math.Abs(b[i])
		for k, c := range cols {
			left -= vals[k] * x[c]
			size += math.Abs(vals[k] * x[c])
		}
		if size > 0 {
			worst = max(worst, math.Abs(left)/size)
		}
	}
	return worst
}

// The trap: with every inner head zero the plain residual passes 1e-8, and the
// heads are wrong by 50 m.
func TestFlowTrapDeceivesThePlainNorm(t *testing.T) {
	for _, c := range []struct {
		name       string
		g, penalty float64
		want       float64 // plain relative residual, order of magnitude
	}{{"identity rows", 1e-9, 0, 1e-9}, {"penalty rows", 1, 1e12, 1e-12}} {
		k := trap(c.g, c.penalty)
		wrong, y := make([]float64, len(k.Exact)), make([]float64, len(k.Exact))
		for i := range wrong {
			if k.Right[i] != 0 {
				wrong[i] = k.Exact[i]
			}
		}
		k.Matrix.Mul(y, wrong)
		for i := range y {
			y[i] -= k.Right[i]
		}
		plain := math.Sqrt(dot(y, y) / dot(k.Right, k.Right))
		if plain > 2*c.want || plain < c.want/2 {
			t.Errorf("%s: plain residual %v, want about %v", c.name, plain, c.want)
		}
		if plain > 1e-8 || math.Abs(wrong[5000]-k.Exact[5000]) < 40 {
			t.Errorf("%s: no trap: residual %v, head %v of %v", c.name, plain, wrong[5000], k.Exact[5000])
		}
	}
}

func TestCantileverFrequencies(t *testing.T) {
	k, m := Cantilever(20)
	if !symmetric(k) || !symmetric(m) {
		t.Fatal("stiffness or mass is not symmetric")
	}
	var c mat.Dense
	if err := c.Solve(dense(k), dense(m)); err != nil { // K⁻¹·M has the eigenvalues 1/λ
		if _, ill := err.(mat.Condition); !ill {
			t.Fatal(err)
		}
	}
	var e mat.Eigen
	if !e.Factorize(&c, mat.EigenNone) {
		t.Fatal("no eigenvalues")
	}
	largest := []float64{0, 0, 0}
	for _, v := range e.Values(nil) {
		for i := range largest {
			if real(v) > largest[i] {
				copy(largest[i+1:], largest[i:])
				largest[i] = real(v)
				break
			}
		}
	}
	for i, want := range []float64{3.5160, 22.0345, 61.6972} { // Thomson, appendix D
		if got := 1 / math.Sqrt(largest[i]); math.Abs(got-want) > 1e-4*want {
			t.Errorf("(βL)² number %d: %v, want %v", i+1, got, want)
		}
	}
}

// The lowest frequency of a square plate by inverse iteration.
func TestPlateFrequencies(t *testing.T) {
	for _, c := range []struct {
		name    string
		clamped bool
		want    float64
	}{{"supported", false, 19.739}, {"clamped", true, 35.985}} { // plate handbooks, from memory
		const m = 39
		a, x := Plate13(m, c.clamped), constant(m*m, 1)
		lambda := 0.0
		for range 6 {
			y := conjugate(t, a, x)
			lambda = dot(x, y) / dot(y, y)
			x = y
		}
		if got := math.Sqrt(lambda) * (m + 1) * (m + 1); math.Abs(got-c.want) > 4e-3*c.want {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
}

// Theis (1935): drawdown Q/(4πT)·W(u) = 0.6025 m at 100 m after a day, with
// W(u) = −γ − ln u + u − u²/4 and u = r²·S/(4T·t) = 2.9e-4; 400 steps that grow
// by the same factor, 200 rings.
func TestWellDrawsDownAsTheisSays(t *testing.T) {
	w := Well{Transmissivity: 1e-2, Storage: 1e-4, Rate: 1e-2, Inner: 0.1, Outer: 3e4, Rings: 200}
	s := make([]float64, w.Rings)
	now, growth := 60.0, math.Pow(86400/60, 1.0/400)
	for step := range 400 {
		dt := now * (growth - 1)
		if step == 0 {
			dt = now * growth
		}
		now *= growth
		a, stored := w.Step(dt)
		for i := range s {
			s[i] *= stored[i]
		}
		s[0] += w.Rate
		thomas(a, s)
	}
	at := 0
	for w.Radius(at+1) < 100 {
		at++
	}
	share := math.Log(100/w.Radius(at)) / math.Log(w.Radius(at+1)/w.Radius(at))
	got := s[at] + share*(s[at+1]-s[at])
	const euler = 0.5772156649015329
	u := 1e4 * w.Storage / (4 * w.Transmissivity * 86400)
	want := w.Rate / (4 * math.Pi * w.Transmissivity) * (u - u*u/4 - euler - math.Log(u))
	if math.Abs(got-want) > 2e-3*want {
		t.Errorf("drawdown %v m, want %v", got, want)
	}
}

// thomas overwrites b by the answer of a tridiagonal system.
func thomas(a *csr.Matrix, b []float64) {
	n := a.Rows
	d := make([]float64, n)
	for i := range n {
		d[i] = a.At(i, i)
		if i > 0 {
			f := a.At(i, i-1) / d[i-1]
			d[i] -= f * a.At(i-1, i)
			b[i] -= f * b[i-1]
		}
	}
	for i := n - 1; i >= 0; i-- {
		if i < n-1 {
			b[i] -= a.At(i, i+1) * b[i+1]
		}
		b[i] /= d[i]
	}
}

func TestNeumannIsSingularAndConsistent(t *testing.T) {
	a, b := Neumann2D(30), NeumannRight(900, 2)
	y, sum := make([]float64, 900), 0.0
	a.Mul(y, constant(900, 1))
	for i := range y {
		if y[i] != 0 {
			t.Fatalf("row %d of A·1 is %v", i, y[i])
		}
		sum += b[i]
	}
	if math.Abs(sum) > 1e-11 || !symmetric(a) {
		t.Errorf("right side sums to %v; symmetric %v", sum, symmetric(a))
	}
}

func TestSmallMatrices(t *testing.T) {
	d := FewEigenvalues(1000, 40, 1e-8, 1)
	seen := map[float64]bool{}
	for i := range d.Rows {
		seen[d.At(i, i)] = true
	}
	if len(seen) != 40 || math.Abs(d.At(0, 0)-1e-8) > 1e-20 || math.Abs(d.At(39, 39)-1) > 1e-13 {
		t.Errorf("%d eigenvalues from %v to %v, want 40 from 1e-8 to 1", len(seen), d.At(0, 0), d.At(39, 39))
	}
	if b := Bidiagonal(5, 1, 2); b.At(3, 3) != 1 || b.At(3, 4) != 2 || b.Entries() != 9 {
		t.Errorf("Bidiagonal(5, 1, 2) = %v", b)
	}
	if i := Identity(3); i.Entries() != 3 || i.At(2, 2) != 1 {
		t.Errorf("Identity(3) = %v", i)
	}
}

// Problem B conserves what is not carried by the flow: with v left out of the
// comparison a row sums to what reaches the walls, so inner rows sum to zero.
func TestProblemBRowsSumToZeroInside(t *testing.T) {
	const m = 12
	a, b := ProblemB(m, 1)
	for k := range a.Rows {
		p := [3]int{k / (m * m), k / m % m, k % m}
		cols, vals := a.Row(k)
		sum, size := 0.0, 0.0
		for e := range cols {
			sum, size = sum+vals[e], size+math.Abs(vals[e])
		}
		inner := true
		for d := range 3 {
			inner = inner && p[d] > 0 && p[d] < m-1
		}
		if inner && math.Abs(sum) > 1e-14*size || !inner && sum <= 0 {
			t.Fatalf("row %d (inner %v) sums to %v", k, inner, sum)
		}
	}
	if len(b) != m*m*m || b[0] != b[len(b)-1] {
		t.Errorf("right side %v … %v", b[0], b[len(b)-1])
	}
}
