// Package coordinator runs a job from its files to its answer: read, scale,
// order, cut, place, solve, check, write. It owns the clock, the phases and the
// progress, and records every choice with its reason.
//
// Its nouns are the Job (what was asked), the Rim (what the outside world does
// for it: places rows, tells the time, keeps snapshots) and the record, which
// Run fills as it goes, so that whatever fails, what was known is told. Rows are
// global and zero-based. One Run uses one goroutine beside those it waits for.
package coordinator

import (
	"context"
	"errors"
	"time"

	"rowstead/coordinator/method"
	"rowstead/coordinator/report"
	"rowstead/partition"
	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

// Auto is the value of a choice that is left to the program.
const Auto = "auto"

// Job is what was asked. Zero values and Auto are chosen by Run.
type Job struct {
	Matrix, Right, Guess string // paths; Right and Guess may be empty
	Cuts                 string // path of a list of cuts, or empty
	Trial                bool   // b = A·(1, …, 1), the answer is known
	Out                  string // path of the answer
	Overwrite            bool
	// OwnShort says that an earlier try of this run wrote a short answer that nobody
	// has changed since; it may be replaced. ShortPath is where it is; empty: under
	// the usual name.
	OwnShort  bool
	ShortPath string

	Tolerance     float64 // required
	Method        string
	Precondition  string
	Basis         string // Auto, or a method.BasisForm
	Window        int
	Cycle         int
	SketchRows    int
	Seed          uint64
	Blocks        int
	Here          int // worker processes on this machine, a block each; 0: none
	Threads       int
	IndexBase     matfile.IndexBase
	Memory        int64         // bytes that may be used; 0: a share of what is free
	TimeLimit     time.Duration // of the whole run; 0: none
	SnapshotEvery time.Duration // 0: no snapshots on the way

	// Start is the answer to begin with, one column a right side, in the order
	// of the file; it goes before Guess.
	Start [][]float64
	// Hashes are the SHA-256 that inputs must have, by role; nil: any.
	Hashes map[string]string
}

// Rim is what the outside world does for a Run. Every function is required.
type Rim struct {
	// Place cuts the rows into blocks and gives them to workers.
	Place func(ctx context.Context, p Placement) (Placed, error)
	// Now is the clock.
	Now func() time.Time
	// FreeMemory is what could be used without swapping, in bytes.
	FreeMemory func() (int64, error)
	// PeakMemory is the largest size of this process so far, 0 if unknown.
	PeakMemory func() int64
	// Phase is told of every phase when it begins; a report.State.
	Phase func(state string)
	// Opened is told once the inputs are known to be good.
	Opened func(r *report.Record)
	// Progress is told how far the run is.
	Progress func(p report.Progress)
	// Stop is asked before every step; a text ends the run and is its reason.
	Stop func() string
	// Snapshot keeps the answer so far, one column a right side.
	Snapshot func(done int, x [][]float64) error
}

// Placement is a system and how its rows are to be held.
type Placement struct {
	Matrix       *csr.Matrix // in the order of the blocks; handed over
	RowExponent  []int16     // e of the row scaling 2^e
	Cuts         partition.RowCuts
	Right, Guess []float64 // in the order of the blocks; copied
	Precondition string
	Threads      int
	Conjugate    bool // prepare for conjugate gradients
	Node         int  // unknowns interleaved at a node, at least 1
}

// Factor is what became of one block's preconditioner.
type Factor struct {
	Kind   string
	Reason string // why it is not what was asked for
	// Definite says that it is known to be symmetric positive definite.
	Definite bool
}

// Placed is a system whose rows are held by workers. It is used by one goroutine
// and must be closed.
type Placed interface {
	method.Space
	method.ConjugateSpace
	// Prepare scales for conjugate gradients or for the other methods, and
	// builds the preconditioner anew; x and b stay.
	Prepare(ctx context.Context, precondition string, conjugate bool) error
	// Factors tells what became of the preconditioner, block by block.
	Factors() []Factor
	SetRight(ctx context.Context, b []float64) error
	SetGuess(ctx context.Context, x []float64) error
	// Solution returns x in a slice of its own.
	Solution(ctx context.Context) ([]float64, error)
	// Workers tells who holds what, with the largest memory so far.
	Workers(ctx context.Context) ([]report.Worker, error)
	// HaloEntries is how many entries of a vector cross borders in a product.
	HaloEntries() int
	Close()
}

// Meter is a Placed whose steps move something between processes.
type Meter interface {
	// Moved is what was moved so far.
	Moved(ctx context.Context) (Moved, error)
}

// Moved are bytes of whole messages, down and up, and whose halos took the long
// way.
type Moved struct {
	Coordinator int64    // in steps, between the coordinator and all workers
	Halo        int64    // in steps, between workers
	Relayed     []string // pairs of workers whose halos go through the coordinator
}

// InputError is a fault of the files or of what was asked about them.
type InputError struct{ Text string }

func (e *InputError) Error() string { return e.Text }

// ErrInterrupted says that the run was asked to stop before there was an answer.
var ErrInterrupted = errors.New("interrupted before there was an answer to keep")

// Reasons of a Stop beside those of package method.
const (
	ReasonInterrupted = "interrupted"
	ReasonTime        = "time limit"
)
