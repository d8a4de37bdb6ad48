package audit

import (
	"context"
	"fmt"
	"io"
	"math"

	"rowstead/partition/csr"
	"rowstead/partition/matfile"
)

// system is the matrix file and the vectors that belong to it.
type system struct {
	files      Files
	read       matfile.Options
	head       matfile.Header
	rows, cols int  // of A as it is audited
	isComplex  bool // rows and columns 2k and 2k+1 belong together
	double     bool // a real matrix with complex vectors: every entry stands twice
	right      *matfile.Dense
	answer     *matfile.Dense
}

// open reads the vectors and the header of the matrix and checks the shapes, so
// that nothing is allocated on the word of a header alone.
func open(f Files, o Options) (*system, error) {
	right, _, err := matfile.ReadDense(f.Right, o.Read)
	if err != nil {
		return nil, err
	}
	answer, _, err := matfile.ReadDense(f.Answer, o.Read)
	if err != nil {
		return nil, err
	}
	s := &system{files: f, read: o.Read, right: right, answer: answer}
	reader, err := matfile.Open(f.Matrix, o.Read)
	if err != nil {
		return nil, err
	}
	s.head = reader.Header()
	if err := reader.Close(); err != nil {
		return nil, fmt.Errorf("audit: close %s: %w", f.Matrix, err)
	}
	s.rows, s.cols = s.head.Rows, s.head.Cols
	s.isComplex = s.head.Complex || right.Complex || answer.Complex
	if s.isComplex {
		s.right, s.answer = right.Interleaved(), answer.Interleaved()
		if s.double = !s.head.Complex; s.double {
			if max(s.rows, s.cols) > math.MaxInt32/2 {
				return nil, misfit(f.Matrix, fmt.Sprintf("at most %d rows and columns beside complex vectors", math.MaxInt32/2), max(s.rows, s.cols))
			}
			s.rows, s.cols = 2*s.rows, 2*s.cols
		}
	}
	return s, s.checkShapes()
}

func (s *system) checkShapes() error {
	size := 1
	if s.isComplex {
		size = 2
	}
	switch {
	case s.right.Rows != s.rows:
		return misfit(s.files.Right, fmt.Sprintf("%d rows, as %s has", s.rows/size, s.files.Matrix), s.right.Rows/size)
	case s.answer.Rows != s.cols:
		return misfit(s.files.Answer, fmt.Sprintf("%d rows, as %s has columns", s.cols/size, s.files.Matrix), s.answer.Rows/size)
	case s.answer.Cols != s.right.Cols:
		return misfit(s.files.Answer, fmt.Sprintf("%d columns, as %s has", s.right.Cols, s.files.Right), s.answer.Cols)
	}
	return nil
}

func misfit(path, expected string, found int) error {
	return &matfile.FileError{Path: path, Expected: expected, Found: fmt.Sprint(found)}
}

// changed says that a later pass over the matrix met another file.
func (s *system) changed() error {
	return &matfile.FileError{Path: s.files.Matrix, Expected: "the same entries in every pass", Found: "others; was the file written to meanwhile?"}
}

// fileRow returns the row of the file that row i belongs to, and whether it is
// the imaginary part of its equation.
func (s *system) fileRow(i int) (row int, imaginary bool) {
	if s.isComplex {
		return i / 2, i%2 == 1
	}
	return i, false
}

// pass reads the matrix once and hands its entries to use, chunk by chunk in
// file order.
func (s *system) pass(ctx context.Context, use func(t *csr.Triplets) error) (err error) {
	reader, err := matfile.Open(s.files.Matrix, s.read)
	if err != nil {
		return err
	}
	defer func() {
		if closed := reader.Close(); err == nil && closed != nil {
			err = fmt.Errorf("audit: close %s: %w", s.files.Matrix, closed)
		}
	}()
	if reader.Header() != s.head {
		return s.changed()
	}
	var chunk, twice csr.Triplets
	for {
		if err := ctx.Err(); err != nil {
			return fmt.Errorf("audit %s: %w", s.files.Matrix, err)
		}
		err := reader.Next(&chunk)
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return err
		}
		entries := &chunk
		if s.double {
			doubled(&twice, &chunk)
			entries = &twice
		}
		if err := use(entries); err != nil {
			return err
		}
	}
}

// doubled sets to to the real form of real entries: a at (2i, 2j) and at
// (2i+1, 2j+1).
func doubled(to, from *csr.Triplets) {
	to.I, to.J, to.V = to.I[:0], to.J[:0], to.V[:0]
	for k, v := range from.V {
		i, j := int(from.I[k]), int(from.J[k])
		to.Add(2*i, 2*j, v)
		to.Add(2*i+1, 2*j+1, v)
	}
}
