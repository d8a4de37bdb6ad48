package fleet

import (
	"context"
	"errors"
	"fmt"
	"math"
	"sort"

	"rowstead/coordinator/method"
)

// Squares is a sum of squares that can neither overflow nor underflow before its
// root is taken: the sum over small, middling and large values, the small ones
// multiplied by 2^537 before they are squared and the large ones by 2^-538.
// Small is |v| < 2^-511, large |v| > 2^486. Sums add element by element. Blue,
// "A portable Fortran program to find the Euclidean norm of a vector"; the
// constants are those of LAPACK's la_constants module, from memory.
type Squares = [3]float64

// ResidualSums is one member's part of method.Residuals.
type ResidualSums struct {
	Inner, InnerRight      Squares // D·r, D·b
	True, Right            Squares // r, b
	Scaled, ScaledRight    Squares // r, b by rows divided by their largest entry
	TrueFloor, ScaledFloor Squares // |A|·|x| + |b| in the units of True and Scaled
	Solution, InnerMatrix  Squares // x, entries of D·A
	WorstRow               []int   // global, worst first, equal errors by row
	WorstError             []float64
	ResidualMax, RightMax  float64
	SolutionMax, MatrixMax float64
	Finite                 bool
	Products               int // Correct: products spent beside the residual's own
}

// StepSums is one member's part of method.Stepped.
type StepSums struct {
	Gram, Dots, SketchW, HoldW []float64
	WW                         float64
}

// SketchSums is one member's part of S·b_i and S'·b_i.
type SketchSums struct{ Sketch, Hold []float64 }

// DotSums is one member's part of the answer of Reduce.
type DotSums struct {
	Dots []float64
	WW   float64
}

// RecycleSums is one member's part of method.Recycled.
type RecycleSums struct{ SU, SAZ, HoldAZ []float64 }

// PairSums are the two norms of Gradient and Probe before the root.
type PairSums struct{ First, Second Squares }

// ConjugateSums are the scalars of conjugate gradients: r·r and r·z, or p·q as
// RZ.
type ConjugateSums struct{ RR, RZ float64 }

func isCanceled(err error) bool { return errors.Is(err, context.Canceled) }

// sums is a total and the part of one member.
type sums struct {
	total *[]float64
	part  []float64
}

// add adds the parts of member i to their totals; member 0 sets them, in the room
// they have. A part of another length than member 0's is an error.
func (f *Space) add(op string, i int, all ...sums) error {
	for _, s := range all {
		if i == 0 {
			*s.total = append((*s.total)[:0], s.part...)
			continue
		}
		if len(s.part) != len(*s.total) {
			return f.memberError(i, op, fmt.Errorf("%d sums came, %d from %s", len(s.part), len(*s.total), f.members[0].Name()))
		}
		for k, v := range s.part {
			(*s.total)[k] += v
		}
	}
	return nil
}

func addSquares(sum *Squares, v Squares) {
	for i := range sum {
		sum[i] += v[i]
	}
}

// root returns the norm of which s is the sum of squares. NaN and infinities
// pass through.
func root(s Squares) float64 {
	const smallUp, largeDown = 0x1p537, 0x1p-538
	small, middle, large := s[0], s[1], s[2]
	switch {
	case large != 0: // small ones cannot matter beside it
		return math.Sqrt(large+(middle*largeDown)*largeDown) / largeDown
	case small == 0:
		return math.Sqrt(middle)
	case middle == 0:
		return math.Sqrt(small) / smallUp
	}
	return math.Hypot(math.Sqrt(middle), math.Sqrt(small)/smallUp)
}

// worstRows is how many of the worst rows Residuals names.
const worstRows = 8

// epsilon is the distance from 1 to the next number, as in the floors.
const epsilon = 0x1p-52

// residuals puts the parts together in block order.
func residuals(parts []ResidualSums) method.Residuals {
	var s ResidualSums
	s.Finite = true
	var worst []method.RowError
	for _, p := range parts {
		for _, f := range []struct {
			sum  *Squares
			part Squares
		}{
			{&s.Inner, p.Inner}, {&s.InnerRight, p.InnerRight}, {&s.True, p.True}, {&s.Right, p.Right},
			{&s.Scaled, p.Scaled}, {&s.ScaledRight, p.ScaledRight}, {&s.TrueFloor, p.TrueFloor},
			{&s.ScaledFloor, p.ScaledFloor}, {&s.Solution, p.Solution}, {&s.InnerMatrix, p.InnerMatrix},
		} {
			addSquares(f.sum, f.part)
		}
		for i, row := range p.WorstRow {
			worst = append(worst, method.RowError{Row: row, Error: p.WorstError[i]})
		}
		s.ResidualMax, s.RightMax = math.Max(s.ResidualMax, p.ResidualMax), math.Max(s.RightMax, p.RightMax)
		s.SolutionMax, s.MatrixMax = math.Max(s.SolutionMax, p.SolutionMax), math.Max(s.MatrixMax, p.MatrixMax)
		s.Finite = s.Finite && p.Finite
	}
	// The parts come by ascending rows, so a stable sort keeps equal errors by row.
	sort.SliceStable(worst, func(a, b int) bool { return worst[a].Error > worst[b].Error })
	r := method.Residuals{
		Inner: root(s.Inner), InnerRight: root(s.InnerRight), True: root(s.True), Right: root(s.Right),
		Scaled: root(s.Scaled), ScaledRight: root(s.ScaledRight),
		TrueFloor: epsilon * root(s.TrueFloor), ScaledFloor: epsilon * root(s.ScaledFloor),
		Worst:       worst[:min(worstRows, len(worst))],
		ResidualMax: s.ResidualMax, RightMax: s.RightMax, SolutionMax: s.SolutionMax, MatrixMax: s.MatrixMax,
		Solution: root(s.Solution), InnerMatrix: root(s.InnerMatrix), Finite: s.Finite,
	}
	if len(r.Worst) > 0 {
		r.RowWise = r.Worst[0].Error
	}
	return r
}
