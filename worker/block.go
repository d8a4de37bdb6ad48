// Package worker holds one worker's rows and the verbs on them: products,
// basis, sketches, corrections and residuals.
//
// Its noun is the Block: rows of D·A and of b, x, a basis, a recycled space and a
// preconditioner of the block's own square part. A Block knows its neighbours
// only through a halo.Exchange and nobody else; what it answers are sums over
// its rows, which others add in block order. The package does no network I/O.
//
// Rows of vectors are local and count from zero; FirstRow and the rows in answers
// are global. D·A has powers of two in D, so going back to the units of the file
// is exact. For conjugate gradients S·A·S is kept instead and S plays the part of
// D. Every sum runs by tiles of rows, in strips that follow from the number of
// rows alone, so that no bit depends on the number of threads.
//
// Verbs are called one at a time, those of neighbouring blocks at the same time
// and in the same order. Slices in an answer stay valid until the next verb. A
// verb returns a Refusal when it is not allowed as things stand, or another error
// when the exchange fails; after the latter the blocks have come apart and only
// Solution, Memory and Close make sense. A Block starts the goroutines of its team; Close
// ends them.
package worker

import (
	"context"
	"fmt"
	"slices"

	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/sketch"
	"rowstead/worker/basis"
	"rowstead/worker/halo"
	"rowstead/worker/kernel"
	"rowstead/worker/precond"
)

// Config is what a Block is made of.
type Config struct {
	// Matrix has the block's rows in the units of the file, in local columns: the
	// own rows first, the halo after them. The Block takes it over and writes to
	// its values; nobody else may use it afterwards.
	Matrix   *csr.Matrix
	FirstRow int // global, a multiple of sketch.Lanes
	// Plan and Exchange bring the halo; both may be nil when there is none.
	Plan     *partition.BlockHalo
	Exchange halo.Exchange
	// RowExponent has e of D = 2^e for the own rows; nil: D is the identity.
	RowExponent []int16
	Right       []float64 // b in the units of the file; copied
	Guess       []float64 // x to begin with; copied; nil: zero
	Threads     int       // at least 1
}

// Preparation says what system the verbs work on.
type Preparation struct {
	Precondition string // a kind of package precond
	Options      precond.Options
	// Conjugate keeps S·A·S with S = 2^e made from the diagonal and allows the
	// verbs of conjugate gradients; otherwise D·A is kept, with D from the Config.
	Conjugate bool
}

// Block is one worker's rows.
type Block struct {
	matrix   *csr.Matrix // D·A or S·A·S
	firstRow int
	rows     int
	halo     *halo.Halo // nil without neighbours
	lower    int        // halo columns that belong to blocks before this one
	team     *kernel.Team
	strips   []kernel.Range

	given     []int16   // e of D as configured
	row       []int16   // e of the rows of matrix as it stands
	column    []int16   // e of its columns, halo included; nil: all zero
	entry     []float64 // the largest of each row, row-scaled; see matrixSums
	conjugate bool
	factors   precond.Preconditioner // nil until prepared
	identity  bool                   // M is the identity
	constants constants

	right       []float64 // b, in the units of the file
	x, try      []float64 // with halo; S⁻¹·x for conjugate gradients
	w, spare, z []float64 // z with halo
	start       []float64 // replay: the w of Start
	tried       bool
	cycle       Cycle
	started     bool
	basis       basis.Basis
	op, hold    sketch.Operator
	sketches    []float64 // S·b_j and S'·b_j, one after the other
	sketchParts *kernel.Partials
	gram, dots  *kernel.Partials
	sums        StepSums
	sketchW     []float64
	sketchOut   SketchSums
	space       recycled
	totals      []float64 // room for sums
}

// New returns a Block that must be prepared before any verb. It panics when
// lengths in c disagree.
func New(c Config) *Block {
	n, width := c.Matrix.Rows, c.Matrix.Cols
	if width < n || len(c.Right) != n || (c.Guess != nil && len(c.Guess) != n) ||
		(c.RowExponent != nil && len(c.RowExponent) != n) || c.FirstRow%sketch.Lanes != 0 {
		panic("worker: lengths disagree in Config, or a first row that is no multiple of 8")
	}
	b := &Block{
		matrix: c.Matrix, firstRow: c.FirstRow, rows: n,
		team: kernel.NewTeam(c.Threads), strips: kernel.Strips(n),
		given: make([]int16, n), row: make([]int16, n), entry: make([]float64, n),
		right: make([]float64, n),
		x:     make([]float64, width), try: make([]float64, width), z: make([]float64, width),
		w: make([]float64, n), spare: make([]float64, n),
	}
	if c.Plan != nil && len(c.Plan.Columns)+len(c.Plan.Send) > 0 {
		b.halo = halo.New(c.Plan, c.Exchange)
		b.lower, _ = slices.BinarySearch(c.Plan.Columns, int32(c.FirstRow))
	}
	copy(b.given, c.RowExponent)
	copy(b.right, c.Right)
	copy(b.x, c.Guess)
	return b
}

