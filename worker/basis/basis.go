// Package basis keeps a row block's part of the basis vectors of one cycle: in
// 64 bits, in 32, or only the last few of them with the coefficients that make
// the others again.
//
// Its noun is the Basis. Vectors count from zero and are as long as the block
// has rows; ranges of rows begin at multiples of kernel.Tile. Whatever is asked
// of a vector is answered for the vector as it is kept, rounded where the form
// rounds. All memory is taken by Reset, once as long as the capacity does not
// grow, and touched there. No goroutine starts here; methods that take a range
// may run at the same time on ranges that do not overlap, the others alone.
package basis

import (
	"fmt"

	"rowstead/worker/kernel"
)

// The forms of a basis, by the names that flags and records use.
const (
	Double = "double"
	Single = "single"
	Replay = "replay"
)

// Basis is a row block's part of the vectors b_0 … b_{Len−1} and of the one that
// is being made, the newest.
type Basis interface {
	// Reset empties the basis and makes room. Memory is taken only when it holds
	// less than that. each runs a task on every range of rows, so that pages are
	// touched by those who use them.
	Reset(room Room, each func(task func(r kernel.Range)))
	// Len is the number of vectors, the newest included.
	Len() int
	// Bytes is the memory held.
	Bytes() int64
	// Check returns an error unless the step can be taken: there is room, and the
	// vectors that it and the window need are kept.
	Check(s Step, window int) error
	// Begin adds the vector that follows from w by step s, to be made range by
	// range by Form; window is the number of vectors, the new one included, whose
	// dots Form takes, at most Len. s.H is copied where it is kept.
	Begin(w []float64, s Step, window int)
	// Form makes the rows r of the newest vector and adds its dots with the
	// window, itself last, to gram.
	Form(gram []float64, r kernel.Range)
	// Newest returns the rows r of the newest vector: its own memory, or scratch,
	// of r's length, filled.
	Newest(scratch []float64, r kernel.Range) []float64
	// Dots adds w·b_i over r to out for the last len(out) vectors.
	Dots(out, w []float64, r kernel.Range)
	// Reduce sets w ← w − Σ h[i]·b_i over r and adds to out the dots of the new w
	// with every vector, and then w·w.
	Reduce(out, w, h []float64, r kernel.Range)
	// Combine adds Σ_j t[c·ldt+j]·b_j, j < k, to every dst[c] over r.
	Combine(dst [][]float64, t []float64, ldt, k int, r kernel.Range)
}

// Room is what one cycle asks of a basis.
type Room struct {
	Rows     int
	Capacity int // most vectors
	Window   int // most vectors that Dots and Form refer to, in replay form
}

// Step is b = (w − Σ H[i]·b_{Lo+i})/Norm.
type Step struct {
	Lo   int
	H    []float64
	Norm float64
}

// New returns an empty basis of a form. An unknown form is an error.
func New(form string) (Basis, error) {
	switch form {
	case Double:
		return &columns[float64]{}, nil
	case Single:
		return &columns[float32]{}, nil
	case Replay:
		return &Ring{}, nil
	}
	return nil, fmt.Errorf("basis: no form %q; there are %s, %s and %s", form, Double, Single, Replay)
}
