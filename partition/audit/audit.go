// Package audit checks an answer x of A·x = b from the files alone, by a path
// of its own: it shares the file readers with the solver and nothing else.
//
// It streams the matrix: once to count the entries of every row, then once for
// every band of rows whose entries fit the memory that is allowed. Only b, x
// and eight bytes a row stay. Every row of b − A·x is formed in double-double
// arithmetic, with about 32 digits, and norms neither overflow nor underflow:
// values of 1e300 and of 1e-300 may stand side by side.
//
// Duplicates of a position are summed in file order before anything else, as
// package csr does. Complex systems are audited in their real form, rows 2k and
// 2k+1 for equation k; a real matrix with a complex b or x is taken as complex.
// Numbers are the same bits whatever the memory. The package starts no
// goroutine beside the reader's.
package audit

import (
	"context"
	"errors"
	"fmt"
	"math"

	"rowstead/partition/matfile"
)

// Files are the paths of the system and of the answer.
type Files struct {
	Matrix, Right, Answer string
}

// Options steer an audit; the zero value of every field is its default.
type Options struct {
	Tolerance float64 // of the true and the scaled residual; 1e-8
	Memory    int64   // bytes for the entries of a band, beside O(rows); 256 MiB. A band has a row at least
	Read      matfile.Options
}

// Result is what the files say.
type Result struct {
	Rows, Unknowns int   // of A; of its real form if Complex, twice the file's
	Complex        bool  // A, b or x is
	Entries        int64 // after duplicates were summed; of the real form if Complex
	Duplicates     int64 // entries that were added to an earlier one
	ZeroRows       int   // rows without a nonzero
	FirstZeroRow   int   // the first of them, a row of the file from 0; −1 without one
	MatrixMax      float64
	Bands          int // how often the matrix was read after the count
	Tolerance      float64
	Columns        []Column // of b and x, one a right side
	Met            bool     // every column is
}

// Column is the verdict on one right side and its answer, with r = b − A·x.
// Norms are Euclidean unless the name says Max. A number beyond the range of
// float64 is given as the largest float64.
type Column struct {
	// True is ‖r‖/‖b‖ in the units of the file; with b = 0 it is ‖r‖ itself, so
	// that only an answer which solves exactly has 0.
	True float64
	// Scaled is the same after every row of A and b is divided by the row's
	// largest |entry|; a row without a nonzero is divided by 1.
	Scaled float64
	// RowWise is max |r|ᵢ/(|A|·|x| + |b|)ᵢ, with 0 for 0/0.
	RowWise float64
	Worst   []RowError // the rows with the largest row-wise errors above 0, at most 8
	// Backward is ‖r‖∞/(‖A‖∞·‖x‖∞ + ‖b‖∞), with 0 for 0/0.
	Backward float64
	// TrueFloor and ScaledFloor are what rounding alone may leave of True and
	// Scaled: ε·‖|A|·|x| + |b|‖ over the same right side, ε = 2⁻⁵².
	TrueFloor, ScaledFloor float64

	Residual, Right, Solution          float64 // ‖r‖, ‖b‖, ‖x‖
	ResidualMax, RightMax, SolutionMax float64 // ‖r‖∞, ‖b‖∞, ‖x‖∞

	Met bool // True and Scaled are at or below the tolerance
}

// RowError is one row and its row-wise error.
type RowError struct {
	Row       int  // of the file, from 0
	Imaginary bool // of a complex system: its imaginary part
	Error     float64
}

const (
	defaultTolerance = 1e-8
	defaultMemory    = 256 << 20
	epsilon          = 0x1p-52
	worstRows        = 8
)

// validate fills in the defaults.
func (o *Options) validate() error {
	var faults []error
	if !(o.Tolerance >= 0) || o.Tolerance > math.MaxFloat64 {
		faults = append(faults, fmt.Errorf("audit: tolerance %v; want a positive number", o.Tolerance))
	}
	if o.Memory < 0 {
		faults = append(faults, fmt.Errorf("audit: %d bytes of memory; want a positive number", o.Memory))
	}
	if o.Tolerance == 0 {
		o.Tolerance = defaultTolerance
	}
	if o.Memory == 0 {
		o.Memory = defaultMemory
	}
	return errors.Join(faults...)
}

// Check audits the answer. Errors name the file and, where there is one, the
// line: what cannot be read, shapes that do not fit, duplicates whose sum is not
// finite, a matrix that changed between two passes. An answer that is wrong is a
// Result and no error.
func Check(ctx context.Context, f Files, o Options) (*Result, error) {
	if err := o.validate(); err != nil {
		return nil, err
	}
	s, err := open(f, o)
	if err != nil {
		return nil, err
	}
	counts, err := s.count(ctx)
	if err != nil {
		return nil, err
	}
	sums := newSums(s)
	bands := cutBands(counts, o.Memory)
	room := newBand(bands, counts)
	for _, rows := range bands {
		if err := s.fill(ctx, room, rows, counts); err != nil {
			return nil, err
		}
		if err := sums.addBand(room); err != nil {
			return nil, err
		}
	}
	result := sums.result(o.Tolerance)
	result.Bands = len(bands)
	return result, nil
}
