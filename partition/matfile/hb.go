package matfile

import (
	"fmt"
	"io"

	"rowstead/partition/csr"
)

// openHB opens a Boeing file.
func openHB(in *stream, purpose use) (*Reader, error) {
	if err := in.mustReopen("Harwell-Boeing files"); err != nil {
		return nil, err
	}
	f, err := readHBHeader(in)
	if err != nil {
		return nil, err
	}
	if purpose == asVectors {
		return openHBRight(in, f)
	}
	b := &hbBody{file: f, in: in}
	b.expand = expansionOf(f.head.Symmetry, f.head.Complex, false)
	b.checker = &coordinates{path: in.path, base: 1}
	return &Reader{head: f.head, body: b}, nil
}

// hbBody delivers the entries of a Boeing file column after column.
type hbBody struct {
	file    *hbFile
	in      *stream
	pointer *cursor
	index   *cursor
	value   *cursor // nil for a pattern
	opened  []*cursor
	expand  expansion
	checker *coordinates
	column  int   // zero-based, being read
	end     int64 // first entry behind it, from one as the file counts
	read    int64 // entries read
}

const hbBlock = 16 << 10 // entries a chunk

func (b *hbBody) open() error {
	f := b.file
	skip := int64(f.lines)
	for _, part := range []struct {
		into  **cursor
		what  string
		card  int
		count int64
		form  []fortranField
	}{
		{&b.pointer, "column pointers", cardsPointers, int64(f.cols) + 1, f.pointers},
		{&b.index, "row indices", cardsIndices, f.head.Stored, f.indices},
		{&b.value, "values", cardsValues, f.valueCount(), f.values},
	} {
		if part.what == "values" && f.head.Field == "pattern" {
			continue
		}
		c, err := openCursor(b.in.path, part.what, skip, part.count, part.form)
		if err != nil {
			return err
		}
		*part.into = c
		b.opened = append(b.opened, c)
		skip += f.cards[part.card]
	}
	first, err := b.pointer.whole()
	if err == nil && first != 1 {
		err = &FileError{Path: b.in.path, Line: b.pointer.lines, Expected: "1 as the first column pointer", Found: fmt.Sprint(first)}
	}
	b.end, b.column = 1, -1
	return err
}

// valueCount is how many numbers the values take.
func (f *hbFile) valueCount() int64 {
	switch f.head.Field {
	case "complex":
		return 2 * f.head.Stored
	case "pattern":
		return 0
	}
	return f.head.Stored
}

func (b *hbBody) next(dst *csr.Triplets) error {
	if b.pointer == nil {
		if err := b.open(); err != nil {
			return err
		}
	}
	left := b.file.head.Stored - b.read
	if left == 0 {
		return b.finish()
	}
	b.expand.grow(dst, int(min(left, hbBlock)))
	k := 0
	for range min(left, hbBlock) {
		e, err := b.entry()
		if err != nil {
			return err
		}
		k = b.expand.put(dst, k, &e)
	}
	dst.I, dst.J, dst.V = dst.I[:k], dst.J[:k], dst.V[:k]
	return nil
}

// entry reads the next entry.
func (b *hbBody) entry() (e entry, err error) {
	for b.read+1 >= b.end {
		if err := b.advance(); err != nil {
			return e, err
		}
	}
	b.read++
	row, err := b.index.whole()
	if err != nil {
		return e, err
	}
	if row < 1 || row > int64(b.file.rows) {
		return e, &FileError{Path: b.in.path, Line: b.index.lines, Expected: fmt.Sprintf("a row index between 1 and %d", b.file.rows), Found: fmt.Sprint(row)}
	}
	e = entry{i: int32(row - 1), j: int32(b.column), re: 1}
	for k, v := range []*float64{&e.re, &e.im} {
		if b.value == nil || k == 1 && !b.file.head.Complex {
			break
		}
		if *v, err = b.value.number(); err != nil {
			return e, err
		}
	}
	if b.expand.check != nil {
		if err := b.expand.check(b.checker, &e); err != nil {
			err.(*FileError).Line = b.index.lines
			return e, err
		}
	}
	return e, nil
}

// advance goes on to the next column.
func (b *hbBody) advance() error {
	end, err := b.pointer.whole()
	if err != nil {
		return err
	}
	b.column++
	if end < b.end || end > b.file.head.Stored+1 {
		return &FileError{Path: b.in.path, Line: b.pointer.lines, Expected: fmt.Sprintf("column pointers that ascend to %d", b.file.head.Stored+1), Found: fmt.Sprintf("%d after %d", end, b.end)}
	}
	b.end = end
	return nil
}

// finish checks that the parts end where the header says; then io.EOF.
func (b *hbBody) finish() error {
	for b.pointer.left > 0 {
		if err := b.advance(); err != nil {
			return err
		}
	}
	if want := b.file.head.Stored + 1; b.end != want {
		return &FileError{Path: b.in.path, Line: b.pointer.lines, Expected: fmt.Sprintf("%d as the last column pointer", want), Found: fmt.Sprint(b.end)}
	}
	for _, c := range b.opened {
		if err := c.endOfLine(); err != nil {
			return err
		}
	}
	last := b.opened[len(b.opened)-1]
	rest, err := last.remaining()
	if err != nil {
		return err
	}
	if want := b.file.cards[cardsRight]; rest != want {
		return &FileError{Path: b.in.path, Line: last.lines, Expected: fmt.Sprintf("%d lines behind the matrix", want), Found: fmt.Sprint(rest)}
	}
	return io.EOF
}

func (b *hbBody) close() error {
	for _, c := range b.opened {
		c.close()
	}
	return b.in.close()
}
