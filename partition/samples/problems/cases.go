package problems

import (
	"fmt"
	"math"

	"rowstead/partition/csr"
)

// Case is one problem on which products were counted.
type Case struct {
	Name         string
	Precondition string // none, diagonal, ilu0, ilut, overlap1
	Blocks       int    // row blocks of the preconditioner
	Ones         bool   // b = A·(1, …, 1) instead of a random one
	Make         func() *csr.Matrix
}

// Count is what was counted on the Case of the same place in Cases.
type Count struct {
	Name         string
	Precondition string
	Blocks       int
	// Ladder is the number of products A·v that sketched GMRES with a window of
	// four vectors and full steps by condition took, Full that of a sketched
	// full orthogonalisation in every step with the same restarts.
	Ladder, Full int
	// Noted is the number first noted for a problem of this law, with other
	// random numbers where there are any. 0: none.
	Noted int
	// Stands says that neither converged: the honest end is "stagnated".
	Stands bool
}

// Right is the right side of a case: standard normal numbers (seed 5), each
// times the power of two by which scaling the rows of a to a unit maximum
// divides. So the scaled system has a standard normal right side, and neither
// norm is ruled by a few rows.
func (c Case) Right(a *csr.Matrix) []float64 {
	if c.Ones {
		b := make([]float64, a.Rows)
		a.Mul(b, constant(a.Cols, 1))
		return b
	}
	b := NormalVector(a.Rows, 5)
	for i := range b {
		_, vals := a.Row(i)
		largest := 0.0
		for _, v := range vals {
			largest = max(largest, math.Abs(v))
		}
		_, e := math.Frexp(largest)
		b[i] = math.Ldexp(b[i], e)
	}
	return b
}

// Cases are the problems on which products were counted. Random ones stand with
// six seeds each, because their counts differ by more than the methods do.
func Cases() []Case {
	upwind := func() *csr.Matrix { return ConvectionDiffusion2D(150, 100, 30, Upwind) }
	eddy := func(m int) func() *csr.Matrix {
		return func() *csr.Matrix { return Recirculating2D(m, 200, Central) }
	}
	helmholtz := func() *csr.Matrix { return Helmholtz2D(120, 0.05) }
	list := []Case{
		{"convection-diffusion 150², upwind", "none", 1, false, upwind},
		{"recirculating 150²", "none", 1, false, eddy(150)},
		{"recirculating 150²", "ilu0", 4, false, eddy(150)},
		{"recirculating 200²", "ilu0", 4, false, eddy(200)},
		{"recirculating 200²", "ilut", 8, false, eddy(200)},
		{"recirculating 200²", "overlap1", 8, false, eddy(200)},
		{"Poisson 200²", "none", 1, false, func() *csr.Matrix { return Poisson2D(200) }},
		{"Helmholtz 120²", "ilu0", 4, false, helmholtz},
		{"Helmholtz 120²", "ilut", 8, false, helmholtz},
		{"Helmholtz 120²", "overlap1", 8, false, helmholtz},
		{"Grcar 20,000", "none", 1, false, func() *csr.Matrix { return Grcar(20000, 3) }},
		{"convection-dominated 150², central", "none", 1, false, func() *csr.Matrix { return ConvectionDiffusion2D(150, 5000, 2000, Central) }},
		{"7-point 30³, upwind", "none", 1, false, func() *csr.Matrix { return ConvectionDiffusion3D(30, [3]float64{80, 20, 10}, Upwind) }},
		{"27-point 30³", "none", 1, false, func() *csr.Matrix { return Stencil27(30) }},
		{"rows of 10^±3", "ilu0", 4, true, func() *csr.Matrix { return BadRows(upwind(), 3, 1) }},
		{"rows of 10^±6", "ilu0", 4, true, func() *csr.Matrix { return BadRows(upwind(), 6, 1) }},
		{"problem B 30³", "ilu0", 4, false, func() *csr.Matrix { a, _ := ProblemB(30, 1); return a }},
		{"cyclic shift 20,000", "none", 1, false, func() *csr.Matrix { return CyclicShift(20000) }},
	}
	for seed := uint64(1); seed <= 6; seed++ {
		plane := func(m int) func() *csr.Matrix {
			return func() *csr.Matrix { return LogNormal([]int{m, m}, 5, 4, seed) }
		}
		list = append(list,
			Case{fmt.Sprintf("log-normal 180², 5 decades, seed %d", seed), "ilu0", 4, false, plane(180)},
			Case{fmt.Sprintf("log-normal 150², 5 decades, seed %d", seed), "overlap1", 8, false, plane(150)},
			Case{fmt.Sprintf("log-normal 30³, 6 decades, seed %d", seed), "diagonal", 1, false, func() *csr.Matrix { return LogNormal([]int{30, 30, 30}, 6, 4, seed) }},
			Case{fmt.Sprintf("circuit 20,000, seed %d", seed), "ilu0", 4, false, func() *csr.Matrix { return Circuit(20000, seed) }},
			Case{fmt.Sprintf("circuit 15,000, seed %d", seed), "overlap1", 8, false, func() *csr.Matrix { return Circuit(15000, seed) }},
		)
	}
	return list
}
