package matfile

import (
	"bytes"
	"fmt"

	"rowstead/partition/csr"
)

// coordinates parses lines "row column [value [imaginary part]]". It keeps no
// state, so chunks may be parsed side by side.
type coordinates struct {
	path       string
	rows, cols int
	base       int  // index of the first row and column
	values     int  // numbers behind the indices: 0, 1 or 2
	integer    bool // values are written without point and exponent
	comments   string
	expand     expansion
}

// entry is one line of the file, indices zero-based.
type entry struct {
	i, j   int32
	re, im float64
}

// parse fills in out and stored of the chunk, or err with the line within it.
func (g *coordinates) parse(c *chunk) {
	g.expand.grow(&c.out, min(c.lines, len(c.text)/(4+2*g.values)+1))
	b, k := c.text, 0
	var e entry
	for p := 0; p < len(b); {
		next, ok := g.fastLine(b, p, &e)
		if !ok {
			end := p + bytes.IndexByte(b[p:], '\n')
			var skip bool
			skip, c.err = g.slowLine(b[p:end], &e)
			next = end + 1
			if skip && c.err == nil {
				p = next
				continue
			}
		}
		if c.err == nil && g.expand.check != nil {
			c.err = g.expand.check(g, &e)
		}
		if c.err != nil {
			c.err.(*FileError).Line = bytes.Count(b[:p], []byte{'\n'}) + 1
			break
		}
		k = g.expand.put(&c.out, k, &e)
		c.stored++
		p = next
	}
	c.out.I, c.out.J, c.out.V = c.out.I[:k], c.out.J[:k], c.out.V[:k]
}

// fastLine reads the line at p as programs write it: single spaces, nothing
// else. ok is false for anything unusual, which slowLine decides.
func (g *coordinates) fastLine(b []byte, p int, e *entry) (next int, ok bool) {
	for b[p] == ' ' || b[p] == '\t' {
		p++
	}
	i, p := scanIndex(b, p)
	for b[p] == ' ' || b[p] == '\t' {
		p++
	}
	j, p := scanIndex(b, p)
	i, j = i-uint64(g.base), j-uint64(g.base)
	if i >= uint64(g.rows) || j >= uint64(g.cols) {
		return p, false
	}
	e.i, e.j, e.re, e.im = int32(i), int32(j), 1, 0
	if g.values > 0 {
		if p, ok = g.number(b, p, &e.re); !ok {
			return p, false
		}
		if g.values > 1 {
			if p, ok = g.number(b, p, &e.im); !ok {
				return p, false
			}
		}
	}
	for b[p] == ' ' || b[p] == '\r' {
		p++
	}
	return p + 1, b[p] == '\n'
}

// number reads blanks and a number.
func (g *coordinates) number(b []byte, p int, v *float64) (next int, ok bool) {
	if b[p] != ' ' && b[p] != '\t' {
		return p, false
	}
	for b[p] == ' ' || b[p] == '\t' {
		p++
	}
	if g.integer && !integerSyntax(b, p) {
		return p, false
	}
	*v, p, ok = scanFloat(b, p)
	return p, ok
}

// scanIndex reads an unsigned number of up to 10 digits; anything else gives a
// value that no range check passes.
func scanIndex(b []byte, p int) (uint64, int) {
	n, mark := uint64(0), p
	for d := b[p] - '0'; d <= 9; d = b[p] - '0' {
		n = n*10 + uint64(d)
		p++
	}
	if p == mark || p-mark > 10 || b[p] > ' ' {
		return 1 << 62, p
	}
	return n, p
}

// integerSyntax tells whether an integer, signed or not, stands at b[p:].
func integerSyntax(b []byte, p int) bool {
	if b[p] == '-' || b[p] == '+' {
		p++
	}
	mark := p
	for b[p]-'0' <= 9 {
		p++
	}
	return p > mark && b[p] <= ' '
}

// slowLine reads any line: skip is true for blank and comment lines; an error
// says what should stand where.
func (g *coordinates) slowLine(line []byte, e *entry) (skip bool, err error) {
	words := bytes.Fields(line)
	if len(words) == 0 || bytes.IndexByte([]byte(g.comments), words[0][0]) >= 0 {
		return true, nil
	}
	var index [2]int32
	for k, axis := range [2]string{"row", "column"} {
		if k >= len(words) {
			return false, &FileError{Path: g.path, Expected: g.lineForm(), Found: quote(line)}
		}
		v, err := g.index(words[k], axis)
		if err != nil {
			return false, err
		}
		index[k] = v
	}
	e.i, e.j, e.re, e.im = index[0], index[1], 1, 0
	row := int(e.i) + 1
	if len(words) != 2+g.values {
		return false, &FileError{Path: g.path, Row: row, Expected: g.lineForm(), Found: quote(line)}
	}
	for k, v := range []*float64{&e.re, &e.im}[:g.values] {
		x, err := readNumber(words[2+k], g.integer)
		if err != nil {
			err.Path, err.Row = g.path, row
			return false, err
		}
		*v = x
	}
	return false, nil
}

// lineForm describes a line in an error.
func (g *coordinates) lineForm() string {
	return [...]string{"a row and a column", "a row, a column and a value", "a row, a column, a real and an imaginary part"}[g.values]
}

// index reads one row or column index and brings it to base zero.
func (g *coordinates) index(word []byte, axis string) (int32, error) {
	most := g.rows
	if axis == "column" {
		most = g.cols
	}
	v, ok := wholeNumber(bytes.TrimPrefix(word, []byte("+")))
	if v -= int64(g.base); ok && v >= 0 && v < int64(most) {
		return int32(v), nil
	}
	err := &FileError{Path: g.path, Expected: fmt.Sprintf("a %s index between %d and %d", axis, g.base, most+g.base-1), Found: quote(word)}
	return 0, err
}

// readNumber reads the whole word as a finite number.
func readNumber(word []byte, integer bool) (float64, *FileError) {
	padded := append(word[:len(word):len(word)], '\n')
	expected := "a finite number"
	if integer {
		expected = "an integer"
	}
	if integer && !integerSyntax(padded, 0) {
		return 0, &FileError{Expected: expected, Found: quote(word)}
	}
	v, next, ok := scanFloat(padded, 0)
	if !ok || next != len(word) {
		return 0, &FileError{Expected: expected, Found: quote(word)}
	}
	return v, nil
}

// expansion turns one entry of a file into the entries of the real, general
// matrix it stands for.
type expansion struct {
	most  int // entries out of one
	check func(*coordinates, *entry) error
	put   func(t *csr.Triplets, k int, e *entry) int
}

// grow makes room for n entries of the file.
func (x expansion) grow(t *csr.Triplets, n int) {
	n *= x.most
	if cap(t.I) < n || cap(t.J) < n || cap(t.V) < n {
		t.I, t.J, t.V = make([]int32, n), make([]int32, n), make([]float64, n)
	}
	t.I, t.J, t.V = t.I[:n], t.J[:n], t.V[:n]
}
