// Package precond builds the preconditioners that a worker applies to its own
// rows: M⁻¹ approximates the inverse of the diagonal block of its row block,
// the couplings to other row blocks (halo columns) left out.
//
// A Preconditioner is a fixed linear operator; it never depends on the number
// of threads. The rows are split into sub-blocks, whose number follows from the
// number of rows alone, and couplings between sub-blocks are left out too. A
// few neighbouring sub-blocks form a part: one thread solves the sub-blocks of
// a part row by row in turn, because a triangular solve waits for its previous
// row and two unrelated ones fill each other's gaps. What is solved in turn
// with what changes no bit.
//
// Indices are local to the row block and zero-based; ranges are half-open. The
// package does no I/O and starts no goroutine; whoever wants a parallel set-up
// passes Options.Each. A Preconditioner may be applied by many goroutines at
// once as long as they write to different rows.
package precond

import (
	"fmt"
	"strings"

	"rowstead/partition/csr"
)

// The kinds of preconditioner, by the names that flags and records use.
const (
	None     = "none"     // z = r
	Diagonal = "diagonal" // z = r divided by the diagonal
	ILU0     = "ilu0"     // incomplete LU on the pattern of the matrix
	ILUT     = "ilut"     // incomplete LU with dropping by size and by count
)

// Preconditioner applies M⁻¹ to vectors of the row block's length. z and r may
// be the same slice but must not overlap otherwise; the methods panic when a
// length is wrong.
type Preconditioner interface {
	// Apply forms z = M⁻¹·r, all parts in order.
	Apply(z, r []float64)
	// ApplyTransposed forms z = M⁻ᵀ·r.
	ApplyTransposed(z, r []float64)
	// Parts is the number of parts, at least 1, which may run in parallel when z
	// and r are different slices, or the same.
	Parts() int
	// ApplyPart forms the rows of z that belong to one part, 0 ≤ part < Parts();
	// z and r are the whole vectors. The bits are those of Apply.
	ApplyPart(z, r []float64, part int)
	// Bytes is the memory it holds.
	Bytes() int64
}

// Options shape a preconditioner. The zero value is the default.
type Options struct {
	// Drop is τ of ilut: entries of row i below τ times the mean size of the
	// entries of row i of A are left out. 0: 1e-3; negative: none is left out.
	Drop float64
	// Fill is the most entries ilut keeps in a row of L and in a row of U, beside
	// the diagonal. 0: 20.
	Fill int
	// SubBlocks is the number of row sub-blocks. 0: chosen from the rows alone.
	SubBlocks int
	// Interleave is the number of sub-blocks of a part, Threads the number of
	// threads that will share the parts. Neither changes a bit. Interleave 0: 2, or
	// up to 4 as long as Threads, if given, leaves every thread a part: 4 is the
	// quickest for one thread, 8 is slower again.
	Interleave, Threads int
	// Node is the number of unknowns interleaved at a node, which a sub-block
	// never splits. 0: 1.
	Node int
	// Symmetric says that A is symmetric and M must be too, as conjugate
	// gradients need: ilu0 takes its L·D·Lᵀ form.
	Symmetric bool
	// SingleFactors keeps the entries of L and U in 32 bits. M is then the product
	// of the rounded factors: still one fixed linear operator.
	SingleFactors bool
	// Each calls do(0) … do(count−1), each once, in any order or in parallel, and
	// returns when all have returned; the preconditioner is the same whatever it
	// does. nil: one after the other.
	Each func(count int, do func(i int))
}

// Report says what was built, and why if it is not what was asked for.
type Report struct {
	Asked   string  // the kind asked for
	Kind    string  // what it became
	Entries int     // stored numbers of the preconditioner, diagonal included
	Fill    float64 // Entries in units of the local entries of A
	// Pivots are the first few rows whose pivot was too small and was replaced;
	// PivotCount is how many there are.
	Pivots     []int
	PivotCount int
	// Growth is max |x|ᵢ·cᵢ over x = M⁻¹·(±d), where d holds the largest entry of
	// each row of A and cᵢ is the largest entry of column i after the rows are
	// divided by d: for an equilibrated matrix ‖M⁻¹·(±1)‖∞. Misfit is
	// max |(A·x ∓ d)ᵢ/dᵢ| inside the sub-blocks; x = 0 would leave 1.
	Growth, Misfit float64
	// Reason says in plain words why Kind is not Asked, or what else was changed;
	// empty when nothing was.
	Reason string
	Parts  int // independent parts
	Blocks int // row sub-blocks
	// Symmetric says that M is symmetric; PositiveDefinite that it is positive
	// definite too. Both are only found out with Options.Symmetric.
	Symmetric, PositiveDefinite bool
	// Shift is the largest α by which diagonals were raised to (1+α)·aᵢᵢ so that
	// the pivots of a symmetric factor became positive.
	Shift float64
}

// recipe makes one kind; fault says in plain words why it is of no use.
type recipe func(a *csr.Matrix, o Options, r *Report) (p Preconditioner, fault string)

// step is a kind and how it is made.
type step struct {
	kind string
	make recipe
}

// ladder lists the kinds from the strongest to the one that always works; when
// a kind is of no use, the next one is tried.
func ladder() []step {
	return []step{{ILUT, makeILUT}, {ILU0, makeILU0}, {Diagonal, makeDiagonal}, {None, makeNone}}
}

// Kinds lists the kinds that Build knows, weakest first.
func Kinds() []string { return []string{None, Diagonal, ILU0, ILUT} }

// Build makes the preconditioner of a row block. a has the block's rows; its
// first a.Rows columns are the rows' own and any further ones are halo columns,
// which are left out. a is read only and not kept. Tolerances expect the
// largest entry of each row to be about 1, but any scale works.
//
// An unstable or broken factor is a result, not an error: the next kind in the
// order ilut, ilu0, diagonal, none takes its place and the Report says why. An
// error says that the kind does not exist or the options make no sense.
func Build(kind string, a *csr.Matrix, o Options) (Preconditioner, Report, error) {
	rungs := ladder()
	first := -1
	for i, s := range rungs {
		if s.kind == kind {
			first = i
		}
	}
	if first < 0 {
		return nil, Report{}, fmt.Errorf("precondition: no kind %q; there are %s", kind, strings.Join(Kinds(), ", "))
	}
	o, err := o.complete()
	if err != nil {
		return nil, Report{}, err
	}
	if a.Cols < a.Rows {
		return nil, Report{}, fmt.Errorf("precondition: a row block of %d rows has only %d columns", a.Rows, a.Cols)
	}
	var remarks []string
	if o.Symmetric {
		if i, j, ok := asymmetry(a); !ok {
			o.Symmetric = false
			remarks = append(remarks, fmt.Sprintf("the matrix is not symmetric: entries (%d, %d) and (%d, %d) differ", i, j, j, i))
		}
	}
	for _, s := range rungs[first:] {
		report := Report{Asked: kind, Kind: s.kind, Symmetric: o.Symmetric}
		p, fault := s.make(a, o, &report)
		if fault != "" {
			remarks = append(remarks, s.kind+" is of no use here: "+fault)
			continue
		}
		if report.Reason != "" {
			remarks = append(remarks, report.Reason)
		}
		report.Reason = strings.Join(remarks, "; ")
		report.Parts = p.Parts()
		if n := localEntries(a); n > 0 {
			report.Fill = float64(report.Entries) / float64(n)
		}
		return p, report, nil
	}
	panic("precond: the kind none is always of use")
}
