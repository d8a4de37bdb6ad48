package matfile

import (
	"fmt"
	"io"
	"math"
)

// openNpy opens a NumPy array of one or two dimensions.
func openNpy(in *stream, purpose use) (*Reader, error) {
	c, err := openCells(in.in, in.path)
	if err != nil {
		return nil, err
	}
	a := c.array
	if a.kind == 'S' || a.kind == 'U' || len(a.shape) < 1 || len(a.shape) > 2 {
		return nil, &FileError{Path: in.path, Expected: "an array of numbers with one or two dimensions", Found: fmt.Sprintf("%d dimensions of type %c%d", len(a.shape), a.kind, a.size)}
	}
	rows, cols := a.shape[0], int64(1)
	if len(a.shape) == 2 {
		cols = a.shape[1]
	}
	h := Header{Path: in.path, Format: "npy", Layout: "array", Compression: in.compression, Symmetry: "general", Field: a.field(), Complex: a.kind == 'c', Dense: true}
	if err := h.setShape(rows, cols, 0); err != nil {
		return nil, err
	}
	h.Stored = c.left
	if in.size >= 0 && c.left > in.size/int64(a.size) {
		return nil, &FileError{Path: in.path, Expected: fmt.Sprintf("%d elements", c.left), Found: fmt.Sprintf("a file of %d bytes", in.size)}
	}
	order := newWalk(int(rows), int(cols), !a.fortran && cols > 1, "general")
	source := &npyValues{in: in, cells: c}
	return &Reader{head: h, body: &denseBody{source: source, order: order, isComplex: h.Complex, path: in.path, expand: expansionOf("general", h.Complex, purpose == asVectors)}}, nil
}

// field is the name of the element type in the words of Matrix Market.
func (a *npyArray) field() string {
	switch a.kind {
	case 'c':
		return "complex"
	case 'f':
		return "real"
	}
	return "integer"
}

// setShape fills in Rows and Cols, doubled when Complex, and refuses what no
// int32 index reaches.
func (h *Header) setShape(rows, cols int64, line int) error {
	most := int64(math.MaxInt32)
	scale := 1
	if h.Complex {
		most, scale = most/2, 2
	}
	if rows < 1 || cols < 1 || rows > most || cols > most {
		why := ""
		switch {
		case rows > most || cols > most:
			why = ", which is too large"
		case rows < 0 || cols < 0:
			why = ", which is negative"
		}
		return &FileError{Path: h.Path, Line: line, Expected: fmt.Sprintf("between 1 and %d rows and columns", most), Found: fmt.Sprintf("%d by %d%s", rows, cols, why)}
	}
	h.Rows, h.Cols = scale*int(rows), scale*int(cols)
	if h.Symmetry != "general" && rows != cols {
		return &FileError{Path: h.Path, Line: line, Expected: "as many rows as columns in a " + h.Symmetry + " file", Found: fmt.Sprintf("%d by %d", rows, cols)}
	}
	return nil
}

// npyValues reads the elements of a .npy file in their own order.
type npyValues struct {
	in    *stream
	cells *cells
	ahead *ahead
}

func (s *npyValues) nextValues() ([]float64, error) {
	if s.ahead == nil {
		s.ahead = newAhead(s.in.in)
		s.cells.in = s.ahead
	}
	values, err := s.cells.floats()
	if err == nil && len(values) == 0 {
		if err = s.cells.finish(); err == nil {
			err = io.EOF
		}
	}
	return values, err
}

func (s *npyValues) close() error {
	if s.ahead != nil {
		s.ahead.close()
	}
	return s.in.close()
}
