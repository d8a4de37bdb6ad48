package matfile

import (
	"fmt"
	"io"

	"rowstead/partition/csr"
)

// npzBody delivers the entries of a SciPy sparse archive, its large members
// inflated side by side.
type npzBody struct {
	file    *npzFile
	opened  []io.Closer
	aheads  []*ahead
	values  *cells
	row     *cells // coo: rows; else nil
	pointer *cells // csr, csc: starts; else nil
	index   *cells // coo: columns; else indices
	expand  expansion
	major   int   // csr: row, csc: column that is being read
	left    int64 // entries left in it
	end     int64 // last start read
}

// open opens a large member with a goroutine that inflates ahead.
func (b *npzBody) open(name string) (*cells, error) {
	in, full, err := b.file.member(name)
	if err != nil {
		return nil, err
	}
	a := newAhead(in)
	b.opened, b.aheads = append(b.opened, in), append(b.aheads, a)
	c, err := openCells(a, full)
	if err != nil {
		return nil, err
	}
	if c.array.kind == 'S' || c.array.kind == 'U' || len(c.array.shape) != 1 || name != "data" && !contains([]string{"i4", "i8", "u4", "u8"}, fmt.Sprintf("%c%d", c.array.kind, c.array.size)) {
		return nil, &FileError{Path: full, Expected: "a list of numbers (32- or 64-bit indices)", Found: fmt.Sprintf("%d dimensions of type %c%d", len(c.array.shape), c.array.kind, c.array.size)}
	}
	return c, nil
}

// start opens the index members and compares the lengths.
func (b *npzBody) start() error {
	var err error
	if b.file.format == "coo" {
		if b.row, err = b.open("row"); err != nil {
			return err
		}
		if b.index, err = b.open("col"); err != nil {
			return err
		}
		return b.sameLength(b.row, b.index)
	}
	if b.pointer, err = b.open("indptr"); err != nil {
		return err
	}
	if b.index, err = b.open("indices"); err != nil {
		return err
	}
	majors := b.file.rows
	if b.file.format == "csc" {
		majors = b.file.cols
	}
	if b.pointer.left != int64(majors)+1 {
		return &FileError{Path: b.pointer.name, Expected: fmt.Sprintf("%d starts", int64(majors)+1), Found: fmt.Sprint(b.pointer.left)}
	}
	first, err := b.pointer.nextIndex()
	if err == nil && first != 0 {
		err = &FileError{Path: b.pointer.name, Expected: "0 as the first start", Found: fmt.Sprint(first)}
	}
	if err != nil {
		return err
	}
	b.major = -1
	return b.sameLength(b.index)
}

func (b *npzBody) sameLength(lists ...*cells) error {
	for _, c := range lists {
		if c.left != b.values.left {
			return &FileError{Path: c.name, Expected: fmt.Sprintf("%d elements, as many as values", b.values.left), Found: fmt.Sprint(c.left)}
		}
	}
	return nil
}

func (b *npzBody) next(dst *csr.Triplets) error {
	if b.index == nil {
		if err := b.start(); err != nil {
			return err
		}
	}
	values, err := b.values.floats()
	if err != nil {
		return err
	}
	if len(values) == 0 {
		return b.finish()
	}
	step := b.values.perElement()
	b.expand.grow(dst, len(values)/step)
	k := 0
	for p := 0; p < len(values); p += step {
		e, err := b.position()
		if err != nil {
			return err
		}
		if e.re = values[p]; step == 2 {
			e.im = values[p+1]
		}
		k = b.expand.put(dst, k, &e)
	}
	dst.I, dst.J, dst.V = dst.I[:k], dst.J[:k], dst.V[:k]
	return nil
}

// position returns row and column of the next entry.
func (b *npzBody) position() (e entry, err error) {
	var major int64
	name := ""
	if b.row != nil {
		if major, err = b.row.nextIndex(); err != nil {
			return e, err
		}
		name = b.row.name
	} else {
		for b.left == 0 {
			if err := b.advance(); err != nil {
				return e, err
			}
		}
		b.left--
		major = int64(b.major)
	}
	minor, err := b.index.nextIndex()
	if err != nil {
		return e, err
	}
	i, j := major, minor
	if b.file.format == "csc" {
		i, j = minor, major
	}
	if uint64(i) >= uint64(b.file.rows) || uint64(j) >= uint64(b.file.cols) {
		if name == "" || uint64(i) < uint64(b.file.rows) {
			name = b.index.name
		}
		return e, &FileError{Path: name, Expected: fmt.Sprintf("indices of a %d by %d matrix, from 0", b.file.rows, b.file.cols), Found: fmt.Sprintf("row %d, column %d", i, j)}
	}
	e.i, e.j = int32(i), int32(j)
	return e, nil
}

// advance goes on to the next row (csr) or column (csc).
func (b *npzBody) advance() error {
	end, err := b.pointer.nextIndex()
	if err != nil {
		return err
	}
	b.major++
	if end < b.end || end > b.file.head.Stored {
		return &FileError{Path: b.pointer.name, Row: b.major + 1, Expected: fmt.Sprintf("starts that ascend to %d", b.file.head.Stored), Found: fmt.Sprintf("%d after %d", end, b.end)}
	}
	b.left, b.end = end-b.end, end
	return nil
}

// finish checks that all members end together and whole; then io.EOF.
func (b *npzBody) finish() error {
	for b.pointer != nil && (b.pointer.left > 0 || b.pointer.at < len(b.pointer.index)) {
		if err := b.advance(); err != nil {
			return err
		}
	}
	if b.pointer != nil && b.end != b.file.head.Stored {
		return &FileError{Path: b.pointer.name, Expected: fmt.Sprintf("%d as the last start", b.file.head.Stored), Found: fmt.Sprint(b.end)}
	}
	for _, c := range []*cells{b.values, b.row, b.pointer, b.index} {
		if c == nil {
			continue
		}
		if err := c.finish(); err != nil {
			return err
		}
	}
	return io.EOF
}

func (b *npzBody) closeMembers() {
	for k, a := range b.aheads {
		a.close()
		b.opened[k].Close()
	}
}

func (b *npzBody) close() error {
	b.closeMembers()
	return b.file.in.close()
}
