package matfile

import (
	"fmt"
	"io"

	"rowstead/partition/csr"
)

// openHBRight opens the right sides of a Boeing file as vectors.
func openHBRight(in *stream, f *hbFile) (*Reader, error) {
	if f.cards[cardsRight] == 0 {
		return nil, &FileError{Path: in.path, Line: 2, Expected: "right sides", Found: "none in this file"}
	}
	h := f.head
	scale := 1
	if h.Complex {
		scale = 2
	}
	h.Field, h.Symmetry, h.Stored = "real", "general", int64(f.rows)*f.right.columns
	if h.Complex {
		h.Field = "complex"
	}
	h.Cols = int(f.right.columns) * scale
	skip := int64(f.lines) + f.cards[cardsPointers] + f.cards[cardsIndices] + f.cards[cardsValues]
	if f.right.kind[0] == 'M' {
		h.Stored = f.right.entries
		b := &hbSparseRight{file: f, in: in, skip: skip, expand: expansionOf("general", h.Complex, true)}
		return &Reader{head: h, body: b}, nil
	}
	h.Dense, h.Layout = true, "array"
	s := &hbRightValues{file: f, in: in, skip: skip, perColumn: int64(f.rows * scale)}
	if err := s.checkCards(); err != nil {
		return nil, err
	}
	return &Reader{head: h, body: &denseBody{source: s, order: newWalk(f.rows, int(f.right.columns), false, "general"), isComplex: h.Complex, path: in.path, expand: expansionOf("general", h.Complex, true)}}, nil
}

// hbRightValues reads full right sides.
type hbRightValues struct {
	file      *hbFile
	in        *stream
	cursor    *cursor
	skip      int64
	perColumn int64
	newLine   bool // every right side begins on a new line
	column    int64
	values    []float64
}

// checkCards tells by the count of lines whether the right sides stand one
// behind the other or each begins on a line of its own; both are written.
// Guesses (G) and answers (X) take as many lines again.
func (s *hbRightValues) checkCards() error {
	r := s.file.right
	parts := int64(1)
	for k, letter := range "GX" {
		if r.kind[k+1] == byte(letter) {
			parts++
		}
	}
	together := parts * linesFor(r.columns*s.perColumn, r.format)
	apart := parts * r.columns * linesFor(s.perColumn, r.format)
	s.newLine = s.file.cards[cardsRight] != together
	if s.newLine && s.file.cards[cardsRight] != apart {
		return &FileError{Path: s.in.path, Line: 2, Expected: fmt.Sprintf("%d lines of right sides", together), Found: fmt.Sprint(s.file.cards[cardsRight])}
	}
	return nil
}

func (s *hbRightValues) nextValues() ([]float64, error) {
	r := s.file.right
	if s.cursor == nil {
		count := s.perColumn
		if !s.newLine {
			count *= r.columns
		}
		c, err := openCursor(s.in.path, "right sides", s.skip, count, r.format)
		if err != nil {
			return nil, err
		}
		s.cursor = c
	}
	if s.cursor.left == 0 {
		if s.column++; !s.newLine || s.column == r.columns {
			return nil, s.finish()
		}
		s.cursor.part(s.perColumn, r.format)
	}
	s.values = s.values[:0]
	for range min(s.cursor.left, hbBlock) { // even, so complex pairs stay together
		v, err := s.cursor.number()
		if err != nil {
			return nil, err
		}
		s.values = append(s.values, v)
	}
	return s.values, nil
}

// finish counts the lines behind the right sides; then io.EOF.
func (s *hbRightValues) finish() error {
	rest, err := s.cursor.remaining()
	if err != nil {
		return err
	}
	read := int64(s.cursor.lines) - s.skip
	if want := s.file.cards[cardsRight]; read < want || rest > want {
		return &FileError{Path: s.in.path, Line: s.cursor.lines, Expected: fmt.Sprintf("%d lines of right sides", want), Found: fmt.Sprint(read)}
	}
	return io.EOF
}

func (s *hbRightValues) close() error {
	if s.cursor != nil {
		s.cursor.close()
	}
	return s.in.close()
}

// hbSparseRight reads right sides stored as sparse columns: pointers, row
// indices and values, each part beginning on a new line.
type hbSparseRight struct {
	file   *hbFile
	in     *stream
	skip   int64
	done   bool
	expand expansion
}

func (b *hbSparseRight) next(dst *csr.Triplets) error {
	if b.done {
		return io.EOF
	}
	b.done = true
	f, r := b.file, b.file.right
	c, err := openCursor(b.in.path, "right sides", b.skip, r.columns+1, f.pointers)
	if err != nil {
		return err
	}
	defer c.close()
	starts, err := wholeNumbers(c, r.columns+1, r.entries+1)
	if err != nil {
		return err
	}
	if starts[0] != 1 || starts[len(starts)-1] != r.entries+1 {
		return &FileError{Path: b.in.path, Line: c.lines, Expected: fmt.Sprintf("pointers from 1 to %d", r.entries+1), Found: fmt.Sprintf("%d to %d", starts[0], starts[len(starts)-1])}
	}
	c.part(r.entries, f.indices)
	rows, err := wholeNumbers(c, r.entries, int64(f.rows))
	if err != nil {
		return err
	}
	return b.values(dst, c, starts, rows)
}

// wholeNumbers reads count numbers between 1 and most.
func wholeNumbers(c *cursor, count, most int64) ([]int64, error) {
	var out []int64
	for range count {
		v, err := c.whole()
		if err != nil {
			return nil, err
		}
		if v < 1 || v > most {
			return nil, &FileError{Path: c.in.path, Line: c.lines, Expected: fmt.Sprintf("a number between 1 and %d (%s)", most, c.what), Found: fmt.Sprint(v)}
		}
		out = append(out, v)
	}
	return out, nil
}

// values reads the values and puts the entries together.
func (b *hbSparseRight) values(dst *csr.Triplets, c *cursor, starts, rows []int64) error {
	r := b.file.right
	step := int64(1)
	if b.file.head.Complex {
		step = 2
	}
	c.part(step*r.entries, r.format)
	b.expand.grow(dst, len(rows))
	k, column := 0, 0
	for p, row := range rows {
		for int64(p)+1 >= starts[column+1] {
			if column++; starts[column+1] < starts[column] {
				return &FileError{Path: b.in.path, Line: c.lines, Expected: "ascending pointers (right sides)", Found: fmt.Sprint(starts[column+1])}
			}
		}
		e := entry{i: int32(row - 1), j: int32(column)}
		var err error
		if e.re, err = c.number(); err == nil && step == 2 {
			e.im, err = c.number()
		}
		if err != nil {
			return err
		}
		k = b.expand.put(dst, k, &e)
	}
	dst.I, dst.J, dst.V = dst.I[:k], dst.J[:k], dst.V[:k]
	return nil
}

func (b *hbSparseRight) close() error { return b.in.close() }
