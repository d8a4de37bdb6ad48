package matfile

import (
	"fmt"
	"io"
	"math"

	"rowstead/partition/csr"
)

// Dense is one vector or several side by side: right sides, guesses, answers.
type Dense struct {
	Rows, Cols int
	Complex    bool      // entries are interleaved: rows 2k and 2k+1 are re and im of entry k
	Values     []float64 // column-major, length Rows·Cols
}

// Column returns column j, which aliases the values.
func (d *Dense) Column(j int) []float64 {
	return d.Values[j*d.Rows : (j+1)*d.Rows : (j+1)*d.Rows]
}

// Interleaved returns d as complex: itself where it is so already, else a copy
// of twice the rows with zero imaginary parts. A real right side of a complex
// matrix needs this.
func (d *Dense) Interleaved() *Dense {
	if d.Complex {
		return d
	}
	out := &Dense{Rows: 2 * d.Rows, Cols: d.Cols, Complex: true, Values: make([]float64, 2*len(d.Values))}
	for k, v := range d.Values {
		out.Values[2*k] = v
	}
	return out
}

// ReadDense reads vectors from any format that can hold them: Matrix Market
// array or coordinate, NumPy, the right sides of a Harwell-Boeing file, or a
// plain list of numbers, one line a row. The header's Rows and Cols are those
// of the Dense: a complex file doubles the rows alone.
func ReadDense(path string, o Options) (*Dense, Header, error) {
	r, err := open(path, o, asVectors)
	if err != nil {
		return nil, Header{}, err
	}
	defer r.Close()
	h := r.head
	if h.Complex {
		h.Cols /= 2
	}
	body, dense := r.body.(*denseBody)
	if !dense || h.Symmetry != "general" {
		d, err := scatter(r, h)
		return d, h, err
	}
	values, err := collect(body.source)
	if err != nil {
		return nil, h, err
	}
	if h.Format == "numbers" {
		if err := tellTable(&h, values); err != nil {
			return nil, h, err
		}
	}
	d := &Dense{Rows: h.Rows, Cols: h.Cols, Complex: h.Complex, Values: values}
	if body.order.byRow && h.Cols > 1 {
		d.Values = byColumn(d)
	}
	return d, h, nil
}

// collect reads all numbers of a dense file; memory grows with what was read.
func collect(source valueSource) ([]float64, error) {
	var all []float64
	for {
		part, err := source.nextValues()
		if err == io.EOF {
			return all, nil
		}
		if err != nil {
			return nil, err
		}
		all = append(all, part...)
	}
}

// tellTable completes the header of a plain table of numbers. A table of three
// columns whose first two hold only whole numbers could be triplets: that is
// refused.
func tellTable(h *Header, values []float64) error {
	h.Rows, h.Stored = len(values)/h.Cols, int64(len(values))
	for k := 0; k < len(values); k += h.Cols {
		if h.Cols != 3 || !isIndex(values[k]) || !isIndex(values[k+1]) {
			return nil
		}
	}
	return &FileError{Path: h.Path, Expected: "vectors as a Matrix Market array, or a table of numbers",
		Found: "three columns that could be rows, columns and values", Flag: "--index-base 1 (or 0) as triplets"}
}

func isIndex(v float64) bool { return v >= 0 && v == math.Trunc(v) && v <= math.MaxInt32 }

// byColumn reorders values that came row after row.
func byColumn(d *Dense) []float64 {
	width := 1
	if d.Complex {
		width = 2
	}
	out := make([]float64, len(d.Values))
	for k := range d.Rows / width {
		for j := range d.Cols {
			from := (k*d.Cols + j) * width
			copy(out[j*d.Rows+k*width:][:width], d.Values[from:])
		}
	}
	return out
}

// zerosAllowed is how many unstored positions a sparse vector file may have.
const zerosAllowed = 1 << 26

// scatter fills a Dense from entries; duplicates are summed in file order.
func scatter(r *Reader, h Header) (*Dense, error) {
	var parts []csr.Triplets
	entries := 0
	for {
		var t csr.Triplets
		err := r.Next(&t)
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		parts = append(parts, t)
		entries += len(t.V)
	}
	if size := int64(h.Rows) * int64(h.Cols); size > zerosAllowed+rowsPerEntry*int64(entries) {
		return nil, &FileError{Path: h.Path, Expected: fmt.Sprintf("vectors in proportion to %d entries", entries), Found: fmt.Sprintf("%d by %d", h.Rows, h.Cols)}
	}
	d := &Dense{Rows: h.Rows, Cols: h.Cols, Complex: h.Complex, Values: make([]float64, h.Rows*h.Cols)}
	for _, t := range parts {
		for k, v := range t.V {
			at := int(t.J[k])*d.Rows + int(t.I[k])
			if d.Values[at] += v; !finite(d.Values[at]) {
				return nil, &FileError{Path: h.Path, Row: int(t.I[k]) + 1, Expected: "duplicates whose sum is finite", Found: "a sum beyond the range of numbers"}
			}
		}
	}
	return d, nil
}
