package matfile

import (
	"fmt"
	"io"
	"math"
)

// cells reads the elements of a NumPy array one block after the other.
type cells struct {
	name  string // of the file, in errors
	in    io.Reader
	array *npyArray
	left  int64 // elements not yet read
	raw   []byte
	value []float64
	index []int64
	at    int // of the next one in index
}

const cellBlock = 16 << 10 // elements a block

// openCells reads the header; closing in is the caller's.
func openCells(in io.Reader, name string) (*cells, error) {
	a, err := readNpyHeader(in, name)
	if err != nil {
		return nil, err
	}
	n, _ := a.count()
	return &cells{name: name, in: in, array: a, left: n}, nil
}

// block reads the bytes of up to most elements, none at the end.
func (c *cells) block(most int) ([]byte, error) {
	n := int(min(c.left, int64(most)))
	if cap(c.raw) < n*c.array.size {
		c.raw = make([]byte, n*c.array.size)
	}
	raw := c.raw[:n*c.array.size]
	if got, err := io.ReadFull(c.in, raw); err != nil {
		return nil, &FileError{Path: c.name, Expected: fmt.Sprintf("%d elements more", c.left), Found: fmt.Sprintf("the end of the array after %d", got/c.array.size), Err: truncation(err)}
	}
	c.left -= int64(n)
	return raw, nil
}

// finish checks that nothing stands behind the last element; inside an archive
// this also lets the checksum be compared.
func (c *cells) finish() error {
	var one [1]byte
	n, err := io.ReadFull(c.in, one[:])
	if n > 0 {
		return &FileError{Path: c.name, Expected: "the end of the array", Found: "more bytes"}
	}
	if err != io.EOF {
		return &FileError{Path: c.name, Expected: "a whole array", Found: "a broken one", Err: err}
	}
	return nil
}

// floats returns the next elements as float64, a complex one as two; none at
// the end. A 64-bit integer beyond 2^53 is rounded. The slice is valid until
// the next call.
func (c *cells) floats() ([]float64, error) {
	raw, err := c.block(cellBlock)
	if err != nil {
		return nil, err
	}
	out := c.value[:0]
	a := c.array
	switch {
	case a.kind == 'f' && a.size == 8 || a.kind == 'c' && a.size == 16:
		for ; len(raw) >= 8; raw = raw[8:] {
			out = append(out, math.Float64frombits(a.order.Uint64(raw)))
		}
	case a.kind == 'f' || a.kind == 'c':
		for ; len(raw) >= 4; raw = raw[4:] {
			out = append(out, float64(math.Float32frombits(a.order.Uint32(raw))))
		}
	case a.kind == 'u' && a.size == 8:
		for ; len(raw) >= 8; raw = raw[8:] {
			out = append(out, float64(a.order.Uint64(raw)))
		}
	default:
		for ; len(raw) >= a.size; raw = raw[a.size:] {
			out = append(out, float64(a.integer(raw)))
		}
	}
	c.value = out
	for k, v := range out {
		if !finite(v) {
			n, _ := a.count()
			at := n - c.left - int64(len(out)/c.perElement()) + int64(k/c.perElement())
			return nil, &FileError{Path: c.name, Expected: "finite numbers", Found: fmt.Sprintf("%v as element %d", v, at+1)}
		}
	}
	return out, nil
}

// perElement is how many numbers an element holds.
func (c *cells) perElement() int {
	if c.array.kind == 'c' {
		return 2
	}
	return 1
}

// integer reads one element that is a whole number or a truth value.
func (a *npyArray) integer(raw []byte) int64 {
	if a.kind == 'b' {
		if raw[0] != 0 {
			return 1
		}
		return 0
	}
	switch a.size {
	case 1:
		if a.kind == 'u' {
			return int64(raw[0])
		}
		return int64(int8(raw[0]))
	case 2:
		if a.kind == 'u' {
			return int64(a.order.Uint16(raw))
		}
		return int64(int16(a.order.Uint16(raw)))
	case 4:
		if a.kind == 'u' {
			return int64(a.order.Uint32(raw))
		}
		return int64(int32(a.order.Uint32(raw)))
	}
	return int64(a.order.Uint64(raw))
}

// nextIndex returns the next element of an array of whole numbers.
func (c *cells) nextIndex() (int64, error) {
	if c.at == len(c.index) {
		raw, err := c.block(cellBlock)
		if err != nil {
			return 0, err
		}
		if len(raw) == 0 {
			return 0, &FileError{Path: c.name, Expected: "another index", Found: "the end of the array"}
		}
		c.index, c.at = c.index[:0], 0
		for ; len(raw) > 0; raw = raw[c.array.size:] {
			c.index = append(c.index, c.array.integer(raw))
		}
	}
	c.at++
	return c.index[c.at-1], nil
}
