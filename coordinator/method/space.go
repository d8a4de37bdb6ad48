// Package method holds the iterative methods: sketched GMRES with its safe
// ladder, the classical orthogonal reference, and conjugate gradients.
//
// A method asks a Space for what only long vectors can tell and sees sketches
// and scalars alone, so it runs in a test with a few row blocks and no network.
// Everything inside runs on the equilibrated system D·A·x = D·b, D powers of
// two; C = D·A·M⁻¹ is that system with its right preconditioner M. The package
// starts no goroutine, reads no clock and prints nothing. Indices of basis
// vectors count from zero within a cycle; dense matrices are column-major.
package method

import "context"

// BasisForm says how the workers keep basis vectors.
type BasisForm string

const (
	// Double keeps every vector in 64 bits.
	Double BasisForm = "double"
	// Single keeps every vector rounded to 32 bits; sketches are of the rounded
	// vectors.
	Single BasisForm = "single"
	// Replay keeps the last Window+3 vectors and runs the recurrence again in
	// Correct. Only window steps are possible, and Try is refused.
	Replay BasisForm = "replay"
)

// HoldRows is the length of the hold-out sketch, which is never minimised.
const HoldRows = 64

// Cycle fixes the sketch and the room of one cycle.
type Cycle struct {
	Seed       uint64 // of S; the hold-out sketch S' has a seed made from it
	SketchRows int    // s, a multiple of 8·Zeta; 0: no sketches are taken
	Zeta       int    // nonzeros of S a row of the problem
	Capacity   int    // most basis vectors, b₀ included
	Window     int    // most vectors that Gram and window dots refer to
	Form       BasisForm
}

// Step tells how the next basis vector follows from w, and what is wanted of
// it. With j vectors so far, b_j = (w − Σ H[i]·b_{Lo+i})/Norm; then, if Product,
// w ← C·b_j.
type Step struct {
	Lo      int
	H       []float64
	Norm    float64 // not zero
	Product bool
	Dots    int  // with Product: w·b_i for the last Dots vectors, b_j included
	SketchW bool // with Product: S·w and S'·w in the answer
}

// Stepped answers a Step. All sums are over all rows, in block order.
type Stepped struct {
	Gram    []float64 // b_i·b_j for the last min(Window, j+1) vectors, i ascending to j
	Dots    []float64 // w·b_i, i ascending to j
	WW      float64   // w·w
	SketchW []float64 // S·w, length SketchRows
	HoldW   []float64 // S'·w, length HoldRows
}

// Correction asks for x_try = x + Z·YU + M⁻¹·B·Y, and with T for the vectors
// U_new = U·T_U + B·T_B of the next recycled space.
type Correction struct {
	Y  []float64 // length k ≤ number of basis vectors
	YU []float64 // length of the recycled space, or nil
	// T is (len(YU)+len(Y))×Directions, column-major, the rows of U first.
	T          []float64
	Directions int
}

// Recycled are the sketches of the recycled space for the cycle to come.
type Recycled struct {
	SU     []float64 // S·U, s×d column-major
	SAZ    []float64 // S·C·U
	HoldAZ []float64 // S'·C·U, HoldRows×d
}

// RowError is one row and its row-wise error.
type RowError struct {
	Row   int // global, in the order of the space
	Error float64
}

// Residuals is what a recomputed residual r = b − A·x says. Norms are
// Euclidean unless the name says Max; nothing in it comes from a sketch.
type Residuals struct {
	Inner, InnerRight   float64 // ‖D·r‖, ‖D·b‖: the norm of the iteration
	True, Right         float64 // ‖r‖, ‖b‖ in the units of the file
	Scaled, ScaledRight float64 // rows divided by their largest entry
	// TrueFloor and ScaledFloor are what rounding alone may leave:
	// ε·‖|A|·|x| + |b|‖ in the norms of True and Scaled.
	TrueFloor, ScaledFloor float64
	RowWise                float64    // max |r|ᵢ / (|A|·|x| + |b|)ᵢ
	Worst                  []RowError // the worst rows, worst first, at most 8
	ResidualMax, RightMax  float64    // ‖r‖∞, ‖b‖∞
	SolutionMax            float64    // ‖x‖∞
	MatrixMax              float64    // ‖A‖∞, the largest row sum
	Solution               float64    // ‖x‖
	InnerMatrix            float64    // ‖D·A‖_F
	Finite                 bool       // x and r hold no NaN and no infinity
}

// Space is what the sketched and the orthogonal method need of the long
// vectors. It holds A, b, x and M, a basis and a recycled space. Its verbs are
// called one at a time. An error means that the surroundings failed; the
// mathematics never makes one.
type Space interface {
	// Rows is the number of unknowns.
	Rows() int
	// Start recomputes r = b − A·x, empties the basis and sets w ← D·r.
	Start(ctx context.Context, c Cycle) (Residuals, error)
	// Advance carries out a Step.
	Advance(ctx context.Context, s Step) (Stepped, error)
	// Sketches waits for S·b_i and S'·b_i, i in [from, to): s×(to−from) and
	// HoldRows×(to−from), column-major. The slices stay valid until the next call.
	Sketches(ctx context.Context, from, to int) (sb, hold []float64, err error)
	// Reduce sets w ← w − Σ h[i]·b_i over the whole basis and returns the new
	// dots w·b_i and w·w.
	Reduce(ctx context.Context, h []float64) (dots []float64, ww float64, err error)
	// Try forms x_try of a Correction without T and its residuals. x, w and the
	// basis stay as they are.
	Try(ctx context.Context, c Correction) (Residuals, error)
	// Correct is Try at the end of a cycle; it may form U_new too, and in replay
	// form runs the recurrence again. products counts what that took beside the
	// residual's own product.
	Correct(ctx context.Context, c Correction) (r Residuals, products int, err error)
	// Keep sets x ← x_try.
	Keep(ctx context.Context) error
	// Recycle turns U_new of the last Correct into the recycled space: Z = M⁻¹·U
	// and D·A·Z by true products, with the sketches of the cycle to come.
	Recycle(ctx context.Context, next Cycle) (Recycled, error)
	// Forget drops the recycled space.
	Forget(ctx context.Context) error
	// Check recomputes the residuals of x.
	Check(ctx context.Context) (Residuals, error)
	// Gradient returns ‖(D·A)ᵀ·D·r‖ and ‖D·r‖ for x, one product with Aᵀ.
	Gradient(ctx context.Context) (gradient, residual float64, err error)
	// Probe returns ‖v‖ and ‖D·A·v‖ for v = Z·YU + M⁻¹·B·Y.
	Probe(ctx context.Context, c Correction) (v, av float64, err error)
}

// ConjugateSpace is what conjugate gradients need. The system is S·A·S·t = S·b,
// x = S·t, with S powers of two, so that symmetry is kept.
type ConjugateSpace interface {
	Rows() int
	// StartConjugate sets r = S·(b − A·x), z = M⁻¹·r, p = 0; returns r·r and r·z.
	StartConjugate(ctx context.Context) (rr, rz float64, err error)
	// Direct sets p ← z + beta·p and q = S·A·S·p; returns p·q.
	Direct(ctx context.Context, beta float64) (pq float64, err error)
	// Move sets t ← t + alpha·p, r ← r − alpha·q, z = M⁻¹·r; returns r·r, r·z.
	Move(ctx context.Context, alpha float64) (rr, rz float64, err error)
	// Check recomputes the residuals of x.
	Check(ctx context.Context) (Residuals, error)
}
