package worker

import "math"

// The types of this file are the verbs' questions and answers. Their fields are
// those of the coordinator's types of the same names, which this package does
// not import.

// HoldRows is the length of the hold-out sketch.
const HoldRows = 64

// Cycle fixes the sketch and the room of one cycle.
type Cycle struct {
	Seed       uint64
	SketchRows int // a multiple of 8·Zeta; 0: no sketches are taken
	Zeta       int
	Capacity   int    // most basis vectors
	Window     int    // most vectors of Gram and window dots
	Form       string // a form of package basis
}

// Step tells how the next basis vector follows from w: b_j = (w − Σ
// H[i]·b_{Lo+i})/Norm; then, if Product, w ← C·b_j.
type Step struct {
	Lo      int
	H       []float64
	Norm    float64
	Product bool
	Dots    int
	SketchW bool
}

// Correction asks for x_try = x + Z·YU + M⁻¹·B·Y and, with T, for U_new =
// U·T_U + B·T_B; T is (len(YU)+len(Y))×Directions, column-major.
type Correction struct {
	Y          []float64
	YU         []float64
	T          []float64
	Directions int
}

// Squares is a sum of squares kept apart by size of the values so that it can
// neither overflow nor underflow: small ones, below 2^-511, times 2^537 before
// they are squared, middling ones, and large ones, above 2^486, times 2^-538.
// Blue, "A portable Fortran program to find the Euclidean norm of a vector"; the
// constants are those of LAPACK's la_constants module, from memory.
type Squares = [3]float64

// ResidualSums is the block's part of the residuals.
type ResidualSums struct {
	Inner, InnerRight      Squares // D·r, D·b
	True, Right            Squares // r, b
	Scaled, ScaledRight    Squares // r, b by rows divided by their largest entry
	TrueFloor, ScaledFloor Squares // |A|·|x| + |b| in the units of True and Scaled
	Solution, InnerMatrix  Squares // x, entries of D·A
	WorstRow               []int   // global, worst first, equal errors by row
	WorstError             []float64
	ResidualMax, RightMax  float64 // infinite where r is not finite
	SolutionMax, MatrixMax float64
	Finite                 bool
	Products               int // Correct: products spent beside the residual's own
}

// StepSums is the block's part of the answer to a Step.
type StepSums struct {
	Gram, Dots, SketchW, HoldW []float64
	WW                         float64
}

// SketchSums is the block's part of S·b_i and S'·b_i.
type SketchSums struct{ Sketch, Hold []float64 }

// DotSums is the block's part of the answer of Reduce.
type DotSums struct {
	Dots []float64
	WW   float64
}

// RecycleSums are the block's parts of S·U, S·C·U and S'·C·U.
type RecycleSums struct{ SU, SAZ, HoldAZ []float64 }

// PairSums are two norms before the root.
type PairSums struct{ First, Second Squares }

// ConjugateSums are r·r and r·z, or p·q as RZ.
type ConjugateSums struct{ RR, RZ float64 }

// square adds v² to s.
func square(s *Squares, v float64) {
	const small, large, smallUp, largeDown = 0x1p-511, 0x1p486, 0x1p537, 0x1p-538
	switch a := math.Abs(v); {
	case a > large:
		v *= largeDown
		s[2] += float64(v * v)
	case a < small:
		v *= smallUp
		s[0] += float64(v * v)
	default: // NaN too
		s[1] += float64(v * v)
	}
}

// squares adds the squares of v to s.
func squares(s *Squares, v []float64) {
	for _, vi := range v {
		square(s, vi)
	}
}

// addSquares adds part to s.
func addSquares(s *Squares, part Squares) {
	for i := range s {
		s[i] += part[i]
	}
}