// Close ends the goroutines of the block.
func (b *Block) Close() { b.team.Close() }

// Range returns the block's global rows [lo, hi).
func (b *Block) Range() (lo, hi int) { return b.firstRow, b.firstRow + b.rows }

// each runs task on every strip, several at a time.
func (b *Block) each(task func(strip int, r kernel.Range)) {
	b.team.Run(len(b.strips), func(i int) { task(i, b.strips[i]) })
}

// tiles calls task for every tile of r in order.
func tiles(r kernel.Range, task func(t kernel.Range)) {
	for lo := r.Lo; lo < r.Hi; lo += kernel.Tile {
		task(kernel.Range{Lo: lo, Hi: min(lo+kernel.Tile, r.Hi)})
	}
}

// gather brings the halo of v, which has room for it.
func (b *Block) gather(ctx context.Context, v []float64) error {
	if b.halo == nil {
		return ctx.Err()
	}
	return b.halo.Gather(ctx, v[:b.rows], v[b.rows:])
}

// precondition sets the own rows of z to M⁻¹·r; r may be those rows.
func (b *Block) precondition(z, r []float64) {
	own := z[:b.rows]
	b.team.Run(b.factors.Parts(), func(part int) { b.factors.ApplyPart(own, r, part) })
}

// Memory is what a block holds, in bytes by part.
type Memory struct {
	Matrix, Factors, Basis, Recycled, Sketches, Vectors, Halo int64
}

// Total is the sum of all parts.
func (m Memory) Total() int64 {
	return m.Matrix + m.Factors + m.Basis + m.Recycled + m.Sketches + m.Vectors + m.Halo
}

// Memory counts what the block holds now.
func (b *Block) Memory() Memory {
	m := Memory{
		Matrix:   int64(8*len(b.matrix.Start) + 12*len(b.matrix.Col)),
		Recycled: 8 * int64(len(b.space.slab)),
		Vectors: 8*int64(len(b.right)+len(b.entry)+len(b.x)+len(b.try)+len(b.z)+len(b.w)+len(b.spare)+len(b.start)) +
			2*int64(len(b.given)+len(b.row)+len(b.column)),
		Sketches: 8 * int64(cap(b.sketches)+len(b.strips)*b.sketchRows()),
	}
	if b.factors != nil {
		m.Factors = b.factors.Bytes()
	}
	if b.basis != nil {
		m.Basis = b.basis.Bytes()
	}
	if b.halo != nil {
		m.Halo = b.halo.Bytes()
	}
	return m
}

// Solution sets into, of the block's length, to x in the units of the file.
func (b *Block) Solution(into []float64) {
	copy(into, b.x[:b.rows])
	if b.column != nil {
		for i := range into {
			into[i] = scaled(into[i], int(b.column[i]))
		}
	}
}

// SetRight replaces b, in the units of the file; x stays. The basis is emptied.
func (b *Block) SetRight(right []float64) {
	copy(b.right, right)
	b.started, b.tried = false, false
	b.rightSums()
}

// SetGuess replaces x, in the units of the file. The basis is emptied.
func (b *Block) SetGuess(x []float64) {
	copy(b.x[:b.rows], x)
	b.started, b.tried = false, false
	if b.column != nil {
		for i := range b.rows {
			b.x[i] = scaled(b.x[i], -int(b.column[i]))
		}
	}
}

// Refusal is the error of a verb that is not allowed as things stand. Nothing has
// been done and no halo exchanged: the block can go on.
type Refusal struct{ Text string }

// Error says what was refused.
func (r *Refusal) Error() string { return "worker: " + r.Text }

func refuse(format string, args ...any) error {
	return &Refusal{fmt.Sprintf(format, args...)}
}

// ready returns an error unless the block is prepared for that kind of verb.
func (b *Block) ready(conjugate bool) error {
	switch {
	case b.factors == nil:
		return refuse("the block is not prepared")
	case conjugate && !b.conjugate:
		return refuse("the block is not prepared for conjugate gradients")
	case !conjugate && b.conjugate:
		return refuse("the block is prepared for conjugate gradients")
	}
	return nil
}
