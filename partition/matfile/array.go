package matfile

import (
	"bytes"
	"fmt"
	"io"

	"rowstead/partition/csr"
)

// numbers parses text that holds bare numbers.
type numbers struct {
	path     string
	perLine  int // numbers a line must hold; 0: any
	integer  bool
	comments string // marks that make a line a comment
}

// parse fills in values and stored of the chunk, or err with the line in it.
func (g *numbers) parse(c *chunk) {
	if most := len(c.text)/2 + 1; cap(c.values) < min(most, c.lines*max(g.perLine, 1)) {
		c.values = make([]float64, 0, min(most, c.lines*max(g.perLine, 1)))
	}
	c.values = c.values[:0]
	for p := 0; p < len(c.text); {
		end := p + bytes.IndexByte(c.text[p:], '\n')
		if err := g.line(c, p, end); err != nil {
			err.Path, err.Line = g.path, bytes.Count(c.text[:p], []byte{'\n'})+1
			c.err = err
			return
		}
		p = end + 1
	}
	c.stored = int64(len(c.values))
}

// line appends the numbers of text[p:end] to the chunk's.
func (g *numbers) line(c *chunk, p, end int) *FileError {
	b, before := c.text, len(c.values)
	for {
		for b[p] == ' ' || b[p] == '\t' || b[p] == '\r' {
			p++
		}
		if p >= end {
			break
		}
		if len(c.values) == before && bytes.IndexByte([]byte(g.comments), b[p]) >= 0 {
			return nil
		}
		mark := p
		v, next, ok := scanFloat(b, p)
		if !ok || b[next] > ' ' || g.integer && !integerSyntax(b, mark) {
			word := b[mark : mark+bytes.IndexAny(b[mark:], " \t\r\n")]
			_, err := readNumber(word, g.integer)
			if err == nil {
				err = &FileError{Expected: "a number", Found: quote(word)}
			}
			return err
		}
		c.values, p = append(c.values, v), next
	}
	if n := len(c.values) - before; n > 0 && g.perLine > 0 && n != g.perLine {
		return &FileError{Expected: fmt.Sprintf("%d numbers on the line", g.perLine), Found: fmt.Sprint(n)}
	}
	return nil
}

// valueSource delivers the numbers of a dense file in its own order.
type valueSource interface {
	// nextValues returns the next numbers, valid until the next call, or io.EOF
	// once exactly the promised count was delivered.
	nextValues() ([]float64, error)
	close() error
}

// textValues reads the numbers of a Matrix Market array or a list.
type textValues struct {
	lineTracker
	in      *stream
	pipe    *pipeline
	last    *chunk
	layout  *numbers
	opts    Options
	promise int64 // numbers the header promises; −1: as many as there are
}

func (s *textValues) nextValues() ([]float64, error) {
	if s.pipe == nil {
		s.pipe = newPipeline(s.in, s.opts, s.layout.parse)
	}
	if s.last != nil {
		s.pipe.release(s.last)
		s.last = nil
	}
	c, err := s.take(s.pipe)
	if err == io.EOF && s.promise >= 0 && s.count < s.promise {
		return nil, &FileError{Path: s.in.path, Line: s.lines, Expected: fmt.Sprintf("%d numbers", s.promise), Found: fmt.Sprintf("the end of the file after %d", s.count)}
	}
	if err != nil {
		return nil, err
	}
	s.last = c
	if s.promise >= 0 && s.count+c.stored > s.promise {
		line := s.lines + lineOfNumber(c.text, s.promise-s.count, s.layout.comments)
		return nil, &FileError{Path: s.in.path, Line: line, Expected: fmt.Sprintf("the end of the file after %d numbers", s.promise), Found: "another number"}
	}
	s.count, s.lines = s.count+c.stored, s.lines+c.lines
	return c.values, nil
}

// lineOfNumber returns the line within text of its k-th number.
func lineOfNumber(text []byte, k int64, comments string) int {
	for p, line := 0, 1; p < len(text); line++ {
		end := p + bytes.IndexByte(text[p:], '\n')
		words := bytes.Fields(text[p:end])
		if len(words) > 0 && bytes.IndexByte([]byte(comments), words[0][0]) < 0 {
			if k -= int64(len(words)); k < 0 {
				return line
			}
		}
		p = end + 1
	}
	return 0
}

func (s *textValues) close() error { return closePipe(s.pipe, s.in) }

// denseBody delivers the numbers of a dense file as entries; exact zeros are
// left out.
type denseBody struct {
	source    valueSource
	order     walk
	isComplex bool
	path      string
	expand    expansion
}

func (b *denseBody) next(dst *csr.Triplets) error {
	values, err := b.source.nextValues()
	if err != nil {
		return err
	}
	step := 1
	if b.isComplex {
		step = 2
	}
	b.expand.grow(dst, len(values)/step)
	k := 0
	g := coordinates{path: b.path, base: 1}
	for p := 0; p+step <= len(values); p += step {
		e := entry{i: int32(b.order.i), j: int32(b.order.j), re: values[p]}
		if b.isComplex {
			e.im = values[p+1]
		}
		b.order.advance()
		if e.re == 0 && e.im == 0 {
			continue
		}
		if b.expand.check != nil {
			if err := b.expand.check(&g, &e); err != nil {
				return err
			}
		}
		k = b.expand.put(dst, k, &e)
	}
	dst.I, dst.J, dst.V = dst.I[:k], dst.J[:k], dst.V[:k]
	return nil
}

func (b *denseBody) close() error { return b.source.close() }

// walk is the position of the next number of a dense file.
type walk struct {
	rows, cols int
	i, j       int
	byRow      bool   // row after row instead of column after column
	symmetry   string // only the lower triangle is stored unless "general"
}

func newWalk(rows, cols int, byRow bool, symmetry string) walk {
	w := walk{rows: rows, cols: cols, byRow: byRow, symmetry: symmetry}
	w.i = w.top()
	return w
}

// top is the first stored row of column j.
func (w *walk) top() int {
	switch w.symmetry {
	case "symmetric", "hermitian":
		return w.j
	case "skew-symmetric":
		return w.j + 1
	}
	return 0
}

func (w *walk) advance() {
	if w.byRow {
		if w.j++; w.j == w.cols {
			w.i, w.j = w.i+1, 0
		}
		return
	}
	if w.i++; w.i >= w.rows {
		w.j++
		w.i = w.top()
	}
}
